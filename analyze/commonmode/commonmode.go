// Package commonmode measures common-mode rejection from two takes, one driven
// differentially, one with both pins joined.
//
// Gains are complex, from the joint fit at one frequency; the common-mode gain
// keeps its sign and phase, which tell a resistor mismatch (in phase or
// inverted) from a capacitive one (quadrature).
package commonmode

import (
	"fmt"
	"math"
	"math/cmplx"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
	"benchslip/analyze/stage"
	"benchslip/capture/unit"
)

var dB = unit.MustLookup("dB")

// Measures lists the measures of this package.
func Measures() []*analyze.Measure { return []*analyze.Measure{cmrr} }

var cmrr = &analyze.Measure{
	Name:  "cmrr",
	Title: "common-mode rejection ratio",
	Doc: "Differential gain over common-mode gain at one frequency or several. `differential`: the drive between pin 2 and pin 3; `common`: both pins driven " +
		"together against pin 1. Gains from `in` or `in_level` of each take, so levels may differ; both at one gain setting. Of several frequencies the " +
		"smallest ratio is the value and the worst verdict the row's. For the imbalanced source of the standard record `common` twice more, with 10 ohm in series " +
		"with either leg, and give each a row: the worse one counts. With phases (`in` in both takes) the details hold the parts of the common-mode gain, and with " +
		"r1 .. r4 what to trim: R1 from pin 3 to the inverting input, R2 its feedback, R3 from pin 2 to the other input, R4 from there to 0 V.",
	Formula:  "CMRR = 20 lg(|G_d| / |G_c|)",
	Standard: "IEC 60268-3 (balance of the input; there with 10 ohm of source imbalance)",
	Unit:     "dB",
	Roles:    []string{"differential", "common"},
	Keys:     []string{"at", "source", "source_match", "r1", "r2", "r3", "r4"},
	Run:      run,
}

// point is the ratio at one frequency.
type point struct {
	hz, value    float64
	lines        []analyze.Contributor
	lacking      []string
	bound        *analyze.Bound
	refusal      *analyze.Refusal
	gd, gc       complex128
	phases       bool
	mains        bool
	diff, common *stage.Lines
}

func run(p *analyze.Pass) analyze.Result {
	d, c := p.Take("differential"), p.Take("common")
	if d == nil || c == nil {
		return analyze.Refuse(dB, analyze.MissingTake, "both `differential` and `common` must name a take", "name both in the job")
	}
	if bad := stage.SameGain(d, c); bad != nil {
		return analyze.RefuseWith(dB, bad)
	}
	at := p.Params.At
	if len(at) == 0 {
		at = []float64{0}
	}
	var points []point
	for _, hz := range at {
		points = append(points, measure(p, d, c, hz))
	}
	return gather(p, points)
}

// gains finds one take's complex gain at hz. The tone of the common take may
// be too weak to see: then what lies at like's frequency is read.
func measure(p *analyze.Pass, d, c *analyze.Take, hz float64) point {
	pt := point{hz: hz}
	h, bad := stage.ListenAt(p, d, "differential", hz, 0)
	if bad != nil {
		pt.refusal = mainsClash(p, d, bad, hz)
		return pt
	}
	pt.hz, pt.diff, pt.mains = h.Tone.Hz, h.Lo, h.Tone.MainsResolved
	sd, bad := stage.InputOf(p, d, h)
	if bad != nil {
		pt.refusal = bad
		return pt
	}
	gd, bad := stage.GainOfHeard(p, d, h, sd)
	if bad != nil {
		pt.refusal = bad
		return pt
	}
	hc, seen, bad := hearCommon(p, c, h)
	if bad != nil {
		pt.refusal = mainsClash(p, c, bad, pt.hz)
		return pt
	}
	if math.Abs(hc.Tone.Hz/h.Tone.Hz-1) > 0.01 {
		pt.refusal = &analyze.Refusal{Code: analyze.NoTone,
			Text: fmt.Sprintf("takes %q and %q hold tones at %.6g and %.6g Hz", d.Name, c.Name, h.Tone.Hz, hc.Tone.Hz), Advice: "record both with the same tone"}
		return pt
	}
	pt.common = hc.Lo
	sc, bad := stage.InputOf(p, c, hc)
	if bad != nil {
		pt.refusal = bad
		return pt
	}
	gc, bad := stage.GainOfHeard(p, c, hc, sc)
	if bad != nil {
		pt.refusal = bad
		return pt
	}
	pt.phases = sd.Lines != nil && sc.Lines != nil
	pt.gd, pt.gc = gd.Phasor, gc.Phasor
	f := hc.Lo.Fundamental()
	if !seen {
		upper, ok := budget.UpperBound(f.Whole+f.Share, f.Share, 1, 0.95)
		if !ok {
			upper = budget.ShareThreshold(f.Share, stage.FalseAlarm)
		}
		upper += stage.StepU(hc.Lo)
		gcMax := upper * gc.G / (cmplx.Abs(hc.Lo.Phasor()) / math.Sqrt2)
		if s := separation(hc.Out, hc.In); s > 0 {
			gcMax += s
		}
		pt.bound = &analyze.Bound{Upper: false, Value: gd.G / gcMax}
		pt.refusal = &analyze.Refusal{Code: analyze.BelowDetection,
			Text:   fmt.Sprintf("take %q: what is left of the common tone at %.6g Hz does not stand out of the noise", c.Name, pt.hz),
			Advice: "drive the common mode harder, or record longer"}
		return pt
	}
	// The line's power with its noise share off, not the biased amplitude.
	size := gc.G * math.Sqrt(math.Max(f.Whole, f.Share*0.1)/(f.Whole+f.Share))
	pt.value = gd.G / size
	pt.lines = budget.Difference(gd.Budget.Lines, gc.Budget.Lines, pt.value/gd.G, pt.value/gc.G)
	g := stage.Gain{Budget: gc.Budget, Cancels: true}
	pt.lacking = stage.Lacking(gd.Budget.Lacking, g)
	return pt
}

// hearCommon finds the tone in the common take: in its `in` where it has one,
// else in `out`, else at the differential take's frequency. seen: it stands
// out of the noise in `out`.
func hearCommon(p *analyze.Pass, c *analyze.Take, d *stage.Heard) (h *stage.Heard, seen bool, bad *analyze.Refusal) {
	h = &stage.Heard{}
	if h.Out, h.In, h.Steps, bad = stage.Channels(p, c, "common", d.Tone.Hz); bad != nil {
		return nil, false, bad
	}
	if h.In != nil {
		if h.Tone, bad = stage.FindTone(p, d.Tone.Hz, h.In, h.Out); bad != nil {
			return nil, false, bad
		}
		h.Li = stage.Decompose(p, h.In, stage.Options{Tone: h.Tone})
	} else if h.Tone, bad = stage.FindTone(p, d.Tone.Hz, h.Out); bad != nil {
		if bad.Code != analyze.NoTone && bad.Code != analyze.NoSignal {
			return nil, false, bad
		}
		h.Tone = stage.ToneAt(h.Out, d.Tone.Hz, d.Tone)
	}
	h.Lo = stage.Decompose(p, h.Out, stage.Options{Tone: h.Tone})
	if h.Lo.Fundamental() == nil {
		return nil, false, stage.Present(h.Lo)
	}
	return h, stage.Present(h.Lo) == nil, nil
}

// separation is the linear crosstalk of the recorder from in to out, in
// out volts a volt of in; 0: none stated.
func separation(out, in *analyze.Signal) float64 {
	if in == nil || out.Gear.Separation == 0 {
		return 0
	}
	return math.Pow(10, -out.Gear.Separation/20)
}

// mainsClash names the case in which the frequency asked lies on the mains.
func mainsClash(p *analyze.Pass, t *analyze.Take, bad *analyze.Refusal, hz float64) *analyze.Refusal {
	if bad.Code != analyze.TooShort || hz == 0 || t.Rec == nil {
		return bad
	}
	mains := p.MainsHz
	if mains == 0 {
		return bad
	}
	gap, order := stage.NearMains(hz, mains, 5)
	T := t.Rec.Info().DurationS()
	if T*mains >= 10 && gap < 0.2/T {
		return &analyze.Refusal{Code: analyze.AmbiguousTone,
			Text:   fmt.Sprintf("%.6g Hz lies on mains order %d: hum cannot be told from the tone", hz, order),
			Advice: fmt.Sprintf("drive at %.4g Hz instead", hz-3)}
	}
	return bad
}

func gather(p *analyze.Pass, points []point) analyze.Result {
	r := analyze.Result{Unit: dB, Details: map[string]any{}}
	worst := -1
	limit := func(pt point) float64 {
		switch {
		case pt.refusal == nil:
			return pt.value
		case pt.bound != nil:
			return pt.bound.Value
		}
		return math.Inf(-1)
	}
	for i, pt := range points {
		if worst < 0 || limit(pt) < limit(points[worst]) {
			worst = i
		}
	}
	list := []map[string]any{}
	for _, pt := range points {
		list = append(list, pt.details())
	}
	w := points[worst]
	r.Refusal, r.Bound = w.refusal, w.bound
	if w.refusal == nil {
		v := w.value
		r.Value, r.Budget, r.Lacking = &v, w.lines, w.lacking
	}
	if w.bound != nil {
		r.Details["lower_bound"] = dB.FromLinear(w.bound.Value)
	}
	if len(points) > 1 {
		for _, pt := range points {
			q := analyze.Point{Label: fmt.Sprintf("%.6g Hz", pt.hz), Bound: pt.bound, Refusal: pt.refusal}
			if pt.refusal == nil {
				v := pt.value
				q.Value, q.Budget = &v, pt.lines
			}
			r.Points = append(r.Points, q)
		}
	}
	r.Details["points"] = list
	r.Details["mismatch"] = nil
	if mid := near1k(points); mid >= 0 {
		if e, u, ok := points[mid].mismatch(); ok {
			r.Details["mismatch"], r.Details["mismatch_uncertainty"], r.Details["mismatch_hz"] = e, 2*u, points[mid].hz
			r.Details["mismatch_note"] = "(R4/R3)/(R2/R1) - 1 of a one-op-amp stage that holds all the gain"
		}
	}
	if q, ok := partsOf(points); ok {
		r.Details["parts"] = q.details()
		r.Opinions = append(r.Opinions, q.opinions()...)
		for _, say := range []struct {
			key  string
			look func() ([]string, map[string]any)
		}{
			{"trim", func() ([]string, map[string]any) { return trim(p, points, q) }},
			{"capacitance", func() ([]string, map[string]any) { return capacitors(p, q) }},
			{"coupling", func() ([]string, map[string]any) { return coupling(p, q) }},
			{"loading", func() ([]string, map[string]any) { return loading(p) }},
		} {
			text, more := say.look()
			if more != nil {
				r.Details[say.key] = more
			}
			if say.key == "loading" {
				r.Notes = append(r.Notes, text...)
			} else {
				r.Opinions = append(r.Opinions, text...)
			}
		}
	}
	if !w.mains && w.diff != nil {
		r.Details["mains_resolved"] = false
	}
	r.Notes = append(r.Notes, fixture(p)...)
	if w.common != nil {
		r.Figures = append(r.Figures, stage.SpectrumFigure(p, w.common), stage.SpectrumFigure(p, w.diff))
	}
	if len(points) > 1 {
		r.Figures = append(r.Figures, figure(points))
	}
	return r
}

func (pt point) details() map[string]any {
	e := map[string]any{"frequency_hz": pt.hz, "cmrr_db": nil, "uncertainty_db": nil, "differential_gain_db": nil,
		"common_gain_db": nil, "common_phase_deg": nil}
	if g := cmplx.Abs(pt.gd); g > 0 {
		e["differential_gain_db"] = dB.FromLinear(g)
	}
	if pt.refusal != nil {
		e["reason"] = pt.refusal.Code
		if pt.bound != nil {
			e["lower_bound_db"] = dB.FromLinear(pt.bound.Value)
		}
		return e
	}
	u, _ := budget.Combine(pt.lines)
	e["cmrr_db"] = dB.FromLinear(pt.value)
	e["uncertainty_db"] = 2 * budget.DecibelsPer(unit.Ratio) * u / pt.value
	e["common_gain_db"] = dB.FromLinear(cmplx.Abs(pt.gd) / pt.value)
	if pt.phases {
		e["common_phase_deg"] = cmplx.Phase(pt.gc) * 180 / math.Pi
		e["in_phase"], e["quadrature"] = real(pt.turned()), imag(pt.turned())
	}
	return e
}

func figure(points []point) analyze.Figure {
	fig := analyze.Figure{ID: "cmrr", Title: "Common-mode rejection over frequency",
		Caption: "each point from a pair of takes; the higher the better",
		X:       analyze.Axis{Label: "frequency", Unit: "Hz", Log: true}, Y: analyze.Axis{Label: "CMRR", Unit: "dB"}}
	s := analyze.Series{Name: "CMRR", Kind: analyze.Points}
	for _, pt := range points {
		if pt.refusal == nil {
			s.X = append(s.X, pt.hz)
			s.Y = append(s.Y, dB.FromLinear(pt.value))
			fig.ID = fmt.Sprintf("cmrr-%s-%s", pt.diff.Sig.Take.Name, pt.common.Sig.Take.Name)
		}
	}
	fig.Series = []analyze.Series{s}
	return fig
}
