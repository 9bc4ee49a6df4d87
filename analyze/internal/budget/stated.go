package budget

import (
	"math"

	"benchslip/analyze"
	"benchslip/capture/unit"
)

// expandedIn is the coverage factor of the uncertainties in job files.
const expandedIn = 2

// Stated adds the uncertainty of a figure from the job file, shared by all
// rows that use the key; without one the figure is taken as exact and its key
// goes to Unstated. value is the sensitivity to a relative error of it.
func (b *Budget) Stated(words string, s *analyze.Stated, value float64) {
	switch {
	case s == nil:
	case s.Uncertainty == nil:
		b.Unstated = once(b.Unstated, s.Key)
	default:
		b.Shared(words, "stated "+s.Key+" "+s.Value.String(), Relative(s.Value, *s.Uncertainty)*value)
	}
}

// InLevel adds the uncertainty of a take's stated in_level. It is needed:
// without one the key goes to Lacking. Each take has its own reading.
func (b *Budget) InLevel(t *analyze.Take, w analyze.Wiring, value float64) {
	switch {
	case w.InLevel == nil:
	case w.InUncertainty == nil:
		b.Lacking = once(b.Lacking, "takes."+t.Name+".in_uncertainty")
	default:
		b.Shared("stated level at the input", "in_level of "+t.Name, Relative(*w.InLevel, *w.InUncertainty)*value)
	}
}

// Standard turns a stated expanded uncertainty (k = 2) of a value into a
// standard one in the linear base unit of the value. It may be in dB, then
// relative (20 lg; 10 lg for watts); in the value's own unit or another of
// its dimension, then absolute; in % or ppm, then relative, but for values
// that are written in % or ppm themselves, whose own unit they are.
func Standard(value, uncertainty unit.Quantity) float64 {
	x, u := math.Abs(value.Linear()), uncertainty.Unit
	switch {
	case u.IsLog():
		return math.Abs(uncertainty.Number) / DecibelsPer(value.Unit.Dim) / expandedIn * x
	case u.Dim == unit.Ratio && !(value.Unit.Dim == unit.Ratio && isShare(value.Unit) == isShare(u)):
		return math.Abs(uncertainty.Linear()) / expandedIn * x
	}
	// The difference keeps the zero of degC out.
	return math.Abs(u.ToLinear(uncertainty.Number)-u.ToLinear(0)) / expandedIn
}

// isShare tells %, ppm from x and dB.
func isShare(u unit.Unit) bool { return !u.IsLog() && u.ToLinear(1) != 1 }

// Relative is Standard over the value; 0 for a value of 0.
func Relative(value, uncertainty unit.Quantity) float64 {
	x := math.Abs(value.Linear())
	if x == 0 {
		return 0
	}
	return Standard(value, uncertainty) / x
}

// DecibelsPer is the number of dB that a small relative change of 1 makes:
// 20/ln 10 = 8.685890 for amplitudes, 10/ln 10 for powers.
func DecibelsPer(d unit.Dim) float64 {
	if d == unit.Watt {
		return 10 / math.Ln10
	}
	return 20 / math.Ln10
}
