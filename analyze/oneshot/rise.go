package oneshot

import (
	"fmt"
	"math"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
)

var riseTime = &analyze.Measure{
	Name:  "rise_time",
	Title: "rise time of a step, 10 % to 90 %",
	Doc: "Time from the last crossing of 10 % before the first crossing of 90 % to that crossing, on the first rising step whose size is over half of the " +
		"largest. The two levels are the histogram's modes. The rise time of the instrument, where stated, is taken off in squares, which is right for edges " +
		"of a Gaussian kind. An edge of fewer than four samples has an uncertainty of at least one of them.",
	Formula:  "t = t(90 %) - t(10 %);  t_unit = sqrt(t^2 - t_instrument^2)",
	Standard: "IEEE Std 181 (transition duration)",
	Unit:     "s",
	Roles:    []string{"take"},
	Keys:     []string{"instrument_rise"},
	Run:      func(p *analyze.Pass) analyze.Result { return runEdgeTime(p, rising) },
}

var fallTime = &analyze.Measure{
	Name:  "fall_time",
	Title: "fall time of a step, 90 % to 10 %",
	Doc: "As the rise time, on the first falling step whose size is over half of the largest: from the last crossing of 90 % before the first crossing of 10 % " +
		"to that crossing.",
	Formula:  "t = t(10 %) - t(90 %);  t_unit = sqrt(t^2 - t_instrument^2)",
	Standard: "IEEE Std 181 (transition duration)",
	Unit:     "s",
	Roles:    []string{"take"},
	Keys:     []string{"instrument_rise"},
	Run:      func(p *analyze.Pass) analyze.Result { return runEdgeTime(p, falling) },
}

var slewRate = &analyze.Measure{
	Name:  "slew_rate",
	Title: "slew rate of a step between 10 % and 90 %",
	Doc: "Mean steepness between the 10 % and the 90 % crossing of the first step, rising or falling, whose size is over half of the largest; positive. The " +
		"rise time of the instrument, where stated, is taken off in squares. It is the unit's own only when the step was large and fast enough to drive it there.",
	Formula:  "SR = 0.8 |V_after - V_before| / t(10-90)",
	Standard: "common practice; levels and instants after IEEE Std 181",
	Unit:     "V/s",
	Roles:    []string{"take"},
	Keys:     []string{"instrument_rise"},
	Run:      runSlewRate,
}

// duration of an edge with its uncertainty, s.
type duration struct {
	value  float64
	budget budget.Budget
}

// duration is the time between 10 % and 90 %, the instrument's own taken off.
// A refusal may come with an upper bound, s.
func (e *edge) duration(p *analyze.Pass) (duration, *analyze.Refusal, *analyze.Bound) {
	dt := 1 / e.s.RateHz
	if e.inside() < 1 {
		// Both crossings lie between two neighbouring samples or on them.
		return duration{}, &analyze.Refusal{Code: analyze.NotEnoughPoints,
			Text:   fmt.Sprintf("the edge at %.9g s lies between two samples %.4g s apart", timeOf(e.s, e.t50.at), dt),
			Advice: "use a faster time base"}, e.bound(p, (float64(e.last-e.first))*dt)
	}
	var d duration
	b := &d.budget
	n := e.t90.at - e.t10.at // samples
	noise := math.Hypot(e.t10.uNoise, e.t90.uNoise)
	steps := math.Hypot(e.t10.uStep, e.t90.uStep)
	shape := math.Hypot(e.t10.uShape, e.t90.uShape)
	// A level that lies off by u moves 10 % by u/10 and 90 % by 9u/10, or the
	// other way round.
	top := (0.9/e.t90.slope - 0.1/e.t10.slope) * e.uAfter
	base := (0.1/e.t90.slope - 0.9/e.t10.slope) * e.uBefore
	if e.inside() < 4 {
		shape = math.Max(shape, 1/math.Sqrt(3))
	}
	value := n * dt
	own := 0.0
	if p.Params.InstrumentRise != nil {
		own = *p.Params.InstrumentRise
		b.Unstated = append(b.Unstated, "instrument_rise")
	}
	net := math.Sqrt(math.Max(value*value-own*own, 0))
	grow := 1.0
	if own > 0 {
		u := dt * budget.RSS(noise, steps, shape, top, base)
		if net < 2*u || net*net < 4*value*u {
			why := "the edge is no slower than the instrument itself"
			if (value+2*u)*(value+2*u) < own*own {
				return d, &analyze.Refusal{Code: analyze.Impossible,
					Text:   fmt.Sprintf("the edge takes %.4g s, less than the %.4g s stated for the instrument", value, own),
					Advice: "correct instrument_rise"}, nil
			}
			return d, &analyze.Refusal{Code: analyze.FloorLimited, Text: fmt.Sprintf("%s: %.4g s read, %.4g s stated for it", why, value, own),
				Advice: "use a faster instrument"}, &analyze.Bound{Upper: true, Value: math.Sqrt((value+2*u)*(value+2*u) - own*own)}
		}
		grow = value / net
	}
	b.A("noise at the crossings", noise*dt*grow, 0)
	b.B("converter steps at the crossings", steps*dt*grow)
	b.B("course between samples", shape*dt*grow)
	b.B("level before the edge", base*dt*grow)
	b.B("level after the edge", top*dt*grow)
	d.value = net
	return d, nil, nil
}

// bound is an upper bound of a time, the instrument's own taken off.
func (e *edge) bound(p *analyze.Pass, t float64) *analyze.Bound {
	if own := p.Params.InstrumentRise; own != nil && t > *own {
		t = math.Sqrt(t*t - *own**own)
	}
	return &analyze.Bound{Upper: true, Value: t}
}

// details that all measures of an edge give.
func (e *edge) details() map[string]any {
	return map[string]any{
		"span_s": spanOf(e.s), "edge_s": timeOf(e.s, e.t50.at), "before_v": e.jump.before.v, "after_v": e.jump.after.v,
		"t10_s": timeOf(e.s, e.t10.at), "t90_s": timeOf(e.s, e.t90.at), "samples_in_edge": e.inside(), "noise_v": e.noise * e.size(),
		"other_transitions": e.others,
	}
}

func runEdgeTime(p *analyze.Pass, d direction) analyze.Result {
	e, bad := edgeOf(p, d)
	if bad != nil {
		return analyze.RefuseWith(second, bad)
	}
	t, bad, bound := e.duration(p)
	r := analyze.Result{Unit: second, Refusal: bad, Bound: bound}
	if bad == nil {
		r.Value = &t.value
		t.budget.Clock(e.s, -t.value)
		t.budget.Into(&r)
	}
	e.finish(p, &r)
	return r
}

// finish adds what all measures of an edge show.
func (e *edge) finish(p *analyze.Pass, r *analyze.Result) {
	r.Details = e.details()
	r.Figures = append(r.Figures, e.figure())
	if own := p.Params.InstrumentRise; own != nil && *own > 0 {
		r.Details["read_s"] = (e.t90.at - e.t10.at) / e.s.RateHz
		r.Notes = append(r.Notes, "the instrument's rise time is taken off in squares, which holds for edges of a Gaussian kind")
	}
	if e.remaining > 0.002 {
		r.Notes = append(r.Notes, fmt.Sprintf("the level after the edge was still moving at the end, with about %.2g %% of the step to go", 100*e.remaining))
	}
}

func runSlewRate(p *analyze.Pass) analyze.Result {
	s, _, bad := samples(p)
	u := slope
	if s != nil && s.Unit == "FS" {
		u = fsSlope
	}
	if bad != nil {
		return analyze.RefuseWith(u, bad)
	}
	e, bad := edgeOf(p, either)
	if bad != nil {
		return analyze.RefuseWith(u, bad)
	}
	t, bad, bound := e.duration(p)
	r := analyze.Result{Unit: u, Refusal: bad}
	size := e.size()
	if bad != nil {
		if bound != nil && bound.Value > 0 {
			r.Bound = &analyze.Bound{Upper: false, Value: 0.8 * size / bound.Value}
		}
		e.finish(p, &r)
		return r
	}
	v := 0.8 * size / t.value
	r.Value = &v
	var b budget.Budget
	for _, l := range t.budget.Lines {
		l.U *= v / t.value
		b.Lines = append(b.Lines, l)
	}
	b.Unstated = t.budget.Unstated
	b.B("size of the step", v*math.Hypot(e.uBefore, e.uAfter))
	b.Scale(e.s, v)
	b.Clock(e.s, v)
	b.Into(&r)
	e.finish(p, &r)
	r.Details["step_v"] = size
	r.Details["full_power_hz"] = v / (2 * math.Pi * size / 2)
	return r
}
