package channels

import (
	"fmt"
	"math"
	"math/cmplx"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
	"benchslip/analyze/internal/transfer"
	"benchslip/analyze/stage"
)

var balance = &analyze.Measure{
	Name:  "balance",
	Title: "difference of the gains of two channels",
	Doc: "Gain of `out` over that of `out2` at one tone that drives both, from one take; the common input cancels. The tone is found in `in` where the take has one, " +
		"else in `out`. Positive: `out` is the louder.",
	Formula:  "20 lg(|G_out| / |G_out2|)",
	Standard: "IEC 60268-3 (gain difference between channels)",
	Unit:     "dB",
	Roles:    []string{"take"},
	Keys:     []string{"at", "out2"},
	Run:      runBalance,
}

func runBalance(p *analyze.Pass) analyze.Result {
	refuse := func(bad *analyze.Refusal) analyze.Result { return analyze.RefuseWith(dB, bad) }
	out, bad := p.Signal("take", "out")
	if bad != nil {
		return refuse(bad)
	}
	out2, bad := p.Signal("take", "out2")
	if bad != nil {
		return refuse(bad)
	}
	if bad := copied(p.Take("take"), "balance", out, out2); bad != nil {
		return refuse(bad)
	}
	if bad := volts(out, out2); bad != nil {
		return refuse(bad)
	}
	if c, q, many, bad := curveAt(p, out, out2); many {
		if bad != nil {
			return refuse(bad)
		}
		return balanceAt(p, c, q)
	}
	search := out
	if p.Wired("take", "in") {
		if search, bad = p.Signal("take", "in"); bad != nil {
			return refuse(bad)
		}
	}
	b, bad := hear(p, out, out2, search)
	if bad != nil {
		return refuse(bad)
	}
	for _, l := range []*stage.Lines{b.lines1, b.lines2} {
		if bad := stage.Present(l); bad != nil {
			return refuse(bad)
		}
	}
	g := b.lines1.Phasor() / b.lines2.Phasor()
	v := cmplx.Abs(g)
	r := analyze.Result{Unit: dB, Value: &v, Details: b.details()}
	var q budget.Budget
	addPair(&q, b.lines1, b.lines2, "out", "out2", v)
	leak(&q, out, v)
	q.Into(&r)
	r.Details["phase_deg"] = cmplx.Phase(g) * 180 / math.Pi
	r.Details["out_rms_v"], r.Details["out2_rms_v"] = b.lines1.Fundamental().RMS(), b.lines2.Fundamental().RMS()
	if math.Abs(cmplx.Phase(g)) > math.Pi/2 {
		r.Notes = append(r.Notes, "the two channels are of opposite polarity")
	}
	r.Figures = append(r.Figures, stage.SpectrumFigure(p, b.lines1), stage.SpectrumFigure(p, b.lines2))
	return r
}

// leak adds that each channel holds a little of the other, of unknown phase:
// sep/v of its own in out, sep v in out2.
func leak(b *budget.Budget, out *analyze.Signal, v float64) {
	if sep := separation(out); sep > 0 {
		b.B("channel separation of the recorder", budget.ArcSine(sep*math.Hypot(1, v*v)))
	}
}

// balanceAt is balance from a stimulus of many frequencies.
func balanceAt(p *analyze.Pass, c *transfer.Curve, q transfer.Point) analyze.Result {
	r := curveResult(p, c, q, "balance_db", "balance")
	if !q.Used {
		r.Refusal = &analyze.Refusal{Code: analyze.NotEnoughPoints,
			Text:   fmt.Sprintf("take %q: %.6g Hz has no support (%s)", c.Out.Take.Name, q.Hz, q.Why),
			Advice: "raise the level, or play the stimulus longer"}
		return r
	}
	v := cmplx.Abs(q.H)
	r.Value = &v
	var b budget.Budget
	b.A("noise", q.U*v, q.Dof)
	b.B("converter steps", q.StepU*v)
	b.Ratio(c.Out, c.In, v)
	leak(&b, c.Out, v)
	b.Into(&r)
	r.Details["phase_deg"] = cmplx.Phase(q.H) * 180 / math.Pi
	return r
}
