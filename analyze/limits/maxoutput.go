package limits

import (
	"fmt"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
	"benchslip/analyze/stage"
	"benchslip/capture/unit"
)

// thdnOr is the limit of THD+N, a fraction.
func thdnOr(p *analyze.Params) float64 {
	if p.THDN != nil {
		return *p.THDN
	}
	return 0.01
}

var maxOutput = &analyze.Measure{
	Name:  "max_output",
	Title: "largest output at a stated distortion",
	Doc: "RMS of everything in the band at which THD+N reaches `thdn` (1 % unless stated), from several takes in any order or from one take with steps of level " +
		"between silences; straight between the two neighbouring levels with both axes logarithmic, the lowest crossing. Never reached: no value, the highest level " +
		"as lower bound. With `rails` (and `load`) it says what may set the limit.",
	Formula:  "U at which THD+N(U) = thdn",
	Standard: "IEC 60268-3 (distortion-limited output voltage)",
	Unit:     "V",
	Roles:    []string{"take"},
	Keys:     []string{"at", "band", "thdn", "load", "load_uncertainty", "rails", "rails_uncertainty"},
	Run: func(p *analyze.Pass) analyze.Result {
		g, skipped, bad := gather(p)
		if bad != nil {
			return analyze.RefuseWith(volt, bad)
		}
		r, _ := largest(p, g, skipped)
		return r
	},
}

// largest is the result of max_output and, where THD+N crosses the limit, the
// crossing.
func largest(p *analyze.Pass, g gathered, skipped int) (analyze.Result, *crossing) {
	limit := thdnOr(p.Params)
	first, top := g.points[0], g.points[len(g.points)-1]
	s := top.heard.Out
	u := volt
	if s.Unit == "FS" {
		u = fs
	}
	r := analyze.Result{Unit: u, FullScaleSine: s.FullScaleSine()}
	r.Details = map[string]any{"points": g.list(), "thdn_percent": 100 * limit, "steps": g.stepped, "skipped": skipped,
		"fundamental": map[string]any{"frequency_hz": top.heard.Tone.Hz, "rms_v": top.heard.Lo.Fundamental().RMS()}}
	b := p.Params.BandOr(20, 20000)
	r.Details["band_hz"] = []float64{b.Low, b.High}
	r.Figures = []analyze.Figure{stage.ToneWaveform(s, top.heard.Tone.Hz), stage.SpectrumFigure(p, top.heard.Lo)}
	if len(g.points) > 1 {
		r.Figures = append([]analyze.Figure{g.figure(limit)}, r.Figures...)
	}
	if band, _ := stage.BandFor(s, b); band.Open {
		r.Details["lower_edge_resolved"] = false
	}
	if p.Params.Load == nil {
		r.Notes = append(r.Notes, "no `load` stated: the value holds for whatever the output was connected to")
	}
	c, ok := g.crossing(limit)
	switch {
	case ok:
		bud := c.budget(c.rms, 1)
		v := c.rms
		r.Value = &v
		bud.Into(&r)
		r.Details["between_v"] = []float64{c.low.rms, c.high.rms}
	case first.thdn >= limit && first.bent:
		r.Bound = &analyze.Bound{Upper: true, Value: first.rms}
		r.Refusal = &analyze.Refusal{Code: analyze.NotEnoughPoints,
			Text:   fmt.Sprintf("THD+N is %.3g %% at the lowest level already (%s), over the %.3g %% asked", 100*first.thdn, show(u, first.rms), 100*limit),
			Advice: "add a take at a lower level"}
	case top.thdn >= limit:
		r.Refusal = &analyze.Refusal{Code: analyze.NotEnoughPoints,
			Text:   fmt.Sprintf("THD+N is over %.3g %% at every level, mostly noise at the lowest (%s)", 100*limit, show(u, first.rms)),
			Advice: "add takes between, at which the noise is under the limit"}
	default:
		r.Bound = &analyze.Bound{Value: top.rms}
		r.Refusal = &analyze.Refusal{Code: analyze.NotEnoughPoints,
			Text:   fmt.Sprintf("THD+N never reaches %.3g %%: %.3g %% at the highest level (%s)", 100*limit, 100*top.thdn, show(u, top.rms)),
			Advice: "add a take at a higher level"}
	}
	if r.Bound != nil { // of a reading that has its own uncertainty
		q := top
		if r.Bound.Upper {
			q = first
		}
		var own budget.Budget
		own.A("noise in the level", q.rms*q.rmsU, 0)
		own.Scale(q.heard.Out, q.rms)
		if r.Bound.Upper {
			r.Bound.Value += 2 * own.U()
			r.Details["upper_bound"] = u.FromLinear(r.Bound.Value)
		} else {
			r.Bound.Value -= 2 * own.U()
			r.Details["lower_bound"] = u.FromLinear(r.Bound.Value)
		}
	}
	r = explain(p, r, g, limit)
	if !ok {
		return r, nil
	}
	return r, &c
}

// show is a linear value in words.
func show(u unit.Unit, v float64) string { return unit.Format(u.FromLinear(v), u, 0) }
