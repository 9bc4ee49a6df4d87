package spectrum

import (
	"math"
	"math/rand/v2"
	"testing"
)

// Used against its definition, sum by sum: (sum W)^2 / (n sum W^2).
func TestUsed(t *testing.T) {
	for _, c := range []struct{ n, m, hop int }{{80, 80, 20}, {100, 64, 16}, {1000, 64, 16}, {1000, 64, 32}, {777, 100, 25}} {
		w := BlackmanHarris(c.m)
		sum := make([]float64, c.n)
		segments := 0
		for at := 0; at+c.m <= c.n; at += c.hop {
			segments++
			for i, v := range w.W {
				sum[at+i] += v * v
			}
		}
		var one, two float64
		for _, v := range sum {
			one += v
			two += v * v
		}
		want := one * one / (float64(c.n) * two)
		if got := used(w, c.hop, segments, c.n); math.Abs(got-want) > 1e-3*want {
			t.Errorf("%+v: %.6f, want %.6f", c, got, want)
		}
	}
}

// The power of white Gaussian noise, read from an averaged periodogram over
// the whole band B, scatters by 1/sqrt(B T Used) (Bendat and Piersol, with the
// samples that count in place of all).
func TestUsedScatter(t *testing.T) {
	const n, m, runs = 4096, 512, 400
	r := rand.New(rand.NewPCG(1, 2))
	x := make([]float64, n)
	src := func(dst []float64, at int) int { return copy(dst, x[min(at, n):]) }
	var mean, square, share float64
	for range runs {
		for i := range x {
			x[i] = r.NormFloat64()
		}
		d := Welch(src, n, 2, BlackmanHarris(m), m, m/4)
		p := d.Integrate(0.05, 0.95, nil)
		mean += p / runs
		square += p * p / runs
		share = d.Used
	}
	got := math.Sqrt(square-mean*mean) / mean
	want := 1 / math.Sqrt(0.9*n/2*share)
	if math.Abs(got/want-1) > 4/math.Sqrt(2*runs) {
		t.Errorf("scatter %.5f, want %.5f (used %.3f)", got, want, share)
	}
	if math.Abs(mean-0.9) > 5*want/math.Sqrt(runs) {
		t.Errorf("mean %.5f, want 0.9", mean)
	}
}
