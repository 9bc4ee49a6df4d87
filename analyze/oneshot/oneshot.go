// Package oneshot holds the measures of a single event on a scope's screen:
// the edge of a step (rise and fall time, slew rate, overshoot, settling,
// droop), the thump of switching, the ripple of a rail, and an oscillation
// that comes and goes.
//
// Edges follow IEEE Std 181: the two levels of a step are the modes of the
// histogram, and reference instants are crossings of levels between them.
// Where an edge holds many samples, a crossing is taken from a short
// polynomial through its neighbours, so that neither noise nor the steps of an
// 8-bit converter choose it; where it holds few, from the straight line
// between two samples.
package oneshot

import (
	"fmt"

	"benchslip/analyze"
	"benchslip/capture/unit"
)

var (
	volt    = unit.MustLookup("V")
	fs      = unit.MustLookup("FS")
	slope   = unit.MustLookup("V/s")
	fsSlope = unit.MustLookup("FS/s")
	second  = unit.MustLookup("s")
	percent = unit.MustLookup("%")
)

// Measures lists the measures of this package.
func Measures() []*analyze.Measure {
	return []*analyze.Measure{riseTime, fallTime, settlingTime, overshoot, droop, slewRate, ripple, thump, oscillation}
}

// mostSamples is what a measure of this package reads at once (8 bytes each).
const mostSamples = 1 << 25

// samples reads the whole of a role's `out`.
func samples(p *analyze.Pass) (*analyze.Signal, []float64, *analyze.Refusal) {
	s, bad := p.Signal("take", "out")
	if bad != nil {
		return nil, nil, bad
	}
	if s.Len() > mostSamples {
		return s, nil, &analyze.Refusal{Code: analyze.Unsupported,
			Text:   fmt.Sprintf("take %q holds %d samples in the span; a single event is looked for in up to %d", s.Take.Name, s.Len(), mostSamples),
			Advice: "set a span about the event"}
	}
	x := p.Stages.Once("oneshot/samples/"+s.ID(), func() any { return s.All() }).([]float64)
	if err := s.Err(); err != nil || len(x) < s.Len() {
		return s, nil, &analyze.Refusal{Code: analyze.Unreadable, Text: fmt.Sprintf("take %q: %v", s.Take.Name, err), Advice: "copy the file again"}
	}
	return s, x, nil
}

// plainUnit is V, or FS for takes without volts at full scale.
func plainUnit(s *analyze.Signal) unit.Unit {
	if s != nil && s.Unit == "FS" {
		return fs
	}
	return volt
}

func spanOf(s *analyze.Signal) []float64 { return []float64{s.StartS, s.StartS + s.DurationS()} }

// timeOf is the time of a (fractional) sample index.
func timeOf(s *analyze.Signal, i float64) float64 { return s.StartS + i/s.RateHz }
