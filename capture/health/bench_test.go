package health

import (
	"testing"
)

// BenchmarkScan reports the cost a sample; reading is a copy in memory.
func BenchmarkScan(b *testing.B) {
	x := live(0.5, 997, 1)
	for _, c := range []struct {
		name string
		rec  *fake
	}{
		{"24-bit", audio(fs, 24, times(20, x))},
		{"16-bit stereo", audio(fs, 16, times(20, x), times(20, live(0.2, 443, 2)))},
		{"16-bit quiet", audio(fs, 16, times(20, noise(fs, 3e-5, 3)))},
		{"float silence", audio(fs, 0, constant(20*fs, 0))},
		{"coherent tone", audio(fs, 16, sample(fs, 20, sine(0.5, 1000, 0)))},
		{"8-bit scope", scope(1e6, 0.04, noise(20*fs, 1, 4))},
	} {
		b.Run(c.name, func(b *testing.B) {
			samples := float64(c.rec.info.Frames) * float64(len(c.rec.x))
			for b.Loop() {
				if _, err := Scan(c.rec); err != nil {
					b.Fatal(err)
				}
			}
			b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(b.N)/samples, "ns/sample")
		})
	}
}
