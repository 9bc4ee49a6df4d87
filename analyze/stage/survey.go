// Package stage holds what several measures share, computed once a signal:
// a survey of its lines, the tracks they follow, and its decomposition into
// DC, test tone with harmonics, mains comb, other lines and noise.
package stage

import (
	"math"

	"benchslip/analyze"
	"benchslip/analyze/internal/spectrum"
)

// Survey is a first look at a signal: an averaged periodogram with a
// low-leakage window (Blackman-Harris, sidelobes -92 dB), segments of 2 s or
// the whole of a shorter signal (64 spread over a long one), and the peaks that stand out of it.
type Survey struct {
	*spectrum.Density
	Floor []float64 // density without lines
	Peaks []spectrum.Peak
}

// SurveyOf computes the survey of a signal once.
func SurveyOf(p *analyze.Pass, s *analyze.Signal) *Survey {
	return p.Stages.Once("survey/"+s.ID(), func() any { return survey(s) }).(*Survey)
}

func survey(s *analyze.Signal) *Survey {
	n := s.Len()
	m := int(2 * s.RateHz)
	if m > n {
		m = n
	}
	m = spectrum.FastLength(m)
	length := m
	if n < 3*m {
		length = spectrum.FastLengthUp(2 * m)
	}
	hop := max(m, n/64) // long signals: 64 looks
	if n < 8*m {
		hop = m / 2
	}
	v := &Survey{Density: spectrum.Welch(without(s, meanOf(s)), n, s.RateHz, spectrum.BlackmanHarris(m), length, max(hop, 1))}
	// The floor is a median over 25 Hz to both sides, at least three lobes.
	half := max(int(25/v.StepHz), int(3*v.Lobe))
	v.Floor = v.Density.Floor(half)
	k := math.Max(v.Averages, 1)
	// The largest of 10^6 noise bins stays below this, to 1 in 1000.
	v.Peaks = v.Density.Peaks(v.Floor, 1+7/math.Sqrt(k)+21/k)
	return v
}

// meanOf is the mean of a signal.
func meanOf(s *analyze.Signal) float64 {
	sum := 0.0
	buf := make([]float64, min(s.Len(), 1<<15))
	for at := 0; ; {
		n := s.Read(buf, at)
		if n == 0 {
			return sum / float64(max(at, 1))
		}
		part := 0.0
		for _, v := range buf[:n] {
			part += v
		}
		sum += part
		at += n
	}
}

func without(s *analyze.Signal, dc float64) spectrum.Source {
	return func(dst []float64, at int) int {
		n := s.Read(dst, at)
		for i := range dst[:n] {
			dst[i] -= dc
		}
		return n
	}
}

// StrongestIn is the strongest peak between lo and hi Hz that keep allows.
func (v *Survey) StrongestIn(lo, hi float64, keep func(spectrum.Peak) bool) (spectrum.Peak, bool) {
	for _, p := range v.Peaks {
		if p.Hz >= lo && p.Hz <= hi && (keep == nil || keep(p)) {
			return p, true
		}
	}
	return spectrum.Peak{}, false
}

// ToleranceHz is how far a peak's reading may lie from its line.
func (v *Survey) ToleranceHz() float64 { return v.Lobe * v.StepHz / 4 }
