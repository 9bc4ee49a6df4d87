package hum

import (
	"math"
	"math/rand/v2"
	"testing"

	"benchslip/analyze"
	"benchslip/analyze/internal/trial"
)

// closed forms of hum, as amplitudes by order. Fourier series of rectified
// sines, sawtooth, triangle and pulse trains: textbook, e.g. Bronstein and
// Semendjajew, tables of Fourier expansions, from memory (full-wave
// 4/(pi (4m^2-1)), first three 0.424, 0.0849, 0.0364 of the crest).
var shapes = []struct {
	name, want string
	amp        func(h int) float64
}{
	{"sine with a little", magnetic, table(map[int]float64{1: 1, 2: 0.02, 3: 0.05, 5: 0.02})},
	{"triangle", magnetic, func(h int) float64 { return when(h%2 == 1, 1/float64(h*h)) }},
	{"sine with a fifth of thirds", magnetic, table(map[int]float64{1: 1, 3: 0.18, 5: 0.03})},
	{"distorted mains, as coupled by fields", odd, table(map[int]float64{1: 1, 3: 0.15, 5: 0.3, 7: 0.35, 11: 0.1, 13: 0.08})},
	{"odd set", odd, table(map[int]float64{1: 1, 3: 0.4, 5: 0.3, 7: 0.2, 9: 0.04, 11: 0.1})},
	{"square", odd, func(h int) float64 { return when(h%2 == 1, 1/float64(h)) }},
	{"neutral currents", triplen, table(map[int]float64{1: 0.4, 3: 1, 5: 0.15, 7: 0.1, 9: 0.5, 15: 0.25, 21: 0.1})},
	{"thirds beside the fundamental", triplen, table(map[int]float64{1: 1, 3: 0.9, 5: 0.1, 9: 0.4, 15: 0.2})},
	{"neutral currents among others", triplen, table(map[int]float64{1: 0.65, 3: 1, 5: 0.56, 7: 0.42, 9: 0.61, 15: 0.34})},
	{"odd set with more thirds", odd, table(map[int]float64{1: 1, 3: 0.3, 5: 0.15, 7: 0.1})},
	{"full-wave rectified sine", fullWave, func(h int) float64 { return when(h%2 == 0, 4/math.Pi/float64(h*h-1)) }},
	{"ripple sawtooth at 2f", fullWave, func(h int) float64 { return when(h%2 == 0, 1/float64(h)) }},
	{"half-wave rectified sine", halfWave, func(h int) float64 {
		if h == 1 {
			return 0.5
		}
		return when(h%2 == 0, 2/math.Pi/float64(h*h-1))
	}},
	{"ripple sawtooth at f", halfWave, func(h int) float64 { return 1 / float64(h) }},
	{"pulses twice a period", needles, func(h int) float64 { return when(h%2 == 0, 0.2) }},
	{"pulses of both signs", needles, func(h int) float64 { return when(h%2 == 1, 0.2*math.Exp(-float64(h)/40)) }},
	{"field and ripple alike", mixed, table(map[int]float64{1: 0.6, 2: 0.7, 4: 0.14, 6: 0.06})},
	{"odd set and ripple", mixed, table(map[int]float64{1: 1, 2: 0.8, 3: 0.4, 4: 0.1, 5: 0.4, 6: 0.05, 7: 0.3})},
}

func table(m map[int]float64) func(int) float64 { return func(h int) float64 { return m[h] } }

func when(yes bool, x float64) float64 {
	if yes {
		return x
	}
	return 0
}

// At least nine of ten recordings of distinct causes get their family, over
// noise, drift of the mains and spread of single orders.
func TestFamilies(t *testing.T) {
	right, count := 0, 0
	for _, s := range shapes {
		got := map[string]int{}
		for seed := 0; seed < 3; seed++ {
			r := rand.New(rand.NewPCG(uint64(seed), 31))
			m := supply{hz: 49.6 + 0.8*r.Float64(), drift: 0.02, period: 17, wander: 0.3, swing: 8, seed: uint64(seed)}
			rms := map[int]float64{}
			for h := 1; h <= 40; h++ {
				rms[h] = 1e-3 * s.amp(h) * (1 + 0.12*r.NormFloat64())
			}
			x := trial.New(6000, 5)
			m.wave(x, rms, nil)
			x.Noise(2e-4, uint64(seed)+50)
			res := trial.Run(hum, analyze.Params{}, trial.Take("t", x))
			word, _ := res.Details["family"].(string)
			sure, _ := res.Details["family_confidence"].(float64)
			if sure < 0 || sure > surest || len(res.Opinions) == 0 || res.Details["family_evidence"] == "" {
				t.Errorf("%s: confidence %g, opinions %q", s.name, sure, res.Opinions)
			}
			got[word]++
			count++
			if word == s.want {
				right++
			}
		}
		if got[s.want] < 2 {
			t.Errorf("%s: %v, want %s", s.name, got, s.want)
		}
	}
	t.Logf("%d of %d right", right, count)
	if right*10 < count*9 {
		t.Errorf("only %d of %d right", right, count)
	}
}

func TestNoFamily(t *testing.T) {
	res := trial.Run(hum, analyze.Params{}, trial.Take("t", trial.New(6000, 5).Noise(1e-3, 4)))
	if res.Details["family"] != none || res.Refusal == nil || res.Bound == nil || len(res.Opinions) != 0 {
		t.Errorf("noise alone: %v %v %v", res.Details["family"], res.Refusal, res.Opinions)
	}
}
