// Package compare holds finished slips against each other: before and after a
// repair, unit against unit, a batch, one unit over the years. It reads
// slip.json alone, no recording.
//
// The difference of two values is the second less the first, in the first's
// unit. Its uncertainty combines what belongs to each of them alone; an error
// that both share, such as the calibration of one and the same gear, enters
// with its own difference (JCGM 100:2008, 5.2.2 with r = 1) and mostly cancels.
// A difference is significant when it is larger than its expanded
// uncertainty. A row is worse when its margin to the limits has shrunk by more
// than that.
package compare

import (
	"fmt"
	"math"
	"slices"
	"sort"
	"strings"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
	"benchslip/analyze/slip"
	"benchslip/capture/unit"
)

// States of a row, the worst first.
const (
	Worse        = "worse"        // the margin shrank by more than its uncertainty
	Incomparable = "incomparable" // missing, other measure, other conditions, no value on one side
	Changed      = "changed"      // a significant difference without or with an unchanged margin
	Better       = "better"       // the margin grew by more than its uncertainty
	Same         = "same"         // no significant difference
)

var order = []string{Worse, Incomparable, Changed, Better, Same}

// Input is one slip to compare.
type Input struct {
	File string // as typed
	Slip *slip.Slip
}

// Report is the comparison. It is what `compare --json` prints: keys are
// added, none is renamed.
type Report struct {
	Format int      `json:"format"` // 1
	Slips  []Source `json:"slips"`
	Worse  int      `json:"worse"`        // rows
	Open   int      `json:"incomparable"` // rows
	Checks []Row    `json:"checks"`       // the worst first

	Figures []analyze.Figure `json:"-"` // curves of the slips over each other
}

// Source is one of the slips.
type Source struct {
	Label   string `json:"label"` // short and unlike the others'
	File    string `json:"file"`
	Sheet   string `json:"sheet"`
	Serial  string `json:"serial"`
	Date    string `json:"date"`
	Title   string `json:"title"`
	Verdict string `json:"verdict"`
	Version string `json:"version"`
}

// Row is one check over all slips.
type Row struct {
	Name        string   `json:"name"`
	Measure     string   `json:"measure"`
	Unit        string   `json:"unit"`
	State       string   `json:"state"`
	Why         string   `json:"why"`         // what the state rests on, "" for same
	Difference  *float64 `json:"difference"`  // last less first; of two: second less first
	Uncertainty *float64 `json:"uncertainty"` // expanded, of the difference
	Significant bool     `json:"significant"`
	Margin      *float64 `json:"margin_change"` // of the margin, same slips; null without limits
	Values      []Value  `json:"values"`        // one a slip
	Group       *Group   `json:"group"`         // of three and more slips; null for two

	Checks []*slip.Check `json:"-"` // one a slip, nil where it is missing

	rank float64 // within its state: the larger the worse
}

// Value is what one slip says, in the row's unit.
type Value struct {
	Value       *float64 `json:"value"`
	Uncertainty *float64 `json:"uncertainty"`
	Verdict     string   `json:"verdict"` // "" where the check is missing
	State       string   `json:"state"`   // against the first slip; "" for the first
}

// Make compares two or more slips.
func Make(in []Input) (*Report, error) {
	if len(in) < 2 {
		return nil, fmt.Errorf("%d slip given, two or more are wanted", len(in))
	}
	r := &Report{Format: 1, Slips: sources(in), Checks: []Row{}}
	for _, name := range names(in) {
		r.Checks = append(r.Checks, rowOf(in, name, r.Slips))
	}
	sort.SliceStable(r.Checks, func(i, j int) bool {
		a, b := &r.Checks[i], &r.Checks[j]
		if x, y := slices.Index(order, a.State), slices.Index(order, b.State); x != y {
			return x < y
		}
		return a.rank > b.rank
	})
	for _, c := range r.Checks {
		switch c.State {
		case Worse:
			r.Worse++
		case Incomparable:
			r.Open++
		}
	}
	r.Figures = figures(r)
	return r, nil
}

// names lists the checks of all slips: in the order of the first, then what
// only later ones have.
func names(in []Input) []string {
	var out []string
	seen := map[string]bool{}
	for _, s := range in {
		for _, c := range s.Slip.Checks {
			if !seen[c.Name] {
				seen[c.Name] = true
				out = append(out, c.Name)
			}
		}
	}
	return out
}

// sources names the slips: by serial number where that tells them apart, else
// by date, else by file.
func sources(in []Input) []Source {
	var out []Source
	for _, s := range in {
		out = append(out, Source{File: s.File, Sheet: s.Slip.Sheet, Serial: s.Slip.Unit["serial"], Date: s.Slip.Record["date"],
			Title: s.Slip.Title, Verdict: s.Slip.Verdict, Version: s.Slip.Tool.Version})
	}
	for _, by := range []func(Source) string{
		func(s Source) string { return s.Serial },
		func(s Source) string { return s.Date },
		func(s Source) string { return short(s.File, out) },
	} {
		seen := map[string]bool{}
		for _, s := range out {
			seen[by(s)] = true
		}
		if len(seen) < len(out) || seen[""] {
			continue
		}
		for i := range out {
			out[i].Label = by(out[i])
		}
		return out
	}
	for i := range out {
		out[i].Label = fmt.Sprintf("slip %d", i+1)
	}
	return out
}

// short is a path without the folders that all paths share, and without the
// name that every slip has.
func short(path string, all []Source) string {
	parts := strings.Split(path, "/")
	from := len(parts) - 1
	for _, s := range all {
		other := strings.Split(s.File, "/")
		n := 0
		for n < len(parts)-1 && n < len(other)-1 && parts[n] == other[n] {
			n++
		}
		if s.File != path {
			from = min(from, n)
		}
	}
	name := strings.Join(parts[from:], "/")
	if trimmed := strings.TrimSuffix(name, "/slip.json"); trimmed != "" {
		return trimmed
	}
	return path
}

func checkOf(s *slip.Slip, name string) *slip.Check {
	for i := range s.Checks {
		if s.Checks[i].Name == name {
			return &s.Checks[i]
		}
	}
	return nil
}

// rowOf compares one check over all slips, each with the first.
func rowOf(in []Input, name string, src []Source) Row {
	row := Row{Name: name, State: Same}
	var first *slip.Check
	for _, s := range in {
		c := checkOf(s.Slip, name)
		row.Checks = append(row.Checks, c)
		if first == nil {
			first = c
		}
	}
	row.Measure, row.Unit = first.Measure, first.Unit
	for i, c := range row.Checks {
		v := Value{}
		if c != nil {
			v.Verdict = c.Verdict
			if in := into(c, row.Unit); in != nil {
				v.Value, v.Uncertainty = in.Value, in.Uncertainty
			}
		}
		row.Values = append(row.Values, v)
		if i == 0 {
			continue
		}
		p := pair(in[0].Slip, in[i].Slip, row.Checks[0], c)
		row.Values[i].State = p.state
		last := i == len(in)-1
		worse := slices.Index(order, p.state) < slices.Index(order, row.State) || p.state == row.State && p.rank > row.rank
		if i == 1 || worse {
			row.State, row.rank, row.Why = p.state, p.rank, p.why
			if len(in) > 2 && p.why != "" {
				row.Why = src[i].Label + ": " + p.why
			}
		}
		if last {
			row.Difference, row.Uncertainty, row.Significant, row.Margin = p.difference, p.uncertainty, p.significant, p.margin
		}
	}
	if len(in) > 2 {
		row.Group = groupOf(&row, in, src)
	}
	return row
}

// outcome of one pair.
type outcome struct {
	state, why              string
	difference, uncertainty *float64
	significant             bool
	margin                  *float64
	rank                    float64
}

func incomparable(format string, args ...any) outcome {
	return outcome{state: Incomparable, why: fmt.Sprintf(format, args...)}
}

// pair compares two checks of one name.
func pair(sa, sb *slip.Slip, a, b *slip.Check) outcome {
	switch {
	case a == nil:
		return incomparable("the first slip has no such check")
	case b == nil:
		return incomparable("the check is missing")
	case a.Measure != b.Measure:
		return incomparable("measures %s there, %s here", a.Measure, b.Measure)
	}
	if why := otherConditions(sa, sb, a, b); why != "" {
		return incomparable("%s", why)
	}
	c := into(b, a.Unit)
	if c == nil {
		return incomparable("given in %s there, in %s here", orCount(a.Unit), orCount(b.Unit))
	}
	b = c
	if a.Value == nil || b.Value == nil {
		return withoutValue(a, b)
	}
	k := math.Max(sa.Rule.Coverage, sb.Rule.Coverage)
	U, known := differenceU(sa, sb, a, b, k, false)
	d := *b.Value - *a.Value
	if a.Unit == "deg" {
		d -= 360 * math.Ceil((d-180)/360)
	}
	out := outcome{state: Same, difference: &d}
	if !known {
		out.why = "no uncertainty is known"
		return out
	}
	out.uncertainty = &U
	out.significant = beyond(d, U, *a.Value, *b.Value)
	if out.significant {
		out.state, out.rank = Changed, math.Abs(d)/math.Max(U, 1e-300)
	}
	margins(sa, sb, a, b, k, U, &out)
	return out
}

// beyond reports whether d is larger than U, and larger than what rounding to
// 12 digits leaves.
func beyond(d, U, a, b float64) bool {
	return math.Abs(d) > U*(1+1e-9) && math.Abs(d) > 1e-9*math.Max(math.Abs(a), math.Abs(b))
}

// margins looks how far both values lie from the second slip's limits.
func margins(sa, sb *slip.Slip, a, b *slip.Check, k, U float64, out *outcome) {
	if b.Verdict == slip.NotJudged || a.Verdict == slip.NotJudged {
		return
	}
	ma, upperA, okA := marginOf(*a.Value, b)
	mb, upperB, okB := marginOf(*b.Value, b)
	if !okA || !okB {
		return
	}
	if !near(a.Min, b.Min) || !near(a.Max, b.Max) {
		out.why = "the limits changed: both are held against the second slip's"
	}
	change := mb - ma
	out.margin = &change
	if upperA != upperB { // an error of both moves the margins apart, not along
		U, _ = differenceU(sa, sb, a, b, k, true)
	}
	if !beyond(change, U, *a.Value, *b.Value) {
		return
	}
	out.rank = math.Abs(change) / math.Max(U, 1e-300)
	out.state = Better
	if change < 0 {
		out.state = Worse
	}
}

// marginOf is the smaller of value - min and max - value; upper: the latter.
func marginOf(v float64, c *slip.Check) (m float64, upper, ok bool) {
	m = math.Inf(1)
	if c.Min != nil {
		m, ok = v-*c.Min, true
	}
	if c.Max != nil && *c.Max-v < m {
		m, upper, ok = *c.Max-v, true, true
	}
	return m, upper, ok
}

func near(x, y *float64) bool {
	if x == nil || y == nil {
		return x == nil && y == nil
	}
	return math.Abs(*x-*y) <= 1e-9*math.Max(math.Abs(*x), math.Abs(*y))
}

// withoutValue says what can be said when a side has no value.
func withoutValue(a, b *slip.Check) outcome {
	code := func(c *slip.Check) string {
		text, _, _ := strings.Cut(c.Reason, ":")
		return text
	}
	switch {
	case a.Value == nil && b.Value == nil && a.Bound != nil && b.Bound != nil:
		return outcome{state: Same, why: "bounds on both sides"}
	case a.Value == nil && b.Value == nil && code(a) == code(b):
		return outcome{state: Same, why: "no value on either side: " + code(a)}
	case a.Value == nil && b.Value == nil:
		return incomparable("no value on either side: %s there, %s here", code(a), code(b))
	case a.Value == nil && a.Bound != nil:
		return againstBound(b, a, 1)
	case b.Value == nil && b.Bound != nil:
		return againstBound(a, b, -1)
	case a.Value == nil:
		return incomparable("no value there: %s", a.Reason)
	}
	return incomparable("no value here: %s", b.Reason)
}

// againstBound compares the value of c with the bound of o; sign is +1 when
// the value is the second slip's.
func againstBound(c, o *slip.Check, sign float64) outcome {
	u := 0.0
	if c.Uncertainty != nil {
		u = *c.Uncertainty
	}
	up := o.Bound.Kind == "upper" // o lies below its bound
	gap := *c.Value - o.Bound.Value
	if up && gap <= u || !up && gap >= -u {
		return outcome{state: Same, why: "a bound on one side that holds the other's value"}
	}
	out := outcome{state: Changed, significant: true, why: "one side is only known as a bound, beyond the other's value", rank: math.Abs(gap) / math.Max(u, 1e-300)}
	// The value lies above (up) or below what is bounded; towards a limit it
	// is worse when it is the second one.
	towards := up && c.Max != nil && c.Min == nil || !up && c.Min != nil && c.Max == nil
	away := up && c.Min != nil && c.Max == nil || !up && c.Max != nil && c.Min == nil
	switch {
	case towards && sign > 0 || away && sign < 0:
		out.state = Worse
	case towards && sign < 0 || away && sign > 0:
		out.state = Better
	}
	return out
}

func orCount(symbol string) string {
	if symbol == "" {
		return "plain counts"
	}
	return symbol
}

// unknownU: a row of counts has no uncertainty and needs none.
func unknownU(c *slip.Check) bool { return c.Uncertainty == nil && c.Unit != "" }

// differenceU is the expanded uncertainty of b less a. opposed: a shared error
// moves the two apart instead of along.
func differenceU(sa, sb *slip.Slip, a, b *slip.Check, coverage float64, opposed bool) (U float64, known bool) {
	if unknownU(a) || unknownU(b) {
		return 0, false
	}
	var lines []analyze.Contributor
	type side struct {
		u    map[string]float64
		list []string
	}
	sides := [2]side{{u: map[string]float64{}}, {u: map[string]float64{}}}
	extra := 0.0
	for i, c := range []*slip.Check{a, b} {
		own := ownLines(c)
		for _, l := range own {
			if l.Source == "" || !shared(sa, sb, l.Source) {
				l.Source, l.Sign = "", 0
				lines = append(lines, l)
				continue
			}
			if _, seen := sides[i].u[l.Source]; !seen {
				sides[i].list = append(sides[i].list, l.Source)
			}
			sides[i].u[l.Source] += l.U
		}
		extra += beyondBudget(c, own, coverage)
	}
	for i := range sides {
		for _, source := range sides[i].list {
			x, y := sides[0].u[source], sides[1].u[source]
			if i == 1 {
				if _, done := sides[0].u[source]; done {
					continue
				}
			}
			u := math.Abs(x - y)
			if opposed {
				u = x + y
			}
			lines = append(lines, analyze.Contributor{Name: source, Kind: "B", U: u})
		}
	}
	U, _, _, _ = budget.Expand(lines, coverage)
	return U + extra, true
}

// ownLines is the budget of a check; where the slip gives none, its expanded
// uncertainty as one line.
func ownLines(c *slip.Check) []analyze.Contributor {
	var out []analyze.Contributor
	for _, l := range c.Contributors {
		n := analyze.Contributor{Name: l.Name, Kind: l.Kind, U: math.Abs(l.StandardUncertainty), Source: l.Source}
		if l.Dof != nil {
			n.Dof = *l.Dof
		}
		out = append(out, n)
	}
	if len(out) == 0 && c.Uncertainty != nil && c.Coverage != nil && *c.Coverage > 0 {
		out = append(out, analyze.Contributor{Kind: "B", U: *c.Uncertainty / *c.Coverage})
	}
	return out
}

// beyondBudget is what a check's uncertainty holds besides its budget: the
// range that an estimator itself leaves open. It adds, not in squares.
func beyondBudget(c *slip.Check, lines []analyze.Contributor, coverage float64) float64 {
	if c.Uncertainty == nil {
		return 0
	}
	U, _, _, _ := budget.Expand(lines, coverage)
	if *c.Uncertainty <= 1.2*U { // the slope of dB and the larger half of a wide interval
		return 0
	}
	return *c.Uncertainty - U
}

// shared reports whether a source of error is one and the same in two slips:
// the same gear entry with the same calibration, or the same stated figure.
func shared(a, b *slip.Slip, source string) bool {
	if strings.HasPrefix(source, "stated ") {
		// Its text holds the figure, and both have the same text. A reading
		// taken by hand is taken anew.
		return !strings.HasPrefix(source, "stated uncertainty ")
	}
	rest, ok := strings.CutPrefix(source, "gear ")
	if !ok {
		return false
	}
	for _, g := range a.Gear {
		if rest != g.Name && !strings.HasPrefix(rest, g.Name+" ") {
			continue
		}
		if slices.Contains(b.Gear, g) {
			return true
		}
	}
	return false
}

// into gives a check with all its numbers in another unit of the same
// dimension; nil when there is no such conversion.
func into(c *slip.Check, symbol string) *slip.Check {
	if c.Unit == symbol {
		return c
	}
	from, err1 := unit.Lookup(c.Unit)
	to, err2 := unit.Lookup(symbol)
	if err1 != nil || err2 != nil || from.Dim != to.Dim {
		return nil
	}
	out := *c
	number := func(x *float64) *float64 {
		if x == nil {
			return nil
		}
		y := to.FromLinear(from.ToLinear(*x))
		if math.IsNaN(y) || math.IsInf(y, 0) {
			return nil
		}
		return &y
	}
	out.Value, out.Min, out.Max, out.Typical = number(c.Value), number(c.Min), number(c.Max), number(c.Typical)
	if c.Value != nil && out.Value == nil {
		return nil
	}
	at := 0.0
	if c.Value != nil {
		at = *c.Value
	}
	step := func(x float64) float64 { return stepInto(x, at, from, to) }
	if c.Uncertainty != nil {
		u := step(*c.Uncertainty)
		out.Uncertainty = &u
	}
	out.Contributors = slices.Clone(c.Contributors)
	for i := range out.Contributors {
		out.Contributors[i].StandardUncertainty = step(out.Contributors[i].StandardUncertainty)
	}
	if c.Bound != nil {
		b := *c.Bound
		if v := number(&b.Value); v != nil {
			b.Value, b.Unit = *v, symbol
			out.Bound = &b
		} else {
			out.Bound = nil
		}
	}
	out.Margin, out.Interval, out.Unit = nil, nil, symbol
	return &out
}

// stepInto converts a small step at a value by the slope of the conversion.
func stepInto(x, at float64, from, to unit.Unit) float64 {
	linear, base := x, from.ToLinear(at)
	if from.IsLog() {
		linear = x / budget.DecibelsPer(from.Dim) * math.Abs(base)
	} else {
		linear = from.ToLinear(x) - from.ToLinear(0)
	}
	if to.IsLog() {
		return budget.DecibelsPer(to.Dim) * linear / math.Abs(base)
	}
	return to.FromLinear(linear) - to.FromLinear(0)
}
