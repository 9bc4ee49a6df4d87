package judge

import (
	"encoding/json"
	"fmt"
	"math"
	"math/rand"
	"reflect"
	"strings"
	"testing"

	"benchslip/analyze"
	"benchslip/analyze/slip"
	"benchslip/capture/recording"
	"benchslip/capture/unit"
)

// The verdict does not depend on the unit a limit is written in, nor on the
// rule's way of showing U; and in no unit does a smaller reading pass less
// against a maximum.
func TestUnitOfLimit(t *testing.T) {
	rng := rand.New(rand.NewSource(1))
	const fullScaleSine = 3.479 // V RMS
	units := []string{"V", "mV", "uV", "dBu", "dBV", "dBFS"}
	for range 4000 {
		limit := math.Exp(rng.Float64()*20 - 14)
		U := limit * math.Exp(rng.Float64()*6-6)
		y := math.Abs(limit + 3*U*(rng.Float64()*2-1))
		if y == 0 {
			continue
		}
		decision := []string{FourWay, Guarded, Simple}[rng.Intn(3)]
		upper := rng.Intn(2) == 0
		r := res("V", y, U)
		r.FullScaleSine = fullScaleSine
		verdict := ""
		for _, s := range units {
			u := unit.MustLookup(s)
			x := limit
			if s == "dBFS" {
				x = limit / fullScaleSine * unit.FullScaleSine
			}
			l := &unit.Quantity{Number: u.FromLinear(x), Unit: u}
			lim := Limits{Max: l}
			if !upper {
				lim = Limits{Min: l}
			}
			var c slip.Check
			Row(&c, r, lim, slip.Rule{Decision: decision, Coverage: 2}, 10)
			if verdict == "" {
				verdict = c.Verdict
			}
			if c.Verdict != verdict {
				t.Fatalf("%g V +- %g, limit %g %s: %s, in V %s", y, U, l.Number, s, c.Verdict, verdict)
			}
			if c.Unit != s || *c.LimitUnit != s {
				t.Fatalf("unit %s, limit unit %s, want %s", c.Unit, *c.LimitUnit, s)
			}
			if c.Margin != nil && *c.Margin != 0 && (*c.Margin > 0) != (verdict == p || verdict == cp || decision == Guarded && *c.Margin > 0) {
				t.Fatalf("margin %g with %s", *c.Margin, verdict)
			}
		}
	}
}

// A better unit never passes less: as the quantity falls under a maximum, down
// to where only a bound is left, the verdict never gets worse.
func TestBetterNeverWorse(t *testing.T) {
	for _, decision := range []string{FourWay, Guarded, Simple} {
		for _, limit := range []string{"10 mV", "-40 dBV", "-100 dBu"} {
			last := rank(slip.Fail)
			max := q(limit).Linear()
			for x := 3.0; x > 1e-3; x *= 0.97 {
				y := x * max
				c := judged(res("V", y, math.Hypot(0.1*y, 0.05*max)), "", limit, decision)
				if rank(c.Verdict) < last {
					t.Errorf("%s, %s: at %g of the limit %s after a better one", decision, limit, x, c.Verdict)
				}
				last = rank(c.Verdict)
			}
			r := analyze.Refuse(unit.MustLookup("V"), analyze.BelowDetection, "none", "")
			r.Bound = &analyze.Bound{Upper: true, Value: 0.1 * max}
			if got := judged(r, "", limit, decision).Verdict; got != slip.Pass {
				t.Errorf("%s, %s: a bound a tenth of the limit: %s", decision, limit, got)
			}
		}
	}
}

func TestUncalibrated(t *testing.T) {
	r := res("dBFS", 0.01, 0)
	c := judged(r, "", "1 mV", FourWay)
	if c.Verdict != slip.NotMeasurable || !strings.HasPrefix(c.Reason, "uncalibrated: ") || c.Value != nil ||
		!strings.Contains(c.Reason, "-36.99 dBFS") || c.Unit != "mV" || *c.Max != 1 || c.Advice == "" {
		t.Errorf("limit in V: %+v", c)
	}
	c = judged(r, "", "-30 dBFS", FourWay)
	near(t, "in dBFS", c.Value, -36.9897, 1e-4)
	if c.Verdict != p {
		t.Errorf("limit in dBFS: %s", c.Verdict)
	}
	// Volts with a known full scale: a sine of full scale is 0 dBFS.
	v := res("V", 3.479, 0.01)
	v.FullScaleSine = 3.479
	c = judged(v, "", "-1 dBFS", FourWay)
	near(t, "volts in dBFS", c.Value, 0, 1e-9)
	near(t, "margin", c.Margin, -1, 1e-9)
	if c.Verdict != f {
		t.Errorf("volts against dBFS: %s", c.Verdict)
	}
	v.FullScaleSine = 0 // an oscilloscope
	if c = judged(v, "", "-1 dBFS", FourWay); c.Verdict != slip.NotMeasurable || !strings.HasPrefix(c.Reason, "uncalibrated") {
		t.Errorf("scope against dBFS: %s %q", c.Verdict, c.Reason)
	}
	if c = judged(res("Hz", 50, 0), "", "1 V", FourWay); c.Verdict != slip.NotMeasurable || !strings.HasPrefix(c.Reason, "unsupported") {
		t.Errorf("hertz against volts: %s %q", c.Verdict, c.Reason)
	}
	// Density and slew rate are tied by the same full scale.
	d := res("V/rtHz", 1e-6, 0)
	d.FullScaleSine = 2 / math.Sqrt2 // 2 V peak
	c = judged(d, "", "1 FS/rtHz", FourWay)
	near(t, "density in FS", c.Value, 0.5e-6, 1e-15)
}

// An uncertainty that the value needs and nobody stated keeps four-way from a
// full pass; the other rules keep their verdict; all carry the flag when there
// are limits.
func TestLacking(t *testing.T) {
	for _, c := range []struct {
		y              float64
		decision, want string
	}{{0.5, FourWay, cp}, {0.5, "", cp}, {0.5, Guarded, p}, {0.5, Simple, p}, {1.5, FourWay, f}, {0.99, FourWay, cp}, {1.01, FourWay, cf}} {
		r := res("V", c.y, 0.1)
		r.Lacking = []string{"gear.box.uncertainty"}
		r.Unstated = []string{"load"}
		got := judged(r, "", "1 V", c.decision)
		if got.Verdict != c.want {
			t.Errorf("%g V, %s: %s, want %s", c.y, c.decision, got.Verdict, c.want)
		}
		if len(got.Flags) != 1 || got.Flags[0].Code != recording.UncertaintyUnstated || !strings.Contains(got.Flags[0].Message, "gear.box.uncertainty") {
			t.Errorf("flags %+v", got.Flags)
		}
		if !reflect.DeepEqual(got.Unstated, []string{"load", "gear.box.uncertainty"}) {
			t.Errorf("unstated %v", got.Unstated)
		}
		if c.y == 0.5 && c.want == cp && (!strings.HasPrefix(got.Reason, "uncertainty-unstated: ") || got.Advice != "state gear.box.uncertainty") {
			t.Errorf("reason %q advice %q", got.Reason, got.Advice)
		}
	}
	r := res("V", 1, 0.1)
	r.Lacking = []string{"gear.box.uncertainty"}
	if c := judged(r, "", "", FourWay); len(c.Flags) != 0 || len(c.Unstated) != 1 || c.Verdict != slip.NotJudged {
		t.Errorf("without limits: %+v", c)
	}
	b := analyze.Refuse(unit.MustLookup("V"), analyze.BelowDetection, "none", "")
	b.Bound, b.Lacking = &analyze.Bound{Upper: true, Value: 0.1}, r.Lacking
	if c := judged(b, "", "1 V", FourWay); c.Verdict != cp || !strings.HasPrefix(c.Reason, "below-detection") {
		t.Errorf("bound: %s %q", c.Verdict, c.Reason)
	}
}

// A measure may keep its value from a full pass, whatever the room: four-way
// says conditional-pass with the measure's reason, a fail stays one, the other
// rules (which know no state between) keep their verdict and note the reason.
func TestConditional(t *testing.T) {
	const why = "floor-limited: the recorder's own harmonics are too near"
	for _, c := range []struct {
		y              float64
		decision, want string
	}{{0.5, FourWay, cp}, {0.5, "", cp}, {0.5, Guarded, p}, {0.5, Simple, p}, {0.99, FourWay, cp}, {1.01, FourWay, cf}, {1.5, FourWay, f}} {
		r := res("%", c.y/100, 0.001)
		r.Conditional = why
		got := &slip.Check{Measure: "thd", Class: "major"}
		Row(got, r, Limits{Max: q("1 %")}, slip.Rule{Decision: c.decision, Coverage: 2}, 10)
		if got.Verdict != c.want {
			t.Errorf("%g %%, %q: %s, want %s", c.y, c.decision, got.Verdict, c.want)
		}
		if c.y != 0.5 {
			continue
		}
		if c.want == cp && (got.Reason != why || !strings.Contains(got.Advice, "`loop`")) {
			t.Errorf("%q: reason %q advice %q", c.decision, got.Reason, got.Advice)
		}
		if c.want == p && (got.Reason != "" || len(got.Notes) != 1 || got.Notes[0] != why) {
			t.Errorf("%q: reason %q notes %q", c.decision, got.Reason, got.Notes)
		}
	}
	// Neither limits nor class info: nothing to keep from a pass.
	r := res("%", 0.005, 0.001)
	r.Conditional = why
	if got := judged(r, "", "", FourWay); got.Verdict != slip.NotJudged || got.Reason != "" {
		t.Errorf("without limits: %s %q", got.Verdict, got.Reason)
	}
	// It survives a mean of takes and a comparison.
	if m := Repeat([]string{"a", "b"}, []analyze.Result{res("%", 0.005, 0.001), r}); m.Conditional != why {
		t.Errorf("mean: %q", m.Conditional)
	}
	if d := Against("thd", [2]string{"a", "b"}, r, res("%", 0.005, 0.001)); d.Conditional != why {
		t.Errorf("comparison: %q", d.Conditional)
	}
}

func TestClassesAndRefusals(t *testing.T) {
	c := &slip.Check{Measure: "gain", Class: Info}
	Row(c, inDB(40, 0.1), Limits{Max: q("30 dB")}, slip.Rule{}, 0)
	if c.Verdict != slip.NotJudged || c.Margin != nil || c.Probability != nil || *c.Max != 30 {
		t.Errorf("info: %+v", c)
	}
	if got := judged(inDB(40, 0.1), "", "", FourWay); got.Verdict != slip.NotJudged || got.LimitUnit != nil || got.Unit != "dB" {
		t.Errorf("no limits: %+v", got)
	}
	got := judged(analyze.Refuse(unit.MustLookup("V"), analyze.NotApplicable, "gain differs", ""), "", "1 V", FourWay)
	if got.Verdict != slip.NotApplicable || got.Reason != "not-applicable: gain differs" {
		t.Errorf("not applicable: %+v", got)
	}
	got = judged(analyze.Refuse(unit.MustLookup("dBFS"), analyze.Clipped, "at 1 s", "lower the level by 6 dB"), "", "1 V", FourWay)
	if got.Verdict != slip.NotMeasurable || got.Reason != "clipped: at 1 s" || got.Advice != "lower the level by 6 dB" || got.Unit != "V" {
		t.Errorf("clipped: %+v", got)
	}
	for _, r := range []analyze.Result{{}, res("V", math.NaN(), 0), res("V", 1, math.Inf(1)), res("V", math.Inf(1), 1)} {
		if got := judged(r, "", "1 V", FourWay); got.Verdict != slip.NotMeasurable || got.Value != nil {
			t.Errorf("a broken result: %+v", got)
		}
	}
	// A typical figure is shown in the row's unit and never judged.
	c = &slip.Check{Class: "major"}
	Row(c, res("V", 1, 0.1), Limits{Typical: q("1 mV")}, slip.Rule{}, 0)
	if c.Verdict != slip.NotJudged || *c.Typical != 0.001 || c.Unit != "V" {
		t.Errorf("typical: %+v", c)
	}
}

// Signs and counts have no guard band.
func TestCounts(t *testing.T) {
	r := res("", 1, 0.5)
	c := &slip.Check{Measure: "polarity", Class: "major"}
	Row(c, r, Limits{Min: q("1"), Max: q("1")}, slip.Rule{}, 0)
	if c.Verdict != p || c.Uncertainty != nil || *c.Margin != 0 || *c.Probability != 1 || c.Unit != "" || *c.LimitUnit != "" {
		t.Errorf("polarity: %+v", c)
	}
	c = &slip.Check{Measure: "events", Class: "major"}
	Row(c, res("", 2, 0), Limits{Max: q("0")}, slip.Rule{}, 0)
	if c.Verdict != f || *c.Margin != -2 {
		t.Errorf("events: %+v", c)
	}
}

// Levels in dB of zero and negative values: shown in the linear unit, judged
// as the signed value they are.
func TestNoLevel(t *testing.T) {
	for _, y := range []float64{0, -0.3} {
		c := judged(res("V", y, 0.001), "", "-40 dBV", FourWay)
		if c.Verdict != p || c.Unit != "V" || *c.LimitUnit != "V" || *c.Value != y || math.Abs(*c.Max-0.01) > 1e-15 || len(c.Notes) != 1 {
			t.Errorf("%g V: %+v", y, c)
		}
	}
}

func TestPoints(t *testing.T) {
	pt := func(label string, dB, U float64) analyze.Point {
		r := inDB(dB, U)
		return analyze.Point{Label: label, Value: r.Value, Budget: r.Budget}
	}
	below := analyze.Point{Label: "10 kHz", Bound: &analyze.Bound{Value: math.Pow(10, 90./20)},
		Refusal: &analyze.Refusal{Code: analyze.BelowDetection, Text: "no line"}}
	short := analyze.Point{Label: "47 Hz", Refusal: &analyze.Refusal{Code: analyze.TooShort, Text: "3 Hz from the mains", Advice: "record 8 s"}}
	for _, c := range []struct {
		name   string
		points []analyze.Point
		want   string
		value  float64
		reason string
	}{
		{"all pass", []analyze.Point{pt("1 kHz", 80, 1), pt("50 Hz", 70, 1)}, p, 70, ""},
		{"smallest open", []analyze.Point{pt("1 kHz", 80, 1), pt("50 Hz", 60.5, 1)}, cp, 60.5, ""},
		{"another open", []analyze.Point{pt("1 kHz", 65, 10), pt("50 Hz", 62, 1)}, cp, 62, ""},
		{"fails", []analyze.Point{pt("1 kHz", 80, 1), pt("50 Hz", 50, 1)}, f, 50, ""},
		{"bound passes", []analyze.Point{pt("1 kHz", 80, 1), below}, p, 80, ""},
		{"one refused", []analyze.Point{pt("1 kHz", 80, 1), short}, slip.NotMeasurable, 80, "too-short: at 47 Hz: 3 Hz from the mains"},
		{"fail beats refused", []analyze.Point{short, pt("1 kHz", 40, 1)}, f, 40, ""},
	} {
		r := analyze.Result{Unit: unit.MustLookup("dB"), Points: c.points}
		got := judged(r, "60 dB", "", FourWay)
		if got.Verdict != c.want || got.Reason != c.reason {
			t.Errorf("%s: %s %q, want %s %q", c.name, got.Verdict, got.Reason, c.want, c.reason)
		}
		near(t, c.name, got.Value, c.value, 1e-9)
		near(t, c.name+": margin", got.Margin, c.value-60, 1e-9)
		list := got.Details["points"].([]map[string]any)
		if len(list) != len(c.points) || list[0]["label"] != c.points[0].Label || list[1]["verdict"] == nil {
			t.Errorf("%s: details %v", c.name, list)
		}
	}
	only := judged(analyze.Result{Unit: unit.MustLookup("dB"), Points: []analyze.Point{below, below}}, "60 dB", "", FourWay)
	if only.Verdict != p || only.Bound == nil || only.Value != nil || only.Details["lower_bound"] == nil {
		t.Errorf("bounds alone: %+v", only)
	}
	// The measure's own list is kept and added to.
	r := analyze.Result{Unit: unit.MustLookup("dB"), Points: []analyze.Point{pt("1 kHz", 80, 1), pt("50 Hz", 70, 1)}}
	r.Details = map[string]any{"points": []map[string]any{{"frequency_hz": 1000.0}, {"frequency_hz": 50.0}}}
	got := judged(r, "60 dB", "", FourWay)
	list := got.Details["points"].([]map[string]any)
	if list[1]["frequency_hz"] != 50.0 || list[1]["verdict"] != p || len(r.Details["points"].([]map[string]any)[0]) != 1 {
		t.Errorf("merged %v, measure's own %v", list, r.Details)
	}
}

// No row ever holds a number that JSON cannot.
func TestFinite(t *testing.T) {
	rng := rand.New(rand.NewSource(2))
	pick := func() float64 {
		x := math.Pow(10, rng.Float64()*40-20)
		return []float64{x, x, x, -x, 0, 1e300, 1e-300, math.NaN(), math.Inf(1), math.MaxFloat64, 5e-324}[rng.Intn(11)]
	}
	units := []string{"V", "dBu", "dB", "%", "dBFS", "W", "dBm", "", "Hz", "V/rtHz"}
	for i := range 6000 {
		u := unit.MustLookup(units[rng.Intn(len(units))])
		y := pick()
		r := analyze.Result{Unit: u, Value: &y, FullScaleSine: []float64{0, 1, 3}[rng.Intn(3)]}
		for range rng.Intn(3) {
			r.Budget = append(r.Budget, analyze.Contributor{Name: "x", Kind: "A", U: math.Abs(pick()), Dof: []float64{0, 1, 5, 1e9}[rng.Intn(4)]})
		}
		if rng.Intn(4) == 0 {
			r.Interval = &[2]float64{pick(), pick()}
		}
		if rng.Intn(4) == 0 {
			r.Value, r.Refusal, r.Bound = nil, &analyze.Refusal{Code: "below-detection", Text: "x"}, &analyze.Bound{Upper: rng.Intn(2) == 0, Value: pick()}
		}
		l := unit.MustLookup(units[rng.Intn(len(units))])
		lim := Limits{Max: &unit.Quantity{Number: rng.NormFloat64() * 50, Unit: l}}
		if rng.Intn(2) == 0 {
			lim.Min = &unit.Quantity{Number: lim.Max.Number - rng.Float64()*9, Unit: l}
		}
		c := slip.Check{Class: "major", Measure: "level"}
		Row(&c, r, lim, slip.Rule{Coverage: []float64{2, 3, 0.1, 30, 1e6}[rng.Intn(5)], Decision: FourWay}, 10)
		if _, err := json.Marshal(c); err != nil {
			t.Fatalf("case %d: %v: value %v budget %v interval %v bound %v: %+v", i, err, y, r.Budget, r.Interval, r.Bound, c)
		}
		if s := fmt.Sprint(c.Notes, c.Advice, c.Reason); strings.Contains(s, "NaN") || strings.Contains(s, "Inf") {
			t.Fatalf("case %d: %s", i, s)
		}
	}
}

// Points with a limit of their own fail a row whatever its own limits say, and
// judge one that has none.
func TestPointsOwnLimit(t *testing.T) {
	most := unit.MustLookup("dBu")
	own := &unit.Quantity{Number: -100, Unit: most}
	pt := func(label string, dBu, rel float64) analyze.Point {
		v := most.ToLinear(dBu)
		return analyze.Point{Label: label, Value: &v, Limit: own, Budget: []analyze.Contributor{{Name: "noise", Kind: "A", U: rel * v}}}
	}
	below := func(dBu float64) analyze.Point {
		return analyze.Point{Label: "order 9", Limit: own, Bound: &analyze.Bound{Upper: true, Value: most.ToLinear(dBu)},
			Refusal: &analyze.Refusal{Code: analyze.BelowDetection, Text: "no line"}}
	}
	for _, c := range []struct {
		name   string
		max    string
		points []analyze.Point
		want   string
	}{
		{"all under, row without limits", "", []analyze.Point{pt("order 1", -103, 0.01), pt("order 3", -110, 0.01)}, p},
		{"one over, row passes", "-90 dBu", []analyze.Point{pt("order 1", -98, 0.01), pt("order 3", -110, 0.01)}, f},
		{"one over, row without limits", "", []analyze.Point{pt("order 1", -98, 0.01)}, f},
		{"row fails alone", "-120 dBu", []analyze.Point{pt("order 1", -103, 0.01)}, f},
		{"close", "", []analyze.Point{pt("order 1", -100.1, 0.02)}, cp},
		{"bound under", "", []analyze.Point{pt("order 1", -103, 0.01), below(-101)}, p},
		{"bound over", "", []analyze.Point{pt("order 1", -103, 0.01), below(-99)}, slip.NotMeasurable},
	} {
		v := most.ToLinear(-97)
		r := analyze.Result{Unit: unit.MustLookup("V"), Value: &v, Points: c.points, Budget: []analyze.Contributor{{Name: "noise", Kind: "A", U: 1e-3 * v}}}
		got := judged(r, "", c.max, FourWay)
		if got.Verdict != c.want {
			t.Errorf("%s: %s %q, want %s", c.name, got.Verdict, got.Reason, c.want)
		}
		if got.Value == nil || got.Verdict == f && c.max != "-120 dBu" && got.Reason == "" {
			t.Errorf("%s: value %v, reason %q", c.name, got.Value, got.Reason)
		}
	}
	var info slip.Check
	info.Class = Info
	v := most.ToLinear(-97)
	Row(&info, analyze.Result{Unit: unit.MustLookup("V"), Value: &v, Points: []analyze.Point{pt("order 1", -90, 0.01)}}, Limits{}, slip.Rule{Coverage: 2}, 10)
	if info.Verdict != slip.NotJudged {
		t.Errorf("info row: %s", info.Verdict)
	}
}
