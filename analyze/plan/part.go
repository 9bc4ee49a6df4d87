package plan

import (
	"slices"

	"benchslip/analyze"
	"benchslip/capture/recording"
)

// part is a part of the work on the bench. Its rank puts the takes in order:
// what can show a fault at once and harms least comes first (the instrument by
// itself, then DC), full level comes late, so that a fault found early does not
// make later takes worthless.
type part struct {
	rank  int
	words string
}

var (
	partFloor  = part{10, "the instrument by itself: floor"}
	partLoop   = part{20, "the instrument by itself: loop"}
	partDC     = part{30, "DC and rails"}
	partSmall  = part{40, "small signal"}
	partZ      = part{50, "impedances"}
	partCurve  = part{60, "response"}
	partBent   = part{70, "distortion"}
	partBase   = part{80, "baseline for hum"}
	partQuiet  = part{81, "noise and hum"}
	partCommon = part{90, "common mode"}
	partSide   = part{95, "channels against each other"}
	partEdge   = part{100, "edges"}
	partFull   = part{110, "full level"}
	partSwitch = part{120, "switching on and off"}
	partWatch  = part{130, "a long watch"}
	partNone   = part{140, "no check reads it"}
)

// partOfMeasure names the part of the work that a measure belongs to.
// level, peak, crest and mains_frequency belong to whatever else the take is
// for.
func partOfMeasure(measure string) (part, bool) {
	for _, g := range []struct {
		part     part
		measures []string
	}{
		{partDC, []string{"dc", "ripple", "oscillation"}},
		{partSmall, []string{"gain", "phase", "polarity", "delay", "tone_frequency"}},
		{partZ, []string{"output_impedance", "input_impedance"}},
		{partCurve, []string{"response", "flatness", "corner_low", "corner_high"}},
		{partBent, []string{"thd", "harmonic", "thdn", "sinad", "modulation_distortion", "difference_distortion", "snr"}},
		{partQuiet, []string{"noise", "noise_density", "ein", "hum", "hum_ratio", "pickup"}},
		{partCommon, []string{"cmrr"}},
		{partSide, []string{"crosstalk", "balance"}},
		{partEdge, []string{"rise_time", "fall_time", "settling_time", "overshoot", "droop", "slew_rate"}},
		{partFull, partFullMeasures},
		{partSwitch, []string{"thump"}},
		{partWatch, []string{"events"}},
	} {
		if slices.Contains(g.measures, measure) {
			return g.part, true
		}
	}
	return part{}, false
}

// partFullMeasures drive a unit to its limits.
var partFullMeasures = []string{"max_output", "power", "clip_symmetry"}

// partOf is the latest part that a take is for; a take that tells the
// instrument from the unit keeps its early place.
func partOf(t *analyze.Take, uses []use) part {
	out := part{}
	for _, u := range uses {
		one := part{}
		switch u.role {
		case "floor":
			return partFloor
		case "loop":
			return partLoop
		case "baseline":
			return partBase
		case "gain_take", "in_take":
			one = partSmall
		default:
			one, _ = partOfMeasure(u.check.Measure)
			if u.check.Measure == "snr" && u.check.Params.RefLevel != nil {
				one = partQuiet
			}
		}
		if one.rank > out.rank {
			out = one
		}
	}
	switch {
	case out.rank > 0:
	case len(uses) == 0:
		return partNone
	case isScope(t):
		return partDC
	case t.Wiring.In != "" || t.Wiring.InLevel != nil || t.Stimulus != "":
		return partSmall
	default:
		return partQuiet
	}
	return out
}

func isScope(t *analyze.Take) bool { return t.Gear != nil && t.Gear.Kind == recording.Scope }

// channels says what each channel of a take is for: what the checks that read
// it make of it, else what the take states.
func channels(t *analyze.Take, uses []use) []Channel {
	out := []Channel{}
	output := "output of the unit"
	for _, u := range uses {
		switch u.role {
		case "floor":
			output = "the recorder's own input, closed"
		case "loop":
			output = "the recorder's own output"
		}
	}
	add := func(key, channel, what string) {
		if channel != "" && !slices.ContainsFunc(out, func(c Channel) bool { return c.Key == key && c.Channel == channel }) {
			out = append(out, Channel{channel, key, what})
		}
	}
	from := func(w analyze.Wiring) {
		if w.Out == "" {
			w.Out = "1"
		}
		add("out", w.Out, output)
		add("in", w.In, "signal at the unit's input terminals")
		add("out2", w.Out2, "output to compare with")
		add("driven", w.Driven, "output of the channel that is driven")
		add("mains", w.Mains, "mains phase, from a wire laid beside a mains lead")
	}
	for _, u := range uses {
		from(t.Wiring.Over(u.check.Params.Wiring))
	}
	if len(uses) == 0 {
		from(t.Wiring)
	}
	return out
}
