package noise

import (
	"fmt"
	"math"
	"math/cmplx"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
)

// runQuasiPeak is the noise voltage of ITU-R BS.468-4: the weighting network
// in the time domain, then the quasi-peak detector, started at rest, scaled so
// that a steady 1 kHz sine of U RMS reads U.
func runQuasiPeak(p *analyze.Pass, s *analyze.Signal) analyze.Result {
	u := rmsUnit(s)
	if s.RateHz < 44000 {
		return analyze.Refuse(u, analyze.Bandwidth, fmt.Sprintf("the 468 network reaches past %.6g Hz, half the rate of take %q", s.RateHz/2, s.Take.Name), "record at 48 kHz or more")
	}
	if s.DurationS() < 0.5 {
		return analyze.Refuse(u, analyze.TooShort, fmt.Sprintf("take %q holds %.3g s, the quasi-peak meter needs 0.5 s", s.Take.Name, s.DurationS()), "record 10 s or more")
	}
	m := newMeter(s.RateHz)
	highest, mean, square, count, sumCount := 0.0, 0.0, 0.0, 0.0, 0.0
	buf := make([]float64, 1<<14)
	for at := 0; ; {
		n := s.Read(buf, at)
		if n == 0 {
			break
		}
		for i, x := range buf[:n] {
			w, y := m.step(x)
			highest = math.Max(highest, y)
			square += w * w
			sumCount++
			if float64(at+i) >= 2*s.RateHz {
				mean += y
				count++
			}
		}
		at += n
	}
	if highest == 0 {
		return analyze.Refuse(u, analyze.NoSignal, fmt.Sprintf("take %q, channel %d: every sample is equal", s.Take.Name, s.Channel()), "check the connection and the channel")
	}
	var b budget.Budget
	// The meter integrates over some 0.3 s; its indication on steady noise
	// swings by a few per cent, of which the highest is taken.
	b.A("swing of the indication", 0.02*highest, 0)
	b.Scale(s, highest)
	r := analyze.Result{Value: &highest, Unit: u, FullScaleSine: s.FullScaleSine()}
	b.Into(&r)
	r.Details = map[string]any{"weighting": "468", "detector": "quasi-peak", "rms_v": math.Sqrt(square / sumCount), "span_s": spanOf(s)}
	if count > 0 {
		r.Details["mean_v"] = mean / count
	}
	r.Notes = []string{"quasi-peak reading after ITU-R BS.468-4; on steady white noise it lies 4.4 dB over the weighted RMS"}
	return r
}

// poles and zero of the network of BS.468-4 Fig. 1a in Hz (times 2 pi):
// the rational form of the Recommendation in factors; one zero at 0.
var networkPoles = []complex128{
	complex(-4122.702, 0), complex(-9975.063, 0),
	complex(-3758.529, 5790.042), complex(-3758.529, -5790.042),
	complex(-2983.160, 9940.843), complex(-2983.160, -9940.843),
}

// meter is network and detector at one sample rate.
type meter struct {
	sections []section
	prev     float64 // last input
	scale    float64 // network gain to 0 dB at 1 kHz
	det      float64 // detector output to RMS of a steady sine
	a, b     follower
}

// section is one complex (or real) pole in its exact impulse-invariant form on
// a signal taken as straight between samples (first-order hold).
type section struct {
	e, g0, g1 complex128 // state factor, weights of old and new input
	residue   complex128
	state     complex128
}

// follower is a one-pole follower with separate rise and fall times.
type follower struct{ rise, fall, y float64 }

func (f *follower) step(x float64) float64 {
	k := f.fall
	if x > f.y {
		k = f.rise
	}
	f.y += k * (x - f.y)
	return f.y
}

// newMeter builds the network from its partial fractions: H(s) = sum
// r_i/(s - p_i), each integrated exactly for an input that runs straight from
// sample to sample; the droop of that assumption near half the rate is small
// where the network passes anything. Detector constants: two followers in
// series, rise/fall 1.445/292 ms and 139.5/164.8 ms, which meet the burst
// tables of the Recommendation.
func newMeter(rate float64) *meter {
	m := &meter{}
	T := 1 / rate
	for i, p := range networkPoles {
		q := p * complex(2*math.Pi, 0)
		// residue of s / prod (s - p_k)
		r := q
		for k, o := range networkPoles {
			if k != i {
				r /= q - o*complex(2*math.Pi, 0)
			}
		}
		x := q * complex(T, 0)
		e := cmplx.Exp(x)
		// y' = q y + u, u straight from u0 to u1 over T:
		// y1 = e y0 + u0 (integral of e^{q(T-t)}(1 - t/T)) + u1 (same with t/T)
		i1 := (e - 1) / q
		it := (e - 1 - x) / (q * q * complex(T, 0)) // integral of e^{q(T-t)} t/T
		m.sections = append(m.sections, section{e: e, g0: i1 - it, g1: it, residue: r})
	}
	constant := func(seconds float64) float64 { return 1 - math.Exp(-T/seconds) }
	m.a = follower{rise: constant(1.445e-3), fall: constant(292e-3)}
	m.b = follower{rise: constant(139.5e-3), fall: constant(164.8e-3)}
	// Gain at 1 kHz of the discrete network, from its own sections.
	z := cmplx.Rect(1, 2*math.Pi*1000*T)
	var h complex128
	for _, s := range m.sections {
		h += s.residue * (s.g0 + s.g1*z) / (z - s.e)
	}
	m.scale = 1 / cmplx.Abs(h)
	// A steady sine of peak sqrt2 settles the detector at `steady`.
	w := &meter{a: m.a, b: m.b}
	steady := 0.0
	for i := 0; float64(i) < 3*rate; i++ {
		steady = w.b.step(w.a.step(math.Abs(math.Sqrt2 * math.Sin(2*math.Pi*math.Mod(1000*float64(i)*T, 1)))))
	}
	m.det = 1 / steady
	return m
}

// step takes one sample and returns the weighted voltage and the indication.
func (m *meter) step(x float64) (weighted, indication float64) {
	var y complex128
	for i := range m.sections {
		s := &m.sections[i]
		s.state = s.e*s.state + s.g0*complex(m.prev, 0) + s.g1*complex(x, 0)
		y += s.residue * s.state
	}
	m.prev = x
	weighted = real(y) * m.scale
	return weighted, m.b.step(m.a.step(math.Abs(weighted))) * m.det
}
