package limits

import (
	"math"
	"strings"
	"testing"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
	"benchslip/analyze/internal/trial"
	"benchslip/capture/unit"
)

func db(x float64) float64 { return 20 * math.Log10(x) }

func stated(key string, number float64, symbol string) *analyze.Stated {
	return &analyze.Stated{Key: key, Value: unit.New(number, symbol)}
}

// cut is a tone of peak amp, cut off at -down and up, 1 s.
func cut(amp, up, down float64, seed uint64) *trial.Signal {
	s := trial.New(48000, 1).Tone(997.3, amp, 0.4)
	for i, x := range s.X {
		s.X[i] = math.Max(-down, math.Min(up, x))
	}
	return s.Noise(1e-5, seed)
}

func over(m *analyze.Measure, params analyze.Params, takes ...*analyze.Take) analyze.Result {
	p := trial.Pass(m, params, map[string]*analyze.Take{"take": takes[0]})
	p.Roles["take"] = takes
	return m.Run(p)
}

// Closed forms of a symmetrically clipped sine: THD re fundamental and
// fundamental for a clip at c of the peak, and the c of a given THD.
func TestClipModel(t *testing.T) {
	for _, c := range []struct{ c, thd, fundamental float64 }{
		{0.99, 0.00286177224, 0.99880138}, {0.95, 0.0192401388, 0.986679989}, {0.9, 0.0421993256, 0.962613927},
		{0.8, 0.0897857565, 0.895911961}, {0.5, 0.232938137, 0.608997781},
	} {
		rms, b := clipped(c.c)
		r := residualOf(c.c)
		thd := r / math.Sqrt(1-r*r) // residual over total to harmonics over fundamental
		if math.Abs(b-c.fundamental) > 1e-8 || math.Abs(thd-c.thd) > 1e-9 || math.Abs(rms*math.Sqrt(1-r*r)*math.Sqrt2-b) > 1e-12 {
			t.Errorf("c = %g: THD %.10f, fundamental %.9f", c.c, thd, b)
		}
	}
	for thd, c := range map[float64]float64{0.01: 0.97148694, 0.1: 0.778651164} {
		if got := clipFor(thd / math.Sqrt(1+thd*thd)); math.Abs(got-c) > 1e-7 {
			t.Errorf("THD %g: clip at %.8f, want %.8f", thd, got, c)
		}
	}
	// Power at 1 % THD over that of the sine that just clips: 1.04750587, 0.201565 dB.
	c := clipFor(0.01 / math.Sqrt(1.0001))
	rms, _ := clipped(c)
	if got := 2 * rms * rms / (c * c); math.Abs(got-1.04750587) > 1e-7 {
		t.Errorf("power at 1 %%: %.8f of the onset's", got)
	}
}

// A cubic y = x - a x^3: THD+N = U3/total in closed form (peaks x A, A - 3/4 a
// A^3, a A^3/4), so log-log interpolation has little to bend, and the true
// crossing of 1 % is known.
func cubic(peak float64) (rms, thd float64) {
	const a = 0.2
	u1, u3 := peak-0.75*a*peak*peak*peak, 0.25*a*peak*peak*peak
	rms = math.Hypot(u1, u3) / math.Sqrt2
	return rms, u3 / math.Hypot(u1, u3)
}

func cubicTake(name string, peak float64, seed uint64) *analyze.Take {
	s := trial.New(48000, 0.6).Tone(997.3, peak, 0.4)
	for i, x := range s.X {
		s.X[i] = x - 0.2*x*x*x
	}
	return trial.Take(name, s.Noise(1e-6, seed))
}

func trueCrossing(limit float64) float64 {
	lo, hi := 0.01, 0.9
	for range 80 {
		m := (lo + hi) / 2
		if _, d := cubic(m); d < limit {
			lo = m
		} else {
			hi = m
		}
	}
	rms, _ := cubic(lo)
	return rms
}

func TestMaxOutput(t *testing.T) {
	want := trueCrossing(0.01)
	peaks := []float64{0.5, 0.05, 0.4, 0.8, 0.1, 0.63} // any order
	var takes []*analyze.Take
	for i, a := range peaks {
		takes = append(takes, cubicTake("t"+string(rune('a'+i)), a, uint64(i)))
	}
	r := over(maxOutput, analyze.Params{}, takes...)
	if r.Value == nil {
		t.Fatal(r.Refusal)
	}
	U, _, _, _ := budget.Expand(r.Budget, 2)
	t.Logf("%.4f dB, U %.4f dB", db(*r.Value/want), 8.69*U / *r.Value)
	if math.Abs(db(*r.Value/want)) > 0.05 || math.Abs(*r.Value-want) > U {
		t.Errorf("%.5f V, want %.5f, U %.5f", *r.Value, want, U)
	}
	list := r.Details["points"].([]map[string]any)
	if len(list) != len(peaks) {
		t.Fatalf("%d points", len(list))
	}
	for i, e := range list {
		if i > 0 && e["rms_v"].(float64) < list[i-1]["rms_v"].(float64) {
			t.Error("points are not in order of level")
		}
	}
	rms, thd := cubic(0.5)
	if got := list[3]["thdn_percent"].(float64); math.Abs(got/100/thd-1) > 1e-3 || math.Abs(list[3]["rms_v"].(float64)/rms-1) > 1e-5 {
		t.Errorf("point at 0.5 V peak: %v, want %g V, %g", list[3], rms, thd)
	}
	// The scale of the gear counts once, in power twice, the load once.
	three := 0.03
	for _, tk := range takes {
		g := *tk.Gear
		g.ScaleU = &three
		tk.Gear = &g
	}
	load := stated("load", 8, "ohm")
	u := unit.New(4, "%")
	load.Uncertainty = &u
	r = over(maxOutput, analyze.Params{}, takes...)
	if got, _ := budget.Combine(only(r.Budget, "gear")); math.Abs(got / *r.Value - 0.03) > 1e-9 {
		t.Errorf("scale in the level: %.5f", got / *r.Value)
	}
	w := over(power, analyze.Params{Load: load}, takes...)
	if math.Abs(*w.Value/(*r.Value**r.Value/8)-1) > 1e-12 {
		t.Errorf("%g W from %g V", *w.Value, *r.Value)
	}
	if got, _ := budget.Combine(only(w.Budget, "gear")); math.Abs(got / *w.Value - 0.06) > 1e-9 {
		t.Errorf("scale in the power: %.5f", got / *w.Value)
	}
	if got, _ := budget.Combine(only(w.Budget, "stated load")); math.Abs(got / *w.Value - 0.02) > 1e-9 {
		t.Errorf("load in the power: %.5f", got / *w.Value)
	}
}

func only(lines []analyze.Contributor, source string) (out []analyze.Contributor) {
	for _, l := range lines {
		if strings.HasPrefix(l.Source, source) {
			out = append(out, l)
		}
	}
	return out
}

// One take with eleven steps between silences, in a rising and in a falling
// order; the same level as from single takes.
func TestStepped(t *testing.T) {
	want := trueCrossing(0.01)
	for _, falling := range []bool{false, true} {
		s := trial.New(48000, 6)
		for k := range 11 {
			peak := 0.08 * math.Pow(10, float64(k)/20*2)
			if falling {
				peak = 0.08 * math.Pow(10, float64(10-k)/20*2)
			}
			step := trial.New(48000, 0.4).Tone(997.3, peak, 0.4)
			for i, x := range step.X {
				s.X[i+4800+k*24000] += x - 0.2*x*x*x
			}
		}
		r := over(maxOutput, analyze.Params{}, trial.Take("t", s.Noise(1e-5, 1)))
		if r.Value == nil {
			t.Fatal(r.Refusal)
		}
		if math.Abs(db(*r.Value/want)) > 0.05 || len(r.Details["points"].([]map[string]any)) != 11 || r.Details["steps"] != true {
			t.Errorf("%.4f dB off, %v points", db(*r.Value/want), r.Details["points"])
		}
	}
}

func TestNeverCrossed(t *testing.T) {
	clean := []*analyze.Take{cubicTake("a", 0.05, 1), cubicTake("b", 0.1, 2)}
	r := over(maxOutput, analyze.Params{}, clean...)
	top, _ := cubic(0.1)
	if r.Value != nil || r.Refusal.Code != analyze.NotEnoughPoints || r.Bound == nil || r.Bound.Upper || math.Abs(r.Bound.Value/top-1) > 1e-3 {
		t.Errorf("%+v %+v", r.Refusal, r.Bound)
	}
	w := over(power, analyze.Params{Load: stated("load", 8, "ohm")}, clean...)
	if w.Value != nil || w.Bound == nil || math.Abs(w.Bound.Value/(top*top/8)-1) > 2e-3 {
		t.Errorf("%+v %+v", w.Refusal, w.Bound)
	}
	bent := over(maxOutput, analyze.Params{}, cubicTake("a", 0.6, 1), cubicTake("b", 0.8, 2))
	if bent.Value != nil || bent.Bound == nil || !bent.Bound.Upper {
		t.Errorf("%+v %+v", bent.Refusal, bent.Bound)
	}
	// Noise over the limit at low levels is no crossing.
	noisy := trial.Take("n", trial.New(48000, 0.6).Tone(997.3, 0.001, 0).Noise(1e-3, 4))
	r = over(maxOutput, analyze.Params{}, noisy, cubicTake("b", 0.1, 2), cubicTake("c", 0.6, 3), cubicTake("d", 0.4, 3))
	if r.Value == nil || math.Abs(db(*r.Value/trueCrossing(0.01))) > 0.06 {
		t.Errorf("%v %+v", r.Value, r.Refusal)
	}
}

// A hard clip between two levels 1 dB apart: the course between them is not
// known, U covers it (from the onset, the true crossing of 1 % lies 0.2016 dB
// further in level).
func TestHardClip(t *testing.T) {
	rms, _ := clipped(0.97148694)
	want := 0.5 * rms / 0.97148694
	var takes []*analyze.Take
	for i, a := range []float64{0.3, 0.4, 0.49, 0.55, 0.62} {
		takes = append(takes, trial.Take("t"+string(rune('a'+i)), cut(a, 0.5, 0.5, uint64(i))))
	}
	r := over(maxOutput, analyze.Params{}, takes...)
	if r.Value == nil {
		t.Fatal(r.Refusal)
	}
	U, _, _, _ := budget.Expand(r.Budget, 2)
	t.Logf("%.3f dB, U %.3f dB", db(*r.Value/want), 8.69*U / *r.Value)
	if math.Abs(*r.Value-want) > U {
		t.Errorf("%.4f V, want %.4f, U %.4f", *r.Value, want, U)
	}
}

// 1.02 A into 8 ohm are 8.16 V peak, 5.76999 V RMS and 4.1616 W (common
// practice, no source): with rails of 15 V that is a current limit, with rails
// of 10 V the rails.
func TestHint(t *testing.T) {
	take := func(name string, peak float64) *analyze.Take {
		tk := trial.Take(name, cut(peak/16, 8.16/16, 8.16/16, 3))
		tk.Gear.FullScalePeak = 16
		return tk
	}
	load := stated("load", 8, "ohm")
	for rail, want := range map[float64]string{15: "current limit", 10.5: "the rails"} {
		p := analyze.Params{Load: load, Rails: stated("rails", rail, "V")}
		r := over(maxOutput, p, take("a", 6), take("b", 8.3), take("c", 8.6), take("d", 9.5))
		if r.Value == nil || len(r.Opinions) != 1 || !strings.Contains(r.Opinions[0], want) {
			t.Errorf("rails %g V: %v %v %v", rail, r.Value, r.Refusal, r.Opinions)
			continue
		}
		clip := r.Details["clip"].(map[string]any)
		if i, _ := clip["current_a"].(float64); rail == 15 && math.Abs(i-1.02) > 1e-3 {
			t.Errorf("current %v", clip)
		}
	}
	// The sine that just reaches 8.16 V.
	full := trial.Take("t", trial.New(48000, 1).Tone(997.3, 8.16/16, 0))
	full.Gear.FullScalePeak = 16
	w := over(power, analyze.Params{Load: load}, full)
	if w.Value == nil || math.Abs(*w.Value-4.1616) > 1e-6 || w.Unstated == nil {
		t.Errorf("%v W, %v", w.Value, w.Refusal)
	}
	if l := w.Details["level_v"].(float64); math.Abs(l-5.76999133) > 1e-6 {
		t.Errorf("%v V", l)
	}
	// Past the rails no stage swings.
	if r := over(power, analyze.Params{Load: load, Rails: stated("rails", 7, "V")}, full); r.Refusal == nil || r.Refusal.Code != analyze.Impossible {
		t.Errorf("%+v", r.Refusal)
	}
}
