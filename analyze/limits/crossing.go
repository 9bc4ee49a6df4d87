package limits

import (
	"math"

	"benchslip/analyze/internal/budget"
	"benchslip/analyze/stage"
)

// crossing is where THD+N reaches the limit, between two neighbouring points.
type crossing struct {
	rms       float64
	low, high point
	share     float64 // of ln(high/low) from low on
	byLow     float64 // d ln rms / d ln thdn of each
	byHigh    float64
	spread    float64 // relative half width of what the course between may do
}

// crossing finds the lowest level at which THD+N rises through the limit:
// straight between neighbours in lg THD+N over lg output.
func (g gathered) crossing(limit float64) (crossing, bool) {
	for i := 1; i < len(g.points); i++ {
		a, b := g.points[i-1], g.points[i]
		if a.thdn >= limit || b.thdn < limit || a.thdn <= 0 {
			continue
		}
		dx, dy := math.Log(b.rms/a.rms), math.Log(b.thdn/a.thdn)
		t := math.Log(limit/a.thdn) / dy
		c := crossing{rms: a.rms * math.Exp(t*dx), low: a, high: b, share: t, byLow: -dx * (1 - t) / dy, byHigh: -dx * t / dy}
		c.spread = 2 * math.Abs(g.curved(i, t)-t) * dx
		if f, ok := stage.FlatsOf(b.heard); ok && f.Any() {
			c.spread = math.Max(c.spread, math.Abs(math.Log(hardClip(b, limit)/c.rms)))
		}
		c.spread = math.Min(c.spread, dx)
		return c, true
	}
	return crossing{}, false
}

// curved is the share of the way from point i-1 to point i at which a monotone
// cubic (Fritsch and Carlson 1980) through the neighbours too has the height
// that the straight line has at share t. Slopes are in units of the chord's.
func (g gathered) curved(i int, t float64) float64 {
	slope := func(k int) (float64, bool) { // of the chord from point k to k+1
		if k < 0 || k+1 >= len(g.points) {
			return 0, false
		}
		p, q := g.points[k], g.points[k+1]
		x := math.Log(q.rms / p.rms)
		if x <= 0 || p.thdn <= 0 || q.thdn <= 0 {
			return 0, false
		}
		return math.Log(q.thdn/p.thdn) / x, true
	}
	chord, ok := slope(i - 1)
	if !ok {
		return t
	}
	// Harmonic mean of the chords on both sides; half the chord where there is
	// no neighbour to tell.
	end := func(k int) float64 {
		s, ok := slope(k)
		switch {
		case !ok:
			return 0.5
		case s*chord <= 0:
			return 0
		}
		s /= chord
		return 2 * s / (1 + s)
	}
	m0, m1 := end(i-2), end(i)
	height := func(u float64) float64 { return u * (m0 + u*(3-2*m0-m1+u*(m0+m1-2))) }
	lo, hi := 0.0, 1.0
	for range 50 {
		if u := (lo + hi) / 2; height(u) < t {
			lo = u
		} else {
			hi = u
		}
	}
	return (lo + hi) / 2
}

// budget of a result proportional to the power-th power of the output.
func (c crossing) budget(value, power float64) budget.Budget {
	var b budget.Budget
	v := value * power
	b.A("noise in the level", v*math.Hypot((1-c.share)*c.low.rmsU, c.share*c.high.rmsU), 0)
	b.A("noise in THD+N", v*math.Hypot(c.byLow*c.low.thdnU/c.low.thdn, c.byHigh*c.high.thdnU/c.high.thdn), 0)
	b.B("course between the levels", budget.Rectangular(c.spread)*v)
	b.Scale(c.low.heard.Out, v*(1-c.share))
	b.Scale(c.high.heard.Out, v*c.share)
	return b
}
