package oneshot

import (
	"math"
	"slices"

	"benchslip/analyze/internal/spectrum"
)

func (f find) hz() float64 { return float64(f.k) * f.look.stepK }

// power is the mean square of a steady line that would make the find.
func (f find) power() float64 { return f.ratio * f.look.floor[f.k] * 2.0044 * f.look.stepK }

// blend reports whether a find in shorter frames is no more than harmonics that
// longer ones tell apart: their beat exceeds the root of the sum of their
// powers by 6 dB at most.
func (f find) blend(harmonics []find) bool {
	sum := 0.0
	for _, h := range harmonics {
		if math.Abs(f.hz()-h.hz()) < (lobe+2)*f.look.stepK {
			sum += h.power()
		}
	}
	return f.power() < 4*sum
}

// ofComb reports whether a find is a harmonic of the signal: of the strongest
// line below it. Its neighbours on both sides, one or two orders away, are
// there then, at a like level; or it is over 30 dB weaker than the signal and
// sits on a low multiple of it. Frames too short to tell two orders apart say
// nothing; an oscillation that starts anew with every period of the signal
// shows a comb in long frames and none in its own.
func (f find) ofComb(y []float64, rate float64, looks []*look) bool {
	long := looks[len(looks)-1] // tells the signal best
	low := min(int(f.hz()/long.stepK)*3/4, len(long.mean)-1)
	base := 0
	for k := lobe; k < low; k++ {
		if long.mean[k] > long.mean[max(base, lobe)] || base == 0 {
			base = k
		}
	}
	if base == 0 {
		return false
	}
	apart := vertex(long.mean, base) * long.stepK / f.look.stepK // bins of an order
	if apart < lobe {
		return false
	}
	s := f.look.mean
	if f.at >= 0 {
		spectrum.Frames(y[f.at:], rate, spectrum.BlackmanHarris(f.look.m), f.look.m, func(_ int, own []float64) bool {
			s = slices.Clone(own)
			return false
		})
	}
	if s[f.k]*f.look.stepK > long.mean[base]*long.stepK {
		return false // stronger than the signal
	}
	k := vertex(s, f.k)
	order := k / apart
	// The signal is known to a tenth of a bin of the long frames.
	off := math.Abs(order-math.Round(order)) * apart
	if off > 0.3+0.1*order*long.stepK/f.look.stepK {
		return false
	}
	if order < 200 && s[f.k] < 1e-3*long.mean[base]*long.stepK/f.look.stepK {
		return true
	}
	for _, d := range []float64{apart, 2 * apart} {
		hit := 0
		for _, side := range []float64{-d, d} {
			n := int(math.Round(k + side))
			for i := max(n-2, 1); i <= n+2 && i < len(s); i++ {
				if s[i] > s[f.k]/16 && s[i] > 10*f.look.floor[i] {
					hit++
					break
				}
			}
		}
		if hit == 2 {
			return true
		}
	}
	return false
}

// vertex is the place of a maximum between bins: of a parabola in the
// logarithm.
func vertex(s []float64, k int) float64 {
	if k < 1 || k+1 >= len(s) || s[k-1] <= 0 || s[k] <= 0 || s[k+1] <= 0 {
		return float64(k)
	}
	a, b, c := math.Log(s[k-1]), math.Log(s[k]), math.Log(s[k+1])
	if d := a - 2*b + c; d < 0 {
		return float64(k) + math.Max(-0.5, math.Min(0.5, (a-c)/(2*d)))
	}
	return float64(k)
}
