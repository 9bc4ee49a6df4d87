package limits

import (
	"math"
	"testing"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
	"benchslip/analyze/internal/trial"
	"benchslip/capture/recording"
)

// blocked passes a signal through a one-pole high-pass, as a recorder's
// coupling capacitor does.
func blocked(s *trial.Signal, hz float64) *trial.Signal {
	k := math.Exp(-2 * math.Pi * hz / s.Rate)
	mean := 0.0
	for _, x := range s.X[:int(s.Rate/4)] {
		mean += x / math.Floor(s.Rate/4)
	}
	for i, x := range s.X { // settled at the wave's own mean
		mean = k*mean + (1-k)*x
		s.X[i] = x - mean
	}
	return s
}

func TestClipSymmetry(t *testing.T) {
	shape := func(rate, seconds, hz, amp, up, down float64) *trial.Signal {
		s := trial.New(rate, seconds).Tone(hz, amp, 0.7)
		for i, x := range s.X {
			s.X[i] = math.Max(-down, math.Min(up, x))
		}
		return s
	}
	for _, c := range []struct {
		name     string
		take     *analyze.Take
		up, down float64
		within   float64 // %
	}{
		{"even", trial.Take("t", shape(48000, 1, 997.3, 0.6, 0.5, 0.5).Noise(1e-4, 1)), 0.5, 0.5, 0.02},
		{"negative half first", trial.Take("t", shape(48000, 1, 997.3, 0.6, 0.5, 0.45).Noise(1e-4, 1)), 0.5, 0.45, 0.02},
		{"positive half first, with DC", trial.Take("t", shape(48000, 1, 997.3, 0.6, 0.4, 0.5).DC(0.1).Noise(1e-4, 1)), 0.4, 0.5, 0.02},
		{"AC-coupled", trial.Take("t", blocked(shape(48000, 2, 997.3, 0.6, 0.3, 0.55), 2).Noise(1e-4, 1)), 0.3, 0.55, 0.15},
		{"one half only", trial.Take("t", shape(48000, 1, 997.3, 0.6, 0.7, 0.5).Noise(1e-4, 1)), 0.6, 0.5, 0.02},
		{"locked to the rate", trial.Take("t", shape(48000, 1, 1000, 0.6, 0.5, 0.46).Noise(1e-4, 1)), 0.5, 0.46, 0.05},
		{"noisy", trial.Take("t", shape(48000, 1, 997.3, 0.6, 0.5, 0.45).Noise(0.01, 1)), 0.5, 0.45, 0.3},
		{"deep clip", trial.Take("t", shape(96000, 0.5, 997.3, 0.9, 0.3, 0.35).Noise(1e-4, 1)), 0.3, 0.35, 0.05},
		{"slight clip", trial.Take("t", shape(96000, 0.5, 997.3, 0.6, 0.59, 0.595).Noise(1e-5, 1)), 0.59, 0.595, 0.03},
		{"a scope's screen, 8 bit", trial.Bits(trial.Take("t", shape(250000, 0.01, 400, 0.9, 0.8, 0.7).Quantise(8, false, 1)), 8), 0.8, 0.7, 0.7},
	} {
		r := trial.Run(clipSymmetry, analyze.Params{}, c.take)
		if r.Value == nil {
			t.Errorf("%s: %+v", c.name, r.Refusal)
			continue
		}
		want := (c.up - c.down) / (c.up + c.down)
		U, _, _, _ := budget.Expand(r.Budget, 2)
		t.Logf("%s: %.4f %%, want %.4f, U %.4f", c.name, 100**r.Value, 100*want, 100*U)
		if d := 100 * math.Abs(*r.Value-want); d > c.within {
			t.Errorf("%s: %.4f %%, want %.4f", c.name, 100**r.Value, 100*want)
		}
		if got := r.Details["positive_v"].(float64); math.Abs(got/c.up-1) > 0.01+c.within/100 {
			t.Errorf("%s: positive half %.4f V, want %.4f", c.name, got, c.up)
		}
	}
}

// What is no clipping has no flats: a clean sine, strong second or third
// order, a rounded limiter, a triangle-like crossover, an 8-bit sine.
func TestNoFlats(t *testing.T) {
	bend := func(f func(float64) float64) *trial.Signal {
		s := trial.New(48000, 1).Tone(997.3, 0.6, 0.2)
		for i, x := range s.X {
			s.X[i] = f(x)
		}
		return s.Noise(1e-5, 2)
	}
	for name, s := range map[string]*trial.Signal{
		"clean":        bend(func(x float64) float64 { return x }),
		"second order": bend(func(x float64) float64 { return x + 0.05*x*x }),
		"third order":  bend(func(x float64) float64 { return x - 0.1*x*x*x }),
		"rounded":      bend(func(x float64) float64 { return 0.6 * math.Tanh(x/0.6) }),
		"crossover":    bend(func(x float64) float64 { return math.Copysign(math.Max(0, math.Abs(x)-0.02), x) }),
	} {
		r := trial.Run(clipSymmetry, analyze.Params{}, trial.Take("t", s))
		if r.Value != nil || r.Refusal.Code != analyze.NotEnoughPoints {
			t.Errorf("%s: %v %v", name, r.Value, r.Details)
		}
	}
	q := trial.Bits(trial.Take("t", trial.New(250000, 0.01).Tone(400, 0.9, 0).Quantise(8, false, 1)), 8)
	q.Rec.Info().Kind = recording.Scope
	if r := trial.Run(clipSymmetry, analyze.Params{}, q); r.Value != nil {
		t.Errorf("8-bit sine: %v %v", *r.Value, r.Details)
	}
}
