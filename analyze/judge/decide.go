package judge

import (
	"math"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
	"benchslip/analyze/slip"
)

// estimate is a value ready to be judged, linear throughout.
type estimate struct {
	y         float64 // the value
	low, high float64 // range that the estimator itself leaves open; y, y for none
	U, k      float64 // expanded uncertainty and its factor
	u, nu     float64 // standard uncertainty, effective degrees of freedom
	lines     []analyze.Contributor
	min, max  *float64 // limits
}

// guard is what rounding may do to a comparison: 32 units in the last place
// of the largest number in it. A limit of 120 dB loses up to 14 on its way
// through the power of ten.
const guard = 0x1p-47

// above and below compare with a limit; equal, up to rounding, is neither.
func (e estimate) above(x float64, limit *float64) bool {
	return limit != nil && x > *limit+e.slack(*limit)
}

func (e estimate) below(x float64, limit *float64) bool {
	return limit != nil && x < *limit-e.slack(*limit)
}

func (e estimate) slack(limit float64) float64 {
	return guard * math.Max(math.Max(math.Abs(e.y), math.Abs(limit)), e.U)
}

// inside reports whether x meets the limits, themselves included.
func (e estimate) inside(x float64) bool { return !e.above(x, e.max) && !e.below(x, e.min) }

// verdict of a value y +- U under a decision rule. Every boundary belongs to
// the state nearer pass:
//
//	pass              y + U <= max
//	conditional pass  max - U < y <= max
//	conditional fail  max < y <= max + U
//	fail              y - U > max
//
// mirrored for min, the worse of both for two limits. A range counts with both
// ends: it passes when all of it does and fails when all of it does.
func (e estimate) verdict(decision string) string {
	passes := !e.above(e.high+e.U, e.max) && !e.below(e.low-e.U, e.min)
	fails := e.above(e.low-e.U, e.max) || e.below(e.high+e.U, e.min)
	in := e.inside(e.y)
	switch decision {
	case Simple:
		return either(in, slip.Pass, slip.Fail)
	case Guarded:
		return either(passes, slip.Pass, slip.Fail)
	}
	switch {
	case passes:
		return slip.Pass
	case fails:
		return slip.Fail
	}
	return either(in, slip.ConditionalPass, slip.ConditionalFail)
}

func either(yes bool, a, b string) string {
	if yes {
		return a
	}
	return b
}

// tooWide reports whether no value could pass: the window is narrower than
// the whole uncertainty.
func (e estimate) tooWide() bool {
	if e.min == nil || e.max == nil {
		return false
	}
	return 2*e.U+e.high-e.low > *e.max-*e.min+e.slack(*e.max)
}

// probability that the quantity conforms (JCGM 106 clause 7): the law of the
// value, normal or Student's by its degrees of freedom, between the limits.
// Over a range, taken as equally likely throughout, its mean.
func (e estimate) probability() float64 {
	if e.u == 0 && e.low == e.high { // certain, limits included
		if e.inside(e.y) {
			return 1
		}
		return 0
	}
	p := 1.0
	if e.max != nil {
		p = e.under(*e.max)
	}
	if e.min != nil {
		p -= e.under(*e.min)
	}
	return math.Min(1, math.Max(0, p))
}

// under is the probability that the quantity lies below a limit.
func (e estimate) under(limit float64) float64 {
	width := e.high - e.low
	if width <= 1e-6*e.u {
		return budget.Conforming((limit-e.y)/e.u, e.nu)
	}
	if e.u < 1e-9*width {
		return math.Min(1, math.Max(0, (limit-e.low)/width))
	}
	// The integral of Phi is z Phi(z) + phi(z).
	g := func(z float64) float64 {
		return z*budget.Conforming(z, math.Inf(1)) + math.Exp(-z*z/2)/math.Sqrt(2*math.Pi)
	}
	return e.u / width * (g((limit-e.low)/e.u) - g((limit-e.high)/e.u))
}

// margin is the distance to the nearer limit in the row's unit, positive
// inside, without guard band; exactly 0 on a limit.
func (r *row) margin(e estimate) float64 {
	m := math.Inf(1)
	if r.Min != nil {
		m = math.Min(m, *r.Value-*r.Min)
	}
	if r.Max != nil {
		m = math.Min(m, *r.Max-*r.Value)
	}
	for _, l := range []*float64{e.min, e.max} {
		if l != nil && e.inside(e.y) && !e.above(e.y, l) && !e.below(e.y, l) {
			return 0
		}
	}
	return m
}

// judgeBound judges "below b" or "above b": pass or fail when the bound lies
// wholly on one side of every limit, else not measurable. What has a bound is
// a magnitude, so "below b" reaches down to 0 and no further.
func judgeBound(b *analyze.Bound, min, max *float64) string {
	e := estimate{y: b.Value, min: min, max: max}
	if b.Upper {
		switch {
		case e.below(b.Value, min):
			return slip.Fail
		case !e.above(b.Value, max) && (min == nil || *min <= 0):
			return slip.Pass
		}
		return slip.NotMeasurable
	}
	switch {
	case e.above(b.Value, max):
		return slip.Fail
	case max == nil && !e.below(b.Value, min):
		return slip.Pass
	}
	return slip.NotMeasurable
}
