package spectrum

import (
	"math"
	"math/cmplx"
	"math/rand/v2"
	"testing"
)

// Whole against the defining sum at single frequencies, and there and back.
func TestWhole(t *testing.T) {
	for _, n := range []int{2, 30, 4096, 16200, 1 << 17, 196830} {
		r := rand.New(rand.NewPCG(1, uint64(n)))
		x := make([]float64, n)
		for i := range x {
			x[i] = r.NormFloat64()
		}
		w := NewWhole(n)
		X := w.Forward(x)
		for _, k := range []int{0, 1, n / 3, n / 2} {
			var sum complex128
			for i := range x {
				sum += cmplx.Rect(x[i], -2*math.Pi*float64(k*i%n)/float64(n))
			}
			if d := cmplx.Abs(X[k] - sum); d > 1e-9*math.Sqrt(float64(n)) {
				t.Errorf("n %d, line %d: off by %g", n, k, d)
			}
		}
		for i, v := range w.Back(X) {
			if math.Abs(v-x[i]) > 1e-12 {
				t.Fatalf("n %d: sample %d came back as %g, was %g", n, i, v, x[i])
			}
		}
	}
}
