package oneshot

import (
	"math"
	"strings"
	"testing"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
	"benchslip/analyze/internal/trial"
	"benchslip/capture/recording"
	"benchslip/capture/recording/memory"
)

// of samples a function of time.
func of(rate float64, n int, f func(t float64) float64) *trial.Signal {
	s := &trial.Signal{Rate: rate, X: make([]float64, n)}
	for i := range s.X {
		s.X[i] = f(float64(i) / rate)
	}
	return s
}

// gauss is a step through a Gaussian system; its 10-90 % time is 2 x 1.2815516
// sigma (quantiles of the normal law).
func gauss(t, sigma float64) float64 { return math.Erfc(-t/sigma/math.Sqrt2) / 2 }

const gaussRise = 2 * 1.2815515655

// 3 us through an instrument of 2 us read 3.60555 us: root of the sum of
// squares, exact for Gaussian systems.
func TestInstrumentRise(t *testing.T) {
	take := trial.Take("t", of(20e6, 4000, func(t float64) float64 { return 0.8 * gauss(t-100.013e-6, 3.60555128e-6/gaussRise) }))
	v, _ := must(t, trial.Run(riseTime, analyze.Params{}, take))
	if math.Abs(v/3.60555128e-6-1) > 0.002 {
		t.Errorf("as read: %.6g s", v)
	}
	own := 2e-6
	r := trial.Run(riseTime, analyze.Params{InstrumentRise: &own}, take)
	v, _ = must(t, r)
	if math.Abs(v/3e-6-1) > 0.003 || len(r.Unstated) != 1 {
		t.Errorf("instrument taken off: %.6g s, unstated %v", v, r.Unstated)
	}
	v, _ = must(t, trial.Run(slewRate, analyze.Params{InstrumentRise: &own}, take))
	if math.Abs(v/(0.8*0.8/3e-6)-1) > 0.003 {
		t.Errorf("slew rate %.6g V/s", v)
	}
	own = 3.6054e-6
	r = trial.Run(riseTime, analyze.Params{InstrumentRise: &own}, take)
	refused(t, "no slower than the instrument", r, analyze.FloorLimited)
	if r.Bound == nil || !r.Bound.Upper || r.Bound.Value < 0.1e-6 || r.Bound.Value > 1e-6 {
		t.Errorf("bound %+v", r.Bound)
	}
	own = 5e-6
	refused(t, "faster than the instrument", trial.Run(riseTime, analyze.Params{InstrumentRise: &own}, take), analyze.Impossible)
}

// Edges of a few samples: within one of them, and U says so; an edge between
// two samples gives a bound.
func TestFewSamples(t *testing.T) {
	for _, sigma := range []float64{0.7, 1, 1.5, 2, 3, 5} {
		for k := range 10 {
			at := 60 + float64(k)/10
			take := trial.Take("t", of(1, 200, func(t float64) float64 { return 0.8 * gauss(t-at, sigma) }))
			r := trial.Run(riseTime, analyze.Params{}, take)
			if r.Value == nil {
				if r.Bound == nil || r.Bound.Value < sigma*gaussRise-0.5 {
					t.Errorf("sigma %g: %+v, bound %+v", sigma, r.Refusal, r.Bound)
				}
				continue
			}
			v, u := must(t, r)
			err := math.Abs(v - gaussRise*sigma)
			if err > 1 || err > u {
				t.Errorf("sigma %g at %g: %.3f samples, want %.3f, U %.3f", sigma, at, v, gaussRise*sigma, u)
			}
			if n := r.Details["samples_in_edge"].(int); n < 4 && u < 1 {
				t.Errorf("sigma %g: %d samples in the edge, U only %.3f of one", sigma, n, u)
			}
		}
	}
	sharp := trial.Take("t", of(1, 200, func(t float64) float64 { return map[bool]float64{true: 0.5}[t >= 60] }))
	r := trial.Run(riseTime, analyze.Params{}, sharp)
	refused(t, "ideal step", r, analyze.NotEnoughPoints)
	if r.Bound == nil || !r.Bound.Upper || r.Bound.Value != 1 {
		t.Errorf("bound of an ideal step: %+v, want one sample", r.Bound)
	}
	r = trial.Run(slewRate, analyze.Params{}, sharp)
	if r.Bound == nil || r.Bound.Upper || math.Abs(r.Bound.Value-0.4) > 1e-9 {
		t.Errorf("bound of its slew rate: %+v, want 0.8 x 0.5 V in one sample", r.Bound)
	}
}

// Which transition is measured: the first over half of the largest, in the
// direction asked for; others are counted.
func TestWhichTransition(t *testing.T) {
	edge := func(t, at, tau float64) float64 { return firstOrder((t - at) / tau) }
	stairs := trial.Take("stairs", of(1, 10000, func(t float64) float64 {
		return 0.15*edge(t, 3000, 20) + 0.5*edge(t, 4000, 30) + 0.3*edge(t, 7000, 50)
	}).Noise(0.0015, 4))
	pulse := trial.Take("pulse", of(1, 10000, func(t float64) float64 { return 0.7*edge(t, 3000, 20) - 0.7*edge(t, 6000, 45) }).Noise(0.001, 3))
	square := trial.Take("square", of(1, 20000, func(t float64) float64 {
		v := -0.4
		for k := range 10 {
			v += 0.8 * float64(1-2*(k%2)) * edge(t, 900+2000*float64(k), []float64{20, 33}[k%2])
		}
		return v
	}))
	ringing := trial.Take("ringing", of(1, 20000, func(t float64) float64 { return 0.5 * secondOrder(0.05)((t-2000.3)/30) }))
	for _, c := range []struct {
		name   string
		m      *analyze.Measure
		take   *analyze.Take
		want   float64
		others int
	}{
		{"second step of three", riseTime, stairs, 30 * math.Log(9), 2},
		{"pulse rises", riseTime, pulse, 20 * math.Log(9), 1},
		{"pulse falls", fallTime, pulse, 45 * math.Log(9), 1},
		{"square rises", riseTime, square, 20 * math.Log(9), 9},
		{"square falls", fallTime, square, 33 * math.Log(9), 9},
		{"hardly damped", overshoot, ringing, math.Exp(-math.Pi * 0.05 / math.Sqrt(1-0.0025)), 0},
	} {
		r := trial.Run(c.m, analyze.Params{}, c.take)
		v, _ := must(t, r)
		if math.Abs(v/c.want-1) > 0.01 || r.Details["other_transitions"] != c.others {
			t.Errorf("%s: %.5g, want %.5g; %v others, want %d", c.name, v, c.want, r.Details["other_transitions"], c.others)
		}
	}
	refused(t, "no falling step", trial.Run(fallTime, analyze.Params{}, stairs), analyze.NoSignal)
}

// Nothing that is no step passes for one.
func TestNoStep(t *testing.T) {
	for name, s := range map[string]*trial.Signal{
		"sine":     trial.New(10000, 1).Tone(3, 0.5, 0.4),
		"noise":    trial.New(10000, 1).Noise(0.1, 2),
		"triangle": of(1, 10000, func(t float64) float64 { return math.Abs(math.Mod(t, 2000)-1000) / 1100 }),
		"constant": trial.New(10000, 1).DC(0.3),
		"ramp":     of(1, 1000, func(t float64) float64 { return t / 1100 }),
		"short":    of(1, 3, func(t float64) float64 { return t / 4 }),
	} {
		for _, m := range []*analyze.Measure{riseTime, slewRate, overshoot, settlingTime, droop} {
			if r := trial.Run(m, analyze.Params{}, trial.Take("t", s)); r.Value != nil {
				t.Errorf("%s: %s = %g", name, m.Name, *r.Value)
			} else if r.Refusal == nil {
				t.Errorf("%s: %s gives neither value nor reason", name, m.Name)
			}
		}
	}
}

// A ramp with corners has no overshoot, in noise either; its slew rate is its
// slope.
func TestRamp(t *testing.T) {
	take := trial.Take("t", of(1e6, 3000, func(t float64) float64 { return 0.8*math.Min(1, math.Max(0, (t-600.3e-6)/100e-6)) - 0.4 }).Noise(0.004, 3))
	if v, u := must(t, trial.Run(overshoot, analyze.Params{}, take)); v != 0 || u > 0.006 {
		t.Errorf("overshoot %g, U %g", v, u)
	}
	if v, _ := must(t, trial.Run(slewRate, analyze.Params{}, take)); math.Abs(v/8000-1) > 0.005 {
		t.Errorf("slew rate %g V/s, want 8000", v)
	}
}

// A step that is still on its way is not settled; noise that fills the band
// says so.
func TestNotSettled(t *testing.T) {
	short := shotOf{form: firstOrder, size: 0.9, rate: 1e6, scale: 100e-6, n: 800, t0: 500e-6} // 3 time constants
	refused(t, "three time constants", trial.Run(settlingTime, analyze.Params{}, short.take()), analyze.TooShort)
	ring := shotOf{form: secondOrder(0.02), size: 0.5, rate: 1e6, scale: 20e-6, n: 2500, t0: 500e-6}
	r := trial.Run(settlingTime, analyze.Params{}, ring.take())
	if r.Value != nil {
		t.Errorf("ringing to the end: %g", *r.Value)
	}
	noisy := shotOf{form: firstOrder, size: 0.9, rate: 1e6, scale: 10e-6, n: 2500, t0: 500e-6, noise: 0.03}
	refused(t, "noise", trial.Run(settlingTime, analyze.Params{}, noisy.take()), analyze.FloorLimited)
}

// A flat behind a coupling capacitor falls by 1 - exp(-T/RC).
func TestDroop(t *testing.T) {
	for _, bits := range []int{0, 12, 8} {
		for _, fall := range []float64{0.02, 0.1, 0.35, 0.7} {
			const length = 10000
			tau := -length / math.Log(1-fall)
			decay := func(x float64) float64 { return math.Exp(-math.Max(x, 0) / tau) }
			single := of(1, 14000, func(t float64) float64 {
				if t < 4000.5 {
					return 0
				}
				return 0.9 * decay(t-4000.5) * firstOrder((t-4000.5)/4)
			})
			square := of(1, 20000, func(t float64) float64 { // its own steady state, whatever lies before it
				turn := math.Mod(t+300.3, 2000)
				level := 0.9 / (2 - fall)
				if turn < 1000 {
					return level * math.Exp(turn/1000*math.Log(1-fall))
				}
				return -level * math.Exp((turn-1000)/1000*math.Log(1-fall))
			})
			for name, s := range map[string]*trial.Signal{"single": single, "square": square} {
				take := trial.Take("t", s)
				if bits > 0 {
					take = trial.Bits(trial.Take("t", s.Noise(0.5*math.Exp2(float64(1-bits)), 3).Quantise(bits, false, 1)), bits)
				}
				v, u := must(t, trial.Run(droop, analyze.Params{}, take))
				limit := 0.01 * fall
				if bits == 8 {
					limit = math.Max(0.03*fall, 0.001)
				}
				if err := math.Abs(v - fall); err > limit || err > 1.5*u {
					t.Errorf("%s, %d bits: droop %.5f, want %.5f, U %.2g", name, bits, v, fall, u)
				}
			}
		}
	}
}

// A thump V exp(-t/tau): the area is V tau, it settles to 2 % after tau ln 50.
func TestThump(t *testing.T) {
	for _, bits := range []int{0, 12, 8} {
		for _, tau := range []float64{0.02, 0.3, 1.5} {
			s := of(2000, 30000, func(t float64) float64 {
				if t < 4.0003 {
					return 0.02
				}
				return 0.02 - 0.8*math.Exp(-(t-4.0003)/tau)
			})
			take := trial.Take("t", s)
			limit := 0.01
			if bits > 0 {
				take = trial.Bits(trial.Take("t", s.Noise(0.4*math.Exp2(float64(1-bits)), 3).Quantise(bits, false, 1)), bits)
				if bits == 8 {
					limit = 0.03
				}
			}
			r := trial.Run(thump, analyze.Params{}, take)
			v, u := must(t, r)
			if math.Abs(v-0.8) > math.Max(limit*0.8, u) || u > 0.04 {
				t.Errorf("%d bits, tau %g: thump %.4f V, U %.3g", bits, tau, v, u)
			}
			if a := r.Details["area_vs"].(float64); math.Abs(a+0.8*tau) > math.Max(limit*0.8*tau, 1.5*r.Details["area_uncertainty_vs"].(float64)) {
				t.Errorf("%d bits, tau %g: area %.5g V s, want %.5g", bits, tau, a, -0.8*tau)
			}
			if d, ok := r.Details["settle_s"].(float64); !ok || math.Abs(d-tau*math.Log(50)) > 2*limit*tau*math.Log(50)+1e-3 {
				t.Errorf("%d bits, tau %g: settles in %v s, want %.4g", bits, tau, r.Details["settle_s"], tau*math.Log(50))
			}
		}
	}
	relay := trial.Take("t", of(1000, 10000, func(t float64) float64 { return 0.3 * firstOrder((t-5)/0.1) }).Noise(0.001, 2))
	r := trial.Run(thump, analyze.Params{}, relay)
	if v, _ := must(t, r); math.Abs(v-0.3) > 0.006 {
		t.Errorf("lasting change: %g V", v)
	}
	ac := trial.Take("t", of(1000, 10000, func(t float64) float64 { return 0.3 * firstOrder((t-5)/0.1) }))
	ac.Gear.DC = false
	refused(t, "AC-coupled", trial.Run(thump, analyze.Params{}, ac), analyze.ACCoupled)
	r = trial.Run(thump, analyze.Params{}, trial.Take("t", trial.New(1000, 10).Noise(0.001, 4)))
	refused(t, "nothing happens", r, analyze.BelowDetection)
	if r.Bound == nil || r.Bound.Value < 0.003 || r.Bound.Value > 0.006 {
		t.Errorf("bound of nothing: %+v", r.Bound)
	}
	late := trial.Take("t", of(1000, 10000, func(t float64) float64 { return 0.5 * math.Exp(-t) }))
	refused(t, "no quiet part", trial.Run(thump, analyze.Params{}, late), analyze.TooShort)
}

// Ripple behind a full-wave rectifier: peak to peak as it stands, mains part
// from orders 2, 4, 6 (lines at twice the mains), long and short takes.
func TestRipple(t *testing.T) {
	rms := []float64{0, 0.01, 0, 0.003, 0, 0.001}
	mains := math.Sqrt(1e-4 + 9e-6 + 1e-6)
	for _, seconds := range []float64{0.05, 0.1, 0.6, 2} {
		s := trial.New(50000, seconds).Mains(50.05, 0, rms, 3).Noise(0.002, 3).DC(0.3)
		lo, hi := math.Inf(1), math.Inf(-1)
		for _, v := range s.X {
			lo, hi = math.Min(lo, v), math.Max(hi, v)
		}
		r := trial.Run(ripple, analyze.Params{}, trial.Take("t", s))
		if v, _ := must(t, r); v != hi-lo {
			t.Errorf("%g s: %g V, want %g", seconds, v, hi-lo)
		}
		if m := r.Details["mains_v"].(float64); math.Abs(m/mains-1) > 0.02 {
			t.Errorf("%g s: mains part %.5g V, want %.5g", seconds, m, mains)
		}
		if m := r.Details["rest_v"].(float64); math.Abs(m/0.002-1) > 0.1 {
			t.Errorf("%g s: rest %.5g V, want 0.002", seconds, m)
		}
		if len(r.Opinions) != 1 {
			t.Errorf("%g s: opinions %v", seconds, r.Opinions)
		}
	}
	r := trial.Run(ripple, analyze.Params{}, trial.Take("t", trial.New(1e6, 0.005).Noise(0.01, 1)))
	if _, ok := r.Details["mains_v"]; ok || len(r.Notes) != 1 {
		t.Errorf("5 ms: %v, notes %v", r.Details, r.Notes)
	}
	refused(t, "constant", trial.Run(ripple, analyze.Params{}, trial.Take("t", trial.New(1000, 1))), analyze.NoSignal)
}

// Scale, offset and clock enter where they belong; without volts the results
// are in full scale.
func TestUnitsAndBudget(t *testing.T) {
	data := shotOf{form: firstOrder, size: 0.9, rate: 1e6, scale: 20e-6, n: 1000, t0: 300e-6}.take().Rec.(*memory.Recording).Data[0]
	bare := &analyze.Take{Name: "bare", Rec: memory.New(recording.Audio, 1e6, data), Gear: &analyze.Gear{Name: "box", Kind: recording.Audio, DC: true}}
	scale := 0.015
	scope := &analyze.Take{Name: "scope", Rec: memory.New(recording.Scope, 1e6, data),
		Gear: &analyze.Gear{Name: "scope", Kind: recording.Scope, Probe: 10, ScaleU: &scale, DC: true, Clock: 1e-3, OffsetU: 0.1}}
	for m, unit := range map[*analyze.Measure]string{slewRate: "FS/s", ripple: "FS", thump: "FS", riseTime: "s", overshoot: "%"} {
		if r := trial.Run(m, analyze.Params{}, bare); r.Unit.Symbol != unit {
			t.Errorf("%s of an uncalibrated take in %q, want %q", m.Name, r.Unit.Symbol, unit)
		}
	}
	r := trial.Run(slewRate, analyze.Params{}, scope)
	v, _ := must(t, r)
	if want := 10 * 0.8 * 0.9 / (20e-6 * math.Log(9)); math.Abs(v/want-1) > 0.01 {
		t.Errorf("probe of 10: %g V/s, want %g", v, want)
	}
	find := func(r analyze.Result, word string) float64 {
		for _, l := range r.Budget {
			if strings.Contains(l.Name, word) {
				return l.U
			}
		}
		return 0
	}
	if c, k := find(r, "calibration"), find(r, "time base"); math.Abs(c/v-0.015) > 1e-6 || math.Abs(k/v-1e-3) > 1e-6 {
		t.Errorf("calibration %g, time base %g of the slew rate", c/v, k/v)
	}
	r = trial.Run(riseTime, analyze.Params{}, scope)
	if find(r, "calibration") != 0 || find(r, "time base") == 0 {
		t.Errorf("budget of the rise time: %+v", r.Budget)
	}
	r = trial.Run(overshoot, analyze.Params{}, scope)
	if find(r, "calibration") != 0 || find(r, "time base") != 0 {
		t.Errorf("budget of the overshoot: %+v", r.Budget)
	}
	if u, _ := budget.Combine(trial.Run(thump, analyze.Params{}, scope).Budget); u < 0.015*9*0.99 {
		t.Errorf("thump: u = %g V", u)
	}
}
