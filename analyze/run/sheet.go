package run

import (
	"crypto/sha256"
	"encoding/hex"
	"fmt"
	"io"
	"path/filepath"
	"sort"
	"strconv"
	"strings"

	"benchslip/analyze"
	"benchslip/analyze/job"
	"benchslip/analyze/keys"
	"benchslip/analyze/slip"
	"benchslip/capture/recording"
	"benchslip/capture/unit"
)

// about fills in what the slip says beside its rows: job, unit, record, rule,
// gear. Only what the job states gets there; the job file goes by its base
// name, wherever it lies.
func about(s *slip.Slip, j *job.Job) {
	s.Title, s.Mains = j.Title, j.Mains
	s.Job.File = filepath.Base(j.File)
	for i, src := range j.Sources {
		if i == 0 {
			sum := sha256.Sum256(src.Data)
			s.Job.SHA256 = hex.EncodeToString(sum[:])
			continue
		}
		s.Job.Includes = append(s.Job.Includes, src.Name)
	}
	s.Unit, s.UnitKeys = entries(j.Unit)
	s.Record, s.RecordKeys = entries(j.Record)
	s.Rule = slip.Rule{Decision: j.Decision, Coverage: j.Coverage}
	s.Gear = []slip.Gear{}
	for _, g := range j.Gear {
		s.Gear = append(s.Gear, slip.Gear{Name: g.Name, Kind: g.Kind, FullScale: g.FullScale, Coupling: g.Coupling,
			Stated: g.Uncertainty, Calibrated: g.Calibrated, Notes: strings.Join(gearNotes(g), "; ")})
	}
}

func entries(list []job.Entry) (map[string]string, []string) {
	m, order := map[string]string{}, []string{}
	for _, e := range list {
		m[e.Key] = e.Value
		order = append(order, e.Key)
	}
	return m, order
}

// gearNotes says what was taken for granted about gear.
func gearNotes(g *job.Gear) []string {
	var notes []string
	if g.Kind == recording.Scope && g.Probe != 1 {
		notes = append(notes, fmt.Sprintf("volts of the file times %g", g.Probe))
	}
	if !g.Match {
		notes = append(notes, "channels taken as equal")
	}
	if !g.Clock {
		notes = append(notes, "clock taken as right within 100 ppm")
	}
	return notes
}

// sheetDigits is the length of the sheet number, in hexadecimal digits.
const sheetDigits = 12

// sheet is the number that stands on every page: a hash over the version of
// the program, the texts of the job in order (the slips its limits came from
// among them), and the takes.
func sheet(version string, j *job.Job, takes []*analyze.Take) string {
	h := sha256.New()
	part := func(data string) {
		fmt.Fprintf(h, "%d:", len(data)) // no two lists of parts read alike
		io.WriteString(h, data)
	}
	part(version)
	for _, list := range [][]job.Text{j.Sources, j.Slips} {
		part(strconv.Itoa(len(list)))
		for _, text := range list {
			part(string(text.Data))
		}
	}
	for _, t := range takes {
		part(t.Name)
		part(t.SHA256)
	}
	return hex.EncodeToString(h.Sum(nil))[:sheetDigits]
}

// limitsHash is over the sorted rows "name, measure, min, max", the limits in
// the measure's own unit: it changes when a limit does, not when one is
// written in another unit or the rows are put in another order.
func limitsHash(rows []job.Row) string {
	var lines []string
	for _, r := range rows {
		lines = append(lines, strings.Join([]string{r.Name, r.Check.Measure,
			ownUnit(r.Check, r.Limits.Min), ownUnit(r.Check, r.Limits.Max)}, "\t"))
	}
	sort.Strings(lines)
	sum := sha256.Sum256([]byte(strings.Join(lines, "\n")))
	return hex.EncodeToString(sum[:])
}

// ownUnit prints a limit in the unit of the check's measure; one of another
// dimension (a difference in dB of two takes, a level against full scale, an
// entered reading) in the linear base unit of its own.
func ownUnit(c *job.Check, q *unit.Quantity) string {
	if q == nil {
		return ""
	}
	u := q.Unit.Dim.Base()
	if m, ok := keys.FindMeasure(c.Measure); ok && c.Against == nil {
		if own, err := unit.Lookup(m.Unit); err == nil && own.Dim == q.Unit.Dim {
			u = own
		}
	}
	number, err := unit.Convert(q.Linear(), q.Unit.Dim, u)
	if err != nil {
		number = q.Number
	}
	// Nine digits: what conversions leave beyond is not the limit's.
	return strings.TrimSpace(strconv.FormatFloat(number, 'g', 9, 64) + " " + u.Symbol)
}
