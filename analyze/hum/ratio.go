package hum

import (
	"fmt"
	"math"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
	"benchslip/analyze/stage"
)

var humRatio = &analyze.Measure{
	Name:  "hum_ratio",
	Title: "hum against the remaining noise",
	Doc: "Hum of the orders 1 to `harmonics` inside the band over the noise in the band without them. `weighting` acts on both. A test tone and its harmonics " +
		"are left out of the noise. A gain cancels.",
	Formula:  "20 lg(U_hum / U_rest)",
	Standard: "common practice",
	Unit:     "dB",
	Roles:    []string{"take"},
	Keys:     []string{"band", "harmonics", "weighting", "gain", "gain_take", "gain_uncertainty"},
	Run:      runRatio,
}

func runRatio(p *analyze.Pass) analyze.Result {
	s, bad := p.Signal("take", "out")
	if bad != nil {
		return analyze.RefuseWith(dB, bad)
	}
	band, bad := stage.BandFor(s, p.Params.BandOr(20, 20000))
	if bad == nil && band.Open {
		bad = &analyze.Refusal{Code: analyze.TooShort,
			Text:   fmt.Sprintf("take %q holds %.3g s; noise from %.4g Hz on needs %.3g s", s.Take.Name, s.DurationS(), band.Low, 10/band.Low),
			Advice: fmt.Sprintf("record %.3g s or more", math.Max(10/band.Low, 10))}
	}
	if bad != nil {
		return analyze.RefuseWith(dB, bad)
	}
	top := highest(p.Params)
	r, bad := read(p, "take", s, top)
	if bad != nil {
		return analyze.RefuseWith(dB, bad)
	}
	weight := stage.Weighting(p.Params.Weighting)
	c := r.sum(0, top, weight, func(q stage.Line) bool { return band.InLine(q.Hz) })
	if bad := readable(r, c); bad != nil {
		return analyze.RefuseWith(dB, bad)
	}
	rest := stage.NoiseIn(r.Lines, band, weight).Plus(stage.LinesIn(band, weight, r.Others))
	for _, q := range r.Mains {
		if q.Order > top {
			rest = rest.Plus(stage.LinesIn(band, weight, []stage.Line{q}))
		}
	}
	if rest.P <= 0 {
		return analyze.Refuse(dB, analyze.NoSignal, fmt.Sprintf("take %q, channel %d holds no noise", s.Take.Name, s.Channel()), "check the connection")
	}
	res := analyze.Result{Unit: dB}
	res.Details = map[string]any{"mains_hz": r.hz, "harmonics": list(r, c, stage.Gain{G: 1}, false, nil), "band_hz": []float64{band.Low, band.High},
		"weighting": p.Params.Weighting, "noise_v": math.Sqrt(rest.P), "hum_v": math.Sqrt(math.Max(c.P, 0)), "span_s": spanOf(s)}
	r.describe(p, c, &res)
	if !c.seen || c.P <= 0 {
		// The rest may be smaller than it reads by its own uncertainty.
		noise := math.Sqrt(math.Max(rest.P-2*rest.U, rest.P/4))
		res.Bound = &analyze.Bound{Upper: true, Value: r.bound(p, c) / noise}
		res.Refusal = belowDetection(r)
		res.Details["upper_bound"] = dB.FromLinear(res.Bound.Value)
		return res
	}
	v := math.Sqrt(c.P / rest.P)
	low, high := math.Sqrt(math.Max(c.P-2*c.U, 0)/c.P), math.Sqrt((c.P+2*c.U)/c.P)
	var b budget.Budget
	b.A("noise at the lines", v*math.Max(1-low, high-1)/2, 0)
	b.A("noise statistics", v*rest.U/(2*rest.P), 0)
	b.Into(&res)
	res.Value = &v
	return res
}
