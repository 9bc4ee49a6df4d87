package judge

import (
	"math"
	"strings"
	"testing"

	"benchslip/analyze"
	"benchslip/analyze/slip"
	"benchslip/capture/unit"
)

func q(s string) *unit.Quantity {
	if s == "" {
		return nil
	}
	v, err := unit.Parse(s)
	if err != nil {
		panic(err)
	}
	return &v
}

// res is a result of value y (linear) with an expanded uncertainty U (k = 2)
// of type B, in a unit.
func res(symbol string, y, U float64) analyze.Result {
	r := analyze.Result{Unit: unit.MustLookup(symbol), Value: &y}
	if U > 0 {
		r.Budget = []analyze.Contributor{{Name: "calibration of box", Kind: "B", U: U / 2, Source: "gear box scale", Sign: 1}}
	}
	return r
}

// inDB is a ratio result of a value and U in dB.
func inDB(dB, U float64) analyze.Result {
	y := math.Pow(10, dB/20)
	return res("dB", y, U*y*math.Ln10/20)
}

func judged(r analyze.Result, min, max, decision string) *slip.Check {
	c := &slip.Check{Measure: "level", Class: "major"}
	Row(c, r, Limits{Min: q(min), Max: q(max)}, slip.Rule{Decision: decision, Coverage: 2}, 10)
	return c
}

func near(t *testing.T, name string, got *float64, want, tol float64) {
	t.Helper()
	if got == nil {
		t.Errorf("%s: null, want %g", name, want)
	} else if math.Abs(*got-want) > tol {
		t.Errorf("%s: %.12g, want %.12g", name, *got, want)
	}
}

const (
	p, cp, cf, f = slip.Pass, slip.ConditionalPass, slip.ConditionalFail, slip.Fail
)

// TestVerdicts: the four verdicts of ILAC-G8:09/2019 4.2.3 with w = U and what
// becomes of them under the other rules. On a boundary the state nearer pass
// holds, which is our choice. Acceptance on the limit itself under the simple
// rule is that of IEC 61260-1:2014 table C.1 (read second-hand).
func TestVerdicts(t *testing.T) {
	for _, c := range []struct {
		name                  string
		r                     analyze.Result
		min, max              string
		four, guarded, simple string
	}{
		// Upper limit 1.00, U 0.20.
		{"well inside", res("V", 0.75, 0.2), "", "1 V", p, p, p},
		{"0.95", res("V", 0.95, 0.2), "", "1 V", cp, f, p},
		{"1.05", res("V", 1.05, 0.2), "", "1 V", cf, f, f},
		{"1.25", res("V", 1.25, 0.2), "", "1 V", f, f, f},
		{"on the inner guard", res("V", 0.80, 0.2), "", "1 V", p, p, p},
		{"on the limit", res("V", 1.00, 0.2), "", "1 V", cp, f, p},
		{"on the outer guard", res("V", 1.20, 0.2), "", "1 V", cf, f, f},
		// Lower limit, mirrored.
		{"lower, inner guard", res("V", 1.20, 0.2), "1 V", "", p, p, p},
		{"lower, on the limit", res("V", 1.00, 0.2), "1 V", "", cp, f, p},
		{"lower, outer guard", res("V", 0.80, 0.2), "1 V", "", cf, f, f},
		{"lower, outside", res("V", 0.79, 0.2), "1 V", "", f, f, f},
		// Gain 40 +- 0.5 dB, U 0.12 dB.
		{"gain 40.37", inDB(40.37, 0.12), "39.5 dB", "40.5 dB", p, p, p},
		{"gain 40.45", inDB(40.45, 0.12), "39.5 dB", "40.5 dB", cp, f, p},
		{"gain 40.55", inDB(40.55, 0.12), "39.5 dB", "40.5 dB", cf, f, f},
		{"gain 39.63", inDB(39.63, 0.12), "39.5 dB", "40.5 dB", p, p, p},
		{"gain 39.30", inDB(39.30, 0.12), "39.5 dB", "40.5 dB", f, f, f},
		// Common-mode rejection of at least 60 dB, U 2 dB.
		{"rejection 61.0", inDB(61, 2), "60 dB", "", cp, f, p},
		{"rejection 57.9", inDB(57.9, 2), "60 dB", "", f, f, f},
		// Window narrower than 2U: +-0.1, U 0.15, value in the middle.
		{"narrow window", res("V", 0, 0.15), "-0.1 V", "0.1 V", cp, f, p},
		{"narrow window, outside", res("V", 0.2, 0.15), "-0.1 V", "0.1 V", cf, f, f},
		{"window of exactly 2U", res("V", 0, 0.1), "-0.1 V", "0.1 V", p, p, p},
		// Signed limits +1.0/-1.2, U 0.3 (table C.1 rows 2, 3, 7, 8).
		{"1.1", res("V", 1.1, 0.3), "-1.2 V", "1 V", cf, f, f},
		{"1.0", res("V", 1.0, 0.3), "-1.2 V", "1 V", cp, f, p},
		{"-1.2", res("V", -1.2, 0.3), "-1.2 V", "1 V", cp, f, p},
		{"-1.3", res("V", -1.3, 0.3), "-1.2 V", "1 V", cf, f, f},
		// No uncertainty at all: two states.
		{"exact, on the limit", res("V", 1, 0), "", "1 V", p, p, p},
		{"exact, over", res("V", 1.0001, 0), "", "1 V", f, f, f},
	} {
		for decision, want := range map[string]string{FourWay: c.four, "": c.four, Guarded: c.guarded, Simple: c.simple} {
			got := judged(c.r, c.min, c.max, decision)
			if got.Verdict != want {
				t.Errorf("%s, %q: %s, want %s", c.name, decision, got.Verdict, want)
			}
		}
	}
}

// Boundaries to the last places: a step of one ulp is rounding and stays with
// the state nearer pass; a step of 1e-12 is not.
func TestBoundaries(t *testing.T) {
	for _, limit := range []float64{1, 0.3, 1e-6, 4.92, 120.7} {
		for _, rel := range []float64{0.001, 0.07, 0.3} {
			U := limit * rel
			for _, b := range []struct {
				at      float64
				on, off string // verdicts on the boundary and beyond
			}{{limit - U, p, cp}, {limit, cp, cf}, {limit + U, cf, f}} {
				c := slip.Check{Class: "major"}
				max := unit.Quantity{Number: limit, Unit: unit.MustLookup("V")}
				at := func(y float64) string {
					c = slip.Check{Class: "major"}
					Row(&c, res("V", y, U), Limits{Max: &max}, slip.Rule{Coverage: 2}, 0)
					return c.Verdict
				}
				for _, y := range []float64{math.Nextafter(b.at, 0), b.at, math.Nextafter(b.at, 1e9)} {
					if got := at(y); got != b.on {
						t.Errorf("limit %g U %g: %s at %.17g, want %s", limit, U, got, y, b.on)
					}
				}
				if got := at(b.at * (1 + 1e-12)); got != b.off {
					t.Errorf("limit %g U %g: %s beyond %.17g, want %s", limit, U, got, b.at, b.off)
				}
			}
		}
	}
	// On a limit in dB, whatever the power of ten loses.
	for x := -140.0; x <= 140; x += 3.7 {
		max := unit.Quantity{Number: x, Unit: unit.MustLookup("dBu")}
		y := math.Sqrt(0.6) * math.Exp(x*math.Ln10/20) // another way to the same number
		var c slip.Check
		Row(&c, res("V", y, 0), Limits{Max: &max}, slip.Rule{}, 0)
		if c.Verdict != p || *c.Margin != 0 {
			t.Errorf("%g dBu on its limit: %s, margin %g", x, c.Verdict, *c.Margin)
		}
	}
}

// The numbers of a row in dB: value, U, margin, probability, sentence, advice.
func TestBoundaryRow(t *testing.T) {
	c := judged(inDB(40.45, 0.12), "39.5 dB", "40.5 dB", FourWay)
	near(t, "value", c.Value, 40.45, 1e-9)
	near(t, "uncertainty", c.Uncertainty, 0.12, 1e-12)
	near(t, "margin", c.Margin, 0.05, 1e-9)
	near(t, "coverage", c.Coverage, 2, 0)
	near(t, "contributor", &c.Contributors[0].StandardUncertainty, 0.06, 1e-12)
	// Phi(0.05/0.06) = 0.7977 in dB; 0.7970 in V/V.
	near(t, "probability", c.Probability, 0.797, 0.002)
	want := "measured 40.45 dB, limit 40.5 dB, uncertainty 0.12 dB: passes, but not beyond doubt (about 80 in 100)"
	if len(c.Notes) != 1 || c.Notes[0] != want {
		t.Errorf("notes %q, want %q", c.Notes, want)
	}
	if c.Advice != "needs U <= 0.05 dB: a better calibration: gear.box.uncertainty is the largest part" {
		t.Errorf("advice %q", c.Advice)
	}
	if c.Unit != "dB" || *c.LimitUnit != "dB" || *c.Min != 39.5 || *c.Max != 40.5 || c.Reason != "" || c.Interval != nil {
		t.Errorf("row %+v", c)
	}
	c = judged(inDB(40.45, 0.12), "39.5 dB", "40.5 dB", Guarded)
	if !strings.Contains(c.Notes[0], "the guarded rule fails it (about 80 in 100 that it conforms)") {
		t.Errorf("guarded: %q", c.Notes)
	}
	c = judged(inDB(40.55, 0.12), "39.5 dB", "40.5 dB", FourWay)
	if !strings.Contains(c.Notes[0], "fails, but not beyond doubt (about 20 in 100 that it conforms)") {
		t.Errorf("conditional fail: %q", c.Notes)
	}
	c = judged(inDB(40.0, 0.12), "39.5 dB", "40.5 dB", FourWay)
	if len(c.Notes) != 0 || c.Advice != "" || *c.Probability < 0.9999 {
		t.Errorf("clear pass: %q %q %g", c.Notes, c.Advice, *c.Probability)
	}
}

// Conformance probabilities of JCGM 106:2012 7.2 to 7.4 (two from memory), and
// at a quarter of the guard band.
func TestProbability(t *testing.T) {
	for _, c := range []struct {
		name     string
		y, u     float64
		min, max string
		want     float64
		tol      float64
	}{
		{"upper limit", 0.85, 0.1, "", "1 V", 0.933192799, 1e-8},
		{"two limits", 0.8, 0.2, "-1 V", "1 V", 0.841344746, 1e-8},
		{"breakdown voltage, prints 0.92", -5.47, 0.05, "", "-5.40 V", 0.92, 0.005},
		{"motor oil, prints 0.66", 13.6, 1.8, "12.5 V", "16.3 V", 0.66, 0.005},
		{"half a guard band inside", 0.9, 0.1, "", "1 V", 0.841344746, 1e-8},
		{"on the limit", 1, 0.1, "", "1 V", 0.5, 1e-12},
		{"on the inner guard", 0.8, 0.1, "", "1 V", 1 - 0.0227501319, 1e-8},
		{"exact, on the limit", 1, 0, "", "1 V", 1, 0},
		{"exact, over", 1.1, 0, "", "1 V", 0, 0},
	} {
		near(t, c.name, judged(res("V", c.y, 2*c.u), c.min, c.max, FourWay).Probability, c.want, c.tol)
	}
	// Few degrees of freedom: Student's law and its k. At 10 degrees t 0.95,
	// one-sided, is 1.812 (JCGM 100 table G.2).
	r := res("V", 1, 0)
	r.Budget = []analyze.Contributor{{Name: "scatter", Kind: "A", U: 0.1, Dof: 10}}
	c := judged(r, "", "1.1812 V", FourWay)
	near(t, "ten degrees", c.Probability, 0.95, 1e-4)
	near(t, "k", c.Coverage, 2.2837, 1e-3)
	near(t, "U", c.Uncertainty, 0.22837, 1e-4)
	near(t, "dof", c.Contributors[0].Dof, 10, 0)
}

// Relative U over a tenth: both ends in dB (+10 % is +0.8279 dB, -10 % is
// -0.9151 dB, closed form), the larger half as U; from 100 % on no lower end.
func TestWideInDB(t *testing.T) {
	c := judged(res("V", 1, 0.1), "", "10 dBV", FourWay)
	near(t, "10 %: slope", c.Uncertainty, 0.868588964, 1e-8)
	if c.Interval != nil {
		t.Errorf("10 %%: interval %v", *c.Interval)
	}
	c = judged(res("V", 1, 0.1000001), "", "10 dBV", FourWay)
	near(t, "over 10 %: U", c.Uncertainty, 0.9151, 1e-4)
	near(t, "over 10 %: low", &c.Interval[0], -0.9151, 1e-4)
	near(t, "over 10 %: high", &c.Interval[1], 0.8279, 1e-4)
	c = judged(res("V", 1, 1.2), "", "10 dBV", FourWay)
	near(t, "120 %: U", c.Uncertainty, 20*math.Log10(2.2), 1e-9)
	if c.Interval != nil {
		t.Errorf("120 %%: interval %v", *c.Interval)
	}
	c = judged(res("V", 1, 0.3), "", "10 V", FourWay) // linear units have the ends too
	if c.Interval == nil || math.Abs(c.Interval[0]-0.7) > 1e-12 || *c.Uncertainty != 0.3 {
		t.Errorf("30 %% in V: %v", c.Interval)
	}
	if c = judged(res("V", 1, 1.2), "", "10 V", FourWay); c.Interval != nil || *c.Uncertainty != 1.2 {
		t.Errorf("120 %% in V: %v", c.Interval)
	}
	c = judged(res("W", 1, 0.02), "", "40 dBm", FourWay) // powers: 10 lg
	near(t, "power: U", c.Uncertainty, 0.0868588964, 1e-9)
	near(t, "power: value", c.Value, 30, 1e-9)
}

func TestTooLarge(t *testing.T) {
	for _, decision := range []string{FourWay, Guarded} {
		c := judged(res("V", 0, 0.15), "-100 mV", "100 mV", decision)
		if !strings.HasPrefix(c.Reason, "uncertainty too large") || c.Advice == "" {
			t.Errorf("%s: reason %q, advice %q", decision, c.Reason, c.Advice)
		}
		near(t, "shown in the limit's unit", c.Uncertainty, 150, 1e-9)
	}
}

// What settles an open row: a longer take while type A decides (U_A falls with
// the root of the length), else the largest figure of type B.
func TestAdvice(t *testing.T) {
	line := func(kind string, u float64) analyze.Contributor {
		return analyze.Contributor{Name: "load of 8 ohm", Kind: kind, U: u}
	}
	for _, c := range []struct {
		name    string
		lines   []analyze.Contributor
		y       float64
		seconds float64
		want    string
	}{
		// u_A 0.1, room 0.1 = 2 x 0.05: a quarter of the variance, four times the length.
		{"type A", []analyze.Contributor{line("A", 0.1)}, 0.9, 10, "needs U <= 100 mV: record 40 s"},
		// Type B takes 0.03 of 0.05: type A must fall to 0.04, 6.25 times.
		{"type A over B", []analyze.Contributor{line("A", 0.1), line("B", 0.03)}, 0.9, 10, "needs U <= 100 mV: record 63 s"},
		{"minutes", []analyze.Contributor{line("A", 0.1)}, 0.98, 10, "needs U <= 20 mV: record 17 min"},
		{"too long", []analyze.Contributor{line("A", 0.1)}, 0.98, 30, "needs U <= 20 mV: mean of 100 takes under repeat"},
		{"length unknown", []analyze.Contributor{line("A", 0.1)}, 0.9, 0, "needs U <= 100 mV: mean of 4 takes under repeat"},
		{"type B", []analyze.Contributor{line("A", 0.01), line("B", 0.1)}, 0.9, 10, "needs U <= 100 mV: a better figure for the largest part, load of 8 ohm"},
		{"both", []analyze.Contributor{line("A", 0.1), line("B", 0.06)}, 0.9, 10, "needs U <= 100 mV: a longer take and a better figure for the largest part, load of 8 ohm"},
		{"outside", []analyze.Contributor{line("A", 0.1)}, 1.1, 10, "needs U <= 100 mV: record 40 s"},
		{"on the limit", []analyze.Contributor{line("A", 0.1)}, 1, 10, "the value lies on its limit"},
	} {
		y := c.y
		r := analyze.Result{Unit: unit.MustLookup("V"), Value: &y, Budget: c.lines}
		got := &slip.Check{Class: "major"}
		Row(got, r, Limits{Max: q("1 V")}, slip.Rule{Coverage: 2}, c.seconds)
		if !strings.HasPrefix(got.Advice, c.want) {
			t.Errorf("%s: %q, want %q", c.name, got.Advice, c.want)
		}
	}
}

// Bounds judge by the side they lie on, under every rule; nothing else of the
// row is known.
func TestBounds(t *testing.T) {
	nm := slip.NotMeasurable
	for _, c := range []struct {
		name     string
		upper    bool
		at       float64
		min, max string
		want     string
	}{
		{"below, under max", true, 0.5, "", "1 V", p},
		{"below, on max", true, 1, "", "1 V", p},
		{"below, over max", true, 1.1, "", "1 V", nm},
		{"below, under min", true, 0.5, "1 V", "", f},
		{"below, over min", true, 1.5, "1 V", "", nm},
		{"below, on min", true, 1, "1 V", "", nm},
		{"below, window", true, 0.5, "0.1 V", "1 V", nm},
		{"below, window from zero", true, 0.5, "0 V", "1 V", p},
		{"above, over min", false, 1.5, "1 V", "", p},
		{"above, on min", false, 1, "1 V", "", p},
		{"above, under min", false, 0.5, "1 V", "", nm},
		{"above, over max", false, 1.5, "", "1 V", f},
		{"above, under max", false, 0.5, "", "1 V", nm},
		{"above, window", false, 0.5, "0.1 V", "1 V", nm},
		{"below, no limits", true, 0.5, "", "", nm},
	} {
		for _, decision := range []string{FourWay, Guarded, Simple} {
			r := analyze.Refuse(unit.MustLookup("V"), analyze.BelowDetection, "no line over 1 uV", "record 40 s")
			r.Bound = &analyze.Bound{Upper: c.upper, Value: c.at}
			got := judged(r, c.min, c.max, decision)
			if got.Verdict != c.want || got.Value != nil || got.Margin != nil || got.Probability != nil ||
				!strings.HasPrefix(got.Reason, "below-detection: ") || got.Bound == nil {
				t.Errorf("%s, %s: %s, want %s: %+v", c.name, decision, got.Verdict, c.want, got)
			}
			if (got.Advice == "") != (c.want == p || c.want == f) {
				t.Errorf("%s: advice %q", c.name, got.Advice)
			}
		}
	}
	r := analyze.Refuse(unit.MustLookup("%"), analyze.BelowDetection, "none", "")
	r.Bound = &analyze.Bound{Upper: true, Value: 4e-6}
	got := judged(r, "", "-90 dB", FourWay)
	if got.Bound.Unit != "dB" || got.Bound.Kind != "upper" || got.Bound.Confidence != 0.95 {
		t.Errorf("bound %+v", got.Bound)
	}
	near(t, "bound in the limit's unit", &got.Bound.Value, -107.9588, 1e-3)
	own, _ := got.Details["upper_bound"].(float64)
	near(t, "bound in the own unit", &own, 0.0004, 1e-12)
}

// A range that the estimator leaves open is judged with both ends, widened by
// U: it passes when all of it does and fails when all of it does.
func TestRange(t *testing.T) {
	for _, c := range []struct {
		lo, y, hi float64
		max       string
		want      string
	}{
		{0.7, 0.8, 0.9, "1.001 V", p}, {0.7, 0.8, 0.9, "0.95 V", cp}, {0.7, 0.8, 0.9, "0.85 V", cp},
		{0.7, 0.8, 0.9, "0.75 V", cf}, {0.7, 0.8, 0.9, "0.65 V", cf}, {0.7, 0.8, 0.9, "0.59 V", f},
	} {
		r := res("V", c.y, 0.1)
		r.Interval = &[2]float64{c.lo, c.hi}
		got := judged(r, "", c.max, FourWay)
		if got.Verdict != c.want {
			t.Errorf("range under %s: %s, want %s", c.max, got.Verdict, c.want)
		}
		if *got.Interval != [2]float64{0.7, 0.9} {
			t.Errorf("interval %v", *got.Interval)
		}
		near(t, "U covers range and uncertainty", got.Uncertainty, 0.2, 1e-12)
	}
	// Uniform over 0.7..0.9, widened by a normal law: symmetric about 0.8.
	r := res("V", 0.8, 0.1)
	r.Interval = &[2]float64{0.7, 0.9}
	near(t, "middle", judged(r, "", "0.8 V", FourWay).Probability, 0.5, 1e-12)
	r.Budget = nil
	near(t, "three quarters", judged(r, "", "0.85 V", FourWay).Probability, 0.75, 1e-9)
	r.Budget = res("V", 1, 1e-7).Budget
	near(t, "nearly no normal part", judged(r, "", "0.85 V", FourWay).Probability, 0.75, 1e-6)
	c := &slip.Check{Class: "major", Measure: "pickup"}
	Row(c, r, Limits{Max: q("0.85 V")}, slip.Rule{}, 10)
	if !strings.Contains(c.Advice, "mains reference") {
		t.Errorf("advice %q", c.Advice)
	}
}
