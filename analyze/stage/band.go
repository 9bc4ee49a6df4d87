package stage

import (
	"fmt"
	"math"

	"benchslip/analyze"
	"benchslip/analyze/internal/spectrum"
)

// edge widens the upper band edge for lines: a harmonic at 20 kHz of a tone
// whose clock runs fast still belongs to a band that ends at 20 kHz.
const edge = 1e-3

// Band is a measurement band on one signal.
type Band struct {
	analyze.Band
	// Open: the span is too short to resolve the lower edge (under ten
	// periods of it), so everything but DC counts.
	Open bool
}

// InLine reports whether a line at hz counts.
func (b Band) InLine(hz float64) bool {
	return (b.Open || hz >= b.Low) && hz <= b.High*(1+edge)
}

// BandFor checks a band against a signal: an upper edge above half the rate
// is refused, never narrowed.
func BandFor(s *analyze.Signal, b analyze.Band) (Band, *analyze.Refusal) {
	if b.High > s.RateHz/2 {
		return Band{}, &analyze.Refusal{Code: analyze.Bandwidth,
			Text:   fmt.Sprintf("the band reaches to %.6g Hz, take %q only to %.6g Hz (half its sample rate)", b.High, s.Take.Name, s.RateHz/2),
			Advice: fmt.Sprintf("record at %.6g Hz or more, or state a narrower band", 2.2*b.High)}
	}
	return Band{Band: b, Open: b.Low > 0 && s.DurationS() < 10/b.Low}, nil
}

// NoiseLow is the lower edge for integrating the noise: the band's, or one
// resolution step when the span cannot resolve it (DC stays out).
func (b Band) NoiseLow(l *Lines) float64 {
	if b.Open {
		return 0.5 * l.Noise.StepHz
	}
	return b.Low
}

// Power is mean-square in V^2 with its standard uncertainty.
type Power struct{ P, U float64 }

// LinesIn sums the fitted lines of a set inside the band (noise shares off),
// each times gain at its frequency (nil: 1).
func LinesIn(b Band, gain func(float64) float64, sets ...[]Line) Power {
	var p Power
	v := 0.0
	for _, set := range sets {
		for _, q := range set {
			if q.Dropped || !b.InLine(q.Hz) {
				continue
			}
			g := 1.0
			if gain != nil {
				g = gain(q.Hz)
			}
			p.P += g * q.Power
			v += g * q.U * g * q.U
		}
	}
	p.U = math.Sqrt(v)
	return p
}

// NoiseIn integrates the noise density in the band under gain. Its relative
// uncertainty is 1/sqrt(B_s T), B_s the statistical bandwidth
// (int S)^2/int S^2, T the share of the span that the averaging uses.
func NoiseIn(l *Lines, b Band, gain func(float64) float64) Power {
	lo := b.NoiseLow(l)
	p := l.Noise.Integrate(lo, b.High, gain)
	return Power{p, p / math.Sqrt(math.Max(StatisticalBandwidth(l, lo, b.High, gain)*l.Sig.DurationS()*l.Noise.Used, 1))}
}

// StatisticalBandwidth is B_s in Hz; the scatter of the estimated density
// itself, which makes int S^2 too large by 1 + 1/K, is taken off.
func StatisticalBandwidth(l *Lines, lo, hi float64, gain func(float64) float64) float64 {
	b := l.Noise.BandwidthOf(lo, hi, gain)
	if k := l.Noise.Averages; k > 0 {
		b *= 1 + 1/k
	}
	return math.Min(b, hi-lo)
}

// Plus adds independent powers.
func (p Power) Plus(q Power) Power { return Power{p.P + q.P, math.Hypot(p.U, q.U)} }

// Weighting is the power gain of a check's weighting curve; nil for none.
func Weighting(name string) func(float64) float64 {
	g, ok := spectrum.Weighting(name)
	if !ok {
		panic("stage: weighting " + name) // the job parser knows the names
	}
	return g
}
