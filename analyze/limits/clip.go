package limits

import (
	"fmt"
	"math"

	"benchslip/analyze"
	"benchslip/analyze/stage"
)

// words says how one half ends.
func words(flat bool) string {
	if flat {
		return "flat"
	}
	return "not flat"
}

func details(f stage.Flats, s *analyze.Signal) map[string]any {
	suffix := "_v"
	if s.Unit == "FS" {
		suffix = "_fs"
	}
	return map[string]any{"positive" + suffix: f.Positive, "negative" + suffix: f.Negative, "sine_peak" + suffix: f.Peak, "centre" + suffix: f.Centre,
		"positive_half": words(f.Up), "negative_half": words(f.Down)}
}

// opinion says what may flatten the wave at these volts, from the rails and
// the load stated.
func opinion(f stage.Flats, p *analyze.Pass) (text string, details map[string]any) {
	if p.Params.Rails == nil || !f.Any() {
		return "", nil
	}
	rail := math.Abs(p.Params.Rails.Value.Linear())
	peak := math.Max(f.Positive, f.Negative)
	if f.Up != f.Down { // the half that is flat
		peak = map[bool]float64{true: f.Positive, false: f.Negative}[f.Up]
	}
	room := rail - peak
	details = map[string]any{"headroom_v": room}
	if room < math.Max(4, 0.25*rail) {
		return fmt.Sprintf("the output flattens at %.3g V peak, %.2g V inside rails of %.3g V: consistent with the rails as the limit (stages stop 1 to 4 V short, common practice); "+
			"to confirm, measure again with a lighter load: the voltage stays", peak, math.Max(room, 0), rail), details
	}
	if p.Params.Load == nil {
		return fmt.Sprintf("the output flattens at %.3g V peak, %.3g V inside rails of %.3g V: consistent with a current limit, or with a stage before it that clips; "+
			"to confirm, state `load` and measure again with a lighter one", peak, room, rail), details
	}
	load := p.Params.Load.Value.Linear()
	details["current_a"] = peak / load
	return fmt.Sprintf("the output flattens at %.3g V peak, %.3g V inside rails of %.3g V; into %.3g ohm that is %.3g A: consistent with a current limit there; "+
		"to confirm, measure again with a lighter load: a current limit lets the voltage rise, a stage before it that clips does not", peak, room, rail, load, peak/load), details
}

// withinRails refuses a result whose wave swings further than the stated rails
// allow: the volts must be wrong then. Half of peak to peak is compared, which
// a blocked DC does not change.
func withinRails(p *analyze.Pass, h *stage.Heard, f stage.Flats, r analyze.Result) analyze.Result {
	if p.Params.Rails == nil || h.Out.Unit != "V" {
		return r
	}
	rail, swing := math.Abs(p.Params.Rails.Value.Linear()), (f.Positive+f.Negative)/2
	if swing <= rail*1.02 {
		return r
	}
	bad := analyze.Refuse(r.Unit, analyze.Impossible, fmt.Sprintf("the output would swing %.4g V peak past rails of %.4g V", swing, rail),
		"check full_scale_peak or the probe factor of the gear")
	bad.Details, bad.Figures = r.Details, r.Figures
	return bad
}

// explain adds to a result of points what the wave of the highest one shows.
func explain(p *analyze.Pass, r analyze.Result, g gathered, limit float64) analyze.Result {
	top := g.points[len(g.points)-1]
	f, ok := stage.FlatsOf(top.heard)
	if !ok || top.heard.Out.Unit != "V" {
		return r
	}
	if r = withinRails(p, top.heard, f, r); r.Refusal != nil && r.Refusal.Code == analyze.Impossible {
		return r
	}
	if top.thdn < limit || !f.Any() {
		return r
	}
	clip := details(f, top.heard.Out)
	text, more := opinion(f, p)
	for k, v := range more {
		clip[k] = v
	}
	r.Details["clip"] = clip
	if text != "" {
		r.Opinions = append(r.Opinions, text)
	}
	return r
}
