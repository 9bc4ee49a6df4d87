package stage

import (
	"math"

	"benchslip/analyze"
)

// MaxOrder is the highest mains harmonic fitted by default.
const MaxOrder = 40

// minMainsPeriods is how many periods of the mains a signal must hold before
// lines can be told from it.
const minMainsPeriods = 10

// comb is a first guess of the mains in a signal.
type comb struct {
	Hz     float64 // base frequency; 0: none resolvable
	Orders []int   // orders with a peak of their own in the survey
	Faint  []int   // others that show at the base frequency
	Score  float64 // sum over them of dB above the floor, 40 dB at most each
	Power  float64 // V^2 of those orders
	Rival  *comb   // a second supply found within 6 dB
}

// nominals are the supplies tried when the job does not say one.
var nominals = []float64{50, 60, 50.0 / 3, 400}

// findComb looks for the mains comb among the peaks of a survey, within 1 %
// of the nominal frequency, leaving out the peaks that skip names (the test
// tone and its harmonics). Without any peak the nominal frequency stands.
func findComb(v *Survey, nominalHz, durationS float64, skip func(hz float64) bool) comb {
	tries := nominals
	if nominalHz > 0 {
		tries = []float64{nominalHz}
	}
	var best comb
	for i, f := range tries {
		if durationS*f < minMainsPeriods {
			continue
		}
		c := combNear(v, f, skip)
		switch {
		case best.Hz == 0:
			best = c
		case nominalHz == 0 && i == 1 && c.Score > 0 && best.Score > 0 && c.Power > best.Power/4 && c.Power < best.Power*4 && !related(c, best):
			rival := best
			if c.Score > best.Score {
				best = c
			} else {
				rival = c
			}
			best.Rival = &rival
		case c.Score > best.Score && i < 2:
			best = c
		case i >= 2 && c.credible(3) && c.covers(best):
			best = c
		}
	}
	if nominalHz > 0 || len(best.Orders) > 0 {
		nominal := nearest(tries, best.Hz)
		best.settle(v, nominal, skip)
		if best.Hz > 0 && len(best.Orders)+len(best.Faint) == 0 {
			best.Hz = nominal // nothing shows: no better guess
		}
	}
	return best
}

// nearest is the entry of list that hz lies closest to.
func nearest(list []float64, hz float64) float64 {
	out := list[0]
	for _, f := range list {
		if math.Abs(f-hz) < math.Abs(out-hz) {
			out = f
		}
	}
	return out
}

// credible: enough orders stand out, a low one among them, to take the comb
// for a supply rather than for one chance line.
func (c comb) credible(orders int) bool {
	low := false
	for _, o := range c.Orders {
		low = low || o <= 2
	}
	return len(c.Orders) >= orders && low
}

// covers: every line of the other comb is one of c's too, so that c explains
// it: 50 Hz as order 3 of 16.7 Hz, 400 Hz as order 8 of 50 Hz.
func (c comb) covers(other comb) bool {
	for _, o := range other.Orders {
		hz := float64(o) * other.Hz
		if d, _ := NearMains(hz, c.Hz, MaxOrder); d > 1 {
			return false
		}
	}
	return true
}

// related: both combs live on the same peaks (300 Hz is 6 x 50 and 5 x 60).
func related(a, b comb) bool {
	shared := 0
	for _, o := range a.Orders {
		for _, q := range b.Orders {
			if math.Abs(float64(o)*a.Hz-float64(q)*b.Hz) < 1 {
				shared++
			}
		}
	}
	return shared >= min(len(a.Orders), len(b.Orders))
}

func combNear(v *Survey, nominal float64, skip func(float64) bool) comb {
	best := comb{Hz: nominal}
	tol := v.ToleranceHz()
	for _, p := range v.Peaks {
		k := math.Round(p.Hz / nominal)
		if k < 1 || k > 12 || skip(p.Hz) || math.Abs(p.Hz/k-nominal) > 0.01*nominal+tol/k {
			continue
		}
		c := score(v, p.Hz/k, skip)
		c.Score -= k / 5 // low orders make the surer guess
		if c.Score > best.Score {
			best = c
		}
	}
	return best
}

// score matches the survey's peaks against a comb at hz.
func score(v *Survey, hz float64, skip func(float64) bool) comb {
	c := comb{Hz: hz}
	tol := v.ToleranceHz()
	seen := map[int]bool{}
	sum, weight := 0.0, 0.0
	for _, p := range v.Peaks {
		k := int(math.Round(p.Hz / hz))
		if k < 1 || k > MaxOrder || seen[k] || skip(p.Hz) {
			continue
		}
		if math.Abs(p.Hz-float64(k)*hz) > tol+0.0004*p.Hz {
			continue
		}
		seen[k] = true
		c.Orders = append(c.Orders, k)
		c.Power += p.Power
		if p.Floor > 0 {
			c.Score += math.Min(10*math.Log10(1+p.Power/(p.Floor*v.RBW())), 40)
		} else {
			c.Score += 40
		}
		w := p.Power * float64(k*k)
		sum += w * p.Hz / float64(k)
		weight += w
	}
	if weight > 0 {
		c.Hz = sum / weight
	}
	return c
}

// NearMains is the distance in Hz from hz to the nearest mains line of order
// 1..limit and that order; +Inf when the signal cannot resolve mains.
func NearMains(hz, mainsHz float64, limit int) (distance float64, order int) {
	if mainsHz <= 0 {
		return math.Inf(1), 0
	}
	k := math.Round(hz / mainsHz)
	k = math.Max(1, math.Min(k, float64(limit)))
	return math.Abs(hz - k*mainsHz), int(k)
}

// MainsNominal is the job's mains frequency, 0 to find it.
func mainsNominal(p *analyze.Pass) float64 { return p.MainsHz }
