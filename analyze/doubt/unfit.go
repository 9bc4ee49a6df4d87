package doubt

import (
	"fmt"
	"slices"

	"benchslip/analyze"
	"benchslip/capture/recording"
)

// What a flag makes impossible. A flag that is not listed, or a measure that
// a list leaves out, only travels: the row is measured and carries the flag.
//
//	flag               measures that cannot be trusted
//	gain-riding        whatever compares or states levels: the gain was not one
//	gap,               whatever needs one phase of a tone, or counts all that is
//	repeated-block     not the tone: the break splits the tone and clicks
//	averaged           whatever holds noise, or hum that the trigger does not hold
//	peak-detect        all but peaks, counts and frequencies: samples are extremes
//	settling           dc: the mean moves
//	identical-channels whatever compares the two channels: a copy is no witness
//	resampled-looking  what lies beyond the wall: bands and frequencies above it
//	clipped            refused for any span that holds it, where the samples are read
//
// These only travel: flat-top (the unit's own limit), rate-doubt (the numbers
// stand against the recorder's clock), time-jitter, mains-unlike, few-codes
// (measures refuse what lies below the steps), truncated, size-mended and all
// others.
var (
	ofLevels = []string{"gain", "level", "crest", "noise", "noise_density", "ein", "snr", "hum", "hum_ratio", "pickup", "cmrr",
		"thd", "harmonic", "thdn", "sinad", "modulation_distortion", "difference_distortion",
		"response", "flatness", "corner_low", "corner_high", "crosstalk", "balance", "output_impedance", "input_impedance", "max_output", "power"}
	ofTone = []string{"gain", "phase", "delay", "tone_frequency", "cmrr", "thd", "harmonic", "thdn", "sinad", "snr",
		"modulation_distortion", "difference_distortion", "response", "flatness", "corner_low", "corner_high",
		"crosstalk", "balance", "output_impedance", "input_impedance", "max_output", "power", "clip_symmetry"}
	ofNoise = []string{"noise", "noise_density", "ein", "snr", "hum", "hum_ratio", "pickup", "mains_frequency", "thdn", "sinad", "ripple", "oscillation"}
	ofShape = append([]string{"dc", "phase", "delay", "clip_symmetry", "rise_time", "fall_time", "settling_time", "overshoot", "droop", "slew_rate", "ripple", "oscillation"}, ofLevels...)
	ofPairs = []string{"gain", "phase", "polarity", "delay", "cmrr", "response", "flatness", "corner_low", "corner_high", "crosstalk", "balance", "output_impedance", "input_impedance"}
)

// invalid lists the measures that a flag makes impossible; resampled-looking
// and identical-channels have conditions beside.
var invalid = map[string][]string{
	recording.GainRiding:        ofLevels,
	recording.Gap:               ofTone,
	recording.RepeatedBlock:     ofTone,
	recording.Averaged:          ofNoise,
	recording.PeakDetect:        ofShape,
	recording.Settling:          {"dc"},
	recording.IdenticalChannels: ofPairs,
}

// advice is the cheapest way out of a flag.
var advice = map[string]string{
	recording.GainRiding:        "switch automatic gain and noise suppression off in the driver and record again",
	recording.Gap:               "set a span without it, or record again with larger buffers",
	recording.RepeatedBlock:     "set a span without it, or record again with larger buffers",
	recording.Averaged:          "record one sweep in plain sampling mode",
	recording.PeakDetect:        "record in plain sampling mode",
	recording.Settling:          "set a span after it has settled",
	recording.IdenticalChannels: "record the second signal on a channel of its own",
	recording.ResampledLooking:  "record without rate conversion, or state a band below the wall",
}

// Role of a take that a row reads: as what, and which channels.
type Role struct {
	Name     string // "take", "gain_take", "differential" ...
	Channels []int
}

// Unfit says why a flag of a take keeps a row of a measure from being trusted,
// nil when it only travels with it. measure is the row's; a take in another
// role is read as what that role is for.
func Unfit(measure string, par *analyze.Params, role Role, f Finding) *analyze.Refusal {
	m := measure
	switch role.Name {
	case "gain_take", "in_take":
		m = "gain"
	}
	bad := slices.Contains(invalid[f.Code], m)
	switch f.Code {
	case recording.IdenticalChannels:
		bad = bad && len(role.Channels) > 1 && (f.Source == 0 || slices.Contains(role.Channels, f.Source))
	case recording.ResampledLooking:
		bad = beyond(m, par, f.WallHz)
	}
	if !bad {
		return nil
	}
	return &analyze.Refusal{Code: analyze.UnfitTake, Text: fmt.Sprintf("%s: take %q, %s", f.Code, f.Take, f.Message), Advice: advice[f.Code]}
}

// beyond: the measure reads what lies over a wall.
func beyond(measure string, par *analyze.Params, wallHz float64) bool {
	if wallHz <= 0 {
		return false
	}
	switch measure {
	case "noise", "ein", "snr", "thdn", "sinad", "thd", "flatness", "level", "hum_ratio":
		return par.BandOr(20, 20000).High > wallHz*1.03
	case "noise_density", "response":
		return len(par.At) > 0 && par.At[0] > wallHz*0.94
	case "corner_high":
		return true
	}
	return false
}
