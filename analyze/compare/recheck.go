package compare

import (
	"encoding/json"
	"fmt"
	"math"
	"slices"
	"sort"
	"strings"
)

// Again is what a second run of the same job says about a slip.
type Again struct {
	Same     bool     // byte for byte
	Rounding bool     // not byte for byte, but within rounding
	Rows     []string // checks that differ, with where: "Gain: value 39.98 then, 39.97 now"
	Causes   []string // what changed: takes, job, limits, version, other parts of the slip
}

// Recheck holds the slip.json of old against that of a run made now. Numbers
// agree within rounding when they differ by less than 1e-9 of the larger, or
// by less than a ten thousandth of the row's own uncertainty: other processors
// and other orders of addition reach no further.
func Recheck(before, now []byte) (*Again, error) {
	var a, b map[string]any
	if err := json.Unmarshal(before, &a); err != nil {
		return nil, fmt.Errorf("the slip is no JSON: %w", err)
	}
	if err := json.Unmarshal(now, &b); err != nil {
		return nil, fmt.Errorf("the new slip is no JSON: %w", err)
	}
	out := &Again{Same: string(before) == string(now), Rows: []string{}, Causes: []string{}}
	if out.Same {
		return out, nil
	}
	out.causes(a, b)
	out.rows(a, b)
	out.Rounding = len(out.Rows) == 0 && len(out.Causes) == 0
	return out, nil
}

func textAt(m map[string]any, path ...string) string {
	var v any = m
	for _, p := range path {
		t, _ := v.(map[string]any)
		v = t[p]
	}
	s, _ := v.(string)
	return s
}

// byName lists the tables of a list by their name, in order.
func byName(m map[string]any, list string) (order []string, items map[string]map[string]any) {
	items = map[string]map[string]any{}
	rows, _ := m[list].([]any)
	for _, r := range rows {
		t, _ := r.(map[string]any)
		name := textAt(t, "name")
		if _, twice := items[name]; !twice {
			order = append(order, name)
		}
		items[name] = t
	}
	return order, items
}

// causes says what of the inputs changed.
func (r *Again) causes(a, b map[string]any) {
	say := func(format string, args ...any) { r.Causes = append(r.Causes, fmt.Sprintf(format, args...)) }
	names, was := byName(a, "takes")
	later, is := byName(b, "takes")
	for _, n := range names {
		t, there := is[n]
		switch x, y := textAt(was[n], "sha256"), textAt(t, "sha256"); {
		case !there:
			say("take %s is no longer in the job", n)
		case x == y:
		case y == "":
			say("take %s (%s) cannot be read now", n, textAt(was[n], "file"))
		case x == "":
			say("take %s (%s) could not be read then", n, textAt(t, "file"))
		default:
			say("take %s (%s) has changed: SHA-256 %.12s then, %.12s now", n, textAt(t, "file"), x, y)
		}
	}
	for _, n := range later {
		if _, there := was[n]; !there {
			say("take %s is new in the job", n)
		}
	}
	if textAt(a, "job", "sha256") != textAt(b, "job", "sha256") {
		say("the job file has changed")
	}
	if textAt(a, "limits_sha256") != textAt(b, "limits_sha256") {
		say("limits have changed")
	}
	if x, y := textAt(a, "tool", "version"), textAt(b, "tool", "version"); x != y {
		say("version %s then, %s now", x, y)
	}
	if len(r.Causes) == 0 && textAt(a, "sheet") != textAt(b, "sheet") {
		say("an included file or a slip that limits came from has changed")
	}
}

// rows says which checks differ and where first.
func (r *Again) rows(a, b map[string]any) {
	names, was := byName(a, "checks")
	later, is := byName(b, "checks")
	for _, n := range names {
		now, there := is[n]
		if !there {
			r.Rows = append(r.Rows, n+": no longer in the job")
			continue
		}
		u := 0.0
		for _, c := range []map[string]any{was[n], now} {
			if x, ok := c["uncertainty"].(float64); ok {
				u = math.Max(u, math.Abs(x))
			}
		}
		if where := differ("", was[n], now, u); where != "" {
			r.Rows = append(r.Rows, n+": "+where)
		}
	}
	for _, n := range later {
		if _, there := was[n]; !there {
			r.Rows = append(r.Rows, n+": new in the job")
		}
	}
	if len(r.Rows) > 0 || len(r.Causes) > 0 {
		return
	}
	// Same rows of the same inputs: what else of the slip differs. The hashes
	// of the other files follow from their bytes.
	for _, k := range sortedKeys(a, b) {
		if k == "checks" || k == "files" {
			continue
		}
		if where := differ(k, a[k], b[k], 0); where != "" {
			r.Causes = append(r.Causes, "other parts of the slip: "+where)
		}
	}
}

func sortedKeys(list ...map[string]any) []string {
	var keys []string
	for _, m := range list {
		for k := range m {
			if !slices.Contains(keys, k) {
				keys = append(keys, k)
			}
		}
	}
	sort.Strings(keys)
	return keys
}

// first are the keys of a check that are told before others.
var first = []string{"verdict", "value", "uncertainty", "bound", "reason", "min", "max", "margin"}

// differ finds the first place where two decoded values differ by more than
// rounding; "" when they do not. A key that the older version did not write is
// no difference. u is the row's uncertainty.
func differ(path string, a, b any, u float64) string {
	switch x := a.(type) {
	case map[string]any:
		y, ok := b.(map[string]any)
		if !ok {
			return told(path, a, b)
		}
		keys := sortedKeys(x, y)
		sort.SliceStable(keys, func(i, j int) bool { return rankOf(keys[i]) < rankOf(keys[j]) })
		for _, k := range keys {
			v, had := x[k]
			if !had {
				continue
			}
			w, has := y[k]
			if !has {
				return strings.TrimPrefix(path+"."+k, ".") + " is gone"
			}
			if where := differ(strings.TrimPrefix(path+"."+k, "."), v, w, u); where != "" {
				return where
			}
		}
		return ""
	case []any:
		y, ok := b.([]any)
		if !ok {
			return told(path, a, b)
		}
		if len(x) != len(y) {
			return fmt.Sprintf("%s: %d entries then, %d now", path, len(x), len(y))
		}
		for i := range x {
			if where := differ(fmt.Sprintf("%s[%d]", path, i), x[i], y[i], u); where != "" {
				return where
			}
		}
		return ""
	case float64:
		y, ok := b.(float64)
		if !ok || !rounded(x, y, u) {
			return told(path, a, b)
		}
		return ""
	}
	if a != b {
		return told(path, a, b)
	}
	return ""
}

func rankOf(key string) int {
	if i := slices.Index(first, key); i >= 0 {
		return i
	}
	return len(first)
}

func rounded(x, y, u float64) bool {
	d := math.Abs(x - y)
	return d <= 1e-9*math.Max(math.Abs(x), math.Abs(y)) || d <= 1e-4*u
}

// told words a difference shortly.
func told(path string, a, b any) string {
	word := func(v any) string {
		switch x := v.(type) {
		case nil:
			return "nothing"
		case float64:
			return fmt.Sprintf("%.9g", x)
		case map[string]any, []any:
			return "a list"
		}
		s := fmt.Sprint(v)
		if len([]rune(s)) > 80 {
			s = string([]rune(s)[:80]) + "..."
		}
		return s
	}
	return fmt.Sprintf("%s %s then, %s now", path, word(a), word(b))
}
