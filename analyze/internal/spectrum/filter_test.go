package spectrum

import (
	"math"
	"math/cmplx"
	"testing"
)

// A sine through a one-pole low-pass of 3 kHz comes out with the pole's
// closed-form gain and phase, at the right time, at every output rate and
// across the seams between blocks; odd read lengths change nothing.
func TestFilter(t *testing.T) {
	pole := func(hz float64) complex128 { return 1 / complex(1, hz/3000) }
	const rate, n = 44100.0, 30011
	for _, up := range []int{1, 2, 4, 5} {
		for _, hz := range []float64{100.7, 5001.3, 19000.9} {
			src := func(dst []float64, at int) int {
				dst = dst[:min(len(dst), 777)]
				for i := range dst {
					dst[i] = math.Cos(2*math.Pi*hz*float64(at+i)/rate + 0.3)
				}
				return len(dst)
			}
			var y []float64
			NewFilter(pole, rate, up).Run(src, n, func(part []float64) { y = append(y, part...) })
			if len(y) != n*up {
				t.Fatalf("x %d: %d samples of %d", up, len(y), n*up)
			}
			h := pole(hz)
			worst := 0.0
			for i := 3000 * up; i < len(y)-3000*up; i++ {
				want := cmplx.Abs(h) * math.Cos(2*math.Pi*hz*float64(i)/rate/float64(up)+0.3+cmplx.Phase(h))
				worst = math.Max(worst, math.Abs(y[i]-want))
			}
			if worst > 3e-4 {
				t.Errorf("x %d, %g Hz: %.2g off", up, hz, worst)
			}
		}
	}
}
