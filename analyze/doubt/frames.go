package doubt

import (
	"math"
	"math/cmplx"
	"slices"

	"benchslip/analyze"
)

const (
	lowestTone = 16 // Hz, whose frames are half a second long
	frameS     = 0.02
	framePds   = 8 // periods of the tone a frame holds at least
)

// frame is what a short stretch of a signal shows, under a Hann window where
// a tone is read, so that neighbouring lines hardly disturb it.
type frame struct {
	z    complex128 // peak phasor of the tone, turned back to sample 0
	rms  float64    // about the stretch's mean
	fine float64    // RMS of the second difference: what is near half the rate, hum and slow things out
	zero bool       // every sample is exactly 0
}

// frames cuts a signal into stretches of equal length.
type frames struct {
	rate float64
	n    int     // samples a frame
	hz   float64 // of the tone; 0: none
	list []frame
	slow []float64 // means under a Hann window of slowS, half overlapped
	lag  int       // samples from one slow mean to the next
}

// slowS is long enough that hum and tones leave the means alone.
const slowS = 0.2

// framesOf reads a signal once. Memory: 50 frames a second.
func framesOf(s *analyze.Signal, hz float64) *frames {
	f := &frames{rate: s.RateHz, hz: hz, n: max(int(frameS*s.RateHz), 16)}
	if hz > 0 {
		f.n = max(f.n, int(framePds*s.RateHz/hz))
	}
	window := hann(f.n)
	buf := make([]float64, f.n)
	step := cmplx.Rect(1, -2*math.Pi*hz/s.RateHz)
	for at := 0; at+f.n <= s.Len(); at += f.n {
		if s.Read(buf, at) < f.n {
			break
		}
		f.list = append(f.list, f.read(buf, window, at, step))
	}
	f.means(s)
	return f
}

// hann is a periodic Hann window whose weights sum to 1.
func hann(n int) []float64 {
	w := make([]float64, n)
	for i := range w {
		w[i] = (1 - math.Cos(2*math.Pi*float64(i)/float64(n))) / float64(n)
	}
	return w
}

func (f *frames) read(x, window []float64, at int, step complex128) frame {
	out := frame{zero: true}
	mean := 0.0
	for _, v := range x {
		mean += v
		out.zero = out.zero && v == 0
	}
	mean /= float64(len(x))
	square, fine := 0.0, 0.0
	turn := cmplx.Rect(1, -2*math.Pi*fraction(f.hz/f.rate*float64(at)))
	for i, v := range x {
		d := v - mean
		square += d * d
		if i > 1 {
			c := v - 2*x[i-1] + x[i-2]
			fine += c * c
		}
		if f.hz > 0 {
			out.z += complex(2*window[i]*d, 0) * turn
			turn *= step
		}
	}
	out.rms = math.Sqrt(square / float64(len(x)))
	out.fine = math.Sqrt(fine / float64(len(x)-2))
	return out
}

func fraction(x float64) float64 { return x - math.Round(x) }

// means fills slow.
func (f *frames) means(s *analyze.Signal) {
	n := int(slowS * f.rate)
	f.lag = max(n/2, 1)
	if n < 16 {
		return
	}
	window := hann(n)
	buf := make([]float64, n)
	for at := 0; at+n <= s.Len(); at += f.lag {
		got := 0
		if at > 0 {
			got = copy(buf, buf[f.lag:])
		}
		if got += s.Read(buf[got:], at+got); got < n {
			return
		}
		m := 0.0
		for i, v := range buf {
			m += v * window[i]
		}
		f.slow = append(f.slow, m)
	}
}

// seconds is the length of k frames.
func (f *frames) seconds(k int) float64 { return float64(k*f.n) / f.rate }

// per is the number of frames in so many seconds, at least 1.
func (f *frames) per(seconds float64) int { return max(1, int(seconds*f.rate/float64(f.n)+0.5)) }

// stretch is frames [from, to).
type stretch struct{ from, to int }

func (s stretch) len() int { return s.to - s.from }

// A frame holds the tone when its line makes most of it and stands within
// 26 dB of the loudest; it holds silence 34 dB below.
const (
	mostOf   = 0.5
	loudly   = 0.05
	silently = 0.02
	abrupt   = 0.12 // a change of level from frame to frame that ends a stretch (1 dB)
)

// loudest is the level that a tenth of the frames exceed, peak.
func (f *frames) loudest() float64 {
	if f.hz == 0 || len(f.list) == 0 {
		return 0
	}
	a := make([]float64, len(f.list))
	for i, v := range f.list {
		a[i] = cmplx.Abs(v.z)
	}
	slices.Sort(a)
	return a[len(a)*9/10]
}

// tones lists the stretches in which one tone sounds without abrupt change.
func (f *frames) tones() []stretch {
	top := f.loudest()
	if top == 0 {
		return nil
	}
	var out []stretch
	from := -1
	end := func(i int) {
		if from >= 0 && i-from > 2 {
			out = append(out, stretch{from, i})
		}
		from = -1
	}
	for i, v := range f.list {
		a := cmplx.Abs(v.z)
		on := a >= loudly*top && a*a/2 >= mostOf*v.rms*v.rms
		if on && from >= 0 {
			if before := cmplx.Abs(f.list[i-1].z); math.Abs(a-before) > abrupt*math.Max(a, before) {
				end(i)
			}
		}
		switch {
		case !on:
			end(i)
		case from < 0:
			from = i
		}
	}
	end(len(f.list))
	return out
}

// silences lists the stretches without the tone, longer than least seconds.
func (f *frames) silences(least float64) []stretch {
	top := f.loudest()
	if top == 0 {
		return nil
	}
	var out []stretch
	from := -1
	for i := 0; i <= len(f.list); i++ {
		quiet := i < len(f.list) && f.list[i].rms < silently*top
		if quiet && from < 0 {
			from = i
		}
		if !quiet && from >= 0 {
			if f.seconds(i-from) >= least {
				out = append(out, stretch{from, i})
			}
			from = -1
		}
	}
	return out
}

func median(x []float64) float64 {
	if len(x) == 0 {
		return 0
	}
	s := slices.Clone(x)
	slices.Sort(s)
	return (s[(len(s)-1)/2] + s[len(s)/2]) / 2
}
