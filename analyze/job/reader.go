package job

import (
	"path/filepath"
	"slices"
	"strconv"
	"strings"

	"benchslip/analyze"
	"benchslip/analyze/keys"
)

// reader turns trees into a Job.
type reader struct {
	faults
	job      *Job
	opt      Options
	defaults *node // [defaults], nil when there is none
	broken   bool  // text was lost to syntax errors: names may be missing for that reason
	anyPath  bool  // paths come from a command line: no rules about them

	gear   map[string]*Gear
	takes  map[string]*analyze.Take
	states map[*analyze.Take]func(string) *node // what a take states, defaults among it
	order  []string                             // names of takes as the file has them
	firsts map[string]pos                       // where a name was defined, by "gear NAME", "take NAME", "row NAME"
	wires  []wire                               // channels to look up in the files' headers
	slips  map[string]map[string]golden         // slips of limits_from by path
}

func newReader(name, dir string, o Options) *reader {
	return &reader{
		job:    &Job{File: name, Dir: dir, Decision: "four-way", Coverage: 2},
		opt:    o,
		gear:   map[string]*Gear{},
		takes:  map[string]*analyze.Take{},
		states: map[*analyze.Take]func(string) *node{},
		firsts: map[string]pos{},
		slips:  map[string]map[string]golden{},
	}
}

// find is keys.Find for names that must be in the table.
func find(name string, in keys.Place) keys.Key {
	k, ok := keys.Find(name, in)
	if !ok {
		panic("job: no key " + name)
	}
	return k
}

var topTables = []string{"unit", "record", "rule", "mains", "gear", "defaults", "takes", "checks"}

// top reads what only the job file itself may say.
func (r *reader) top(root *node) {
	r.unknown(root, append(keys.Names(keys.Job), topTables...), "the job file")
	r.integer(root.get("format"), find("format", keys.Job))
	r.job.Title = r.textOf(root.get("title"), find("title", keys.Job), false)

	if n := r.table(root, "unit"); n != nil {
		for _, name := range n.names {
			r.job.Unit = append(r.job.Unit, Entry{name, r.textOf(n.under[name], keys.Key{Name: name}, true)})
		}
	}
	if n := r.table(root, "record"); n != nil {
		r.unknown(n, keys.Names(keys.Record), "[record]")
		for _, name := range n.names {
			k, ok := keys.Find(name, keys.Record)
			if !ok {
				continue
			}
			v := n.under[name]
			text := ""
			if k.Kind == keys.Date {
				text = r.date(v, k)
				r.job.Date = text
			} else {
				text = r.textOf(v, k, true)
			}
			r.job.Record = append(r.job.Record, Entry{name, text})
		}
	}
	if n := r.table(root, "rule"); n != nil {
		r.unknown(n, keys.Names(keys.Rule), "[rule]")
		if w := r.word(n.get("decision"), find("decision", keys.Rule)); w != "" {
			r.job.Decision = w
		}
		if k := r.number(n.get("coverage"), find("coverage", keys.Rule)); k != 0 {
			r.job.Coverage = k
		}
	}
	if n := r.table(root, "mains"); n != nil {
		r.unknown(n, keys.Names(keys.Mains), "[mains]")
		r.mains(n.get("frequency"))
	}
	r.defaults = r.table(root, "defaults")
	r.checkDefaults()
}

// mains reads the nominal mains frequency or "find".
func (r *reader) mains(n *node) {
	if n == nil {
		return
	}
	k := find("frequency", keys.Mains)
	if n.kind == stringKind && n.text == "find" {
		r.job.Mains = n.text
		return
	}
	if n.kind == stringKind {
		if m := r.meant(n.text, k.Words); m != "" {
			r.add(n.at, "%s: got %s%s", tick(k.Name), quote(n.text), m)
			return
		}
	}
	if q := r.quantity(n, k); q != nil {
		r.job.Mains, r.job.MainsHz = q.Text, q.Linear()
	}
}

// all reads gear, takes and checks of the job file and its included files.
func (r *reader) all(trees []*node) {
	for _, t := range trees {
		r.broken = r.broken || t.broken
	}
	each := func(name string, do func(name string, n *node)) {
		for _, t := range trees {
			n := r.table(t, name)
			if n == nil {
				continue
			}
			for _, key := range n.names {
				do(key, n.under[key])
			}
		}
	}
	each("gear", r.readGear)
	each("takes", r.readTake)
	for _, t := range trees {
		n := t.get("checks")
		if n == nil {
			continue
		}
		if n.kind != arrayKind {
			r.add(n.at, "checks come as a list: write [[checks]]")
			continue
		}
		for _, c := range n.items {
			if c.kind != tableKind {
				r.add(c.at, "a check is a table: write [[checks]] and its keys below")
				continue
			}
			r.readCheck(c)
		}
	}
	r.checkChannels()
}

// includes reads the files that the job names with `include`.
func (r *reader) includes(root *node) []*node {
	n := root.get("include")
	if n == nil {
		return nil
	}
	k := find("include", keys.Job)
	if n.kind != arrayKind {
		r.wrong(n, k, `a list of files, like ["gear.toml"]`)
		return nil
	}
	var trees []*node
	seen := map[string]bool{}
	for _, item := range n.items {
		if item.kind != stringKind {
			r.wrong(item, k, "the name of a file in quotes")
			continue
		}
		path, why := confine(r.job.Dir, item.text, r.opt.AllowOutside)
		if why != "" {
			r.add(item.at, "%s: %s %s", tick(k.Name), quote(item.text), why)
			continue
		}
		if seen[path] {
			r.add(item.at, "%s: %s stands twice in the list", tick(k.Name), quote(item.text))
			continue
		}
		seen[path] = true
		data, err := readText(path)
		if err != nil {
			r.add(item.at, "%s: %s %v", tick(k.Name), quote(item.text), err)
			continue
		}
		r.job.Sources = append(r.job.Sources, Text{item.text, data})
		shown := filepath.Join(filepath.Dir(r.job.File), filepath.FromSlash(item.text))
		t := parseTree(newSource(shown, len(r.job.Sources)-1, data), &r.faults)
		allowed := []string{"format", "gear", "takes", "checks"}
		for _, name := range t.names {
			if _, known := keys.Find(name, keys.Job); !slices.Contains(allowed, name) && (known || slices.Contains(topTables, name)) {
				r.add(t.under[name].key, "%s belongs in the job file itself: an included file holds gear, takes and checks", tick(name))
				allowed = append(allowed, name)
			}
		}
		r.unknown(t, allowed, "an included file")
		r.integer(t.get("format"), find("format", keys.Job))
		trees = append(trees, t)
	}
	return trees
}

// table returns the table of that name, nil when there is none; another kind
// of value is told.
func (r *reader) table(n *node, name string) *node {
	t := n.get(name)
	if t != nil && t.kind != tableKind {
		r.add(t.at, "%s: got %s, expected a table", tick(name), kindNames[t.kind])
		return nil
	}
	return t
}

// unknown tells keys of a table that are not in the list.
func (r *reader) unknown(n *node, allowed []string, where string) {
	for _, name := range n.names {
		if !slices.Contains(allowed, name) {
			r.add(n.under[name].key, "unknown key %s in %s%s", tick(name), where, r.hint(name, allowed))
		}
	}
}

// hint names the nearest key, or all of them when there are few.
func (r *reader) hint(name string, allowed []string) string {
	if m := r.meant(name, allowed); m != "" {
		return m
	}
	if _, ok := keys.Find(name, keys.Take); ok {
		return "; it is a key of takes"
	}
	if _, ok := keys.Find(name, keys.Check); ok {
		return "; it is a key of checks"
	}
	if _, ok := keys.Find(name, keys.Gear); ok {
		return "; it is a key of gear"
	}
	if len(allowed) <= 8 {
		return "; expected " + list(allowed)
	}
	return ""
}

// checkDefaults tells defaults that neither takes nor checks know. Their
// values are judged where they are used.
func (r *reader) checkDefaults() {
	if r.defaults != nil {
		r.unknown(r.defaults, keys.Names(keys.Take|keys.Check), "[defaults]")
	}
}

// once enters a name and tells when it was there before.
func (r *reader) once(class, name string, at pos) bool {
	id := class + " " + name
	if first, ok := r.firsts[id]; ok {
		r.add(at, "the %s %s is defined twice, first in %s", class, tick(name), first.line())
		return false
	}
	r.firsts[id] = at
	return true
}

// conditions reads a `where` table.
func (r *reader) conditions(n *node) []analyze.Condition {
	if n == nil {
		return nil
	}
	if n.kind != tableKind {
		r.wrong(n, find("where", keys.Take), `a table, like { gain = "40 dB" }`)
		return nil
	}
	var out []analyze.Condition
	for _, name := range n.names {
		v := n.under[name]
		out = append(out, analyze.Condition{Key: name, Value: strings.TrimSpace(r.textOf(v, keys.Key{Name: "where." + name}, true))})
	}
	return out
}

// wiring reads the keys that takes and checks share. get finds their nodes.
func (r *reader) wiring(get func(string) *node) analyze.Wiring {
	k := func(name string) keys.Key { return find(name, keys.Take) }
	w := analyze.Wiring{
		Out:      r.channels(get("out"), k("out")),
		In:       r.channels(get("in"), k("in")),
		Out2:     r.channels(get("out2"), k("out2")),
		Driven:   r.channels(get("driven"), k("driven")),
		Mains:    r.channels(get("mains"), k("mains")),
		InLevel:  r.quantity(get("in_level"), k("in_level")),
		InFactor: r.number(get("in_factor"), k("in_factor")),
	}
	u := k("in_uncertainty")
	w.InUncertainty, _ = r.uncertainty(get("in_uncertainty"), u, k("in_level").Dims)
	if n := get("span"); n != nil {
		if lo, hi, ok := r.span(n, k("span")); ok {
			s := &analyze.Span{Text: strings.TrimSpace(n.text)}
			if lo != nil {
				s.From, s.HasFrom = lo.Linear(), true
			}
			if hi != nil {
				s.To, s.HasTo = hi.Linear(), true
			}
			w.Span = s
		}
	}
	return w
}

// channelNumber reads the N of [gear.NAME.channel.N].
func channelNumber(s string) (int, bool) {
	n, err := strconv.Atoi(s)
	return n, err == nil && n >= 1 && n <= 1<<16 && strconv.Itoa(n) == s
}
