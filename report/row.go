package report

import (
	"fmt"
	"math"
	"sort"
	"strconv"
	"strings"

	"benchslip/analyze/slip"
	"benchslip/capture/unit"
)

// Row is one check in words and rounded numbers. All texts are clean.
type Row struct {
	N       int // from 1, in the job's order
	Check   *slip.Check
	Scale   Scale
	Name    string
	Verdict string // in words
	Value   string // "39.980 ± 0.060 dB", "below 0.0004 %", "no value"
	Wide    string // the interval of a wide result, "39.1 .. 41.2 dB"; "" otherwise
	Limits  string // "39.5 .. 40.5 dB", "max 0.02 %", "none"
	Typical string // "0.005 %"; "" none
	Margin  string // "0.48 dB"; "" none
	Cover   string // "k = 2"; "" without an uncertainty
	Code    string // of the reason
	Say     string // one sentence about the verdict; "" for a plain pass
	Advice  string // what would settle an open row
	Waiver  string
	By      string // "entered by hand, with bench meter"; "" for a measured row
	Open    bool
}

// Rows puts every check of a slip into words, in order.
func Rows(s *slip.Slip) []Row {
	rows := make([]Row, len(s.Checks))
	for i := range s.Checks {
		rows[i] = RowOf(&s.Checks[i], i+1, s.Rule)
	}
	return rows
}

// RowOf puts one check into words; n is its number on the sheet.
func RowOf(c *slip.Check, n int, rule slip.Rule) Row {
	sc := ScaleOf(c)
	r := Row{N: n, Check: c, Scale: sc, Name: Clean(c.Name), Verdict: Verdict(c.Verdict),
		Limits: sc.limits(c), Advice: Clean(c.Advice), Open: Open(c)}
	r.Code, _ = SplitReason(c.Reason)
	r.Value = "no value"
	switch {
	case c.Value != nil && c.Uncertainty != nil:
		r.Value = sc.PlusMinus(*c.Value, *c.Uncertainty)
	case c.Value != nil:
		r.Value = sc.Value(*c.Value)
	case c.Bound != nil:
		r.Value = sc.bound(c.Bound)
	}
	if c.Interval != nil {
		r.Wide = with(sc.Number(c.Interval[0])+" .. "+sc.Number(c.Interval[1]), sc.Unit())
	}
	if c.Typical != nil {
		r.Typical = with(sc.Exact(*c.Typical), sc.Unit())
	}
	if c.Margin != nil {
		r.Margin = sc.Diff(*c.Margin)
	}
	if c.Coverage != nil && c.Uncertainty != nil && *c.Uncertainty > 0 {
		r.Cover = "k = " + Digits(*c.Coverage, 3)
	}
	if c.Measure == "entered" {
		r.By = "entered by hand"
		if c.By != "" {
			r.By += ", with " + Clean(c.By)
		}
	}
	if w := c.Waiver; w != nil {
		r.Waiver = "waived by " + orDash(w.By) + ": " + orDash(w.Why)
		if w.Ticket != "" {
			r.Waiver += " (" + Clean(w.Ticket) + ")"
		}
		r.Waiver += "; the verdict stays"
	}
	r.Say = say(&r, rule)
	return r
}

func orDash(s string) string {
	if s = strings.TrimSpace(Clean(s)); s == "" {
		return "(not stated)"
	}
	return s
}

func (sc Scale) limits(c *slip.Check) string {
	switch {
	case c.Min != nil && c.Max != nil && *c.Min == *c.Max:
		return with("exactly "+sc.Exact(*c.Min), sc.Unit())
	case c.Min != nil && c.Max != nil:
		return with(sc.Exact(*c.Min)+" .. "+sc.Exact(*c.Max), sc.Unit())
	case c.Max != nil:
		return with("max "+sc.Exact(*c.Max), sc.Unit())
	case c.Min != nil:
		return with("min "+sc.Exact(*c.Min), sc.Unit())
	}
	return "none"
}

func (sc Scale) bound(b *slip.Bound) string {
	if b.Kind == "upper" {
		return "below " + sc.Outward(b.Value, true)
	}
	return "above " + sc.Outward(b.Value, false)
}

// nearest returns the limit that decides the margin; ok is false without one.
func nearest(c *slip.Check) (limit float64, ok bool) {
	if c.Value == nil {
		return 0, false
	}
	best := math.Inf(1)
	if c.Min != nil {
		limit, best, ok = *c.Min, *c.Value-*c.Min, true
	}
	if c.Max != nil && *c.Max-*c.Value < best {
		limit, ok = *c.Max, true
	}
	return limit, ok
}

// say is the sentence beside a verdict.
func say(r *Row, rule slip.Rule) string {
	c, sc := r.Check, r.Scale
	code, text := SplitReason(Clean(c.Reason))
	because := text
	if because == "" {
		because = code
	}
	limit, ok := nearest(c)
	measured := ""
	if c.Value != nil && ok {
		measured = "measured " + sc.Value(*c.Value) + ", limit " + with(sc.Exact(limit), sc.Unit())
		if c.By != "" || c.Measure == "entered" {
			measured = "entered " + strings.TrimPrefix(measured, "measured ")
		}
		if c.Uncertainty != nil && *c.Uncertainty > 0 {
			measured += ", uncertainty " + sc.Small(*c.Uncertainty)
		}
		measured += ": "
	}
	tail := func(s string) string {
		if because != "" {
			return s + "; " + because
		}
		return s
	}
	switch c.Verdict {
	case slip.Pass:
		if c.Value == nil && c.Bound != nil {
			return tail(sc.bound(c.Bound) + " at " + percent(c.Bound.Confidence) + ": the bound alone passes")
		}
		return because
	case slip.Fail:
		if c.Value == nil && c.Bound != nil {
			return tail(sc.bound(c.Bound) + " at " + percent(c.Bound.Confidence) + ": the bound alone fails")
		}
		s := measured + "fails"
		switch {
		case c.Margin == nil:
		case *c.Margin < 0:
			s += ", " + sc.Diff(-*c.Margin) + " outside"
		case rule.Decision == "guarded":
			s += ", inside the limit but nearer to it than its uncertainty"
		}
		return tail(s)
	case slip.ConditionalPass:
		return tail(measured + "passes, but not beyond doubt" + odds(c.Probability, false))
	case slip.ConditionalFail:
		return tail(measured + "fails, but not beyond doubt" + odds(c.Probability, true))
	case slip.NotMeasurable, slip.NotApplicable:
		if c.Bound != nil && c.Value == nil {
			return tail(sc.bound(c.Bound) + " at " + percent(c.Bound.Confidence) + " is all that can be said")
		}
		return because
	}
	return because
}

// Why is Say with the reason's code before it.
func (r *Row) Why() string {
	if r.Code == "" || r.Code == r.Say {
		return r.Say
	}
	return r.Code + ": " + r.Say
}

func percent(x float64) string { return Digits(100*x, 3) + " %" }

// odds puts the probability that a verdict is right into words: of conformity
// for a pass, of its opposite for a fail.
func odds(p *float64, fails bool) string {
	if p == nil {
		return ""
	}
	x := *p * 100
	if fails {
		x = 100 - x
	}
	switch {
	case x > 99:
		return " (more than 99 in 100)"
	case x < 1:
		return " (less than 1 in 100)"
	case x >= 10 && x <= 90:
		x = math.Round(x/5) * 5
	}
	return " (about " + strconv.Itoa(int(math.Round(x))) + " in 100)"
}

// Part is one line of an uncertainty budget.
type Part struct {
	Name, Kind, Dof string
	U               string  // standard uncertainty with unit
	Share           float64 // of the variance, 0..1
	Percent         string  // "62 %"
}

// Budget lists the contributors of a row, largest first; equal ones keep their
// order.
func (r *Row) Budget() []Part {
	type line struct {
		c slip.Contributor
		u float64
	}
	var lines []line
	var total float64
	for _, c := range r.Check.Contributors {
		u := inUnit(c.StandardUncertainty, c.Unit, r.Check.Unit)
		lines = append(lines, line{c, u})
		total += u * u
	}
	sort.SliceStable(lines, func(i, j int) bool { return lines[i].u > lines[j].u })
	var parts []Part
	for _, l := range lines {
		p := Part{Name: Clean(l.c.Name), Kind: Clean(l.c.Kind), Dof: "∞", U: r.Scale.Small(l.u)}
		if l.c.Dof != nil {
			p.Dof = Digits(*l.c.Dof, 3)
		}
		if total > 0 {
			p.Share = l.u * l.u / total
			p.Percent = Digits(math.Round(100*p.Share), 3) + " %"
			if p.Share > 0 && p.Share < 0.005 {
				p.Percent = "< 1 %"
			}
		}
		parts = append(parts, p)
	}
	return parts
}

// inUnit rescales a difference between two linear units of one dimension;
// anything else is left as it is.
func inUnit(x float64, from, to string) float64 {
	f, err1 := unit.Lookup(from)
	t, err2 := unit.Lookup(to)
	if err1 != nil || err2 != nil || f == t || f.Dim != t.Dim || f.IsLog() || t.IsLog() {
		return x
	}
	return t.FromLinear(f.ToLinear(x)) - t.FromLinear(f.ToLinear(0))
}

// TwoLargest names the two largest parts of a row's uncertainty in one line:
// "calibration of box 0.018 dB (81 %), repeatability 0.008 dB (19 %)".
func (r *Row) TwoLargest() string {
	var out []string
	for i, p := range r.Budget() {
		if i == 2 || p.Share == 0 {
			break
		}
		out = append(out, fmt.Sprintf("%s %s (%s)", p.Name, p.U, p.Percent))
	}
	return strings.Join(out, ", ")
}

// Facts lists what a row rests on: measure and takes, class, clause,
// conditions, typical value, notes.
func (r *Row) Facts() []string {
	c := r.Check
	first := Clean(c.Measure)
	if t := r.Takes(); t != "" {
		first += " of " + t
	}
	out := []string{first}
	if c.Class != "" {
		out = append(out, Clean(c.Class))
	}
	if c.Optional {
		out = append(out, "optional")
	}
	if c.Clause != "" {
		out = append(out, "clause "+Clean(c.Clause))
	}
	for _, s := range c.Conditions {
		out = append(out, Clean(s))
	}
	if r.Typical != "" {
		out = append(out, "typical "+r.Typical)
	}
	for _, s := range c.Notes {
		out = append(out, Clean(s))
	}
	return out
}

// Takes names a row's takes, those that are not the main one with their role:
// "take quiet, gain_take g40".
func (r *Row) Takes() string {
	var out []string
	for _, t := range r.Check.Takes {
		out = append(out, Clean(t.Role)+" "+Clean(t.Name))
	}
	if out == nil && r.Check.Take != nil {
		out = []string{"take " + Clean(*r.Check.Take)}
	}
	return strings.Join(out, ", ")
}
