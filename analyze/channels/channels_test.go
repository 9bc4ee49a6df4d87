package channels

import (
	"math"
	"math/cmplx"
	"testing"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
	"benchslip/analyze/internal/trial"
)

func db(x float64) float64 { return 20 * math.Log10(x) }

func expanded(r analyze.Result) float64 {
	U, _, _, _ := budget.Expand(r.Budget, 2)
	return U
}

// stray is crosstalk through a capacitance: it rises by 6 dB an octave.
func stray(at1k float64) func(float64) complex128 {
	return func(f float64) complex128 { return complex(0, at1k*f/1000) }
}

// A capacitive crosstalk of -70 dB at 1 kHz reads -70 dB there and 20 dB more
// at 10 kHz, by single tones and by stimuli of many, noise and hum 20 dB over
// it notwithstanding.
func TestCrosstalk(t *testing.T) {
	const at1k = 3.1623e-4
	for _, text := range []string{"tone at=1kHz", "tone at=10kHz", "stepped-tones at=100Hz,1kHz,10kHz each=500ms", "sweep length=4s", "multitone at=101Hz,1003Hz,9001Hz length=6s"} {
		x := trial.Played(text + " before=200ms after=300ms")
		if text[0] == 't' {
			hz := 1042.0
			if text == "tone at=10kHz" {
				hz = 10420
			}
			x = trial.New(48000, 6).Tone(hz, 0.5, 0.3)
		}
		tk := trial.Take("t", x.Through(stray(at1k)).Noise(1e-4, 1).Mains(50, 0.01, []float64{1e-3, 3e-4, 5e-4}, 4), x)
		tk.Wiring.Driven = "2"
		b := trial.On(tk)
		for _, at := range []float64{1000, 10000} {
			params := analyze.Params{At: []float64{at}}
			if text[0] == 't' {
				params.At = nil
				at = 1042
				if text == "tone at=10kHz" {
					at = 10420
				}
			} else if text[0] == 'm' {
				at = map[float64]float64{1000: 1003, 10000: 9001}[at]
				params.At = []float64{at}
			}
			r := b.Run(crosstalk, params)
			if r.Value == nil {
				t.Errorf("%s at %g: %+v", text, at, r.Refusal)
				continue
			}
			want := at1k * at / 1000
			if U := expanded(r); math.Abs(*r.Value-want) > 1.5*U || U > 0.2*want {
				t.Errorf("%s at %g Hz: %.3f dB +- %.3f, want %.3f", text, at, db(*r.Value), 8.69*U/want, db(want))
			}
		}
	}
}

// Crosstalk under the noise is bounded, and the bound holds: 95 of 100.
func TestCrosstalkBound(t *testing.T) {
	held := 0
	const runs, truth = 40, 2e-7
	for seed := uint64(0); seed < runs; seed++ {
		x := trial.New(8000, 2).Tone(1042, 0.5, 0)
		tk := trial.Take("t", trial.New(8000, 2).Tone(1042, 0.5*truth, 1).Noise(1e-4, seed), x)
		tk.Wiring.Driven = "2"
		r := trial.Run(crosstalk, analyze.Params{}, tk)
		if r.Value != nil {
			held++ // one in a thousand stands out by chance
			continue
		}
		if r.Refusal.Code != analyze.BelowDetection || r.Bound == nil || !r.Bound.Upper {
			t.Fatalf("%+v", r)
		}
		if r.Bound.Value >= truth {
			held++
		}
		if db(r.Bound.Value) > -90 {
			t.Errorf("bound %.1f dB", db(r.Bound.Value))
		}
	}
	if held < runs*85/100 {
		t.Errorf("the bound held in %d of %d", held, runs)
	}
	// A unit without any: 4 times the time halves the bound.
	var bound [2]float64
	for i, seconds := range []float64{2, 8} {
		for seed := uint64(0); seed < 10; seed++ {
			x := trial.New(8000, seconds).Tone(1042, 0.5, 0)
			tk := trial.Take("t", trial.New(8000, seconds).Noise(1e-4, seed), x)
			tk.Wiring.Driven = "2"
			if r := trial.Run(crosstalk, analyze.Params{}, tk); r.Bound != nil {
				bound[i] += r.Bound.Value / 10
			}
		}
	}
	if r := bound[0] / bound[1]; r < 1.5 || r > 2.7 {
		t.Errorf("bounds %g and %g", bound[0], bound[1])
	}
}

// The recorder's own separation is part of the doubt, and rules where it is
// no better than the reading.
func TestSeparation(t *testing.T) {
	x := trial.New(48000, 3).Tone(1042, 0.5, 0)
	tk := trial.Take("t", trial.New(48000, 3).Tone(1042, 0.5e-4, 1).Noise(1e-6, 1), x)
	tk.Wiring.Driven = "2"
	free := trial.Run(crosstalk, analyze.Params{}, tk)
	if free.Conditional != "" || len(free.Notes) == 0 {
		t.Errorf("%+v", free)
	}
	tk.Gear.Separation = 84 // dB: 6.3e-5 of the driven channel
	r := trial.Run(crosstalk, analyze.Params{}, tk)
	if want := math.Pow(10, -84.0/20) / math.Sqrt2; math.Abs(expanded(r)/2-want) > 0.02*want {
		t.Errorf("u %g, want %g", expanded(r)/2, want)
	}
	if r.Conditional == "" {
		t.Error("the recorder's separation of 84 dB passes for the unit's -80 dB")
	}
	silent := trial.Take("t", trial.New(48000, 3).Noise(1e-7, 1), x)
	silent.Wiring.Driven, silent.Gear.Separation = "2", 84
	if r := trial.Run(crosstalk, analyze.Params{}, silent); r.Bound == nil || r.Bound.Value < math.Pow(10, -84.0/20) {
		t.Errorf("the bound lies under the recorder's separation: %+v", r.Bound)
	}
}

// A program in mono makes both channels equal: that is no result.
func TestMonoCopy(t *testing.T) {
	x := trial.New(48000, 2).Tone(1042, 0.5, 0).Noise(1e-4, 1)
	tk := trial.Take("t", x, x.Copy())
	tk.Wiring.Driven, tk.Wiring.Out2 = "2", "2"
	for _, m := range Measures() {
		r := trial.Run(m, analyze.Params{}, tk)
		if r.Refusal == nil || r.Refusal.Code != analyze.UnfitTake {
			t.Errorf("%s: %+v", m.Name, r)
		}
	}
	// One channel named twice is a copy too.
	tk = trial.Take("t", x, trial.New(48000, 2).Tone(1042, 0.1, 0))
	tk.Wiring.Driven = "1"
	if r := trial.Run(crosstalk, analyze.Params{}, tk); r.Refusal == nil || r.Refusal.Code != analyze.UnfitTake {
		t.Errorf("%+v", r)
	}
	// Equal gains with noise of their own are no copy.
	tk = trial.Take("t", trial.New(48000, 2).Tone(1042, 0.5, 0).Noise(1e-5, 1), trial.New(48000, 2).Tone(1042, 0.5, 0).Noise(1e-5, 2))
	tk.Wiring.Out2 = "2"
	if r := trial.Run(balance, analyze.Params{}, tk); r.Value == nil || math.Abs(db(*r.Value)) > 0.001 {
		t.Errorf("%+v", r)
	}
}

// Gains 0.5 dB apart read 0.5 dB, by a tone and by a sweep; the match of the
// recorder's channels is all the gear that counts.
func TestBalance(t *testing.T) {
	ratio := math.Pow(10, 0.5/20)
	for _, text := range []string{"tone", "sweep length=2s", "stepped-tones count=5 each=300ms from=100Hz"} {
		x := trial.New(48000, 3).Tone(1042, 0.3, 0)
		params := analyze.Params{}
		if text != "tone" {
			x = trial.Played(text)
			params.At = []float64{1414}
		}
		louder := x.Copy()
		for i := range louder.X {
			louder.X[i] *= ratio
		}
		low := func(f float64) complex128 { return 1 / complex(1, f/40000) }
		tk := trial.Take("t", louder.Through(low).Noise(1e-5, 1), x.Through(low).Noise(1e-5, 2), x)
		tk.Wiring.Out2, tk.Wiring.In = "2", "3"
		tk.Gear.ChannelMatch, tk.Gear.ScaleU = 0.001, nil
		r := trial.Run(balance, params, tk)
		if r.Value == nil {
			t.Errorf("%s: %+v", text, r.Refusal)
			continue
		}
		if math.Abs(db(*r.Value)-0.5) > 0.002 {
			t.Errorf("%s: %.5f dB", text, db(*r.Value))
		}
		u, _ := budget.Combine(r.Budget)
		if math.Abs(u/ratio-0.001) > 1e-4 || len(r.Lacking) > 0 {
			t.Errorf("%s: u %g, %v", text, u/ratio, r.Lacking)
		}
	}
	// Opposite polarity is told.
	tk := trial.Take("t", trial.New(48000, 2).Tone(1042, 0.3, 0), trial.New(48000, 2).Tone(1042, 0.3, math.Pi))
	tk.Wiring.Out2 = "2"
	if r := trial.Run(balance, analyze.Params{}, tk); r.Value == nil || len(r.Notes) == 0 || math.Abs(cmplx.Abs(complex(*r.Value, 0))-1) > 1e-6 {
		t.Errorf("%+v", r)
	}
}
