package judge

import (
	"math"
	"reflect"
	"strings"
	"testing"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
	"benchslip/analyze/slip"
	"benchslip/capture/recording"
	"benchslip/capture/unit"
)

func taken(y float64, lines ...analyze.Contributor) analyze.Result {
	return analyze.Result{Unit: unit.MustLookup("V"), Value: &y, Budget: lines}
}

func a(u, dof float64) analyze.Contributor {
	return analyze.Contributor{Name: "scatter", Kind: "A", U: u, Dof: dof}
}

func shared(u float64) analyze.Contributor {
	return analyze.Contributor{Name: "calibration of box", Kind: "B", U: u, Source: "gear box scale", Sign: 1}
}

// Ten daily means of JCGM 100 H.5 (table H.9): mean 10.000097 V, u of the
// mean 18 uV from the scatter between days, which outweighs the days' own
// (pooled 85 uV over sqrt 5 readings, 38 uV a day).
func TestRepeatDaily(t *testing.T) {
	means := []float64{172, 116, 13, 144, 106, 31, 60, 125, 163, 41}
	within := []float64{60, 77, 111, 101, 67, 93, 80, 73, 88, 86}
	var names []string
	var results []analyze.Result
	for i, m := range means {
		names = append(names, string(rune('a'+i)))
		results = append(results, taken(10+m*1e-6, a(within[i]*1e-6/math.Sqrt(5), 4), shared(1e-6)))
	}
	r := Repeat(names, results)
	near(t, "mean", r.Value, 10.000097, 5e-7)
	near(t, "u", &r.Budget[0].U, 18.05e-6, 0.01e-6)
	if r.Budget[0].Dof != 9 || r.Budget[0].Kind != "A" || len(r.Budget) != 2 || math.Abs(r.Budget[1].U-1e-6) > 1e-12 {
		t.Errorf("budget %+v", r.Budget)
	}
}

// u_A = max(s, RMS of u_A)/sqrt M; type B does not shrink.
func TestRepeat(t *testing.T) {
	names := []string{"t1", "t2", "t3", "t4"}
	var results []analyze.Result
	for _, y := range []float64{1, 1.001, 0.999, 1} {
		r := taken(y, a(0.03, 8), a(0.04, 0), shared(0.02), analyze.Contributor{Name: "converter step", Kind: "B", U: 0.01})
		r.Flags = []recording.Flag{{Code: "settling", Take: "t1", Message: "m"}}
		r.Lacking = []string{"gear.box.uncertainty"}
		results = append(results, r)
	}
	r := Repeat(names, results)
	near(t, "mean", r.Value, 1, 1e-12)
	if len(r.Budget) != 3 {
		t.Fatalf("budget %+v", r.Budget)
	}
	near(t, "u_A", &r.Budget[0].U, 0.05/2, 1e-12)
	// One take: 0.05^4/(0.03^4/8) = 61.7 degrees; four such: 247.
	near(t, "dof", &r.Budget[0].Dof, 4*0.05*0.05*0.05*0.05/(0.03*0.03*0.03*0.03/8), 1e-6)
	near(t, "calibration", &r.Budget[1].U, 0.02, 1e-12)
	near(t, "step", &r.Budget[2].U, 0.01, 1e-12)
	if len(r.Flags) != 1 || len(r.Lacking) != 1 || !strings.Contains(r.Notes[0], "mean of 4 takes: t1, t2, t3, t4") {
		t.Errorf("%+v", r)
	}
	if one := Repeat(names[:1], results[:1]); !reflect.DeepEqual(one, results[0]) {
		t.Errorf("one take changed: %+v", one)
	}
	// A refused take refuses the mean, by name.
	bad := analyze.Refuse(unit.MustLookup("V"), analyze.Clipped, "at 1 s", "lower the level")
	r = Repeat(names[:2], []analyze.Result{results[0], bad})
	if r.Value != nil || r.Refusal.Code != analyze.Clipped || r.Refusal.Text != `take "t2": at 1 s` || r.Bound != nil {
		t.Errorf("%+v", r.Refusal)
	}
	// Below detection in one: the loosest of bound and value + 2u.
	low := analyze.Refuse(unit.MustLookup("V"), analyze.BelowDetection, "none", "")
	low.Bound = &analyze.Bound{Upper: true, Value: 0.4}
	r = Repeat(names[:2], []analyze.Result{low, taken(0.3, shared(0.1))})
	near(t, "bound", &r.Bound.Value, 0.5, 1e-12)
	// Phases turn.
	deg := func(x float64) analyze.Result {
		return analyze.Result{Unit: unit.MustLookup("deg"), Value: &x}
	}
	near(t, "phase", Repeat(names[:2], []analyze.Result{deg(179), deg(-179)}).Value, 180, 1e-9)
	near(t, "phase", Repeat(names[:2], []analyze.Result{deg(-178), deg(179)}).Value, -179.5, 1e-9)
	if r := Repeat(names[:2], []analyze.Result{deg(1), taken(1)}); r.Refusal == nil || r.Refusal.Code != analyze.NotApplicable {
		t.Errorf("degrees and volts: %+v", r)
	}
	// Points are averaged by themselves.
	p1, p2 := results[0], results[1]
	x, y := 3.0, 5.0
	p1.Points = []analyze.Point{{Label: "1 kHz", Value: &x}}
	p2.Points = []analyze.Point{{Label: "1 kHz", Value: &y}}
	near(t, "point", Repeat(names[:2], []analyze.Result{p1, p2}).Points[0].Value, 4, 1e-12)
}

func TestAgainst(t *testing.T) {
	names := [2]string{"after", "before"}
	// 2 V against 1 V: +6.02 dB; the calibration cancels, the scatter stays.
	r := Against("level", names, taken(2, shared(0.02), a(0.006, 0)), taken(1, shared(0.01), a(0.004, 0)))
	near(t, "quotient", r.Value, 2, 1e-12)
	u, _ := budget.Combine(r.Budget)
	near(t, "u", &u, 2*math.Hypot(0.003, 0.004), 1e-12)
	if r.Unit.Symbol != "dB" || len(r.Budget) != 2 || r.FullScaleSine != 0 {
		t.Errorf("%+v", r)
	}
	c := &slip.Check{Measure: "level", Class: "major"}
	Row(c, r, Limits{Min: q("5.9 dB"), Max: q("6.2 dB")}, slip.Rule{}, 0)
	near(t, "dB", c.Value, 6.0206, 1e-4)
	if c.Verdict != p {
		t.Errorf("%s", c.Verdict)
	}
	// Powers: 10 lg of the quotient, half of the relative uncertainty each.
	watts := func(y, u float64) analyze.Result {
		r := taken(y, a(u, 0))
		r.Unit = unit.MustLookup("W")
		return r
	}
	c = &slip.Check{Class: "major"}
	Row(c, Against("power", names, watts(10, 0.1), watts(5, 0)), Limits{}, slip.Rule{}, 0)
	near(t, "power", c.Value, 3.0103, 1e-4)
	near(t, "its U", c.Uncertainty, 2*0.01*10/math.Ln10, 1e-9)
	// DC, frequencies, phases: plain differences, signed.
	r = Against("dc", names, taken(-0.2, shared(0.002)), taken(0.1, shared(0.001)))
	near(t, "dc", r.Value, -0.3, 1e-12)
	near(t, "u of dc", &r.Budget[0].U, 0.001, 1e-12)
	if r.Unit.Symbol != "V" {
		t.Errorf("unit %s", r.Unit)
	}
	deg := func(x float64) analyze.Result { return analyze.Result{Unit: unit.MustLookup("deg"), Value: &x} }
	near(t, "phase", Against("phase", names, deg(-170), deg(170)).Value, 20, 1e-9)
	near(t, "phase", Against("phase", names, deg(90), deg(-90)).Value, 180, 1e-9)
	near(t, "phase", Against("phase", names, deg(-90), deg(90)).Value, 180, 1e-9)
	// What only one side lacks is lacking; what both lack cancels.
	x, y := taken(2), taken(1)
	x.Lacking, y.Lacking = []string{"gear.box.uncertainty"}, []string{"gear.box.uncertainty", "takes.b.in_uncertainty"}
	if r := Against("level", names, x, y); !reflect.DeepEqual(r.Lacking, []string{"takes.b.in_uncertainty"}) {
		t.Errorf("lacking %v", r.Lacking)
	}
	if r := Against("level", names, taken(0), taken(1)); r.Refusal == nil || r.Refusal.Code != analyze.NotApplicable {
		t.Errorf("zero in dB: %+v", r)
	}
}

// A bound on either side bounds the quotient.
func TestAgainstBound(t *testing.T) {
	names := [2]string{"after", "before"}
	bound := func(upper bool, x float64) analyze.Result {
		r := analyze.Refuse(unit.MustLookup("V"), analyze.BelowDetection, "none", "")
		r.Bound = &analyze.Bound{Upper: upper, Value: x}
		return r
	}
	value := taken(2, a(0.5, 0)) // 1..3 at twice u
	for _, c := range []struct {
		name  string
		a, b  analyze.Result
		upper bool
		want  float64
	}{
		{"below over value", bound(true, 0.1), value, true, 0.1},
		{"above over value", bound(false, 6), value, false, 2},
		{"value over below", value, bound(true, 0.1), false, 10},
		{"value over above", value, bound(false, 6), true, 0.5},
	} {
		r := Against("level", names, c.a, c.b)
		if r.Value != nil || r.Refusal == nil || r.Bound == nil || r.Bound.Upper != c.upper {
			t.Errorf("%s: %+v", c.name, r)
			continue
		}
		near(t, c.name, &r.Bound.Value, c.want, 1e-12)
	}
	if r := Against("level", names, bound(true, 1), bound(true, 1)); r.Bound != nil || r.Refusal == nil {
		t.Errorf("two bounds: %+v", r.Bound)
	}
	// A plain difference: corner below 20 Hz against 30 +- 1 Hz (twice u).
	hz := taken(30, a(0.5, 0))
	hz.Unit = unit.MustLookup("Hz")
	b := bound(true, 20)
	b.Unit = hz.Unit
	r := Against("corner_low", names, b, hz)
	if r.Bound == nil || !r.Bound.Upper {
		t.Fatalf("%+v", r)
	}
	near(t, "corner", &r.Bound.Value, -9, 1e-12)
	r = Against("corner_low", names, hz, b)
	near(t, "corner turned round", &r.Bound.Value, 9, 1e-12)
}

func TestOffNominal(t *testing.T) {
	row := func(y, U float64, lim Limits) (float64, float64, bool) {
		c := &slip.Check{Measure: "gain", Class: "major"}
		Row(c, inDB(y, U), lim, slip.Rule{}, 0)
		return OffNominal(c, lim)
	}
	lim := Limits{Min: q("39.5 dB"), Max: q("40.5 dB"), Nominal: q("40 dB")}
	if d, u, ok := row(33.98, 0.06, lim); !ok || math.Abs(d+6.02) > 1e-9 || math.Abs(u-0.06) > 1e-9 {
		t.Errorf("half: %g %g %v", d, u, ok)
	}
	if _, _, ok := row(40.03, 0.06, lim); ok {
		t.Error("within its uncertainty of nominal")
	}
	if d, _, ok := row(40.3, 0.06, Limits{Min: q("39.5 dB"), Max: q("40.5 dB")}); !ok || math.Abs(d-0.3) > 1e-9 {
		t.Errorf("against the middle: %g %v", d, ok)
	}
	if d, _, ok := row(20, 0.06, Limits{Typical: q("10 x")}); ok || d != 0 {
		t.Errorf("on its typical value: %g %v", d, ok)
	}
	if _, _, ok := row(20, 0.06, Limits{Max: q("10 dB")}); ok {
		t.Error("one limit names no expected value")
	}
	c := &slip.Check{Class: "major"}
	Row(c, taken(-0.3), Limits{Max: q("-1 V"), Nominal: q("-2 V")}, slip.Rule{}, 0)
	if _, _, ok := OffNominal(c, Limits{Nominal: q("-2 V")}); ok {
		t.Error("signed volts in dB")
	}
	// A linear unit: 1 % of U is 0.087 dB.
	c = &slip.Check{Class: "major"}
	Row(c, taken(2, shared(0.01)), Limits{Max: q("1 V"), Nominal: q("1 V")}, slip.Rule{}, 0)
	if d, u, ok := OffNominal(c, Limits{Nominal: q("1 V")}); !ok || math.Abs(d-6.0206) > 1e-4 || math.Abs(u-0.0868589) > 1e-6 {
		t.Errorf("volts: %g %g %v", d, u, ok)
	}
}
