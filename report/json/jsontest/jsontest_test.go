package jsontest

import (
	"strings"
	"testing"
)

// The verdicts follow from JSON Schema draft 2020-12 (validation vocabulary).
func TestValidate(t *testing.T) {
	for _, c := range []struct{ schema, doc, fault string }{
		{`{"type":"number"}`, `1`, ""}, {`{"type":"number"}`, `"1"`, "string where number"},
		{`{"type":"integer"}`, `2.0`, ""}, {`{"type":"integer"}`, `2.5`, "number where integer"},
		{`{"type":["number","null"]}`, `null`, ""}, {`{"type":["number","null"]}`, `true`, "boolean"},
		{`{"const":1}`, `1`, ""}, {`{"const":1}`, `2`, "2 where 1"},
		{`{"enum":["a","b"]}`, `"b"`, ""}, {`{"enum":["a"]}`, `"b"`, "none of"},
		{`{"minimum":0}`, `0`, ""}, {`{"minimum":0}`, `-1`, "below"}, {`{"minimum":0}`, `"x"`, ""},
		{`{"exclusiveMinimum":0}`, `0`, "not above"}, {`{"maximum":1}`, `1.1`, "above"},
		{`{"minLength":1}`, `""`, "too short"}, {`{"pattern":"^a+$"}`, `"aab"`, "does not match"},
		{`{"items":{"type":"string"}}`, `["a",1]`, "$[1]: integer"},
		{`{"minItems":2}`, `[1]`, "at least"}, {`{"maxItems":1}`, `[1,2]`, "at most"},
		{`{"required":["a"]}`, `{}`, `no key "a"`}, {`{"required":["a"]}`, `[]`, ""},
		{`{"properties":{"a":{"type":"null"}}}`, `{"a":1}`, "$.a: integer"},
		{`{"properties":{"a":true},"additionalProperties":false}`, `{"a":1,"b":2}`, "$.b: must not"},
		{`{"additionalProperties":{"type":"string"}}`, `{"b":2}`, "$.b"},
		{`{"anyOf":[{"type":"null"},{"type":"string"}]}`, `1`, "none of the 2"},
		{`{"allOf":[{"minimum":0},{"maximum":1}]}`, `2`, "above"},
		{`{"if":{"properties":{"a":{"const":1}}},"then":{"required":["b"]}}`, `{"a":1}`, `no key "b"`},
		{`{"if":{"properties":{"a":{"const":1}}},"then":{"required":["b"]}}`, `{"a":2}`, ""},
		{`{"$ref":"#/$defs/x","$defs":{"x":{"type":"null"}}}`, `1`, "integer where null"},
	} {
		faults, err := Validate([]byte(c.schema), []byte(c.doc))
		got := strings.Join(faults, "; ")
		if err != nil || (c.fault == "") != (got == "") || !strings.Contains(got, c.fault) {
			t.Errorf("%s with %s: %q (%v), want %q", c.schema, c.doc, got, err, c.fault)
		}
	}
	for _, schema := range []string{`{"format":"date"}`, `{"$ref":"#/$defs/none"}`, `{"$ref":"other.json"}`, `3`, `{"anyOf":[{"not":{}}]}`} {
		if _, err := Validate([]byte(schema), []byte(`"x"`)); err == nil {
			t.Errorf("schema %s is followed although it holds what is not known", schema)
		}
	}
}
