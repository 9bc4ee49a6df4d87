package stage

import (
	"math"
	"slices"
)

// Where a supply's lines hardly stand out, each alone says little about its
// frequency; all orders together say more. For independent lines of unknown
// size in noise, the likelihood of a base frequency f grows with the sum over
// the orders of power at k f over the noise there. That sum is searched
// within what a public supply may do.
const (
	// supplyRange is how far a supply may lie from its nominal frequency
	// (EN 50160: 1 % for 99.5 % of a year).
	supplyRange = 0.01

	// searchOrders is how many orders take part: higher ones smear even within
	// a block while the frequency wanders.
	searchOrders = 20

	// mostSay bounds what one order may say, as a ratio of powers: a line that
	// happens to lie near an order must not drag the comb there against the
	// others.
	mostSay = 300
)

// settle moves the base frequency of a comb to where all orders together fit
// best. The peaks that the comb stands on hold it: within their tolerance
// when there are any, within supplyRange else. Places that skip names (the
// test tone's) and other strong peaks say nothing.
func (c *comb) settle(v *Survey, nominal float64, skip func(hz float64) bool) {
	if c.Hz <= 0 {
		return
	}
	if c.plain(v) {
		c.faint(v, skip)
		return
	}
	lo, hi := nominal*(1-supplyRange), nominal*(1+supplyRange)
	for _, k := range c.Orders {
		tol := v.ToleranceHz() / float64(k)
		lo, hi = math.Max(lo, c.Hz-tol), math.Min(hi, c.Hz+tol)
	}
	// The highest order moves by an eighth of a resolution step a try.
	step := v.StepHz / 4 / searchOrders
	best, at := math.Inf(-1), c.Hz
	for f := lo; f <= hi; f += step {
		if s := c.says(v, f, skip); s > best {
			best, at = s, f
		}
	}
	if math.IsInf(best, -1) {
		return
	}
	// The vertex of a parabola through three tries.
	l, r := c.says(v, at-step, skip), c.says(v, at+step, skip)
	if d := l - 2*best + r; d < 0 {
		at += step * math.Max(-0.5, math.Min(0.5, (l-r)/2/d))
	}
	c.Hz = at
	c.faint(v, skip)
}

// faint adds the orders that a reading at the found frequency shows, though
// none makes a peak of its own: they help to place the frequency.
func (c *comb) faint(v *Survey, skip func(hz float64) bool) {
	k := math.Max(v.Averages, 1)
	limit := 1 + 3/math.Sqrt(k) + 4/k
	for o := 1; o <= searchOrders; o++ {
		hz := float64(o) * c.Hz
		j := int(hz/v.StepHz + 0.5)
		if j < 1 || j+1 >= len(v.S) {
			return
		}
		if !skip(hz) && !slices.Contains(c.Orders, o) && v.S[j] > limit*v.Floor[j] && !v.onSkirt(hz) {
			c.Faint = append(c.Faint, o)
		}
	}
}

// plain: an order stands so far out that its peak places the comb better than
// any sum, in which it counts no more than others.
func (c *comb) plain(v *Survey) bool {
	for _, o := range c.Orders {
		hz := float64(o) * c.Hz
		tol := v.ToleranceHz() + 0.0004*hz
		if p, ok := v.StrongestIn(hz-tol, hz+tol, nil); ok && p.Power > mostSay*p.Floor*v.RBW() {
			return true
		}
	}
	return false
}

// onSkirt: a peak stands beside hz, so near that the window's lobe reaches
// there, and not at hz itself.
func (v *Survey) onSkirt(hz float64) bool {
	lobe := (v.Lobe + 1) * v.StepHz
	for _, p := range v.Peaks {
		if d := math.Abs(p.Hz - hz); d < lobe {
			return d > v.ToleranceHz()
		}
	}
	return false
}

// says is the sum over orders of power over noise at the multiples of f.
func (c *comb) says(v *Survey, f float64, skip func(hz float64) bool) float64 {
	sum := 0.0
	for k := 1; k <= searchOrders; k++ {
		hz := float64(k) * f
		i := hz / v.StepHz
		j := int(i + 0.5)
		if j < 1 || j+1 >= len(v.S) {
			break
		}
		if skip(hz) || v.Floor[j] <= 0 || v.onSkirt(hz) {
			continue
		}
		// Parabola through three bins in the logarithm, as for peaks.
		a, b, d := v.S[j-1], v.S[j], v.S[j+1]
		if a <= 0 || b <= 0 || d <= 0 {
			continue
		}
		la, lb, ld := math.Log(a), math.Log(b), math.Log(d)
		x := i - float64(j)
		s := math.Exp(lb + x*(ld-la)/2 + x*x*(la-2*lb+ld)/2)
		sum += math.Min(s/v.Floor[j], mostSay)
	}
	return sum
}
