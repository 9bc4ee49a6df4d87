// Package level holds the measures of size: DC, RMS in a band, peak, crest
// factor, and readings entered by hand.
package level

import (
	"fmt"
	"math"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
	"benchslip/analyze/stage"
	"benchslip/capture/unit"
)

var (
	volt  = unit.MustLookup("V")
	fs    = unit.MustLookup("FS")
	dBFS  = unit.MustLookup("dBFS")
	ratio = unit.MustLookup("x")
)

// Measures lists the measures of this package.
func Measures() []*analyze.Measure {
	return []*analyze.Measure{dc, level, peak, crest, entered}
}

// plainUnit is V, or FS for takes without volts at full scale.
func plainUnit(s *analyze.Signal) unit.Unit {
	if s.Unit == "FS" {
		return fs
	}
	return volt
}

// rmsUnit is V, or dBFS for takes without volts at full scale.
func rmsUnit(s *analyze.Signal) unit.Unit {
	if s.Unit == "FS" {
		return dBFS
	}
	return volt
}

func spanOf(s *analyze.Signal) []float64 { return []float64{s.StartS, s.StartS + s.DurationS()} }

var dc = &analyze.Measure{
	Name:  "dc",
	Title: "DC voltage",
	Doc: "The constant of the least-squares fit of DC and all lines present (tone, hum), signed. The band is not used. A recorder whose input is AC-coupled " +
		"cannot show it.",
	Formula:  "x(t) = DC + sum of lines + noise",
	Standard: "IEEE Std 1057 (offset of the sine fit)",
	Unit:     "V",
	Roles:    []string{"take"},
	Run:      runDC,
}

func runDC(p *analyze.Pass) analyze.Result {
	s, bad := p.Signal("take", "out")
	if bad != nil {
		return analyze.RefuseWith(volt, bad)
	}
	u := plainUnit(s)
	if !s.Gear.DC {
		return analyze.Refuse(u, analyze.ACCoupled,
			fmt.Sprintf("take %q was recorded through an AC-coupled input, which does not pass DC", s.Take.Name),
			"record it with a DC-coupled scope or meter; or, where the input does pass DC, state coupling = \"dc\" for the gear")
	}
	l := stage.Apart(p, "take", s, 0)
	v := l.DC
	var b budget.Budget
	b.A("noise", math.Sqrt(l.DensityAt(0)/(2*s.DurationS())), 0)
	b.Scale(s, v)
	b.Offset(s, 1)
	if math.Sqrt(l.Residual) < 0.45*s.Step {
		b.Quantisation(s, 1)
	}
	r := analyze.Result{Value: &v, Unit: u}
	b.Into(&r)
	r.Details = map[string]any{"span_s": spanOf(s)}
	r.Figures = []analyze.Figure{stage.WaveformFigure(s, s.DurationS())}
	return r
}

var level = &analyze.Measure{
	Name:  "level",
	Title: "RMS level in a band",
	Doc: "RMS of everything in the band (20 Hz to 20 kHz unless stated): tones, harmonics, hum and noise, DC left out. A line counts when its frequency lies " +
		"in the band (the upper edge widened by 0.1 %); noise is integrated with straight edges.",
	Formula:  "U = sqrt(sum of line powers + integral of the noise density)",
	Standard: "AES17 (level), common practice",
	Unit:     "V",
	Roles:    []string{"take"},
	Keys:     []string{"band", "floor", "rails"},
	Run:      runLevel,
}

func runLevel(p *analyze.Pass) analyze.Result {
	s, bad := p.Signal("take", "out")
	if bad != nil {
		return analyze.RefuseWith(volt, bad)
	}
	u := rmsUnit(s)
	band, bad := stage.BandFor(s, p.Params.BandOr(20, 20000))
	if bad != nil {
		return analyze.RefuseWith(u, bad)
	}
	l := stage.Apart(p, "take", s, 0)
	total := stage.Everything(l, band, nil)
	if total.P <= 0 {
		return analyze.Refuse(u, analyze.NoSignal, fmt.Sprintf("take %q, channel %d: nothing is left in the band beside DC", s.Take.Name, s.Channel()), "check the connection and the channel")
	}
	v := math.Sqrt(total.P)
	var b budget.Budget
	b.A("noise in the band", total.U/(2*v), 0)
	b.B("converter steps", stage.StepU(l)/math.Sqrt2)
	b.Scale(s, v)
	r := analyze.Result{Value: &v, Unit: u, FullScaleSine: s.FullScaleSine()}
	b.Into(&r)
	r.Details = map[string]any{"span_s": spanOf(s), "band_hz": []float64{band.Low, band.High}}
	if band.Open {
		r.Details["lower_edge_resolved"] = false
		r.Notes = append(r.Notes, "the span is too short for the lower band edge: everything but DC up to the upper edge counts")
	}
	if l.Tone != nil {
		r.Details["fundamental"] = map[string]any{"frequency_hz": l.Tone.Hz, "rms_v": l.Fundamental().RMS()}
	}
	r.Figures = []analyze.Figure{stage.SpectrumFigure(p, l)}
	f, ok, bad := stage.TakeFloor(p, total, func(s *analyze.Signal) (stage.Power, *analyze.Refusal) {
		if _, bad := stage.BandFor(s, band.Band); bad != nil {
			return stage.Power{}, bad
		}
		return stage.Everything(stage.Apart(p, "floor", s, 0), band, nil), nil
	})
	if bad != nil {
		return analyze.RefuseWith(u, bad)
	}
	if ok {
		r = stage.Floor(r, f)
	}
	if l.Tone != nil {
		return stage.Rails(p, l, r)
	}
	return r
}

// extremes of a signal and its first two moments.
type extremes struct{ min, max, mean, rms float64 }

func scan(s *analyze.Signal) extremes {
	e := extremes{min: math.Inf(1), max: math.Inf(-1)}
	buf := make([]float64, min(s.Len(), 1<<15))
	walk := func(fn func(x float64)) {
		for at := 0; ; {
			n := s.Read(buf, at)
			if n == 0 {
				return
			}
			for _, x := range buf[:n] {
				fn(x)
			}
			at += n
		}
	}
	n := float64(s.Len())
	walk(func(x float64) {
		e.min, e.max = math.Min(e.min, x), math.Max(e.max, x)
		e.mean += x / n
	})
	walk(func(x float64) { e.rms += (x - e.mean) * (x - e.mean) / n })
	e.rms = math.Sqrt(e.rms)
	return e
}

var peak = &analyze.Measure{
	Name:     "peak",
	Title:    "largest excursion",
	Doc:      "Largest absolute sample in the span, DC included, samples as they stand (no interpolation between them).",
	Formula:  "max |x|",
	Standard: "common practice",
	Unit:     "V",
	Roles:    []string{"take"},
	Keys:     []string{"rails"},
	Run:      runPeak,
}

func runPeak(p *analyze.Pass) analyze.Result {
	s, bad := p.Signal("take", "out")
	if bad != nil {
		return analyze.RefuseWith(volt, bad)
	}
	e := scan(s)
	v := math.Max(math.Abs(e.min), math.Abs(e.max))
	var b budget.Budget
	b.Scale(s, v)
	if s.Gear.DC {
		b.Offset(s, 1)
	}
	b.Quantisation(s, 1)
	r := analyze.Result{Value: &v, Unit: plainUnit(s)}
	b.Into(&r)
	r.Details = map[string]any{"min_v": e.min, "max_v": e.max, "pp_v": e.max - e.min, "span_s": spanOf(s)}
	r.Figures = []analyze.Figure{stage.WaveformFigure(s, s.DurationS())}
	if k := p.Params.Rails; k != nil && s.Unit == "V" && v > math.Abs(k.Value.Linear())*1.02 {
		return analyze.Refuse(volt, analyze.Impossible,
			fmt.Sprintf("the output would swing %.4g V past rails of %.4g V", v, math.Abs(k.Value.Linear())), "check full_scale_peak or the probe factor of the gear")
	}
	return r
}

var crest = &analyze.Measure{
	Name:     "crest",
	Title:    "crest factor",
	Doc:      "Largest excursion from the mean over the RMS about the mean, over all samples of the span; sine 1.414 (3.01 dB), triangle 1.732.",
	Formula:  "max|x - mean| / RMS(x - mean)",
	Standard: "IEC 60268-1 (crest factor, from memory)",
	Unit:     "x",
	Roles:    []string{"take"},
	Run:      runCrest,
}

func runCrest(p *analyze.Pass) analyze.Result {
	s, bad := p.Signal("take", "out")
	if bad != nil {
		return analyze.RefuseWith(ratio, bad)
	}
	e := scan(s)
	if e.rms == 0 || e.min == e.max {
		return analyze.Refuse(ratio, analyze.NoSignal, fmt.Sprintf("take %q, channel %d: every sample is equal", s.Take.Name, s.Channel()), "check the connection and the channel, and record again")
	}
	top := math.Max(e.max-e.mean, e.mean-e.min)
	v := top / e.rms
	var b budget.Budget
	b.Quantisation(s, v/top)
	b.A("noise of one sample's place", v/math.Sqrt(2*float64(s.Len())), 0)
	r := analyze.Result{Value: &v, Unit: ratio}
	b.Into(&r)
	r.Details = map[string]any{"min_v": e.min, "max_v": e.max, "mean_v": e.mean, "rms_v": e.rms, "span_s": spanOf(s)}
	r.Figures = []analyze.Figure{stage.WaveformFigure(s, s.DurationS())}
	return r
}

var entered = &analyze.Measure{
	Name:     "entered",
	Title:    "a reading taken by hand",
	Doc:      "A value and its expanded uncertainty (k = 2) as typed in the job file, judged like any other and marked as entered by hand.",
	Formula:  "as typed",
	Standard: "none",
	Unit:     "",
	Keys:     []string{"value", "uncertainty", "with"},
	Run:      runEntered,
}

func runEntered(p *analyze.Pass) analyze.Result {
	q := p.Params.Value
	if q == nil {
		return analyze.Refuse(ratio, analyze.MissingTake, "no `value` is stated", "type the reading as `value`")
	}
	v := q.Linear()
	var b budget.Budget
	b.Stated("stated uncertainty of the reading", &analyze.Stated{Value: *q, Uncertainty: p.Params.Uncertainty, Key: "uncertainty"}, v)
	r := analyze.Result{Value: &v, Unit: q.Unit}
	b.Into(&r)
	r.Notes = []string{"entered by hand"}
	return r
}
