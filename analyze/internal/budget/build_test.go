package budget

import (
	"math"
	"reflect"
	"testing"

	"benchslip/analyze"
	"benchslip/capture/recording"
	"benchslip/capture/unit"
)

// file is a recording without samples.
type file struct{ info recording.Info }

func (f *file) Info() *recording.Info                  { return &f.info }
func (f *file) ReadAt([][]float64, int64) (int, error) { return 0, nil }
func (f *file) Close() error                           { return nil }

func take(name string, g *analyze.Gear) *analyze.Take {
	kind, u := recording.Audio, "FS"
	if g == nil || g.Kind == recording.Scope {
		kind, u = recording.Scope, "V"
	}
	ch := recording.Channel{Unit: u, Step: 0.5}
	return &analyze.Take{Name: name, Gear: g, Rec: &file{recording.Info{Kind: kind, RateHz: 1000, Frames: 10,
		Channels: []recording.Channel{ch, ch, ch}}}}
}

func rel(x float64) *float64 { return &x }

func box(u *float64) *analyze.Gear {
	return &analyze.Gear{Name: "box", Kind: recording.Audio, FullScalePeak: 2, ScaleU: u, ChannelMatch: 0.001, Clock: 5e-5, OffsetU: 1e-3}
}

func sig(t *analyze.Take, plus, minus int) *analyze.Signal {
	return analyze.NewSignal(t, plus, minus, 0, 10, 1)
}

func TestCalibration(t *testing.T) {
	known, unknown := box(rel(0.01)), box(nil)
	two := box(rel(0.01))
	apart := *two
	apart.OwnScale, apart.ScaleU = true, rel(0.02)
	two.Channels = map[int]*analyze.Gear{2: &apart}
	scope := &analyze.Gear{Name: "scope", Kind: recording.Scope, Probe: 1, ScaleU: rel(0.03)}
	bare := box(rel(0.01))
	bare.FullScalePeak = 0
	a, b, c, d := take("a", known), take("b", unknown), take("c", two), take("s", scope)
	none := take("n", nil)

	for _, x := range []struct {
		name    string
		add     func(*Budget)
		want    float64
		lacking []string
	}{
		{"volts", func(b *Budget) { b.Scale(sig(a, 1, 0), 5) }, 0.05, nil},
		{"power: twice", func(b *Budget) { b.Scale(sig(a, 1, 0), 2*5) }, 0.1, nil},
		{"not stated", func(x *Budget) { x.Scale(sig(b, 1, 0), 5) }, 0, []string{"gear.box.uncertainty"}},
		{"no gear", func(x *Budget) { x.Scale(sig(none, 1, 0), 5) }, 0, []string{"takes.n.gear"}},
		{"full scale", func(x *Budget) { x.Scale(sig(take("f", bare), 1, 0), 5) }, 0, nil},
		{"own channel", func(b *Budget) { b.Scale(sig(c, 2, 0), 5) }, 0.1, nil},
		{"difference, one scale", func(b *Budget) { b.Scale(sig(a, 1, 2), 5) }, 5 * math.Hypot(0.01, 0.001/2), nil},
		{"difference, two scales", func(b *Budget) { b.Scale(sig(c, 1, 2), 5) }, 2.5 * math.Hypot(0.01, 0.02), nil},
		{"quotient, one channel", func(b *Budget) { b.Ratio(sig(a, 1, 0), sig(a, 1, 0), 5) }, 0, nil},
		{"quotient, two channels", func(b *Budget) { b.Ratio(sig(a, 1, 0), sig(a, 2, 0), 5) }, 0.005, nil},
		{"quotient, two takes of one gear", func(x *Budget) { x.Ratio(sig(a, 1, 0), sig(take("a2", known), 1, 0), 5) }, 0, nil},
		{"quotient, calibration unknown", func(x *Budget) { x.Ratio(sig(b, 1, 0), sig(b, 2, 0), 5) }, 0.005, nil},
		{"quotient, no gear", func(x *Budget) { x.Ratio(sig(none, 1, 0), sig(none, 2, 0), 5) }, 0, nil},
		{"quotient, own entry", func(b *Budget) { b.Ratio(sig(c, 1, 0), sig(c, 2, 0), 5) }, 5 * math.Hypot(0.01, 0.02), nil},
		{"quotient, two gears", func(x *Budget) { x.Ratio(sig(d, 1, 0), sig(a, 1, 0), 5) }, 5 * math.Hypot(0.03, 0.01), nil},
		{"quotient, one gear unknown", func(x *Budget) { x.Ratio(sig(d, 1, 0), sig(b, 1, 0), 5) }, 0.15, []string{"gear.box.uncertainty"}},
		// Channels 1 (half), 2 (half) against 3: m/sqrt 2 each.
		{"quotient of a difference", func(b *Budget) { b.Ratio(sig(a, 1, 2), sig(a, 3, 0), 5) }, 0.005 * math.Sqrt(0.75), nil},
		{"offset", func(b *Budget) { b.Offset(sig(a, 1, 0), 1) }, 1e-3, nil},
		{"offset of a difference", func(b *Budget) { b.Offset(sig(a, 1, 2), 1) }, 1e-3 * math.Sqrt2, nil},
		{"clock", func(b *Budget) { b.Clock(sig(a, 1, 0), 1000) }, 0.05, nil},
		{"converter step", func(b *Budget) { b.Quantisation(sig(a, 1, 0), 1) }, 2 * 0.5 / math.Sqrt(12), nil},
	} {
		var got Budget
		x.add(&got)
		if math.Abs(got.U()-x.want) > 1e-12 {
			t.Errorf("%s: u = %.9g, want %.9g: %+v", x.name, got.U(), x.want, got.Lines)
		}
		if !reflect.DeepEqual(got.Lacking, x.lacking) {
			t.Errorf("%s: lacking %v, want %v", x.name, got.Lacking, x.lacking)
		}
	}
}

// Results of two takes with one gear: the calibration cancels in a quotient
// and partly in a difference; what is a take's own adds.
func TestDifference(t *testing.T) {
	a, b := take("a", box(rel(0.01))), take("b", box(rel(0.01)))
	var x, y Budget
	x.Scale(sig(a, 1, 0), 3)
	x.A("scatter", 0.03, 9)
	y.Scale(sig(b, 1, 0), 2)
	y.A("scatter", 0.04, 0)
	plain := Difference(x.Lines, y.Lines, 1, 1)
	near(t, u(plain), math.Sqrt(0.01*0.01+0.03*0.03+0.04*0.04), 1e-12, "3 V - 2 V", 0)
	quotient := Difference(x.Lines, y.Lines, 1./2, 3./4)
	near(t, u(quotient), math.Hypot(0.015, 0.03), 1e-12, "3 V / 2 V", 0)
	if len(quotient) != 2 || quotient[1].Name != "scatter (other take)" || quotient[0].Dof != 9 {
		t.Errorf("lines of the quotient: %+v", quotient)
	}
	// Channels the other way round: the match counts twice, it does not cancel.
	var p, q Budget
	p.Ratio(sig(a, 1, 0), sig(a, 2, 0), 1)
	q.Ratio(sig(b, 2, 0), sig(b, 1, 0), 1)
	near(t, u(Difference(p.Lines, q.Lines, 1, 1)), 0.002, 1e-12, "swapped channels", 0)
	near(t, u(Difference(p.Lines, p.Lines, 1, 1)), 0, 0, "same channels", 0)
}

// One Source within a budget is one error: it adds as it stands.
func TestSharedAdds(t *testing.T) {
	var b Budget
	b.Shared("calibration", "gear box scale", 3)
	b.Shared("calibration", "gear box scale", 1)
	b.Shared("calibration", "gear box scale", -8)
	b.B("other", 3)
	near(t, b.U(), 5, 1e-12, "hypot(3+1-8, 3)", 0)
	for _, scale := range []float64{1e-160, 1e160} { // squares leave float64
		near(t, u(own(3*scale, 4*scale)), 5*scale, 1e-12, "scaled by", scale)
	}
	if x, n := Combine(nil); x != 0 || !math.IsInf(n, 1) {
		t.Errorf("nothing: %g, %g", x, n)
	}
}

func TestStatedUncertainty(t *testing.T) {
	for _, c := range []struct {
		value, u string
		want     float64 // standard, linear
	}{
		{"40 dB", "0.1 dB", 100 * 0.1 / 8.6858896 / 2},
		{"40 dB", "1 %", 0.5},
		{"100 x", "1 %", 0.5},
		{"100 x", "2 x", 1},
		{"2 %", "0.1 %", 0.0005},
		{"0.02 %", "10 ppm", 5e-6},
		{"8 ohm", "1 %", 0.04},
		{"8 ohm", "100 mohm", 0.05},
		{"-20 dBu", "0.2 dB", 0.07745967 * 0.2 / 8.6858896 / 2},
		{"-20 dBu", "1 mV", 0.0005},
		{"10 W", "0.2 dB", 10 * 0.2 / 4.3429448 / 2},
		{"14.98 V", "0.02 V", 0.01},
		{"20 degC", "1 K", 0.5},
		{"20 degC", "1 degC", 0.5},
		{"-3 V", "1 %", 0.015},
	} {
		v, _ := unit.Parse(c.value)
		e, err := unit.Parse(c.u)
		if err != nil {
			t.Fatal(err)
		}
		near(t, Standard(v, e), c.want, 1e-7, c.value+" +- "+c.u, 0)
	}
	ohm := unit.New(8, "ohm")
	e := unit.New(1, "%")
	var b Budget
	b.Stated("load", &analyze.Stated{Value: ohm, Uncertainty: &e, Key: "load"}, -10)
	b.Stated("length", &analyze.Stated{Value: ohm, Key: "length"}, 10)
	b.Stated("none", nil, 10)
	level := unit.New(-40, "dBu")
	w := analyze.Wiring{InLevel: &level}
	b.InLevel(take("tone", nil), w, 10)
	w.InUncertainty = &e
	b.InLevel(take("tone", nil), w, 10)
	if len(b.Lines) != 2 || b.Lines[0].U != 0.05 || b.Lines[0].Sign != -1 || b.Lines[1].U != 0.05 ||
		!reflect.DeepEqual(b.Unstated, []string{"length"}) || !reflect.DeepEqual(b.Lacking, []string{"takes.tone.in_uncertainty"}) {
		t.Errorf("%+v", b)
	}
	var r analyze.Result
	b.Into(&r)
	b.Into(&r)
	if len(r.Budget) != 4 || len(r.Lacking) != 1 || len(r.Unstated) != 1 {
		t.Errorf("%+v", r)
	}
}
