package report

import (
	"fmt"
	"math"
	"reflect"
	"slices"
	"sort"
	"strings"

	"benchslip/analyze/slip"
	"benchslip/capture/unit"
)

// Table is a list of details as a table: all cells clean and rounded.
type Table struct {
	Name    string
	Columns []string
	Rows    [][]string
	Left    int // rows left out, evenly; they are all in slip.json
}

// maxTable is the largest table a sheet shows; longer ones are thinned.
const maxTable = 32

// Details turns the free details of a check into words: single values as
// pairs, lists of equal things as tables, both sorted by key. Units come from
// the ending of a key (frequency_hz, rms_v, gain_db).
func Details(c *slip.Check) (pairs []Pair, tables []Table) {
	keys := make([]string, 0, len(c.Details))
	for k := range c.Details {
		keys = append(keys, k)
	}
	sort.Strings(keys)
	for _, k := range keys {
		v := deref(reflect.ValueOf(c.Details[k]))
		switch {
		case !v.IsValid():
		case isList(v) && v.Len() > 0 && isObject(deref(v.Index(0))):
			tables = append(tables, table(k, v))
		case isObject(v):
			for _, f := range fields(v) {
				pairs = append(pairs, Pair{keyWords(k) + ": " + keyWords(f.key), valueWords(f.key, f.value)})
			}
		case isList(v) && v.Len() > 8:
			pairs = append(pairs, Pair{keyWords(k), fmt.Sprintf("%d values, in slip.json", v.Len())})
		default:
			pairs = append(pairs, Pair{keyWords(k), valueWords(k, v)})
		}
	}
	return pairs, tables
}

func deref(v reflect.Value) reflect.Value {
	for v.IsValid() && (v.Kind() == reflect.Interface || v.Kind() == reflect.Pointer) {
		v = v.Elem()
	}
	return v
}

func isList(v reflect.Value) bool {
	return v.IsValid() && (v.Kind() == reflect.Slice || v.Kind() == reflect.Array)
}

func isObject(v reflect.Value) bool {
	return v.IsValid() && (v.Kind() == reflect.Struct || v.Kind() == reflect.Map && v.Type().Key().Kind() == reflect.String)
}

type field struct {
	key   string
	value reflect.Value
}

// leading are keys that name a row of a table and so come first.
var leading = []string{"kind", "order", "label", "at_s", "frequency_hz"}

// fields lists the entries of a struct in its order, of a map by name.
func fields(v reflect.Value) []field {
	var out []field
	if v.Kind() == reflect.Struct {
		for i := range v.NumField() {
			name, _, _ := strings.Cut(v.Type().Field(i).Tag.Get("json"), ",")
			if name != "" && name != "-" && v.Type().Field(i).IsExported() {
				out = append(out, field{name, deref(v.Field(i))})
			}
		}
		return out
	}
	for _, k := range v.MapKeys() {
		out = append(out, field{k.String(), deref(v.MapIndex(k))})
	}
	rank := func(k string) int {
		if i := slices.Index(leading, k); i >= 0 {
			return i
		}
		return len(leading)
	}
	sort.Slice(out, func(i, j int) bool {
		if a, b := rank(out[i].key), rank(out[j].key); a != b {
			return a < b
		}
		return out[i].key < out[j].key
	})
	return out
}

func table(key string, v reflect.Value) Table {
	t := Table{Name: keyWords(key)}
	var cols []string
	for i := range v.Len() {
		if o := deref(v.Index(i)); isObject(o) {
			for _, f := range fields(o) {
				if !slices.Contains(cols, f.key) {
					cols = append(cols, f.key)
				}
			}
		}
	}
	for _, c := range cols {
		t.Columns = append(t.Columns, keyWords(c))
	}
	n, shown := v.Len(), min(v.Len(), maxTable)
	t.Left = n - shown
	for i := range shown {
		at := i
		if t.Left > 0 {
			at = i * (n - 1) / (shown - 1)
		}
		row := make([]string, len(cols))
		if o := deref(v.Index(at)); isObject(o) {
			for _, f := range fields(o) {
				row[slices.Index(cols, f.key)] = valueWords(f.key, f.value)
			}
		}
		t.Rows = append(t.Rows, row)
	}
	return t
}

// endings of keys and their units.
var endings = []struct{ ending, symbol string }{
	{"_v_per_rthz", "V/rtHz"}, {"_v_per_m", "V/m"}, {"_v_per_s", "V/s"}, {"_percent", "%"}, {"_dbfs", "dBFS"}, {"_dbu", "dBu"},
	{"_dbv", "dBV"}, {"_ohm", "ohm"}, {"_ppm", "ppm"}, {"_deg", "deg"}, {"_db", "dB"}, {"_hz", "Hz"}, {"_v", "V"}, {"_fs", "FS"}, {"_s", "s"},
}

func splitKey(key string) (words, symbol string) {
	for _, e := range endings {
		if strings.HasSuffix(key, e.ending) && len(key) > len(e.ending) {
			return strings.TrimSuffix(key, e.ending), e.symbol
		}
	}
	return key, ""
}

func keyWords(key string) string {
	words, _ := splitKey(key)
	return Clean(strings.ReplaceAll(words, "_", " "))
}

func valueWords(key string, v reflect.Value) string {
	if !v.IsValid() {
		return "-"
	}
	_, symbol := splitKey(key)
	switch v.Kind() {
	case reflect.Bool:
		if v.Bool() {
			return "yes"
		}
		return "no"
	case reflect.Float64, reflect.Float32:
		x := v.Float()
		if math.IsNaN(x) || math.IsInf(x, 0) {
			return "-"
		}
		if symbol == "" {
			return Digits(x, 4)
		}
		u := unit.MustLookup(symbol)
		if symbol == "Hz" && math.Abs(x) < 1e6 && x != math.Trunc(x) {
			return with(Digits(x, 7), u.Proper()) // a frequency is known better than four digits
		}
		return unit.FormatProper(x, u, 0)
	case reflect.String:
		return Clean(v.String())
	case reflect.Slice, reflect.Array:
		if lo, hi, ok := twoNumbers(v); ok && symbol != "" {
			return with(plain(lo)+" .. "+plain(hi), unit.MustLookup(symbol).Proper())
		}
		var parts []string
		for i := range v.Len() {
			parts = append(parts, valueWords(key, deref(v.Index(i))))
		}
		return strings.Join(parts, ", ")
	case reflect.Map, reflect.Struct:
		var parts []string
		for _, f := range fields(v) {
			parts = append(parts, keyWords(f.key)+" "+valueWords(f.key, f.value))
		}
		return strings.Join(parts, ", ")
	}
	return Clean(fmt.Sprint(v.Interface()))
}

// twoNumbers recognises a range: band_hz, span_s.
func twoNumbers(v reflect.Value) (lo, hi float64, ok bool) {
	if v.Len() != 2 {
		return 0, 0, false
	}
	a, b := deref(v.Index(0)), deref(v.Index(1))
	if a.Kind() != reflect.Float64 || b.Kind() != reflect.Float64 {
		return 0, 0, false
	}
	return a.Float(), b.Float(), true
}
