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
	return []*analyze.Measure{gain, phase, polarity, frequency, thd, harmonic, thdn, sinad, modulation, differenceFrequency}
}

// details of the fundamental in out.
func details(h *stage.Heard) map[string]any {
	f := h.Lo.Fundamental()
	d := map[string]any{
		"fundamental": map[string]any{"frequency_hz": f.Hz, "rms_v": f.RMS()},
		"span_s":      []float64{h.Out.StartS, h.Out.StartS + h.Out.DurationS()},
		"gap_hz":      h.Lo.GapHz,
		"periods":     h.Tone.Periods,
	}
	if !h.Tone.MainsResolved {
		d["mains_resolved"] = false
	}
	return d
}

func finish(r *analyze.Result, b *budget.Budget, p *analyze.Pass, h *stage.Heard) {
	b.Into(r)
	r.Details = details(h)
	r.FullScaleSine = h.Out.FullScaleSine()
	r.Figures = append(r.Figures, stage.ToneWaveform(h.Out, h.Tone.Hz), stage.SpectrumFigure(p, h.Lo))
	if !h.Tone.MainsResolved {
		r.Notes = append(r.Notes, "the span is too short to tell mains lines from the tone")
	}
	if h.Tone.OnMains > 0 {
		r.Notes = append(r.Notes, fmt.Sprintf("the tone lies %.3g Hz from mains order %d; the uncertainty includes their correlation", h.Tone.MainsGapHz, h.Tone.OnMains))
	}
	if k := toneOnMains(h.Lo); k > 0 {
		r.Flags = append(r.Flags, stage.ToneOnMainsFlag(h.Lo, k))
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

func runGain(p *analyze.Pass) analyze.Result {
	h, bad := stage.Listen(p, "take", 0)
	if bad != nil {
		return analyze.RefuseWith(dB, bad)
	}
	s, bad := stage.Input(p, h)
	if bad != nil {
		return analyze.RefuseWith(dB, bad)
	}
	g, bad := stage.GainOfHeard(p, p.Take("take"), h, s)
	if bad != nil {
		return analyze.RefuseWith(dB, bad)
	}
	r := analyze.Result{Value: &g.G, Unit: dB}
	finish(&r, &g.Budget, p, h)
	r.FullScaleSine = 0
	if h.In != nil && s.Lines == h.Li {
		r.Details["phase_deg"] = cmplx.Phase(g.Phasor) * 180 / math.Pi
		r.Details["in_rms_v"] = cmplx.Abs(s.Z) / math.Sqrt2
	}
	r.Details["out_rms_v"] = cmplx.Abs(h.Lo.Phasor()) / math.Sqrt2
	return stage.Rails(p, h.Lo, r)
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
func phased(p *analyze.Pass) (*stage.Heard, *analyze.Refusal) {
	h, bad := stage.Listen(p, "take", 0)
	if bad == nil && h.In == nil {
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
	deg := cmplx.Phase(h.Lo.Phasor()/h.Li.Phasor()) * 180 / math.Pi
	if deg <= -180 {
		deg = 180
	}
	var b budget.Budget
	perRad := 180 / math.Pi
	stage.AddTone(&b, h.Lo, "out", perRad)
	stage.AddTone(&b, h.Li, "in", perRad)
	b.Skew(h.Out, h.In, 360*h.Tone.Hz)
	stage.Separation(&b, h.Lo, h.Li, perRad)
	r := analyze.Result{Value: &deg, Unit: degree}
	finish(&r, &b, p, h)
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
	h, bad := stage.Listen(p, "take", 0)
	if bad != nil {
		return analyze.RefuseWith(hertz, bad)
	}
	f := h.Tone.Hz
	var b budget.Budget
	b.A("noise", h.Tone.UHz, 0)
	// Steps without dither move the phase of a block by StepU; over the span
	// they act like noise of that size.
	b.B("converter steps", stage.RelativeStepU(h.Lo)*math.Sqrt(3)/(math.Pi*h.Out.DurationS()))
	b.Clock(h.Out, f)
	r := analyze.Result{Value: &f, Unit: hertz}
	finish(&r, &b, p, h)
	if len(p.Params.At) > 0 {
		r.Details["ppm"] = (f/p.Params.At[0] - 1) * 1e6
	}
	r.Details["wander_hz"] = h.Tone.Track.Spread * h.Out.RateHz
	return r
}
