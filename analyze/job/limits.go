package job

import (
	"encoding/json"
	"math"
	"slices"
	"strconv"
	"strings"

	"benchslip/analyze"
	"benchslip/analyze/keys"
	"benchslip/capture/unit"
)

// limitKeys may be tables by take where `each` makes a row a take.
var limitKeys = []string{"min", "max", "nominal", "within", "typical"}

// rows expands the check into its rows, each with its limits.
func (e *entry) rows() {
	e.tables()
	e.combination()
	c := e.c
	if c.Each != nil {
		for _, t := range c.Each {
			name := c.Name + ": " + t.Name
			c.rows = append(c.rows, Row{Name: name, Check: c, Main: []*analyze.Take{t}, Limits: e.limits(t, name)})
		}
	} else if e.get("each") == nil {
		row := Row{Name: c.Name, Check: c, Main: c.Repeat, Limits: e.limits(nil, c.Name)}
		for _, role := range c.Roles {
			if role.Name == "take" {
				row.Main = role.Takes
			}
		}
		c.rows = append(c.rows, row)
	}
	if c.Name == "" {
		return
	}
	at := e.n.key
	if v := e.get("name"); v != nil {
		at = v.at
	}
	for _, row := range c.rows {
		e.r.once("check", row.Name, at)
	}
}

// tables judges the shape of limits that are given by take.
func (e *entry) tables() {
	for _, name := range limitKeys {
		v := e.get(name)
		if v == nil || v.kind != tableKind {
			continue
		}
		if e.get("each") == nil {
			e.r.add(v.at, "%s: a table by take goes with %s: without it write one quantity", tick(name), tick("each"))
			continue
		}
		var names []string
		for _, t := range e.c.Each {
			names = append(names, t.Name)
			if v.get(t.Name) == nil {
				e.r.add(v.key, "%s: take %s of %s has no entry in the table", tick(name), quote(t.Name), tick("each"))
			}
		}
		if len(names) == 0 {
			continue
		}
		for _, k := range v.names {
			if !slices.Contains(names, k) {
				e.r.add(v.under[k].key, "%s: take %s is not in %s%s", tick(name), quote(k), tick("each"), e.r.meant(k, names))
			}
		}
	}
}

// combination tells limits that contradict or lack each other.
func (e *entry) combination() {
	r := e.r
	nominal, within, from := e.get("nominal"), e.within(), e.get("limits_from")
	for _, name := range []string{"min", "max"} {
		v := e.get(name)
		if v == nil {
			continue
		}
		if nominal != nil {
			r.add(v.key, "both %s and %s are stated: limits are min and max, or nominal with within", tick(name), tick("nominal"))
		} else if from != nil {
			r.add(v.key, "both %s and %s are stated: keep one", tick(name), tick("limits_from"))
		}
	}
	switch {
	case nominal != nil && from != nil:
		r.add(from.key, "both %s and %s are stated: keep one", tick("nominal"), tick("limits_from"))
	case nominal != nil && within == nil && !e.missing:
		r.add(nominal.key, "%s needs %s: how far the value may lie from it", tick("nominal"), tick("within"))
	case from != nil && within == nil && !e.missing:
		r.add(from.key, "%s needs %s: how far the value may lie from that slip's", tick("limits_from"), tick("within"))
	case within != nil && nominal == nil && from == nil && !e.missing:
		r.add(within.key, "%s needs %s", tick("within"), list([]string{"nominal", "limits_from"}))
	}
}

// within is the node of `within`; a default counts only where there is
// something to be within of.
func (e *entry) within() *node {
	if v := e.n.get("within"); v != nil {
		return v
	}
	if e.get("nominal") == nil && e.get("limits_from") == nil {
		return nil
	}
	return e.get("within")
}

// limits reads the limits of one row; t is its take with `each`, else nil.
func (e *entry) limits(t *analyze.Take, rowName string) Limits {
	pick := func(v *node) *node {
		if v == nil || v.kind != tableKind {
			return v
		}
		if t == nil {
			return nil // told before
		}
		return v.get(t.Name)
	}
	q := func(name string) *unit.Quantity { return e.limit(pick(e.get(name)), name) }
	l := Limits{Min: q("min"), Max: q("max"), Typical: q("typical"), Nominal: q("nominal")}
	if l.Min != nil && l.Max != nil {
		at := pick(e.get("max")).at
		switch {
		case l.Min.Unit != l.Max.Unit:
			e.r.add(at, "%s is in %s, %s in %s: both limits of a check are in one unit", tick("min"), unitName(l.Min.Unit), tick("max"), unitName(l.Max.Unit))
		case l.Min.Number > l.Max.Number:
			e.r.add(at, "%s %s lies below %s %s", tick("max"), quote(l.Max.Text), tick("min"), quote(l.Min.Text))
		}
	}
	from := e.get("limits_from")
	if from != nil {
		l.From = from.text
		l.Nominal = e.golden(from, rowName)
	}
	if w := pick(e.within()); w != nil {
		e.around(&l, w)
	}
	return l
}

func unitName(u unit.Unit) string {
	if u.Symbol == "" {
		return "a plain count"
	}
	return u.Symbol
}

// limit reads a limit in a unit that the measure's result converts to.
func (e *entry) limit(v *node, name string) *unit.Quantity {
	if v == nil {
		return nil
	}
	k := keys.Key{Name: name, Dims: e.m.Dims, Unit: e.m.Unit, Linear: e.m.Signed}
	relative := e.get("against") != nil && !e.m.Plain
	switch {
	case !e.known:
		k.Unit = ""
	case relative:
		k.Dims, k.Unit, k.Linear = []unit.Dim{unit.Ratio}, "dB", false
	case e.m.Name == "entered" && e.c.Params.Value != nil:
		u := e.c.Params.Value.Unit
		k.Dims, k.Unit = []unit.Dim{u.Dim}, u.Symbol
	}
	q := e.r.quantity(v, k)
	switch {
	case q == nil:
	case relative && e.known && q.Unit.Symbol != "dB":
		e.r.add(v.at, "%s: %s: relative to another take the result is a difference in dB", tick(name), quote(q.Text))
		return nil
	case e.m.Peak && q.Unit.Symbol == "dBFS":
		e.r.add(v.at, "%s: %s: dBFS relates an RMS to a full-scale sine, and %s is no RMS: write it in V or FS", tick(name), quote(q.Text), tick(e.m.Name))
		return nil
	}
	return q
}

// around makes min and max of nominal and within. In decibel units within is
// in dB. Else it is in a unit of the nominal's dimension, or in % of the
// nominal; for a nominal that is itself in % (or ppm) it is in points.
func (e *entry) around(l *Limits, v *node) {
	k := keys.Key{Name: "within", Sign: keys.NotNegative, Unit: e.m.Unit}
	nom := l.Nominal
	switch {
	case nom != nil && nom.Unit.IsLog():
		k.Unit = "dB"
	case nom != nil:
		k.Unit = nom.Unit.Symbol
	}
	if nom != nil && nom.Unit.Dim == unit.None && v.kind != stringKind {
		k.Dims = []unit.Dim{unit.None} // so that the hint shows a count
	}
	w := e.r.quantity(v, k)
	if w == nil || nom == nil {
		return
	}
	half, why := halfWidth(*nom, *w)
	if why != "" {
		e.r.add(v.at, "%s: %s: %s", tick("within"), quote(w.Text), why)
		return
	}
	l.Within = w
	l.Min, l.Max = shifted(*nom, -half), shifted(*nom, half)
}

// halfWidth gives within as a number in the nominal's unit.
func halfWidth(nom, w unit.Quantity) (half float64, why string) {
	u := nom.Unit
	points := u.Symbol == "%" || u.Symbol == "ppm"
	percent := w.Unit.Symbol == "%" || w.Unit.Symbol == "ppm"
	switch {
	case u.IsLog() && w.Unit.Symbol == "dB":
		return w.Number, ""
	case u.IsLog():
		return 0, "a nominal in " + u.Symbol + " takes a distance in dB"
	case w.Unit.IsLog():
		return 0, "a nominal in " + unitName(u) + " takes a distance in " + unitName(u) + " or in %"
	case percent && !points:
		return math.Abs(nom.Number) * w.Linear(), ""
	case w.Unit.Dim != u.Dim:
		return 0, "a nominal in " + unitName(u) + " takes a distance in " + unitName(u) + " or in %"
	}
	// A distance has no offset: 2 degC above 20 degC is 2 K above.
	delta := w.Unit.ToLinear(w.Number) - w.Unit.ToLinear(0)
	return u.FromLinear(delta) - u.FromLinear(0), ""
}

// shifted is nom + by, rounded to 14 significant digits so that decimals
// come out as one would write them: 0.3 V less 0.1 V is 0.2 V.
func shifted(nom unit.Quantity, by float64) *unit.Quantity {
	x, _ := strconv.ParseFloat(strconv.FormatFloat(nom.Number+by, 'g', 14, 64), 64)
	if x == 0 {
		x = 0 // no negative zero
	}
	text := strconv.FormatFloat(x, 'f', -1, 64)
	if m := math.Abs(x); m != 0 && (m < 1e-6 || m >= 1e9) {
		text = strconv.FormatFloat(x, 'g', -1, 64)
	}
	return &unit.Quantity{Number: x, Unit: nom.Unit, Text: strings.TrimSpace(text + " " + nom.Unit.Symbol)}
}

// golden is one row of a slip that limits come from.
type golden struct {
	Name  string   `json:"name"`
	Value *float64 `json:"value"`
	Unit  string   `json:"unit"`
}

// golden returns the value of the row of that name in the slip that
// limits_from names.
func (e *entry) golden(from *node, name string) *unit.Quantity {
	r, k := e.r, key("limits_from")
	path := r.textOf(from, k, false)
	if from.kind != stringKind {
		return nil
	}
	rows, ok := r.slips[path]
	if !ok {
		rows = r.readSlip(from, path)
		r.slips[path] = rows
	}
	if rows == nil {
		return nil // told when it was read
	}
	row, ok := rows[name]
	if !ok {
		var names []string
		for n := range rows {
			names = append(names, n)
		}
		slices.Sort(names)
		r.add(from.at, "%s: %s has no check %s%s", tick(k.Name), quote(path), quote(name), r.meant(name, names))
		return nil
	}
	if row.Value == nil {
		r.add(from.at, "%s: the check %s in %s has no value", tick(k.Name), quote(name), quote(path))
		return nil
	}
	u, err := unit.Lookup(row.Unit)
	if err != nil {
		r.add(from.at, "%s: the check %s in %s: %v", tick(k.Name), quote(name), quote(path), err)
		return nil
	}
	text := strings.TrimSpace(strconv.FormatFloat(*row.Value, 'g', -1, 64) + " " + u.Symbol)
	typed := &node{kind: stringKind, at: from.at, key: from.key, text: text}
	return e.limit(typed, "limits_from")
}

// readSlip reads the rows of a slip.json by name; nil after a fault.
func (r *reader) readSlip(from *node, typed string) map[string]golden {
	k := key("limits_from")
	path, why := typed, ""
	if !r.anyPath {
		path, why = confine(r.job.Dir, typed, r.opt.AllowOutside)
	}
	if why != "" {
		r.add(from.at, "%s: %s %s", tick(k.Name), quote(typed), why)
		return nil
	}
	data, err := readText(path)
	if err != nil {
		r.add(from.at, "%s: %s %v", tick(k.Name), quote(typed), err)
		return nil
	}
	var slip struct {
		Checks []golden `json:"checks"`
	}
	if err := json.Unmarshal(data, &slip); err != nil || slip.Checks == nil {
		r.add(from.at, "%s: %s is no slip.json", tick(k.Name), quote(typed))
		return nil
	}
	r.job.Slips = append(r.job.Slips, Text{typed, data})
	rows := map[string]golden{}
	for _, c := range slip.Checks {
		rows[c.Name] = c
	}
	return rows
}
