package stage

import (
	"math"
	"testing"

	"benchslip/analyze"
	"benchslip/analyze/internal/trial"
)

func apart(t *testing.T, s *trial.Signal) *Lines {
	t.Helper()
	p := trial.Pass(nil, analyze.Params{}, map[string]*analyze.Take{"take": trial.Take("t", s)})
	sig, bad := p.Signal("take", "out")
	if bad != nil {
		t.Fatal(bad)
	}
	return Apart(p, "take", sig, 0)
}

// Faint mains orders read on the slower copy are those of a fit at the full
// rate: the same signal in 3.9 s (direct) and 4.1 s (slower copy) pieces, and
// the direct fit of the same length by hand.
func TestSlowCopyReadsTheSame(t *testing.T) {
	rms := make([]float64, 40)
	for k := range rms {
		rms[k] = 2e-5 / float64(k+1)
	}
	s := trial.New(48000, 8).Tone(1042.3, 0.3, 1).Mains(50.01, 0, rms, 3).Noise(1e-4, 4)
	slow := apart(t, s)
	weak := 0
	for _, q := range slow.Mains {
		if q.weak {
			weak++
		}
	}
	if weak < 20 {
		t.Fatalf("only %d orders went to the slower copy", weak)
	}
	// The same lines, all at the full rate.
	direct := *slow
	direct.Harm = append([]Line(nil), slow.Harm...)
	direct.Mains = append([]Line(nil), slow.Mains...)
	direct.Others = append([]Line(nil), slow.Others...)
	for _, q := range direct.all() {
		q.Blocks, q.weak = nil, false
	}
	direct.fitBlocks()
	for i, q := range slow.Mains {
		a, b := slow.meanPower(q.Blocks, 1), direct.meanPower(direct.Mains[i].Blocks, 1)
		// Both see the same noise but for the filter's edges of a block.
		if math.Abs(a-b) > 0.02*q.Share+0.001*b {
			t.Errorf("order %d: %.4g V^2 on the slower copy, %.4g at the full rate, share %.3g", q.Order, a, b, q.Share)
		}
	}
}

// The noise that is left is the noise that was put in, whatever lines stood
// in it: white noise of sigma a sample has the density 2 sigma^2/fs.
func TestNoiseAmongLines(t *testing.T) {
	const sigma, rate = 1e-4, 48000.0
	for _, seconds := range []float64{1, 3, 12, 40} {
		s := trial.New(rate, seconds).Tone(997.3, 0.5, 1).Tone(1994.6, 1e-3, 0).Tone(6543.2, 0.01, 2).
			Mains(49.98, 0.02, []float64{1e-3, 2e-4, 5e-4, 0, 2e-4}, 3).Noise(sigma, uint64(seconds))
		l := apart(t, s)
		got := l.Noise.Integrate(20, 20000, nil) / 19980
		want := 2 * sigma * sigma / rate
		if u := 4 / math.Sqrt(19980*seconds*0.8); math.Abs(got/want-1) > u {
			t.Errorf("%g s: density %.4f of the truth, wanted 1 within %.4f", seconds, got/want, u)
		}
	}
}

// The frequency of a wandering tone is the mean over the span: phase gained
// over time gone.
func TestMeanFrequencyOfAWanderingTone(t *testing.T) {
	const hz, T = 5000.0, 9.0
	swing := func(x float64) float64 { return 0.02 * math.Sin(2*math.Pi*x/8) }
	l := apart(t, trial.New(48000, T).Swing(hz, 0.5, swing).Noise(1e-5, 1))
	want := hz + (swing(T)-swing(0))/(2*math.Pi*T)
	if l.Tone == nil || math.Abs(l.Tone.Hz-want) > 3e-5 {
		t.Errorf("mean frequency %v, want %.6f", l.Tone, want)
	}
}
