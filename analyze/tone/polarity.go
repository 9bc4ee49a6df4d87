package tone

import (
	"fmt"
	"math"
	"math/cmplx"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
	"benchslip/analyze/internal/transfer"
)

var polarity = &analyze.Measure{
	Name:  "polarity",
	Title: "whether the output follows (+1) or inverts (-1) the input",
	Doc: "From the phase of a single tone: +1 when cos(phase) > 0.5, -1 when it is below -0.5, else it cannot be told from this tone. From pulses, sweeps, noise and tones " +
		"of many frequencies: the sign of the largest value of the band-limited impulse response, whatever its delay. No uncertainty band.",
	Formula:  "sign(cos arg(U_out/U_in));  sign of h(t) where |h| is largest",
	Standard: "common practice",
	Unit:     "",
	Roles:    []string{"take"},
	Keys:     []string{"at"},
	Run:      runPolarity,
}

func runPolarity(p *analyze.Pass) analyze.Result {
	if wide, bad := fillsBand(p); bad != nil {
		return analyze.RefuseWith(count, bad)
	} else if wide {
		return fromImpulse(p)
	}
	h, bad := phased(p)
	if bad != nil {
		return analyze.RefuseWith(count, bad)
	}
	ph := cmplx.Phase(h.Lo.Phasor() / h.Li.Phasor())
	v, bad := signOf(ph, h.Tone.Hz)
	if bad != nil {
		return analyze.RefuseWith(count, bad)
	}
	r := analyze.Result{Value: &v, Unit: count}
	finish(&r, &budget.Budget{}, p, h)
	r.Details["phase_deg"] = ph * 180 / math.Pi
	return r
}

// signOf is the polarity that a phase tells, rad.
func signOf(phase, hz float64) (float64, *analyze.Refusal) {
	c := math.Cos(phase)
	if math.Abs(c) <= 0.5 {
		return 0, &analyze.Refusal{Code: analyze.NotEnoughPoints,
			Text:   fmt.Sprintf("the output is %.1f deg from the input at %.6g Hz: neither in phase nor inverted", phase*180/math.Pi, hz),
			Advice: "use a lower or middle frequency, or the pulse stimulus"}
	}
	return math.Copysign(1, c), nil
}

// fillsBand reports whether the stimulus of the take holds many frequencies.
func fillsBand(p *analyze.Pass) (bool, *analyze.Refusal) {
	t := p.Take("take")
	if t == nil || t.Fault != nil {
		_, bad := p.Signal("take", "out")
		return false, bad
	}
	if p.Wiring(t).In == "" {
		return t.Stimulus != "", nil
	}
	in, bad := p.Signal("take", "in")
	if bad != nil {
		return false, bad
	}
	switch transfer.ShapeOf(p, in).Kind {
	case "", transfer.Tone:
		return false, nil
	case transfer.Multitone: // one of its tones can be asked for
		return len(p.Params.At) == 0, nil
	}
	return true, nil
}

// fromImpulse is the polarity of the impulse response, or, with `at` stated,
// of the response at that frequency.
func fromImpulse(p *analyze.Pass) analyze.Result {
	c, bad := transfer.Of(p, p.Take("take"), "take")
	if bad != nil {
		return analyze.RefuseWith(count, bad)
	}
	r := analyze.Result{Unit: count, Details: map[string]any{"stimulus": c.Kind, "delay_s": c.DelayS}}
	if len(p.Params.At) > 0 && !c.Stated {
		q, bad := c.At(p.Params.At[0])
		if bad == nil && !q.Used {
			bad = &analyze.Refusal{Code: analyze.NotEnoughPoints, Text: fmt.Sprintf("%.6g Hz has no support (%s)", q.Hz, q.Why), Advice: "raise the level"}
		}
		if bad != nil {
			return analyze.RefuseWith(count, bad)
		}
		v, bad := signOf(cmplx.Phase(q.H), q.Hz)
		if bad != nil {
			return analyze.RefuseWith(count, bad)
		}
		r.Value = &v
		r.Details["phase_deg"] = cmplx.Phase(q.H) * 180 / math.Pi
		return r
	}
	if c.Impulse.Sign == 0 {
		return analyze.Refuse(count, analyze.NotEnoughPoints,
			fmt.Sprintf("take %q: the %s holds too few frequencies that count for an impulse response", c.Out.Take.Name, c.Kind), "play a sweep or the pulse stimulus")
	}
	v := c.Impulse.Sign
	r.Value = &v
	r.Details["peak_s"], r.Details["opposite_peak"] = c.Impulse.AtS, c.Impulse.Next
	r.Notes = append(r.Notes, fmt.Sprintf("the largest value of the impulse response stands %.3g times over the largest of the other sign", 1/math.Max(c.Impulse.Next, 1e-3)))
	return r
}
