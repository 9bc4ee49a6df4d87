package doubt

import (
	"math"
	"math/rand/v2"

	"benchslip/analyze"
	"benchslip/analyze/internal/trial"
	"benchslip/capture/health"
	"benchslip/capture/recording"
	"benchslip/capture/recording/memory"
)

// The takes of these tests: signals with what a bench adds to them.

type signal = trial.Signal

// subject is a take of the channels with the health report that opening it
// makes. bits 0: float samples.
func subject(kind string, bits int, channels ...*signal) Subject {
	var data [][]float64
	for _, c := range channels {
		data = append(data, c.X)
	}
	t := &analyze.Take{Name: "t", Rec: memory.New(kind, channels[0].Rate, data...)}
	if bits > 0 {
		trial.Bits(t, bits)
	}
	h, err := health.Scan(t.Rec)
	if err != nil {
		panic(err)
	}
	t.Health = h
	t.Flags = append(t.Flags, h.Flags...)
	return Subject{Take: t, MainsHz: 50}
}

// audio records channels with 24 bits and dither.
func audio(channels ...*signal) Subject {
	for i, c := range channels {
		c.Quantise(24, true, uint64(i+91))
	}
	return subject(recording.Audio, 24, channels...)
}

// screen records channels as an eight-bit screen of +-1 V does: whole steps.
func screen(channels ...*signal) Subject {
	for i, c := range channels {
		c.Quantise(8, false, uint64(i+91))
	}
	s := subject(recording.Scope, 0, channels...)
	for i := range s.Take.Rec.Info().Channels {
		s.Take.Rec.Info().Channels[i].Step = math.Exp2(-7)
	}
	return s
}

func silent(rate, seconds float64) *signal { return trial.New(rate, seconds) }

// shaped multiplies what is there by a gain over time.
func shaped(s *signal, gain func(t float64) float64) *signal {
	for i := range s.X {
		s.X[i] *= gain(float64(i) / s.Rate)
	}
	return s
}

// plus adds a function of time.
func plus(s *signal, v func(t float64) float64) *signal {
	for i := range s.X {
		s.X[i] += v(float64(i) / s.Rate)
	}
	return s
}

// on is 1 from a to b seconds with raised-cosine fades of 10 ms outside.
func on(a, b float64) func(t float64) float64 {
	const fade = 0.01
	return func(t float64) float64 {
		switch d := math.Max(a-t, t-b); {
		case d <= 0:
			return 1
		case d < fade:
			return 0.5 + 0.5*math.Cos(math.Pi*d/fade)
		}
		return 0
	}
}

// burst is silence, tone, silence of three seconds each.
func burst(rate float64) *signal { return shaped(silent(rate, 9).Tone(1042.3, 0.3, 1), on(3, 6)) }

// cut takes n samples out at a time, as a recorder that loses them.
func cut(s *signal, at float64, n int) *signal {
	i := int(at * s.Rate)
	return &signal{Rate: s.Rate, X: append(append([]float64(nil), s.X[:i]...), s.X[i+n:]...)}
}

// twice plays n samples a second time.
func twice(s *signal, at float64, n int) *signal {
	i := int(at * s.Rate)
	x := append([]float64(nil), s.X[:i]...)
	x = append(x, s.X[i-n:i]...)
	return &signal{Rate: s.Rate, X: append(x, s.X[i:]...)}
}

// onePole is a low-pass of first order, applied so many times.
func onePole(s *signal, hz float64, times int) *signal {
	keep := math.Exp(-2 * math.Pi * hz / s.Rate)
	for range times {
		y := 0.0
		for i, v := range s.X {
			y = keep*y + (1-keep)*v
			s.X[i] = y
		}
	}
	return s
}

// brick keeps what lies below hz with a linear-phase filter of 401 taps
// (windowed sinc, Blackman, 74 dB).
func brick(s *signal, hz float64) *signal {
	const n = 401
	h := make([]float64, n)
	sum := 0.0
	for k := range h {
		t := float64(k - n/2)
		w := 0.42 - 0.5*math.Cos(2*math.Pi*float64(k)/(n-1)) + 0.08*math.Cos(4*math.Pi*float64(k)/(n-1))
		h[k] = 2 * hz / s.Rate * w
		if t != 0 {
			h[k] = math.Sin(2*math.Pi*hz/s.Rate*t) / (math.Pi * t) * w
		}
		sum += h[k]
	}
	x := make([]float64, len(s.X))
	for i := range x {
		for k, c := range h {
			if j := i - k; j >= 0 {
				x[i] += c * s.X[j]
			}
		}
	}
	return &signal{Rate: s.Rate, X: x}
}

// sweep is an exponential sweep from lo to hi Hz between times a and b.
func sweep(rate, seconds, lo, hi, a, b float64) *signal {
	s := silent(rate, seconds)
	l := (b - a) / math.Log(hi/lo)
	return plus(s, func(t float64) float64 {
		if t < a || t > b {
			return 0
		}
		return 0.3 * on(a+0.02, b-0.02)(t) * math.Sin(2*math.Pi*lo*l*(math.Exp((t-a)/l)-1))
	})
}

// steps plays tones one after another, each so long, with silences between.
func steps(rate float64, each, gap float64, hz []float64, amp func(i int) float64) *signal {
	s := silent(rate, float64(len(hz))*(each+gap)+gap)
	for i, f := range hz {
		a := gap + float64(i)*(each+gap)
		shape := on(a+0.01, a+each-0.01)
		plus(s, func(t float64) float64 { return amp(i) * shape(t) * math.Sin(2*math.Pi*f*t) })
	}
	return s
}

// pink adds noise whose density falls by 10 dB a decade.
func pink(s *signal, rms float64, seed uint64) *signal {
	r := rand.New(rand.NewPCG(seed, 4))
	const poles = 8
	var y [poles]float64
	for i := range s.X {
		for p := range y {
			keep := math.Exp(-2 * math.Pi * 2 * math.Pow(4, float64(p)) / s.Rate)
			y[p] = keep*y[p] + math.Sqrt(1-keep*keep)*r.NormFloat64()
			s.X[i] += rms / math.Sqrt(poles) * y[p]
		}
	}
	return s
}

// jittered is a tone sampled at instants that scatter by dt seconds RMS.
func jittered(rate, seconds, hz, amp, dt float64, seed uint64) *signal {
	r := rand.New(rand.NewPCG(seed, 8))
	s := silent(rate, seconds)
	for i := range s.X {
		s.X[i] = amp * math.Sin(2*math.Pi*hz*(float64(i)/rate+dt*r.NormFloat64()))
	}
	return s
}

// runningMean replaces each sample by the mean of m.
func runningMean(s *signal, m int) *signal {
	x := make([]float64, len(s.X)-m)
	for i := range x {
		for _, v := range s.X[i : i+m] {
			x[i] += v / float64(m)
		}
	}
	return &signal{Rate: s.Rate, X: x}
}

// extremes gives the smallest and the largest of each m samples in turn.
func extremes(s *signal, m int) *signal {
	out := &signal{Rate: s.Rate * 2 / float64(m)}
	for i := 0; i+m <= len(s.X); i += m {
		lo, hi := s.X[i], s.X[i]
		for _, v := range s.X[i : i+m] {
			lo, hi = math.Min(lo, v), math.Max(hi, v)
		}
		out.X = append(out.X, lo, hi)
	}
	return out
}

// times is a copy with another gain, rounded to 24 bits without dither.
func times(s *signal, g float64) *signal {
	c := &signal{Rate: s.Rate, X: append([]float64(nil), s.X...)}
	return shaped(c, func(float64) float64 { return g }).Quantise(24, false, 1)
}

func clone(s *signal) *signal { return &signal{Rate: s.Rate, X: append([]float64(nil), s.X...)} }

// allPass turns phases as a unit does, without touching sizes.
func allPass(s *signal, hz float64) *signal {
	a := (math.Tan(math.Pi*hz/s.Rate) - 1) / (math.Tan(math.Pi*hz/s.Rate) + 1)
	x1, y1 := 0.0, 0.0
	for i, x := range s.X {
		y := a*x + x1 - a*y1
		x1, y1 = x, y
		s.X[i] = y
	}
	return s
}
