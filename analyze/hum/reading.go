package hum

import (
	"fmt"
	"math"
	"math/cmplx"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
	"benchslip/analyze/stage"
)

// familyOrders is how many orders a look at the kind of hum takes in.
const familyOrders = stage.MaxOrder

// reading is the mains comb of one signal.
type reading struct {
	*stage.Lines
	hz     float64 // mean mains frequency
	supply *reading
}

// read takes a signal of a role's take apart and makes sure that it can show
// the mains. A channel that the take names as its mains reference lends its
// frequency.
func read(p *analyze.Pass, role string, s *analyze.Signal, orders int) (*reading, *analyze.Refusal) {
	nominal := p.MainsHz
	if nominal == 0 {
		nominal = 50
	}
	if T := s.DurationS(); T*nominal < 10 {
		return nil, &analyze.Refusal{Code: analyze.TooShort,
			Text:   fmt.Sprintf("take %q holds %.3g periods of the mains, 10 are needed", s.Take.Name, T*nominal),
			Advice: fmt.Sprintf("record %.3g s or more", math.Max(10, 10/nominal))}
	}
	r := &reading{}
	o := stage.Options{Mains: max(orders, familyOrders)}
	if p.Wiring(s.Take).Mains != "" {
		ref, bad := p.SignalOf(s.Take, role, "mains")
		switch {
		case bad != nil && bad.Code == analyze.MissingTake && role != "take":
			// A take beside the main one may do without.
		case bad != nil:
			return nil, bad
		default:
			if l := stage.Decompose(p, ref, stage.Options{}); l.MainsFound && l.Rival == 0 {
				r.supply = &reading{Lines: l, hz: l.MainsHz}
				o.Supply = l
			}
		}
	}
	// Two supplies to choose from: the other's lines are no test tone.
	if p.MainsHz != 0 || stage.Decompose(p, s, o).Rival == 0 {
		o.Tone = testTone(p, s, o)
	}
	l := stage.Decompose(p, s, o)
	if len(l.Mains) == 0 {
		return nil, &analyze.Refusal{Code: analyze.TooShort,
			Text:   fmt.Sprintf("take %q is too short, or its rate too low, to show the mains", s.Take.Name),
			Advice: "record 10 s or more"}
	}
	if l.Rival > 0 && r.supply == nil {
		return nil, &analyze.Refusal{Code: analyze.AmbiguousTone,
			Text:   fmt.Sprintf("take %q holds hum of %.4g Hz and of %.4g Hz of like size", s.Take.Name, l.MainsHz, l.Rival),
			Advice: "state the supply with [mains] frequency"}
	}
	r.Lines = l
	r.hz, _ = frequency(l)
	return r, nil
}

// Which lines are hum and which a test tone. A line away from the comb by more
// than off Hz and by more than its frequency's own uncertainty is none of it.
// On the comb it is a tone when it stands far over all other orders together,
// or when there are none.
const (
	off     = 0.1
	company = 400 // 26 dB
)

// testTone finds what a take's tone is, nil when its strongest line is hum.
func testTone(p *analyze.Pass, s *analyze.Signal, o stage.Options) *stage.Tone {
	tone, _ := stage.FindTone(p, 0, s)
	if tone == nil || !tone.MainsResolved && p.MainsHz != 0 {
		return tone
	}
	v := stage.SurveyOf(p, s)
	// Without other orders the comb may lie anywhere in the supply's range.
	supply := p.MainsHz
	if supply == 0 {
		supply = tone.MainsHz
	}
	if l := stage.Decompose(p, s, o); l.MainsFound {
		// The strongest line may be a low order itself: so near to one no tone
		// is told from it.
		if gap, order := stage.NearMains(tone.Hz, l.MainsHz, 5); order <= 5 && gap < math.Max(2/s.DurationS(), off) {
			return nil
		}
		if p.MainsHz == 0 {
			supply = l.MainsHz
		}
	}
	gap, order := stage.NearMains(tone.Hz, supply, familyOrders)
	if order <= 5 || gap > 2*v.ToleranceHz()+0.01*tone.Hz {
		return tone
	}
	o.Tone = tone
	l := stage.Decompose(p, s, o)
	others := 0.0
	for _, q := range l.Mains {
		if q.Order%order != 0 && stage.MainsDetected(l, q, familyOrders) {
			others += q.Power
		}
	}
	top := l.Fundamental().Power
	if others == 0 || !l.MainsFound {
		// Alone and weak it is more likely the one order that shows.
		if top < 300*v.Floor[min(int(tone.Hz/v.StepHz), len(v.Floor)-1)]*v.RBW() {
			return nil
		}
		return tone
	}
	hz, u := frequency(l)
	away := math.Abs(tone.Hz - float64(order)*hz)
	if away > off && away > 5*float64(order)*u || top > company*others {
		return tone
	}
	return nil
}

// comb is a set of mains orders, summed.
type comb struct {
	stage.Power
	lines  []stage.Line
	shares []float64
	gains  []float64
	read   float64
	seen   bool
}

// sum adds the powers of one order (or of 1 .. top for order 0) under a power
// gain; within, when not nil, chooses lines.
func (r *reading) sum(order, top int, gain func(float64) float64, within func(stage.Line) bool) comb {
	var c comb
	for _, q := range r.Mains {
		if order > 0 && q.Order != order || q.Order > top || within != nil && !within(q) {
			continue
		}
		c.lines = append(c.lines, q)
	}
	v := 0.0
	for _, q := range c.lines {
		if q.Dropped {
			continue
		}
		g := 1.0
		if gain != nil {
			g = gain(q.Hz)
		}
		c.P += g * q.Power
		v += g * q.U * g * q.U
		c.read += g * (q.Power + q.Share)
		c.shares = append(c.shares, g*q.Share)
		c.gains = append(c.gains, g)
		c.seen = c.seen || stage.MainsDetected(r.Lines, q, len(c.lines))
	}
	c.U = math.Sqrt(v)
	return c
}

// bound is the RMS that the sum stays below at 95 %. Where no supply was
// found its frequency is not known either, and the largest reading of any
// within its range counts.
func (r *reading) bound(p *analyze.Pass, c comb) float64 {
	b, ok := stage.MainsBound(r.Lines, c.read, c.shares)
	if !ok {
		b = budget.SumThreshold(c.shares, stage.FalseAlarm)
	}
	if r.supply == nil {
		orders := make([]int, 0, len(c.shares))
		for _, q := range c.lines {
			if !q.Dropped {
				orders = append(orders, q.Order)
			}
		}
		b = math.Max(b, stage.BoundAnywhere(p, r.Lines, orders, c.gains))
	}
	return b
}

// between is the 95 % interval of a line's RMS, from noise alone: the powers x
// whose expected scatter (2 x s + c^2)/M just reaches the reading, two
// standard deviations away (the score interval). s is the share of a block, M
// the number of blocks; what does not grow with the power is c.
func between(l *stage.Lines, q stage.Line) (low, high float64) {
	M := float64(len(l.Blocks))
	grows := 2 * q.Share / M
	fixed := math.Max(q.U*q.U-grows*math.Max(q.Power, 0), q.Share*q.Share/M)
	half := 2 * grows
	root := math.Sqrt(half*half + 4*(fixed+grows*math.Max(q.Power, 0)))
	x := q.Power + half
	return math.Sqrt(math.Max(x-root, 0)), math.Sqrt(math.Max(x+root, 0))
}

// lineU is the expanded (k = 2) uncertainty of an order's RMS: noise, converter
// steps and the gear's calibration.
func lineU(l *stage.Lines, q stage.Line) float64 {
	rms := q.RMS()
	low, high := between(l, q)
	var b budget.Budget
	b.B("converter steps", stage.StepU(l)/math.Sqrt2)
	b.Scale(l.Sig, rms)
	return math.Hypot(math.Max(rms-low, high-rms), 2*b.U())
}

// against gives an order's phase relative to the fundamental's, in degrees,
// and how steady it is: the coherent mean of block phasors, each turned back
// by order times the fundamental's phase there, over their RMS. ok is false
// when one of the two does not stand out of a block's noise.
func (r *reading) against(q stage.Line) (deg, steady float64, ok bool) {
	first, have := r.order(1)
	if !have || q.Dropped || q.Power < 2*q.Share || first.Power < 10*first.Share || len(first.Blocks) != len(q.Blocks) {
		return 0, 0, false
	}
	sum, power := complex(0, 0), 0.0
	for m, z := range q.Blocks {
		sum += z * cmplx.Rect(1, -float64(q.Order)*cmplx.Phase(first.Blocks[m]))
		power += real(z)*real(z) + imag(z)*imag(z)
	}
	n := float64(len(q.Blocks))
	mean := cmplx.Abs(sum) / n
	return cmplx.Phase(sum) * 180 / math.Pi, math.Min(1, mean/math.Sqrt(power/n)), true
}

// order is a mains order by number.
func (r *reading) order(k int) (stage.Line, bool) {
	for _, q := range r.Mains {
		if q.Order == k {
			return q, !q.Dropped
		}
	}
	return stage.Line{}, false
}
