// Package json writes a slip as slip.json: the contract that other programs
// read. The same model gives the same bytes on every machine.
//
//   - Keys stand in the order of the model's structs; keys of maps are sorted.
//   - Every key is there: empty lists are [], missing numbers null.
//   - A number is the shortest decimal that gives back the float64 rounded to
//     12 significant digits: more digits would promise what no recording holds
//     and would differ between processors.
//   - Control and direction characters are written as \u escapes, so that the
//     file can be printed on a terminal as it is.
//
// The schema in testdata/slip.schema.json describes the result.
package json

import (
	"fmt"
	"io"
	"math"
	"reflect"
	"sort"
	"strconv"
	"strings"
	"unicode"
	"unicode/utf8"

	"benchslip/analyze/slip"
	"benchslip/report"
)

// Render writes the slip with a final line feed.
func Render(w io.Writer, s *slip.Slip) error { return Write(w, s) }

// Write is Render for any value built of structs with json tags, maps with
// string keys, slices, pointers and plain values: the programs' other JSON
// outputs use it, so that all of them write numbers alike. A value of another
// kind (a channel, a function) is an error that names its place. Numbers that
// are not finite, which the model excludes, become null.
func Write(w io.Writer, v any) error {
	e := encoder{}
	n, err := e.tree(reflect.ValueOf(v), "$")
	if err != nil {
		return err
	}
	n.print(&e.out, 0)
	e.out.WriteByte('\n')
	_, err = io.WriteString(w, e.out.String())
	return err
}

// number is the one way in which slips write numbers, null when not finite.
func number(x float64) string {
	if math.IsNaN(x) || math.IsInf(x, 0) {
		return "null"
	}
	return report.Number(x)
}

// node is a value on its way out: a scalar already in its final text, or a
// list of nodes between brackets.
type node struct {
	text        string // scalar
	open, close string // "[" "]" or "{" "}"
	keys        []string
	items       []node
	width       int // characters when written on one line
	deep        bool
}

type encoder struct{ out strings.Builder }

func (e *encoder) tree(v reflect.Value, place string) (node, error) {
	switch v.Kind() {
	case reflect.Invalid:
		return scalar("null"), nil
	case reflect.Pointer, reflect.Interface:
		if v.IsNil() {
			return scalar("null"), nil
		}
		return e.tree(v.Elem(), place)
	case reflect.Bool:
		return scalar(strconv.FormatBool(v.Bool())), nil
	case reflect.Int, reflect.Int8, reflect.Int16, reflect.Int32, reflect.Int64:
		return scalar(strconv.FormatInt(v.Int(), 10)), nil
	case reflect.Uint, reflect.Uint8, reflect.Uint16, reflect.Uint32, reflect.Uint64:
		return scalar(strconv.FormatUint(v.Uint(), 10)), nil
	case reflect.Float32, reflect.Float64:
		return scalar(number(v.Float())), nil
	case reflect.String:
		return scalar(quote(v.String())), nil
	case reflect.Slice, reflect.Array:
		n := node{open: "[", close: "]"}
		for i := range v.Len() {
			item, err := e.tree(v.Index(i), fmt.Sprintf("%s[%d]", place, i))
			if err != nil {
				return node{}, err
			}
			n.add("", item)
		}
		return n, nil
	case reflect.Map:
		return e.mapTree(v, place)
	case reflect.Struct:
		return e.structTree(v, place)
	}
	return node{}, fmt.Errorf("json: %s: a %s cannot be written", place, v.Kind())
}

func (e *encoder) mapTree(v reflect.Value, place string) (node, error) {
	if v.Type().Key().Kind() != reflect.String {
		return node{}, fmt.Errorf("json: %s: a map needs string keys, got %s", place, v.Type().Key())
	}
	keys := v.MapKeys()
	sort.Slice(keys, func(i, j int) bool { return keys[i].String() < keys[j].String() })
	n := node{open: "{", close: "}"}
	for _, k := range keys {
		item, err := e.tree(v.MapIndex(k), place+"."+k.String())
		if err != nil {
			return node{}, err
		}
		n.add(quote(k.String()), item)
	}
	return n, nil
}

// structTree writes the exported fields that carry a json tag other than "-",
// in the order of the struct; "omitempty" leaves empty ones out. The fields of
// an embedded struct stand among the others.
func (e *encoder) structTree(v reflect.Value, place string) (node, error) {
	n := node{open: "{", close: "}"}
	for i := range v.NumField() {
		f := v.Type().Field(i)
		name, option, _ := strings.Cut(f.Tag.Get("json"), ",")
		if f.Anonymous && name == "" && f.Type.Kind() == reflect.Struct {
			inner, err := e.structTree(v.Field(i), place)
			if err != nil {
				return node{}, err
			}
			for j, key := range inner.keys {
				n.add(key, inner.items[j])
			}
			continue
		}
		if !f.IsExported() || name == "-" || name == "" {
			continue
		}
		if option == "omitempty" && empty(v.Field(i)) {
			continue
		}
		item, err := e.tree(v.Field(i), place+"."+name)
		if err != nil {
			return node{}, err
		}
		n.add(quote(name), item)
	}
	return n, nil
}

func empty(v reflect.Value) bool {
	switch v.Kind() {
	case reflect.Slice, reflect.Map, reflect.String, reflect.Array:
		return v.Len() == 0
	}
	return v.IsZero()
}

func scalar(text string) node { return node{text: text, width: utf8.RuneCountInString(text)} }

func (n *node) add(key string, item node) {
	if key != "" {
		n.keys = append(n.keys, key)
		n.width += utf8.RuneCountInString(key) + 2
	}
	n.items = append(n.items, item)
	n.width += item.width + 2
	n.deep = n.deep || item.deep || item.open != "" && len(item.items) > 0
}

// lineWidth is the longest list that is written on one line. A list of plain
// values stays on one line at any length: a curve is not worth a page.
const lineWidth = 150

// print writes the node; level is the depth of its own line.
func (n *node) print(out *strings.Builder, level int) {
	if n.open == "" {
		out.WriteString(n.text)
		return
	}
	oneLine := level > 0 && n.width <= lineWidth || n.open == "[" && !n.deep
	indent := func(level int) {
		out.WriteByte('\n')
		for range level {
			out.WriteString("  ")
		}
	}
	out.WriteString(n.open)
	for i := range n.items {
		if i > 0 {
			out.WriteByte(',')
			if oneLine {
				out.WriteByte(' ')
			}
		}
		if !oneLine {
			indent(level + 1)
		}
		if n.keys != nil {
			out.WriteString(n.keys[i])
			out.WriteString(": ")
		}
		n.items[i].print(out, level+1)
	}
	if !oneLine && len(n.items) > 0 {
		indent(level)
	}
	out.WriteString(n.close)
}

// quote writes a JSON string (RFC 8259, section 7). Beyond the required
// escapes it escapes every control and format character: terminal sequences,
// direction marks, line separators. Bytes that are not UTF-8 become U+FFFD.
func quote(s string) string {
	var b strings.Builder
	b.WriteByte('"')
	for _, r := range s {
		switch {
		case r == '"' || r == '\\':
			b.WriteByte('\\')
			b.WriteRune(r)
		case r == '\n':
			b.WriteString(`\n`)
		case r == '\t':
			b.WriteString(`\t`)
		case r > 0xffff && unicode.Is(unicode.Cf, r):
			hi, lo := 0xd800+(r-0x10000)>>10, 0xdc00+(r-0x10000)&0x3ff
			fmt.Fprintf(&b, `\u%04x\u%04x`, hi, lo)
		case unicode.Is(unicode.Cc, r) || unicode.Is(unicode.Cf, r) || r == 0x2028 || r == 0x2029:
			fmt.Fprintf(&b, `\u%04x`, r)
		default:
			b.WriteRune(r)
		}
	}
	b.WriteByte('"')
	return b.String()
}
