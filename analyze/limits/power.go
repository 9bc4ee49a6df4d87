package limits

import (
	"fmt"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
)

var power = &analyze.Measure{
	Name:  "power",
	Title: "power into a load",
	Doc: "Level squared over `load`, the level the RMS of everything in the band of one steady take; with several takes, or one with steps of level, that of max_output " +
		"at `thdn`. `load` is its resistance at that power, hot. Its uncertainty counts once, that of the recorder's scale twice.",
	Formula:  "P = U^2 / R_load",
	Standard: "IEC 60268-3 (distortion-limited output power)",
	Unit:     "W",
	Roles:    []string{"take"},
	Keys:     []string{"at", "band", "thdn", "load", "load_uncertainty", "rails", "rails_uncertainty"},
	Run:      runPower,
}

func runPower(p *analyze.Pass) analyze.Result {
	if p.Params.Load == nil {
		return analyze.Refuse(watt, analyze.Unsupported, "no `load` is stated", "state `load`, the resistance at that power")
	}
	load := p.Params.Load.Value.Linear()
	g, skipped, bad := gather(p)
	if bad != nil {
		return analyze.RefuseWith(watt, bad)
	}
	s := g.points[0].heard.Out
	if s.Unit != "V" {
		return analyze.Refuse(watt, analyze.Uncalibrated, fmt.Sprintf("take %q has no volts at full scale", s.Take.Name), "state full_scale_peak for its gear")
	}
	r, c := largest(p, g, skipped)
	r.Unit, r.FullScaleSine = watt, 0
	r.Details["load_ohm"] = load
	if len(g.points) == 1 {
		return steady(p, r, g.points[0], load)
	}
	switch {
	case r.Value != nil:
		w := c.rms * c.rms / load
		b := c.budget(w, 2)
		b.Stated("load", p.Params.Load, -w)
		r.Details["level_v"] = *r.Value
		r.Value, r.Budget, r.Lacking, r.Unstated = &w, nil, nil, nil
		b.Into(&r)
	case r.Bound != nil:
		r.Bound.Value *= r.Bound.Value / load
		for _, key := range []string{"upper_bound", "lower_bound"} {
			if _, ok := r.Details[key]; ok {
				r.Details[key] = r.Bound.Value
			}
		}
	}
	r.Notes = append(r.Notes, heat)
	return r
}

// heat goes with every power.
const heat = "a load changes with heat: `load` is taken as its resistance at this power"

// steady is the power of one take at whatever level it was made.
func steady(p *analyze.Pass, r analyze.Result, q point, load float64) analyze.Result {
	if r.Refusal != nil && r.Refusal.Code == analyze.Impossible {
		return r
	}
	w := q.rms * q.rms / load
	r.Value, r.Bound, r.Refusal = &w, nil, nil
	delete(r.Details, "upper_bound")
	delete(r.Details, "lower_bound")
	var b budget.Budget
	b.A("noise in the level", 2*w*q.rmsU, 0)
	b.Scale(q.heard.Out, 2*w)
	b.Stated("load", p.Params.Load, -w)
	r.Budget, r.Lacking, r.Unstated = nil, nil, nil
	b.Into(&r)
	r.Details["level_v"], r.Details["thdn_of_take_percent"] = q.rms, 100*q.thdn
	r.Notes = []string{heat}
	return r
}
