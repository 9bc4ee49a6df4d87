// Package jsontest checks JSON against a JSON Schema in tests. It knows the
// part of draft 2020-12 that testdata/slip.schema.json uses and refuses a
// schema that uses more, so that no rule is skipped unseen. Imported by tests
// only.
package jsontest

import (
	"encoding/json"
	"fmt"
	"math"
	"regexp"
	"sort"
	"strings"
	"unicode/utf8"
)

// Validate returns everything in doc that the schema forbids, each with its
// place ("$.checks[3].unit"), or an error when one of them cannot be read.
func Validate(schema, doc []byte) (faults []string, err error) {
	var s, d any
	if err := json.Unmarshal(schema, &s); err != nil {
		return nil, fmt.Errorf("schema: %w", err)
	}
	if err := json.Unmarshal(doc, &d); err != nil {
		return nil, fmt.Errorf("document: %w", err)
	}
	v := validator{root: s}
	v.check(s, d, "$")
	if v.bad != "" {
		return nil, fmt.Errorf("schema: %s", v.bad)
	}
	return v.faults, nil
}

type validator struct {
	root   any
	faults []string
	bad    string // what the schema itself has that cannot be followed
}

func (v *validator) fault(place, format string, args ...any) {
	v.faults = append(v.faults, place+": "+fmt.Sprintf(format, args...))
}

// ok reports whether d fits the schema, without noting faults.
func (v *validator) ok(schema, d any) bool {
	try := validator{root: v.root}
	try.check(schema, d, "$")
	if try.bad != "" {
		v.bad = try.bad
	}
	return len(try.faults) == 0
}

func (v *validator) check(schema, d any, place string) {
	if b, is := schema.(bool); is {
		if !b {
			v.fault(place, "must not be there")
		}
		return
	}
	s, is := schema.(map[string]any)
	if !is {
		v.bad = "neither an object nor true or false at " + place
		return
	}
	keys := make([]string, 0, len(s))
	for k := range s {
		keys = append(keys, k)
	}
	sort.Strings(keys)
	for _, k := range keys {
		v.keyword(k, s, d, place)
	}
}

func (v *validator) keyword(k string, s map[string]any, d any, place string) {
	arg := s[k]
	number, isNumber := d.(float64)
	text, isText := d.(string)
	list, isList := d.([]any)
	object, isObject := d.(map[string]any)
	switch k {
	case "$schema", "$id", "$defs", "title", "description", "then":
	case "$ref":
		v.check(v.resolve(arg), d, place)
	case "type":
		if !hasType(arg, d) {
			v.fault(place, "%s where %v is wanted", typeOf(d), arg)
		}
	case "const":
		if fmt.Sprint(arg) != fmt.Sprint(d) {
			v.fault(place, "%v where %v is wanted", d, arg)
		}
	case "enum":
		for _, e := range arg.([]any) {
			if e == d {
				return
			}
		}
		v.fault(place, "%v is none of %v", d, arg)
	case "minimum":
		if isNumber && number < arg.(float64) {
			v.fault(place, "%v is below %v", number, arg)
		}
	case "exclusiveMinimum":
		if isNumber && number <= arg.(float64) {
			v.fault(place, "%v is not above %v", number, arg)
		}
	case "maximum":
		if isNumber && number > arg.(float64) {
			v.fault(place, "%v is above %v", number, arg)
		}
	case "minLength":
		if isText && utf8.RuneCountInString(text) < int(arg.(float64)) {
			v.fault(place, "%q is too short", text)
		}
	case "pattern":
		if isText && !regexp.MustCompile(arg.(string)).MatchString(text) {
			v.fault(place, "%q does not match %s", text, arg)
		}
	case "minItems":
		if isList && len(list) < int(arg.(float64)) {
			v.fault(place, "%d items, at least %v are wanted", len(list), arg)
		}
	case "maxItems":
		if isList && len(list) > int(arg.(float64)) {
			v.fault(place, "%d items, at most %v are wanted", len(list), arg)
		}
	case "items":
		for i, e := range list {
			v.check(arg, e, fmt.Sprintf("%s[%d]", place, i))
		}
	case "required":
		for _, name := range arg.([]any) {
			if _, there := object[name.(string)]; isObject && !there {
				v.fault(place, "no key %q", name)
			}
		}
	case "properties":
		for name, sub := range arg.(map[string]any) {
			if e, there := object[name]; there {
				v.check(sub, e, place+"."+name)
			}
		}
	case "additionalProperties":
		named, _ := s["properties"].(map[string]any)
		for name, e := range object {
			if _, there := named[name]; !there {
				v.check(arg, e, place+"."+name)
			}
		}
	case "allOf":
		for _, sub := range arg.([]any) {
			v.check(sub, d, place)
		}
	case "anyOf":
		for _, sub := range arg.([]any) {
			if v.ok(sub, d) {
				return
			}
		}
		v.fault(place, "%s fits none of the %d choices", typeOf(d), len(arg.([]any)))
	case "if":
		if then, there := s["then"]; there && v.ok(arg, d) {
			v.check(then, d, place)
		}
	default:
		v.bad = "keyword " + k + " is not known here, at " + place
	}
}

func (v *validator) resolve(ref any) any {
	at := v.root
	path, local := strings.CutPrefix(fmt.Sprint(ref), "#/")
	for _, name := range strings.Split(path, "/") {
		m, is := at.(map[string]any)
		if !is || !local || m[name] == nil {
			v.bad = fmt.Sprintf("nothing at %v", ref)
			return true
		}
		at = m[name]
	}
	return at
}

func hasType(want, d any) bool {
	if list, is := want.([]any); is {
		for _, w := range list {
			if hasType(w, d) {
				return true
			}
		}
		return false
	}
	got := typeOf(d)
	return want == got || want == "number" && got == "integer"
}

func typeOf(d any) string {
	switch x := d.(type) {
	case nil:
		return "null"
	case bool:
		return "boolean"
	case float64:
		if x == math.Trunc(x) {
			return "integer"
		}
		return "number"
	case string:
		return "string"
	case []any:
		return "array"
	}
	return "object"
}
