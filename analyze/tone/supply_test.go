package tone

import (
	"math"
	"testing"

	"benchslip/analyze"
	"benchslip/analyze/internal/trial"
)

// A strong tone within 2 % of a low mains order is the take's tone, whether
// hum shows beside it or not: it must not make a supply of its own and leave
// its harmonics to be measured as the tone.
func TestToneBesideTheSupply(t *testing.T) {
	for _, hz := range []float64{51.4, 98.5, 101.7, 148.2, 197.7, 253.1} {
		for _, T := range []float64{1.5, 3, 6} {
			for _, hum := range [][]float64{nil, {2e-4, 5e-5, 1e-4}} {
				if gap := math.Abs(hz - 50.02*math.Round(hz/50)); gap < 4/T {
					continue // they cannot be told apart for sure
				}
				s := trial.New(8000, T).Tone(hz, 0.4, 0.3).Tone(3*hz, 0.004, 1).Mains(50.02, 0.01, hum, 4).Noise(1e-5, 5)
				r := trial.Run(frequency, analyze.Params{}, trial.Take("t", s))
				if r.Value == nil || math.Abs(*r.Value-hz) > 0.01 {
					t.Errorf("%g Hz, %g s, hum %v: %+v %v", hz, T, hum, r.Refusal, r.Value)
				}
			}
		}
	}
	// Hum alone holds no tone, whichever order is the strongest.
	for k := range 5 {
		hum := []float64{3e-4, 1e-4, 2e-4, 5e-5, 1e-4}
		hum[k] = 2e-3
		for _, mains := range []float64{49.85, 50.13} {
			s := trial.New(8000, 4).Mains(mains, 0.01, hum, 6).Noise(1e-5, 7)
			r := trial.Run(frequency, analyze.Params{}, trial.Take("t", s))
			if r.Refusal == nil || r.Refusal.Code != analyze.NoTone {
				t.Errorf("hum of %g Hz, order %d the strongest: %v %v", mains, k+1, r.Value, r.Refusal)
			}
		}
	}
}
