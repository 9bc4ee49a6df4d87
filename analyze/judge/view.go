package judge

import (
	"fmt"
	"math"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
	"benchslip/analyze/slip"
	"benchslip/capture/unit"
)

// view is the unit a row is shown in, and how the result's linear values get
// there.
type view struct {
	unit unit.Unit
	// tie takes the result's linear unit to that of the view's dimension:
	// 1, or fractions of full scale a volt when volts meet a limit in dBFS.
	tie float64
}

// tied pairs dimensions that a gear's full scale ties together: volts first.
var tied = [][2]unit.Dim{{unit.Volt, unit.FullScale}, {unit.VoltPerRootHertz, unit.FullScalePerRootHertz},
	{unit.VoltPerSecond, unit.FullScalePerSecond}}

// viewOf chooses the limit's unit, or the measure's own where there are no
// limits. A limit that cannot be compared with the result comes back as the
// reason.
func viewOf(res analyze.Result, lim Limits) (view, *analyze.Refusal) {
	if !lim.limited() {
		return view{res.Unit, 1}, nil
	}
	u := lim.unit()
	if u.Dim == res.Unit.Dim {
		return view{u, 1}, nil
	}
	for _, t := range tied {
		switch {
		case u.Dim == t[1] && res.Unit.Dim == t[0] && res.FullScaleSine > 0:
			return view{u, unit.FullScaleSine / res.FullScaleSine}, nil
		case u.Dim == t[1] && res.Unit.Dim == t[0]:
			return view{u, 1}, &analyze.Refusal{Code: analyze.Uncalibrated,
				Text:   fmt.Sprintf("the take holds volts and has no digital full scale, the limit is in %s", u),
				Advice: "write the limit in " + t[0].Base().Symbol}
		case u.Dim == t[0] && res.Unit.Dim == t[1]:
			return view{u, 1}, &analyze.Refusal{Code: analyze.Uncalibrated,
				Text:   "no volts at full scale are known, " + reading(res) + fmt.Sprintf("the limit is in %s", u),
				Advice: "state full_scale_peak or full_scale_sine for the gear (benchslip calibrate finds it)"}
		}
	}
	return view{u, 1}, &analyze.Refusal{Code: analyze.Unsupported,
		Text: fmt.Sprintf("a result in %s cannot be held against a limit in %s", words(res.Unit), words(u)), Advice: "correct the limit's unit"}
}

// reading says what was read, in the result's own unit.
func reading(res analyze.Result) string {
	if res.Value == nil {
		return ""
	}
	return fmt.Sprintf("the take reads %s, ", unit.Format(res.Unit.FromLinear(*res.Value), res.Unit, 0))
}

func words(u unit.Unit) string {
	if u.Symbol == "" {
		return "plain counts"
	}
	return u.Symbol
}

// base is the view in the linear unit of the same dimension.
func (v view) base() view { return view{v.unit.Dim.Base(), v.tie} }

// number is a linear value of the result in the view's unit.
func (v view) number(x float64) float64 { return v.unit.FromLinear(x * v.tie) }

// linear is a limit in the linear unit of the result; nil for none.
func (v view) linear(q *unit.Quantity) *float64 {
	if q == nil {
		return nil
	}
	x := q.Linear() / v.tie
	return &x
}

// limits writes the limits in the view's unit, exactly as typed where that is
// their unit.
func (v view) limits(c *slip.Check, lim Limits) {
	in := func(q *unit.Quantity) *float64 {
		switch {
		case q == nil:
			return nil
		case q.Unit == v.unit:
			x := q.Number
			return &x
		}
		// A typical figure may be of another kind than a result in full scale.
		if x := v.unit.FromLinear(q.Linear()); finite(x) && q.Unit.Dim == v.unit.Dim {
			return &x
		}
		return nil
	}
	c.Unit = v.unit.Symbol
	c.Min, c.Max, c.Typical = in(lim.Min), in(lim.Max), in(lim.Typical)
	c.LimitUnit = nil
	if lim.limited() {
		u := v.unit.Symbol
		c.LimitUnit = &u
	}
}

// size is a small linear step at the value y in the view's unit: in dB by the
// slope 20/ln 10 (10/ln 10 for powers) of the relative step.
func (v view) size(step, y float64) float64 {
	if v.unit.IsLog() {
		return budget.DecibelsPer(v.unit.Dim) * step / math.Abs(y)
	}
	return v.step(step)
}

// step is a linear difference in a linear unit, whatever its zero.
func (v view) step(x float64) float64 {
	if zero := v.unit.FromLinear(0); zero != 0 && finite(zero) {
		return v.unit.FromLinear(x*v.tie) - zero
	}
	return v.unit.FromLinear(x * v.tie)
}

// Relative U: up to wide the slope will do (10 % is 0.87 dB by it, +0.83 and
// -0.92 dB in truth); from widest on a level in dB has no lower end.
const (
	wide   = 0.1
	widest = 1
)

// uncertainty is the expanded uncertainty in the view's unit and, where it is
// wide or the estimator gives a range, the ends. nil: the value has none.
func (v view) uncertainty(e estimate) (*float64, *[2]float64) {
	ranged := e.low < e.high
	if len(e.lines) == 0 && !ranged {
		return nil, nil
	}
	rel := e.U / math.Abs(e.y)
	half := v.size(e.U, e.y)
	var ends *[2]float64
	lo, hi := v.number(e.low-e.U), v.number(e.high+e.U)
	if ranged {
		// The range is the estimator's own; the uncertainty covers it and U.
		half = hi - v.number(e.y)
		if finite(lo) {
			half = math.Max(half, v.number(e.y)-lo)
		}
		if a, b := v.number(e.low), v.number(e.high); finite(a) && finite(b) {
			ends = &[2]float64{a, b}
		}
		return &half, ends
	}
	switch {
	case !(rel > wide):
	case rel < widest && finite(lo):
		ends = &[2]float64{lo, hi}
		if v.unit.IsLog() {
			half = math.Max(hi-v.number(e.y), v.number(e.y)-lo)
		}
	case v.unit.IsLog():
		half = hi - v.number(e.y)
	}
	return &half, ends
}

// sizeText prints a step: "0.12 dB", "30 mV".
func (v view) sizeText(x float64) string {
	u := v.unit
	if u.IsLog() {
		u = unit.MustLookup("dB")
	}
	return unit.Format(x, u, x)
}
