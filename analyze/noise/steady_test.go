package noise

import (
	"math"
	"math/rand/v2"
	"testing"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
	"benchslip/analyze/internal/trial"
)

// coloured is white noise of the density e (V/rtHz) with a 1/f part that
// equals it at corner Hz: one-pole noises with poles a factor 4 apart, whose
// densities c p/(f^2 + p^2) add up to 1/f within 0.4 % (the integral of
// p/(f^2+p^2) over ln p is pi/(2f)).
func coloured(rate, seconds, e, corner float64, seed uint64) *trial.Signal {
	s := trial.New(rate, seconds).Noise(e*math.Sqrt(rate/2), seed)
	r := rand.New(rand.NewPCG(seed, 8))
	if corner == 0 {
		return s
	}
	for pole := 0.25; pole < rate/4; pole *= 4 {
		power := e * e * corner * math.Log(4)
		keep := math.Exp(-2 * math.Pi * pole / rate)
		push, x := math.Sqrt(power*(1-keep*keep)), math.Sqrt(power)*r.NormFloat64()
		for i := range s.X {
			s.X[i] += x
			x = keep*x + push*r.NormFloat64()
		}
	}
	return s
}

// The corner and the white density come out within their uncertainty; the
// band's RMS is e sqrt(B + fc ln(f2/f1)) (closed form).
func TestShape(t *testing.T) {
	const e = 1e-5
	for i, corner := range []float64{0, 30, 100, 300} {
		r := trial.Run(noise, analyze.Params{}, trial.Take("t", coloured(48000, 12, e, corner, uint64(i+3)).Mains(50.01, 0.01, []float64{1e-3, 3e-4, 5e-4}, 1)))
		if r.Value == nil {
			t.Fatal(r.Refusal)
		}
		d, ok := r.Details["density"].(map[string]any)
		if !ok {
			t.Fatalf("corner %g: no shape", corner)
		}
		if w := d["white_v_rthz"].(float64); math.Abs(w/e-1) > 0.015 {
			t.Errorf("corner %g: white part %g, want %g", corner, w, e)
		}
		if corner == 0 {
			if d["corner_hz"] != nil {
				t.Errorf("white noise has a corner at %v Hz", d["corner_hz"])
			}
		} else if got, _ := d["corner_hz"].(float64); math.Abs(got-corner) > 1.5*d["corner_uncertainty_hz"].(float64) || math.Abs(got/corner-1) > 0.12 {
			t.Errorf("corner %v +- %v, want %g", d["corner_hz"], d["corner_uncertainty_hz"], corner)
		}
		hum := r.Details["hum_v"].(float64)
		want := e * math.Sqrt(19980+corner*math.Log(1000))
		if got := math.Sqrt(*r.Value**r.Value - hum*hum); math.Abs(db(got/want)) > 0.06 {
			t.Errorf("corner %g: %.3f dB off the closed form", corner, db(got/want))
		}
		if b := r.Details["bursts"].(map[string]any); b["steps"] != 0 || len(r.Opinions) > 0 {
			t.Errorf("corner %g: %v %v", corner, b, r.Opinions)
		}
		if len(r.Notes) > 0 {
			t.Errorf("corner %g: %v", corner, r.Notes)
		}
	}
	// A hump is neither white nor 1/f.
	s := trial.New(48000, 6)
	r := rand.New(rand.NewPCG(1, 2))
	y1, y2 := 0.0, 0.0
	for i := range s.X {
		y := 1.998*math.Cos(2*math.Pi*300/48000)*0.995*y1 - 0.995*0.995*y2 + 1e-4*r.NormFloat64()
		y1, y2 = y, y1
		s.X[i] = y
	}
	if q := trial.Run(noise, analyze.Params{}, trial.Take("t", s)); q.Details["density"] != nil {
		t.Errorf("a hump at 300 Hz: %v", q.Details["density"])
	}
}

func db(x float64) float64 { return 20 * math.Log10(x) }

// A random telegraph signal in white noise: about as many jumps as there are.
func TestTelegraph(t *testing.T) {
	s := coloured(48000, 15, 1e-5, 60, 4)
	r := rand.New(rand.NewPCG(5, 6))
	level, jumps, left := 1e-3, 0, 0.0
	for i := range s.X {
		if left <= 0 {
			left = 48000 * (0.1 + 0.6*r.ExpFloat64())
			level = -level
			jumps++
		}
		left--
		s.X[i] += level
	}
	q := trial.Run(noise, analyze.Params{}, trial.Take("t", s.Mains(49.98, 0.01, []float64{2e-3, 0, 1e-3}, 1)))
	b := q.Details["bursts"].(map[string]any)
	if n := b["steps"].(int); math.Abs(float64(n-jumps+1)) > 0.15*float64(jumps) {
		t.Errorf("%d jumps found of %d", n, jumps-1)
	}
	if v := b["largest_v"].(float64); math.Abs(v/2e-3-1) > 0.2 || len(q.Opinions) != 1 {
		t.Errorf("largest %g V, %v", v, q.Opinions)
	}
}

// Noise whose power swings from second to second carries that in its
// uncertainty; steady noise does not (one of hundreds by chance).
func TestUnsteady(t *testing.T) {
	s := trial.New(48000, 12).Noise(1e-3, 1)
	for i := range s.X {
		if (i/24000)%4 == 0 {
			s.X[i] *= 2
		}
	}
	r := trial.Run(noise, analyze.Params{}, trial.Take("t", s))
	U, k, _, _ := budget.Expand(r.Budget, 2)
	// Powers 4, 1, 1, 1: relative scatter of one 1.3/1.75, of the mean of 32
	// parts an eighteenth of that at least, half as much in the RMS.
	if rel := U / *r.Value; rel < 0.05 || rel > 0.3 || k <= 2 || len(r.Notes) == 0 {
		t.Errorf("U %.3f of the value, k %.2f, %v", rel, k, r.Notes)
	}
	flagged := 0
	for seed := range uint64(6) {
		r := trial.Run(noise, analyze.Params{}, trial.Take("t", trial.New(44100, 5).Noise(1e-3, seed)))
		if len(r.Notes) > 0 {
			flagged++
		}
	}
	if flagged > 1 {
		t.Errorf("%d of 6 steady takes are called unsteady", flagged)
	}
}
