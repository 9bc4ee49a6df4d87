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

var crosstalk = &analyze.Measure{
	Name:  "crosstalk",
	Title: "what arrives in a channel of the tone that drives another",
	Doc: "Level of the tone in `out`, a channel whose input is terminated, over its level in `driven`. Both are read by a fitted sine, so noise and hum do not count; " +
		"below the noise an upper bound stands for the value. The recorder's own separation, where stated, is part of the uncertainty. Negative is good.",
	Formula:  "20 lg(U_out / U_driven) at the tone",
	Standard: "IEC 60268-3 (crosstalk; separation is minus that)",
	Unit:     "dB",
	Roles:    []string{"take"},
	Keys:     []string{"at", "driven"},
	Run:      runCrosstalk,
}

func runCrosstalk(p *analyze.Pass) analyze.Result {
	refuse := func(bad *analyze.Refusal) analyze.Result { return analyze.RefuseWith(dB, bad) }
	out, bad := p.Signal("take", "out")
	if bad != nil {
		return refuse(bad)
	}
	driven, bad := p.Signal("take", "driven")
	if bad != nil {
		return refuse(bad)
	}
	if bad := copied(p.Take("take"), "crosstalk", out, driven); bad != nil {
		return refuse(bad)
	}
	if bad := volts(out, driven); bad != nil {
		return refuse(bad)
	}
	if c, q, many, bad := curveAt(p, out, driven); many {
		if bad != nil {
			return refuse(bad)
		}
		return crosstalkAt(p, c, q)
	}
	b, bad := hear(p, driven, out, driven)
	if bad != nil {
		return refuse(bad)
	}
	if bad := stage.Present(b.lines1); bad != nil {
		return refuse(bad)
	}
	f := b.lines2.Fundamental()
	if f == nil || math.IsInf(b.lines2.Cond, 0) {
		return refuse(stage.Present(b.lines2))
	}
	top := cmplx.Abs(b.lines1.Phasor()) / math.Sqrt2
	r := analyze.Result{Unit: dB, Details: b.details()}
	r.Figures = append(r.Figures, stage.SpectrumFigure(p, b.lines2), stage.SpectrumFigure(p, b.lines1))
	sep := separation(out)
	if stage.Present(b.lines2) != nil {
		upper, ok := budget.UpperBound(f.Whole+f.Share, f.Share, 1, 0.95)
		if !ok {
			upper = budget.ShareThreshold(f.Share, stage.FalseAlarm)
		}
		v := (upper+stage.StepU(b.lines2)/math.Sqrt2)/top + sep
		r.Bound = &analyze.Bound{Upper: true, Value: v}
		r.Refusal = &analyze.Refusal{Code: analyze.BelowDetection,
			Text:   fmt.Sprintf("take %q: what arrives in channel %d at %.6g Hz does not stand out of the noise", out.Take.Name, out.Channel(), b.tone.Hz),
			Advice: fmt.Sprintf("drive harder, or record longer: %.3g s halve the bound", 4*out.DurationS())}
		r.Details["upper_bound"] = dB.FromLinear(v)
		return r
	}
	// The line's power with its noise share off.
	v := math.Sqrt(math.Max(f.Whole, 0.1*f.Share)) / top
	r.Value = &v
	var q budget.Budget
	addPair(&q, b.lines2, b.lines1, "out", "driven", v)
	own(&r, &q, sep)
	q.Into(&r)
	r.Details["phase_deg"] = cmplx.Phase(b.lines2.Phasor()/b.lines1.Phasor()) * 180 / math.Pi
	r.Details["out_rms_v"] = v * top
	return r
}

// own adds the recorder's own separation: a vector of unknown phase.
func own(r *analyze.Result, b *budget.Budget, sep float64) {
	if sep == 0 {
		r.Notes = append(r.Notes, "no `separation` is stated for the recorder: its own crosstalk is in the reading")
		return
	}
	r.Details["recorder_separation_db"] = -dB.FromLinear(sep)
	b.B("channel separation of the recorder", budget.ArcSine(sep))
	if *r.Value < 2*sep {
		r.Conditional = "the recorder's own separation is no better than this reading"
	}
}

// crosstalkAt is crosstalk from a stimulus of many frequencies.
func crosstalkAt(p *analyze.Pass, c *transfer.Curve, q transfer.Point) analyze.Result {
	r := curveResult(p, c, q, "crosstalk_db", "crosstalk")
	sep := separation(c.Out)
	if !q.Used {
		r.Refusal = &analyze.Refusal{Code: analyze.NotEnoughPoints,
			Text:   fmt.Sprintf("take %q: %.6g Hz has no support (%s)", c.Out.Take.Name, q.Hz, q.Why),
			Advice: "drive harder, or play the stimulus longer"}
		if q.Share > 0 && q.H != 0 {
			upper, ok := budget.UpperBound(real(q.H*cmplx.Conj(q.H)), q.Share, 1, 0.95)
			if !ok {
				upper = budget.ShareThreshold(q.Share, stage.FalseAlarm)
			}
			r.Refusal.Code = analyze.BelowDetection
			r.Bound = &analyze.Bound{Upper: true, Value: upper + sep}
			r.Details["upper_bound"] = dB.FromLinear(upper + sep)
		}
		return r
	}
	v := cmplx.Abs(q.H)
	r.Value = &v
	var b budget.Budget
	b.A("noise", q.U*v, q.Dof)
	b.B("converter steps", q.StepU*v)
	b.Ratio(c.Out, c.In, v)
	own(&r, &b, sep)
	b.Into(&r)
	return r
}
