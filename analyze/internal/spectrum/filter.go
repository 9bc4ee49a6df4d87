package spectrum

import (
	"math"

	"gonum.org/v1/gonum/dsp/fourier"
)

// filterMemory is the least number of kernel samples to each side, filterLasts
// the least time, s; a transform holds sixteen times as many.
const (
	filterMemory = 512
	filterLasts  = 2.5e-3
)

// Filter passes a sampled signal through a network given by its frequency
// response and reads the output at a multiple of the sample rate. For a
// signal that held nothing above half the rate the output is that of the
// network itself: the response is used as it stands, not mapped by a formula
// that bends it towards half the rate.
//
// The kernel is the inverse transform of the response, faded out over the
// outer half of its length to both sides, so a network whose own response
// lasts over 1 ms does not fit; blocks overlap and the parts that wrap around
// are dropped. What came before the first sample counts as 0.
type Filter struct {
	Rate float64 // of the input, Hz
	Up   int     // output samples an input sample

	memory   int          // kernel samples to each side
	block    int          // samples a transform
	kernel   []float64    // index memory is time 0
	response []complex128 // of the kernel, delayed by memory samples
	forward  *fourier.FFT
	backward *fourier.FFT
}

// NewFilter prepares a filter: response in V/V at hz >= 0, exp(+j w t); up 1 or
// a product of 2, 3 and 5.
func NewFilter(response func(hz float64) complex128, rate float64, up int) *Filter {
	f := &Filter{Rate: rate, Up: up, memory: filterMemory}
	for float64(f.memory) < filterLasts*rate {
		f.memory *= 2
	}
	f.block = 16 * f.memory
	f.forward, f.backward = fourier.NewFFT(f.block), fourier.NewFFT(f.block*up)
	c := make([]complex128, f.block/2+1)
	for k := range c {
		c[k] = response(float64(k) * rate / float64(f.block))
	}
	// Half the rate stands for both signs of the frequency: only a real part.
	c[f.block/2] = complex(real(c[f.block/2]), 0)
	h := f.forward.Sequence(nil, c)
	f.kernel = make([]float64, 2*f.memory+1)
	for i := range f.kernel {
		t := i - f.memory
		f.kernel[i] = h[(t+f.block)%f.block] / float64(f.block) * fade(math.Abs(float64(t))/float64(f.memory))
	}
	padded := make([]float64, f.block)
	copy(padded, f.kernel)
	f.response = f.forward.Coefficients(nil, padded)
	return f
}

// fade is 1 up to 1/2 and falls as a raised cosine to 0 at 1.
func fade(x float64) float64 {
	if x <= 0.5 {
		return 1
	}
	return 0.5 + 0.5*math.Cos(2*math.Pi*(x-0.5))
}

// Response is the frequency response that the kernel really has.
func (f *Filter) Response(hz float64) complex128 {
	var re, im float64
	for i, h := range f.kernel {
		s, c := math.Sincos(2 * math.Pi * hz / f.Rate * float64(i-f.memory))
		re += h * c
		im -= h * s
	}
	return complex(re, im)
}

// Run filters n samples from src and hands the n*Up output samples to emit in
// stretches; emit must not keep the slice. src is read in order.
func (f *Filter) Run(src Source, n int, emit func(y []float64)) {
	keep := f.block - 2*f.memory
	x := make([]float64, f.block)
	var c []complex128
	wide := make([]complex128, f.block*f.Up/2+1)
	var y []float64
	read := 0
	fill := func(dst []float64) { // zeros past the end
		got := 0
		for got < len(dst) && read < n {
			k := src(dst[got:min(len(dst), got+n-read)], read)
			if k == 0 {
				break
			}
			got += k
			read += k
		}
		clear(dst[got:])
	}
	// x starts f.memory samples before the first one of the output.
	fill(x[f.memory:])
	for at := 0; at < n; at += keep {
		if at > 0 {
			copy(x, x[keep:])
			fill(x[2*f.memory:])
		}
		c = f.forward.Coefficients(c, x)
		clear(wide)
		for k := range c {
			wide[k] = c[k] * f.response[k] / complex(float64(f.block), 0)
		}
		if f.Up > 1 { // half the input's rate now lies inside
			wide[f.block/2] /= 2
		}
		y = f.backward.Sequence(y, wide)
		emit(y[2*f.memory*f.Up:][:min(keep, n-at)*f.Up])
	}
}
