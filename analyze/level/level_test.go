package level

import (
	"math"
	"testing"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
	"benchslip/analyze/internal/trial"
	"benchslip/capture/unit"
)

// Closed forms: crest factor of a sine sqrt 2, of a triangle sqrt 3, of a
// square wave 1; RMS of a sine A/sqrt 2 (IEC 60268-1, crest factor, from
// memory; elementary algebra).
func TestCrestOfShapes(t *testing.T) {
	shapes := map[string]struct {
		of   func(turn float64) float64
		want float64
	}{
		"sine":     {func(x float64) float64 { return math.Sin(2 * math.Pi * x) }, math.Sqrt2},
		"triangle": {func(x float64) float64 { return 4*math.Abs(x-math.Floor(x+0.5)) - 1 }, math.Sqrt(3)},
		"square":   {func(x float64) float64 { return math.Copysign(1, math.Sin(2*math.Pi*x+0.1)) }, 1},
	}
	for name, s := range shapes {
		sig := trial.New(96000, 2).DC(0.1)
		for i := range sig.X {
			sig.X[i] += 0.5 * s.of(100.37*float64(i)/sig.Rate)
		}
		r := trial.Run(crest, analyze.Params{}, trial.Take("t", sig))
		if r.Value == nil || math.Abs(*r.Value/s.want-1) > 2e-3 {
			t.Errorf("%s: crest %v, want %.4f", name, r.Value, s.want)
		}
	}
}

// Level is the root of the summed powers in the band: tone, its harmonic,
// hum and white noise; a line on the band's upper edge counts, one past it
// does not.
func TestLevelAddsPowers(t *testing.T) {
	const sigma = 2e-3
	s := trial.New(48000, 6).Tone(1042.3, 0.3, 1).Tone(2084.6, 0.01, 0).Mains(50.02, 0.01, []float64{4e-3, 0, 2e-3}, 3).Noise(sigma, 4).DC(0.2)
	noise := func(lo, hi float64) float64 { return sigma * sigma * (hi - lo) / 24000 }
	on := trial.On(trial.Take("t", s))
	for _, c := range []struct {
		name string
		band *analyze.Band
		want float64
	}{
		{"20 Hz to 20 kHz", nil, 0.09/2 + 5e-5 + 16e-6 + 4e-6 + noise(20, 20000)},
		{"from 100 Hz", &analyze.Band{Low: 100, High: 20000}, 0.09/2 + 5e-5 + 4e-6 + noise(100, 20000)},
		{"the harmonic on the edge", &analyze.Band{Low: 500, High: 2084}, 0.09/2 + 5e-5 + noise(500, 2084)},
		{"the harmonic past the edge", &analyze.Band{Low: 500, High: 2080}, 0.09/2 + noise(500, 2080)},
		{"hum alone", &analyze.Band{Low: 40, High: 200}, 20e-6 + noise(40, 200)},
	} {
		r := on.Run(level, analyze.Params{Band: c.band})
		if r.Value == nil {
			t.Errorf("%s: %v", c.name, r.Refusal)
			continue
		}
		u, _ := budget.Combine(r.Budget)
		want := math.Sqrt(c.want)
		if off := math.Abs(*r.Value - want); off > 3*u+1e-9 || 2*u > 0.05*want {
			t.Errorf("%s: %.9g, want %.9g, u %.2g", c.name, *r.Value, want, u)
		}
	}
	if r := on.Run(level, analyze.Params{Band: &analyze.Band{Low: 20, High: 30000}}); r.Refusal == nil || r.Refusal.Code != analyze.Bandwidth {
		t.Errorf("a band past half the rate: %+v", r)
	}
}

// DC is the constant of the joint fit, whatever part of a period the take
// ends on; an AC-coupled input refuses it.
func TestDC(t *testing.T) {
	s := trial.New(10000, 0.0137).Tone(331, 1.2, 0.4).Tone(662, 0.05, 1).DC(0.25)
	take := trial.Take("t", s)
	r := trial.Run(dc, analyze.Params{}, take)
	if r.Value == nil || math.Abs(*r.Value-0.25) > 1e-9 {
		t.Errorf("DC %v, want 0.25", r.Value)
	}
	take.Gear.DC = false
	if r := trial.Run(dc, analyze.Params{}, take); r.Refusal == nil || r.Refusal.Code != analyze.ACCoupled {
		t.Errorf("an AC-coupled input gave %+v", r)
	}
}

func TestPeak(t *testing.T) {
	s := trial.New(48000, 0.1).DC(-0.2)
	s.X[777], s.X[778] = -0.9, 0.6
	r := trial.Run(peak, analyze.Params{}, trial.Take("t", s))
	if r.Value == nil || *r.Value != 0.9 || r.Details["min_v"] != -0.9 || r.Details["max_v"] != 0.6 || math.Abs(r.Details["pp_v"].(float64)-1.5) > 1e-12 {
		t.Errorf("peak %v, details %v", r.Value, r.Details)
	}
	rails := analyze.Params{Rails: &analyze.Stated{Value: unit.New(0.8, "V"), Key: "rails"}}
	if r := trial.Run(peak, rails, trial.Take("t", s)); r.Refusal == nil || r.Refusal.Code != analyze.Impossible {
		t.Errorf("past the rails: %+v", r)
	}
}

func TestNothingThere(t *testing.T) {
	for _, m := range []*analyze.Measure{level, crest} {
		if r := trial.Run(m, analyze.Params{}, trial.Take("t", trial.New(48000, 1))); r.Refusal == nil || r.Refusal.Code != analyze.NoSignal {
			t.Errorf("%s of silence: %+v", m.Name, r)
		}
	}
}

// A reading by hand comes through as typed, its uncertainty half of the
// expanded one.
func TestEntered(t *testing.T) {
	q, u := unit.New(14.98, "V"), unit.New(0.02, "V")
	r := entered.Run(trial.Pass(entered, analyze.Params{Value: &q, Uncertainty: &u}, nil))
	got, _ := budget.Combine(r.Budget)
	if r.Value == nil || math.Abs(*r.Value-14.98) > 1e-12 || math.Abs(got-0.01) > 1e-12 {
		t.Errorf("value %v, u %v", r.Value, got)
	}
}
