package commonmode

import (
	"math"
	"math/cmplx"
	"strings"
	"testing"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
	"benchslip/analyze/internal/trial"
	"benchslip/capture/unit"
)

var (
	fiveTones  = []float64{47, 137, 1000, 10000, 20000}
	threeTones = []float64{47, 997, 20000}
)

// takes records a circuit at all tones together: differential drive of 0.05 V
// a tone between the pins, common drive of 0.15 V; flip inverts the output.
func takes(b bench, tones []float64, noise float64, flip float64) map[string]*analyze.Take {
	const rate, seconds = 48000.0, 1.5
	din, dout := trial.New(rate, seconds), trial.New(rate, seconds)
	cin, cout := trial.New(rate, seconds), trial.New(rate, seconds)
	for k, f := range tones {
		gd, gc, _ := b.gains(f)
		ph := 0.7 * float64(k)
		din.Tone(f, 0.05, ph)
		dout.Tone(f, flip*0.05*cmplx.Abs(gd), ph+cmplx.Phase(gd))
		cin.Tone(f, 0.15, ph+1)
		cout.Tone(f, flip*0.15*cmplx.Abs(gc), ph+1+cmplx.Phase(gc))
	}
	d := trial.Take("d", dout.Noise(noise, 1), din.Noise(noise/10, 2))
	c := trial.Take("c", cout.Noise(noise, 3), cin.Noise(noise/10, 4))
	d.Wiring.In, c.Wiring.In = "2", "2"
	return map[string]*analyze.Take{"differential": d, "common": c}
}

func measured(t *testing.T, roles map[string]*analyze.Take, p analyze.Params) analyze.Result {
	t.Helper()
	r := trial.Between(roles).Run(cmrr, p)
	if r.Value == nil {
		t.Fatalf("%+v %v", r.Refusal, r.Details["points"])
	}
	return r
}

func with(b bench, tones []float64) analyze.Params {
	return analyze.Params{At: tones, R1: &b.r1, R2: &b.r2, R3: &b.r3, R4: &b.r4}
}

// Every circuit at five tones together, 10 and 20 kHz whole multiples of 1
// kHz: each rejection within 0.1 dB of the node equations, 55 to 100 dB.
func TestFiveTones(t *testing.T) {
	for name, b := range map[string]bench{
		"100 dB":            four(10e3, 10e3, 10e3, 10e3*1.00002),
		"with capacitances": {r1: 2e3, r2: 20e3, r3: 2e3, r4: 19.99e3, c4: 22e-12},
	} {
		r := measured(t, takes(b, fiveTones, 1e-7, 1), analyze.Params{At: fiveTones})
		if len(r.Points) != 5 {
			t.Fatalf("%s: %d points", name, len(r.Points))
		}
		lowest := math.Inf(1)
		for i, f := range fiveTones {
			want := b.rejection(f)
			lowest = math.Min(lowest, want)
			U, _, _, _ := budget.Expand(r.Points[i].Budget, 2)
			got := dB.FromLinear(*r.Points[i].Value)
			if e := math.Abs(got - want); e > math.Max(0.1, 2*8.686*U / *r.Points[i].Value) {
				t.Errorf("%s at %g Hz: %.3f dB, want %.3f", name, f, got, want)
			}
		}
		if got := dB.FromLinear(*r.Value); math.Abs(got-lowest) > 0.1 {
			t.Errorf("%s: worst %.3f dB, want %.3f", name, got, lowest)
		}
	}
}

// The mismatch within 2 % of its value, with its sign, at gains of 1 and 10,
// also behind a stage that inverts; the trim nulls it in the node equations.
func TestMismatchAndTrim(t *testing.T) {
	for name, c := range map[string]struct {
		b    bench
		flip float64
		arm  string
	}{
		"R4 0.4 % high":           {four(10e3, 10e3, 10e3, 10.04e3), 1, "R2"},
		"R4 0.4 % low":            {four(10e3, 10e3, 10e3, 9.96e3), 1, "R4"},
		"R2 1 % high, gain 10":    {four(2e3, 20.2e3, 2e3, 20e3), 1, "R4"},
		"R3 0.02 % low, inverted": {four(10e3, 10e3, 9.998e3, 10e3), -1, "R2"},
	} {
		b := c.b
		e := b.r4/b.r3/(b.r2/b.r1) - 1
		r := measured(t, takes(b, []float64{997}, 1e-7, c.flip), with(b, nil))
		if got, _ := r.Details["mismatch"].(float64); math.Abs(got/e-1) > 0.02 {
			t.Errorf("%s: mismatch %v, want %.6f", name, r.Details["mismatch"], e)
		}
		d, _ := r.Details["trim"].(map[string]any)
		if d["arm"] != c.arm {
			t.Errorf("%s: %v, want arm %s", name, d, c.arm)
			continue
		}
		series, shunt := d["series_ohm"].(float64), d["shunt_ohm"].(float64)
		inSeries, across := b, b
		if c.arm == "R2" {
			inSeries.r2 += series
			across.r4 = 1 / (1/b.r4 + 1/shunt)
		} else {
			inSeries.r4 += series
			across.r2 = 1 / (1/b.r2 + 1/shunt)
		}
		expect := d["expected_db"].(float64)
		for way, after := range map[string]bench{"in series": inSeries, "across": across} {
			if got := after.rejection(997); got < expect || got < b.rejection(997)+20 {
				t.Errorf("%s, %s: %.1f dB after the trim, %.1f expected, %.1f before", name, way, got, expect, b.rejection(997))
			}
		}
		if text := strings.Join(r.Opinions, "\n"); !strings.Contains(text, "resistor ratios") || !strings.Contains(text, "trim:") {
			t.Errorf("%s: %v", name, r.Opinions)
		}
	}
}

// Capacitances are told by their course, by side and size; what the advice
// adds balances them.
func TestCapacitance(t *testing.T) {
	source := &analyze.Stated{Key: "source", Value: unit.New(150, "ohm")}
	b := bench{r1: 10e3, r2: 10e3, r3: 10e3, r4: 10.002e3}
	for name, c := range map[string]struct {
		set  func(*bench)
		key  string
		want string
		add  func(*bench, float64)
	}{
		"47 pF across R4": {func(b *bench) { b.c4 = 47e-12 }, "across_f", "R2", func(b *bench, c float64) { b.c2 += c }},
		"47 pF across R2": {func(b *bench) { b.c2 = 47e-12 }, "across_f", "R4", func(b *bench, c float64) { b.c4 += c }},
		"1 nF from pin 2": {func(b *bench) { b.pinHot = 1e-9 }, "pin_f", "pin 3", func(b *bench, c float64) { b.pinCold += c }},
		"1 nF from pin 3": {func(b *bench) { b.pinCold = 1e-9 }, "pin_f", "pin 2", func(b *bench, c float64) { b.pinHot += c }},
	} {
		x := b
		x.rsHot, x.rsCold = 75, 75
		c.set(&x)
		p := with(x, threeTones)
		p.Source = source
		r := measured(t, takes(x, threeTones, 1e-7, 1), p)
		d, _ := r.Details["capacitance"].(map[string]any)
		f, _ := d[c.key].(float64)
		if f == 0 || d["across"] != c.want && d["pin"] != c.want {
			t.Errorf("%s: %v", name, r.Details["capacitance"])
			continue
		}
		after := x
		c.add(&after, f)
		if gain := after.rejection(20000) - x.rejection(20000); gain < 15 {
			t.Errorf("%s: %.3g F bring %.1f dB at 20 kHz", name, f, gain)
		}
		if !strings.Contains(strings.Join(r.Opinions, "\n"), "rises with frequency") {
			t.Errorf("%s: %v", name, r.Opinions)
		}
	}
	// Coupling capacitors of 47 uF, 20 % apart, into 10 kohm: 57 dB at 50 Hz
	// (first order: 2 pi 50 R C / 0.2).
	ten := bench{r1: 5e3, r2: 5e3, r3: 5e3, r4: 5e3, seriesHot: 47e-6 * 1.1, seriesCld: 47e-6 * 0.9}
	if got := ten.rejection(50); math.Abs(got-57.4) > 0.3 {
		t.Errorf("20 %% of 47 uF into 10 kohm: %.1f dB at 50 Hz", got)
	}
	y := bench{r1: 5e3, r2: 5e3, r3: 5e3, r4: 5e3, seriesHot: 47e-6, seriesCld: 47e-6 * 0.8}
	for side, z := range map[string]bench{"pin 3": y, "pin 2": {r1: 5e3, r2: 5e3, r3: 5e3, r4: 5e3, seriesHot: 47e-6 * 0.8, seriesCld: 47e-6}} {
		r := measured(t, takes(z, threeTones, 1e-7, 1), with(z, threeTones))
		d, _ := r.Details["coupling"].(map[string]any)
		// 20 % apart as the twice as large capacitors 10 % apart would be.
		c, _ := d["capacitor_f_at_10_percent"].(float64)
		if d["smaller_side"] != side || math.Abs(c/(47e-6*0.8/2)-1) > 0.15 {
			t.Errorf("smaller at %s: %v", side, r.Details["coupling"])
		}
		if !strings.Contains(strings.Join(r.Opinions, "\n"), "falls with frequency") {
			t.Errorf("%v", r.Opinions)
		}
	}
}

// The advice stops at the uncertainty and at the fixture's own limit, and
// where the stage does not hold all the gain.
func TestNoTrim(t *testing.T) {
	match := 0.01
	for name, c := range map[string]struct {
		b     bench
		noise float64
		edit  func(*analyze.Params)
		want  string
	}{
		"within the uncertainty": {four(10e3, 10e3, 10e3, 10e3*1.00001), 2e-4, nil, "within its uncertainty"},
		"the fixture": {four(10e3, 10e3, 10e3, 10e3*1.00005), 1e-7, func(p *analyze.Params) {
			p.Source, p.SourceMatch = &analyze.Stated{Value: unit.New(150, "ohm")}, &match
		}, "fixture's resistors"},
		"gain elsewhere": {four(10e3, 100e3, 10e3, 101e3), 1e-7, func(p *analyze.Params) { r := 10e3; p.R2, p.R4 = &r, &r }, "does not hold all the gain"},
	} {
		p := with(c.b, nil)
		if c.edit != nil {
			c.edit(&p)
		}
		r := trial.Between(takes(c.b, []float64{997}, c.noise, 1)).Run(cmrr, p)
		text := strings.Join(r.Opinions, "\n")
		if r.Value == nil { // below detection gives no advice either
			if r.Bound == nil || name != "within the uncertainty" {
				t.Errorf("%s: %+v", name, r.Refusal)
			}
			continue
		}
		if !strings.Contains(text, c.want) || strings.Contains(text, "trim: ") && !strings.Contains(text, "no trim") {
			t.Errorf("%s: %s", name, text)
		}
	}
	// Two resistors of 75 ohm matched to 1 % stop at 68.5 dB with 4 kohm a leg.
	p := analyze.Params{Source: &analyze.Stated{Value: unit.New(150, "ohm")}, SourceMatch: &match}
	if l, ok := fixtureLimit(&p); !ok || math.Abs(dB.FromLinear(l)-68.52) > 0.01 {
		t.Errorf("fixture limit %.3f dB", dB.FromLinear(l))
	}
}

// Both legs of a balanced output, recorded apart and subtracted: the gains are
// those of the difference, and what both legs carry alike drops out.
func TestBothLegs(t *testing.T) {
	const rate, seconds, hz = 48000.0, 1.5, 997.3
	build := func(name string, in, out float64) *analyze.Take {
		up := trial.New(rate, seconds).Tone(hz, out/2, 0).Tone(350, 0.02, 1).Noise(1e-7, 1)
		down := trial.New(rate, seconds).Tone(hz, -out/2, 0).Tone(350, 0.02, 1).Noise(1e-7, 2)
		tk := trial.Take(name, up, down, trial.New(rate, seconds).Tone(hz, in, 0).Noise(1e-8, 3))
		tk.Wiring.Out, tk.Wiring.In = "1-2", "3"
		return tk
	}
	// 1 V in 10 V out and 1 V in 1.5 mV out are 76.4782 dB; levels scaled down.
	roles := map[string]*analyze.Take{"differential": build("d", 0.05, 0.5), "common": build("c", 0.5, 0.5*1.5e-3)}
	r := measured(t, roles, analyze.Params{})
	if got := dB.FromLinear(*r.Value); math.Abs(got-76.4781748) > 0.01 {
		t.Errorf("%.4f dB", got)
	}
	if g := r.Details["points"].([]map[string]any)[0]["differential_gain_db"].(float64); math.Abs(g-20) > 1e-3 {
		t.Errorf("differential gain %.4f dB", g)
	}
}

// Without phases there are no parts and no advice; what is not seen gives a
// lower bound.
func TestWithoutPhases(t *testing.T) {
	b := four(10e3, 10e3, 10e3, 10.04e3)
	roles := takes(b, []float64{997}, 1e-6, 1)
	for _, r := range []struct {
		role  string
		level float64
	}{{"differential", 0.05}, {"common", 0.15}} {
		tk := roles[r.role]
		q, u := unit.New(r.level/math.Sqrt2, "V"), unit.New(1, "%")
		tk.Wiring.In, tk.Wiring.InLevel, tk.Wiring.InUncertainty = "", &q, &u
	}
	r := measured(t, roles, with(b, nil))
	if got := dB.FromLinear(*r.Value); math.Abs(got-b.rejection(997)) > 0.02 {
		t.Errorf("%.3f dB", got)
	}
	if r.Details["mismatch"] != nil || r.Details["parts"] != nil || r.Details["trim"] != nil || len(r.Opinions) > 0 {
		t.Errorf("%v %v", r.Details, r.Opinions)
	}
	silent := takes(four(10e3, 10e3, 10e3, 10e3), []float64{997}, 1e-5, 1)
	q := trial.Between(silent).Run(cmrr, analyze.Params{})
	if q.Value != nil || q.Bound == nil || q.Bound.Upper || dB.FromLinear(q.Bound.Value) < 100 {
		t.Errorf("%v %+v %+v", q.Value, q.Refusal, q.Bound)
	}
}
