package compare

import (
	"encoding/json"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"benchslip/analyze/slip"
)

func f(x float64) *float64 { return &x }

// check is a row of value v with a standard uncertainty of its own and one of
// the gear's scale.
func check(name, unit string, v, own, scale float64) slip.Check {
	c := slip.Check{Name: name, Measure: "level", Unit: unit, Value: f(v), Coverage: f(2), Verdict: slip.Pass, Details: map[string]any{}}
	if own > 0 {
		c.Contributors = append(c.Contributors, slip.Contributor{Name: "noise", StandardUncertainty: own, Kind: "A"})
	}
	if scale > 0 {
		c.Contributors = append(c.Contributors, slip.Contributor{Name: "calibration of box", StandardUncertainty: scale, Kind: "B", Source: "gear box scale"})
	}
	c.Uncertainty = f(2 * math.Hypot(own, scale))
	return c
}

func slipOf(checks ...slip.Check) *slip.Slip {
	return &slip.Slip{Format: 1, Rule: slip.Rule{Decision: "four-way", Coverage: 2}, Checks: checks,
		Gear: []slip.Gear{{Name: "box", Kind: "audio", FullScale: "5 V peak", Stated: "2 %", Calibrated: "2026-01-01"}}}
}

func two(t *testing.T, a, b *slip.Slip) Row {
	t.Helper()
	r, err := Make([]Input{{"a/slip.json", a}, {"b/slip.json", b}})
	if err != nil {
		t.Fatal(err)
	}
	if len(r.Checks) == 0 {
		t.Fatal("no rows")
	}
	return r.Checks[0]
}

// Independent errors add in squares (JCGM 100, 5.1.2), one that both share
// enters with its difference (5.2.2, r = 1).
func TestUncertaintyOfDifference(t *testing.T) {
	other := func(s *slip.Slip) *slip.Slip { s.Gear[0].Calibrated = "2027-01-01"; return s }
	for _, c := range []struct {
		name        string
		a, b        *slip.Slip
		difference  float64
		uncertainty float64
		significant bool
	}{
		{"independent", slipOf(check("C", "V", 10, 0.1, 0)), slipOf(check("C", "V", 10.5, 0.1, 0)), 0.5, 2 * math.Sqrt(0.02), true},
		{"one calibration cancels", slipOf(check("C", "V", 10, 0, 0.1)), slipOf(check("C", "V", 10.5, 0, 0.105)), 0.5, 2 * 0.005, true},
		{"another calibration does not", slipOf(check("C", "V", 10, 0, 0.1)), other(slipOf(check("C", "V", 10.2, 0, 0.1))), 0.2, 2 * math.Sqrt(0.02), false},
		{"both kinds", slipOf(check("C", "dB", 40, 0.03, 0.2)), slipOf(check("C", "dB", 40.05, 0.04, 0.2)), 0.05, 2 * 0.05, false},
		{"smaller than its uncertainty", slipOf(check("C", "V", 10, 0.1, 0)), slipOf(check("C", "V", 9.8, 0.1, 0)), -0.2, 2 * math.Sqrt(0.02), false},
	} {
		r := two(t, c.a, c.b)
		if r.Difference == nil || math.Abs(*r.Difference-c.difference) > 1e-12 {
			t.Errorf("%s: difference %v, wanted %g", c.name, r.Difference, c.difference)
		}
		if r.Uncertainty == nil || math.Abs(*r.Uncertainty-c.uncertainty) > 1e-9 {
			t.Errorf("%s: uncertainty %v, wanted %g", c.name, *r.Uncertainty, c.uncertainty)
		}
		if r.Significant != c.significant {
			t.Errorf("%s: significant %v", c.name, r.Significant)
		}
	}
}

// 0.774597 V is 0 dBu, and a small relative step is 8.685890 times as many dB.
func TestUnits(t *testing.T) {
	r := two(t, slipOf(check("C", "dBu", 0, 0.1, 0)), slipOf(check("C", "mV", 1000*math.Sqrt(0.6), 10, 0)))
	want := 2 * math.Hypot(0.1, 8.685890*10/(1000*math.Sqrt(0.6)))
	if math.Abs(*r.Difference) > 1e-9 || math.Abs(*r.Uncertainty-want) > 1e-6 || r.Unit != "dBu" {
		t.Errorf("%g +- %g %s, wanted 0 +- %g dBu", *r.Difference, *r.Uncertainty, r.Unit, want)
	}
	r = two(t, slipOf(check("C", "V", 1, 0.001, 0)), slipOf(check("C", "mV", 1010, 1, 0)))
	if math.Abs(*r.Difference-0.01) > 1e-12 || math.Abs(*r.Uncertainty-2*math.Sqrt2*0.001) > 1e-12 {
		t.Errorf("%g +- %g V", *r.Difference, *r.Uncertainty)
	}
	if r := two(t, slipOf(check("C", "V", 1, 0.001, 0)), slipOf(check("C", "Hz", 1, 1, 0))); r.State != Incomparable {
		t.Errorf("volts against hertz: %s", r.State)
	}
	r = two(t, slipOf(check("C", "deg", 179, 1, 0)), slipOf(check("C", "deg", -179, 1, 0)))
	if *r.Difference != 2 {
		t.Errorf("from 179 to -179 degrees: %g", *r.Difference)
	}
}

// A margin counts: nearer to the limit by more than the uncertainty is worse.
func TestMargins(t *testing.T) {
	limited := func(v, u float64, min, max *float64) *slip.Slip {
		c := check("C", "dB", v, u, 0)
		c.Min, c.Max = min, max
		return slipOf(c)
	}
	for _, c := range []struct {
		name   string
		a, b   *slip.Slip
		state  string
		change *float64
	}{
		{"up towards a maximum", limited(1, 0.1, nil, f(3)), limited(2, 0.1, nil, f(3)), Worse, f(-1)},
		{"down from a maximum", limited(2, 0.1, nil, f(3)), limited(1, 0.1, nil, f(3)), Better, f(1)},
		{"down towards a minimum", limited(2, 0.1, f(0), nil), limited(1, 0.1, f(0), nil), Worse, f(-1)},
		{"a little nearer", limited(1, 0.1, nil, f(3)), limited(1.1, 0.1, nil, f(3)), Same, f(-0.1)},
		{"across a window", limited(0.6, 0.1, f(0), f(2)), limited(1.4, 0.1, f(0), f(2)), Changed, f(0)},
		{"no limits", limited(1, 0.1, nil, nil), limited(2, 0.1, nil, nil), Changed, nil},
		{"other limits: both by the second's", limited(1, 0.1, nil, f(3)), limited(1, 0.1, nil, f(2)), Same, f(0)},
	} {
		r := two(t, c.a, c.b)
		if r.State != c.state {
			t.Errorf("%s: %s, wanted %s", c.name, r.State, c.state)
		}
		if (r.Margin == nil) != (c.change == nil) || r.Margin != nil && math.Abs(*r.Margin-*c.change) > 1e-12 {
			t.Errorf("%s: margin change %v", c.name, r.Margin)
		}
	}
}

func TestIncomparable(t *testing.T) {
	made := func(where map[string]string, conditions ...string) *slip.Slip {
		c := check("C", "dB", 40, 0.1, 0)
		c.Takes, c.Conditions = []slip.Role{{Role: "take", Name: "x"}}, conditions
		s := slipOf(c)
		s.Takes = []slip.Take{{Name: "x", Where: where}}
		return s
	}
	measure := slipOf(check("C", "dB", 40, 0.1, 0))
	measure.Checks[0].Measure = "thd"
	lost := slipOf(check("C", "dB", 40, 0.1, 0))
	lost.Checks[0].Value, lost.Checks[0].Reason = nil, "missing-take: x.wav"
	gain := map[string]string{"gain": "40 dB"}
	for _, c := range []struct {
		name string
		a, b *slip.Slip
		why  string // "": comparable
	}{
		{"missing", slipOf(check("C", "dB", 1, 1, 0)), slipOf(check("D", "dB", 1, 1, 0)), "missing"},
		{"another measure", slipOf(check("C", "dB", 1, 1, 0)), measure, "measures"},
		{"another gain step", made(gain), made(map[string]string{"gain": "20 dB"}), "gain = 40 dB there, 20 dB here"},
		{"the same gain, written otherwise", made(gain), made(map[string]string{"gain": "40.0 dB"}), ""},
		{"a condition not stated", made(gain), made(nil), "not stated here"},
		{"another band", made(gain, "20.00 Hz .. 20.00 kHz"), made(gain, "20.00 Hz .. 80.00 kHz"), "80.00 kHz"},
		{"another stretch of the take, another drive", made(gain, "span 0 s .. 5 s", "input level 1 V"), made(gain, "span 1 s .. 4 s", "input level 1.1 V"), ""},
		{"no value now", slipOf(check("C", "dB", 1, 1, 0)), lost, "missing-take"},
		{"no value either time", lost, lost, ""},
	} {
		r := two(t, c.a, c.b)
		if (r.State == Incomparable) != (c.why != "") || !strings.Contains(r.Why, c.why) {
			t.Errorf("%s: %s, %q", c.name, r.State, r.Why)
		}
	}
}

// A bound tells more or less only when it lies beyond the other's value.
func TestBounds(t *testing.T) {
	bound := func(kind string, v float64, min, max *float64) *slip.Slip {
		c := check("C", "%", 0, 0, 0)
		c.Value, c.Uncertainty, c.Contributors, c.Reason = nil, nil, nil, "below-detection: x"
		c.Bound, c.Min, c.Max = &slip.Bound{Kind: kind, Value: v, Unit: "%", Confidence: 0.95}, min, max
		return slipOf(c)
	}
	value := func(v float64, max *float64) *slip.Slip {
		c := check("C", "%", v, 0.01, 0)
		c.Max = max
		return slipOf(c)
	}
	for _, c := range []struct {
		name  string
		a, b  *slip.Slip
		state string
	}{
		{"below 0.1, then 1", bound("upper", 0.1, nil, f(2)), value(1, f(2)), Worse},
		{"1, then below 0.1", value(1, f(2)), bound("upper", 0.1, nil, f(2)), Better},
		{"0.1, then below 1", value(0.1, f(2)), bound("upper", 1, nil, f(2)), Same},
		{"two bounds", bound("upper", 1, nil, f(2)), bound("upper", 0.1, nil, f(2)), Same},
	} {
		if r := two(t, c.a, c.b); r.State != c.state {
			t.Errorf("%s: %s, wanted %s", c.name, r.State, c.state)
		}
	}
}

// NIST Statistical Reference Datasets, NumAcc1: mean 10000002, standard
// deviation 1 (from memory).
func TestMeanAndSpread(t *testing.T) {
	var in []Input
	for _, v := range []float64{10000001, 10000003, 10000002} {
		in = append(in, Input{"x", slipOf(check("C", "V", v, 0.1, 0))})
	}
	r, err := Make(in)
	if err != nil {
		t.Fatal(err)
	}
	if g := r.Checks[0].Group; g == nil || *g.Mean != 10000002 || math.Abs(*g.Spread-1) > 1e-8 || g.Count != 3 {
		t.Errorf("%+v", g)
	}
}

// The set of Iglewicz and Hoaglin (1993, from memory): 8.2 and 8.3 stand out.
func TestOutliers(t *testing.T) {
	var in []Input
	for i, v := range []float64{2.1, 2.6, 2.4, 2.5, 2.3, 2.1, 2.3, 2.6, 8.2, 8.3} {
		s := slipOf(check("C", "V", v, 0.01, 0))
		s.Unit = map[string]string{"serial": string(rune('A' + i))}
		in = append(in, Input{"x", s})
	}
	r, err := Make(in)
	if err != nil {
		t.Fatal(err)
	}
	if got := strings.Join(r.Checks[0].Group.Outliers, ""); got != "IJ" {
		t.Errorf("outliers %q, wanted IJ", got)
	}
	if r.Slips[3].Label != "D" {
		t.Errorf("label %q", r.Slips[3].Label)
	}
}

// A line of 1 V a year, exactly: 0, 1, 2, 4 years.
func TestTrend(t *testing.T) {
	days := []float64{0, 365.2425, 2 * 365.2425, 4 * 365.2425}
	tr := trendOf(days, []float64{5, 6, 7, 9}, []float64{0.02, 0.02, 0.02, 0.02}, 2)
	// u of a slope is u/sqrt(sum (x - mean)^2): 0.01/sqrt(8.75) a year, doubled.
	if tr == nil || math.Abs(tr.PerYear-1) > 1e-9 || math.Abs(tr.Uncertainty-0.02/math.Sqrt(8.75)) > 1e-9 || !tr.Significant {
		t.Errorf("%+v", tr)
	}
	// Scatter about no slope: residuals 1, -1, -1, 1 over 0, 1, 2, 3 have none.
	y := 365.2425
	tr = trendOf([]float64{0, y, 2 * y, 3 * y}, []float64{1, -1, -1, 1}, make([]float64, 4), 2)
	if tr == nil || math.Abs(tr.PerYear) > 1e-9 || tr.Significant {
		t.Errorf("%+v", tr)
	}
	if trendOf(days[:3], []float64{5, 6, 7}, make([]float64, 3), 2) != nil {
		t.Error("a trend from three values")
	}
}

func TestLabels(t *testing.T) {
	s := func() *slip.Slip { return slipOf(check("C", "V", 1, 0.1, 0)) }
	r, err := Make([]Input{{"/x/before/slip.json", s()}, {"/x/after/slip.json", s()}})
	if err != nil || r.Slips[0].Label != "before" || r.Slips[1].Label != "after" {
		t.Errorf("%v, %+v", err, r.Slips)
	}
	r, _ = Make([]Input{{"/x/slip.json", s()}, {"/x/slip.json", s()}})
	if r.Slips[0].Label == r.Slips[1].Label {
		t.Errorf("one label for two slips: %q", r.Slips[0].Label)
	}
}

// The worst comes first, and two slips or more are needed.
func TestOrderOfRows(t *testing.T) {
	row := func(name string, v float64, max *float64) slip.Check {
		c := check(name, "V", v, 0.01, 0)
		c.Max = max
		return c
	}
	r, err := Make([]Input{
		{"a", slipOf(row("same", 1, f(9)), row("better", 2, f(9)), row("gone", 1, nil), row("worse", 1, f(9)), row("far worse", 1, f(9)))},
		{"b", slipOf(row("same", 1, f(9)), row("better", 1, f(9)), row("worse", 1.5, f(9)), row("far worse", 5, f(9)))},
	})
	if err != nil {
		t.Fatal(err)
	}
	var got []string
	for _, c := range r.Checks {
		got = append(got, c.Name)
	}
	if s := strings.Join(got, ", "); s != "far worse, worse, gone, better, same" || r.Worse != 2 || r.Open != 1 {
		t.Errorf("%s; %d worse, %d open", s, r.Worse, r.Open)
	}
	if _, err := Make([]Input{{"a", slipOf()}}); err == nil {
		t.Error("one slip is compared")
	}
}

// What is no slip is told with its path, in one line, and never panics.
func TestReadRefuses(t *testing.T) {
	dir := t.TempDir()
	for name, text := range map[string]string{"empty": "", "text": "hello", "array": "[]", "object": "{}", "format": `{"format": 2, "checks": []}`,
		"cut": `{"format": 1, "checks": [`, "twice": `{"format": 1, "checks": [{"name": "a"}, {"name": "a"}]}`, "type": `{"format": 1, "checks": [{"value": "x"}]}`} {
		path := filepath.Join(dir, name)
		if err := os.WriteFile(path, []byte(text), 0o666); err != nil {
			t.Fatal(err)
		}
		if _, _, err := Read(path); err == nil || !strings.HasPrefix(err.Error(), path+": ") || strings.Contains(err.Error(), "\n") {
			t.Errorf("%s: %v", name, err)
		}
	}
	for _, path := range []string{dir, filepath.Join(dir, "none")} {
		if _, _, err := Read(path); err == nil {
			t.Errorf("%s is read", path)
		}
	}
}

func TestRecheck(t *testing.T) {
	base := func() map[string]any {
		var m map[string]any
		err := json.Unmarshal([]byte(`{"format": 1, "sheet": "a", "verdict": "pass", "tool": {"version": "1"}, "job": {"sha256": "j"}, "limits_sha256": "l",
			"takes": [{"name": "x", "file": "x.wav", "sha256": "abc"}], "checks": [{"name": "C", "value": 40, "uncertainty": 0.1, "verdict": "pass", "details": {"points": [1, 2]}}]}`), &m)
		if err != nil {
			t.Fatal(err)
		}
		return m
	}
	row := func(m map[string]any) map[string]any { return m["checks"].([]any)[0].(map[string]any) }
	for _, c := range []struct {
		name          string
		change        func(m map[string]any)
		same, within  bool
		rows, because string
	}{
		{"nothing", func(map[string]any) {}, true, false, "", ""},
		{"the last digits", func(m map[string]any) { row(m)["value"] = 40 * (1 + 1e-11) }, false, true, "", ""},
		{"far below the uncertainty", func(m map[string]any) { row(m)["value"] = 40 + 1e-6 }, false, true, "", ""},
		{"a value", func(m map[string]any) { row(m)["value"] = 40.01 }, false, false, "C: value 40 then, 40.01 now", ""},
		{"a detail", func(m map[string]any) { row(m)["details"].(map[string]any)["points"] = []any{1.0, 3.0} }, false, false, "points[1]", ""},
		{"a take", func(m map[string]any) { m["takes"].([]any)[0].(map[string]any)["sha256"] = "abd" }, false, false, "", "take x"},
		{"limits", func(m map[string]any) { m["limits_sha256"] = "k" }, false, false, "", "limits"},
		{"the version", func(m map[string]any) { m["tool"].(map[string]any)["version"] = "2" }, false, false, "", "version 1 then, 2 now"},
		{"a new key of a later version", func(m map[string]any) { row(m)["new"] = 1.0 }, false, true, "", ""},
		{"a row less", func(m map[string]any) { m["checks"] = []any{} }, false, false, "no longer", ""},
		{"an included file", func(m map[string]any) { m["sheet"] = "b" }, false, false, "", "included"},
	} {
		before, _ := json.Marshal(base())
		m := base()
		c.change(m)
		now, _ := json.Marshal(m)
		r, err := Recheck(before, now)
		if err != nil {
			t.Fatal(err)
		}
		if r.Same != c.same || r.Rounding != c.within || !strings.Contains(strings.Join(r.Rows, ";"), c.rows) || !strings.Contains(strings.Join(r.Causes, ";"), c.because) {
			t.Errorf("%s: %+v", c.name, r)
		}
		if c.rows == "" && len(r.Rows) > 0 || c.because == "" && len(r.Causes) > 0 {
			t.Errorf("%s: rows %q, causes %q", c.name, r.Rows, r.Causes)
		}
	}
}
