package transfer

import (
	"fmt"
	"math"
	"testing"

	"benchslip/analyze"
	"benchslip/analyze/internal/trial"
	"benchslip/capture/recording"
	"benchslip/capture/recording/memory"
)

// late plays in with a clock that runs fast by ppm and begins after seconds.
func late(in *trial.Signal, ppm, after, seconds float64) *trial.Signal {
	x := resample(in.X, int(seconds*in.Rate), -after*in.Rate*(1+ppm*1e-6), 1+ppm*1e-6)
	return &trial.Signal{Rate: in.Rate, X: x}
}

// A take of one channel against the stated stimulus: clocks 60 ppm apart,
// 3.7 ms of delay, a unit of known response. Clock, delay, magnitudes and,
// after one common delay, phases come right.
func TestOneChannel(t *testing.T) {
	h := chain(highpass(10), section(40000, 0.8))
	for _, c := range []struct {
		text  string
		ppm   float64 // wanted of the clock
		degAt float64 // phases a sweep's clock leaves open
	}{
		{"sweep length=3s", 0.01, 0.1},
		{"stepped-tones count=16 each=300ms gap=60ms", 0.005, 0.1},
		{"multitone length=2s", 0.005, 0.1},
		{"white-noise length=2s", 0.01, 0.1},
		{"pink-noise length=2s", 0.3, 0.1},
		{"pulse length=2s", 0.5, 0.3},
	} {
		in := trial.Played(c.text)
		y := late(in, 60, 0.0037, float64(len(in.X))/in.Rate+0.5).Through(h).Noise(1e-5, 1)
		tk := trial.Take("t", y)
		tk.Stimulus = c.text
		curve, bad := Of(passOf(tk), tk, "take")
		if bad != nil {
			t.Errorf("%s: %v", c.text, bad)
			continue
		}
		db, deg, _ := worst(curve, h)
		if db > 0.01 || deg > c.degAt {
			t.Errorf("%s: off by %.4f dB, %.3f deg", c.text, db, deg)
		}
		if e := curve.ClockPPM - 60; math.Abs(e) > c.ppm {
			t.Errorf("%s: clock %.5f ppm (claimed +- %.5f)", c.text, curve.ClockPPM, 2*curve.ClockU)
		}
		// The unit's own delay is a few us; the rest is the player's.
		if d := curve.StartS + curve.DelayS; math.Abs(d-0.0037) > 60e-6 {
			t.Errorf("%s: delay %.6f s", c.text, d)
		}
	}
}

// The stimulus as a file, at twice the rate of the take.
func TestOneChannelFromFile(t *testing.T) {
	h := chain(highpass(20), lowpass(20000))
	in := trial.Played("sweep length=1500ms to=20kHz rate=96kHz")
	y := late(in, -40, 0.1, 4).Through(h)
	half := &trial.Signal{Rate: 48000, X: resample(y.X, len(y.X)/2, 0, 2)}
	tk := trial.Take("t", half.Noise(1e-5, 1))
	tk.Stimulus = "sweep.wav"
	tk.PlayedRec = memory.New(recording.Audio, 96000, in.X)
	c, bad := Of(passOf(tk), tk, "take")
	if bad != nil {
		t.Fatal(bad)
	}
	if db, deg, _ := worst(c, h); db > 0.01 || deg > 0.2 {
		t.Errorf("off by %.4f dB, %.3f deg", db, deg)
	}
	if math.Abs(c.ClockPPM+40) > 0.3 || !c.Stated {
		t.Errorf("clock %.4f ppm", c.ClockPPM)
	}
}

func TestStatedRefusals(t *testing.T) {
	y := trial.New(48000, 1).Noise(0.1, 1)
	for text, code := range map[string]string{
		"":                   analyze.MissingTake,
		"tone":               analyze.NotEnoughPoints,
		"sweep from=nothing": analyze.Unreadable,
	} {
		tk := trial.Take("t", y)
		tk.Stimulus = text
		if _, bad := Of(passOf(tk), tk, "take"); bad == nil || bad.Code != code {
			t.Errorf("%q: %v, want %s", text, bad, code)
		}
	}
	tk := trial.Take("t", y)
	tk.Stimulus, tk.PlayedFault = "x.wav", &analyze.Refusal{Code: analyze.MissingTake}
	if _, bad := Of(passOf(tk), tk, "take"); bad != tk.PlayedFault {
		t.Errorf("a file that is not there: %v", bad)
	}
	// A sweep that was never played.
	tk = trial.Take("t", y)
	tk.Stimulus = "sweep length=500ms"
	if c, bad := Of(passOf(tk), tk, "take"); bad == nil {
		for _, q := range c.Used() {
			t.Logf("%+v", q)
		}
		if len(c.Used()) > len(c.Points)/4 {
			t.Errorf("%d of %d points of a sweep that is not there", len(c.Used()), len(c.Points))
		}
	}
}

// Sines between the samples, up to 0.47 of the lower rate.
func TestResample(t *testing.T) {
	for _, c := range []struct{ nu, step, at float64 }{{0.001, 1.00006, 100.3}, {0.2, 0.99, 100.7}, {0.47, 1.0001, 100.1}, {0.23, 2, 100}, {0.1, 0.5, 100.25}} {
		r := make([]float64, 4000)
		for i := range r {
			r[i] = math.Sin(2 * math.Pi * c.nu * float64(i))
		}
		n := int(3000 / c.step)
		x := resample(r, n, c.at, c.step)
		worst := 0.0
		for i, v := range x {
			pos := c.at + float64(i)*c.step
			if pos > 200 && pos < 3800 {
				worst = math.Max(worst, math.Abs(v-math.Sin(2*math.Pi*c.nu*pos)))
			}
		}
		if worst > 3e-5 {
			t.Errorf("%+v: off by %g", c, worst)
		}
	}
	if x := resample([]float64{1, 2}, 5, 1000, 1); x[0] != 0 || x[4] != 0 {
		t.Error("beyond the end:", x)
	}
}

// Delays in closed form: 37.5 samples at 48 kHz are 781.25 us, 10 us are -36
// deg at 10 kHz; positive is later; an inversion is no delay.
func TestDelay(t *testing.T) {
	const ends = " before=100ms after=200ms"
	for _, text := range []string{"sweep length=500ms" + ends, "multitone length=2s" + ends, "stepped-tones count=10 each=100ms gap=50ms" + ends, "white-noise length=1s" + ends} {
		in := trial.Played(text)
		for _, tau := range []float64{37.5 / 48000, 10e-6, -20e-6} {
			for _, sign := range []complex128{1, -1} {
				h := chain(delayed(tau), func(float64) complex128 { return sign })
				c := curveOf(t, in.Through(h).Noise(1e-5, 3), in)
				name := fmt.Sprintf("%s, %.6g us, sign %g", text, tau*1e6, real(sign))
				if e := math.Abs(c.DelayS - tau); e > 2e-8 || e > 4*c.DelayU+1e-10 {
					t.Errorf("%s: %.6g us +- %.2g", name, c.DelayS*1e6, 2*c.DelayU*1e6)
				}
				if c.Impulse.Sign != real(sign) {
					t.Errorf("%s: polarity %g", name, c.Impulse.Sign)
				}
				q, _ := c.nearest(10000, 1.3, "", "")
				want := math.Remainder(-360*q.Hz*tau+90*(1-real(sign)), 360)
				got := c.PhaseDeg(q) - 360*q.Hz*c.DelayS
				if e := math.Remainder(got-want, 360); math.Abs(e) > 0.05 {
					t.Errorf("%s: phase %.3f deg at %.5g Hz, want %.3f", name, got, q.Hz, want)
				}
				for i, g := range c.GroupDelays() {
					if c.Points[i].Hz > 500 && math.Abs(g-tau) > 2e-6 {
						t.Errorf("%s: group delay %.4g us at %.5g Hz", name, g*1e6, c.Points[i].Hz)
						break
					}
				}
			}
		}
	}
}
