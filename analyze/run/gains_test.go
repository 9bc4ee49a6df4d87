package run

import (
	"math"
	"strings"
	"testing"
)

// Each row of input noise shows all gains, beside the largest output at the
// same gain where there is one ("20 dB" and "10 x" are one gain).
func TestByGain(t *testing.T) {
	text := toneJob + `
[takes.hot]
file = "takes/tone.wav"
gear = "box"
where = { gain = "40 dB" }
[takes.loud]
file = "takes/tone.wav"
gear = "box"
where = { gain = "10 x" }
[[checks]]
name = "EIN"
measure = "ein"
each = ["tone", "hot"]
gain = "20 dB"
[[checks]]
name = "Output"
measure = "max_output"
take = ["loud"]
`
	s := execute(t, text, Options{Measure: fixed(volts(0.7745966692))})
	if len(s.Checks) != 3 {
		t.Fatalf("%d rows", len(s.Checks))
	}
	for i, noted := range []bool{true, false} {
		c := s.Checks[i]
		list, ok := c.Details["gains"].([]map[string]any)
		if !ok || len(list) != 2 || list[0]["gain"] != "20 dB" || math.Abs(list[0]["ein_dbu"].(float64)) > 1e-6 {
			t.Fatalf("%s: %v", c.Name, c.Details["gains"])
		}
		if o, _ := list[0]["max_output_dbu"].(float64); list[0]["max_output_dbu"] == nil || math.Abs(o) > 1e-6 || list[1]["max_output_dbu"] != nil {
			t.Errorf("outputs %v", list)
		}
		if got := strings.Contains(strings.Join(c.Notes, ""), "at the same gain the output reaches 0.00 dBu (Output)"); got != noted {
			t.Errorf("%s: notes %v", c.Name, c.Notes)
		}
	}
}
