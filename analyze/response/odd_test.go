package response

import (
	"math"
	"math/rand/v2"
	"testing"

	"benchslip/analyze"
	"benchslip/analyze/internal/trial"
)

// Cut, gapped, short and mixed stimuli, with and without an input channel:
// every measure answers with a finite value or a reason, and none panics.
func TestOddTakes(t *testing.T) {
	texts := []string{"sweep length=400ms", "stepped-tones count=6 each=60ms gap=30ms", "multitone length=500ms period=200ms", "white-noise length=300ms", "pulse length=500ms",
		"difference-pair length=300ms", "tone length=300ms"}
	for seed := uint64(0); seed < 30; seed++ {
		r := rand.New(rand.NewPCG(seed, 1))
		text := texts[r.IntN(len(texts))] + " before=50ms after=100ms"
		in := trial.Played(text)
		out := in.Through(coupled(math.Pow(10, 4*r.Float64()))).Noise(math.Pow(10, -6*r.Float64()), seed)
		from := r.IntN(len(in.X) / 2)
		to := from + 1 + r.IntN(len(in.X)-from-1)
		if r.IntN(3) == 0 {
			from, to = 0, len(in.X)
		}
		in.X, out.X = in.X[from:to], out.X[from:to]
		tk := trial.Take("t", out, in)
		if r.IntN(2) == 0 {
			tk.Wiring.In = "2"
		} else {
			tk.Stimulus = text
		}
		b := trial.On(tk)
		for _, m := range Measures() {
			res := b.Run(m, analyze.Params{At: []float64{1000 * math.Pow(10, r.Float64())}})
			if (res.Value == nil) == (res.Refusal == nil) {
				t.Errorf("seed %d, %s, %s: neither or both of value and reason", seed, text, m.Name)
			}
			finite := func(x float64) {
				if math.IsNaN(x) || math.IsInf(x, 0) {
					t.Errorf("seed %d, %s, %s: %v", seed, text, m.Name, x)
				}
			}
			if res.Value != nil {
				finite(*res.Value)
			}
			if res.Bound != nil {
				finite(res.Bound.Value)
			}
			for _, l := range res.Budget {
				finite(l.U)
			}
			for _, v := range res.Details {
				if x, ok := v.(float64); ok {
					finite(x)
				}
			}
		}
	}
}
