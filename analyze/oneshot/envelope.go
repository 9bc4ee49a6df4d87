package oneshot

import (
	"math"
	"math/cmplx"
	"slices"

	"benchslip/analyze/internal/sinefit"
)

// smoothComplex is smooth for complex samples.
func smoothComplex(z []complex128, half int) []complex128 {
	if half < 1 {
		return z
	}
	y := make([]complex128, len(z))
	var sum complex128
	a, b := 0, 0
	for i := range z {
		for ; b < len(z) && b <= i+half; b++ {
			sum += z[b]
		}
		for ; a < i-half; a++ {
			sum -= z[a]
		}
		y[i] = sum / complex(float64(b-a), 0)
	}
	return y
}

// bright takes what lies far below hz off x: twice less its own running mean
// over about a period of it. gain is what that leaves of a tone at hz. Towards
// the ends the mean is taken over fewer samples, equally many on both sides, so
// that a slope leaves nothing anywhere.
func bright(x []float64, rate, hz float64) (y []float64, gain float64) {
	half := max(int(math.Round((rate/hz-1)/2)), 1)
	y = x
	for range 2 {
		d := make([]float64, len(y))
		sum := 0.0
		a, b := 0, 0
		for i, v := range y {
			h := min(half, i, len(y)-1-i)
			for ; b < i+h+1; b++ {
				sum += y[b]
			}
			for ; b > i+h+1; b-- {
				sum -= y[b-1]
			}
			for ; a < i-h; a++ {
				sum -= y[a]
			}
			d[i] = v - sum/float64(b-a)
		}
		y = d
	}
	n := float64(2*half + 1)
	d := math.Sin(math.Pi*n*hz/rate) / (n * math.Sin(math.Pi*hz/rate))
	return y, (1 - d) * (1 - d)
}

// demodulate is the complex envelope of x about hz: |z| is the amplitude (peak)
// of a tone there. Three running means of 2*half+1 samples let through what
// lies within about 0.3 rate/(2 half+1) of hz; both flanks of a sudden start or
// stop pass half of their height where it lies.
func demodulate(x []float64, rate, hz, gain float64, half int) []complex128 {
	z := make([]complex128, len(x))
	const block = 256 // the turning phasor is set afresh so often
	nu := hz / rate
	step := cmplx.Rect(1, -2*math.Pi*nu)
	for a := 0; a < len(x); a += block {
		w := cmplx.Rect(2/gain, -2*math.Pi*sinefit.Turns(nu, float64(a)))
		for i := a; i < min(a+block, len(x)); i++ {
			z[i] = complex(x[i], 0) * w
			w *= step
		}
	}
	for range 3 {
		z = smoothComplex(z, half)
	}
	return z
}

// noiseShare is the mean of |z|^2 that noise of a density (V^2/Hz) leaves:
// three running means of n samples have a noise bandwidth of 0.55 rate/n.
func noiseShare(density, rate float64, half int) float64 {
	return 4 * density * 0.55 * rate / 2 / float64(2*half+1)
}

// stay is a stretch of time, in sample indexes.
type stay struct{ from, to float64 }

func (s stay) long() float64 { return s.to - s.from }

// stays lists where env exceeds limit, crossings linear between samples; gaps
// shorter than gap are closed, and so are those in which it keeps over 0.8 of
// the limit (noise on a slow flank).
func stays(env []float64, limit float64, gap int) []stay {
	var out []stay
	cross := func(i int) float64 { // between i-1 and i
		a, b := env[i-1], env[i]
		return float64(i-1) + math.Min(math.Max((limit-a)/(b-a), 0), 1)
	}
	open := -1.0
	for i, v := range env {
		switch {
		case v > limit && open < 0:
			open = 0
			if i > 0 {
				open = cross(i)
			}
		case v <= limit && open >= 0:
			out = append(out, stay{open, cross(i)})
			open = -1
		}
	}
	if open >= 0 {
		out = append(out, stay{open, float64(len(env))})
	}
	var joined []stay
	for _, s := range out {
		n := len(joined)
		if n > 0 && (s.from-joined[n-1].to < float64(gap) || slices.Min(env[int(joined[n-1].to):int(s.from)+1]) > 0.8*limit) {
			joined[n-1].to = s.to
		} else {
			joined = append(joined, s)
		}
	}
	return joined
}

// drift is how far, in Hz, the tone within a stretch of an envelope lies from
// the frequency it was demodulated by: the slope of its phase, weighted by its
// power, every half-length of the running mean, where |z| is below a limit
// (edges of the signal exceed it).
func drift(z []complex128, s stay, rate float64, half int, limit float64) float64 {
	step := max(half, 1)
	var w, wt, wp, wtt, wtp float64
	phase, prev := 0.0, complex128(0)
	for i := int(math.Ceil(s.from)); i < int(s.to) && i < len(z); i += step {
		if cmplx.Abs(z[i]) > limit {
			continue
		}
		if prev != 0 {
			phase += cmplx.Phase(z[i] * cmplx.Conj(prev))
		}
		prev = z[i]
		p := real(prev)*real(prev) + imag(prev)*imag(prev)
		t := float64(i) - s.from
		w += p
		wt += p * t
		wp += p * phase
		wtt += p * t * t
		wtp += p * t * phase
	}
	den := w*wtt - wt*wt
	if den <= 0 {
		return 0
	}
	return (w*wtp - wt*wp) / den / (2 * math.Pi) * rate
}
