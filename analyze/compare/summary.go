package compare

import (
	"benchslip/analyze/slip"
)

// Summary is what the slips of several units say together. It is what
// summary.json holds: keys are added, none is renamed.
type Summary struct {
	Format  int       `json:"format"` // 1
	Title   string    `json:"title"`
	Job     string    `json:"job"`
	Verdict string    `json:"verdict"` // the worst of all units
	Units   []OneUnit `json:"units"`
	Checks  []Batch   `json:"checks"` // in the order of the job
}

// OneUnit is one unit's slip.
type OneUnit struct {
	Name    string   `json:"name"`
	Slip    string   `json:"slip"` // path of its slip.json beside the summary
	Sheet   string   `json:"sheet"`
	Verdict string   `json:"verdict"`
	Fails   []string `json:"fails"` // names of checks
	Open    []string `json:"open"`
}

// Batch is one check over all units.
type Batch struct {
	Name    string   `json:"name"`
	Measure string   `json:"measure"`
	Unit    string   `json:"unit"`
	Min     *float64 `json:"min"`
	Max     *float64 `json:"max"`
	Values  []Value  `json:"values"` // one a unit
	Group   *Group   `json:"group"`

	Checks []*slip.Check `json:"-"` // one a unit, nil where it is missing
}

// Summarise gathers the slips of units; key is the key of [unit] that names
// each.
func Summarise(in []Input, key string) *Summary {
	first := in[0].Slip
	s := &Summary{Format: 1, Title: first.Title, Job: first.Job.File, Verdict: slip.NotJudged, Units: []OneUnit{}, Checks: []Batch{}}
	src := sources(in)
	for i, one := range in {
		src[i].Label = one.Slip.Unit[key]
		u := OneUnit{Name: src[i].Label, Slip: one.File, Sheet: one.Slip.Sheet, Verdict: one.Slip.Verdict, Fails: []string{}, Open: []string{}}
		for _, c := range one.Slip.Checks {
			switch {
			case c.Class == "info":
			case c.Verdict == slip.Fail:
				u.Fails = append(u.Fails, c.Name)
			case c.Verdict != slip.Pass && c.Verdict != slip.NotJudged:
				u.Open = append(u.Open, c.Name)
			}
		}
		s.Units = append(s.Units, u)
		s.Verdict = worseVerdict(s.Verdict, u.Verdict)
	}
	for _, name := range names(in) {
		row := Row{Name: name}
		b := Batch{Name: name}
		for _, one := range in {
			c := checkOf(one.Slip, name)
			v := Value{}
			if c != nil {
				if b.Measure == "" {
					b.Measure, b.Unit, b.Min, b.Max = c.Measure, c.Unit, c.Min, c.Max
				}
				v.Verdict = c.Verdict
				if k := into(c, b.Unit); k != nil {
					v.Value, v.Uncertainty = k.Value, k.Uncertainty
				}
			}
			row.Values = append(row.Values, v)
			b.Checks = append(b.Checks, c)
		}
		b.Values, b.Group = row.Values, groupOf(&row, in, src)
		b.Group.Trend = nil // units of one batch have one date
		s.Checks = append(s.Checks, b)
	}
	return s
}

// worseVerdict is the verdict that decides of two.
func worseVerdict(a, b string) string {
	for _, v := range []string{slip.Fail, slip.Inconclusive, slip.Pass} {
		if a == v || b == v {
			return v
		}
	}
	return a
}
