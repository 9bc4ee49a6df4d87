// Package tone holds the measures of a single test tone: gain, phase,
// polarity, frequency, harmonic distortion and distortion with noise.
//
// All of them rest on the joint least-squares fit of package stage: one
// frequency for all channels of a take, harmonics and mains lines fitted
// together with the tone, its slow drift followed from block to block. In
// white noise, amplitudes, phases and frequency reach the Cramer-Rao bound.
package tone

import (
	"fmt"
	"math"
	"math/cmplx"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
	"benchslip/analyze/stage"
	"benchslip/capture/unit"
)

var (
	dB      = unit.MustLookup("dB")
	percent = unit.MustLookup("%")
	degree  = unit.MustLookup("deg")
	hertz   = unit.MustLookup("Hz")
	count   = unit.MustLookup("")
)

// Measures lists the measures of this package.
func Measures() []*analyze.Measure {
	return []*analyze.Measure{gain, phase, polarity, frequency, thd, harmonic, thdn, sinad}
}

// heard is a take whose tone was found.
type heard struct {
	out, in *analyze.Signal // in nil without a second channel
	tone    *stage.Tone
	lo, li  *stage.Lines
}

// listen finds the tone of a role's take: searched in `in` when the take has
// one and needIn allows it, else in `out`, and followed in both.
func listen(p *analyze.Pass, role string, orders int) (*heard, *analyze.Refusal) {
	return listenTo(p, p.Take(role), role, orders)
}

func listenTo(p *analyze.Pass, t *analyze.Take, role string, orders int) (*heard, *analyze.Refusal) {
	h := &heard{}
	var bad *analyze.Refusal
	if h.out, bad = p.SignalOf(t, role, "out"); bad != nil {
		return nil, bad
	}
	if p.Wiring(t).In != "" {
		if h.in, bad = p.SignalOf(t, role, "in"); bad != nil {
			return nil, bad
		}
	}
	at := 0.0
	if len(p.Params.At) > 0 {
		at = p.Params.At[0]
	}
	search, other := h.out, h.in
	if h.in != nil {
		search, other = h.in, h.out
	}
	if h.tone, bad = stage.FindTone(p, at, search, other); bad != nil {
		return nil, bad
	}
	h.lo = stage.Decompose(p, h.out, stage.Options{Tone: h.tone, Orders: orders})
	if bad := present(h.lo); bad != nil {
		return nil, bad
	}
	if h.in != nil {
		h.li = stage.Decompose(p, h.in, stage.Options{Tone: h.tone})
		if bad := present(h.li); bad != nil {
			return nil, bad
		}
	}
	return h, nil
}

// falseAlarm is the probability that noise passes for a line.
const falseAlarm = 1e-3

// present refuses a fundamental that does not stand out of the noise.
func present(l *stage.Lines) *analyze.Refusal {
	f := l.Fundamental()
	if f == nil || math.IsInf(l.Cond, 0) {
		return &analyze.Refusal{Code: analyze.TooShort,
			Text:   fmt.Sprintf("take %q: the tone cannot be told from its neighbours in %.4g s", l.Sig.Take.Name, l.Sig.DurationS()),
			Advice: fmt.Sprintf("record %.3g s or more", 4*l.Sig.DurationS())}
	}
	read := f.Whole + f.Share
	if read <= 0 || math.Sqrt(read) < budget.ShareThreshold(f.Dens/l.Sig.DurationS(), falseAlarm) {
		return &analyze.Refusal{Code: analyze.NoTone,
			Text:   fmt.Sprintf("take %q, channel %d: no tone at %.6g Hz stands out of the noise", l.Sig.Take.Name, l.Sig.Channel(), f.Hz),
			Advice: "check the wiring, or raise the level"}
	}
	return nil
}

// noiseU is the relative standard uncertainty of a fundamental's amplitude
// (and its phase in rad) from noise.
func noiseU(l *stage.Lines) float64 { return l.PhasorU(l.Fundamental()) / cmplx.Abs(l.Phasor()) }

// stepU is the relative standard uncertainty that converter steps bring when
// no dither hides them (noise under 0.45 step RMS; triangular dither gives
// 0.5): errors of lines stay within a quarter of a step, taken as
// rectangular.
func stepU(l *stage.Lines) float64 { return stage.StepU(l) / cmplx.Abs(l.Phasor()) }

// addTone adds what the reading of one fundamental contributes to a value
// proportional to it.
func addTone(b *budget.Budget, l *stage.Lines, what string, value float64) {
	b.A("noise in "+what, noiseU(l)*value, 0)
	b.B("converter steps in "+what, stepU(l)*value)
	if s := l.ScatterU(); s > 0 {
		b.A("wander of the level in "+what, s*value, float64(len(l.Blocks)-1))
	}
}

// details of the fundamental in out.
func details(h *heard) map[string]any {
	f := h.lo.Fundamental()
	d := map[string]any{
		"fundamental": map[string]any{"frequency_hz": f.Hz, "rms_v": f.RMS()},
		"span_s":      []float64{h.out.StartS, h.out.StartS + h.out.DurationS()},
		"gap_hz":      h.lo.GapHz,
		"periods":     h.tone.Periods,
	}
	if !h.tone.MainsResolved {
		d["mains_resolved"] = false
	}
	return d
}

func finish(r *analyze.Result, b *budget.Budget, p *analyze.Pass, h *heard) {
	b.Into(r)
	r.Details = details(h)
	r.FullScaleSine = h.out.FullScaleSine()
	r.Figures = append(r.Figures, stage.ToneWaveform(h.out, h.tone.Hz), stage.SpectrumFigure(p, h.lo))
	if !h.tone.MainsResolved {
		r.Notes = append(r.Notes, "the span is too short to tell mains lines from the tone")
	}
	if h.tone.OnMains > 0 {
		r.Notes = append(r.Notes, fmt.Sprintf("the tone lies %.3g Hz from mains order %d; the uncertainty includes their correlation", h.tone.MainsGapHz, h.tone.OnMains))
	}
	if k := toneOnMains(h.lo); k > 0 {
		r.Flags = append(r.Flags, stage.ToneOnMainsFlag(h.lo, k))
	}
}

// toneOnMains is the lowest mains order above 5 that the tone covers, 0: none.
func toneOnMains(l *stage.Lines) int {
	for _, q := range l.Mains {
		if q.Dropped && q.Order > 5 && math.Abs(q.Hz-l.Fundamental().Hz) < 1.5 && l.MainsFound {
			return q.Order
		}
	}
	return 0
}

var gain = &analyze.Measure{
	Name:  "gain",
	Title: "voltage gain of the tone, output over input",
	Doc: "Ratio of the tone's amplitude at the output to that across the unit's input terminals, at one common frequency fitted in both channels. " +
		"The input comes from a second channel (in), from another take (in_take), or from a stated level (in_level, the RMS of the tone).",
	Formula:  "G = |U_out| / |U_in|;  20 lg G dB",
	Standard: "IEC 60268-3 (gain); sine fit after IEEE Std 1057",
	Unit:     "dB",
	Roles:    []string{"take"},
	Keys:     []string{"at", "in_take", "rails"},
	Run:      runGain,
}

// source of the input tone.
type stimulus struct {
	z     complex128 // peak phasor; phase only with the same take
	lines *stage.Lines
	level float64 // stated RMS, V, instead
}

// input finds what drove the unit.
func input(p *analyze.Pass, h *heard) (stimulus, *analyze.Refusal) {
	t := p.Take("take")
	w := p.Wiring(t)
	switch {
	case p.Has("in_take"):
		other := p.Take("in_take")
		key := "out"
		if p.Wiring(other).In != "" {
			key = "in"
		}
		sig, bad := p.SignalOf(other, "in_take", key)
		if bad != nil {
			return stimulus{}, bad
		}
		tn, bad := stage.FindTone(p, h.tone.Hz, sig)
		if bad != nil {
			return stimulus{}, bad
		}
		if math.Abs(tn.Hz/h.tone.Hz-1) > 500e-6 {
			return stimulus{}, &analyze.Refusal{Code: analyze.NoTone,
				Text:   fmt.Sprintf("take %q holds a tone at %.7g Hz, take %q at %.7g Hz: over 500 ppm apart", t.Name, h.tone.Hz, other.Name, tn.Hz),
				Advice: "record both takes with the same tone"}
		}
		l := stage.Decompose(p, sig, stage.Options{Tone: tn})
		if bad := present(l); bad != nil {
			return stimulus{}, bad
		}
		return stimulus{z: l.Phasor(), lines: l}, nil
	case h.in != nil:
		return stimulus{z: h.li.Phasor(), lines: h.li}, nil
	case w.InLevel != nil:
		if h.out.Unit != "V" {
			return stimulus{}, &analyze.Refusal{Code: analyze.Uncalibrated,
				Text:   fmt.Sprintf("the input level is stated in volts, take %q has no volts at full scale", t.Name),
				Advice: "state full_scale_peak for its gear, or record the input on a second channel"}
		}
		return stimulus{level: w.InLevel.Linear()}, nil
	}
	return stimulus{}, &analyze.Refusal{Code: analyze.MissingTake,
		Text:   fmt.Sprintf("take %q names no input: neither `in`, `in_take` nor `in_level`", t.Name),
		Advice: "record the stimulus on a second channel and name it with `in`, or state `in_level`"}
}

func runGain(p *analyze.Pass) analyze.Result {
	h, bad := listen(p, "take", 0)
	if bad != nil {
		return analyze.RefuseWith(dB, bad)
	}
	s, bad := input(p, h)
	if bad != nil {
		return analyze.RefuseWith(dB, bad)
	}
	t := p.Take("take")
	var b budget.Budget
	var g float64
	z := h.lo.Phasor()
	if s.lines != nil {
		if (s.lines.Sig.Unit == "V") != (h.out.Unit == "V") {
			return analyze.Refuse(dB, analyze.Uncalibrated, "one of the two channels has no volts at full scale", "state full_scale_peak for both")
		}
		g = cmplx.Abs(z) / cmplx.Abs(s.z)
		addTone(&b, h.lo, "out", g)
		addTone(&b, s.lines, "in", g)
		b.Ratio(h.out, s.lines.Sig, g)
	} else {
		g = cmplx.Abs(z) / math.Sqrt2 / s.level
		addTone(&b, h.lo, "out", g)
		b.Scale(h.out, g)
		b.InLevel(t, p.Wiring(t), g)
	}
	r := analyze.Result{Value: &g, Unit: dB}
	finish(&r, &b, p, h)
	r.FullScaleSine = 0
	if h.in != nil && s.lines == h.li {
		r.Details["phase_deg"] = cmplx.Phase(z/s.z) * 180 / math.Pi
		r.Details["in_rms_v"] = cmplx.Abs(s.z) / math.Sqrt2
	}
	r.Details["out_rms_v"] = cmplx.Abs(z) / math.Sqrt2
	return stage.Rails(p, h.lo, r)
}

var phase = &analyze.Measure{
	Name:  "phase",
	Title: "phase of the tone at the output against the input",
	Doc: "Phase of out re in within one take, in (-180, 180] deg, time convention exp(+j w t): positive when the output leads. " +
		"Delay is not removed.",
	Formula:  "phi = arg(U_out / U_in)",
	Standard: "sine fit after IEEE Std 1057",
	Unit:     "deg",
	Roles:    []string{"take"},
	Keys:     []string{"at"},
	Run:      runPhase,
}

// phased finds the tone in both channels of the take.
func phased(p *analyze.Pass) (*heard, *analyze.Refusal) {
	h, bad := listen(p, "take", 0)
	if bad == nil && h.in == nil {
		bad = &analyze.Refusal{Code: analyze.MissingTake,
			Text:   fmt.Sprintf("take %q names no `in`: phase needs the stimulus on a second channel of the same take", p.Take("take").Name),
			Advice: "record the stimulus on a second channel and name it with `in`"}
	}
	return h, bad
}

func runPhase(p *analyze.Pass) analyze.Result {
	h, bad := phased(p)
	if bad != nil {
		return analyze.RefuseWith(degree, bad)
	}
	deg := cmplx.Phase(h.lo.Phasor()/h.li.Phasor()) * 180 / math.Pi
	if deg <= -180 {
		deg = 180
	}
	var b budget.Budget
	perRad := 180 / math.Pi
	addTone(&b, h.lo, "out", perRad)
	addTone(&b, h.li, "in", perRad)
	b.Skew(h.out, h.in, 360*h.tone.Hz)
	r := analyze.Result{Value: &deg, Unit: degree}
	finish(&r, &b, p, h)
	return r
}

var polarity = &analyze.Measure{
	Name:     "polarity",
	Title:    "whether the output follows (+1) or inverts (-1) the input",
	Doc:      "From the phase of the tone: +1 when cos(phase) > 0.5, -1 when it is below -0.5, else it cannot be told from this tone. No uncertainty band.",
	Formula:  "sign(cos arg(U_out/U_in))",
	Standard: "common practice",
	Unit:     "",
	Roles:    []string{"take"},
	Keys:     []string{"at"},
	Run:      runPolarity,
}

func runPolarity(p *analyze.Pass) analyze.Result {
	h, bad := phased(p)
	if bad != nil {
		return analyze.RefuseWith(count, bad)
	}
	ph := cmplx.Phase(h.lo.Phasor() / h.li.Phasor())
	c := math.Cos(ph)
	v := math.Copysign(1, c)
	if math.Abs(c) <= 0.5 {
		return analyze.Refuse(count, analyze.NotEnoughPoints,
			fmt.Sprintf("the output is %.1f deg from the input at %.6g Hz: neither in phase nor inverted", ph*180/math.Pi, h.tone.Hz),
			"use a lower or middle frequency, or the pulse stimulus")
	}
	r := analyze.Result{Value: &v, Unit: count}
	finish(&r, &budget.Budget{}, p, h)
	r.Details["phase_deg"] = ph * 180 / math.Pi
	return r
}

var frequency = &analyze.Measure{
	Name:     "tone_frequency",
	Title:    "frequency of the tone",
	Doc:      "Mean frequency of the tone over the span, against the recorder's own clock. With `at` stated the difference is given in ppm.",
	Formula:  "slope of the phase over time / 2 pi",
	Standard: "Cramer-Rao bound: Rife and Boorstyn 1974",
	Unit:     "Hz",
	Roles:    []string{"take"},
	Keys:     []string{"at"},
	Run:      runFrequency,
}

func runFrequency(p *analyze.Pass) analyze.Result {
	h, bad := listen(p, "take", 0)
	if bad != nil {
		return analyze.RefuseWith(hertz, bad)
	}
	f := h.tone.Hz
	var b budget.Budget
	b.A("noise", h.tone.UHz, 0)
	// Steps without dither move the phase of a block by StepU; over the span
	// they act like noise of that size.
	b.B("converter steps", stepU(h.lo)*math.Sqrt(3)/(math.Pi*h.out.DurationS()))
	b.Clock(h.out, f)
	r := analyze.Result{Value: &f, Unit: hertz}
	finish(&r, &b, p, h)
	if len(p.Params.At) > 0 {
		r.Details["ppm"] = (f/p.Params.At[0] - 1) * 1e6
	}
	r.Details["wander_hz"] = h.tone.Track.Spread * h.out.RateHz
	return r
}
