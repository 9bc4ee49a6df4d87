package job

import (
	"fmt"
	"slices"
	"strconv"
	"strings"

	"benchslip/analyze/keys"
	"benchslip/capture/recording"
)

// A measure on the command line is a job of one check: its options become
// the nodes that a job file would give, and the same reader judges them.
// Faults name the option ("--at: ...") instead of a line.

// Options of a measure beside the check's keys, by the place whose key each
// stands for. "channel" is the key `out`.
var measureOptions = map[string]struct {
	in  keys.Place
	key string
}{
	"full_scale_peak":    {keys.Gear, "full_scale_peak"},
	"full_scale_sine":    {keys.Gear, "full_scale_sine"},
	"gear_uncertainty":   {keys.Gear, "uncertainty"},
	"offset_uncertainty": {keys.Gear, "offset_uncertainty"},
	"probe":              {keys.Gear, "probe"},
	"coupling":           {keys.Gear, "coupling"},
	"clock":              {keys.Gear, "clock"},
	"channel_match":      {keys.Gear, "channel_match"},
	"separation":         {keys.Gear, "separation"},
	"skew":               {keys.Gear, "skew"},
	"stimulus":           {keys.Take, "stimulus"},
	"mains_frequency":    {keys.Mains, "frequency"},
	"decision":           {keys.Rule, "decision"},
	"coverage":           {keys.Rule, "coverage"},
}

// notOptions are keys of a check that make no sense beside files named on
// the command line.
var notOptions = []string{"out", "measure", "take", "each", "optional", "waiver", "where"}

// MeasureKey is one option that `measure NAME` takes: `at` is --at, gain_take
// is --gain-take.
type MeasureKey struct {
	Option string // with underscores
	keys.Key
}

// MeasureKeys lists the options of a measure: its keys, then those of gear,
// take and rule.
func MeasureKeys(measure string) []MeasureKey {
	var out []MeasureKey
	for _, k := range keys.For(measure) {
		switch {
		case k.Name == "out":
			out = append(out, MeasureKey{"channel", k})
		case !slices.Contains(notOptions, k.Name):
			out = append(out, MeasureKey{k.Name, k})
		}
	}
	m, _ := keys.FindMeasure(measure)
	if m.Roles == nil {
		return out
	}
	var more []string
	for name := range measureOptions {
		more = append(more, name)
	}
	slices.Sort(more)
	for _, name := range more {
		o := measureOptions[name]
		out = append(out, MeasureKey{name, find(o.key, o.in)})
	}
	for _, k := range keys.At(keys.CSV) {
		out = append(out, MeasureKey{"csv_" + k.Name, k})
	}
	return out
}

// FromMeasure makes a job of one check: measure name on files, one row a
// file (max_output: one row of all files). opts holds options by key, with
// underscores; takes in other roles are files too. Paths are taken as they
// are. Faults come as Errors.
func FromMeasure(name string, files []string, opts map[string]string, o Options) (*Job, error) {
	r := newReader("", ".", o)
	r.anyPath = true
	if _, ok := keys.FindMeasure(name); !ok {
		r.add(optionPos("measure", 0), "unknown measure %s%s", quote(name), r.meant(name, keys.MeasureNames()))
		return nil, r.err()
	}
	b := &optionBuilder{r: r, name: name, files: map[string]string{}, takes: newTable(optionPos("FILE", 0), optionPos("FILE", 0))}
	root := b.build(files, opts)
	if err := r.err(); err != nil {
		return nil, err
	}
	r.top(root)
	r.all([]*node{root})
	if err := r.err(); err != nil {
		return nil, err
	}
	return r.job, nil
}

func optionPos(name string, index int) pos {
	shown := name
	if name != "FILE" && name != "measure" {
		shown = "--" + strings.ReplaceAll(name, "_", "-")
	}
	return pos{&source{name: shown, index: index, option: true}, 0}
}

// optionBuilder builds the tree that a job file would give.
type optionBuilder struct {
	r     *reader
	name  string
	files map[string]string // take name by path
	takes *node
}

func (b *optionBuilder) build(files []string, opts map[string]string) *node {
	at := optionPos("measure "+b.name, 0)
	at.src.name = "measure " + b.name
	root, check, gear, csv := newTable(at, at), newTable(at, at), newTable(at, at), newTable(at, at)
	own := map[keys.Place]*node{keys.Gear: gear, keys.Mains: newTable(at, at), keys.Rule: newTable(at, at), keys.Take: newTable(at, at)}

	names := MeasureKeys(b.name)
	given := make([]string, 0, len(opts))
	for k := range opts {
		given = append(given, k)
	}
	slices.Sort(given)
	for i, opt := range given {
		p := optionPos(opt, i+1)
		j := slices.IndexFunc(names, func(k MeasureKey) bool { return k.Option == opt })
		if j < 0 {
			b.unknownOption(p, opt, names)
			continue
		}
		k, text := names[j].Key, opts[opt]
		switch o, special := measureOptions[opt]; {
		case special:
			own[o.in].put(o.key, b.node(p, k, text))
		case strings.HasPrefix(opt, "csv_") && k.In&keys.CSV != 0:
			csv.put(k.Name, b.node(p, k, text))
		default:
			check.put(k.Name, b.node(p, k, text))
		}
	}

	put(check, at, "measure", b.name)
	if check.get("name") == nil {
		put(check, at, "name", b.name)
	}
	m, _ := keys.FindMeasure(b.name)
	b.mains(check, at, m, files)
	root.put("checks", &node{kind: arrayKind, at: at, key: at, items: []*node{check}})
	root.put("mains", own[keys.Mains])
	root.put("rule", own[keys.Rule])
	defaults := own[keys.Take]
	if len(csv.names) > 0 {
		defaults.put("csv", csv)
	}
	root.put("takes", b.takes)
	b.gear(root, gear, at)
	root.put("defaults", defaults)
	return root
}

// mains names the main takes: the files in order.
func (b *optionBuilder) mains(check *node, at pos, m keys.Measure, files []string) {
	p := optionPos("FILE", 0)
	reads := slices.Contains(m.Roles, "take")
	switch {
	case !reads && len(files) > 0 && m.Roles != nil:
		b.r.add(at, "reads no plain FILE: name its takes with --%s and --%s", m.Roles[0], strings.ReplaceAll(m.Roles[1], "_", "-"))
	case !reads && len(files) > 0:
		b.r.add(at, "reads no FILE")
	case reads && len(files) == 0 && check.get("repeat") == nil:
		b.r.add(at, "expected a FILE")
	case !reads || len(files) == 0:
	case len(files) == 1:
		put(check, p, "take", b.take(files[0], p))
	default:
		key := "each"
		if m.Name == "max_output" {
			key = "take"
		}
		l := &node{kind: arrayKind, at: p, key: p}
		for _, f := range files {
			l.items = append(l.items, &node{kind: stringKind, at: p, key: p, text: b.take(f, p)})
		}
		check.put(key, l)
	}
}

// take enters a file as a take and returns its name: the path as typed.
func (b *optionBuilder) take(path string, at pos) string {
	if _, ok := b.files[path]; !ok {
		b.files[path] = path
		t := newTable(at, at)
		put(t, at, "file", path)
		b.takes.put(path, t)
	}
	return path
}

// gear makes gear entries when something was said of the gear. A recorder
// and a scope are told apart by what the file holds.
func (b *optionBuilder) gear(root, gear *node, at pos) {
	if len(gear.names) == 0 {
		return
	}
	kinds := map[string]string{} // by path
	mixed := false
	for _, path := range b.takes.names {
		kinds[path] = b.kind(path, gear.get("probe") != nil)
		mixed = mixed || kinds[path] != kinds[b.takes.names[0]]
	}
	all := newTable(at, at)
	for _, path := range b.takes.names {
		kind, name := kinds[path], "recorder"
		if kind == recording.Scope {
			name = "scope"
		}
		put(b.takes.under[path], at, "gear", name)
		if all.get(name) != nil {
			continue
		}
		g := newTable(at, at)
		put(g, at, "kind", kind)
		for _, k := range gear.names {
			scopes := kind == recording.Scope && strings.HasPrefix(k, "full_scale")
			audios := kind == recording.Audio && k == "probe"
			if mixed && (scopes || audios) {
				continue // the option is for the other kind of file
			}
			g.put(k, gear.under[k])
		}
		all.put(name, g)
	}
	root.put("gear", all)
}

// kind of a file by its content; where that cannot be seen, a probe factor
// speaks for a scope.
func (b *optionBuilder) kind(path string, probe bool) string {
	if b.r.opt.Headers != nil {
		if in, err := b.r.opt.Headers(path, recording.Options{}); err == nil && in != nil {
			return in.Kind
		}
	}
	if probe {
		return recording.Scope
	}
	return recording.Audio
}

// node makes the node that a job file would give for the option's text.
func (b *optionBuilder) node(p pos, k keys.Key, text string) *node {
	n := &node{kind: stringKind, at: p, key: p, text: text}
	switch k.Kind {
	case keys.TakeRef:
		n.text = b.take(text, p)
	case keys.TakeRefs:
		n.kind = arrayKind
		for _, f := range strings.Split(text, ",") {
			n.items = append(n.items, &node{kind: stringKind, at: p, key: p, text: b.take(strings.TrimSpace(f), p)})
		}
	case keys.Integer:
		if _, err := strconv.Atoi(text); err == nil {
			n.kind = integerKind
		}
	case keys.Number:
		if _, err := strconv.ParseFloat(text, 64); err == nil {
			n.kind = floatKind
		}
	case keys.Channels:
		if _, err := strconv.Atoi(text); err == nil {
			n.kind = integerKind
		}
	case keys.Quantities:
		// a list is told by its commas, unless one of them is a decimal comma
		if parts := strings.Split(text, ","); b.name == "cmrr" && len(parts) > 1 && !slices.ContainsFunc(parts, lacksUnit) {
			n.kind = arrayKind
			for _, part := range parts {
				n.items = append(n.items, &node{kind: stringKind, at: p, key: p, text: strings.TrimSpace(part)})
			}
		}
	}
	return n
}

func lacksUnit(s string) bool { return strings.Trim(s, "0123456789. ") == "" }

func (b *optionBuilder) unknownOption(p pos, opt string, names []MeasureKey) {
	var words []string
	for _, k := range names {
		words = append(words, k.Option)
	}
	hint := ""
	if w := b.r.meant(opt, words); w != "" {
		hint = strings.ReplaceAll(strings.Replace(w, "`", "--", 1), "`", "")
		hint = strings.ReplaceAll(hint, "_", "-")
	} else if k, ok := keys.Find(opt, keys.Check); ok && k.Measures != nil {
		hint = fmt.Sprintf("; it belongs to %s", strings.ReplaceAll(list(k.Measures), "`", ""))
	}
	if opt == "out" {
		hint = "; the channel is chosen with --channel"
	}
	b.r.add(p, "measure %s has no such option%s", b.name, hint)
}

func put(t *node, at pos, name, text string) {
	t.put(name, &node{kind: stringKind, at: at, key: at, text: text})
}
