package calibrate

import (
	"fmt"
	"math"
	"math/cmplx"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
	"benchslip/analyze/internal/sinefit"
	"benchslip/analyze/stage"
)

// fitted is the one strong tone of a take.
type fitted struct {
	hz, rms float64
	rest    float64 // power of all but DC and the tone, over the tone's
	u       float64 // relative standard uncertainty of rms from noise and converter steps
	drift   float64 // relative difference of rms between first and second half
	onMains float64 // multiple of 50 or 60 Hz within 1 Hz, up to the fifth; 0: none
}

// fitTone fits the strongest line of a signal: a sine with DC (IEEE Std 1057,
// four parameters) in blocks of about a second and at least ten periods, each
// with its own frequency, so that wander between the player's clock and the
// recorder's costs nothing. Unlike the measures it does not refuse a tone on a
// mains line: what calibrates is strong, and hum beside it is seen in rest.
// text says why there is no tone; "" when there is.
func fitTone(p *analyze.Pass, s *analyze.Signal) (f fitted, text string) {
	x := s.All()
	if err := s.Err(); err != nil {
		return f, err.Error()
	}
	mean, power := 0.0, 0.0
	for _, v := range x {
		mean += v
	}
	mean /= float64(len(x))
	for _, v := range x {
		power += (v - mean) * (v - mean)
	}
	power /= float64(len(x))
	if power == 0 {
		return f, "every sample is the same: no signal"
	}
	peak, ok := stage.SurveyOf(p, s).StrongestIn(10, 0.45*s.RateHz, nil)
	if !ok {
		return f, "no tone stands out of the noise; check the wiring, or raise the level"
	}
	if periods := peak.Hz * s.DurationS(); periods < 5 {
		return f, fmt.Sprintf("%.2g periods of %.4g Hz are too few; record %.2g s or more", periods, peak.Hz, 10/peak.Hz)
	}
	block := int(math.Max(1, 10/peak.Hz) * s.RateHz)
	blocks := max(1, len(x)/block)
	block = len(x) / blocks
	var halves, count [2]float64
	sum := 0.0
	for b := range blocks {
		y := x[b*block : (b+1)*block]
		r, err := sinefit.Refine(y, []sinefit.Comb{{Nu: peak.Hz / s.RateHz, Orders: []float64{1}, Free: true}}, 1.5/float64(block))
		if err != nil {
			return f, err.Error()
		}
		one := cmplx.Abs(r.Z[0]) * cmplx.Abs(r.Z[0]) / 2
		sum += one
		f.hz += r.Nu[0] * s.RateHz / float64(blocks)
		half := 2 * b / blocks
		halves[half], count[half] = halves[half]+one, count[half]+1
	}
	tone := sum / float64(blocks)
	f.rms = math.Sqrt(tone)
	if tone <= 0 {
		return f, "no tone stands out of the noise; check the wiring, or raise the level"
	}
	// The blocks may leave some samples over at the end, which a steady tone
	// does not notice.
	f.rest = math.Max(0, power-tone) / tone
	// Noise of power rest over n samples: variance of an amplitude 2 sigma^2/n.
	f.u = budget.RSS(math.Sqrt(f.rest/float64(len(x))), budget.Rectangular(s.Step/4)/(math.Sqrt2*f.rms))
	if blocks > 1 {
		f.drift = math.Abs(math.Sqrt(halves[1]/count[1]*count[0]/halves[0]) - 1)
	}
	for _, supply := range []float64{50, 60} {
		if h := math.Round(f.hz / supply); h >= 1 && h <= 5 && math.Abs(f.hz-h*supply) < 1 {
			f.onMains = h * supply
		}
	}
	return f, ""
}
