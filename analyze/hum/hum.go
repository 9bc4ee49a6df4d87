// Package hum holds the measures of mains hum: the comb of harmonics, single
// orders, hum against noise, pick-up of a cable run, and the mains frequency
// itself; and what they say about where hum comes from.
//
// The comb is tracked in blocks of about 1 s and fitted jointly with any test
// tone. Phases of real hum wander against the fundamental, so an order's power
// is the mean of powers along the track, of blocks where the line is weak and
// of shorter parts where it is strong, each with its noise share (density at
// the line's sides over the length) taken off. For a steady line of amplitude
// A in white noise this reaches the Cramer-Rao bound var A = 2 sigma^2/N, but
// for a factor 1 + s/(2 P), s the noise share of a block, P the line's power.
package hum

import (
	"fmt"
	"math"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
	"benchslip/analyze/stage"
	"benchslip/capture/recording"
	"benchslip/capture/unit"
)

var (
	volt     = unit.MustLookup("V")
	dBFS     = unit.MustLookup("dBFS")
	dB       = unit.MustLookup("dB")
	dBu      = unit.MustLookup("dBu")
	hertz    = unit.MustLookup("Hz")
	perMetre = unit.MustLookup("V/m")
)

// Measures lists the measures of this package.
func Measures() []*analyze.Measure {
	return []*analyze.Measure{hum, humRatio, pickup, mainsFrequency}
}

// defaultOrders is how many orders hum has unless the job says otherwise.
const defaultOrders = 20

var hum = &analyze.Measure{
	Name:  "hum",
	Title: "mains hum",
	Doc: "Root of the sum of the powers of mains harmonics 1 to `harmonics` (20 unless stated) below half the sample rate, each with its noise share taken off, " +
		"or of the one of `order`. The mains frequency is followed through the take, with the help of a reference channel where `mains` names one; the band " +
		"does not matter. With `gain` or `gain_take` the value is referred to the unit's input, else it is the voltage at the recorder's input; harmonics in " +
		"the details stay at the recorder, their `input` columns at the unit's input. `floor` is taken off by power. `baseline` leaves the value alone: what " +
		"the run adds to it, and whether cable or receiver is to blame, stands beside it. `max_each` is a limit for every single harmonic.",
	Formula:  "U_hum = sqrt(sum_h U_h^2)",
	Standard: "common practice; compare the grouping of IEC 61000-4-7",
	Unit:     "V",
	Roles:    []string{"take"},
	Keys:     []string{"order", "harmonics", "weighting", "gain", "gain_take", "gain_uncertainty", "floor", "baseline", "ref_level", "max_each", "mains"},
	Run:      runHum,
}

func rmsUnit(s *analyze.Signal) unit.Unit {
	if s.Unit == "FS" {
		return dBFS
	}
	return volt
}

func spanOf(s *analyze.Signal) []float64 { return []float64{s.StartS, s.StartS + s.DurationS()} }

// highest is the top order that a check asks for.
func highest(p *analyze.Params) int {
	top := p.Harmonics
	if top == 0 {
		top = defaultOrders
	}
	return max(top, p.Order)
}

func runHum(p *analyze.Pass) analyze.Result {
	s, bad := p.Signal("take", "out")
	if bad != nil {
		return analyze.RefuseWith(volt, bad)
	}
	u := rmsUnit(s)
	top := highest(p.Params)
	r, bad := read(p, "take", s, top)
	if bad != nil {
		return analyze.RefuseWith(u, bad)
	}
	weight := stage.Weighting(p.Params.Weighting)
	c := r.sum(p.Params.Order, top, weight, nil)
	if bad := readable(r, c); bad != nil {
		return analyze.RefuseWith(u, bad)
	}
	g, referred, bad := stage.InputGain(p)
	if bad != nil {
		return analyze.RefuseWith(u, bad)
	}
	res := analyze.Result{Unit: u, FullScaleSine: s.FullScaleSine()}
	res.Details = map[string]any{"mains_hz": r.hz, "harmonics": list(r, c, g, referred, p.Params.RefLevel), "span_s": spanOf(s),
		"weighting": p.Params.Weighting, "detector": "RMS"}
	var floor *reading
	f, floored, bad := stage.TakeFloor(p, c.Power, func(s *analyze.Signal) (stage.Power, *analyze.Refusal) {
		var bad *analyze.Refusal
		if floor, bad = read(p, "floor", s, top); bad != nil {
			return stage.Power{}, bad
		}
		return floor.sum(p.Params.Order, top, weight, nil).Power, nil
	})
	if bad != nil {
		return analyze.RefuseWith(u, bad)
	}
	var own budget.Budget
	if c.seen && c.P > 0 {
		v := math.Sqrt(c.P)
		own = rmsBudget(r, v, c.Power)
		res.Value = &v
		own.Into(&res)
		if floored {
			res = stage.Floor(res, f)
		}
	} else {
		res = undetected(p, r, c, res)
	}
	refer(&res, s, own, g, referred)
	below(&res, p.Params.RefLevel, s)
	res.Points = singly(p, r, c, floor, weight, g, referred)
	r.describe(p, c, &res)
	if p.Has("baseline") {
		if bad := compareBaseline(p, r, top, g, &res); bad != nil {
			res.Notes = append(res.Notes, "no comparison with the baseline: "+bad.Text)
		}
	}
	beforeOrAfter(p, r, c, &res)
	return res
}

// readable refuses a comb of which nothing can be read.
func readable(r *reading, c comb) *analyze.Refusal {
	switch {
	case len(c.shares) > 0:
		return nil
	case len(c.lines) > 0:
		return &analyze.Refusal{Code: analyze.AmbiguousTone, Text: fmt.Sprintf("order %d (%.5g Hz) lies under the test tone", c.lines[0].Order, c.lines[0].Hz),
			Advice: "record without the tone"}
	}
	return &analyze.Refusal{Code: analyze.Bandwidth, Text: fmt.Sprintf("no order asked lies below half the rate of take %q", r.Sig.Take.Name),
		Advice: "record at a higher rate"}
}

// rmsBudget is the budget of the root v of a power: noise (the wider side of
// sqrt(P +- 2 u)), converter steps, calibration.
func rmsBudget(r *reading, v float64, p stage.Power) budget.Budget {
	var b budget.Budget
	low, high := math.Sqrt(math.Max(p.P-2*p.U, 0)), math.Sqrt(p.P+2*p.U)
	b.A("noise at the lines", math.Max(v-low, high-v)/2, 0)
	b.B("converter steps", stage.StepU(r.Lines)/math.Sqrt2)
	b.Scale(r.Sig, v)
	return b
}

// undetected makes a result of a comb that does not stand out of the noise.
func undetected(p *analyze.Pass, r *reading, c comb, res analyze.Result) analyze.Result {
	res.Bound = &analyze.Bound{Upper: true, Value: r.bound(p, c)}
	res.Refusal = belowDetection(r)
	return res
}

func belowDetection(r *reading) *analyze.Refusal {
	return &analyze.Refusal{Code: analyze.BelowDetection,
		Text:   fmt.Sprintf("no mains line of take %q stands out of the noise", r.Sig.Take.Name),
		Advice: fmt.Sprintf("record %.3g s or more to lower the bound", 4*r.Sig.DurationS())}
}

// refer puts the value, or its bound, at the unit's input.
func refer(res *analyze.Result, s *analyze.Signal, own budget.Budget, g stage.Gain, referred bool) {
	res.Details["referred_to"] = "recorder input"
	if referred {
		res.Details["referred_to"] = "unit input"
		res.Details["gain_db"] = 20 * math.Log10(g.G)
	} else {
		res.Notes = append(res.Notes, "at the recorder's input, not referred to the unit's input")
	}
	switch {
	case res.Bound != nil:
		res.Bound.Value /= g.G
		res.Details["upper_bound"] = res.Unit.FromLinear(res.Bound.Value)
	case referred && res.Value != nil:
		own.Lines = res.Budget
		v, b := stage.Refer(*res.Value, own, s, g)
		res.Value = &v
		res.Budget, res.Lacking, res.Unstated = nil, nil, nil
		b.Into(res)
	}
}

// below says how far a value lies below the stated nominal level.
func below(res *analyze.Result, ref *unit.Quantity, s *analyze.Signal) {
	level, ok := nominal(ref, s)
	if !ok {
		return
	}
	switch {
	case res.Value != nil && *res.Value > 0:
		res.Details["below_ref_db"] = 20 * math.Log10(level / *res.Value)
	case res.Bound != nil && res.Bound.Value > 0:
		res.Details["below_ref_db_at_least"] = 20 * math.Log10(level/res.Bound.Value)
	}
}

// nominal is the stated level as RMS in the signal's unit.
func nominal(ref *unit.Quantity, s *analyze.Signal) (float64, bool) {
	if ref == nil {
		return 0, false
	}
	v := ref.Linear()
	switch {
	case ref.Unit.Dim == unit.FullScale:
		v *= s.FullScaleSine() / unit.FullScaleSine
	case s.Unit == "FS":
		return 0, false
	}
	return v, v > 0
}

// singly gives each harmonic as a point with the limit max_each of its own.
func singly(p *analyze.Pass, r *reading, c comb, floor *reading, weight func(float64) float64, g stage.Gain, referred bool) []analyze.Point {
	if p.Params.MaxEach == nil {
		return nil
	}
	var out []analyze.Point
	for _, q := range c.lines {
		pt := analyze.Point{Label: fmt.Sprintf("order %d (%.4g Hz)", q.Order, float64(q.Order)*r.hz), Limit: p.Params.MaxEach}
		k := 1.0
		if weight != nil {
			k = weight(q.Hz)
		}
		one := r.sum(q.Order, q.Order, weight, nil)
		switch {
		case q.Dropped:
			pt.Refusal = &analyze.Refusal{Code: analyze.AmbiguousTone, Text: fmt.Sprintf("order %d lies under the test tone", q.Order), Advice: "record without the tone"}
		case !stage.MainsDetected(r.Lines, q, len(c.lines)) || q.Power <= 0:
			pt.Bound = &analyze.Bound{Upper: true, Value: r.bound(p, one) / g.G}
			pt.Refusal = belowDetection(r)
		default:
			power := one.Power
			if floor != nil {
				if o, ok := floor.order(q.Order); ok && stage.MainsDetected(floor.Lines, o, len(c.lines)) {
					power = stage.Power{P: power.P - k*o.Power, U: math.Hypot(power.U, k*o.U)}
				}
			}
			if power.P < one.P/2 { // under 3 dB over the instrument's own
				v := math.Sqrt(one.P)
				pt.Bound = &analyze.Bound{Upper: true, Value: (v + one.U/v) / g.G}
				pt.Refusal = &analyze.Refusal{Code: analyze.FloorLimited, Text: fmt.Sprintf("order %d is less than 3 dB over the instrument's own", q.Order),
					Advice: "use a quieter recorder input, or more gain before it"}
				break
			}
			v := math.Sqrt(power.P)
			b := rmsBudget(r, v, power)
			if referred {
				v, b = stage.Refer(v, b, r.Sig, g)
			}
			pt.Value, pt.Budget = &v, b.Lines
		}
		out = append(out, pt)
	}
	return out
}

// list is details.harmonics: every order asked for, at the recorder's input
// and, where a gain is known, at the unit's.
func list(r *reading, c comb, g stage.Gain, referred bool, ref *unit.Quantity) []map[string]any {
	level, hasLevel := nominal(ref, r.Sig)
	var out []map[string]any
	for _, q := range c.lines {
		e := map[string]any{"order": q.Order, "frequency_hz": float64(q.Order) * r.hz}
		if q.Dropped {
			e["rms_v"], e["uncertainty_v"], e["detected"], e["hidden"] = nil, nil, false, true
			out = append(out, e)
			continue
		}
		rms := q.RMS()
		e["rms_v"], e["uncertainty_v"] = rms, lineU(r.Lines, q)
		seen := stage.MainsDetected(r.Lines, q, len(c.lines))
		e["detected"] = seen
		if !seen {
			e["upper_bound_v"] = r.bound1(q)
		}
		if seen && rms > 0 {
			if r.Sig.Unit == "V" {
				e["level_dbu"] = dBu.FromLinear(rms / g.G)
			}
			if hasLevel {
				e["below_ref_db"] = 20 * math.Log10(level/(rms/g.G))
			}
		}
		if referred {
			e["input_rms_v"], e["input_uncertainty_v"] = rms/g.G, lineU(r.Lines, q)/g.G
		}
		if deg, steady, ok := r.against(q); ok && seen {
			e["phase_deg"], e["steady"] = deg, steady
		}
		out = append(out, e)
	}
	return out
}

// bound1 is the bound of one order at the track's frequency.
func (r *reading) bound1(q stage.Line) float64 {
	if b, ok := stage.MainsBound(r.Lines, q.Power+q.Share, []float64{q.Share}); ok {
		return b
	}
	return stage.MainsThreshold(r.Lines, q, 1)
}

// describe adds what the comb says of its origin, other lines, flags, figures.
func (r *reading) describe(p *analyze.Pass, c comb, res *analyze.Result) {
	f := r.family()
	f.details(res.Details)
	if words := f.opinion(r.Sig.Take.Name); words != "" {
		res.Opinions = append(res.Opinions, words)
	}
	if list := r.otherLines(); len(list) > 0 {
		res.Details["other_lines"] = list
	}
	for _, q := range c.lines {
		if q.Dropped && r.Tone != nil {
			res.Flags = append(res.Flags, stage.ToneOnMainsFlag(r.Lines, q.Order))
		}
	}
	if f := unlike(p, r); f != nil {
		res.Flags = append(res.Flags, *f)
	}
	res.Figures = append(res.Figures, combFigure(r, c), foldedFigure(r), frequencyFigure(r), stage.SpectrumFigure(p, r.Lines))
}

// unlike flags a comb whose frequency is not the job's supply.
func unlike(p *analyze.Pass, r *reading) *recording.Flag {
	if p.MainsHz <= 0 || r.MainsFound {
		return nil
	}
	other := stage.OtherSupply(p, r.Lines)
	if other == 0 {
		return nil
	}
	return &recording.Flag{Code: recording.MainsUnlike, Take: r.Sig.Take.Name, Channel: r.Sig.Channel(),
		Message: fmt.Sprintf("hum of %.4g Hz was found, none of the job's %.4g Hz; state [mains] frequency as it is", other, p.MainsHz)}
}
