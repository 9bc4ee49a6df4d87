package hum

import (
	"math"
	"math/rand/v2"
	"testing"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
	"benchslip/analyze/internal/trial"
	"benchslip/analyze/stage"
	"benchslip/capture/unit"
)

func harmonics(t *testing.T, r analyze.Result) []map[string]any {
	t.Helper()
	list, ok := r.Details["harmonics"].([]map[string]any)
	if !ok {
		t.Fatalf("no harmonics: %+v", r.Refusal)
	}
	return list
}

// Lines at least 6 dB over a block's noise share against the Cramer-Rao bound
// of an amplitude in white noise, var A = 2 sigma^2/N (Rife and Boorstyn 1974):
// RMS error at most 1.15 times it, none over 5; uncertainties cover 95 %, none
// under 90 %, and twice them covers all. The mains drifts by tens of
// millihertz, phases of harmonics wander against the fundamental.
func TestLinesAgainstBound(t *testing.T) {
	const rate, T, noise = 4000, 10.0, 0.01
	orders := []int{1, 2, 3, 4, 5, 7, 9, 11, 13, 17, 19}
	over := []float64{300, 5, 100, 2.1, 60, 30, 2.5, 20, 4, 2.1, 40} // RMS over a block's share
	seeds := 25
	if testing.Short() {
		seeds = 8
	}
	for _, c := range []struct {
		name                string
		hz, drift, wander   float64
		tone                float64
		most, mostFrequency float64 // RMS over the bound; Hz
	}{
		{"50 Hz", 49.9, 0, 0, 0, 1.15, 2e-4},
		{"low, drifting", 49.53, 0.03, 0, 0, 1.15, 3e-4},
		{"60 Hz, drifting, with a tone", 60.4, 0.03, 0, 1042.3, 1.15, 3e-4},
		{"wandering phases", 50.3, 0.03, 1, 0, 1.25, 2e-3}, // weak lines cannot tell wander from noise
	} {
		t.Run(c.name, func(t *testing.T) {
			share := noise * math.Sqrt(2.0/rate)
			bound := share / math.Sqrt(2*T)
			var sum, n, hz2, inside, twice, all float64
			worst := 0.0
			covered := map[int]float64{}
			for seed := 0; seed < seeds; seed++ {
				m := supply{hz: c.hz, drift: c.drift, period: 17, wander: c.wander, swing: 7, seed: uint64(seed)}
				rms := map[int]float64{}
				for i, o := range orders {
					rms[o] = share * over[i]
				}
				s := trial.New(rate, T)
				m.wave(s, rms, nil)
				if c.tone > 0 {
					s.Tone(c.tone, 0.5, 1)
				}
				s.Noise(noise, uint64(seed)+100)
				p := trial.Pass(hum, analyze.Params{}, map[string]*analyze.Take{"take": trial.Take("t", s)})
				p.MainsHz = 10 * math.Round(c.hz/10)
				res := hum.Run(p)
				for _, l := range harmonics(t, res) {
					o := l["order"].(int)
					err := l["rms_v"].(float64) - rms[o]
					U := l["uncertainty_v"].(float64)
					all++
					if math.Abs(err) <= U {
						inside++
						covered[o]++
					}
					if math.Abs(err) <= 2*U {
						twice++
					}
					if rms[o] > 0 {
						sum += err * err / (bound * bound)
						worst = math.Max(worst, math.Abs(err)/bound)
						n++
					}
				}
				d := res.Details["mains_hz"].(float64) - m.mean(T)
				hz2 += d * d / float64(seeds)
			}
			t.Logf("RMS %.3f, worst %.2f of the bound; within U %.3f, 2U %.4f; mains %.2g Hz", math.Sqrt(sum/n), worst, inside/all, twice/all, math.Sqrt(hz2))
			if math.Sqrt(sum/n) > c.most || worst > 5 {
				t.Errorf("RMS %.3f, worst %.2f of the bound", math.Sqrt(sum/n), worst)
			}
			if inside/all < 0.94 || twice/all < 0.999 {
				t.Errorf("%.3f within U, %.4f within 2U", inside/all, twice/all)
			}
			for o, k := range covered {
				if seeds >= 20 && k/float64(seeds) < 0.8 { // 0.95 less three deviations of 25 trials
					t.Errorf("order %d: %.2f within U", o, k/float64(seeds))
				}
			}
			if math.Sqrt(hz2) > c.mostFrequency {
				t.Errorf("mains frequency off by %.2g Hz", math.Sqrt(hz2))
			}
		})
	}
}

// Hum at and under the noise: found without bias, or bounded; bounds hold at
// 95 %, noise alone is no hum.
func TestFaintHum(t *testing.T) {
	const rate, noise = 4000, 0.01
	share := noise * math.Sqrt(2.0/rate)
	seeds := 12
	for _, c := range []struct {
		name  string
		T     float64
		over  float64
		order []int
		seen  float64 // least share of takes where it is found
	}{
		{"noise alone", 5, 0, nil, 0},
		{"under the noise", 10, 0.7, []int{1, 3}, 0},
		{"at the noise", 5, 1.3, []int{3}, 0},
		{"three lines 10 dB over a block's share", 10, 3.2, []int{1, 3, 5}, 1},
		{"one high line", 10, 3.2, []int{7}, 0.9},
	} {
		t.Run(c.name, func(t *testing.T) {
			seen, held, bounded, inside := 0.0, 0.0, 0.0, 0.0
			mean := 0.0
			for seed := 0; seed < seeds; seed++ {
				r := rand.New(rand.NewPCG(uint64(seed), 8))
				m := supply{hz: 49.55 + 0.9*r.Float64(), drift: 0.02, period: 17, seed: uint64(seed)}
				s := trial.New(rate, c.T)
				rms := map[int]float64{}
				for _, o := range c.order {
					rms[o] = c.over * share
				}
				want := c.over * share * math.Sqrt(float64(len(c.order)))
				m.wave(s, rms, nil)
				s.Noise(noise, uint64(seed)+300)
				res := trial.Run(hum, analyze.Params{}, trial.Take("t", s))
				switch {
				case res.Value != nil:
					seen++
					u, _ := budget.Combine(res.Budget)
					mean += (*res.Value - want) / want
					if math.Abs(*res.Value-want) <= 2*u {
						inside++
					}
				case res.Bound == nil || !res.Bound.Upper || res.Refusal.Code != analyze.BelowDetection:
					t.Fatalf("%+v", res.Refusal)
				default:
					bounded++
					if res.Bound.Value >= want {
						held++
					}
				}
			}
			t.Logf("found in %.0f of %d, %.0f within U, mean error %+.3f; %.0f of %.0f bounds hold", seen, seeds, inside, mean/math.Max(seen, 1), held, bounded)
			if seen < c.seen*float64(seeds) || c.over == 0 && seen > 0 {
				t.Errorf("found in %.0f of %d", seen, seeds)
			}
			if held < 0.8*bounded {
				t.Errorf("%.0f of %.0f bounds hold", held, bounded)
			}
			if inside < 0.8*seen {
				t.Errorf("%.0f of %.0f within U", inside, seen)
			}
			if c.seen == 1 && math.Abs(mean/seen) > 0.03 {
				t.Errorf("mean error %+.3f", mean/seen)
			}
		})
	}
}

// Lines 20 dB below the total noise, unbiased; check value HM-03 style:
// 30, 10, 5 uV make 32.0156 uV (root of the sum of squares).
func TestBelowTotalNoise(t *testing.T) {
	const noise = 300e-6
	mean := 0.0
	const seeds = 6
	for seed := uint64(0); seed < seeds; seed++ {
		m := supply{hz: 50.21, drift: 0.03, period: 17, wander: 0.4, swing: 7, seed: seed}
		s := trial.New(8000, 10)
		m.wave(s, map[int]float64{1: 30e-6, 2: 10e-6, 3: 5e-6}, nil)
		s.Noise(noise, seed)
		res := trial.Run(hum, analyze.Params{Wiring: analyze.Wiring{}, Harmonics: 3}, trial.Take("t", s))
		if res.Value == nil {
			t.Fatal(res.Refusal)
		}
		mean += *res.Value / seeds
	}
	if math.Abs(mean/32.0156212e-6-1) > 0.05 { // three deviations of the mean
		t.Errorf("mean %.3f uV, want 32.016 uV", mean*1e6)
	}
}

// Supplies: stated ones of any frequency, and those found.
func TestSupplies(t *testing.T) {
	for _, c := range []struct {
		name       string
		rate, T    float64
		hz, stated float64
		rms        map[int]float64
	}{
		{"50 found", 4000, 5, 49.97, 0, map[int]float64{1: 1, 3: 0.4, 5: 0.2}},
		{"60 found", 4000, 5, 60.02, 0, map[int]float64{1: 1, 2: 0.2, 3: 0.4, 5: 0.2}},
		{"60 found by ripple", 4000, 5, 59.98, 0, map[int]float64{2: 1, 4: 0.2, 6: 0.1}},
		{"16.7 found", 2000, 10, 16.69, 0, map[int]float64{1: 1, 2: 0.5, 3: 0.6, 5: 0.2, 7: 0.2}},
		{"400 found", 16000, 3, 399.6, 0, map[int]float64{1: 1, 3: 0.3, 5: 0.2}},
		{"16.7 stated", 2000, 10, 16.72, 16.7, map[int]float64{1: 1, 3: 0.5}},
		{"400 stated", 16000, 2, 400.9, 400, map[int]float64{1: 1, 2: 0.3, 3: 0.2}},
		{"generator stated", 4000, 5, 52.8, 53, map[int]float64{1: 1, 3: 0.3}},
		{"50.5", 4000, 5, 50.49, 50, map[int]float64{1: 1, 3: 0.3}},
		{"59.5", 4000, 5, 59.51, 60, map[int]float64{1: 1, 3: 0.3}},
	} {
		m := supply{hz: c.hz, drift: 0.01, period: 17, seed: 3}
		s := trial.New(c.rate, c.T)
		rms, want := map[int]float64{}, 0.0
		for o, u := range c.rms {
			rms[o] = u * 1e-3
			want = math.Hypot(want, u*1e-3)
		}
		m.wave(s, rms, nil)
		s.Noise(1e-4, 5)
		p := trial.Pass(hum, analyze.Params{}, map[string]*analyze.Take{"take": trial.Take("t", s)})
		p.MainsHz = c.stated
		res := hum.Run(p)
		if res.Value == nil {
			t.Errorf("%s: %+v", c.name, res.Refusal)
			continue
		}
		if math.Abs(*res.Value/want-1) > 0.01 || math.Abs(res.Details["mains_hz"].(float64)/c.hz-1) > 5e-4 {
			t.Errorf("%s: %.4g V at %v Hz, want %.4g V at %g Hz", c.name, *res.Value, res.Details["mains_hz"], want, c.hz)
		}
		f := mainsFrequency.Run(p)
		if f.Value == nil || math.Abs(*f.Value-m.mean(c.T)) > 2e-3 {
			t.Errorf("%s: mains frequency %v, want %.4f", c.name, f.Value, m.mean(c.T))
		}
	}
}

func TestRefusals(t *testing.T) {
	both := trial.New(4000, 5)
	supply{hz: 50.01}.wave(both, map[int]float64{1: 1e-3, 3: 5e-4}, nil)
	supply{hz: 60.02}.wave(both, map[int]float64{1: 1e-3, 3: 4e-4}, nil)
	both.Noise(1e-5, 1)
	short := trial.New(4000, 0.1).Noise(1e-3, 2)
	for _, c := range []struct {
		name  string
		s     *trial.Signal
		mains float64
		p     analyze.Params
		want  string
	}{
		{"two supplies", both, 0, analyze.Params{}, analyze.AmbiguousTone},
		{"0.1 s", short, 50, analyze.Params{}, analyze.TooShort},
		{"order beyond half the rate", both, 50, analyze.Params{Order: 60}, analyze.Bandwidth},
	} {
		p := trial.Pass(hum, c.p, map[string]*analyze.Take{"take": trial.Take("t", c.s)})
		p.MainsHz = c.mains
		r := hum.Run(p)
		if r.Refusal == nil || r.Refusal.Code != c.want || r.Refusal.Advice == "" {
			t.Errorf("%s: %+v, want %s", c.name, r.Refusal, c.want)
		}
	}
	// Stating the supply settles it.
	p := trial.Pass(hum, analyze.Params{}, map[string]*analyze.Take{"take": trial.Take("t", both)})
	if r := hum.Run(p); r.Value == nil || math.Abs(*r.Value-math.Hypot(1e-3, 5e-4)) > 2e-5 {
		t.Errorf("stated: %v %+v", r.Value, r.Refusal)
	}
}

// A tone 3 Hz from a harmonic is kept apart in 10 s; one on a harmonic hides
// that order alone, and says so.
func TestTones(t *testing.T) {
	lines := map[int]float64{1: 1e-3, 2: 2e-4, 3: 5e-4, 5: 3e-4, 7: 1e-4, 20: 5e-5}
	want := 0.0
	for _, u := range lines {
		want = math.Hypot(want, u)
	}
	for _, c := range []struct {
		name   string
		tone   float64
		hidden int
	}{
		{"far", 943, 0}, {"3 Hz above order 3", 153.06, 0}, {"3 Hz above order 7", 353.14, 0}, {"3 Hz below order 20", 997.4, 0},
		{"on order 20", 1000.4, 20},
	} {
		s := trial.New(4000, 10)
		supply{hz: 50.02, seed: 2}.wave(s, lines, nil)
		s.Tone(c.tone, 0.3, 0.4).Noise(1e-5, 3)
		r := trial.Run(hum, analyze.Params{}, trial.Take("t", s))
		if r.Value == nil {
			t.Errorf("%s: %+v", c.name, r.Refusal)
			continue
		}
		sum := want
		if c.hidden > 0 {
			sum = math.Sqrt(want*want - lines[c.hidden]*lines[c.hidden])
		}
		if math.Abs(*r.Value/sum-1) > 0.005 {
			t.Errorf("%s: %.6g V, want %.6g V", c.name, *r.Value, sum)
		}
		for _, l := range harmonics(t, r) {
			o := l["order"].(int)
			if _, hidden := l["hidden"]; hidden != (o == c.hidden) {
				t.Errorf("%s: order %d hidden %v", c.name, o, hidden)
			} else if !hidden && math.Abs(l["rms_v"].(float64)-lines[o]) > 1e-6 {
				t.Errorf("%s: order %d reads %.4g V, want %.4g V", c.name, o, l["rms_v"], lines[o])
			}
		}
		if flagged := len(r.Flags) > 0; flagged != (c.hidden > 0) {
			t.Errorf("%s: flags %v", c.name, r.Flags)
		}
		others, _ := r.Details["other_lines"].([]map[string]any)
		if len(others) == 0 || others[0]["kind"] != kindTone && others[0]["kind"] != kindBus || math.Abs(others[0]["rms_v"].(float64)-0.3/math.Sqrt2) > 1e-4 {
			t.Errorf("%s: other lines %v", c.name, others)
		}
	}
	// A strong high harmonic with company is hum, not a tone.
	s := trial.New(4000, 5)
	supply{hz: 50.02, seed: 2}.wave(s, map[int]float64{6: 1e-3, 2: 3e-4, 12: 4e-4, 1: 1e-4}, nil)
	r := trial.Run(hum, analyze.Params{}, trial.Take("t", s.Noise(1e-5, 1)))
	if r.Value == nil || math.Abs(*r.Value-math.Sqrt(1e-6+9e-8+16e-8+1e-8)) > 1e-5 {
		t.Errorf("strong sixth: %v %+v", r.Value, r.Refusal)
	}
}

func TestOtherLines(t *testing.T) {
	s := trial.New(48000, 4)
	supply{hz: 49.96, seed: 2}.wave(s, map[int]float64{1: 1e-3, 3: 4e-4}, nil)
	s.Tone(1042.37, 0.3, 0).Tone(2*1042.37, 0.003, 0).Tone(1042.37+49.96, 3e-4, 0).Tone(1042.37-2*49.96, 2e-4, 0)
	s.Tone(8000.02, 2e-4, 0).Tone(21370, 3e-4, 0).Tone(60.01*2, 3e-4, 0).Noise(1e-4, 3)
	r := trial.Run(hum, analyze.Params{}, trial.Take("t", s))
	got := map[string]float64{}
	list, _ := r.Details["other_lines"].([]map[string]any)
	for _, l := range list {
		got[l["kind"].(string)] += 1
	}
	want := map[string]float64{kindTone: 1, kindHarmonic: 1, kindSideband: 2, kindBus: 1, kindSwitch: 1, kindSupply: 1}
	for k, n := range want {
		if got[k] != n {
			t.Errorf("%s: %g, want %g in %v", k, got[k], n, list)
		}
	}
}

// Phases of harmonics against the fundamental, and single orders.
func TestPhases(t *testing.T) {
	s := trial.New(4000, 5)
	first := 0.7
	supply{hz: 50.2, drift: 0.03, period: 9, seed: 4}.wave(s, map[int]float64{1: 1e-3, 3: 4e-4, 5: 3e-4}, map[int]float64{1: first, 3: 3*first + 1, 5: 5*first - 2})
	tk := trial.Take("t", s.Noise(1e-5, 7))
	for _, l := range harmonics(t, trial.Run(hum, analyze.Params{}, tk)) {
		want, ok := map[int]float64{1: 0, 3: 1, 5: -2}[l["order"].(int)]
		deg, have := l["phase_deg"].(float64)
		if !ok {
			continue
		}
		if !have || math.Abs(math.Remainder(deg-want*180/math.Pi, 360)) > 0.5 || l["steady"].(float64) < 0.999 {
			t.Errorf("order %d: phase %v, want %.2f", l["order"], l["phase_deg"], want*180/math.Pi)
		}
	}
	r := trial.Run(hum, analyze.Params{Order: 5}, tk)
	if r.Value == nil || math.Abs(*r.Value-3e-4) > 1e-6 || len(harmonics(t, r)) != 1 {
		t.Errorf("order 5: %v", r.Value)
	}
	// A weighting at nominal frequencies: IEC 61672-1:2013, Table 3: 50 Hz -30.2 dB,
	// 250 Hz -8.6 dB.
	for _, w := range []struct {
		order   int
		rms, dB float64
	}{{1, 1e-3, -30.2}, {5, 3e-4, -8.6}} {
		r := trial.Run(hum, analyze.Params{Weighting: "A", Order: w.order}, tk)
		if r.Value == nil || math.Abs(20*math.Log10(*r.Value/w.rms)-w.dB) > 0.15 {
			t.Errorf("order %d, A-weighted: %v", w.order, r.Value)
		}
	}
}

// Every order alone against max_each; the gear's scale stays once with a
// stated gain, and cancels with a gain found against a stated level.
func TestReferredAndSingle(t *testing.T) {
	s := trial.New(8000, 4)
	supply{hz: 50.02, seed: 4}.wave(s, map[int]float64{1: 1e-3, 3: 4e-4}, nil)
	tk := trial.Take("t", s.Noise(1e-6, 7))
	scale := 0.01
	tk.Gear.ScaleU = &scale
	rel := func(r analyze.Result) float64 {
		u, _ := budget.Combine(r.Budget)
		return u / *r.Value
	}
	plain := trial.Run(hum, analyze.Params{}, tk)
	if math.Abs(rel(plain)-scale) > 1e-3 {
		t.Errorf("at the recorder: relative u %.4g, want %.4g", rel(plain), scale)
	}
	gain := unit.New(40, "dB")
	u := unit.New(0.2, "dB")
	r := trial.Run(hum, analyze.Params{Gain: &analyze.Stated{Value: gain, Uncertainty: &u, Key: "gain"}}, tk)
	if r.Value == nil || math.Abs(*r.Value / *plain.Value - 0.01) > 1e-9 || math.Abs(rel(r)-math.Hypot(scale, 0.1/8.685890)) > 1e-3 {
		t.Errorf("stated gain: %v, relative u %.4g", r.Value, rel(r))
	}
	if l := harmonics(t, r)[0]; math.Abs(l["input_rms_v"].(float64)*100-l["rms_v"].(float64)) > 1e-12 {
		t.Errorf("input column: %v", l)
	}
	tone := trial.Take("g", trial.New(8000, 4).Tone(1042.3, 0.5, 0).Noise(1e-6, 8))
	tone.Gear = tk.Gear
	level, lu := unit.New(5e-3/math.Sqrt2, "V"), unit.New(1, "%")
	tone.Wiring.InLevel, tone.Wiring.InUncertainty = &level, &lu
	g := trial.Between(map[string]*analyze.Take{"take": tk, "gain_take": tone}).Run(hum, analyze.Params{})
	if g.Value == nil || math.Abs(*g.Value / *plain.Value - 0.01) > 1e-5 || math.Abs(rel(g)-0.005) > 5e-4 {
		t.Errorf("gain against a stated level: %v, relative u %.4g, want 0.005", g.Value, rel(g))
	}
	most := unit.New(0.5, "mV")
	each := trial.Run(hum, analyze.Params{MaxEach: &most, Harmonics: 5}, tk)
	if len(each.Points) != 5 || each.Points[0].Value == nil || math.Abs(*each.Points[0].Value-1e-3) > 1e-5 || each.Points[0].Limit == nil ||
		each.Points[1].Refusal == nil || each.Points[1].Bound == nil || each.Points[1].Bound.Value > 1e-5 {
		t.Errorf("single orders: %+v", each.Points)
	}
	ref := unit.New(1, "V")
	below := trial.Run(hum, analyze.Params{RefLevel: &ref}, tk)
	if d, _ := below.Details["below_ref_db"].(float64); math.Abs(d+20*math.Log10(*below.Value)) > 1e-9 {
		t.Errorf("below the nominal level: %v", below.Details["below_ref_db"])
	}
}

// Power difference with the instrument's own floor.
func TestFloor(t *testing.T) {
	make := func(a float64, seed uint64) *analyze.Take {
		s := trial.New(4000, 4)
		supply{hz: 50.02, seed: seed}.wave(s, map[int]float64{1: a, 3: a / 2}, nil)
		return trial.Take("t"+string(rune('a'+seed)), s.Noise(1e-6, seed))
	}
	own := math.Hypot(1e-3, 5e-4)
	for _, c := range []struct{ floor, want float64 }{{3e-4, own * math.Sqrt(1-0.09)}, {9e-4, 0}} {
		r := trial.Between(map[string]*analyze.Take{"take": make(1e-3, 1), "floor": make(c.floor, 2)}).Run(hum, analyze.Params{})
		if c.want == 0 {
			if r.Refusal == nil || r.Refusal.Code != analyze.FloorLimited || r.Bound == nil || r.Bound.Value < own {
				t.Errorf("near floor: %+v %+v", r.Refusal, r.Bound)
			}
		} else if r.Value == nil || math.Abs(*r.Value/c.want-1) > 2e-3 {
			t.Errorf("floor %g: %v, want %g", c.floor, r.Value, c.want)
		}
	}
}

// hum_ratio against its definition: hum over white noise of known density.
func TestRatio(t *testing.T) {
	s := trial.New(8000, 8)
	supply{hz: 50.02, seed: 4}.wave(s, map[int]float64{1: 1e-3, 3: 4e-4}, nil)
	tk := trial.Take("t", s.Tone(1042, 0.1, 0).Noise(1e-3, 7))
	band := analyze.Band{Low: 20, High: 3000}
	r := trial.Run(humRatio, analyze.Params{Band: &band}, tk)
	want := 20 * math.Log10(math.Hypot(1e-3, 4e-4)/(1e-3*math.Sqrt(2980.0/4000)))
	if r.Value == nil || math.Abs(20*math.Log10(*r.Value)-want) > 0.15 {
		t.Errorf("ratio %v, want %.3f dB", r.Value, want)
	}
	if q := trial.Run(humRatio, analyze.Params{Band: &band}, trial.Take("n", trial.New(8000, 8).Noise(1e-3, 7))); q.Bound == nil || q.Refusal.Code != analyze.BelowDetection {
		t.Errorf("noise alone: %+v", q)
	}
}

// Two takes at two gains say where hum enters.
func TestBeforeOrAfter(t *testing.T) {
	take := func(name, gain string, a float64) *analyze.Take {
		s := trial.New(4000, 3)
		supply{hz: 50.02, seed: 4}.wave(s, map[int]float64{1: a, 3: a / 2}, nil)
		tk := trial.Take(name, s.Noise(1e-6, 7))
		tk.Where = []analyze.Condition{{Key: "gain", Value: gain}}
		return tk
	}
	for _, c := range []struct {
		high, low float64
		want      string
	}{{1e-2, 1e-4, "before"}, {1e-3, 1e-3, "after"}, {3e-3, 3e-4, "both"}, {1e-4, 1e-3, "unknown"}} {
		r := trial.Between(map[string]*analyze.Take{"take": take("high", "60 dB", c.high), "against": take("low", "20 dB", c.low)}).Run(hum, analyze.Params{})
		if r.Details["enters"] != c.want {
			t.Errorf("%g and %g: %v, want %s", c.high, c.low, r.Details["enters"], c.want)
		}
	}
}

// Figures hold finite numbers; a folded sine is a sine that starts at its
// rising zero.
func TestFigures(t *testing.T) {
	s := trial.New(48000, 3)
	supply{hz: 50.02, drift: 0.02, period: 17, seed: 4}.wave(s, map[int]float64{1: 1e-3}, nil)
	s.Tone(1042, 0.1, 0)
	tk := trial.Take("t", s.Noise(1e-5, 7))
	p := trial.Pass(hum, analyze.Params{}, map[string]*analyze.Take{"take": tk})
	sig, _ := p.Signal("take", "out")
	r, bad := read(p, "take", sig, 20)
	if bad != nil {
		t.Fatal(bad)
	}
	f := stage.FoldMains(r.Lines, 90)
	for i, v := range f.Mean {
		if want := 1e-3 * math.Sqrt2 * math.Sin(2*math.Pi*(float64(i)+0.5)/90); math.Abs(v-want) > 2e-5 {
			t.Fatalf("bin %d: %g, want %g", i, v, want)
		}
	}
	for _, fig := range hum.Run(p).Figures {
		for _, q := range fig.Series {
			if len(q.X) != len(q.Y) || len(q.X) == 0 {
				t.Errorf("%s: series %s with %d and %d points", fig.ID, q.Name, len(q.X), len(q.Y))
			}
			for i := range q.X {
				if math.IsNaN(q.X[i]+q.Y[i]) || math.IsInf(q.X[i]+q.Y[i], 0) {
					t.Errorf("%s: not finite", fig.ID)
				}
			}
		}
	}
}

// Takes without noise, without hum, without anything give no number that is
// none.
func TestDegenerate(t *testing.T) {
	for name, s := range map[string]*trial.Signal{
		"zeros": trial.New(4000, 2), "constant": trial.New(4000, 2).DC(0.3), "pure tone": trial.New(4000, 2).Tone(440.3, 0.5, 0),
		"pure hum": trial.New(4000, 2).Tone(50, 0.5, 0), "pure tone on an order": trial.New(4000, 2).Tone(1000, 0.5, 0),
		"pure tone and hum": trial.New(4000, 2).Tone(50, 1e-3, 0).Tone(443, 0.5, 0),
	} {
		tk := trial.Take("t", s, s)
		tk.Wiring.Mains = "2"
		base := trial.Take("b", s, s)
		base.Wiring.Mains = "2"
		on := trial.Between(map[string]*analyze.Take{"take": tk, "baseline": base})
		each := unit.New(1, "mV")
		for _, m := range Measures() {
			r := on.Run(m, analyze.Params{Length: length(5), MaxEach: &each, Band: &analyze.Band{Low: 20, High: 1900}})
			if (r.Value == nil) == (r.Refusal == nil) {
				t.Errorf("%s, %s: value %v, refusal %v", name, m.Name, r.Value, r.Refusal)
			}
			if r.Value != nil && !(math.Abs(*r.Value) < 1e100) || r.Bound != nil && !(r.Bound.Value < 1e100) {
				t.Errorf("%s, %s: %v %v", name, m.Name, *r.Value, r.Bound)
			}
			finiteIn(t, name+", "+m.Name, r.Details)
			for _, f := range r.Figures {
				for _, q := range f.Series {
					finiteIn(t, name+", "+f.ID, q.Y)
				}
			}
		}
	}
}

func finiteIn(t *testing.T, where string, v any) {
	t.Helper()
	switch x := v.(type) {
	case float64:
		if math.IsNaN(x) || math.IsInf(x, 0) {
			t.Errorf("%s: %g", where, x)
		}
	case []float64:
		for _, y := range x {
			finiteIn(t, where, y)
		}
	case map[string]any:
		for k, y := range x {
			finiteIn(t, where+": "+k, y)
		}
	case []map[string]any:
		for _, y := range x {
			finiteIn(t, where, y)
		}
	}
}
