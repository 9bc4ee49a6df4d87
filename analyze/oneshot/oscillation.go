package oneshot

import (
	"fmt"
	"math"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
	"benchslip/capture/unit"
)

var oscillation = &analyze.Measure{
	Name:  "oscillation",
	Title: "strongest oscillation above a frequency",
	Doc: "RMS of the strongest narrow line, or of the hump of a wandering or irregular one, above `above` (20 kHz unless stated), while it lasts: while its " +
		"envelope is over half of its maximum. Details give the frequency, the band of a hump, when it starts and stops (the first burst), and whether it lasts " +
		"through the take. Lines that are harmonics of the signal do not count. None found: a bound for a steady line and, in the details, for a burst.",
	Formula:  "U = sqrt(mean of envelope^2 / 2) over the times when envelope > maximum/2",
	Standard: "common practice",
	Unit:     "V",
	Roles:    []string{"take"},
	Keys:     []string{"above"},
	Run:      runOscillation,
}

// mostHunted is the longest span, in samples, that is searched at once.
const mostHunted = 1 << 23

// mostSized is how many finds, the best first, are looked at closely before
// the search is given up.
const mostSized = 8

func runOscillation(p *analyze.Pass) analyze.Result {
	s, x, bad := samples(p)
	u := plainUnit(s)
	if bad != nil {
		return analyze.RefuseWith(u, bad)
	}
	above := 20e3
	if p.Params.Above != nil {
		above = *p.Params.Above
	}
	switch {
	case above > 0.4*s.RateHz:
		return analyze.Refuse(u, analyze.Bandwidth,
			fmt.Sprintf("oscillation is looked for above %.6g Hz, take %q reaches to %.6g Hz", above, s.Take.Name, 0.47*s.RateHz),
			"use a scope at 10 MS/s or more, or state a lower `above`")
	case len(x) > mostHunted:
		return analyze.Refuse(u, analyze.Unsupported,
			fmt.Sprintf("take %q holds %d samples in the span; oscillation is looked for in up to %d", s.Take.Name, len(x), mostHunted), "set a span")
	case len(x) < 4*firstFrame || float64(len(x)) < 2*lobe*s.RateHz/above:
		return analyze.Refuse(u, analyze.TooShort,
			fmt.Sprintf("take %q holds %d samples: less than %d periods of %.6g Hz", s.Take.Name, len(x), 2*lobe, above), "record a longer screen, or state a higher `above`")
	}
	var c calm
	c.of(x)
	if c.most == 0 {
		return analyze.Refuse(u, analyze.NoSignal, fmt.Sprintf("take %q, channel %d: every sample is equal", s.Take.Name, s.Channel()), "use a more sensitive range, and check the connection")
	}
	y := make([]float64, len(x))
	for i, v := range x {
		y[i] = v - c.mean
	}
	looks, finds := hunt(y, s.RateHz, above)
	least := stepsHide(x, s.Step)
	var harmonics []find
	for _, f := range finds { // the longest frames tell them best
		if f.look == looks[len(looks)-1] && f.ofComb(y, s.RateHz, looks) {
			harmonics = append(harmonics, f)
		}
	}
	for sized := 0; len(finds) > 0 && sized < mostSized; finds = finds[1:] {
		f := finds[0]
		if f.blend(harmonics) || f.ofComb(y, s.RateHz, looks) {
			continue
		}
		w := measureSwing(y, s.RateHz, f)
		if sized++; len(w.stays) > 0 && w.rms > least && w.hz >= above {
			return w.result(s, x, above)
		}
	}
	return nothing(s, x, looks, above, least)
}

// stepsHide is the RMS below which converter steps alone may pass for an
// oscillation: without noise to dither them (0.45 step), the error of a slow
// signal is a sawtooth whose first line has 0.225 of a step, RMS.
func stepsHide(x []float64, q float64) float64 {
	if q == 0 || successive(x, math.Inf(-1), math.Inf(1)) > 0.45*q {
		return 0
	}
	return 0.3 * q
}

func (w *swing) result(s *analyze.Signal, x []float64, above float64) analyze.Result {
	v := w.rms
	r := analyze.Result{Value: &v, Unit: plainUnit(s), FullScaleSine: s.FullScaleSine()}
	var b budget.Budget
	b.A("noise, and where it starts and stops", w.u, 0)
	b.Scale(s, v)
	b.Into(&r)
	first := w.stays[0]
	r.Details = map[string]any{
		"span_s": spanOf(s), "frequency_hz": w.hz, "frequency_uncertainty_hz": 2 * math.Hypot(w.uHz, w.hz*s.Gear.Clock),
		"from_s": timeOf(s, first.from), "to_s": timeOf(s, math.Min(first.to, float64(len(x)))), "course": "burst", "bursts": len(w.stays), "above_hz": above,
	}
	if w.continuous {
		r.Details["course"], r.Details["bursts"] = "continuous", 0
		r.Details["from_s"], r.Details["to_s"] = s.StartS, s.StartS+s.DurationS()
	}
	in := func(hz float64) string { return unit.Format(hz, unit.MustLookup("Hz"), 0) }
	what := "a line at " + in(w.hz)
	if w.band != nil {
		r.Details["band_hz"] = []float64{w.band[0], w.band[1]}
		what = "a hump from " + in(w.band[0]) + " to " + in(w.band[1])
	}
	r.Opinions = []string{fmt.Sprintf("%s that is no harmonic of the signal is consistent with an unstable stage: decoupling far from the pins or with long leads "+
		"(lead inductance), a capacitive load without a series resistor, or a regulator without its output capacitor; to confirm, hold 100 nF with the shortest leads "+
		"right at the supply pins and see whether it changes. Probe with a short spring to ground instead of the clip lead: its inductance rings by itself. "+
		"A switching supply or a transmitter nearby stays when the unit is off", what)}
	r.Figures = []analyze.Figure{w.envelopeFigure(s), w.spectrumFigure(s)}
	return r
}

// nothing is the result where no oscillation stands out, with what would have.
func nothing(s *analyze.Signal, x []float64, looks []*look, above, least float64) analyze.Result {
	r := analyze.Result{Unit: plainUnit(s), FullScaleSine: s.FullScaleSine(), Details: map[string]any{"span_s": spanOf(s), "above_hz": above}}
	r.Refusal = &analyze.Refusal{Code: analyze.BelowDetection,
		Text:   fmt.Sprintf("take %q: nothing above %.6g Hz stands out of the noise", s.Take.Name, above),
		Advice: "use a more sensitive range (AC coupling on a rail) for a lower bound"}
	cells := 2 * float64(len(x)) * float64(max(len(looks), 1))
	// The amplitude that is missed one time in twenty: its reading has a
	// standard deviation of share/sqrt 2 in the direction of the line.
	sees := math.Sqrt(math.Log(cells/falseAlarm)) + 1.645/math.Sqrt2
	bound := func(l *look) float64 {
		most := 0.0
		for k := max(lobe, int(above/l.stepK)); k < int(0.47*float64(l.m)); k++ {
			most = math.Max(most, l.floor[k])
		}
		return math.Max(sees*math.Sqrt(most*2.0044*l.stepK), least)
	}
	if len(looks) == 0 {
		return r
	}
	var b budget.Budget
	steady := bound(looks[len(looks)-1])
	b.Scale(s, steady)
	r.Bound = &analyze.Bound{Upper: true, Value: steady + 2*b.U()}
	var list []map[string]any
	for _, l := range looks {
		list = append(list, map[string]any{"lasting_s": float64(l.m) / s.RateHz, "rms_v": bound(l)})
	}
	r.Details["would_be_seen"] = list
	r.Notes = append(r.Notes, fmt.Sprintf("the bound holds for what lasts %.3g s or more; shorter bursts must be larger to be seen", float64(looks[len(looks)-1].m)/s.RateHz))
	w := &swing{look: looks[len(looks)-1]}
	r.Figures = []analyze.Figure{w.spectrumFigure(s)}
	return r
}
