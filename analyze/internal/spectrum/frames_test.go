package spectrum

import (
	"math"
	"math/rand/v2"
	"testing"
)

// The mean over frames is Welch's estimate.
func TestFramesAgreeWithWelch(t *testing.T) {
	r := rand.New(rand.NewPCG(1, 2))
	x := make([]float64, 5000)
	for i := range x {
		x[i] = r.NormFloat64()
	}
	w := BlackmanHarris(360)
	want := Welch(func(dst []float64, at int) int { return copy(dst, x[at:]) }, len(x), 48000, w, 360, 90)
	got := make([]float64, 181)
	n := 0
	Frames(x, 48000, w, 90, func(at int, s []float64) bool {
		if at != 90*n {
			t.Fatalf("frame %d at %d", n, at)
		}
		n++
		for k, v := range s {
			got[k] += v
		}
		return true
	})
	if n != want.Segments {
		t.Fatalf("%d frames, Welch has %d", n, want.Segments)
	}
	for k, v := range got {
		if math.Abs(v/float64(n)/want.S[k]-1) > 1e-12 {
			t.Fatalf("bin %d: %g, Welch %g", k, v/float64(n), want.S[k])
		}
	}
	count := 0
	Frames(x, 48000, w, 90, func(int, []float64) bool { count++; return count < 3 })
	if count != 3 {
		t.Errorf("stopped after %d frames, want 3", count)
	}
}
