package job

import (
	"math"
	"regexp"
	"slices"
	"strconv"
	"strings"
	"time"

	"benchslip/analyze/keys"
	"benchslip/capture/unit"
)

// Each reader below takes a node and the key it belongs to, and returns the
// value or tells the fault. A nil node is a key that was not stated.

// wrong tells that a value has the wrong form.
func (f *faults) wrong(n *node, k keys.Key, want string) {
	got := kindNames[n.kind]
	switch n.kind {
	case stringKind:
		got = quote(n.text)
	case tableKind, arrayKind:
	default:
		got = clean(n.text)
	}
	f.add(n.at, "%s: got %s, expected %s", tick(k.Name), got, want)
}

// textOf reads text. A number or date in its place is taken as written where
// bare is true (free text such as a serial number).
func (f *faults) textOf(n *node, k keys.Key, bare bool) string {
	switch {
	case n == nil:
		return ""
	case n.kind == stringKind, bare && n.kind != tableKind && n.kind != arrayKind:
		return n.text
	}
	want := "text in quotes"
	if n.kind != tableKind && n.kind != arrayKind {
		want += `: write "` + clean(n.text) + `"`
	}
	f.wrong(n, k, want)
	return ""
}

// word reads one of the key's words.
func (f *faults) word(n *node, k keys.Key) string {
	if n == nil {
		return ""
	}
	if n.kind != stringKind {
		if slices.Contains(k.Words, n.text) && n.kind != arrayKind {
			f.wrong(n, k, `the word in quotes: write "`+n.text+`"`)
		} else {
			f.wrong(n, k, "one of "+list(k.Words))
		}
		return ""
	}
	if !slices.Contains(k.Words, n.text) {
		f.add(n.at, "%s: unknown word %s%s; expected %s", tick(k.Name), quote(n.text), f.meant(n.text, k.Words), list(k.Words))
		return ""
	}
	return n.text
}

// integer reads a whole number within the key's bounds.
func (f *faults) integer(n *node, k keys.Key) int {
	if n == nil {
		return 0
	}
	want := "a whole number"
	if k.Most > 0 {
		want += " from " + strconv.Itoa(k.Least) + " to " + strconv.Itoa(k.Most)
	} else {
		want += " from " + strconv.Itoa(k.Least) + " up"
	}
	if n.kind == stringKind {
		if _, err := strconv.Atoi(n.text); err == nil {
			want += ", without quotes: write " + n.text
		}
	}
	if n.kind != integerKind {
		f.wrong(n, k, want)
		return 0
	}
	v, err := strconv.ParseInt(strings.ReplaceAll(n.text, "_", ""), 0, 64)
	if err != nil || v < int64(k.Least) || k.Most > 0 && v > int64(k.Most) || v > math.MaxInt32 {
		f.wrong(n, k, want)
		return 0
	}
	return int(v)
}

// number reads a bare number.
func (f *faults) number(n *node, k keys.Key) float64 {
	if n == nil {
		return 0
	}
	want := "a number above 0"
	if n.kind != integerKind && n.kind != floatKind {
		if _, err := strconv.ParseFloat(n.text, 64); err == nil && n.kind == stringKind {
			want += ", without quotes"
		}
		f.wrong(n, k, want)
		return 0
	}
	v, err := strconv.ParseFloat(strings.ReplaceAll(n.text, "_", ""), 64)
	if err != nil || math.IsNaN(v) || math.IsInf(v, 0) || v <= 0 {
		f.wrong(n, k, want)
		return 0
	}
	return v
}

func (f *faults) boolean(n *node, k keys.Key) bool {
	if n == nil {
		return false
	}
	if n.kind != boolKind {
		f.wrong(n, k, "true or false, without quotes")
		return false
	}
	return n.text == "true"
}

// date reads 2026-12-01, bare or in quotes.
func (f *faults) date(n *node, k keys.Key) string {
	if n == nil {
		return ""
	}
	if n.kind == dateKind || n.kind == stringKind {
		if _, err := time.Parse(time.DateOnly, n.text); err == nil {
			return n.text
		}
	}
	f.wrong(n, k, "a date like 2026-12-01")
	return ""
}

// channels reads a channel: a number from 1, a column's name, or "1-2".
func (f *faults) channels(n *node, k keys.Key) string {
	if n == nil {
		return ""
	}
	text := strings.TrimSpace(n.text)
	switch n.kind {
	case integerKind:
	case stringKind:
		if text == "" {
			f.wrong(n, k, `a channel: 1, "CH1" or "1-2"`)
			return ""
		}
	default:
		f.wrong(n, k, `a channel: 1, "CH1" or "1-2"`)
		return ""
	}
	if v, err := strconv.Atoi(text); err == nil && v < 1 {
		f.wrong(n, k, "a channel from 1 up")
		return ""
	}
	if a, b, ok := strings.Cut(text, "-"); ok {
		x, errA := strconv.Atoi(strings.TrimSpace(a))
		y, errB := strconv.Atoi(strings.TrimSpace(b))
		if errA == nil && errB == nil && (x < 1 || y < 1 || x == y) {
			f.wrong(n, k, "the difference of two channels from 1 up")
			return ""
		}
	}
	return text
}

// examples of quantities by dimension.
var examples = map[unit.Dim]string{
	unit.None: "0", unit.Volt: "1.2 V", unit.Ratio: "40 dB", unit.Hertz: "1 kHz", unit.Second: "0.5 s",
	unit.Ohm: "150 ohm", unit.Farad: "0.33 uF", unit.Watt: "4 W", unit.Metre: "85 m", unit.Kelvin: "20 degC",
	unit.Degree: "180 deg", unit.VoltPerMetre: "1 uV/m", unit.VoltPerSecond: "5 V/us",
	unit.VoltPerRootHertz: "5 nV/rtHz", unit.FullScale: "-60 dBFS",
}

// wanted says what a quantity of the key looks like.
func wanted(dims []unit.Dim, u string) string {
	if len(dims) == 0 {
		return `a number with its unit in quotes, like "14.98 V"`
	}
	d := dims[0]
	ex := examples[d]
	if q, err := unit.Lookup(u); err == nil && u != "" && q.Dim == d {
		if base, err := unit.Parse(ex); err == nil && base.Unit != q && (d == unit.Ratio || q.IsLog()) {
			ex = "1 " + u
		}
	}
	if d == unit.None {
		return `a plain count in quotes, like "0"`
	}
	return article(d.String()) + `, like "` + ex + `"`
}

func article(s string) string {
	if strings.IndexByte("aeiou", s[0]) >= 0 {
		return "an " + s
	}
	if strings.HasPrefix(s, "a ") {
		return s
	}
	return "a " + s
}

// quantity reads a number with its unit.
func (f *faults) quantity(n *node, k keys.Key) *unit.Quantity {
	if n == nil {
		return nil
	}
	count := len(k.Dims) == 1 && k.Dims[0] == unit.None
	if n.kind != stringKind {
		f.bare(n, k, count)
		return nil
	}
	q, err := unit.Parse(n.text)
	if err != nil {
		f.add(n.at, "%s: %v", tick(k.Name), err)
		return nil
	}
	if q.Unit.Dim == unit.None && len(k.Dims) > 0 && !slices.Contains(k.Dims, unit.None) {
		f.add(n.at, "%s: %s has no unit: write %s", tick(k.Name), quote(q.Text), quote(strings.TrimSpace(q.Text+" "+k.Unit)))
		return nil
	}
	if len(k.Dims) > 0 && !slices.Contains(k.Dims, q.Unit.Dim) {
		f.add(n.at, "%s: %s is %s, expected %s", tick(k.Name), quote(q.Text), article(q.Unit.Dim.String()), wanted(k.Dims, k.Unit))
		return nil
	}
	if k.Linear && q.Unit.IsLog() {
		f.add(n.at, "%s: %s is in decibels, expected %s", tick(k.Name), quote(q.Text), wanted(k.Dims, k.Unit))
		return nil
	}
	if why := signFault(k.Sign, q); why != "" {
		f.add(n.at, "%s: %s %s", tick(k.Name), quote(q.Text), why)
		return nil
	}
	return &q
}

func signFault(s keys.Sign, q unit.Quantity) string {
	switch {
	case s == keys.Positive && q.Linear() <= 0:
		return "is not above 0"
	case s == keys.Above0 && q.Number <= 0:
		if q.Number < 0 {
			return "is negative: write it as a positive number"
		}
		return "is not above 0"
	case s == keys.NotNegative && q.Number < 0:
		return "is negative: write it as a positive number"
	}
	return ""
}

// bare tells that a quantity stands without quotes or unit.
func (f *faults) bare(n *node, k keys.Key, count bool) {
	switch {
	case n.kind == floatKind && strings.ContainsAny(n.text, "nN"): // nan, inf: floats hold no other n
		f.wrong(n, k, "a finite number: "+wanted(k.Dims, k.Unit))
	case n.kind == integerKind || n.kind == floatKind:
		switch {
		case count:
			f.add(n.at, "%s: a count stands in quotes: write %s", tick(k.Name), quote(n.text))
		case k.Unit != "":
			f.add(n.at, "%s: the bare number %s has no unit: write %s", tick(k.Name), clean(n.text), quote(n.text+" "+k.Unit))
		default:
			f.add(n.at, "%s: the bare number %s has no unit: expected %s", tick(k.Name), clean(n.text), wanted(k.Dims, k.Unit))
		}
	default:
		f.wrong(n, k, wanted(k.Dims, k.Unit))
	}
}

// quantities reads one quantity, or a list where many is true.
func (f *faults) quantities(n *node, k keys.Key, many bool) []unit.Quantity {
	if n == nil {
		return nil
	}
	if n.kind != arrayKind {
		if q := f.quantity(n, k); q != nil {
			return []unit.Quantity{*q}
		}
		return nil
	}
	if !many {
		f.wrong(n, k, "one value: "+wanted(k.Dims, k.Unit))
		return nil
	}
	if len(n.items) == 0 {
		f.add(n.at, "%s: the list is empty", tick(k.Name))
	}
	var out []unit.Quantity
	for _, item := range n.items {
		q := f.quantity(item, k)
		if q == nil {
			continue
		}
		for _, o := range out {
			if o.Linear() == q.Linear() {
				f.add(item.at, "%s: %s stands twice in the list", tick(k.Name), quote(q.Text))
			}
		}
		out = append(out, *q)
	}
	return out
}

// uncertainty reads an expanded uncertainty of a quantity of dimension of
// (nil: any): in %, ppm or dB of it, or in a linear unit of its own. unknown
// is true for "unknown", which counts as not stated.
func (f *faults) uncertainty(n *node, k keys.Key, of []unit.Dim) (q *unit.Quantity, unknown bool) {
	if n == nil {
		return nil, false
	}
	if n.kind == stringKind && n.text == "unknown" {
		return nil, true
	}
	any := k
	any.Dims, any.Sign = nil, keys.NotNegative
	if any.Unit == "" {
		any.Unit = "%"
	}
	if n.kind == stringKind {
		if w := unit.Nearest(strings.TrimSpace(n.text), []string{"unknown"}); w != "" {
			f.add(n.at, `%s: got %s, expected a quantity or "unknown"; did you mean "unknown"?`, tick(k.Name), quote(n.text))
			return nil, false
		}
	}
	q = f.quantity(n, any)
	if q == nil {
		return nil, false
	}
	d := q.Unit.Dim
	relative := d == unit.Ratio
	own := of == nil && d != unit.None || slices.Contains(of, d)
	switch {
	case d == unit.None && !slices.Contains(of, unit.None):
		f.add(n.at, "%s: %s has no unit: write %s", tick(k.Name), quote(q.Text), quote(q.Text+" "+any.Unit))
		return nil, false
	case q.Unit.IsLog() && q.Unit.Symbol != "dB":
		f.add(n.at, "%s: %s is a level: an uncertainty is written in dB", tick(k.Name), quote(q.Text))
		return nil, false
	case !relative && !own:
		f.add(n.at, "%s: %s is %s, expected %%, dB or a unit of %s", tick(k.Name), quote(q.Text), article(d.String()), tick(k.Of))
		return nil, false
	}
	return q, false
}

// span reads a range in s or Hz. Both ends are needed unless the key is open.
func (f *faults) span(n *node, k keys.Key) (lo, hi *unit.Quantity, ok bool) {
	example := `a range like "20 Hz .. 20 kHz"`
	if len(k.Dims) == 1 && k.Dims[0] == unit.Second {
		example = `a range like "0.5 s .. 7.5 s"`
	}
	if n == nil {
		return nil, nil, false
	}
	if n.kind != stringKind {
		f.wrong(n, k, example)
		return nil, nil, false
	}
	if !strings.Contains(n.text, "..") {
		if m := dashRange.FindStringSubmatch(n.text); m != nil {
			f.add(n.at, "%s: a range has two points between its ends: write %s", tick(k.Name), quote(m[1]+" .. "+m[2]))
			return nil, nil, false
		}
		f.wrong(n, k, example)
		return nil, nil, false
	}
	lo, hi, err := unit.ParseRange(n.text)
	if err != nil {
		f.add(n.at, "%s: %v", tick(k.Name), err)
		return nil, nil, false
	}
	for _, q := range []*unit.Quantity{lo, hi} {
		if q == nil {
			continue
		}
		if q.Unit.Dim == unit.None {
			f.add(n.at, "%s: %s has no unit, expected %s", tick(k.Name), quote(n.text), example)
			return nil, nil, false
		}
		if !slices.Contains(k.Dims, q.Unit.Dim) {
			f.add(n.at, "%s: %s is a range of %s, expected %s", tick(k.Name), quote(n.text), q.Unit.Dim, example)
			return nil, nil, false
		}
		if k.Sign == keys.Positive && q.Linear() <= 0 {
			f.add(n.at, "%s: %s begins at or below 0, expected %s", tick(k.Name), quote(n.text), example)
			return nil, nil, false
		}
	}
	if !k.Open && (lo == nil || hi == nil) {
		f.add(n.at, "%s: %s has an open end, expected %s", tick(k.Name), quote(n.text), example)
		return nil, nil, false
	}
	return lo, hi, true
}

// dashRange finds ranges written with a dash or the word "to".
var dashRange = regexp.MustCompile(`^\s*([0-9][^-–—]*?)\s*(?:-|–|—|\bto\b)\s*([0-9].*?)\s*$`)
