package sim

import (
	"math"
	"math/cmplx"
	"slices"
)

// Line is one harmonic of the mains.
type Line struct {
	Order int     // 1 is the mains frequency itself
	RMS   float64 // V
	Turns float64 // phase against Order times the fundamental's

	// WanderTurns is how far the phase swings to either side while loads come
	// and go, over a period of WanderS; real harmonics do not keep step with
	// the fundamental.
	WanderTurns float64
	WanderS     float64
}

// Mains is the supply's frequency as it drifts, and what of its harmonics
// reaches a circuit:
//
//	f(t) = FreqHz + DriftHz sin(2 pi t/DriftS)
//	v(t) = sum of sqrt2 RMS cos(2 pi (Order theta(t) + Turns + wander(t)))
//
// with theta the integral of f, StartTurns at t = 0. Two combs with the same
// frequency, drift and start are locked to each other, as a pick-up and its
// reference in one room are.
type Mains struct {
	FreqHz     float64 // mean
	DriftHz    float64 // peak; large grids stay within about 0.05 Hz for minutes
	DriftS     float64 // s; 0: no drift
	StartTurns float64
	Harmonics  []Line
}

// With returns the same supply with other lines.
func (m Mains) With(lines ...Line) Mains {
	m.Harmonics = lines
	return m
}

// Through returns the comb behind a linear circuit of transfer h(f), taken at
// the orders of the mean frequency.
func (m Mains) Through(h func(freqHz float64) complex128) Mains {
	m.Harmonics = slices.Clone(m.Harmonics)
	for i, l := range m.Harmonics {
		v := h(float64(l.Order) * m.FreqHz)
		m.Harmonics[i].RMS *= cmplx.Abs(v)
		m.Harmonics[i].Turns += cmplx.Phase(v) / (2 * math.Pi)
	}
	return m
}

// Total is the RMS of all lines together, V.
func (m Mains) Total() float64 {
	var sum float64
	for _, l := range m.Harmonics {
		sum += l.RMS * l.RMS
	}
	return math.Sqrt(sum)
}

// Phase is theta(t) in turns, reduced to about -1 .. 1.
func (m Mains) Phase(t float64) float64 {
	p := turns(m.FreqHz, t, m.StartTurns)
	if m.DriftS > 0 {
		p += m.DriftHz * m.DriftS / (2 * math.Pi) * (1 - math.Cos(2*math.Pi*t/m.DriftS))
	}
	return p
}

// MeanHz is the mean frequency between two times.
func (m Mains) MeanHz(from, to float64) float64 {
	swing := func(t float64) float64 {
		if m.DriftS <= 0 {
			return 0
		}
		return m.DriftHz * m.DriftS / (2 * math.Pi) * (1 - math.Cos(2*math.Pi*t/m.DriftS))
	}
	return m.FreqHz + (swing(to)-swing(from))/(to-from)
}

// Add implements Source. Within blocks of 256 samples (5 ms at 48 kHz) each
// line turns at one rate, from its exact phase at the block's start to that at
// the next one's: continuous, and off by at most a block squared times the
// phase's second derivative over 8 - nothing without drift and wander, some
// 1e-7 turns with a grid's.
func (m Mains) Add(dst []float64, g *Grid) {
	const block = 256
	for from := 0; from < len(dst); from += block {
		part := dst[from:min(from+block, len(dst))]
		t0, t1 := g.T[from], 0.0
		if to := from + len(part); to < len(g.T) {
			t1 = g.T[to]
		} else {
			t1 = g.T[to-1] + 1/g.RateHz
		}
		theta := m.Phase(t0)
		step := m.MeanHz(t0, t1) * (t1 - t0)
		for _, l := range m.Harmonics {
			h, w0, w1 := float64(l.Order), l.wander(t0), l.wander(t1)
			z := cmplx.Rect(math.Sqrt2*l.RMS, 2*math.Pi*(h*theta+l.Turns+w0))
			turn := cmplx.Rect(1, 2*math.Pi*(h*step+w1-w0)/float64(len(part)))
			re, im, c, s := real(z), imag(z), real(turn), imag(turn)
			for i := range part {
				part[i] += re
				re, im = re*c-im*s, re*s+im*c
			}
		}
	}
}

// wander is the line's own phase swing at t, in turns. The start of the swing
// differs by order, so that the lines do not swing together.
func (l Line) wander(t float64) float64 {
	if l.WanderS <= 0 {
		return 0
	}
	return l.WanderTurns * math.Sin(2*math.Pi*(t/l.WanderS+0.17*float64(l.Order)))
}
