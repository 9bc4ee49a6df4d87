package transfer

import (
	"math"
	"testing"

	"benchslip/analyze"
	"benchslip/analyze/internal/trial"
)

func shapeOfSignal(x *trial.Signal) *Shape {
	return shapeOf(signalOf("t", x.X, x.Rate))
}

// Every kind that the program plays is recognised, alone, in noise with hum,
// and with a dirty low level.
func TestShapes(t *testing.T) {
	for text, want := range map[string]string{
		"sweep length=2s":    Sweep,
		"sweep length=500ms": Sweep,
		"sweep length=2s rate=96kHz from=10Hz to=44kHz": Sweep,
		"stepped-tones count=12 each=200ms":             Steps,
		"stepped-tones count=12 each=120ms gap=40ms":    Steps,
		"stepped-tones at=5Hz,1kHz,20kHz each=1s":       Steps,
		"multitone length=3s":                           Multitone,
		"multitone length=3s count=100":                 Multitone,
		"modulation-pair length=2s":                     Multitone,
		"difference-pair length=2s":                     Multitone,
		"white-noise length=2s":                         Noise,
		"pink-noise length=2s":                          Noise,
		"pulse length=2s":                               Pulse,
		"pulse length=1s every=1s width=200us":          Pulse,
		"tone length=2s":                                Tone,
		"tone at=20Hz length=2s":                        Tone,
		"pilot length=2s":                               Tone,
		"stepped-levels count=5 each=200ms":             Tone,
		"level-ramp length=2s":                          Tone,
	} {
		in := trial.Played(text)
		for i, scale := range []float64{1, 0.01} {
			x := in.Copy()
			for k := range x.X {
				x.X[k] *= scale
			}
			x.Noise(3e-4*scale, 1).Mains(50, 0.01, []float64{2e-4 * scale, 1e-4 * scale}, 1)
			if got := shapeOfSignal(x).Kind; got != want {
				t.Errorf("%s (%d): %q, want %q", text, i, got, want)
			}
		}
	}
}

// The law of an exponential sweep in Farina's form (AES 108th Convention
// 2000), 20 Hz to 20 kHz in 10 s: L = T / ln(f2/f1) = 1.44764827 s, orders 2
// and 3 are 1.00343332 s and 1.59040418 s ahead. Rising and falling.
func TestLawOfSweep(t *testing.T) {
	const f1, f2, T, rate = 20.0, 20000.0, 10.0, 48000.0
	L := T / math.Log(f2/f1)
	x := trial.New(rate, T+1)
	for i := range x.X {
		if s := float64(i)/rate - 0.5; s >= 0 && s < T {
			x.X[i] = 0.3 * math.Sin(2*math.Pi*f1*L*(math.Exp(s/L)-1))
		}
	}
	x.Noise(1e-3, 1)
	sh := shapeOfSignal(x)
	if sh.Kind != Sweep {
		t.Fatalf("%+v", sh)
	}
	for _, q := range []struct {
		name           string
		got, want, tol float64
	}{
		{"rate constant, s", sh.Law.L, 1.44764827, 1e-6},
		{"lead of order 2, s", sh.Law.L * math.Log(2), 1.00343332, 1e-6},
		{"lead of order 3, s", sh.Law.L * math.Log(3), 1.59040418, 1e-6},
		{"frequency after 5 s, Hz", sh.Law.HzAt(int(5.5*rate), rate), 632.455532, 1e-3},
		{"lower end, Hz", sh.Law.HzAt(sh.From, rate), 20, 0.15},
		{"upper end, Hz", sh.Law.HzAt(sh.To, rate), 20000, 150},
	} {
		if math.Abs(q.got-q.want) > q.tol {
			t.Errorf("%s: %.9g, want %.9g", q.name, q.got, q.want)
		}
	}
	for i, j := 0, len(x.X)-1; i < j; i, j = i+1, j-1 {
		x.X[i], x.X[j] = x.X[j], x.X[i]
	}
	if sh = shapeOfSignal(x); sh.Kind != Sweep || math.Abs(sh.Law.L+1.44764827) > 1e-6 {
		t.Errorf("falling: %+v", sh)
	}
}

// The sweep that the program plays, synchronised (Novak, Lotton, Simon, JAES
// 63 (2015) 786): L = round(f1 T/ln(f2/f1))/f1 = 1.45 s for 20 Hz to 20 kHz
// in 10 s.
func TestLawOfOwnSweep(t *testing.T) {
	sh := shapeOfSignal(trial.Played("sweep length=10s"))
	if math.Abs(sh.Law.L-1.45) > 1e-6 {
		t.Errorf("L %.9g", sh.Law.L)
	}
}

// A Farina sweep, a falling one and a linear one give the response.
func TestForeignSweeps(t *testing.T) {
	h := chain(highpass(25), lowpass(9000), delayed(40e-6))
	const rate, T, f1, f2 = 48000.0, 3.0, 30.0, 18000.0
	L := T / math.Log(f2/f1)
	for name, phase := range map[string]func(s float64) float64{
		"rising":  func(s float64) float64 { return f1 * L * (math.Exp(s/L) - 1) },
		"falling": func(s float64) float64 { return -f2 * L * (math.Exp(-s/L) - 1) },
		"linear":  func(s float64) float64 { return f1*s + (f2-f1)/(2*T)*s*s },
	} {
		in := trial.New(rate, T+1.5)
		for i := range in.X {
			s := float64(i)/rate - 0.5
			if s >= 0 && s < T {
				fade := math.Min(1, math.Min(s, T-s)/0.02)
				in.X[i] = 0.3 * fade * math.Sin(2*math.Pi*math.Mod(phase(s), 1))
			}
		}
		out := in.Through(h).Noise(2e-5, 1)
		db, deg, _ := worst(curveOf(t, out, in.Noise(1e-5, 2)), h)
		if db > 0.01 || deg > 0.1 {
			t.Errorf("%s: off by %.4f dB, %.3f deg", name, db, deg)
		}
	}
}

// Nothing that a channel may hold brings the engine down, and what tells no
// response is refused.
func TestNothingToHear(t *testing.T) {
	silent, dc := trial.New(48000, 1), trial.New(48000, 1).DC(0.3)
	tiny := trial.New(48000, 0.001).Noise(0.1, 1)
	noise := trial.New(48000, 1).Noise(0.1, 1)
	tone := trial.New(48000, 1).Tone(1000, 0.1, 0)
	click := trial.New(48000, 1)
	click.X[20000] = 1
	cut := trial.Played("sweep length=1s")
	cut.X = cut.X[60000:80000]
	for name, c := range map[string]struct {
		in, out *trial.Signal
		code    string // "": any curve or refusal
	}{
		"silent input":       {silent, noise, analyze.NoSignal},
		"constant input":     {dc, noise, analyze.NoSignal},
		"silent output":      {noise, silent, analyze.NotEnoughPoints},
		"noise to other one": {noise, trial.New(48000, 1).Noise(0.1, 9), ""},
		"one tone":           {tone, tone, analyze.NotEnoughPoints},
		"48 samples":         {tiny, tiny, ""},
		"one sample":         {click, click, ""},
		"cut sweep":          {cut, cut, ""},
		"sweep into silence": {trial.Played("sweep length=1s"), trial.New(48000, trial.Played("sweep length=1s").Rate/48000*float64(len(trial.Played("sweep length=1s").X))/48000), analyze.NotEnoughPoints},
		"pulse into silence": {click, silent, analyze.NotEnoughPoints},
	} {
		tk := trial.Take("t", c.out, c.in)
		tk.Wiring.In = "2"
		curve, bad := Of(passOf(tk), tk, "take")
		switch {
		case c.code != "" && (bad == nil || bad.Code != c.code):
			t.Errorf("%s: %v, want %s", name, bad, c.code)
		case bad == nil:
			for _, q := range curve.Points {
				if math.IsNaN(real(q.H)) || math.IsNaN(imag(q.H)) || math.IsInf(real(q.H), 0) || math.IsNaN(q.U) {
					t.Errorf("%s: %+v", name, q)
				}
			}
		}
	}
	if c := curveOf(t, cut, cut); len(c.Used()) == 0 || math.Abs(real(c.Used()[0].H)-1) > 1e-6 {
		t.Errorf("a channel against itself is not 1")
	}
}
