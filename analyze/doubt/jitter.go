package doubt

import (
	"fmt"
	"math"
	"math/cmplx"

	"benchslip/capture/recording"
)

// Instants of sampling that scatter by dt add x'(t) dt to a signal: noise that
// is strongest where a tone crosses zero and vanishes at its peaks. Noise of
// any other origin does not know the tone's phase.
const (
	jitterStretches = 12
	jitterPoints    = 8192
	phaseBins       = 64
	leastContrast   = 0.35  // pure jitter has 0.5, pure noise 0
	mostContrast    = 0.65  // more is a fault at the tone's zero crossings
	leastJitter     = 0.002 // of a sample interval, RMS
)

// jitter reads the contrast C = mean(r^2 (-cos 2 theta))/mean(r^2) of what is
// left beside the tone. What repeats with the tone's phase (harmonics, steps
// at its zero crossings) is taken off first, as its mean over each of 64
// parts of a period.
func jitter(l *listening) []Finding {
	f := l.frames
	if f.hz == 0 {
		return nil
	}
	n := min(l.sig.Len(), jitterPoints)
	if n < 32*phaseBins || f.hz*float64(n)/f.rate < 8 || f.hz > 0.2*f.rate {
		return nil
	}
	count := min(jitterStretches, l.sig.Len()/n)
	var power, contrast float64
	votes, read := 0, 0
	x := make([]float64, n)
	for i := range count {
		from := int(int64(l.sig.Len()-n) * int64(i) / int64(max(count-1, 1)))
		if l.sig.Read(x, from) < n {
			break
		}
		p, c, ok := f.crossings(x)
		if !ok {
			continue
		}
		read++
		power += p
		contrast += c * p
		if c > leastContrast && c < mostContrast {
			votes++
		}
	}
	if read == 0 || 4*votes < 3*read {
		return nil
	}
	contrast /= power
	// dt^2 (2 pi f)^2 mean(sin^2) = the part of the power that follows the slope.
	dt := math.Sqrt(power/float64(read)*2*contrast*2) / (2 * math.Pi * f.hz)
	if dt*f.rate < leastJitter {
		return nil
	}
	return []Finding{l.found(recording.TimeJitter, 0, l.sig.Len(),
		fmt.Sprintf("the noise beside the tone at %.6g Hz follows the tone's slope (contrast %.2f of 0.5): the instants of sampling scatter by %.3g s RMS, %.2g of a sample interval; noise and THD+N read too high",
			f.hz, contrast, dt, dt*f.rate))}
}

// crossings fits the tone to x and returns the power left beside what repeats
// with it, over the tone's squared amplitude, and its contrast.
func (f *frames) crossings(x []float64) (power, contrast float64, ok bool) {
	nu := f.frequency(x)
	z, mean := phasor(x, nu)
	amp := cmplx.Abs(z)
	if amp == 0 {
		return 0, 0, false
	}
	var sum [phaseBins]float64
	var many [phaseBins]int
	// The edges of a square wave fall between samples, one way or the other:
	// only what is nearly a sine tells. A square wave's fundamental holds 81 %.
	whole := 0.0
	for _, v := range x {
		whole += (v - mean) * (v - mean)
	}
	if amp*amp/2*float64(len(x)) < 0.9*whole {
		return 0, 0, false
	}
	theta := make([]float64, len(x))
	left := make([]float64, len(x))
	for i, v := range x {
		turns := fraction(nu*float64(i) + cmplx.Phase(z)/(2*math.Pi))
		theta[i] = 2 * math.Pi * turns
		left[i] = v - mean - amp*math.Cos(theta[i])
		b := int((turns+0.5)*phaseBins) % phaseBins
		sum[b] += left[i]
		many[b]++
	}
	all, steps, last := 0.0, 0.0, 0.0
	for i := range left {
		b := int((theta[i]/(2*math.Pi)+0.5)*phaseBins) % phaseBins
		if many[b] < 8 {
			return 0, 0, false // the tone is in step with the sample rate
		}
		r := left[i] - sum[b]/float64(many[b])
		all += r * r
		steps += (r - last) * (r - last)
		last = r
		contrast -= r * r * math.Cos(2*theta[i])
	}
	// Scattered instants differ from sample to sample, so that what they add
	// is white: steps twice its power. Hum whose phases wander is slow.
	if all == 0 || steps < all || all > 0.1*amp*amp*float64(len(x)) {
		return 0, 0, false
	}
	return all / float64(len(x)) / (amp * amp), contrast / all, true
}

// frequency refines the tone's frequency in x, cycles a sample, from the
// phases of its two halves, twice.
func (f *frames) frequency(x []float64) float64 {
	nu := f.hz / f.rate
	h := len(x) / 2
	for range 3 {
		a, _ := phasor(x[:h], nu)
		b, _ := phasor(x[h:2*h], nu)
		turn := cmplx.Phase(b*cmplx.Conj(a)) / (2 * math.Pi)
		nu += fraction(turn-nu*float64(h)) / float64(h)
	}
	return nu
}

// phasor is the peak phasor at the first sample of the line nu in x under a
// Hann window, and the mean of x.
func phasor(x []float64, nu float64) (z complex128, mean float64) {
	w := hann(len(x))
	for i, v := range x {
		mean += w[i] * v
	}
	turn, step := complex(1, 0), cmplx.Rect(1, -2*math.Pi*nu)
	for i, v := range x {
		z += complex(2*w[i]*(v-mean), 0) * turn
		turn *= step
	}
	return z, mean
}
