package tone

import (
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
	"benchslip/analyze/internal/trial"
)

// loopBench makes a take of a unit with one harmonic, and a loop, both through a
// recorder that adds its own. Harmonics are given relative to their
// fundamental, with their phase against order times its phase.
type loopBench struct {
	order      int
	unit, box  complex128 // of that order
	noise      float64    // RMS over the whole band, relative to the fundamental's peak
	in         bool       // the stimulus is recorded beside
	turn, gain float64    // phase and size of the unit's fundamental
	seed       uint64
}

func (l loopBench) takes() map[string]*analyze.Take {
	const rate, T, hz = 12000, 1.5, 631.7
	make := func(name string, own, size, phase float64, unit complex128, seed uint64) *analyze.Take {
		s := trial.New(rate, T).Tone(hz, size, phase).Noise(l.noise*size, seed)
		for _, z := range []complex128{unit, l.box} {
			if z != 0 {
				s.Tone(float64(l.order)*hz, size*math.Hypot(real(z), imag(z)), math.Atan2(imag(z), real(z))+float64(l.order)*phase)
			}
		}
		in := trial.New(rate, T).Tone(hz, own, 0.3).Noise(l.noise*own, seed+1)
		t := trial.Take(name, s, in)
		if l.in {
			t.Wiring.In = "2"
		}
		return t
	}
	return map[string]*analyze.Take{
		"take": make("t", 0.05, 0.5*l.gain, 0.3+l.turn, l.unit, l.seed),
		"loop": make("l", 0.4, 0.4, 0.3, 0, l.seed+50),
	}
}

func decibel(x float64) float64 { return 20 * math.Log10(x) }

// A recorder's harmonic 20, 10, 6 dB below the reading leaves the unit's
// within +0.83/-0.92, +2.39/-3.30, +3.53/-6.04 dB of it: 20 lg(1 +- 10^(-R/20)).
// 20 dB are needed for a full pass.
func TestLoopRange(t *testing.T) {
	for _, c := range []struct {
		R, up, down float64
		full        bool
	}{{20.5, 0.78, -0.86, true}, {20, 0.83, -0.92, true}, {19.5, 0.87, -0.97, false}, {10, 2.39, -3.30, false}, {6, 3.53, -6.04, false}} {
		own := 1e-2 * math.Pow(10, -c.R/20)
		if c.R == 20 {
			own *= 1 - 1e-4
		}
		b := loopBench{order: 2, unit: complex(1e-2-own, 0), box: complex(own, 0), noise: 1e-7, gain: 1, seed: 3}
		for _, m := range []*analyze.Measure{thd, harmonic} {
			r := trial.Between(b.takes()).Run(m, analyze.Params{})
			if r.Value == nil || r.Interval == nil {
				t.Fatalf("%g dB %s: %+v", c.R, m.Name, r.Refusal)
			}
			if math.Abs(*r.Value/1e-2-1) > 1e-4 {
				t.Errorf("%g dB %s: value %.6g is not the reading", c.R, m.Name, *r.Value)
			}
			if up, down := decibel(r.Interval[1]/1e-2), decibel(r.Interval[0]/1e-2); math.Abs(up-c.up) > 0.006 || math.Abs(down-c.down) > 0.006 {
				t.Errorf("%g dB %s: %+.3f %+.3f dB, want %+.2f %+.2f", c.R, m.Name, up, down, c.up, c.down)
			}
			if (r.Conditional == "") != c.full || !c.full && !strings.HasPrefix(r.Conditional, analyze.FloorLimited+": ") {
				t.Errorf("%g dB %s: conditional %q", c.R, m.Name, r.Conditional)
			}
		}
	}
}

// Whatever the phases, the range holds the unit's own; for THD+N with the
// noise, which the loop does not change.
func TestLoopRangeHolds(t *testing.T) {
	r := rand.New(rand.NewPCG(4, 4))
	for seed := uint64(0); seed < 12; seed++ {
		unit, own := 1e-3*math.Pow(10, -r.Float64()), 1e-3*math.Pow(10, -2*r.Float64())
		b := loopBench{order: 2 + int(seed%3), unit: polar(unit, r.Float64()*7), box: polar(own, r.Float64()*7), noise: 2e-5, gain: 1, turn: r.Float64() * 7, seed: seed * 3}
		on := trial.Between(b.takes())
		got := on.Run(harmonic, analyze.Params{Order: b.order})
		if got.Value == nil {
			t.Errorf("seed %d: %v", seed, got.Refusal)
			continue
		}
		u, _ := budget.Combine(got.Budget)
		if got.Interval[0]-3*u > unit || got.Interval[1]+3*u < unit {
			t.Errorf("seed %d: %.4g not in %.4g", seed, unit, *got.Interval)
		}
		band := analyze.Band{Low: 20, High: 5000}
		noise := 2e-5 * math.Sqrt(4980.0/6000) * math.Sqrt2
		want := math.Hypot(unit, noise) / math.Sqrt(1+unit*unit+noise*noise)
		for _, m := range []*analyze.Measure{thdn, sinad} {
			got := on.Run(m, analyze.Params{Band: &band})
			v := want
			if m == sinad {
				v = 1 / want
			}
			u, _ := budget.Combine(got.Budget)
			if got.Interval == nil || got.Interval[0]-3*u > v || got.Interval[1]+3*u < v {
				t.Errorf("seed %d: %s %.4g not in %.4g about %.4g", seed, m.Name, v, got.Interval, *got.Value)
			}
		}
	}
}

func polar(r, phi float64) complex128 { s, c := math.Sincos(phi); return complex(r*c, r*s) }

// With the stimulus beside in both takes the recorder's vector is taken off:
// what is left is the unit's within U, though the recorder's is as large.
func TestLoopVectors(t *testing.T) {
	r := rand.New(rand.NewPCG(5, 4))
	in, runs := 0, 40
	for seed := range runs {
		unit, own := 1e-3*math.Pow(10, -r.Float64()), 1e-3*math.Pow(10, 0.5-1.5*r.Float64())
		b := loopBench{order: 2 + seed%4, unit: polar(unit, r.Float64()*7), box: polar(own, r.Float64()*7), noise: 5e-5, in: true, gain: 1.4, turn: r.Float64() * 7, seed: uint64(seed) * 3}
		on := trial.Between(b.takes())
		got := on.Run(harmonic, analyze.Params{Order: b.order})
		if got.Value == nil || got.Interval != nil || got.Conditional != "" {
			t.Errorf("seed %d: %+v", seed, got.Refusal)
			continue
		}
		u, _ := budget.Combine(got.Budget)
		e := math.Abs(*got.Value-unit) / u
		if e <= 2 {
			in++
		}
		if e > 4.5 {
			t.Errorf("seed %d: %.5g for %.5g, %.1f u", seed, *got.Value, unit, e)
		}
		band := analyze.Band{Low: 20, High: 5000}
		noise := 5e-5 * math.Sqrt(4980.0/6000) * math.Sqrt2
		want := math.Hypot(unit, noise)
		res := on.Run(thdn, analyze.Params{Band: &band})
		u, _ = budget.Combine(res.Budget)
		if res.Value == nil || res.Interval != nil || math.Abs(*res.Value-want) > 4.5*u {
			t.Errorf("seed %d: THD+N %v for %.5g, u %.2g", seed, res.Value, want, u)
		}
	}
	if in < runs*85/100 {
		t.Errorf("only %d of %d within U", in, runs)
	}
}

// A clean unit: with phases known nothing is left, and the bound is that of
// the noise; without, the bound of the reading grows by the recorder's own.
func TestLoopOfACleanUnit(t *testing.T) {
	b := loopBench{order: 3, box: polar(1e-3, 1), noise: 5e-5, in: true, gain: 1, seed: 9}
	r := trial.Between(b.takes()).Run(harmonic, analyze.Params{Order: 3})
	if r.Value != nil || r.Bound == nil || r.Refusal.Code != analyze.BelowDetection || r.Bound.Value > 2e-5 {
		t.Errorf("known: %+v %+v", r.Refusal, r.Bound)
	}
	// The unit cancels the recorder's own: the reading shows nothing.
	b = loopBench{order: 3, unit: polar(1e-3, 1+math.Pi), box: polar(1e-3, 1), noise: 5e-5, gain: 1, seed: 9}
	r = trial.Between(b.takes()).Run(harmonic, analyze.Params{Order: 3})
	if r.Value != nil || r.Bound == nil || r.Bound.Value < 1e-3 || r.Bound.Value > 1.05e-3 {
		t.Errorf("unknown, cancelled: %+v %+v", r.Refusal, r.Bound)
	}
	b.in = true
	r = trial.Between(b.takes()).Run(harmonic, analyze.Params{Order: 3})
	if r.Value == nil || math.Abs(*r.Value/1e-3-1) > 0.02 {
		t.Errorf("known, cancelled: %+v", r.Refusal)
	}
}
