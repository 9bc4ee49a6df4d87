// Package hum holds the measures of mains hum: the comb of harmonics, single
// orders, hum against noise, and the mains frequency itself.
//
// The comb is tracked in blocks of about 1 s and fitted jointly with any test
// tone. Phases of real hum wander against the fundamental, so an order's power
// is the mean of its block powers along the track, with the noise share of
// each block (density at the line's sides times 1/T_b) taken off.
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
	volt  = unit.MustLookup("V")
	dBFS  = unit.MustLookup("dBFS")
	dB    = unit.MustLookup("dB")
	hertz = unit.MustLookup("Hz")
)

// falseAlarm is the probability that noise passes for a line, over all lines
// asked.
const falseAlarm = 1e-3

// Measures lists the measures of this package.
func Measures() []*analyze.Measure {
	return []*analyze.Measure{hum, humRatio, mainsFrequency}
}

// lines takes a signal apart and makes sure that it can show the mains.
func lines(p *analyze.Pass, s *analyze.Signal, orders int) (*stage.Lines, *analyze.Refusal) {
	nominal := p.MainsHz
	if nominal == 0 {
		nominal = 50
	}
	if T := s.DurationS(); T*nominal < 10 {
		return nil, &analyze.Refusal{Code: analyze.TooShort,
			Text:   fmt.Sprintf("take %q holds %.3g periods of the mains, 10 are needed", s.Take.Name, T*nominal),
			Advice: fmt.Sprintf("record %.3g s or more", math.Max(10, 10/nominal))}
	}
	tone, _ := stage.FindTone(p, 0, s)
	if tone != nil && ofComb(p, s, tone) {
		tone = nil
	}
	l := stage.Decompose(p, s, stage.Options{Tone: tone, Mains: orders})
	if len(l.Mains) == 0 {
		return nil, &analyze.Refusal{Code: analyze.TooShort,
			Text:   fmt.Sprintf("take %q is too short, or its rate too low, to show the mains", s.Take.Name),
			Advice: "record 10 s or more"}
	}
	if l.Rival > 0 {
		return nil, &analyze.Refusal{Code: analyze.AmbiguousTone,
			Text:   fmt.Sprintf("take %q holds hum of %.4g Hz and of %.4g Hz of like size", s.Take.Name, l.MainsHz, l.Rival),
			Advice: "state the supply with [mains] frequency"}
	}
	return l, nil
}

// A line on a mains order passes for hum while the comb's other orders hold
// over 1/400 of its power (26 dB): hum of one order alone is rare, a test tone
// that shy of the hum more so. A line without company counts as hum only when
// it is weak, under 300 times the noise of one resolution bandwidth.
const (
	company = 400
	weak    = 300
)

// ofComb tells a harmonic of hum from a test tone: it lies on a mains order,
// and has the company of others that are not its own multiples.
func ofComb(p *analyze.Pass, s *analyze.Signal, tone *stage.Tone) bool {
	v := stage.SurveyOf(p, s)
	near := func(hz float64) float64 { return 2*v.ToleranceHz() + 4e-4*hz }
	gap, order := stage.NearMains(tone.Hz, tone.MainsHz, stage.MaxOrder)
	top, ok := v.StrongestIn(tone.Hz-near(tone.Hz), tone.Hz+near(tone.Hz), nil)
	if !ok {
		return false
	}
	others := 0.0
	for _, q := range v.Peaks {
		gap, k := stage.NearMains(q.Hz, tone.MainsHz, stage.MaxOrder)
		if gap <= near(q.Hz) && k%order != 0 {
			others += q.Power
		}
	}
	if others > 0 {
		return gap <= near(tone.Hz) && top.Power < company*others
	}
	// Alone, the order's place is known no better than the supply's frequency.
	return gap <= near(tone.Hz)+0.004*tone.Hz && top.Power < weak*top.Floor*v.RBW()
}

// comb is a set of mains orders, summed.
type comb struct {
	stage.Power
	lines  []stage.Line
	shares []float64
	read   float64
	seen   bool
}

func sum(l *stage.Lines, order, top int, gain func(float64) float64, within func(stage.Line) bool) comb {
	var c comb
	for _, q := range l.Mains {
		if order > 0 && q.Order != order || q.Order > top || within != nil && !within(q) {
			continue
		}
		c.lines = append(c.lines, q)
	}
	v := 0.0
	for _, q := range c.lines {
		if q.Dropped {
			continue
		}
		g := 1.0
		if gain != nil {
			g = gain(q.Hz)
		}
		c.P += g * q.Power
		v += g * q.U * g * q.U
		c.read += g * (q.Power + q.Share)
		c.shares = append(c.shares, g*q.Share)
		c.seen = c.seen || stage.MainsDetected(l, q, len(c.lines))
	}
	c.U = math.Sqrt(v)
	return c
}

var hum = &analyze.Measure{
	Name:  "hum",
	Title: "mains hum",
	Doc: "Root of the sum of the powers of mains harmonics 1 to `harmonics` (20 unless stated) below half the sample rate, each with its noise share taken off, " +
		"or of the one of `order`. The mains frequency is followed through the take; the band does not matter. With `gain` or `gain_take` the value is referred " +
		"to the unit's input, else it is the voltage at the recorder's input.",
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

func runHum(p *analyze.Pass) analyze.Result {
	s, bad := p.Signal("take", "out")
	if bad != nil {
		return analyze.RefuseWith(volt, bad)
	}
	u := rmsUnit(s)
	top := p.Params.Harmonics
	if top == 0 {
		top = 20
	}
	top = max(top, p.Params.Order)
	l, bad := lines(p, s, top)
	if bad != nil {
		return analyze.RefuseWith(u, bad)
	}
	gain := stage.Weighting(p.Params.Weighting)
	c := sum(l, p.Params.Order, top, gain, nil)
	if len(c.shares) == 0 {
		if len(c.lines) > 0 {
			return analyze.Refuse(u, analyze.AmbiguousTone, fmt.Sprintf("order %d (%.5g Hz) lies under the test tone", c.lines[0].Order, c.lines[0].Hz), "record without the tone")
		}
		return analyze.Refuse(u, analyze.Bandwidth, fmt.Sprintf("no order asked lies below half the rate of take %q", s.Take.Name), "record at a higher rate")
	}
	v := math.Sqrt(math.Max(c.P, 0))
	var own budget.Budget
	if v > 0 {
		own.A("noise at the lines", c.U/(2*v), 0)
		own.B("converter steps", stage.StepU(l)/math.Sqrt2)
		own.Scale(s, v)
	}
	r := analyze.Result{Unit: u, FullScaleSine: s.FullScaleSine()}
	r.Value = &v
	own.Into(&r)
	r.Details = map[string]any{"mains_hz": l.MainsHz, "harmonics": list(l, c), "span_s": []float64{s.StartS, s.StartS + s.DurationS()},
		"weighting": p.Params.Weighting, "detector": "RMS", "referred_to": "recorder input"}
	r.Figures = []analyze.Figure{combFigure(l, c), stage.SpectrumFigure(p, l)}
	for _, q := range c.lines {
		if q.Dropped {
			r.Flags = append(r.Flags, stage.ToneOnMainsFlag(l, q.Order))
		}
	}
	if f := unlike(p, l); f != nil {
		r.Flags = append(r.Flags, *f)
	}
	f, floored, bad := stage.TakeFloor(p, c.Power, func(s *analyze.Signal) (stage.Power, *analyze.Refusal) {
		l, bad := lines(p, s, top)
		if bad != nil {
			return stage.Power{}, bad
		}
		return sum(l, p.Params.Order, top, gain, nil).Power, nil
	})
	if bad != nil {
		return analyze.RefuseWith(u, bad)
	}
	if !c.seen {
		bound, ok := stage.MainsBound(l, c.read, c.shares)
		if !ok {
			bound = budget.SumThreshold(c.shares, falseAlarm)
		}
		r.Value, r.Budget = nil, nil
		r.Bound = &analyze.Bound{Upper: true, Value: bound}
		r.Refusal = &analyze.Refusal{Code: analyze.BelowDetection,
			Text:   fmt.Sprintf("no mains line of take %q stands out of the noise", s.Take.Name),
			Advice: fmt.Sprintf("record %.3g s to halve the bound", 4*s.DurationS())}
		own.Lines = nil
	} else if floored {
		if len(r.Budget) > 0 {
			r = stage.Floor(r, f)
		}
	}
	return refer(p, s, r, own)
}

// refer puts the value, or its bound, at the unit's input.
func refer(p *analyze.Pass, s *analyze.Signal, r analyze.Result, own budget.Budget) analyze.Result {
	g, ok, bad := stage.InputGain(p)
	if bad != nil {
		return analyze.RefuseWith(r.Unit, bad)
	}
	if !ok {
		r.Notes = append(r.Notes, "at the recorder's input, not referred to the unit's input")
		bound(&r)
		return r
	}
	r.Details["referred_to"] = "unit input"
	r.Details["gain_db"] = 20 * math.Log10(g.G)
	if r.Bound != nil {
		r.Bound.Value /= g.G
		bound(&r)
		return r
	}
	own.Lines = r.Budget
	v, b := stage.Refer(*r.Value, own, s, g)
	r.Value = &v
	r.Budget, r.Lacking, r.Unstated = nil, nil, nil
	b.Into(&r)
	return r
}

func bound(r *analyze.Result) {
	if r.Bound != nil {
		r.Details["upper_bound"] = r.Unit.FromLinear(r.Bound.Value)
	}
}

// list is details.harmonics.
func list(l *stage.Lines, c comb) []map[string]any {
	var out []map[string]any
	for _, q := range c.lines {
		e := map[string]any{"order": q.Order, "frequency_hz": q.Hz}
		if q.Dropped {
			e["rms_v"], e["uncertainty_v"], e["detected"], e["hidden"] = nil, nil, false, true
			out = append(out, e)
			continue
		}
		e["rms_v"] = q.RMS()
		e["detected"] = stage.MainsDetected(l, q, len(c.lines))
		if q.Power > q.U {
			e["uncertainty_v"] = 2 * q.U / (2 * q.RMS())
		} else {
			e["uncertainty_v"] = math.Sqrt(math.Max(q.Power, 0)+2*q.U) - q.RMS()
		}
		if b, ok := stage.MainsBound(l, q.Power+q.Share, []float64{q.Share}); ok {
			e["upper_bound_v"] = b
		}
		out = append(out, e)
	}
	return out
}

// combFigure shows the orders as bars beside the noise in a block's bandwidth.
func combFigure(l *stage.Lines, c comb) analyze.Figure {
	s := l.Sig
	fig := analyze.Figure{
		ID:      fmt.Sprintf("comb-%s-ch%d", s.Take.Name, s.Channel()),
		Title:   fmt.Sprintf("Mains harmonics of take %s, channel %d", s.Take.Name, s.Channel()),
		Caption: fmt.Sprintf("RMS of each order of %.4f Hz, noise share removed; the line is the RMS that noise alone may reach", l.MainsHz),
		X:       analyze.Axis{Label: "order", Unit: ""},
		Y:       analyze.Axis{Label: "RMS", Unit: s.Unit, Log: true},
	}
	bars := analyze.Series{Name: "harmonic", Kind: analyze.Bars}
	floor := analyze.Series{Name: "detection threshold", Kind: analyze.Line}
	for _, q := range c.lines {
		if q.Dropped {
			continue
		}
		t := stage.MainsThreshold(l, q, len(c.lines))
		floor.X = append(floor.X, float64(q.Order))
		floor.Y = append(floor.Y, t)
		if stage.MainsDetected(l, q, len(c.lines)) && q.RMS() > 0 {
			bars.X = append(bars.X, float64(q.Order))
			bars.Y = append(bars.Y, q.RMS())
		}
	}
	fig.Series = []analyze.Series{bars, floor}
	return fig
}

// unlike flags a comb whose frequency is not the job's supply.
func unlike(p *analyze.Pass, l *stage.Lines) *recording.Flag {
	if p.MainsHz <= 0 || l.MainsFound {
		return nil
	}
	other := stage.OtherSupply(p, l)
	if other == 0 {
		return nil
	}
	return &recording.Flag{Code: recording.MainsUnlike, Take: l.Sig.Take.Name, Channel: l.Sig.Channel(),
		Message: fmt.Sprintf("hum of %.4g Hz was found, none of the job's %.4g Hz", other, p.MainsHz)}
}

var humRatio = &analyze.Measure{
	Name:  "hum_ratio",
	Title: "hum against the remaining noise",
	Doc: "Hum of the orders 1 to `harmonics` inside the band over the noise in the band without them. `weighting` acts on both. A test tone and its harmonics " +
		"are left out of the noise.",
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
	top := p.Params.Harmonics
	if top == 0 {
		top = 20
	}
	l, bad := lines(p, s, top)
	if bad != nil {
		return analyze.RefuseWith(dB, bad)
	}
	gain := stage.Weighting(p.Params.Weighting)
	c := sum(l, 0, top, gain, func(q stage.Line) bool { return band.InLine(q.Hz) })
	rest := stage.NoiseIn(l, band, gain).Plus(stage.LinesIn(band, gain, l.Others))
	for _, q := range l.Mains {
		if q.Order > top {
			rest = rest.Plus(stage.LinesIn(band, gain, []stage.Line{q}))
		}
	}
	if rest.P <= 0 {
		return analyze.Refuse(dB, analyze.NoSignal, fmt.Sprintf("take %q, channel %d holds no noise", s.Take.Name, s.Channel()), "check the connection")
	}
	r := analyze.Result{Unit: dB}
	r.Details = map[string]any{"mains_hz": l.MainsHz, "harmonics": list(l, c), "band_hz": []float64{band.Low, band.High},
		"noise_v": math.Sqrt(rest.P), "hum_v": math.Sqrt(math.Max(c.P, 0)), "span_s": []float64{s.StartS, s.StartS + s.DurationS()}}
	r.Figures = []analyze.Figure{combFigure(l, c), stage.SpectrumFigure(p, l)}
	if !c.seen || c.P <= 0 {
		b, ok := stage.MainsBound(l, c.read, c.shares)
		if !ok {
			b = budget.SumThreshold(c.shares, falseAlarm)
		}
		r.Bound = &analyze.Bound{Upper: true, Value: b / math.Sqrt(rest.P)}
		r.Refusal = &analyze.Refusal{Code: analyze.BelowDetection, Text: fmt.Sprintf("no mains line of take %q stands out of the noise", s.Take.Name),
			Advice: fmt.Sprintf("record %.3g s to halve the bound", 4*s.DurationS())}
		bound(&r)
		return r
	}
	v := math.Sqrt(c.P / rest.P)
	var b budget.Budget
	b.A("noise at the lines", v*c.U/(2*c.P), 0)
	b.A("noise statistics", v*rest.U/(2*rest.P), 0)
	b.Into(&r)
	r.Value = &v
	return r
}

var mainsFrequency = &analyze.Measure{
	Name:     "mains_frequency",
	Title:    "frequency of the mains",
	Doc:      "Mean of the mains frequency over the span, from all orders that stand out of the noise, followed in blocks of about 1 s.",
	Formula:  "common frequency of the comb, least squares",
	Standard: "EN 50160 (what supplies may do)",
	Unit:     "Hz",
	Roles:    []string{"take"},
	Run:      runMainsFrequency,
}

func runMainsFrequency(p *analyze.Pass) analyze.Result {
	s, bad := p.Signal("take", "out")
	if bad != nil {
		return analyze.RefuseWith(hertz, bad)
	}
	l, bad := lines(p, s, 0)
	if bad != nil {
		return analyze.RefuseWith(hertz, bad)
	}
	if !l.MainsFound {
		return analyze.Refuse(hertz, analyze.BelowDetection, fmt.Sprintf("no mains line of take %q stands out of the noise", s.Take.Name), "lay a wire beside a mains lead and record that on a second channel; never connect anything to the mains")
	}
	f := l.MainsHz
	var b budget.Budget
	b.A("noise at the lines", stage.MainsHzU(l), 0)
	b.Clock(s, f)
	r := analyze.Result{Value: &f, Unit: hertz}
	b.Into(&r)
	r.Details = map[string]any{"mains_hz": f, "wander_hz": l.MainsTrack.Spread * s.RateHz, "span_s": []float64{s.StartS, s.StartS + s.DurationS()}}
	r.Figures = []analyze.Figure{stage.SpectrumFigure(p, l)}
	return r
}
