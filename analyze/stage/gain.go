package stage

import (
	"fmt"
	"math"
	"math/cmplx"
	"slices"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
)

// Gain is a unit's gain with its budget, linear.
type Gain struct {
	G      float64
	Budget budget.Budget // lines scaled to G
	// Cancels: the gear's scale that a voltage read with the same gear carries
	// cancels when it is referred to the input, because the gain was found
	// against a stated input level.
	Cancels bool
	Stated  bool // typed in the job, not measured
	Phasor  complex128
}

// GainOfHeard measures the gain of a take whose tone was found.
func GainOfHeard(p *analyze.Pass, t *analyze.Take, h *Heard, s Stimulus) (Gain, *analyze.Refusal) {
	var g Gain
	b := &g.Budget
	z := h.Lo.Phasor()
	if s.Lines != nil {
		if (s.Lines.Sig.Unit == "V") != (h.Out.Unit == "V") {
			return g, &analyze.Refusal{Code: analyze.Uncalibrated, Text: "one of the two channels has no volts at full scale", Advice: "state full_scale_peak for both"}
		}
		g.G = cmplx.Abs(z) / cmplx.Abs(s.Z)
		g.Phasor = z / s.Z
		AddTone(b, h.Lo, "out", g.G)
		AddTone(b, s.Lines, "in", g.G)
		b.Ratio(h.Out, s.Lines.Sig, g.G)
		Separation(b, h.Lo, s.Lines, g.G)
		return g, nil
	}
	g.G = cmplx.Abs(z) / math.Sqrt2 / s.Level
	g.Cancels = true
	AddTone(b, h.Lo, "out", g.G)
	b.Scale(h.Out, g.G)
	b.InLevel(t, p.Wiring(t), g.G)
	return g, nil
}

// Separation adds what two channels of one recorder leak into each other, by
// the gear's stated separation: a vector of unknown phase in each, the other
// channel's tone times 10^(-separation/20), whose part along the reading is
// arcsine-distributed. value is the sensitivity to a relative error.
func Separation(b *budget.Budget, over, under *Lines, value float64) {
	if over.Sig.Take != under.Sig.Take || over.Sig.Gear.Separation == 0 {
		return
	}
	leak := budget.ArcSine(math.Pow(10, -over.Sig.Gear.Separation/20))
	ratio := cmplx.Abs(over.Phasor()) / cmplx.Abs(under.Phasor())
	b.B("channel separation, into out", leak/ratio*value)
	b.B("channel separation, into in", leak*ratio*value)
}

// InputGain is the gain that refers a voltage to the unit's input: `gain`
// stated in the job, or measured from the take of role "gain_take". ok is
// false when the check names neither.
func InputGain(p *analyze.Pass) (g Gain, ok bool, bad *analyze.Refusal) {
	if k := p.Params.Gain; k != nil {
		g.G = math.Abs(k.Value.Linear())
		g.Stated = true
		g.Budget.Stated("stated gain", k, g.G)
		return g, true, nil
	}
	if !p.Has("gain_take") {
		return Gain{G: 1}, false, nil
	}
	t := p.Take("gain_take")
	h, bad := ListenTo(p, t, "gain_take", 0)
	if bad != nil {
		return g, true, bad
	}
	s, bad := input(p, t, h)
	if bad != nil {
		return g, true, bad
	}
	g, bad = GainOfHeard(p, t, h, s)
	return g, true, bad
}

// Refer turns a voltage with its budget to the input: value over gain. It
// returns the budget for the quotient, with the gear's scale counted once, or
// not at all when the gain cancels it.
func Refer(v float64, own budget.Budget, sig *analyze.Signal, g Gain) (float64, budget.Budget) {
	q := v / g.G
	var b budget.Budget
	b.Unstated = append(append(b.Unstated, own.Unstated...), g.Budget.Unstated...)
	lines := budget.Difference(own.Lines, g.Budget.Lines, 1/g.G, q/g.G)
	b.Lines = lines
	b.Lacking = Lacking(own.Lacking, g)
	return q, b
}

// Lacking joins what two budgets lack; a gear's scale that both lack and that
// cancels in the quotient is not needed.
func Lacking(own []string, g Gain) []string {
	var out []string
	for _, k := range own {
		if !g.Cancels || !slices.Contains(g.Budget.Lacking, k) {
			out = append(out, k)
		}
	}
	for _, k := range g.Budget.Lacking {
		if g.Cancels && slices.Contains(own, k) || slices.Contains(out, k) {
			continue
		}
		out = append(out, k)
	}
	return out
}

// SameGain refuses takes whose stated gain settings differ.
func SameGain(a, b *analyze.Take) *analyze.Refusal {
	x, okA := a.Condition("gain")
	y, okB := b.Condition("gain")
	if okA && okB && x != y {
		return &analyze.Refusal{Code: analyze.NotApplicable,
			Text:   fmt.Sprintf("take %q was made at gain %s, take %q at %s", a.Name, x, b.Name, y),
			Advice: "record both at one gain setting"}
	}
	return nil
}
