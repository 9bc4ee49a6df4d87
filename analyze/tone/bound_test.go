package tone

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
	"benchslip/analyze/internal/trial"
)

// Errors over seeds against the Cramer-Rao bounds of Rife and Boorstyn 1974
// (real tone, white noise sigma a sample): var A = 2 sigma^2/N, var f = (fs/2
// pi)^2 12/(eta N (N^2-1)), var phi = 1/(eta N) at the middle, eta =
// A^2/(2 sigma^2). Wanted: RMS at most 1.15 times the bound, none over 5.
func TestBounds(t *testing.T) {
	runs := 12
	if testing.Short() {
		runs = 4
	}
	cases := []struct {
		name              string
		rate, seconds, hz float64
		amp, sigma, hum   float64
	}{
		{"1 kHz, 4 s", 48000, 4, 1042.37, 0.5, 0.003, 0},
		{"1 kHz, 1 s, in hum", 48000, 1, 997.1, 0.1, 0.002, 0.01},
		{"61 Hz, 4 s, in hum", 48000, 4, 61.3, 0.2, 0.002, 0.02},
		{"6.1 kHz, 2.5 s", 44100, 2.5, 6101.9, 0.3, 0.01, 0},
		{"21 periods", 48000, 1, 21.3, 0.3, 0.004, 0},
	}
	for _, c := range cases {
		t.Run(c.name, func(t *testing.T) {
			var e [5]float64 // gain, phase, frequency, level of H2, THD
			var worst [5]float64
			var cover [5]int
			note := func(i int, err, bound float64, r analyze.Result) {
				e[i] += err * err / (bound * bound)
				worst[i] = math.Max(worst[i], math.Abs(err)/bound)
				u, _ := budget.Combine(r.Budget)
				if math.Abs(err) <= 2*u {
					cover[i]++
				}
			}
			for seed := 0; seed < runs; seed++ {
				r := rand.New(rand.NewPCG(uint64(seed), 21))
				hz := c.hz * (1 + (r.Float64()-0.5)*1e-4)
				phi, phi2 := r.Float64()*6.28, r.Float64()*6.28
				hum := []float64{c.hum, c.hum / 5, c.hum / 2, 0, c.hum / 3}
				out := trial.New(c.rate, c.seconds).Tone(hz, c.amp, phi).Tone(2*hz, c.amp/20, 0.3).Tone(3*hz, c.amp/30, 1).
					Mains(50.02, 0.01, hum, uint64(seed)).Noise(c.sigma, uint64(seed)*2+1)
				in := trial.New(c.rate, c.seconds).Tone(hz, c.amp/10, phi2).Noise(c.sigma/10, uint64(seed)*2+2)
				tk := trial.Take("t", out, in)
				tk.Wiring.In = "2"
				on := trial.On(tk)
				n := float64(len(out.X))
				eta := c.amp * c.amp / (2 * c.sigma * c.sigma)
				rel := math.Sqrt(1/(eta*n)) * math.Sqrt2 // two channels of one relative noise
				g := on.Run(gain, analyze.Params{})
				if g.Refusal != nil {
					t.Fatal(g.Refusal)
				}
				note(0, *g.Value/10-1, rel, scaled(g, 0.1))
				ph := on.Run(phase, analyze.Params{})
				note(1, math.Remainder(*ph.Value-(phi-phi2)*180/math.Pi, 360), rel*180/math.Pi, ph)
				f := on.Run(frequency, analyze.Params{})
				note(2, *f.Value-hz, c.rate/(2*math.Pi)*math.Sqrt(12/(2*eta*n*(n*n-1))), f)
				h := on.Run(harmonic, analyze.Params{Order: 2})
				if h.Refusal != nil {
					t.Fatal(h.Refusal)
				}
				note(3, *h.Value-0.05, math.Sqrt(2/n)*c.sigma/c.amp, h)
				d := on.Run(thd, analyze.Params{})
				if d.Refusal != nil {
					t.Fatal(d.Refusal)
				}
				note(4, *d.Value-math.Hypot(0.05, 1.0/30), math.Sqrt(2/n)*c.sigma/c.amp, d)
			}
			for i, what := range []string{"gain", "phase", "frequency", "harmonic", "thd"} {
				r := math.Sqrt(e[i] / float64(runs))
				t.Logf("%-10s RMS %.2f, worst %.2f of the bound, within U %d of %d", what, r, worst[i], cover[i], runs)
				// The RMS over so few runs scatters by 1/sqrt(2 runs).
				if limit := 1.15 * (1 + 2.5/math.Sqrt(2*float64(runs))); r > limit {
					t.Errorf("%s: RMS error %.2f times the bound", what, r)
				}
				if worst[i] > 5 {
					t.Errorf("%s: worst error %.2f times the bound", what, worst[i])
				}
			}
		})
	}
}

func scaled(r analyze.Result, by float64) analyze.Result {
	b := append([]analyze.Contributor(nil), r.Budget...)
	for i := range b {
		b[i].U *= by
	}
	r.Budget = b
	return r
}

func db(x float64) float64 { return 20 * math.Log10(x) }

// A pure float64 tone leaves nothing above -200 dB.
func TestPureTone(t *testing.T) {
	for _, c := range []struct{ rate, seconds, hz float64 }{
		{48000, 10, 997}, {96000, 10, 1042.37}, {96000, 2, 9999.99}, {44100, 20, 999.9}, {192000, 5, 1000}, {48000, 1, 20.5}, {48000, 1.3, 15000},
	} {
		tk := trial.Take("t", trial.New(c.rate, c.seconds).Tone(c.hz, 0.8, 0.1))
		name := fmt.Sprintf("%g Hz %g s at %g", c.hz, c.seconds, c.rate)
		for _, m := range []*analyze.Measure{thd, thdn} {
			if m == thd && c.hz > 10000 {
				continue
			}
			r := trial.Run(m, analyze.Params{Band: &analyze.Band{Low: 20, High: 20000}}, tk)
			v := 0.0
			if r.Value != nil {
				v = *r.Value
			} else if r.Bound != nil {
				v = r.Bound.Value
			} else {
				t.Errorf("%s %s: %v", name, m.Name, r.Refusal)
				continue
			}
			if db(v) > -200 {
				t.Errorf("%s: %s is %.1f dB", name, m.Name, db(v))
			}
		}
	}
}

// A dithered 24-bit tone: THD+N is the dither's theory (0.5 step RMS over
// half the rate, AD-08 of common converter theory: sqrt(1/12 + 2/12) steps),
// THD below detection with a bound.
func TestDithered(t *testing.T) {
	amp := 0.5
	tk := trial.Bits(trial.Take("t", trial.New(48000, 6).Tone(1042.37, amp, 0.1).Quantise(24, true, 4)), 24)
	r := trial.Run(thdn, analyze.Params{}, tk)
	want := 0.5 * math.Exp2(-23) * math.Sqrt(19980.0/24000) / (amp / math.Sqrt2)
	if r.Value == nil || math.Abs(db(*r.Value/want)) > 0.2 {
		t.Errorf("thdn %v, want %.2f dB", r.Value, db(want))
	}
	d := trial.Run(thd, analyze.Params{}, tk)
	if d.Refusal == nil || d.Refusal.Code != analyze.BelowDetection || d.Bound == nil {
		t.Errorf("thd: %+v", d)
	}
}

// Two clocks that drift apart by 0.3 ppm within 10 s, 10 kHz: THD+N of -100 dB
// within 0.3 dB.
func TestDriftingClocks(t *testing.T) {
	const hz, T = 10000.3, 10.0
	shapes := map[string]func(t float64) float64{
		"steady drift":   func(x float64) float64 { return 2 * math.Pi * hz * 0.3e-6 * x * x / (2 * T) },
		"there and back": func(x float64) float64 { return hz * 0.15e-6 * T * (1 - math.Cos(2*math.Pi*x/T)) },
		"half a swing":   func(x float64) float64 { return hz * 0.15e-6 * 2 * T * (math.Sin(math.Pi * x / T)) },
		"twice":          func(x float64) float64 { return hz * 0.15e-6 * T / 2 * (1 - math.Cos(4*math.Pi*x/T)) },
	}
	for name, swing := range shapes {
		s := trial.New(48000, T).Swing(hz, 0.7, swing).Noise(0.7/math.Sqrt2*1e-5*math.Sqrt(24000/19980.0), 3)
		r := trial.Run(thdn, analyze.Params{}, trial.Take("t", s))
		if r.Value == nil {
			t.Errorf("%s: %v", name, r.Refusal)
			continue
		}
		t.Logf("%s: %.3f dB", name, db(*r.Value))
		if math.Abs(db(*r.Value)+100) > 0.3 {
			t.Errorf("%s: THD+N reads %.2f dB, true -100 dB", name, db(*r.Value))
		}
	}
}
