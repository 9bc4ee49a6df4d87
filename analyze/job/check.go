package job

import (
	"slices"
	"strings"

	"benchslip/analyze"
	"benchslip/analyze/keys"
	"benchslip/capture/unit"
)

// entry is a check being read: its own table over [defaults].
type entry struct {
	r       *reader
	n       *node
	m       keys.Measure
	known   bool // m is a measure of the list
	c       *Check
	missing bool // keys of this table were lost to a syntax error
}

// alternatives are keys of which a check states one: its own statement keeps
// a default for another out.
var alternatives = [][]string{
	{"take", "each", "repeat"},
	{"gain", "gain_take"},
	{"min", "max", "nominal", "limits_from"},
}

// get returns the node of a check's key: its own, or the default where the
// measure takes it. Keys that takes share stand in a take's place in
// [defaults], since a check's own would win over what a take says.
func (e *entry) get(name string) *node {
	if v := e.n.get(name); v != nil {
		return v
	}
	v := e.r.defaults.get(name)
	if v == nil {
		return nil
	}
	k := find(name, keys.Check)
	if k.In&keys.Take != 0 || e.known && !k.Takes(e.m.Name) {
		return nil
	}
	for _, set := range alternatives {
		if !slices.Contains(set, name) {
			continue
		}
		for _, other := range set {
			if e.n.get(other) != nil && !(limitPair(name, other)) {
				return nil
			}
		}
	}
	return v
}

// limitPair: min and max go together.
func limitPair(a, b string) bool {
	return a == "min" && b == "max" || a == "max" && b == "min"
}

// key is the table's entry of a check's key.
func key(name string) keys.Key { return find(name, keys.Check) }

// readCheck reads one entry of [[checks]].
func (r *reader) readCheck(n *node) {
	e := &entry{r: r, n: n, missing: n.broken, c: &Check{Line: n.key.line(), Class: "major"}}
	e.measure()
	e.unknown()
	e.head()
	e.takes()
	e.params()
	e.needs()
	r.job.Checks = append(r.job.Checks, e.c)
	e.rows()
	all := append(append([]*analyze.Take(nil), e.c.Each...), e.c.Repeat...)
	for _, role := range e.c.Roles {
		all = append(all, role.Takes...)
	}
	if e.c.Against != nil {
		all = append(all, e.c.Against)
	}
	r.wire(n.get, all)
}

func (e *entry) measure() {
	v := e.get("measure")
	if v == nil {
		if !e.missing {
			e.r.add(e.n.key, "the check says no measure: write measure = \"gain\" or another")
		}
		return
	}
	if v.kind != stringKind {
		e.r.wrong(v, key("measure"), "the name of a measure in quotes")
		return
	}
	e.c.Measure = v.text
	e.m, e.known = keys.FindMeasure(v.text)
	if !e.known {
		hint := e.r.meant(v.text, keys.MeasureNames())
		if hint == "" {
			hint = "; `benchslip measure --help` lists them"
		}
		e.r.add(v.at, "unknown measure %s%s", quote(v.text), hint)
	}
}

// unknown tells keys that no check has, or that this measure does not take.
func (e *entry) unknown() {
	all := keys.Names(keys.Check)
	for _, name := range e.n.names {
		k, ok := keys.Find(name, keys.Check)
		at := e.n.under[name].key
		switch {
		case !ok && e.known:
			var own []string
			for _, k := range keys.For(e.m.Name) {
				own = append(own, k.Name)
			}
			hint := e.r.meant(name, own)
			if hint == "" {
				hint = e.r.hint(name, all)
			}
			e.r.add(at, "unknown key %s in a check%s", tick(name), hint)
		case !ok:
			e.r.add(at, "unknown key %s in a check%s", tick(name), e.r.hint(name, all))
		case e.known && !k.Takes(e.m.Name):
			e.r.add(at, "measure %s does not take the key %s%s", tick(e.m.Name), tick(name), belongs(k))
		}
	}
}

// belongs names the measures that take a key.
func belongs(k keys.Key) string {
	return "; it belongs to " + list(k.Measures)
}

func (e *entry) head() {
	r, c := e.r, e.c
	v := e.get("name")
	c.Name = strings.TrimSpace(r.textOf(v, key("name"), false))
	switch {
	case v == nil && !e.missing:
		r.add(e.n.key, "the check has no name: write name = \"...\"")
	case v != nil && v.kind == stringKind && c.Name == "":
		r.add(v.at, "%s: the name is empty", tick("name"))
	}
	if w := r.word(e.get("class"), key("class")); w != "" {
		c.Class = w
	}
	c.Clause = r.textOf(e.get("clause"), key("clause"), true)
	c.Optional = r.boolean(e.get("optional"), key("optional"))
	c.Where = r.conditions(e.get("where"))
	v = e.get("waiver")
	if v == nil {
		return
	}
	if v.kind != tableKind {
		r.wrong(v, key("waiver"), `a table, like { by = "...", why = "...", ticket = "..." }`)
		return
	}
	r.unknown(v, keys.Names(keys.Waiver), "waiver")
	text := func(name string) string { return r.textOf(v.get(name), find(name, keys.Waiver), true) }
	c.Waiver = &Waiver{By: text("by"), Why: text("why"), Ticket: text("ticket")}
	for _, name := range []string{"by", "why"} {
		if v.get(name) == nil {
			r.add(v.key, "the waiver does not say %s", tick(name))
		}
	}
}

// takes reads every key that names takes.
func (e *entry) takes() {
	r, c := e.r, e.c
	given := ""
	for _, name := range []string{"take", "each", "repeat"} {
		v := e.get(name)
		if v == nil {
			continue
		}
		if given != "" {
			r.add(v.key, "both %s and %s are stated: keep one", tick(given), tick(name))
			continue
		}
		given = name
		switch {
		case name == "each":
			c.Each = r.takeRefs(v, key(name))
		case name == "repeat":
			c.Repeat = r.takeRefs(v, key(name))
			if v.kind == arrayKind && len(v.items) == 1 {
				r.add(v.at, "%s: a mean needs two takes or more", tick(name))
			}
		case v.kind == arrayKind && (e.m.List || !e.known):
			if ts := r.takeRefs(v, key(name)); ts != nil {
				c.Roles = append(c.Roles, Role{"take", ts})
			}
		case v.kind == arrayKind:
			r.wrong(v, key(name), "one take: write each = [...] for a row a take")
		default:
			if t := r.takeRef(v, key(name)); t != nil {
				c.Roles = append(c.Roles, Role{"take", []*analyze.Take{t}})
			}
		}
	}
	if e.known && slices.Contains(e.m.Roles, "take") && given == "" && !e.missing {
		r.add(e.n.key, "the check names no take: write take = \"...\"")
	}
	for _, k := range keys.At(keys.Check) {
		if k.Kind != keys.TakeRef {
			continue
		}
		v := e.get(k.Name)
		if v == nil {
			if e.known && slices.Contains(e.m.Roles, k.Name) && !e.missing {
				r.add(e.n.key, "measure %s needs %s: name a take, %s", tick(e.m.Name), tick(k.Name), k.Doc)
			}
			continue
		}
		t := r.takeRef(v, k)
		switch {
		case t == nil:
		case k.Name == "against":
			c.Against = t
		default:
			c.Roles = append(c.Roles, Role{k.Name, []*analyze.Take{t}})
		}
	}
}

// params reads the keys that a measure may see.
func (e *entry) params() {
	r, p := e.r, &e.c.Params
	q := func(name string) *unit.Quantity { return r.quantity(e.get(name), key(name)) }
	lin := func(name string) *float64 {
		if v := q(name); v != nil {
			x := v.Linear()
			return &x
		}
		return nil
	}
	p.Wiring = r.wiring(e.n.get)
	for _, f := range r.quantities(e.get("at"), key("at"), e.m.Name == "cmrr" || !e.known) {
		p.At = append(p.At, f.Linear())
	}
	if v := e.get("band"); v != nil {
		if lo, hi, ok := r.span(v, key("band")); ok {
			p.Band = &analyze.Band{Low: lo.Linear(), High: hi.Linear()}
		}
	}
	p.Weighting = r.word(e.get("weighting"), key("weighting"))
	p.Order = r.integer(e.get("order"), e.orderKey())
	p.Harmonics = r.integer(e.get("harmonics"), key("harmonics"))
	p.Reference = r.word(e.get("reference"), key("reference"))
	p.Plane = r.word(e.get("plane"), key("plane"))

	p.Gain, p.Source = e.stated("gain"), e.stated("source")
	p.Load, p.Series, p.Length = e.stated("load"), e.stated("series"), e.stated("length")
	p.Resistance, p.Rails = e.stated("resistance"), e.stated("rails")
	p.Temperature, p.InputR = lin("temperature"), lin("input_resistance")
	p.R1, p.R2, p.R3, p.R4, p.SourceMatch = lin("r1"), lin("r2"), lin("r3"), lin("r4"), lin("source_match")
	p.Ref, p.THDN, p.Tolerance = lin("ref"), lin("thdn"), lin("tolerance")
	p.InstrumentRise, p.Above = lin("instrument_rise"), lin("above")
	if v := q("drop"); v != nil {
		x := unit.MustLookup("dB").FromLinear(v.Linear()) // 3 dB as 3, from "3 dB"
		if v.Unit.Symbol == "dB" {
			x = v.Number
		}
		p.Drop = &x
	}
	p.RefLevel, p.MaxEach = q("ref_level"), q("max_each")

	p.Value = q("value")
	p.With = r.textOf(e.get("with"), key("with"), false)
	var of []unit.Dim
	if p.Value != nil {
		of = []unit.Dim{p.Value.Unit.Dim}
	}
	p.Uncertainty, _ = r.uncertainty(e.get("uncertainty"), key("uncertainty"), of)
}

// orderKey narrows the bounds of `order` to what the measure can mean.
func (e *entry) orderKey() keys.Key {
	k := key("order")
	switch e.m.Name {
	case "harmonic":
		k.Least = 2
	case "modulation_distortion", "difference_distortion":
		k.Least, k.Most = 2, 3
	}
	return k
}

// stated reads a quantity with its uncertainty, where there is such a key.
func (e *entry) stated(name string) *analyze.Stated {
	r, k := e.r, key(name)
	q := r.quantity(e.get(name), k)
	uk, has := keys.Find(name+"_uncertainty", keys.Check)
	var u *unit.Quantity
	if has {
		un := e.get(uk.Name)
		u, _ = r.uncertainty(un, uk, k.Dims)
		if un != nil && e.n.get(uk.Name) != nil && e.get(name) == nil {
			r.add(un.key, "%s belongs to %s, which is not stated", tick(uk.Name), tick(name))
		}
	}
	if q == nil {
		return nil
	}
	return &analyze.Stated{Value: *q, Uncertainty: u, Key: name}
}

// needs tells what the measure cannot do without.
func (e *entry) needs() {
	if !e.known || e.missing || e.r.broken {
		return
	}
	for _, need := range e.m.Needs {
		if e.has(need) {
			continue
		}
		text := list(need)
		if k, ok := keys.Find(need[0], keys.Take); ok && k.In&keys.Take != 0 {
			text += " (in the take or the check)"
		}
		e.r.add(e.n.key, "measure %s needs %s", tick(e.m.Name), text)
	}
}

// has reports whether the check states one of the keys, or each of the takes
// that the measure reads first does.
func (e *entry) has(need keys.Need) bool {
	for _, name := range need {
		if k, ok := keys.Find(name, keys.Check); ok && k.In&keys.Check != 0 && e.get(name) != nil {
			return true
		}
	}
	takes := e.mainTakes()
	if len(takes) == 0 {
		_, ofTakes := keys.Find(need[0], keys.Take)
		return ofTakes // the take itself is missing, which was told
	}
	for _, t := range takes {
		get := e.r.states[t]
		if !slices.ContainsFunc(need, func(name string) bool { return get(name) != nil }) {
			return false
		}
	}
	return true
}

// mainTakes are the takes that the measure cannot do without.
func (e *entry) mainTakes() []*analyze.Take {
	takes := append(append([]*analyze.Take(nil), e.c.Each...), e.c.Repeat...)
	for _, role := range e.c.Roles {
		if slices.Contains(e.m.Roles, role.Name) {
			takes = append(takes, role.Takes...)
		}
	}
	return takes
}
