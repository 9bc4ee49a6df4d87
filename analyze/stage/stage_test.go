package stage

import (
	"math"
	"math/cmplx"
	"math/rand/v2"
	"testing"

	"benchslip/analyze"
	"benchslip/analyze/internal/sinefit"
	"benchslip/capture/recording"
	"benchslip/capture/recording/memory"
)

func take(rate float64, data ...[]float64) (*analyze.Pass, *analyze.Take) {
	t := &analyze.Take{Name: "t", Rec: memory.New(recording.Audio, rate, data...),
		Gear: &analyze.Gear{Name: "box", Kind: recording.Audio, FullScalePeak: 1, Clock: 50e-6}}
	return &analyze.Pass{Params: &analyze.Params{}, Stages: analyze.NewStages(), MainsHz: 50}, t
}

func tone(y []float64, rate, hz, amp, phase float64) {
	for i := range y {
		y[i] += amp * math.Cos(2*math.Pi*sinefit.Turns(hz/rate, float64(i))+phase)
	}
}

func noise(y []float64, rms float64, seed uint64) {
	r := rand.New(rand.NewPCG(seed, 1))
	for i := range y {
		y[i] += rms * r.NormFloat64()
	}
}

func TestGainAgainstBound(t *testing.T) {
	rate, n := 48000.0, 48000*2
	sigma := 0.01
	var eAmp, eFreq, ePh float64
	const runs = 6
	for seed := uint64(0); seed < runs; seed++ {
		r := rand.New(rand.NewPCG(seed, 9))
		hz := 1042.3 + r.Float64()
		out, in := make([]float64, n), make([]float64, n)
		tone(out, rate, hz, 0.5, 0.3)
		tone(in, rate, hz, 0.05, -1)
		tone(out, rate, 50.013, 0.002, 1)
		tone(out, rate, 150.04, 0.001, 1)
		noise(out, sigma, seed*2)
		noise(in, sigma/10, seed*2+1)
		p, tk := take(rate, out, in)
		so, si := analyze.NewSignal(tk, 1, 0, 0, int64(n), 1), analyze.NewSignal(tk, 2, 0, 0, int64(n), 1)
		tn, bad := FindTone(p, 0, si, so)
		if bad != nil {
			t.Fatal(bad)
		}
		lo := Decompose(p, so, Options{Tone: tn})
		li := Decompose(p, si, Options{Tone: tn})
		g := lo.Phasor() / li.Phasor()
		eAmp += math.Pow(cmplx.Abs(g)/10-1, 2)
		eFreq += math.Pow(tn.Hz-hz, 2)
		ePh += math.Pow(math.Remainder(cmplx.Phase(g)-1.3, 2*math.Pi), 2)
	}
	eta := 0.5 * 0.5 / (2 * sigma * sigma)
	amp := math.Sqrt(2 / (2 * eta * float64(n)) * 2) // two channels alike: var(A)/A^2 = 1/(eta N) each
	amp = math.Sqrt(2 / (eta * float64(n)))
	fr := rate / (2 * math.Pi) * math.Sqrt(12/(2*eta)/(float64(n)*float64(n)*float64(n)))
	ratio := func(e, bound float64) float64 { return math.Sqrt(e/runs) / bound }
	t.Logf("gain %.3f  freq %.3f  phase %.3f of the bound", ratio(eAmp, amp), ratio(eFreq, fr), ratio(ePh, amp))
}

func TestPureTone(t *testing.T) {
	for _, hz := range []float64{1042.37, 997, 1999.99} {
		rate, n := 96000.0, 960000
		y := make([]float64, n)
		tone(y, rate, hz, 0.7, 0.4)
		p, tk := take(rate, y)
		s := analyze.NewSignal(tk, 1, 0, 0, int64(n), 1)
		tn, bad := FindTone(p, 0, s)
		if bad != nil {
			t.Fatal(bad)
		}
		l := Decompose(p, s, Options{Tone: tn})
		t.Logf("hz err %g rigid %v residual %.1f dB", tn.Hz-hz, tn.Track.Rigid, 10*math.Log10(l.Residual/(0.49/2)))
		for _, h := range l.Harm[1:] {
			if db := 10 * math.Log10(abs2(h.Z)/0.49); db > -240 {
				t.Logf("H%d %.1f dB", h.Order, db)
			}
		}
	}
}

func TestDrift(t *testing.T) {
	// 10 kHz, 0.3 ppm apart within 10 s, noise 100 dB below.
	rate, n := 48000.0, 480000
	for _, shape := range []string{"linear", "wander"} {
		y := make([]float64, n)
		for i := range y {
			x := float64(i) / rate
			ph := 0.0
			if shape == "linear" {
				ph = 2 * math.Pi * 10000 * 0.3e-6 * x * x / 20
			} else {
				ph = 10000 * 0.15e-6 * 10 * (1 - math.Cos(2*math.Pi*x/10))
			}
			y[i] = 0.7 * math.Cos(2*math.Pi*sinefit.Turns(10000.123/rate, float64(i))+ph)
		}
		noise(y, 0.7/math.Sqrt2*1e-5, 5)
		p, tk := take(rate, y)
		s := analyze.NewSignal(tk, 1, 0, 0, int64(n), 1)
		tn, bad := FindTone(p, 0, s)
		if bad != nil {
			t.Fatal(bad)
		}
		l := Decompose(p, s, Options{Tone: tn})
		want := 1e-10 * 19980 / 24000
		got := l.Noise.Integrate(20, 20000, nil) / (0.49 / 2)
		t.Logf("%s rigid %v: %.3f dB off, residual %.2f dB fund %.9g", shape, tn.Track.Rigid, 10*math.Log10(got/want), 10*math.Log10(l.Residual/(0.49/2)), l.Harm[0].RMS())
	}
}
