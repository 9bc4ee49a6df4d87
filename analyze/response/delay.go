package response

import (
	"fmt"
	"math"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
	"benchslip/analyze/internal/transfer"
)

var delay = &analyze.Measure{
	Name:  "delay",
	Title: "delay of the output against the input",
	Doc: howFound + "The slope of the unwrapped phase over frequency, a straight line weighted by the signal-to-noise ratio, from three tones or more or a stimulus " +
		"that fills a band. Positive: the output is later. Against a stated stimulus the delay counts from the start of the take to the start of the stimulus.",
	Formula:  "phi(f) = phi_0 - 2 pi f tau, weighted least squares",
	Standard: "common practice; Cramer-Rao bound after Rife and Boorstyn 1974",
	Unit:     "s",
	Roles:    []string{"take"},
	Keys:     []string{"at"},
	Run:      runDelay,
}

func runDelay(p *analyze.Pass) analyze.Result {
	c, bad := transfer.Of(p, p.Take("take"), "take")
	if bad != nil {
		return analyze.RefuseWith(second, bad)
	}
	u := c.Used()
	if len(u) < 3 {
		return analyze.Refuse(second, analyze.NotEnoughPoints,
			fmt.Sprintf("take %q holds %d tones that count; a slope over frequency needs three", c.Out.Take.Name, len(u)),
			"play a sweep, or three tones or more")
	}
	v := c.DelayS
	if c.Stated {
		v += c.StartS
	}
	r := analyze.Result{Value: &v, Unit: second}
	// The reference only sets the gain's zero here.
	describe(&r, c, u[len(u)/2])
	delete(r.Details, "ref_hz")
	delete(r.Details, "ref_gain_db")
	r.Details["phase_scatter_deg"] = c.Scatter * 180 / math.Pi
	r.Details["phase_at_zero_deg"] = c.Phase0 * 180 / math.Pi
	var b budget.Budget
	b.A("phases about the straight line", c.DelayU, float64(len(u)-2))
	b.Clock(c.Out, -v)
	if c.Stated {
		b.A("clock of the player", c.ClockU*1e-6*c.Out.DurationS()/2, 0)
	} else {
		b.Skew(c.Out, c.In, 1)
	}
	b.Into(&r)
	return r
}
