package health

import (
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"benchslip/capture/recording"
)

// Shares of the fundamental in the AC power, from the Fourier series: square
// 8/pi^2, triangle 96/pi^4, half-wave rectified sine (1/8)/(1/4 - 1/pi^2),
// saw 6/pi^2. The first and third are why the limit is 85 %.
func TestFundamentalShare(t *testing.T) {
	u := func(t float64) float64 { v := 50.3 * t; return v - math.Floor(v) }
	for _, c := range []struct {
		name string
		w    wave
		want float64
	}{
		{"sine", sine(0.7, 50.3, 1), 1},
		{"square", func(t float64) float64 { return math.Copysign(1, u(t)-0.5) }, 8 / (math.Pi * math.Pi)},
		{"triangle", func(t float64) float64 { return math.Abs(u(t) - 0.5) }, 96 / math.Pow(math.Pi, 4)},
		{"half sine", func(t float64) float64 { return max(0, sine(1, 50.3, 0)(t)) }, 0.125 / (0.25 - 1/(math.Pi*math.Pi))},
		{"saw", u, 6 / (math.Pi * math.Pi)},
	} {
		fit, ok := fitSine(sample(fs, 0.5, c.w))
		if !ok {
			t.Errorf("%s: no fit", c.name)
			continue
		}
		near(t, c.name+" share", fit.share, c.want, 2e-3)
		near(t, c.name+" omega", fit.omega, 2*math.Pi*50.3/fs, 1e-5)
	}
}

// A sine of known size, frequency and phase comes back, short or long.
func TestFitSine(t *testing.T) {
	for _, c := range []struct{ rate, seconds, peak, hz, phase float64 }{
		{48000, 0.1, 0.5, 997, 0.3}, {48000, 1, 2, 11025.5, -2}, {1e6, 0.02, 3, 151, 1}, {192000, 2, 1e-3, 3.7, 2.5},
	} {
		x := sample(c.rate, c.seconds, sine(c.peak, c.hz, c.phase))
		for i := range x {
			x[i] += 0.25
		}
		fit, ok := fitSine(x)
		if !ok {
			t.Fatalf("%g Hz: no fit", c.hz)
		}
		near(t, "peak", fit.peak/c.peak, 1, 1e-9)
		near(t, "omega", fit.omega/(2*math.Pi*c.hz/c.rate), 1, 1e-9)
		near(t, "phase", math.Remainder(fit.phase-(c.phase-math.Pi/2), 2*math.Pi), 0, 1e-6)
	}
}

// No rounded sine stands longer at its peak than ownRun allows, with noise of
// a quarter step too; and the allowance is no more than half as long again,
// and two samples, against the longest found.
func TestOwnRun(t *testing.T) {
	r := rand.New(rand.NewPCG(5, 5))
	for range 200 {
		steps := 4 * math.Pow(8000, r.Float64()) // peak in steps
		omega := 2 * math.Pi / (4 * math.Pow(5000, r.Float64()))
		allowed := sineFit{peak: steps, omega: omega}.ownRun(1)
		longest := int64(0)
		for range 30 {
			peak, phase, rms := steps-1+r.Float64(), 7*r.Float64(), 0.25*float64(r.IntN(2))
			x := make([]float64, int(4*math.Pi/omega)+1)
			top := 0.0
			for i := range x {
				x[i] = math.Round(peak*math.Sin(omega*float64(i)+phase) + rms*r.NormFloat64())
				top = max(top, x[i])
			}
			n := int64(0)
			for _, v := range x {
				if v == top {
					n++
				} else {
					n = 0
				}
				longest = max(longest, n)
			}
		}
		if longest > allowed {
			t.Errorf("peak %g steps, %g samples a period: run of %d, allowed %d", steps, 2*math.Pi/omega, longest, allowed)
		}
		if float64(allowed) > 1.5*float64(longest)+2 {
			t.Errorf("peak %g steps, %g samples a period: allowed %d, longest found %d", steps, 2*math.Pi/omega, allowed, longest)
		}
	}
}

// The median of |x| is 0.6745 sigma for normal x; white noise cannot be
// predicted, so that is the error left; a sum of three sines leaves none.
func TestPredictor(t *testing.T) {
	p, ok := fitPredictor(noise(20000, 0.1, 1))
	if !ok {
		t.Fatal("no fit")
	}
	near(t, "median error of white noise", p.median, 0.06745, 0.001)
	x := sum(tone(0.5, 997), tone(0.2, 5000), tone(0.1, 60))
	p, _ = fitPredictor(x[:2000])
	if p.max > 1e-6 {
		t.Errorf("three sines leave %g", p.max)
	}
	if _, ok := fitPredictor(constant(100, 0)); ok {
		t.Error("zeros were fitted")
	}
	if _, ok := fitPredictor([]float64{1, 2, 3}); ok {
		t.Error("three samples were fitted")
	}
}

// Every lag from 64 to 4096 and every place relative to the anchors is found,
// with its exact ends.
func TestMatcherFindsAll(t *testing.T) {
	base := noise(30000, 1, 8)
	for lag := 64; lag <= 4096; lag += 1 + lag/7 {
		for _, at := range []int{lag, 5000, 8191, 8192, 12345 + lag%32} {
			x := insert(base, at, base[at-lag:at]...)
			ch := feedAll(audio(fs, 0, x))
			want := match{int64(lag), int64(at), int64(at + lag)}
			if f := ch.match.found; len(f) != 1 || f[0] != want {
				t.Errorf("found %v, want %v", f, want)
			}
		}
	}
}

// feedAll runs one channel through, without the judging.
func feedAll(rec *fake) *channel {
	ch := newChannel(rec.Info(), 0)
	w := append(constant(history, math.NaN()), rec.x[0]...)
	for k := 0; k < len(rec.x[0]); k += cell {
		ch.feed(w[k:min(k+history+cell, len(w))], int64(k))
	}
	ch.close(rec.info.Frames)
	return ch
}

// Samples that are missing end every run and make no flag.
func TestMissingSamples(t *testing.T) {
	for name, x := range map[string][]float64{
		"tone": live(0.5, 997, 1), "clean tone": tone(0.5, 1000), "zeros": constant(fs, 0), "clipped": limit(tone(1.3, 997), -1, 1),
	} {
		rec := audio(fs, 24, x)
		for i := 7000; i < 7400; i++ {
			rec.x[0][i] = math.NaN()
		}
		for i := 0; i < fs; i += 500 {
			rec.x[0][i] = math.NaN()
		}
		want := map[string]string{"zeros": "silent 1", "clipped": "clipped 1"}[name]
		if r := mustScan(t, rec); codesOf(r) != want {
			t.Errorf("%s: %q, want %q%s", name, codesOf(r), want, tell(r))
		}
	}
	rec := audio(fs, 24, constant(100, 1))
	for i := 2; i < 100; i += 3 {
		rec.x[0][i] = math.NaN()
	}
	if r := mustScan(t, rec); codesOf(r) != "silent 1" {
		t.Errorf("pairs at full scale between gaps: %q", codesOf(r))
	}
}

func TestUnknownRate(t *testing.T) {
	rec := audio(fs, 16, limit(tone(1.3, 997), -1, 1))
	rec.info.RateHz = 0
	f := mustScan(t, rec).Flags[0]
	if f.FromS != nil || f.ToS != nil || !strings.Contains(f.Message, "frame ") {
		t.Errorf("%+v", f)
	}
}

// Many faults: eight are named, the rest shares a flag.
func TestManyEvents(t *testing.T) {
	x := live(0.3, 997, 1)
	for i := range 15 {
		x = put(x, 2000+3000*i, constant(100+i, 0)...)
	}
	r := mustScan(t, audio(fs, 24, x))
	if n := len(r.Flags); n != maxEvents+1 {
		t.Fatalf("%d flags%s", n, tell(r))
	}
	last := r.Flags[maxEvents]
	if !strings.HasPrefix(last.Message, "7 more places") {
		t.Error(last.Message)
	}
	near(t, "from", *last.FromS, float64(2000+3000*8)/fs, 1e-9)
	near(t, "to", *last.ToS, float64(2000+3000*14+114)/fs, 1e-9)
}

type broken struct{ *fake }

func (broken) ReadAt([][]float64, int64) (int, error) { return 0, recording.ErrFormat }

func TestReadErrorIsPassedOn(t *testing.T) {
	if _, err := Scan(broken{audio(fs, 16, tone(0.5, 997))}); err != recording.ErrFormat {
		t.Errorf("got %v", err)
	}
}
