package noise

import (
	"math"
	"testing"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
	"benchslip/analyze/internal/trial"
	"benchslip/analyze/stage"
	"benchslip/capture/unit"
)

func stated(key string, number float64, symbol string) *analyze.Stated {
	return &analyze.Stated{Key: key, Value: unit.New(number, symbol)}
}

// Thermal noise, dBu: sqrt(4 k T R B) with k = 1.380649e-23 J/K (SI 2019).
func TestThermal(t *testing.T) {
	for _, c := range []struct{ ohms, kelvins, hz, volts, level float64 }{
		{150, 290, 20000, 2.19195313e-07, -130.964887},
		{150, 300, 20000, 2.22942513e-07, -130.817655},
		{150, 290, 19980, 2.19085688e-07, -130.969232},
		{200, 290, 19980, 2.52978362e-07, -129.719845},
		{200, 300, 19980, 2.57303091e-07, -129.572612},
		{600, 290, 19980, 4.38171376e-07, -124.948632},
		{10000, 300, 19980, 1.81940761e-06, -112.582912},
	} {
		v := thermal(c.ohms, c.kelvins, c.hz)
		if math.Abs(v/c.volts-1) > 1e-6 || math.Abs(dBu.FromLinear(v)-c.level) > 1e-4 {
			t.Errorf("%g ohm, %g K, %g Hz: %.6g V, %.4f dBu; want %.6g V, %.4f dBu", c.ohms, c.kelvins, c.hz, v, dBu.FromLinear(v), c.volts, c.level)
		}
	}
	if v := thermal(1000, 300, 1); math.Abs(v/4.07035478e-9-1) > 1e-6 {
		t.Errorf("1 kohm at 300 K: %g V/rtHz", v)
	}
}

// Noise bandwidths of the curves between 20 Hz and 20 kHz, from an independent
// numerical integral of the formulas of IEC 61672-1 Annex E and of the
// rational form of BS.468-4: A 12467.18 Hz, C 9027.05 Hz, 468 107334.5 Hz
// (unity at 1 kHz); 150 ohm at 290 K under A: -133.0175 dBu.
func TestNoiseBandwidth(t *testing.T) {
	for name, want := range map[string]float64{"none": 19980, "A": 12467.18, "C": 9027.05, "468": 107334.5} {
		if got := noiseBandwidth(analyze.Band{Low: 20, High: 20000}, stage.Weighting(name)); math.Abs(got/want-1) > 2e-6 {
			t.Errorf("%s: %.2f Hz, want %.2f", name, got, want)
		}
	}
	a := noiseBandwidth(analyze.Band{Low: 20, High: 20000}, stage.Weighting("A"))
	if v := dBu.FromLinear(thermal(150, 290, a)); math.Abs(v+133.017505) > 1e-3 {
		t.Errorf("150 ohm under A: %.4f dBu", v)
	}
}

// level is white noise whose RMS between 20 Hz and 20 kHz is `dbu` dBu,
// scaled exactly, through a recorder of 1 V full scale.
func level(dbu float64, seed uint64) *trial.Signal {
	s := trial.New(48000, 1.5).Noise(1, seed)
	power := 0.0
	for _, v := range s.X {
		power += v * v / float64(len(s.X))
	}
	k := dBu.ToLinear(dbu) / math.Sqrt(power*19980/24000)
	for i := range s.X {
		s.X[i] *= k
	}
	return s
}

func value(t *testing.T, r analyze.Result) float64 {
	t.Helper()
	if r.Value == nil {
		t.Fatalf("refused: %+v", r.Refusal)
	}
	return r.Unit.FromLinear(*r.Value)
}

// -68.35 dBu behind 60 dB are -128.35 dBu; 150 ohm stand 2.9692 dB below
// -128 dBu, and the unit's own part of that is -131.0518 dBu.
func TestEIN(t *testing.T) {
	run := func(dbu float64, p analyze.Params) analyze.Result {
		return trial.Run(ein, p, trial.Take("t", level(dbu, 3)))
	}
	p := analyze.Params{Gain: stated("gain", 60, "dB"), Source: stated("source", 150, "ohm")}
	r := run(-68.35, p)
	// The white noise's own scatter between bands: 4.34/sqrt(4020 Hz x 1.5 s).
	if v := value(t, r); math.Abs(v+128.35) > 0.09 {
		t.Errorf("%.3f dBu, want -128.35", v)
	}
	if got := dBu.FromLinear(ownPart(dBu.ToLinear(-128), thermal(150, 290, 19980))); math.Abs(got+131.05176) > 1e-4 {
		t.Errorf("own part %.5f dBu", got)
	}
	r = run(-68, p)
	v := value(t, r)
	for key, want := range map[string]float64{"thermal_dbu": -130.969232, "noise_figure_db": 2.96923 + v + 128, "gain_db": 60} {
		if got, _ := r.Details[key].(float64); math.Abs(got-want) > 1e-3 {
			t.Errorf("%s = %v, want %.4f", key, r.Details[key], want)
		}
	}
	if r.Details["detector"] != "RMS" || len(r.Unstated) != 2 {
		t.Errorf("detector %v, unstated %v", r.Details["detector"], r.Unstated)
	}
	// A-weighted white noise lies 2.0483 dB lower (integral of the formula).
	p.Weighting = "A"
	if got := value(t, run(-68, p)) - v; math.Abs(got+2.0483) > 0.12 {
		t.Errorf("A minus flat: %.3f dB", got)
	}
	p.Weighting = "468" // read as RMS: +7.3014 dB
	if got := value(t, run(-68, p)) - v; math.Abs(got-7.3014) > 0.12 {
		t.Errorf("468 minus flat: %.3f dB", got)
	}
}

// 150 ohm into 1.5, 2 and 10 kohm lose 0.83, 0.63 and 0.13 dB: (R+150)/R.
func TestEINAtEMF(t *testing.T) {
	base := analyze.Params{Gain: stated("gain", 60, "dB"), Source: stated("source", 150, "ohm")}
	take := trial.Take("t", level(-68, 3))
	v := value(t, trial.Run(ein, base, take))
	for ohms, lost := range map[float64]float64{1500: 0.8279, 2000: 0.6283, 10000: 0.1293} {
		p := base
		p.InputR = &ohms
		if got := value(t, trial.Run(ein, p, take)) - v; math.Abs(got-lost) > 1e-3 {
			t.Errorf("into %g ohm: %.4f dB, want %.4f", ohms, got, lost)
		}
		p.Plane = "emf" // the gain holds the loss already
		if got := value(t, trial.Run(ein, p, take)) - v; math.Abs(got) > 1e-9 {
			t.Errorf("into %g ohm, gain from the EMF: %.4f dB", ohms, got)
		}
	}
}

// Below the source's thermal noise by more than U (and 1 dB at the terminals,
// where the loss into the input is not known) nothing can be.
func TestImpossible(t *testing.T) {
	high := 1500.0
	for name, c := range map[string]struct {
		dbu      float64
		plane    string
		input    *float64
		possible bool
	}{
		"1.5 dB under, terminals":           {-72.47, "", nil, false},
		"0.8 dB under, terminals":           {-71.77, "", nil, true},
		"0.8 dB under, emf":                 {-71.77, "emf", nil, false},
		"0.5 dB over, emf":                  {-70.47, "emf", nil, true},
		"0.6 dB under, referred to the EMF": {-71.57, "", &high, true},
		"1.1 dB under, referred to the EMF": {-72.07, "", &high, false},
	} {
		p := analyze.Params{Gain: stated("gain", 60, "dB"), Source: stated("source", 150, "ohm"), Plane: c.plane, InputR: c.input}
		r := trial.Run(ein, p, trial.Take("t", level(c.dbu, 3)))
		if (r.Value != nil) != c.possible {
			t.Errorf("%s: %v %+v", name, r.Value, r.Refusal)
		}
		if !c.possible && (r.Refusal.Code != analyze.Impossible || r.Bound != nil) {
			t.Errorf("%s: %+v", name, r.Refusal)
		}
	}
}

// The recorder's scale stays once in a reading behind a stated gain or one of
// two channels, and cancels against a stated input level, whose own
// uncertainty then enters.
func TestEINScale(t *testing.T) {
	const scaleU, levelU = 0.01, 0.02
	gear := func(tk *analyze.Take) *analyze.Take {
		u := scaleU
		g := *tk.Gear
		g.ScaleU = &u
		tk.Gear = &g
		return tk
	}
	quiet := gear(trial.Take("t", level(-68, 3)))
	tone := func() *trial.Signal { return trial.New(48000, 2).Tone(1042.3, 0.5, 0.2).Noise(1e-6, 1) }
	two := gear(trial.Take("g", tone(), trial.New(48000, 2).Tone(1042.3, 0.0005, 1).Noise(1e-9, 2)))
	two.Wiring.In = "2"
	told := gear(trial.Take("g", tone()))
	q, u := unit.New(0.5e-3/math.Sqrt2, "V"), unit.New(100*levelU*2, "%")
	told.Wiring.InLevel, told.Wiring.InUncertainty = &q, &u
	bare := gear(trial.Take("g", tone()))
	bare.Wiring.InLevel = &q
	for _, c := range []struct {
		name         string
		gainTake     *analyze.Take
		want         float64 // systematic part, relative
		lacking      int
		statedGainDB float64
	}{
		{"stated gain", nil, scaleU, 0, 60},
		{"two channels", two, scaleU, 0, 0},
		{"stated level", told, levelU, 0, 0},
		{"stated level without its uncertainty", bare, 0, 1, 0},
	} {
		p := analyze.Params{Source: stated("source", 150, "ohm")}
		roles := map[string]*analyze.Take{"take": quiet}
		if c.gainTake != nil {
			roles["gain_take"] = c.gainTake
		} else {
			p.Gain = stated("gain", c.statedGainDB, "dB")
		}
		r := ein.Run(trial.Pass(ein, p, roles))
		v := value(t, r)
		if math.Abs(v+128) > 0.09 {
			t.Errorf("%s: %.3f dBu", c.name, v)
		}
		var kept []analyze.Contributor
		for _, l := range r.Budget {
			if l.Kind == "B" {
				kept = append(kept, l)
			}
		}
		if got, _ := budget.Combine(kept); math.Abs(got / *r.Value - c.want) > 1e-5 {
			t.Errorf("%s: systematic part %.5f of the value, want %.5f: %+v", c.name, got / *r.Value, c.want, kept)
		}
		if len(r.Lacking) != c.lacking {
			t.Errorf("%s: lacking %v", c.name, r.Lacking)
		}
	}
}

// A floor 10, 4 and 1 dB below the reading: corrected by power, corrected and
// flagged, refused with the reading and its U as the bound.
func TestEINFloor(t *testing.T) {
	for _, c := range []struct {
		below float64
		flag  bool
		code  string
	}{{10, false, ""}, {4, true, ""}, {1, false, analyze.FloorLimited}} {
		unitPower := math.Pow(10, -6.8) - math.Pow(10, -6.8-c.below/10)
		own, floor := level(10*math.Log10(unitPower), 3), level(-68-c.below, 5)
		sum := trial.New(48000, 1.5)
		same := level(-68-c.below, 9)
		for i := range sum.X {
			sum.X[i] = own.X[i] + same.X[i]
		}
		p := analyze.Params{Gain: stated("gain", 40, "dB"), Source: stated("source", 150, "ohm")}
		r := ein.Run(trial.Pass(ein, p, map[string]*analyze.Take{"take": trial.Take("t", sum), "floor": trial.Take("f", floor)}))
		if c.code != "" {
			if r.Refusal == nil || r.Refusal.Code != c.code || r.Bound == nil {
				t.Fatalf("%g dB: %+v", c.below, r)
			}
			if b := dBu.FromLinear(r.Bound.Value); b < -108 || b > -107.8 {
				t.Errorf("%g dB: bound %.2f dBu", c.below, b)
			}
			continue
		}
		U, _, _, _ := budget.Expand(r.Budget, 2)
		if got, want := *r.Value, dBu.ToLinear(10*math.Log10(unitPower)-40); math.Abs(got-want) > 1.5*U || U/want > 0.03 {
			t.Errorf("%g dB: %.3f dBu, want %.3f (U %.2g)", c.below, dBu.FromLinear(got), dBu.FromLinear(want), U/want)
		}
		if (len(r.Flags) > 0) != c.flag {
			t.Errorf("%g dB: flags %v", c.below, r.Flags)
		}
	}
}

func TestEINRefuses(t *testing.T) {
	full := trial.Take("t", level(-68, 3))
	bare := trial.Take("t", level(-68, 3))
	bare.Gear = nil
	gain := stated("gain", 60, "dB")
	short := trial.Take("t", trial.New(48000, 0.3).Noise(1e-4, 1))
	slow := trial.Take("t", trial.New(32000, 2).Noise(1e-4, 1))
	for name, c := range map[string]struct {
		take *analyze.Take
		p    analyze.Params
		code string
	}{
		"no volts":      {bare, analyze.Params{Gain: gain}, analyze.Uncalibrated},
		"no gain":       {full, analyze.Params{}, analyze.MissingTake},
		"short":         {short, analyze.Params{Gain: gain}, analyze.TooShort},
		"past the rate": {slow, analyze.Params{Gain: gain}, analyze.Bandwidth},
		"silence":       {trial.Take("t", trial.New(48000, 2)), analyze.Params{Gain: gain}, analyze.NoSignal},
	} {
		r := trial.Run(ein, c.p, c.take)
		if r.Value != nil || r.Refusal == nil || r.Refusal.Code != c.code {
			t.Errorf("%s: %v %+v, want %s", name, r.Value, r.Refusal, c.code)
		}
	}
}
