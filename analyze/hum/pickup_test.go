package hum

import (
	"math"
	"math/cmplx"
	"math/rand/v2"
	"strings"
	"testing"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
	"benchslip/analyze/internal/trial"
	"benchslip/capture/recording"
	"benchslip/capture/unit"
)

// bench makes takes of a cable run: channel 1 the receiver's output, channel 2
// a mains reference of clean level 0.1 V with its own harmonics, noise 40 dB
// below it. Each take has a supply of its own.
type bench struct {
	rate, T  float64
	noise    float64
	wander   float64 // of the reference's and the hum's harmonics, rad
	refLevel float64
}

func (b bench) take(name string, seed uint64, hum map[int]complex128) *analyze.Take {
	r := rand.New(rand.NewPCG(seed, 13))
	first := r.Float64() * 6
	m := supply{hz: 49.8 + 0.4*r.Float64(), drift: 0.02, period: 17, seed: seed}
	out, ref := trial.New(b.rate, b.T), trial.New(b.rate, b.T)
	rms, phase := map[int]float64{}, map[int]float64{}
	for o, z := range hum {
		rms[o], phase[o] = cmplx.Abs(z), cmplx.Phase(z)+float64(o)*first
	}
	w := m
	w.wander, w.swing = b.wander, 7
	w.wave(out, rms, phase)
	level := b.refLevel
	if level == 0 {
		level = 0.1
	}
	m.wave(ref, map[int]float64{1: level}, map[int]float64{1: first})
	w.wander = 0.4 // loads nearby
	w.wave(ref, map[int]float64{3: level / 10, 5: level / 12, 7: level / 20}, nil)
	out.Noise(b.noise, seed+500)
	ref.Noise(level/100, seed+900)
	t := trial.Take(name, out, ref)
	t.Wiring.Mains = "2"
	t.Where = []analyze.Condition{{Key: "gain", Value: "40 dB"}}
	return t
}

func length(m float64) *analyze.Stated {
	u := unit.New(1, "%")
	return &analyze.Stated{Value: unit.New(m, "m"), Uncertainty: &u, Key: "length"}
}

// Equal baseline and pick-up at every angle, reference 40 dB over its noise:
// within 3 %.
func TestPickupWithReference(t *testing.T) {
	inside, n := 0, 0
	for seed := uint64(0); seed < 12; seed++ {
		r := rand.New(rand.NewPCG(seed, 3))
		base, run := map[int]complex128{}, map[int]complex128{}
		want := 0.0
		for i, o := range []int{1, 3, 5, 9, 15} {
			size := 1e-4 / float64(i+1)
			b, p := cmplx.Rect(size, 6.3*r.Float64()), cmplx.Rect(size, 6.3*r.Float64())
			base[o], run[o] = b, b+p
			want = math.Hypot(want, size)
		}
		want /= 85 * 100
		b := bench{rate: 4000, T: 10, noise: 3e-5}
		roles := map[string]*analyze.Take{"take": b.take("run", 2*seed+1, run), "baseline": b.take("base", 2*seed+2, base)}
		gain := unit.New(40, "dB")
		res := trial.Between(roles).Run(pickup, analyze.Params{Length: length(85), Gain: &analyze.Stated{Value: gain, Key: "gain"}})
		if res.Value == nil {
			t.Fatalf("%+v", res.Refusal)
		}
		u, _ := budget.Combine(res.Budget)
		n++
		if math.Abs(*res.Value-want) <= 2*u {
			inside++
		}
		if math.Abs(*res.Value/want-1) > 0.03 {
			t.Errorf("seed %d: %.4g V/m, want %.4g V/m (%+.2f %%), U %.2g", seed, *res.Value, want, 100*(*res.Value/want-1), 2*u)
		}
		if res.Interval != nil || len(res.Flags) != 0 {
			t.Errorf("interval %v, flags %v", res.Interval, res.Flags)
		}
	}
	if inside < n-1 {
		t.Errorf("%d of %d within U", inside, n)
	}
}

// Phases that wander are printed and enter the uncertainty; a reference whose
// level changes does too.
func TestPickupWander(t *testing.T) {
	hum := map[int]complex128{1: 1e-4, 3: 5e-5i, 5: 4e-5}
	base := map[int]complex128{1: 2e-5}
	b := bench{rate: 4000, T: 10, noise: 1e-5, wander: 1.2}
	roles := map[string]*analyze.Take{"take": b.take("run", 1, hum), "baseline": b.take("base", 2, base)}
	res := trial.Between(roles).Run(pickup, analyze.Params{Length: length(10)})
	want := math.Sqrt(8e-5*8e-5+5e-5*5e-5+4e-5*4e-5) / 10
	u, _ := budget.Combine(res.Budget)
	lost, _ := res.Details["incoherence_v"].(float64)
	if res.Value == nil || lost < 1e-6 || math.Abs(*res.Value-want) > 2*u {
		t.Errorf("value %v +- %.3g, want %.4g, lost %.3g", res.Value, 2*u, want, lost)
	}
	b = bench{rate: 4000, T: 10, noise: 1e-5}
	louder := b
	louder.refLevel = 0.12
	roles = map[string]*analyze.Take{"take": b.take("run", 1, hum), "baseline": louder.take("base", 2, base)}
	res = trial.Between(roles).Run(pickup, analyze.Params{Length: length(10)})
	found := false
	for _, c := range res.Budget {
		if strings.Contains(c.Name, "reference") {
			found = true
			if want := (1 - 1/1.2) * 2e-5 / math.Sqrt(3) / 10; math.Abs(c.U/want-1) > 0.05 {
				t.Errorf("level change gives %.3g, want %.3g", c.U, want)
			}
		}
	}
	if !found {
		t.Errorf("no contributor for the reference's level: %+v", res.Budget)
	}
}

// Without a reference: the larger at each order, the range from difference to
// sum; without a baseline the whole hum with a flag.
func TestPickupWithoutReference(t *testing.T) {
	run, base := map[int]complex128{1: 1e-4, 3: 2e-5}, map[int]complex128{1: 4e-5, 3: 3e-5}
	b := bench{rate: 4000, T: 5, noise: 1e-6}
	r, q := b.take("run", 1, run), b.take("base", 2, base)
	r.Wiring.Mains, q.Wiring.Mains = "", ""
	res := trial.Between(map[string]*analyze.Take{"take": r, "baseline": q}).Run(pickup, analyze.Params{Length: length(20)})
	if res.Value == nil || res.Interval == nil {
		t.Fatalf("%+v", res)
	}
	for _, c := range []struct{ got, want float64 }{
		{*res.Value, math.Hypot(1e-4, 3e-5)}, {res.Interval[0], math.Hypot(6e-5, 1e-5)}, {res.Interval[1], math.Hypot(14e-5, 5e-5)},
	} {
		if math.Abs(c.got*20/c.want-1) > 0.01 {
			t.Errorf("got %.4g V, want %.4g V", c.got*20, c.want)
		}
	}
	alone := trial.Between(map[string]*analyze.Take{"take": r}).Run(pickup, analyze.Params{Length: length(20)})
	if alone.Value == nil || math.Abs(*alone.Value*20/math.Hypot(1e-4, 2e-5)-1) > 0.01 || len(alone.Flags) != 1 || alone.Flags[0].Code != recording.NoBaseline {
		t.Errorf("no baseline: %+v %+v", alone.Value, alone.Flags)
	}
}

func TestPickupRefusals(t *testing.T) {
	hum := map[int]complex128{1: 1e-4}
	b := bench{rate: 4000, T: 3, noise: 1e-6}
	for _, c := range []struct {
		name   string
		change func(run, base *analyze.Take)
		want   string
	}{
		{"other gain", func(run, base *analyze.Take) { base.Where[0].Value = "20 dB" }, analyze.NotApplicable},
		{"same gain in other words", func(run, base *analyze.Take) { base.Where[0].Value = "40.0 dB" }, ""},
		{"gain not stated", func(run, base *analyze.Take) { base.Where = nil }, analyze.NotApplicable},
		{"other gear", func(run, base *analyze.Take) { base.Gear.Name = "other" }, analyze.NotApplicable},
		{"other channel", func(run, base *analyze.Take) { base.Wiring.Out, base.Wiring.Mains = "2", "1" }, analyze.NotApplicable},
		{"no volts", func(run, base *analyze.Take) { run.Gear.FullScalePeak = 0 }, analyze.Uncalibrated},
	} {
		run, base := b.take("run", 1, hum), b.take("base", 2, map[int]complex128{1: 2e-5})
		c.change(run, base)
		r := trial.Between(map[string]*analyze.Take{"take": run, "baseline": base}).Run(pickup, analyze.Params{Length: length(5)})
		code := ""
		if r.Refusal != nil {
			code = r.Refusal.Code
		}
		if code != c.want {
			t.Errorf("%s: %q, want %q", c.name, code, c.want)
		}
	}
	silent := trial.Between(map[string]*analyze.Take{"take": b.take("run", 1, nil), "baseline": b.take("base", 2, nil)}).Run(pickup, analyze.Params{Length: length(5)})
	if silent.Refusal == nil || silent.Refusal.Code != analyze.BelowDetection || silent.Bound == nil || silent.Bound.Value > 1e-6 {
		t.Errorf("no hum: %+v %+v", silent.Refusal, silent.Bound)
	}
	same := trial.Between(map[string]*analyze.Take{"take": b.take("run", 1, hum), "baseline": b.take("base", 2, hum)}).Run(pickup, analyze.Params{Length: length(5)})
	if same.Value != nil && *same.Value > 1e-7 || same.Value == nil && same.Bound.Value > 1e-7 {
		t.Errorf("nothing added: %v %+v", same.Value, same.Bound)
	}
}

// Hum with a baseline keeps its value and answers "cable or receiver?".
func TestCableOrReceiver(t *testing.T) {
	b := bench{rate: 4000, T: 5, noise: 1e-6}
	for _, c := range []struct {
		run, base complex128
		want      string
	}{{1e-3 + 1e-4, 1e-4, "the cable, by"}, {1e-3 + 5e-5, 1e-3, "the receiver, by"}} {
		roles := map[string]*analyze.Take{"take": b.take("run", 1, map[int]complex128{1: c.run}), "baseline": b.take("base", 2, map[int]complex128{1: c.base})}
		r := trial.Between(roles).Run(hum, analyze.Params{})
		if r.Value == nil || math.Abs(*r.Value/cmplx.Abs(c.run)-1) > 2e-3 {
			t.Errorf("%s: value %v, want %g", c.want, r.Value, cmplx.Abs(c.run))
		}
		if !strings.Contains(strings.Join(r.Opinions, "\n"), c.want) {
			t.Errorf("want %q in %q", c.want, r.Opinions)
		}
		if d, _ := r.Details["added_v"].(float64); math.Abs(d/cmplx.Abs(c.run-c.base)-1) > 0.01 {
			t.Errorf("added %v, want %g", r.Details["added_v"], cmplx.Abs(c.run-c.base))
		}
	}
}
