package tone

import (
	"math"
	"strings"
	"testing"

	"benchslip/analyze"
	"benchslip/analyze/internal/trial"
)

// stepped is a take of tones between silences, each bent by f, which sees the
// tone from its start on.
func stepped(rate float64, hz, peak []float64, f func(x []float64, hz float64)) *analyze.Take {
	n := max(len(hz), len(peak))
	at := func(v []float64, k int) float64 { return v[min(k, len(v)-1)] }
	s := trial.New(rate, 0.2+0.6*float64(n))
	for k := range n {
		q := trial.New(rate, 0.5).Tone(at(hz, k), at(peak, k), 0.4)
		f(q.X, at(hz, k))
		copy(s.X[int((0.1+0.6*float64(k))*rate):], q.X)
	}
	return trial.Take("t", s.Noise(2e-6, 5))
}

func each(f func(float64) float64) func([]float64, float64) {
	return func(x []float64, _ float64) {
		for i, v := range x {
			x[i] = f(v)
		}
	}
}

// A measure of one tone reads the step that lies at `at`, whole takes as ever.
func TestSteps(t *testing.T) {
	hz := []float64{63.1, 263.3, 997.3, 3981.1, 7943.3}
	// y = x + a2 x^2 + a3 x^3: H2 = a2 A/2, H3 = a3 A^2/4 of A + 3/4 a3 A^3.
	const a2, a3, A = 0.01, 0.005, 0.5
	take := stepped(48000, hz, []float64{A}, each(func(x float64) float64 { return x + a2*x*x + a3*x*x*x }))
	want := math.Hypot(a2*A/2, a3*A*A/4) / (1 + 0.75*a3*A*A)
	for _, at := range []float64{63.1, 1000, 4000} {
		r := trial.Run(thd, analyze.Params{At: []float64{at}}, take)
		if r.Value == nil || math.Abs(*r.Value/want-1) > 1e-3 {
			t.Fatalf("at %g Hz: %v %+v, want %g", at, r.Value, r.Refusal, want)
		}
		if f := r.Details["fundamental"].(map[string]any)["frequency_hz"].(float64); math.Abs(math.Log2(f/at)) > 1.0/24 {
			t.Errorf("at %g Hz: read %g Hz", at, f)
		}
		list := r.Details["steps"].([]map[string]any)
		if len(list) != len(hz) || math.Abs(list[2]["h2_db"].(float64)-db(a2*A/2/(1+0.75*a3*A*A))) > 0.02 {
			t.Errorf("steps %v", list)
		}
		if len(r.Opinions) > 0 {
			t.Errorf("opinions %v", r.Opinions)
		}
	}
	if r := trial.Run(thd, analyze.Params{At: []float64{500}}, take); r.Refusal == nil || r.Refusal.Code != analyze.NoTone {
		t.Errorf("no step at 500 Hz: %+v", r.Refusal)
	}
	if r := trial.Run(thd, analyze.Params{}, take); r.Refusal == nil || r.Refusal.Code != analyze.AmbiguousTone {
		t.Errorf("no frequency named: %+v", r.Refusal)
	}
	// Silence before and after one tone, or twice the same tone, is not stepped.
	once := trial.New(48000, 2)
	copy(once.X[24000:], trial.New(48000, 1).Tone(997.3, 0.5, 0).X)
	once.Noise(1e-6, 1)
	if r := trial.Run(frequency, analyze.Params{}, trial.Take("t", once)); r.Value == nil || r.Details["span_s"].([]float64)[0] != 0 {
		t.Errorf("one tone among silence: %v", r.Details)
	}
}

// Models of four faults are told, and smooth or clean ones are not.
func TestOpinions(t *testing.T) {
	levels := []float64{0.003, 0.01, 0.03, 0.1, 0.3, 0.6}
	tones := []float64{31.7, 63.3, 263.3, 997.3, 3981.1, 10031.7}
	dead := func(x float64) float64 { return math.Copysign(math.Max(0, math.Abs(x)-0.0005), x) }
	slew := func(x []float64, _ float64) { // at most 0.5 x 2 pi x 6 kHz a second
		y, most := 0.0, 0.5*2*math.Pi*6000/96000
		for i, v := range x {
			y += math.Max(-most, math.Min(most, v-y))
			x[i] = y
		}
	}
	core := func(x []float64, hz float64) { // flux follows the integral: 1/f
		for i, v := range x {
			q := v * 30 / hz
			x[i] = v - 0.05*q*q*q
		}
	}
	for _, c := range []struct {
		name, want string
		take       *analyze.Take
		at         float64
	}{
		{"crossover", "crossover", stepped(48000, []float64{997.3}, levels, each(dead)), 0},
		{"slewing", "slewing", stepped(96000, tones, []float64{0.5}, slew), 997.3},
		{"core", "core too small", stepped(48000, tones, []float64{0.5}, core), 997.3},
		{"one half clips", "positive half of the wave flattens first", stepped(48000, []float64{997.3}, levels, each(func(x float64) float64 { return math.Min(x, 0.4) })), 0},
		{"both clip", "both halves", trial.Take("t", trial.New(48000, 1).Tone(997.3, 0.6, 0).Noise(1e-5, 1)), 0},
		{"smooth", "", stepped(48000, []float64{997.3}, levels, each(func(x float64) float64 { return x + 0.01*x*x - 0.02*x*x*x })), 0},
		{"clean over level", "", stepped(48000, []float64{997.3}, levels, each(func(x float64) float64 { return x })), 0},
		{"smooth over frequency", "", stepped(96000, tones, []float64{0.5}, each(func(x float64) float64 { return x + 0.01*x*x - 0.02*x*x*x })), 997.3},
	} {
		if c.name == "both clip" {
			s := trial.New(48000, 1).Tone(997.3, 0.6, 0)
			each(func(x float64) float64 { return math.Max(-0.5, math.Min(0.5, x)) })(s.X, 0)
			c.take = trial.Take("t", s.Noise(1e-5, 1))
		}
		p := analyze.Params{}
		if c.at > 0 {
			p.At = []float64{c.at}
		}
		on := trial.On(c.take)
		for _, m := range []*analyze.Measure{thd, thdn} {
			r := on.Run(m, p)
			if r.Value == nil && r.Bound == nil {
				t.Errorf("%s: %+v", c.name, r.Refusal)
				continue
			}
			got := strings.Join(r.Opinions, "\n")
			if c.want == "" && got != "" || !strings.Contains(got, c.want) || len(r.Opinions) > 1 {
				t.Errorf("%s, %s: %q, want %q", c.name, m.Name, got, c.want)
			}
		}
	}
}
