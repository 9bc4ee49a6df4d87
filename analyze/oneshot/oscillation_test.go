package oneshot

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"benchslip/analyze"
	"benchslip/analyze/internal/trial"
)

// burst adds a tone between two times.
func burst(s *trial.Signal, hz, amp, from, to float64) *trial.Signal {
	for i := range s.X {
		if t := float64(i) / s.Rate; t >= from && t < to {
			s.X[i] += amp * math.Cos(2*math.Pi*hz*(t-from)+1)
		}
	}
	return s
}

// signal is what the stage was meant to put out.
func signal(rate float64, n int) *trial.Signal {
	return of(rate, n, func(t float64) float64 { return 0.3 * math.Sin(2*math.Pi*1000*t) })
}

func square(rate float64, n int) *trial.Signal {
	return of(rate, n, func(t float64) float64 { return 0.4 * math.Copysign(1, math.Sin(2*math.Pi*1037*t)) })
}

func digitised(s *trial.Signal, bits int) *analyze.Take {
	if bits == 0 {
		return trial.Take("t", s)
	}
	return trial.Bits(trial.Take("t", s.Quantise(bits, false, 1)), bits)
}

// A 3.1 MHz burst at 10 MS/s and more: frequency within 0.5 %, times within
// 1 us, RMS within its uncertainty.
func TestBurst(t *testing.T) {
	hz, from := 3.1e6, 100.03e-6
	for _, rate := range []float64{10e6, 25e6, 100e6} {
		for _, bits := range []int{0, 12, 8} {
			for _, lasts := range []float64{10e-6, 60e-6, 500e-6} {
				for _, amp := range []float64{0.5, 0.03} {
					if rate > 90e6 && amp > 0.1 {
						continue // keep it short
					}
					r := trial.Run(oscillation, analyze.Params{}, digitised(burst(signal(rate, int(0.8e-3*rate)), hz, amp, from, from+lasts).Noise(0.002, 3), bits))
					name := fmt.Sprintf("%g S/s, %d bits, %g s, %g V", rate, bits, lasts, amp)
					if r.Value == nil {
						t.Errorf("%s: %+v", name, r.Refusal)
						continue
					}
					v, u := must(t, r)
					if math.Abs(v-amp/math.Sqrt2) > 1.2*u || u > 0.25*v {
						t.Errorf("%s: %.5g V RMS, want %.5g, U %.2g", name, v, amp/math.Sqrt2, u)
					}
					f, a, b := r.Details["frequency_hz"].(float64), r.Details["from_s"].(float64), r.Details["to_s"].(float64)
					if math.Abs(f/hz-1) > 0.005 || math.Abs(a-from) > 1e-6 || math.Abs(b-from-lasts) > 1e-6 {
						t.Errorf("%s: %.6g Hz from %.6g s to %.6g s", name, f, a, b)
					}
					if r.Details["course"] != "burst" || r.Details["bursts"] != 1 {
						t.Errorf("%s: %v, %v bursts, band %v", name, r.Details["course"], r.Details["bursts"], r.Details["band_hz"])
					}
				}
			}
		}
	}
}

// What else oscillations do.
func TestOscillationKinds(t *testing.T) {
	const rate, n = 10e6, 80000
	noise := rand.New(rand.NewPCG(1, 2))
	hump := signal(rate, n)
	// A resonator of radius r driven by noise: variance sigma^2 (1+r^2) /
	// ((1-r^2)(1 - 2 r^2 cos 2 theta + r^4)), the AR(2) process; its 3 dB width
	// is (1-r) rate/pi, 90 % of the power lie within 6.31 times that.
	const radius, sigma = 0.995, 0.001
	theta := 2 * math.Pi * 0.15
	a, b := 0.0, 0.0
	for i := range hump.X {
		a, b = 2*radius*math.Cos(theta)*a-radius*radius*b+sigma*noise.NormFloat64(), a
		hump.X[i] += a
	}
	r2 := radius * radius
	humpRMS := sigma * math.Sqrt((1+r2)/((1-r2)*(1-2*r2*math.Cos(2*theta)+r2*r2)))
	gated := signal(rate, n)
	for k := range 8 {
		burst(gated, 3.1e6, 0.03, float64(k)*1e-3+0.2e-3, float64(k)*1e-3+0.3e-3)
	}
	decay := signal(rate, n)
	for i := range decay.X {
		if t := float64(i)/rate - 3e-3; t > 0 {
			decay.X[i] += 0.05 * math.Exp(-t/1e-4) * math.Sin(2*math.Pi*1.7e6*t)
		}
	}
	// A e^(-t/tau) is over half for tau ln 2; the mean square of the envelope
	// there is A^2 (1 - 1/4)/(2 ln 2).
	decayRMS := 0.05 * math.Sqrt(0.75/(2*math.Ln2)/2)
	for _, c := range []struct {
		name     string
		s        *trial.Signal
		hz, rms  float64
		within   float64 // relative
		from, to float64
		course   string
		bursts   int
		band     [2]float64 // zero: a line
	}{
		{"steady line", signal(rate, n).Tone(412345, 0.01, 1).Noise(0.003, 4), 412345, 0.01 / math.Sqrt2, 0.01, 0, n / rate, "continuous", 0, [2]float64{}},
		{"fast wandering", signal(rate, n).Swing(2.2e6, 0.02, func(t float64) float64 { return 300 * math.Sin(2*math.Pi*250*t) }).Noise(0.003, 4),
			2.2e6, 0.02 / math.Sqrt2, 0.02, 0, n / rate, "continuous", 0, [2]float64{2.125e6, 2.275e6}},
		{"slow wandering", signal(rate, n).Swing(2.2e6, 0.02, func(t float64) float64 { return 2400 * math.Sin(2*math.Pi*62.5*t) }).Noise(0.003, 4),
			2.2e6, 0.02 / math.Sqrt2, 0.05, 0, n / rate, "continuous", 0, [2]float64{2.05e6, 2.35e6}},
		{"noise in a band", hump.Noise(0.0005, 2), 1.5e6, humpRMS, 0.2, 0, n / rate, "continuous", 0, [2]float64{1.45e6, 1.55e6}},
		{"on every crest", gated.Noise(0.002, 1), 3.1e6, 0.03 / math.Sqrt2, 0.03, 0.2e-3, 0.3e-3, "burst", 8, [2]float64{}},
		{"dying away", decay.Noise(0.002, 1), 1.7e6, decayRMS, 0.03, 3e-3, 3e-3 + 1e-4*math.Ln2, "burst", 1, [2]float64{}},
		{"on a square wave", burst(square(rate, n).Noise(0.002, 1), 3.1e6, 0.03, 2e-3, 2.5e-3), 3.1e6, 0.03 / math.Sqrt2, 0.02, 2e-3, 2.5e-3, "burst", 1, [2]float64{}},
		{"through a square wave", square(rate, n).Tone(777e3, 0.01, 0).Noise(0.002, 1), 777e3, 0.01 / math.Sqrt2, 0.02, 0, n / rate, "continuous", 0, [2]float64{}},
		{"at an audio rate", trial.New(192e3, 0.5).Tone(1000, 0.5, 0).Tone(43210, 0.003, 1).Noise(0.0005, 4), 43210, 0.003 / math.Sqrt2, 0.01, 0, 0.5, "continuous", 0, [2]float64{}},
	} {
		r := trial.Run(oscillation, analyze.Params{}, trial.Take("t", c.s))
		if r.Value == nil {
			t.Errorf("%s: %+v", c.name, r.Refusal)
			continue
		}
		v, u := must(t, r)
		if math.Abs(v/c.rms-1) > c.within || math.Abs(v-c.rms) > 2*u+0.01*c.rms {
			t.Errorf("%s: %.5g V RMS, want %.5g, U %.2g", c.name, v, c.rms, u)
		}
		f, from, to := r.Details["frequency_hz"].(float64), r.Details["from_s"].(float64), r.Details["to_s"].(float64)
		if math.Abs(f/c.hz-1) > 0.005 || math.Abs(from-c.from) > 1e-6 || math.Abs(to-c.to) > 3e-6 {
			t.Errorf("%s: %.7g Hz from %.7g s to %.7g s, want %.7g, %g, %g", c.name, f, from, to, c.hz, c.from, c.to)
		}
		if r.Details["course"] != c.course || r.Details["bursts"] != c.bursts {
			t.Errorf("%s: %v with %v bursts", c.name, r.Details["course"], r.Details["bursts"])
		}
		band, _ := r.Details["band_hz"].([]float64)
		switch wide := c.band[1] - c.band[0]; {
		case wide == 0 && band != nil:
			t.Errorf("%s: a band %v", c.name, band)
		case wide > 0 && (band == nil || band[0] < c.band[0]-0.2*wide || band[1] > c.band[1]+0.2*wide || band[1]-band[0] < 0.3*wide):
			t.Errorf("%s: band %v, want within %v", c.name, band, c.band)
		}
		if len(r.Opinions) != 1 || len(r.Figures) != 2 {
			t.Errorf("%s: %d opinions, %d figures", c.name, len(r.Opinions), len(r.Figures))
		}
	}
}

// Signals, edges, converter steps and coloured noise are no oscillation; the
// bound says what would have been seen.
func TestNoOscillation(t *testing.T) {
	const rate, n = 10e6, 60000
	r := rand.New(rand.NewPCG(1, 2))
	brown := trial.New(rate, n/rate)
	v := 0.0
	for i := range brown.X {
		v = 0.9999*v + 0.001*r.NormFloat64()
		brown.X[i] = v
	}
	for name, take := range map[string]*analyze.Take{
		"sine":                    trial.Take("t", signal(rate, n).Noise(0.002, 1)),
		"sine, 8 bits":            digitised(signal(rate, n), 8),
		"sine, 12 bits":           digitised(signal(rate, n), 12),
		"sine, 8 bits, noise 0.2": digitised(signal(rate, n).Noise(0.2/128, 3), 8),
		"square":                  trial.Take("t", square(rate, n).Noise(0.002, 1)),
		"square, 8 bits":          digitised(square(rate, n).Noise(0.002, 1), 8),
		"slow step":               trial.Take("t", of(rate, n, func(t float64) float64 { return 0.4 * firstOrder((t-3e-3)/1e-6) }).Noise(0.002, 1)),
		"fast step":               trial.Take("t", of(rate, n, func(t float64) float64 { return 0.4 * firstOrder((t-3e-3)/1e-8) }).Noise(0.0005, 1)),
		"high harmonics":          trial.Take("t", signal(rate, n).Tone(21000, 0.001, 1).Tone(23000, 0.001, 2).Tone(3000, 0.01, 1).Noise(0.0005, 1)),
		"brown noise":             trial.Take("t", brown),
	} {
		res := trial.Run(oscillation, analyze.Params{}, take)
		if res.Value != nil {
			t.Errorf("%s: %.3g V RMS at %v Hz, %v .. %v", name, *res.Value, res.Details["frequency_hz"], res.Details["from_s"], res.Details["to_s"])
			continue
		}
		if res.Refusal.Code != analyze.BelowDetection || res.Bound == nil || !res.Bound.Upper || res.Bound.Value <= 0 {
			t.Errorf("%s: %+v, bound %+v", name, res.Refusal, res.Bound)
		}
	}
	// A steady line of the size of the bound is found.
	clean := func() *trial.Signal { return signal(rate, n).Noise(0.002, 9) }
	bound := trial.Run(oscillation, analyze.Params{}, trial.Take("t", clean())).Bound.Value
	if bound > 0.002/5 {
		t.Errorf("bound %.3g V in noise of 2 mV over the whole band", bound)
	}
	if res := trial.Run(oscillation, analyze.Params{}, trial.Take("t", clean().Tone(613e3, bound*math.Sqrt2, 1))); res.Value == nil || math.Abs(*res.Value/bound-1) > 0.3 {
		t.Errorf("a line of %.3g V: %+v", bound, res.Value)
	}
	high := 4.5e6
	refused(t, "above the band", trial.Run(oscillation, analyze.Params{Above: &high}, trial.Take("t", clean())), analyze.Bandwidth)
	refused(t, "audio rate", trial.Run(oscillation, analyze.Params{}, trial.Take("t", trial.New(48000, 1).Noise(0.1, 1))), analyze.Bandwidth)
	refused(t, "constant", trial.Run(oscillation, analyze.Params{}, trial.Take("t", trial.New(rate, 0.001))), analyze.NoSignal)
	refused(t, "short", trial.Run(oscillation, analyze.Params{}, trial.Take("t", trial.New(rate, 10e-6).Noise(0.1, 1))), analyze.TooShort)
}

// Noise alone passes for an oscillation in one take of a thousand by design:
// none in 120 here.
func TestOscillationFalseAlarms(t *testing.T) {
	runs := 120
	if testing.Short() {
		runs = 30
	}
	for seed := range runs {
		r := trial.Run(oscillation, analyze.Params{}, trial.Take("t", trial.New(10e6, 0.4e-3).Tone(1000, 0.3, 0).Noise(0.003, uint64(seed))))
		if r.Value != nil {
			t.Errorf("seed %d: %.3g V at %v Hz", seed, *r.Value, r.Details["frequency_hz"])
		}
	}
}
