package tone

import (
	"fmt"
	"math"
	"slices"

	"benchslip/analyze"
	"benchslip/analyze/stage"
)

// profileOrders is how many harmonics a step's distortion is read from.
const profileOrders = 10

// rung is the distortion of one step of a stepped take.
type rung struct {
	hz, rms   float64 // RMS of the fundamental
	thd, thdn float64 // fractions; thd of all orders seen below half the rate
	rel       [profileOrders + 1]float64
	seen      [profileOrders + 1]bool
}

// odd and even are the roots of the sums of squares of the orders seen.
func (r rung) odd() float64  { return r.sum(3) }
func (r rung) even() float64 { return r.sum(2) }

func (r rung) sum(from int) float64 {
	p := 0.0
	for h := from; h <= profileOrders; h += 2 {
		if r.seen[h] {
			p += r.rel[h] * r.rel[h]
		}
	}
	return math.Sqrt(p)
}

// profile reads every step of a stepped take, once; nil for others.
func profile(p *analyze.Pass, t *analyze.Take) []rung {
	if t == nil || t.Rec == nil {
		return nil
	}
	out, bad := p.SignalOf(t, "take", "out")
	if bad != nil {
		return nil
	}
	band := p.Params.BandOr(20, 20000)
	key := fmt.Sprintf("profile/%s/%s/%g..%g", out.ID(), p.Wiring(t).In, band.Low, band.High)
	return p.Stages.Once(key, func() any {
		heard, _, _ := stage.HearSteps(p, t, "take", profileOrders, func(stage.Step) bool { return true })
		var all []rung
		for _, h := range heard {
			if h.Tone.Few {
				continue
			}
			all = append(all, rungOf(h, band))
		}
		return all
	}).([]rung)
}

func rungOf(h *stage.Heard, b analyze.Band) rung {
	f := h.Lo.Fundamental()
	r := rung{hz: f.Hz, rms: f.RMS()}
	for _, q := range h.Lo.Harm[1:] {
		if q.Order <= profileOrders && q.Power > 0 {
			r.rel[q.Order] = math.Sqrt(q.Power / f.Power)
			r.seen[q.Order] = detected(q, profileOrders)
		}
	}
	r.thd = math.Hypot(r.odd(), r.even())
	if band, bad := stage.BandFor(h.Out, b); bad == nil && band.InLine(f.Hz) {
		rest := math.Max(stage.Residual(h.Lo, band).P, 0)
		r.thdn = math.Sqrt(rest / (rest + f.Power))
	}
	return r
}

// overSteps adds what the other steps of a stepped take show: the table, the
// curve over frequency or level, and opinions with their evidence.
func overSteps(p *analyze.Pass, h *stage.Heard, r *analyze.Result) {
	if h.Steps == 0 {
		return
	}
	r.Notes = append(r.Notes, fmt.Sprintf("one of %d steps of the take, from %.3g s to %.3g s", h.Steps, h.Out.StartS, h.Out.StartS+h.Out.DurationS()))
	all := profile(p, h.Out.Take)
	if len(all) == 0 {
		return
	}
	list := []map[string]any{}
	for _, q := range all {
		e := map[string]any{"frequency_hz": q.hz, "rms_v": q.rms, "thd_percent": 100 * q.thd, "thdn_percent": nil, "h2_db": nil, "h3_db": nil}
		if q.thdn > 0 {
			e["thdn_percent"] = 100 * q.thdn
		}
		for h, key := range map[int]string{2: "h2_db", 3: "h3_db"} {
			if q.seen[h] {
				e[key] = 20 * math.Log10(q.rel[h])
			}
		}
		list = append(list, e)
	}
	r.Details["steps"] = list
	r.Figures = append([]analyze.Figure{profileFigure(h.Out, all)}, r.Figures...)
	r.Opinions = append(r.Opinions, opinions(all)...)
}

// profileFigure is distortion over frequency, or over level where all steps
// have one frequency.
func profileFigure(s *analyze.Signal, all []rung) analyze.Figure {
	lo, hi := all[0].hz, all[0].hz
	for _, q := range all {
		lo, hi = math.Min(lo, q.hz), math.Max(hi, q.hz)
	}
	f := analyze.Figure{ID: fmt.Sprintf("distortion-%s-ch%d", s.Take.Name, s.Channel()), Title: "Distortion over level, take " + s.Take.Name,
		Caption: "harmonics that stand out of the noise, re the fundamental; THD+N in the band",
		X:       analyze.Axis{Label: "output", Unit: s.Unit, Log: true}, Y: analyze.Axis{Label: "distortion", Unit: "%", Log: true}}
	x := func(q rung) float64 { return q.rms }
	if math.Log2(hi/lo) > 1.0/24 {
		f.Title, f.X = "Distortion over frequency, take "+s.Take.Name, analyze.Axis{Label: "frequency", Unit: "Hz", Log: true}
		x = func(q rung) float64 { return q.hz }
	}
	all = slices.Clone(all)
	slices.SortStableFunc(all, func(a, b rung) int {
		switch {
		case x(a) < x(b):
			return -1
		case x(a) > x(b):
			return 1
		}
		return 0
	})
	for _, c := range []struct {
		name, kind string
		y          func(rung) float64
	}{
		{"THD+N", analyze.Line, func(q rung) float64 { return q.thdn }}, {"THD", analyze.Line, func(q rung) float64 { return q.thd }},
		{"second harmonic", analyze.Points, func(q rung) float64 { return seen(q, 2) }}, {"third harmonic", analyze.Points, func(q rung) float64 { return seen(q, 3) }},
	} {
		line := analyze.Series{Name: c.name, Kind: c.kind}
		for _, q := range all {
			if y := c.y(q); y > 0 {
				line.X, line.Y = append(line.X, x(q)), append(line.Y, 100*y)
			}
		}
		if len(line.X) > 0 {
			f.Series = append(f.Series, line)
		}
	}
	return f
}

func seen(q rung, h int) float64 {
	if q.seen[h] {
		return q.rel[h]
	}
	return 0
}
