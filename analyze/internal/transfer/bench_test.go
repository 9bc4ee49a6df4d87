package transfer

import (
	"testing"

	"benchslip/analyze/internal/trial"
)

// processor time, since other work may share the machine
func benchmark(b *testing.B, text string) {
	in := trial.Played(text)
	out := in.Through(highpass(10)).Noise(1e-4, 1)
	in.Noise(1e-4, 2)
	b.ResetTimer()
	t0 := cpu()
	for i := 0; i < b.N; i++ {
		curveOf(b, out, in)
	}
	b.ReportMetric(float64((cpu()-t0).Milliseconds())/float64(b.N), "cpu-ms/op")
}

// A 20 s sweep at 192 kHz: under 1.5 s is wanted.
func BenchmarkSweep192(b *testing.B) { benchmark(b, "sweep length=20s rate=192kHz") }

// 31 steps: under 0.5 s is wanted.
func BenchmarkSteps48(b *testing.B)  { benchmark(b, "stepped-tones rate=48kHz") }
func BenchmarkSteps192(b *testing.B) { benchmark(b, "stepped-tones rate=192kHz to=80kHz") }
func BenchmarkMulti(b *testing.B)    { benchmark(b, "multitone rate=48kHz") }
