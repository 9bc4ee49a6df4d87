package judge

import (
	"fmt"
	"math"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
	"benchslip/capture/unit"
)

// AgainstUnit is the unit of a measure relative to the same measure of another
// take: dB for levels and ratios, its own unit for what is compared by
// subtraction (dc, frequencies, times, phases, resistances, counts).
func AgainstUnit(measure string, own unit.Unit) unit.Unit {
	switch {
	case !subtracts(measure, own.Dim):
		return unit.MustLookup("dB")
	case own.IsLog():
		return own.Dim.Base()
	}
	return own
}

func subtracts(measure string, d unit.Dim) bool {
	switch d {
	case unit.Hertz, unit.Second, unit.Degree, unit.Ohm, unit.None:
		return true
	}
	return measure == "dc"
}

// Against is a result relative to that of another take, names in the same
// order: a quotient shown in dB, or a difference (see AgainstUnit). Errors
// that both share, such as the calibration of one gear, cancel by their
// signs. A bound on one side and a value on the other give a bound.
func Against(measure string, names [2]string, a, b analyze.Result) analyze.Result {
	u := AgainstUnit(measure, a.Unit)
	if a.Unit.Dim != b.Unit.Dim && a.Refusal == nil && b.Refusal == nil {
		return analyze.RefuseWith(u, unlike(names[0], names[1]))
	}
	out := joined(names[:], []analyze.Result{a, b})
	out.Unit, out.FullScaleSine = u, 0
	var compare func(a, b cell) cell
	if subtracts(measure, a.Unit.Dim) {
		compare = func(a, b cell) cell { return difference(a, b, names, u.Dim == unit.Degree) }
	} else {
		// 20 lg of the square root is 10 lg of a quotient of powers.
		p := 1.0
		if a.Unit.Dim == unit.Watt {
			p = 0.5
		}
		compare = func(a, b cell) cell { return quotient(a, b, names, p) }
		// One calibration that nobody stated cancels when both sides lack it.
		out.Lacking = notShared(a.Lacking, b.Lacking)
	}
	compare(cellOf(a), cellOf(b)).into(&out)
	for i, p := range a.Points {
		if p.Limit != nil { // in the measure's own unit, which a quotient has left
			break
		}
		if len(b.Points) != len(a.Points) || b.Points[i].Label != p.Label {
			out.Points = nil
			break
		}
		q := b.Points[i]
		c := compare(cell{p.Value, p.Budget, nil, p.Bound, p.Refusal}, cell{q.Value, q.Budget, nil, q.Bound, q.Refusal})
		out.Points = append(out.Points, analyze.Point{Label: p.Label, Value: c.value, Budget: c.budget, Bound: c.bound, Refusal: c.refusal})
	}
	if out.Points != nil { // the row's own value is the smallest of the new points
		out.Value, out.Budget, out.Interval, out.Bound, out.Refusal = nil, nil, nil, nil, nil
	}
	out.Details["against"] = sides(a, b, names)
	out.Notes = append(out.Notes, fmt.Sprintf("take %q relative to take %q", names[0], names[1]))
	return out
}

// sides keeps both values in the measure's own unit.
func sides(a, b analyze.Result, names [2]string) map[string]any {
	d := map[string]any{"take": names[1], "unit": a.Unit.Symbol}
	put := func(key string, r analyze.Result) {
		if r.Value != nil && finite(a.Unit.FromLinear(*r.Value)) {
			d[key] = a.Unit.FromLinear(*r.Value)
		}
	}
	put("value", a)
	put("reference", b)
	return d
}

// notShared returns the keys that only one side lacks.
func notShared(a, b []string) []string {
	var out []string
	for i, list := range [2][]string{a, b} {
		other := [2][]string{b, a}[i]
		for _, k := range list {
			if len(once(other[:len(other):len(other)], k)) > len(other) {
				out = append(out, k)
			}
		}
	}
	return out
}

// whyNot is the refusal of the side without a value.
func whyNot(a, b cell, names [2]string) *analyze.Refusal {
	if a.value == nil {
		return because(names[0], a.refusal)
	}
	return because(names[1], b.refusal)
}

// difference is a - b; phases are taken into (-180, 180] degrees.
func difference(a, b cell, names [2]string, wraps bool) cell {
	if a.value == nil || b.value == nil {
		out := cell{refusal: whyNot(a, b, names)}
		switch {
		case a.value == nil && a.bound != nil && b.value != nil:
			lo, hi := reach(b)
			out.bound = side(a.bound.Upper, a.bound.Value-lo, a.bound.Value-hi)
		case b.value == nil && b.bound != nil && a.value != nil:
			lo, hi := reach(a)
			out.bound = side(!b.bound.Upper, hi-b.bound.Value, lo-b.bound.Value)
		}
		return out
	}
	d := *a.value - *b.value
	shift := 0.0
	if wraps {
		shift = -360 * math.Ceil((d-180)/360)
	}
	d += shift
	out := cell{value: &d, budget: budget.Difference(a.budget, b.budget, 1, 1)}
	if a.interval != nil || b.interval != nil {
		aLo, aHi := ends(a)
		bLo, bHi := ends(b)
		out.interval = &[2]float64{aLo - bHi + shift, aHi - bLo + shift}
	}
	return out
}

// side is a bound with the value that fits its kind.
func side(upper bool, ifUpper, ifLower float64) *analyze.Bound {
	if upper {
		return &analyze.Bound{Upper: true, Value: ifUpper}
	}
	return &analyze.Bound{Value: ifLower}
}

// quotient is (a/b)^p for magnitudes.
func quotient(a, b cell, names [2]string, p float64) cell {
	pow := func(x float64) float64 {
		if p == 1 {
			return x
		}
		return math.Pow(x, p)
	}
	if a.value == nil || b.value == nil {
		out := cell{refusal: whyNot(a, b, names)}
		switch {
		case a.value == nil && a.bound != nil && b.value != nil:
			if lo, hi := reach(b); lo > 0 && a.bound.Upper {
				out.bound = &analyze.Bound{Upper: true, Value: pow(a.bound.Value / lo)}
			} else if hi > 0 && !a.bound.Upper {
				out.bound = &analyze.Bound{Value: pow(a.bound.Value / hi)}
			}
		case b.value == nil && b.bound != nil && b.bound.Value > 0 && a.value != nil:
			if lo, hi := reach(a); lo > 0 && b.bound.Upper {
				out.bound = &analyze.Bound{Value: pow(lo / b.bound.Value)}
			} else if hi > 0 && !b.bound.Upper {
				out.bound = &analyze.Bound{Upper: true, Value: pow(hi / b.bound.Value)}
			}
		}
		return out
	}
	if *a.value <= 0 || *b.value <= 0 {
		return cell{refusal: &analyze.Refusal{Code: analyze.NotApplicable,
			Text:   fmt.Sprintf("takes %q and %q cannot be compared in dB: a value is not above zero", names[0], names[1]),
			Advice: "set limits on each take instead"}}
	}
	q := pow(*a.value / *b.value)
	out := cell{value: &q, budget: budget.Difference(a.budget, b.budget, p*q / *a.value, p*q / *b.value)}
	if a.interval != nil || b.interval != nil {
		aLo, aHi := ends(a)
		bLo, bHi := ends(b)
		if bLo > 0 && aLo >= 0 {
			out.interval = &[2]float64{pow(aLo / bHi), pow(aHi / bLo)}
		} else {
			// Without an upper end nothing can be said but the lower one.
			out = cell{refusal: &analyze.Refusal{Code: analyze.FloorLimited,
				Text: fmt.Sprintf("take %q may be as small as zero, so that nothing limits the quotient", names[1]), Advice: rangeAdvice("")}}
		}
	}
	return out
}
