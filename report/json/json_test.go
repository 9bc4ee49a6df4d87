package json

import (
	stdjson "encoding/json"
	"math"
	"reflect"
	"strconv"
	"strings"
	"testing"

	"benchslip/analyze/slip"
)

// Expected texts follow from the definition: round to 12 significant digits,
// then the shortest decimal that reads back as that float64.
func TestNumber(t *testing.T) {
	for _, c := range []struct {
		x    float64
		want string
	}{
		{0, "0"}, {math.Copysign(0, -1), "0"}, {1, "1"}, {-3, "-3"}, {0.1 + 0.2, "0.3"},
		{1.0 / 3, "0.333333333333"}, {2e10 / 3, "6666666666.67"}, {39.98, "39.98"},
		{96000, "96000"}, {1e-6, "0.000001"}, {1.5e-9, "1.5e-09"}, {123456789012345, "123456789012000"},
		{1e21, "1e+21"}, {math.Pi * 1e-12, "3.14159265359e-12"}, {0.9999999999999, "1"},
		{math.MaxFloat64, "1.79769313486e+308"}, {5e-324, "5e-324"},
		{math.NaN(), "null"}, {math.Inf(1), "null"}, {math.Inf(-1), "null"},
	} {
		if got := number(c.x); got != c.want {
			t.Errorf("number(%v) = %s, want %s", c.x, got, c.want)
		}
	}
}

// Property: what is written reads back within half a unit of the 12th digit.
func TestNumberReadsBack(t *testing.T) {
	x := 1.2345678901234567e-30
	for range 400 {
		got, err := strconv.ParseFloat(number(x), 64)
		if err != nil || math.Abs(got-x) > 5e-12*math.Abs(x) {
			t.Fatalf("%v written as %s reads %v (%v)", x, number(x), got, err)
		}
		if again := number(got); again != number(x) {
			t.Fatalf("%s is not stable: %s", number(x), again)
		}
		x *= -1.4142135623730951
	}
}

// The standard library's decoder is the independent reader.
func TestEmptySlipHasEveryKey(t *testing.T) {
	var b strings.Builder
	if err := Render(&b, &slip.Slip{Format: 1, Takes: []slip.Take{{}}, Checks: []slip.Check{{}}}); err != nil {
		t.Fatal(err)
	}
	var got map[string]any
	if err := stdjson.Unmarshal([]byte(b.String()), &got); err != nil {
		t.Fatalf("%v in\n%s", err, b.String())
	}
	every := func(typ reflect.Type, m map[string]any) {
		for i := range typ.NumField() {
			name, option, _ := strings.Cut(typ.Field(i).Tag.Get("json"), ",")
			if _, ok := m[name]; !ok && name != "-" && option == "" {
				t.Errorf("%s: no key %q", typ, name)
			}
		}
	}
	every(reflect.TypeOf(slip.Slip{}), got)
	check := got["checks"].([]any)[0].(map[string]any)
	every(reflect.TypeOf(slip.Check{}), check)
	every(reflect.TypeOf(slip.Take{}), got["takes"].([]any)[0].(map[string]any))
	for _, key := range []string{"contributors", "unstated", "flags", "takes", "opinions"} {
		if _, ok := check[key].([]any); !ok {
			t.Errorf("%s of an empty check is %v, want a list", key, check[key])
		}
	}
	if _, ok := check["details"].(map[string]any); !ok {
		t.Errorf("details of an empty check is %v, want an object", check["details"])
	}
}

func TestOrderFollowsTheModel(t *testing.T) {
	var b strings.Builder
	if err := Render(&b, &slip.Slip{Checks: []slip.Check{{}}}); err != nil {
		t.Fatal(err)
	}
	at := -1
	for _, key := range []string{"format", "sheet", "verdict", "tool", "job", "limits_sha256", "record", "unit",
		"rule", "takes", "checks", "name", "measure", "class", "clause", "take", "value", "uncertainty",
		"interval", "coverage", "bound", "contributors", "unstated", "min", "max", "typical", "limit_unit",
		"margin", "probability", "verdict", "reason", "advice", "flags", "details"} {
		i := strings.Index(b.String()[at+1:], `"`+key+`":`)
		if i < 0 {
			t.Fatalf("%q does not follow in the contract's order in\n%s", key, b.String())
		}
		at += 1 + i
	}
}

func TestHostileText(t *testing.T) {
	in := "a\x1b[31m\u009b\u202e\u2066\u2028\"\\\n\t\x00\x7f<script>&\u0301\U000e0001 é\xff"
	var b strings.Builder
	if err := Render(&b, &slip.Slip{Title: in, Unit: map[string]string{in: in}}); err != nil {
		t.Fatal(err)
	}
	for _, r := range b.String() {
		if r != '\n' && (r < 0x20 || r >= 0x7f && r < 0xa0 || r >= 0x202a && r <= 0x202e || r == 0x2066) {
			t.Errorf("raw control or direction character %U", r)
		}
	}
	var got slip.Slip
	if err := stdjson.Unmarshal([]byte(b.String()), &got); err != nil {
		t.Fatal(err)
	}
	want := strings.ToValidUTF8(in, "\ufffd")
	if got.Title != want || got.Unit[want] != want {
		t.Errorf("text came back as %q, want %q", got.Title, want)
	}
}

func TestDetails(t *testing.T) {
	s := &slip.Slip{Checks: []slip.Check{{Details: map[string]any{
		"points":  []map[string]any{{"frequency_hz": 1000.0, "gain_db": 1.0 / 3}, {"gain_db": math.NaN()}},
		"band_hz": [2]float64{20, 20000}, "averages": 12, "family": "odd", "resolved": true, "none": nil,
	}}}}
	var b strings.Builder
	if err := Render(&b, s); err != nil {
		t.Fatal(err)
	}
	for _, want := range []string{`"band_hz": [20, 20000]`, `{"frequency_hz": 1000, "gain_db": 0.333333333333}`, `{"gain_db": null}`,
		`"averages": 12`, `"none": null`, `"resolved": true`} {
		if !strings.Contains(b.String(), want) {
			t.Errorf("no %s in\n%s", want, b.String())
		}
	}
	s.Checks[0].Details = map[string]any{"bad": func() {}}
	if err := Render(&b, s); err == nil || !strings.Contains(err.Error(), "$.checks[0].details.bad") {
		t.Errorf("error %v does not name the place", err)
	}
}
