// Package limits holds the measures of what a unit can deliver: the output at
// which distortion reaches a limit, the power into a load, and which half of
// the wave flattens first.
//
// Output and distortion come as points, one a take or one a step of a stepped
// take, each from the joint fit of package stage.
package limits

import (
	"fmt"
	"math"
	"slices"

	"benchslip/analyze"
	"benchslip/analyze/stage"
	"benchslip/capture/unit"
)

var (
	volt    = unit.MustLookup("V")
	fs      = unit.MustLookup("FS")
	watt    = unit.MustLookup("W")
	percent = unit.MustLookup("%")
)

// Measures lists the measures of this package.
func Measures() []*analyze.Measure { return []*analyze.Measure{maxOutput, power, clipSymmetry} }

// point is output against distortion at one level.
type point struct {
	heard       *stage.Heard
	rms         float64 // of everything in the band, unit of the signal
	rmsU        float64 // relative standard uncertainty from noise and steps
	thdn, thdnU float64 // fraction; standard uncertainty
	bent        bool    // harmonics hold most of the residual
}

func (q point) take() string { return q.heard.Out.Take.Name }

// pointOf reads one steady stretch.
func pointOf(h *stage.Heard, b analyze.Band) (point, *analyze.Refusal) {
	if bad := h.Tone.FullPeriods(h.Out); bad != nil {
		return point{}, bad
	}
	band, bad := stage.BandFor(h.Out, b)
	if bad != nil {
		return point{}, bad
	}
	f := h.Lo.Fundamental()
	if !band.InLine(f.Hz) {
		return point{}, &analyze.Refusal{Code: analyze.Bandwidth,
			Text: fmt.Sprintf("the tone at %.6g Hz lies outside the band %.6g Hz .. %.6g Hz", f.Hz, band.Low, band.High), Advice: "state a band that holds the tone"}
	}
	rest := stage.Residual(h.Lo, band)
	q := point{heard: h, rms: math.Sqrt(f.Power + rest.P), thdn: math.Sqrt(math.Max(rest.P, 0) / (f.Power + rest.P))}
	q.rmsU = math.Hypot(stage.NoiseU(h.Lo)*(1-q.thdn*q.thdn), math.Hypot(stage.RelativeStepU(h.Lo), rest.U/2/(f.Power+rest.P)))
	if s := h.Lo.ScatterU(); s > 0 {
		q.rmsU = math.Hypot(q.rmsU, s)
	}
	if rest.P > 0 {
		q.thdnU = rest.U / (2 * rest.P) * q.thdn
	}
	q.bent = 2*stage.LinesIn(band, nil, h.Lo.Harm[1:]).P > rest.P
	return q, nil
}

// gathered is what the takes of a check hold.
type gathered struct {
	points  []point // by rising output
	stepped bool    // from the steps of one take
}

// gather reads every take of the check, or every step of a stepped one. A
// step too short or too faint to read is left out and counted; a take is not.
func gather(p *analyze.Pass) (g gathered, skipped int, bad *analyze.Refusal) {
	takes := p.Roles["take"]
	if len(takes) == 0 {
		return g, 0, &analyze.Refusal{Code: analyze.MissingTake, Text: "no take is named", Advice: "name one in the job"}
	}
	at := 0.0
	if len(p.Params.At) > 0 {
		at = p.Params.At[0]
	}
	band := p.Params.BandOr(20, 20000)
	for _, t := range takes {
		heard, left, why := oneTone(p, t, at)
		skipped += left
		if len(heard)+left < 2 {
			if why != nil && left == 0 {
				return g, skipped, why
			}
			h, bad := stage.ListenAt(p, t, "take", at, 0)
			if bad != nil {
				return g, skipped, bad
			}
			q, bad := pointOf(h, band)
			if bad != nil {
				return g, skipped, bad
			}
			g.points = append(g.points, q)
			continue
		}
		g.stepped = true
		read := 0
		for _, h := range heard {
			q, bad := pointOf(h, band)
			if bad != nil {
				skipped, why = skipped+1, bad
				continue
			}
			read++
			g.points = append(g.points, q)
		}
		if read == 0 {
			return g, skipped, why
		}
	}
	slices.SortStableFunc(g.points, func(a, b point) int {
		switch {
		case a.rms < b.rms:
			return -1
		case a.rms > b.rms:
			return 1
		}
		return 0
	})
	if u := g.points[0].heard.Out.Unit; slices.ContainsFunc(g.points, func(q point) bool { return q.heard.Out.Unit != u }) {
		return g, skipped, &analyze.Refusal{Code: analyze.Uncalibrated, Text: "some of the takes have no volts at full scale", Advice: "state full_scale_peak for the gear of all of them"}
	}
	return g, skipped, nil
}

// oneTone hears the steps of one frequency: that of `at`, else of the
// strongest.
func oneTone(p *analyze.Pass, t *analyze.Take, at float64) ([]*stage.Heard, int, *analyze.Refusal) {
	if at == 0 {
		top := 0.0
		if _, _, why := stage.HearSteps(p, t, "take", 0, func(q stage.Step) bool {
			if q.RMS > top {
				top, at = q.RMS, q.Hz
			}
			return false
		}); why != nil {
			return nil, 0, why
		}
	}
	return stage.HearSteps(p, t, "take", 0, func(q stage.Step) bool { return math.Abs(math.Log2(q.Hz/at)) <= 1.0/24 })
}

// list is details.points.
func (g gathered) list() []map[string]any {
	out := []map[string]any{}
	for _, q := range g.points {
		s := q.heard.Out
		e := map[string]any{"rms_v": q.rms, "thdn_percent": 100 * q.thdn, "uncertainty_percent": 200 * q.thdnU, "frequency_hz": q.heard.Tone.Hz,
			"take": q.take(), "from_s": s.StartS, "to_s": s.StartS + s.DurationS()}
		if q.heard.Li != nil {
			e["in_rms_v"] = q.heard.Li.Fundamental().RMS()
			e["gain_db"] = 10 * math.Log10(q.heard.Lo.Fundamental().Power/q.heard.Li.Fundamental().Power)
		}
		out = append(out, e)
	}
	return out
}

// figure shows THD+N over output with the limit asked.
func (g gathered) figure(limit float64) analyze.Figure {
	s := g.points[0].heard.Out
	f := analyze.Figure{ID: fmt.Sprintf("limit-%s-ch%d", s.Take.Name, s.Channel()), Title: "Distortion and noise over output, " + s.Take.Name,
		Caption: fmt.Sprintf("THD+N of %d levels; both axes logarithmic, straight between neighbours", len(g.points)),
		X:       analyze.Axis{Label: "output", Unit: s.Unit, Log: true}, Y: analyze.Axis{Label: "THD+N", Unit: "%", Log: true},
		Rules: []analyze.Rule{{Label: fmt.Sprintf("%.3g %%", 100*limit), At: 100 * limit}}}
	line := analyze.Series{Name: "THD+N", Kind: analyze.Line}
	for _, q := range g.points {
		if q.thdn > 0 {
			line.X, line.Y = append(line.X, q.rms), append(line.Y, 100*q.thdn)
		}
	}
	marks := line
	marks.Kind, marks.Name = analyze.Points, "levels"
	f.Series = []analyze.Series{line, marks}
	return f
}
