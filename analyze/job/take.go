package job

import (
	"strings"

	"benchslip/analyze"
	"benchslip/analyze/keys"
	"benchslip/capture/recording"
	"benchslip/capture/stimulus"
)

// readTake reads [takes.NAME] over [defaults].
func (r *reader) readTake(name string, n *node) {
	if n.kind != tableKind {
		r.add(n.at, "%s: got %s, expected a table: write [takes.%s]", tick(name), kindNames[n.kind], clean(name))
		return
	}
	if !r.once("take", name, n.key) {
		return
	}
	r.unknownInTake(n, name)
	t := &analyze.Take{Name: name}
	r.takes[name] = t
	r.order = append(r.order, name)
	r.job.Takes = append(r.job.Takes, t)

	get := func(key string) *node {
		if v := n.get(key); v != nil {
			return v
		}
		return r.defaults.get(key)
	}
	k := func(name string) keys.Key { return find(name, keys.Take) }

	if file := get("file"); file != nil {
		t.File = r.textOf(file, k("file"), false)
		if file.kind == stringKind {
			t.Path = r.takePath(file, k("file"))
		}
	} else if !n.broken {
		r.add(n.key, `take %s names no file: write file = "takes/%s.wav"`, tick(name), clean(name))
	}
	if v := get("gear"); v != nil {
		if ref := r.textOf(v, k("gear"), false); ref != "" || v.kind == stringKind {
			t.Gear = r.gearRef(v, ref)
		}
	}
	t.Note = r.textOf(get("note"), k("note"), false)
	t.Setup = r.word(get("setup"), k("setup"))
	t.Stimulus, t.Played = r.stimulus(get("stimulus"), k("stimulus"))
	t.Where = r.conditions(get("where"))
	t.CSV = r.csv(n, name)
	t.Wiring = r.wiring(get)
	r.states[t] = get
	r.wire(get, []*analyze.Take{t})
	if v := n.get("in_uncertainty"); v != nil && get("in_level") == nil {
		r.add(v.key, "%s belongs to %s, which is not stated", tick("in_uncertainty"), tick("in_level"))
	}
}

func (r *reader) unknownInTake(n *node, name string) {
	r.unknown(n, keys.Names(keys.Take), "[takes."+clean(name)+"]")
}

// takePath confines a take's file to the takes' folder.
func (r *reader) takePath(n *node, k keys.Key) string {
	if r.anyPath {
		return n.text
	}
	root := r.job.Dir
	if r.opt.TakeRoot != "" {
		root = r.opt.TakeRoot
	}
	path, why := confine(root, n.text, r.opt.AllowOutside)
	if why != "" {
		r.add(n.at, "%s: %s %s", tick(k.Name), quote(n.text), why)
	}
	return path
}

func (r *reader) gearRef(n *node, name string) *analyze.Gear {
	if g := r.gear[name]; g != nil {
		return g.Gear
	}
	if r.broken {
		return nil
	}
	var names []string
	for _, g := range r.job.Gear {
		names = append(names, g.Name)
	}
	hint := r.meant(name, names)
	if hint == "" && len(names) > 0 {
		hint = "; there is " + list(names)
	} else if hint == "" {
		hint = ": the job has no gear"
	}
	r.add(n.at, "unknown gear %s%s", quote(name), hint)
	return nil
}

// stimulus is a WAV file inside the job's folder, with the path to it, or the
// description of one that can be made.
func (r *reader) stimulus(n *node, k keys.Key) (text, path string) {
	s := r.textOf(n, k, false)
	if s == "" {
		return "", ""
	}
	if !strings.HasSuffix(strings.ToLower(s), ".wav") {
		if _, err := stimulus.Parse(s); err != nil {
			r.add(n.at, "%s: %s", tick(k.Name), clean200(strings.TrimPrefix(err.Error(), "stimulus: ")))
		}
		return s, ""
	}
	if r.anyPath {
		return s, s
	}
	path, why := confine(r.job.Dir, s, r.opt.AllowOutside)
	if why != "" {
		r.add(n.at, "%s: %s %s", tick(k.Name), quote(s), why)
		return "", ""
	}
	return s, path
}

// csv reads [takes.NAME.csv], each key over that of [defaults.csv].
func (r *reader) csv(n *node, name string) recording.Options {
	own, def := r.table(n, "csv"), (*node)(nil)
	if r.defaults != nil {
		def = r.table(r.defaults, "csv")
	}
	for _, t := range []*node{own, def} {
		if t != nil {
			where := "[takes." + clean(name) + ".csv]"
			if t == def {
				where = "[defaults.csv]"
			}
			r.unknown(t, keys.Names(keys.CSV), where)
		}
	}
	get := func(key string) (*node, keys.Key) {
		k := find(key, keys.CSV)
		shown := k
		shown.Name = "csv." + key
		if v := own.get(key); v != nil {
			return v, shown
		}
		return def.get(key), shown
	}
	o := recording.Options{
		Separator: r.word(get("separator")),
		Decimal:   r.word(get("decimal")),
		Skip:      r.integer(get("skip")),
		TimeUnit:  r.word(get("time_unit")),
		ValueUnit: r.word(get("value_unit")),
		Resample:  r.boolean(get("resample")),
	}
	o.TimeColumn = r.channels(get("time_column"))
	if q := r.quantity(get("rate")); q != nil {
		o.RateHz = q.Linear()
	}
	return o
}

// takeRef returns the take that a node names.
func (r *reader) takeRef(n *node, k keys.Key) *analyze.Take {
	if n == nil {
		return nil
	}
	if n.kind != stringKind {
		r.wrong(n, k, "the name of a take in quotes")
		return nil
	}
	if t := r.takes[n.text]; t != nil {
		return t
	}
	if r.broken {
		return nil
	}
	hint := r.meant(n.text, r.order)
	switch {
	case hint != "":
	case len(r.order) == 0:
		hint = ": the job has no takes"
	default:
		hint = "; there is " + list(r.order)
	}
	r.add(n.at, "%s: unknown take %s%s", tick(k.Name), quote(n.text), hint)
	return nil
}

// takeRefs returns the takes of a list of names, each once.
func (r *reader) takeRefs(n *node, k keys.Key) []*analyze.Take {
	if n == nil {
		return nil
	}
	if n.kind != arrayKind {
		r.wrong(n, k, `a list of takes, like ["g20", "g30"]`)
		return nil
	}
	if len(n.items) == 0 {
		r.add(n.at, "%s: the list is empty", tick(k.Name))
		return nil
	}
	var out []*analyze.Take
	seen := map[*analyze.Take]bool{}
	for _, item := range n.items {
		t := r.takeRef(item, k)
		if t == nil {
			continue
		}
		if seen[t] {
			r.add(item.at, "%s: take %s stands twice in the list", tick(k.Name), quote(t.Name))
			continue
		}
		seen[t] = true
		out = append(out, t)
	}
	return out
}
