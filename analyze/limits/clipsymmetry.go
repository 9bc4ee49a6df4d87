package limits

import (
	"fmt"
	"math"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
	"benchslip/analyze/stage"
)

var clipSymmetry = &analyze.Measure{
	Name:  "clip_symmetry",
	Title: "how evenly the two halves of a wave clip",
	Doc: "Difference of the levels at which the two halves flatten over their sum, each the median of the flat measured from the centre of a sine fitted to the samples " +
		"outside both flats, so that a recorder that blocks DC reads the same. Positive when the negative half flattens first. Where one half is not flat the sine's own " +
		"peak counts. Levels in volts stand in the details.",
	Formula:  "100 (V+ - V-)/(V+ + V-)",
	Standard: "common practice",
	Unit:     "%",
	Roles:    []string{"take"},
	Keys:     []string{"at", "rails", "rails_uncertainty"},
	Run:      runClipSymmetry,
}

func runClipSymmetry(p *analyze.Pass) analyze.Result {
	h, bad := stage.Listen(p, "take", 0)
	if bad != nil {
		return analyze.RefuseWith(percent, bad)
	}
	s := h.Out
	f, ok := stage.FlatsOf(h)
	r := analyze.Result{Unit: percent, FullScaleSine: s.FullScaleSine()}
	r.Figures = []analyze.Figure{stage.ToneWaveform(s, h.Tone.Hz), stage.SpectrumFigure(p, h.Lo)}
	r.Details = map[string]any{"fundamental": map[string]any{"frequency_hz": h.Tone.Hz, "rms_v": h.Lo.Fundamental().RMS()},
		"span_s": []float64{s.StartS, s.StartS + s.DurationS()}}
	if ok {
		for k, v := range details(f, s) {
			r.Details[k] = v
		}
	}
	if !ok || !f.Any() {
		r.Refusal = &analyze.Refusal{Code: analyze.NotEnoughPoints,
			Text:   fmt.Sprintf("take %q, channel %d: neither half of the wave is flat", s.Take.Name, s.Channel()),
			Advice: "record at a level at which the output clips by a decibel or more, below the recorder's full scale"}
		return r
	}
	sum := f.Positive + f.Negative
	v := (f.Positive - f.Negative) / sum
	var b budget.Budget
	// dv = 2 (V- dV+ - V+ dV-)/(V+ + V-)^2; the centre moves both.
	b.A("positive half", 2*f.Negative/(sum*sum)*f.PositiveU, 0)
	b.A("negative half", 2*f.Positive/(sum*sum)*f.NegativeU, 0)
	b.A("centre of the sine", 2/sum*f.CentreU, 0)
	r.Value = &v
	b.Into(&r)
	first := "the negative half flattens first"
	if v < 0 {
		first = "the positive half flattens first"
	}
	U := 2 * b.U()
	switch {
	case math.Abs(v) <= math.Max(U, 0.02):
		r.Notes = append(r.Notes, "both halves flatten at about the same level")
	default:
		r.Notes = append(r.Notes, first)
		r.Opinions = append(r.Opinions, fmt.Sprintf("%s, at %.3g against %.3g %s: consistent with one rail low, a bias fault or a dead half of the output stage; "+
			"to confirm, measure both rails under load and the DC on each stage", first, math.Min(f.Positive, f.Negative), math.Max(f.Positive, f.Negative), s.Unit))
	}
	r.Details["flattens_first"] = map[bool]string{true: "negative", false: "positive"}[v > 0]
	if s.Unit == "V" {
		text, more := opinion(f, p)
		for k, d := range more {
			r.Details[k] = d
		}
		if text != "" {
			r.Opinions = append(r.Opinions, text)
		}
		r = withinRails(p, h, f, r)
	}
	return r
}
