package run

import (
	"slices"
	"strings"

	"benchslip/analyze/job"
)

// The cautions of the trade for what a job measures. They say what to mind
// and leave the rest to local codes and to people licensed for it. None ever
// suggests taking a protective earth off.
var (
	mainsCautions = []string{
		"Mains: isolate before touching, and discharge reservoir capacitors. Work on mains wiring belongs to licensed people; local codes hold.",
		"One protective earth stays on everything, always. Break a hum loop in the signal path instead: a transformer, a balanced input, or a recorder on battery.",
		"The clip of a scope probe is earth. It goes on points that are at earth already; elsewhere use two probes and their difference.",
		"Never connect a recorder to the mains. A mains phase reference comes from an insulated wire laid beside a mains lead.",
		"Open a shield only on a test lead of audio wiring, never where the shield is a box's earth.",
	}
	phantomCaution = "Phantom power: switch it off and let it decay (under 0.5 V from pins 2 and 3 to pin 1) before a recorder, a scope or a generator goes on."
	loadCautions   = []string{
		"Loads: use a resistor rated for several times the power, on metal, and keep full level short; it gets hot. No loudspeaker before DC at the output is known to be small.",
		"Ears: turn down before connecting, and protect your hearing where a loudspeaker is in circuit.",
		"A speaker stage can exceed a recorder's input: put a pad before it.",
	}
	railsCaution = "First power-up goes through a current limit, with the rails watched before anything is connected."
)

var (
	humMeasures     = []string{"hum", "hum_ratio", "pickup", "mains_frequency"}
	railMeasures    = []string{"ripple", "thump", "oscillation"}
	phantomMeasures = []string{"ein", "cmrr"}
	loadMeasures    = []string{"power", "max_output", "clip_symmetry"}
)

// cautions lists what whoever repeats the job must mind, each once.
func cautions(j *job.Job) []string {
	hum, rails, phantom, load := false, false, false, false
	for _, c := range j.Checks {
		hum = hum || slices.Contains(humMeasures, c.Measure)
		rails = rails || slices.Contains(railMeasures, c.Measure) || c.Params.Rails != nil
		phantom = phantom || slices.Contains(phantomMeasures, c.Measure)
		load = load || slices.Contains(loadMeasures, c.Measure) || c.Params.Load != nil && c.Measure != "output_impedance"
		if c.Measure == "entered" && c.Params.Value != nil {
			rails = rails || strings.Contains(strings.ToLower(c.Name), "rail")
		}
	}
	for _, t := range j.Takes {
		hum = hum || t.Wiring.Mains != "" || t.Setup != ""
		for _, w := range t.Where {
			phantom = phantom || strings.Contains(strings.ToLower(w.Key), "phantom")
		}
	}
	out := []string{}
	if hum {
		out = append(out, mainsCautions...)
	}
	if rails {
		out = append(out, railsCaution)
		if !hum {
			out = append(out, mainsCautions[0], mainsCautions[1], mainsCautions[2])
		}
	}
	if phantom || hum {
		out = append(out, phantomCaution)
	}
	if load {
		out = append(out, loadCautions...)
	}
	return out
}
