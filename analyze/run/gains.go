package run

import (
	"fmt"

	"benchslip/analyze/job"
	"benchslip/analyze/slip"
	"benchslip/capture/unit"
)

// One figure of noise at one gain misleads: what a unit's input can hear and
// what its output can deliver belong together, gain by gain.

// gained is a row whose first take states the gain it was made at.
type gained struct {
	row  int
	gain string
	dBu  float64
}

// byGain puts into every `ein` row the table of all gains measured, each with
// the largest output at the same gain where a row of that measure has one.
func byGain(checks []slip.Check, rows []job.Row) {
	noise, output := atGains(checks, rows, "ein"), atGains(checks, rows, "max_output")
	if len(noise) == 0 || len(noise) < 2 && len(output) == 0 {
		return
	}
	list := []map[string]any{}
	for _, n := range noise {
		e := map[string]any{"gain": n.gain, "ein_dbu": n.dBu, "row": checks[n.row].Name, "max_output_dbu": nil}
		for _, o := range output {
			if !sameCondition(n.gain, o.gain) {
				continue
			}
			e["max_output_dbu"] = o.dBu
			c := &checks[n.row]
			c.Notes = append(c.Notes, fmt.Sprintf("at the same gain the output reaches %s (%s)", unit.Format(o.dBu, unit.MustLookup("dBu"), 0.1), checks[o.row].Name))
			break
		}
		list = append(list, e)
	}
	for _, n := range noise {
		if c := &checks[n.row]; c.Details != nil {
			c.Details["gains"] = list
		}
	}
}

func atGains(checks []slip.Check, rows []job.Row, measure string) (out []gained) {
	dBu := unit.MustLookup("dBu")
	for i, c := range checks {
		if c.Measure != measure || c.Value == nil {
			continue
		}
		t := first(rows[i])
		u, err := unit.Lookup(c.Unit)
		if t == nil || err != nil || u.Dim != dBu.Dim {
			continue
		}
		if gain, ok := t.Condition("gain"); ok {
			out = append(out, gained{i, gain, dBu.FromLinear(u.ToLinear(*c.Value))})
		}
	}
	return out
}
