package tone

import (
	"math"
	"testing"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
	"benchslip/analyze/internal/trial"
	"benchslip/capture/recording"
)

// bent is two tones through y = x + a2 x^2 + a3 x^3, level times the result.
func bent(rate, seconds, f1, a1, f2, amp2, a2, a3, level float64) *trial.Signal {
	s := trial.New(rate, seconds).Tone(f1, a1, 0.4).Tone(f2, amp2, 1.1)
	for i, x := range s.X {
		s.X[i] = level * (x + a2*x*x + a3*x*x*x)
	}
	return s
}

// Closed forms for y = x + 0.01 x^2 + 0.005 x^3: the products are a2 A1 A2 at
// f2+-f1, (3/4) a3 A1^2 A2 at f2+-2f1 (and at 2f1-f2 for A1, A2), tone 2 is A2
// + (3/4) a3 A2^3 + (3/2) a3 A1^2 A2.
func TestIntermodulation(t *testing.T) {
	cases := []struct {
		name              string
		m                 *analyze.Measure
		rate, seconds     float64
		f1, a1, f2, amp2  float64
		order             int
		want              float64 // fraction
		noise, hum, level float64
		at                []float64
	}{
		{name: "60 Hz and 7 kHz, root of squares", m: modulation, rate: 48000, seconds: 4, f1: 60, a1: 0.8, f2: 7000, amp2: 0.2, want: 0.0117536777},
		{name: "order 2", m: modulation, rate: 48000, seconds: 4, f1: 60, a1: 0.8, f2: 7000, amp2: 0.2, order: 2, want: 0.0159211901},
		{name: "order 3", m: modulation, rate: 48000, seconds: 4, f1: 60, a1: 0.8, f2: 7000, amp2: 0.2, order: 3, want: 0.00477635703},
		{name: "clock 70 ppm off, noise and hum", m: modulation, rate: 44100, seconds: 5, f1: 60.0042, a1: 0.8, f2: 7000.49, amp2: 0.2, want: 0.0117536777, noise: 1e-4, hum: 1e-3},
		{name: "other tones", m: modulation, rate: 96000, seconds: 3, f1: 41.3, a1: 0.8, f2: 7993.7, amp2: 0.2, order: 2, want: 0.0159211901, noise: 1e-5, level: 0.3},
		{name: "250 Hz and 8 kHz, a whole ratio", m: modulation, rate: 48000, seconds: 2, f1: 250, a1: 0.8, f2: 8000, amp2: 0.2, order: 3, want: 0.00477635703},
		{name: "a scope's second", m: modulation, rate: 50000, seconds: 0.3, f1: 60, a1: 0.8, f2: 7000, amp2: 0.2, want: 0.0117536777, noise: 1e-4},
		{name: "19 and 20 kHz, order 2", m: differenceFrequency, rate: 96000, seconds: 3, f1: 19000, a1: 0.5, f2: 20000, amp2: 0.5, order: 2, want: 0.00249298847},
		{name: "19 and 20 kHz, order 3", m: differenceFrequency, rate: 44100, seconds: 3, f1: 19000, a1: 0.5, f2: 20000, amp2: 0.5, order: 3, want: 0.000934870676, noise: 1e-5},
		{name: "off the bins, in hum", m: differenceFrequency, rate: 48000, seconds: 4, f1: 18999.3, a1: 0.5, f2: 20012.1, amp2: 0.5, order: 2, want: 0.00249298847, noise: 1e-5, hum: 1e-4},
		{name: "8 and 11.95 kHz", m: differenceFrequency, rate: 48000, seconds: 4, f1: 8000, a1: 0.5, f2: 11950, amp2: 0.5, order: 3, want: 0.000934870676, noise: 1e-5},
		{name: "named", m: differenceFrequency, rate: 48000, seconds: 2, f1: 13000, a1: 0.5, f2: 14000, amp2: 0.5, order: 2, want: 0.00249298847, at: []float64{14000, 13000}},
	}
	for _, c := range cases {
		t.Run(c.name, func(t *testing.T) {
			if c.level == 0 {
				c.level = 0.9
			}
			s := bent(c.rate, c.seconds, c.f1, c.a1, c.f2, c.amp2, 0.01, 0.005, c.level)
			if c.hum > 0 {
				s.Mains(50.02, 0.01, []float64{c.hum, c.hum / 3, c.hum / 2, 0, c.hum / 4}, 3)
			}
			s.Noise(c.noise, 8)
			r := trial.Run(c.m, analyze.Params{Order: c.order, At: c.at}, trial.Take("t", s))
			if r.Value == nil {
				t.Fatalf("%+v", r.Refusal)
			}
			U, _, _, _ := budget.Expand(r.Budget, 2)
			t.Logf("%.6f %%, %+.4f dB, U %.4f dB", 100**r.Value, db(*r.Value/c.want), 8.69*U / *r.Value)
			if d := math.Abs(*r.Value - c.want); math.Abs(db(*r.Value/c.want)) > 0.02 || d > 1.75*U+1e-7*c.want {
				t.Errorf("%.7f, want %.7f, U %.2g", *r.Value, c.want, U)
			}
			if len(r.Flags) > 0 {
				t.Errorf("flags %v", r.Flags)
			}
		})
	}
}

// The two tones may drift with their clock (0.4 ppm over the take): sidebands
// drift with them.
func TestIntermodulationDrift(t *testing.T) {
	const f1, f2 = 60.0, 7000.0
	swing := func(hz float64) func(float64) float64 {
		return func(x float64) float64 {
			return 2 * math.Pi * hz * 0.4e-6 * 10 / (2 * math.Pi) * math.Sin(2*math.Pi*x/10)
		}
	}
	s := trial.New(48000, 8).Swing(f1, 0.8, swing(f1)).Swing(f2, 0.2, swing(f2))
	for i, x := range s.X {
		s.X[i] = 0.9 * (x + 0.01*x*x + 0.005*x*x*x)
	}
	r := trial.Run(modulation, analyze.Params{}, trial.Take("t", s.Noise(1e-5, 1)))
	if r.Value == nil || math.Abs(db(*r.Value/0.0117536777)) > 0.01 {
		t.Errorf("%v %+v", r.Value, r.Refusal)
	}
}

// Errors over seeds: products 20 dB over detection scatter by their noise, and
// U covers them.
func TestIntermodulationCoverage(t *testing.T) {
	inside, runs := 0, 24
	sum := 0.0
	for seed := 0; seed < runs; seed++ {
		s := bent(48000, 1, 60.3, 0.8, 7000.1, 0.2, 1e-3, 5e-4, 1).Noise(3e-3, uint64(seed))
		r := trial.Run(modulation, analyze.Params{}, trial.Take("t", s))
		if r.Value == nil {
			t.Fatal(r.Refusal)
		}
		U, _, _, _ := budget.Expand(r.Budget, 2)
		// (a2 A1 A2, (3/4) a3 A1^2 A2 each side) over tone 2.
		tone2 := 0.2 + 0.75*5e-4*0.008 + 1.5*5e-4*0.64*0.2
		want := math.Sqrt2 * math.Hypot(1e-3*0.16, 0.75*5e-4*0.128) / tone2
		e := *r.Value - want
		sum += e / U
		if math.Abs(e) <= U {
			inside++
		}
	}
	t.Logf("%d of %d within U, mean error %.2f U", inside, runs, sum/float64(runs))
	if inside < runs-4 || math.Abs(sum/float64(runs)) > 0.35 {
		t.Errorf("%d of %d within U, mean error %.2f U", inside, runs, sum/float64(runs))
	}
}

func TestIntermodulationRefuses(t *testing.T) {
	two := func(f1, a1, f2, a2 float64) *analyze.Take {
		return trial.Take("t", trial.New(48000, 3).Tone(f1, a1, 0).Tone(f2, a2, 1).Noise(1e-4, 2))
	}
	for name, c := range map[string]struct {
		m     *analyze.Measure
		take  *analyze.Take
		order int
		code  string
		bound bool
	}{
		"clean pair":                  {modulation, two(60, 0.4, 7000, 0.1), 0, analyze.BelowDetection, true},
		"clean twin":                  {differenceFrequency, two(18800, 0.4, 20000, 0.4), 2, analyze.BelowDetection, true},
		"one tone":                    {modulation, trial.Take("t", trial.New(48000, 2).Tone(1000, 0.4, 0).Noise(1e-4, 1)), 0, analyze.NoTone, false},
		"tone and hum":                {modulation, two(50, 1e-3, 7000, 0.4), 0, analyze.NoTone, false},
		"too near for modulation":     {modulation, two(3000, 0.4, 7000, 0.1), 0, analyze.NoTone, false},
		"silence":                     {modulation, trial.Take("t", trial.New(48000, 1)), 0, analyze.NoSignal, false},
		"2f2-f1 past half the rate":   {differenceFrequency, two(19000, 0.4, 23000, 0.4), 3, analyze.Bandwidth, false},
		"difference below 10 Hz":      {differenceFrequency, two(18000, 0.4, 18006, 0.4), 2, analyze.Bandwidth, false},
		"difference on the mains":     {differenceFrequency, two(18000, 0.4, 18100.2, 0.4), 2, analyze.TooShort, false},
		"sideband on a harmonic":      {modulation, two(1000, 0.4, 4000, 0.1), 2, analyze.TooShort, false},
		"under five periods":          {modulation, trial.Take("t", trial.New(48000, 0.06).Tone(60, 0.4, 0).Tone(7000, 0.1, 1)), 0, analyze.TooShort, false},
		"difference without an order": {differenceFrequency, two(19000, 0.4, 20000, 0.4), 0, analyze.Unsupported, false},
	} {
		r := trial.Run(c.m, analyze.Params{Order: c.order}, c.take)
		if r.Value != nil || r.Refusal == nil || r.Refusal.Code != c.code || (r.Bound != nil) != c.bound {
			t.Errorf("%s: %v %+v %+v, want %s", name, r.Value, r.Refusal, r.Bound, c.code)
		}
		if r.Bound != nil && db(r.Bound.Value) > -65 {
			t.Errorf("%s: bound %.1f dB", name, db(r.Bound.Value))
		}
	}
	// A pair 6:1 is measured and flagged.
	r := trial.Run(modulation, analyze.Params{}, trial.Take("t", bent(48000, 2, 60, 0.9, 7000, 0.15, 0.01, 0.005, 0.9)))
	if r.Value == nil || len(r.Flags) != 1 || r.Flags[0].Code != recording.Ratio {
		t.Errorf("6:1: %v %v", r.Value, r.Flags)
	}
}
