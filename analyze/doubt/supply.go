package doubt

import (
	"fmt"
	"math"

	"benchslip/analyze/internal/spectrum"
	"benchslip/analyze/stage"
	"benchslip/capture/recording"
)

// A job for one supply and hum of another: the job was copied, or the take is
// not what it says.
const (
	combOrders  = 12
	leastOrders = 3   // of the other supply that must show
	stronger    = 100 // times the power of what shows of the job's (20 dB)
)

// otherSupplies are the public ones (IEC 60038), to look for beside the job's.
var otherSupplies = []float64{50, 60}

func supply(l *listening) []Finding {
	if l.MainsHz <= 0 || l.sig.DurationS()*l.MainsHz < 10 {
		return nil
	}
	tone := 0.0
	if l.driven() {
		tone = l.tone()
	}
	_, own, _ := l.comb(l.MainsHz, tone, 0)
	for _, hz := range otherSupplies {
		if math.Abs(hz/l.MainsHz-1) < 0.03 {
			continue
		}
		orders, power, at := l.comb(hz, tone, l.MainsHz)
		if orders < leastOrders || power < stronger*own || l.pair(at) || l.pure(at, power) {
			continue
		}
		return []Finding{l.found(recording.MainsUnlike, 0, l.sig.Len(),
			fmt.Sprintf("%d harmonics of %.4g Hz stand out of the noise, and little or none of the job's %.4g Hz: set [mains] frequency, or check the take", orders, at, l.MainsHz))}
	}
	return nil
}

// pure: the line at hz holds all but a ten thousandth of the comb's power. So
// clean is a test tone near the supply's frequency, not a supply.
func (l *listening) pure(hz, power float64) bool {
	tol := l.survey.ToleranceHz()
	low, ok := l.survey.StrongestIn(hz-tol-4e-4*hz, hz+tol+4e-4*hz, nil)
	return ok && power-low.Power < 1e-4*power
}

// pair: the line at hz is the low tone of a tone pair, 60 Hz of the modulation
// method of IEC 60268-3: another line that is none of its multiples stands
// between 20 dB under it and little over its own level.
func (l *listening) pair(hz float64) bool {
	v := l.survey
	tol := v.ToleranceHz()
	low, ok := v.StrongestIn(hz-tol-4e-4*hz, hz+tol+4e-4*hz, nil)
	if !ok {
		return false
	}
	_, two := v.StrongestIn(5*hz, l.sig.RateHz/2, func(q spectrum.Peak) bool {
		off := math.Abs(q.Hz - hz*math.Round(q.Hz/hz))
		return q.Power > low.Power/100 && q.Power < 1.5*low.Power && (off > tol+4e-4*q.Hz || q.Hz > combOrders*hz)
	})
	return two
}

// comb counts the peaks on multiples of a supply within 1 % of hz, those of
// the test tone and those that the supply other has as well left out; at is
// the supply's frequency.
func (l *listening) comb(hz, tone, other float64) (orders int, power, at float64) {
	v := l.survey
	tol := v.ToleranceHz()
	for k := 1; k <= 3; k++ {
		for _, p := range v.Peaks {
			base := p.Hz / float64(k)
			if math.Abs(base/hz-1) > 0.01 {
				continue
			}
			n, sum := 0, 0.0
			for o := 1; o <= combOrders; o++ {
				f := float64(o) * base
				if near, _ := stage.NearMains(f, other, combOrders); other > 0 && near < tol+0.01*f {
					continue
				}
				if tone > 0 && math.Abs(f-tone*math.Round(f/tone)) < tol+1e-3*f && f > 0.5*tone {
					continue
				}
				if q, ok := v.StrongestIn(f-tol-4e-4*f, f+tol+4e-4*f, nil); ok {
					n++
					sum += q.Power
				}
			}
			if n > orders || n == orders && sum > power {
				orders, power, at = n, sum, base
			}
		}
	}
	return orders, power, at
}
