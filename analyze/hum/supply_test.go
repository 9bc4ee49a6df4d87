package hum

import (
	"math"
	"math/cmplx"
	"math/rand/v2"

	"benchslip/analyze/internal/trial"
)

// supply is a mains of known truth: its frequency drifts, and the phase of
// each harmonic wanders against that of the fundamental, as loads come and go.
type supply struct {
	hz     float64 // mean over the take, nearly
	drift  float64 // Hz, peak, sinusoidal
	period float64 // s, of the drift
	wander float64 // rad, peak, of each harmonic from the second on
	swing  float64 // s, period of that wander
	seed   uint64
}

// wave adds the comb of orders with the given RMS to s and returns the phases
// (rad, without wander) at the start. Lines turn at one rate over 16 samples,
// exact at their ends.
func (m supply) wave(s *trial.Signal, rms map[int]float64, phase map[int]float64) {
	r := rand.New(rand.NewPCG(m.seed, 5))
	at := r.Float64() * 2 * math.Pi
	theta := func(t float64) float64 { // turns
		p := m.hz * t
		if m.drift != 0 {
			p -= m.drift * m.period / (2 * math.Pi) * (math.Cos(2*math.Pi*t/m.period+at) - math.Cos(at))
		}
		return p
	}
	for h := 1; h <= 100; h++ {
		start, own := r.Float64()*2*math.Pi, r.Float64()*2*math.Pi
		u := rms[h]
		if u == 0 {
			continue
		}
		if p, ok := phase[h]; ok {
			start = p
		}
		arg := func(t float64) float64 {
			a := theta(t) * float64(h)
			x := 2*math.Pi*(a-math.Round(a)) + start
			if h > 1 && m.wander != 0 {
				x += m.wander * math.Sin(2*math.Pi*t/m.swing+own)
			}
			return x
		}
		const block = 16
		for from := 0; from < len(s.X); from += block {
			part := s.X[from:min(from+block, len(s.X))]
			a, b := arg(float64(from)/s.Rate), arg(float64(from+len(part))/s.Rate)
			turns := float64(h) * m.hz * float64(len(part)) / s.Rate * 2 * math.Pi
			d := turns + math.Remainder(b-a-turns, 2*math.Pi)
			z := cmplx.Rect(math.Sqrt2*u, a)
			w := cmplx.Rect(1, d/float64(len(part)))
			for i := range part {
				part[i] += real(z)
				z *= w
			}
		}
	}
}

// mean is the mean frequency over a take.
func (m supply) mean(seconds float64) float64 {
	r := rand.New(rand.NewPCG(m.seed, 5))
	at := r.Float64() * 2 * math.Pi
	if m.drift == 0 {
		return m.hz
	}
	return m.hz - m.drift*m.period/(2*math.Pi)*(math.Cos(2*math.Pi*seconds/m.period+at)-math.Cos(at))/seconds
}
