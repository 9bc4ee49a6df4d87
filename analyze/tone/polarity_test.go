package tone

import (
	"math"
	"testing"

	"benchslip/analyze"
	"benchslip/analyze/internal/trial"
	"benchslip/capture/stimulus"
)

// A one-pole high-pass (10 Hz), a delay of whole samples and a sign: the sign
// comes back for every stimulus that tells it.
func TestPolarity(t *testing.T) {
	const ends = " before=200ms after=300ms"
	for _, text := range []string{"pulse length=1s" + ends, "pulse width=500us every=1s length=1s", "sweep length=1s" + ends, "white-noise length=1s" + ends, "pink-noise length=1s" + ends,
		"multitone length=1s" + ends, "stepped-tones count=10 each=200ms gap=60ms" + ends, "tone length=1s before=0s after=0s fade=0s"} {
		s, err := stimulus.Parse(text)
		if err != nil {
			t.Fatal(err)
		}
		g, err := stimulus.New(s)
		if err != nil {
			t.Fatal(err)
		}
		in := trial.New(float64(s.RateHz), s.TotalS())
		g.Next(in.X)
		for _, sign := range []float64{1, -1} {
			late := 17 // samples
			if s.Kind == "tone" {
				late = 0
			}
			out := trial.New(in.Rate, s.TotalS())
			a := math.Exp(-2 * math.Pi * 10 / in.Rate)
			y, before := 0.0, 0.0
			for i := range out.X {
				x := 0.0
				if i >= late {
					x = in.X[i-late]
				}
				y = a*y + (1+a)/2*(x-before)
				before = x
				out.X[i] = sign * y
			}
			tk := trial.Take("t", out.Noise(1e-5, 1), in)
			tk.Wiring.In = "2"
			r := trial.Run(polarity, analyze.Params{}, tk)
			if r.Value == nil || *r.Value != sign {
				t.Errorf("%s: %v (%v), want %g", text, r.Value, r.Refusal, sign)
			}
			if s.Kind == "tone" {
				continue
			}
			alone := trial.Take("t", out)
			alone.Stimulus = text
			r = trial.Run(polarity, analyze.Params{}, alone)
			if r.Value == nil || *r.Value != sign {
				t.Errorf("%s, one channel: %v (%v), want %g", text, r.Value, r.Refusal, sign)
			}
		}
	}
}

// A tone a quarter of a turn away tells nothing; one of many tones can be
// asked for.
func TestPolarityOfOneTone(t *testing.T) {
	take := func(out, in *trial.Signal) *analyze.Take {
		tk := trial.Take("t", out, in)
		tk.Wiring.In = "2"
		return tk
	}
	tk := take(trial.New(48000, 2).Tone(1042, 0.1, 1.5), trial.New(48000, 2).Tone(1042, 0.1, 0))
	if r := trial.Run(polarity, analyze.Params{}, tk); r.Refusal == nil || r.Refusal.Code != analyze.NotEnoughPoints {
		t.Errorf("a quarter turn: %+v", r)
	}
	many := func(turn float64) *trial.Signal {
		return trial.New(48000, 4).Tone(317, 0.1, 0).Tone(1042, 0.1, turn).Tone(3011, 0.1, 0)
	}
	tk = take(many(math.Pi), many(0))
	if r := trial.Run(polarity, analyze.Params{At: []float64{1042}}, tk); r.Value == nil || *r.Value != -1 {
		t.Errorf("at 1042 Hz: %+v", r)
	}
	if r := trial.Run(polarity, analyze.Params{At: []float64{317}}, tk); r.Value == nil || *r.Value != 1 {
		t.Errorf("at 317 Hz: %+v", r)
	}
}
