package impedance

import (
	"math"
	"math/cmplx"
	"testing"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
	"benchslip/analyze/internal/trial"
	"benchslip/capture/unit"
)

func stated(t testing.TB, value, uncertainty, key string) *analyze.Stated {
	t.Helper()
	v, err := unit.Parse(value)
	if err != nil {
		t.Fatal(err)
	}
	s := &analyze.Stated{Value: v, Key: key}
	if uncertainty != "" {
		u, err := unit.Parse(uncertainty)
		if err != nil {
			t.Fatal(err)
		}
		s.Uncertainty = &u
	}
	return s
}

const hz = 1042.0

// take holds the phasor z (peak) at the output, and the generator in the
// second channel when in is not 0.
func take(name string, z, in complex128, noise float64, seed uint64) *analyze.Take {
	out := trial.New(48000, 2).Tone(hz, cmplx.Abs(z), cmplx.Phase(z)).Noise(noise, seed)
	if in == 0 {
		return trial.Take(name, out)
	}
	t := trial.Take(name, out, trial.New(48000, 2).Tone(hz, cmplx.Abs(in), cmplx.Phase(in)).Noise(noise, seed+1000))
	t.Wiring.In = "2"
	return t
}

func run(m *analyze.Measure, p analyze.Params, a, b *analyze.Take) analyze.Result {
	return trial.Between(map[string]*analyze.Take{m.Roles[0]: a, m.Roles[1]: b}).Run(m, p)
}

func expanded(r analyze.Result) float64 {
	U, _, _, _ := budget.Expand(r.Budget, 2)
	return U
}

// 2.000 V open and 1.920 V on 600 ohm are 25 ohm ((U_open/U_loaded - 1) R);
// 0.08 ohm on 8 ohm is a damping factor of 100 (R/R_out). The takes hold a
// quarter of the volts.
func TestOutputWorkedExamples(t *testing.T) {
	p := analyze.Params{Load: stated(t, "600 ohm", "1 %", "load")}
	r := run(outputImpedance, p, take("a", 0.5, 0, 1e-6, 1), take("b", 0.48, 0, 1e-6, 2))
	if r.Value == nil || math.Abs(*r.Value-25) > 0.02 {
		t.Fatalf("%+v", r)
	}
	// Half a percent of the load (k = 1) is half a percent of the value.
	if u := expanded(r) / 2; math.Abs(u-0.125) > 0.01 {
		t.Errorf("u %g", u)
	}
	p = analyze.Params{Load: stated(t, "8 ohm", "", "load")}
	r = run(outputImpedance, p, take("a", 0.5, 0, 1e-6, 1), take("b", 0.5/1.01, 0, 1e-6, 2))
	if math.Abs(*r.Value-0.08) > 1e-4 || math.Abs(r.Details["damping_factor"].(float64)-100) > 0.1 {
		t.Errorf("%g ohm, %v", *r.Value, r.Details["damping_factor"])
	}
	if len(r.Unstated) != 1 || r.Unstated[0] != "load" {
		t.Errorf("unstated %v", r.Unstated)
	}
	// The same step in terms of two gains: the generator drifts by 3 % and turns.
	p = analyze.Params{Load: stated(t, "600 ohm", "", "load")}
	r = run(outputImpedance, p, take("a", 0.5, 0.1, 1e-6, 1), take("b", 0.48*cmplx.Rect(1.03, 0.7), cmplx.Rect(0.103, 0.7), 1e-6, 2))
	if math.Abs(*r.Value-25) > 0.05 || r.Details["phases_known"] != true {
		t.Errorf("with a drifting generator: %g ohm", *r.Value)
	}
}

// A reactive output: 47 ohm in series with 10 uF, by voltage division; what
// the levels alone show is less.
func TestOutputComplex(t *testing.T) {
	z := complex(47, -1/(2*math.Pi*hz*10e-6))
	loaded := 0.5 * 600 / (600 + z)
	p := analyze.Params{Load: stated(t, "600 ohm", "", "load")}
	r := run(outputImpedance, p, take("a", 0.5, 0.1, 1e-6, 1), take("b", loaded, 0.1, 1e-6, 2))
	if math.Abs(*r.Value-cmplx.Abs(z)) > 0.02 || math.Abs(r.Details["resistance_ohm"].(float64)-47) > 0.02 ||
		math.Abs(r.Details["series_capacitance_f"].(float64)/10e-6-1) > 0.01 {
		t.Errorf("%g ohm %v", *r.Value, r.Details)
	}
	r = run(outputImpedance, p, take("a", 0.5, 0, 1e-6, 1), take("b", loaded, 0, 1e-6, 2))
	if want := 600 * (1/cmplx.Abs(600/(600+z)) - 1); math.Abs(*r.Value-want) > 0.02 || len(r.Notes) < 2 {
		t.Errorf("by levels %g ohm, want %g; %v", *r.Value, want, r.Notes)
	}
}

// A step of 0.0087 dB in noise: the value is unbiased, and its uncertainty
// covers its scatter.
func TestSmallStep(t *testing.T) {
	p := analyze.Params{Load: stated(t, "1 kohm", "", "load")}
	for _, in := range []complex128{0, 0.1} {
		sum, inside, chi := 0.0, 0.0, 0.0
		const runs = 30
		for seed := uint64(0); seed < runs; seed++ {
			r := run(outputImpedance, p, take("a", 0.5, in, 1e-3, 4*seed+1), take("b", 0.5/1.001, in, 1e-3, 4*seed+3))
			v := 0.0
			if r.Value != nil {
				v = *r.Value
			} else if r.Bound.Value > 1 {
				inside++
				continue
			}
			sum += v
			u := expanded(r) / 2
			if math.Abs(v-1) <= 2*u {
				inside++
			}
			chi += (v - 1) * (v - 1) / (u * u)
		}
		if inside < runs*80/100 {
			t.Errorf("in %v: %g of %d inside, chi-square %.2f", in, inside, runs, chi/runs)
		}
	}
}

// No step at all gives an upper bound for an output and a lower one for an
// input, and a rising level is called impossible.
func TestNoStep(t *testing.T) {
	for _, in := range []complex128{0, 0.1} {
		a, b := take("a", 0.5, in, 1e-3, 1), take("b", 0.5, in, 1e-3, 3)
		r := run(outputImpedance, analyze.Params{Load: stated(t, "600 ohm", "", "load")}, a, b)
		if r.Refusal == nil || r.Refusal.Code != analyze.BelowDetection || r.Bound == nil || !r.Bound.Upper || r.Bound.Value > 1 || r.Bound.Value <= 0 {
			t.Errorf("output: %+v %+v", r.Refusal, r.Bound)
		}
		r = run(inputImpedance, analyze.Params{Series: stated(t, "10 kohm", "", "series")}, a, b)
		if r.Refusal == nil || r.Refusal.Code != analyze.BelowDetection || r.Bound == nil || r.Bound.Upper || r.Bound.Value < 1e6 {
			t.Errorf("input: %+v %+v", r.Refusal, r.Bound)
		}
	}
	r := run(outputImpedance, analyze.Params{Load: stated(t, "600 ohm", "", "load")}, take("a", 0.4, 0, 1e-5, 1), take("b", 0.5, 0, 1e-5, 2))
	if r.Refusal == nil || r.Refusal.Code != analyze.Impossible || r.Bound != nil {
		t.Errorf("exchanged takes: %+v", r)
	}
}

// An input of 10 kohm beside 220 pF behind 150 ohm of source, by voltage
// division: series/(U_direct/U_series - 1) - source.
func TestInput(t *testing.T) {
	z := 1 / complex(1.0/10000, 2*math.Pi*hz*2.2e-9)
	const series, source = 4700.0, 150.0
	level := func(r float64) complex128 { return 0.5 * z / (z + complex(r, 0)) }
	p := analyze.Params{Series: stated(t, "4.7 kohm", "1 %", "series"), Source: stated(t, "150 ohm", "2 %", "source")}
	r := run(inputImpedance, p, take("a", level(source), 0.2, 1e-6, 1), take("b", level(source+series), 0.2, 1e-6, 2))
	if r.Value == nil || math.Abs(*r.Value/cmplx.Abs(z)-1) > 1e-3 {
		t.Fatalf("%+v", r)
	}
	d := r.Details
	if math.Abs(d["parallel_resistance_ohm"].(float64)/10000-1) > 1e-3 || math.Abs(d["parallel_capacitance_f"].(float64)/2.2e-9-1) > 2e-3 {
		t.Errorf("%v", d)
	}
	// u: half a percent of |Z + source|, and 1 % of the source.
	if u, want := expanded(r)/2, math.Hypot(0.005*cmplx.Abs(z+source), 1.5); math.Abs(u/want-1) > 0.05 {
		t.Errorf("u %g, want %g", u, want)
	}
	// Purely resistive, by levels alone, without source.
	r = run(inputImpedance, analyze.Params{Series: stated(t, "2.2 kohm", "", "series")},
		take("a", 0.5, 0, 1e-6, 1), take("b", complex(0.5*1500/(1500+2200), 0), 0, 1e-6, 2))
	if math.Abs(*r.Value/1500-1) > 1e-4 {
		t.Errorf("%g ohm", *r.Value)
	}
	// A source larger than what the step allows.
	r = run(inputImpedance, analyze.Params{Series: stated(t, "2.2 kohm", "", "series"), Source: stated(t, "2 kohm", "", "source")},
		take("a", 0.5, 0, 1e-6, 1), take("b", complex(0.5*1500/(1500+2200), 0), 0, 1e-6, 2))
	if r.Refusal == nil || r.Refusal.Code != analyze.Impossible {
		t.Errorf("%+v", r)
	}
}

// What does not belong together is refused.
func TestRefusals(t *testing.T) {
	p := analyze.Params{Load: stated(t, "600 ohm", "", "load")}
	a := take("a", 0.5, 0.1, 1e-6, 1)
	other := trial.Take("b", trial.New(48000, 2).Tone(1100, 0.5, 0))
	if r := run(outputImpedance, p, a, other); r.Refusal == nil || r.Refusal.Code != analyze.NoTone {
		t.Errorf("another tone: %+v", r.Refusal)
	}
	if r := run(outputImpedance, p, a, take("b", 0.48, 0, 1e-6, 2)); r.Refusal == nil || r.Refusal.Code != analyze.MissingTake {
		t.Errorf("one input known: %+v", r.Refusal)
	}
	if r := run(outputImpedance, analyze.Params{}, a, a); r.Refusal == nil {
		t.Error("no load")
	}
	g20, g40 := take("a", 0.5, 0, 1e-6, 1), take("b", 0.48, 0, 1e-6, 2)
	g20.Where, g40.Where = []analyze.Condition{{Key: "gain", Value: "20 dB"}}, []analyze.Condition{{Key: "gain", Value: "40 dB"}}
	if r := run(outputImpedance, p, g20, g40); r.Refusal == nil || r.Refusal.Code != analyze.NotApplicable {
		t.Errorf("two gains: %+v", r.Refusal)
	}
	// The gear's scale cancels between two takes of one recorder, whoever
	// calibrated it.
	a, b := take("a", 0.5, 0, 1e-6, 1), take("b", 0.48, 0, 1e-6, 2)
	a.Gear.ScaleU, b.Gear.ScaleU = nil, nil
	if r := run(outputImpedance, p, a, b); len(r.Lacking) > 0 {
		t.Errorf("lacking %v", r.Lacking)
	}
}
