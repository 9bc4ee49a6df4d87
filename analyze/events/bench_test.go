package events

import (
	"testing"

	"benchslip/analyze"
	"benchslip/analyze/internal/trial"
)

// Time a sample: reported as ns/sample.
func BenchmarkEvents(b *testing.B) {
	tk := newScene(48000, 70, scene{hz: 1042.7, amp: 0.2, noise: 1e-4, mains: 50, seed: 3}).take()
	p := trial.Pass(events, analyze.Params{}, map[string]*analyze.Take{"take": tk})
	s, _ := p.Signal("take", "out")
	x := s.All()
	take := trial.Take("t", &trial.Signal{Rate: 48000, X: x})
	for b.Loop() {
		trial.Run(events, analyze.Params{}, take)
	}
	b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(b.N)/float64(len(x)), "ns/sample")
}
