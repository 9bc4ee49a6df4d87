package sim

import (
	"math"
	"math/cmplx"
	"slices"
)

// Grid says when the samples of a take are taken.
type Grid struct {
	RateHz float64   // nominal sample rate, Hz: sets the bandwidth of noise
	T      []float64 // true time of each sample, s, increasing
}

// Source is a voltage over time. Add adds its value at g.T[i], in V, to
// dst[i]; len(dst) = len(g.T). A Source holds no state: every call gives the
// same voltage. It must hold nothing above half the sample rate, as behind an
// ideal anti-alias filter.
type Source interface {
	Add(dst []float64, g *Grid)
}

// Func is a Source made of a function.
type Func func(dst []float64, g *Grid)

// Add implements Source.
func (f Func) Add(dst []float64, g *Grid) { f(dst, g) }

// Sum adds sources.
type Sum []Source

// Add implements Source.
func (s Sum) Add(dst []float64, g *Grid) {
	for _, x := range s {
		x.Add(dst, g)
	}
}

// DC is a constant voltage, V.
type DC float64

// Add implements Source.
func (v DC) Add(dst []float64, _ *Grid) {
	for i := range dst {
		dst[i] += float64(v)
	}
}

// Tone is sqrt2 RMS cos(2 pi (FreqHz t + Turns)).
type Tone struct {
	FreqHz float64
	RMS    float64 // V
	Turns  float64 // phase at t = 0
}

// Add implements Source. The phase is kept in turns and reduced to its
// fraction before the sine; the rounding of the product FreqHz t is put back
// (fused multiply-add), so that what remains is the rounding of t itself:
// below 2e-12 turns, -220 dB, up to 20 000 periods.
func (s Tone) Add(dst []float64, g *Grid) {
	a := math.Sqrt2 * s.RMS
	for i, t := range g.T {
		dst[i] += a * math.Cos(2*math.Pi*turns(s.FreqHz, t, s.Turns))
	}
}

// turns is the fraction of f t + start, in about -0.5 .. 0.5.
func turns(f, t, start float64) float64 {
	p := f * t
	lost := math.FMA(f, t, -p) // exact f t less its rounded value
	p -= math.Round(p)
	p += start
	return p - math.Round(p) + lost
}

// Tones is a sum of tones.
type Tones []Tone

// Add implements Source.
func (s Tones) Add(dst []float64, g *Grid) {
	for _, x := range s {
		x.Add(dst, g)
	}
}

// Through returns the tones behind a linear circuit of complex transfer h(f),
// e^{+jwt}.
func (s Tones) Through(h func(freqHz float64) complex128) Tones {
	out := slices.Clone(s)
	for i, x := range s {
		v := h(x.FreqHz)
		out[i].RMS = x.RMS * cmplx.Abs(v)
		out[i].Turns = x.Turns + cmplx.Phase(v)/(2*math.Pi)
	}
	return out
}

// Curve is a weak nonlinearity without memory, y = x + K2 x^2 + K3 x^3, x in V
// (K2 in 1/V, K3 in 1/V^2). For one tone of peak A, from the powers of the
// cosine: fundamental A + 3/4 K3 A^3, second harmonic K2 A^2/2, third
// K3 A^3/4, a shift of K2 A^2/2.
type Curve struct {
	K2, K3 float64
	Of     Source
}

// Add implements Source. Three times the highest frequency of Of must stay
// below half the sample rate, or the products fold back.
func (c Curve) Add(dst []float64, g *Grid) {
	x := make([]float64, len(dst))
	c.Of.Add(x, g)
	for i, v := range x {
		dst[i] += v * (1 + v*(c.K2+v*c.K3))
	}
}

// HarmonicsOf returns the peaks of harmonics 0 (the shift) to 3 that the curve
// makes of one tone of peak a, V.
func (c Curve) HarmonicsOf(a float64) [4]float64 {
	return [4]float64{
		c.K2 * a * a / 2,
		a + 0.75*c.K3*a*a*a,
		c.K2 * a * a / 2,
		c.K3 * a * a * a / 4,
	}
}
