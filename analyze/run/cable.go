package run

import (
	"slices"

	"benchslip/analyze"
	"benchslip/analyze/hum"
	"benchslip/analyze/job"
	"benchslip/analyze/slip"
)

// compareSetups puts what several takes of one cable run tell together (their
// `setup` says what was connected) into its first pick-up row, or its first
// hum row: one table of the takes, one of the ways in, and whether the cable
// or the receiver is to blame.
func (r *runner) compareSetups(checks []slip.Check, rows []job.Row) {
	var takes []*analyze.Take
	var seen []string
	for _, t := range r.job.Takes {
		if t.Setup != "" && t.Fault == nil && !slices.Contains(seen, t.Setup) {
			takes = append(takes, t)
			seen = append(seen, t.Setup)
		}
	}
	if len(takes) < 2 {
		return
	}
	for _, measure := range []string{"pickup", "hum"} {
		for i := range checks {
			c := &checks[i]
			if c.Measure != measure || c.Details == nil || first(rows[i]) == nil || first(rows[i]).Setup == "" {
				continue
			}
			row := rows[i]
			roles := row.Roles(row.Main...)
			p := &analyze.Pass{Params: &row.Check.Params, Roles: roles, MainsHz: r.job.MainsHz, Stages: r.stages}
			sum, bad := hum.CableSummary(p, takes)
			if bad != nil {
				return
			}
			for k, v := range sum.Details() {
				c.Details[k] = v
			}
			for _, o := range sum.Opinions() {
				if !slices.Contains(c.Opinions, o) {
					c.Opinions = append(c.Opinions, o)
				}
			}
			return
		}
	}
}

// sayOnce keeps of equal opinions the one of the first row: several rows that
// read one take come to one conclusion.
func sayOnce(checks []slip.Check) {
	var said []string
	for i := range checks {
		c := &checks[i]
		c.Opinions = slices.DeleteFunc(c.Opinions, func(o string) bool { return slices.Contains(said, o) })
		said = append(said, c.Opinions...)
	}
}
