package doubt

import (
	"fmt"
	"math"
)

// kind is a set of kinds of measures.
type kind int

// Kinds of measures a mix-up can be met in.
const (
	levels kind = 1 << iota // results in volts or watts
	gains                   // quotients of two readings
	noises                  // results that integrate noise
	either = levels | gains | noises
)

// rung is one usual mix-up of the bench: by how many dB it shifts a reading.
type rung struct {
	dB    float64
	sign  int // +1: it makes a reading too high, -1: too low, 0: either
	in    kind
	cause string
	check string // how to confirm it
}

// ladder of mix-ups. Sizes are closed forms of the figures named, or common
// practice without a source where marked.
var ladder = []rung{
	{0.42, 1, noises, "a band up to half of 44.1 kHz instead of 20 kHz (10 lg 22.05/20)", "compare the band in the row's conditions"},
	{0.63, -1, levels | gains, "the source loaded by a 2 kohm input (150 ohm source)", "measure at the unit's terminals, or compare with the open source"},
	{0.83, -1, levels | gains, "the source loaded by a 1.5 kohm input (150 ohm source)", "measure at the unit's terminals, or compare with the open source"},
	{0.79, 1, noises, "a band up to half of 48 kHz instead of 20 kHz (10 lg 24/20)", "compare the band in the row's conditions"},
	{1.05, 0, noises, "a mean-responding meter scaled for sines, on noise (20 lg of sqrt(pi)/2)", "ask which detector the other figure used"},
	{2.05, 0, noises, "A-weighting on one side of the comparison (flat noise, 20 Hz to 20 kHz)", "compare the weighting in the row's conditions"},
	{2.22, 0, levels | noises, "dBu taken for dBV (20 lg 0.7746)", "read the unit of the expected figure again"},
	{3.01, 0, either, "a peak value taken for RMS (20 lg sqrt 2), or one channel of two", "read a known sine with both instruments"},
	{3.80, 1, noises, "a band up to half of 96 kHz instead of 20 kHz (10 lg 48/20)", "compare the band in the row's conditions"},
	{6.02, 0, either, "one leg of a balanced line, peak-to-peak taken for peak, or a double count (20 lg 2)", "measure pin 2 against pin 3; state in_factor = 2 where one leg was recorded"},
	{9.03, 0, levels | gains, "peak-to-peak taken for RMS (20 lg of 2 sqrt 2)", "read a known sine with both instruments"},
	{11.79, 0, levels | gains, "the two line levels +4 dBu and -10 dBV (common practice)", "look at the level switch of the gear"},
	{20, 0, either, "a probe factor, a pad or a resistor off by a decade (20 lg 10)", "check the probe's switch against its entry, the pad, the resistor's code"},
	{26, 0, levels | gains, "a speaker stage's gain of 20 (common practice)", "check at which stage the signal was taken"},
}

// Rung tolerances in dB: a deviation counts as a rung's within the row's
// uncertainty, yet never farther than practice allows, nor nearer than the
// parts of a good unit scatter anyway.
const (
	farthest = 0.2
	nearest  = 0.05
)

// MixUp names the mix-ups that usually cause a deviation of a measure by
// difference dB (measured less expected) with expanded uncertainty u dB. It is
// meant for rows that fail or lie off their expected value. What it returns
// are opinions: nothing is corrected. nil when no mix-up fits.
func MixUp(measure string, difference, u float64) []string {
	within := math.Min(farthest, math.Max(nearest, u))
	k := kindOf(measure)
	high := difference
	if measure == "snr" { // too much noise makes it too low
		high = -high
	}
	var out []string
	for _, r := range ladder {
		if k&r.in == 0 || float64(r.sign)*high < 0 || math.Abs(math.Abs(difference)-r.dB) > within {
			continue
		}
		out = append(out, fmt.Sprintf("%+.2f dB from the expected value: consistent with %s; to confirm, %s", difference, r.cause, r.check))
	}
	return out
}

// kindOf sorts measures by what can shift them; 0 for those whose values no
// mix-up of levels explains (distortion, common-mode rejection, hum ratio).
func kindOf(measure string) kind {
	switch measure {
	case "level", "max_output", "power", "hum", "entered":
		return levels
	case "gain":
		return gains
	case "noise", "noise_density", "ein", "snr":
		return noises
	}
	return 0
}
