package sinefit

import (
	"math"
	"testing"
)

// IEEE Std 1057 four-parameter fit against an independent non-linear least
// squares run (scipy): y = floor(100(0.5 + 2 cos wn + sin wn + 0.02 cos 3wn)
// + 0.5)/100, w = 2 pi 123.4/10000, n = 0..999.
func TestRefineWorkedExample(t *testing.T) {
	y := make([]float64, 1000)
	for n := range y {
		w := 2 * math.Pi * 123.4 / 10000 * float64(n)
		y[n] = math.Floor(100*(0.5+2*math.Cos(w)+math.Sin(w)+0.02*math.Cos(3*w))+0.5) / 100
	}
	r, err := Refine(y, []Comb{{123.0 / 10000, []float64{1}, true}}, 1.0/1000)
	if err != nil || !r.Settled[0] {
		t.Fatal(err, r.Settled)
	}
	near := func(what string, got, want, tol float64) {
		if math.Abs(got-want) > tol {
			t.Errorf("%s: got %.12g, want %.12g", what, got, want)
		}
	}
	near("frequency", r.Nu[0]*10000, 123.399548814, 2e-9)
	near("DC", r.DC, 0.499903183, 1e-9)
	amp := math.Hypot(real(r.Z[0]), imag(r.Z[0]))
	near("amplitude", amp, 2.236135420, 1e-9)
	near("residual rms", math.Sqrt(r.SSR/1000), 0.014451671, 1e-9)
	// phasor at n = 0: A = 2.000269677, B = 0.999611341
	z0 := r.Z[0] * Phasor(Turns(r.Nu[0], -999.0/2))
	near("A", real(z0), 2.000269677, 2e-9)
	near("B", -imag(z0), 0.999611341, 2e-9)
	t.Log(r.Steps)
}

func TestSolverExact(t *testing.T) {
	nu := []float64{0.01234, 0.0133, 0.2, 0.4999}
	z := []complex128{1 + 2i, 0.01 - 0.3i, 1e-6i, 0.2}
	for _, n := range []int{2000, 2001, 6000} {
		y := make([]float64, n)
		Subtract(y, -0.7, nu, []complex128{-z[0], -z[1], -z[2], -z[3]})
		s, err := NewSolver(nu, n)
		if err != nil {
			t.Fatal(err)
		}
		f := s.Block(y)
		if math.Abs(f.DC-0.7) > 1e-13 {
			t.Error("dc", f.DC)
		}
		for k := range z {
			if d := f.Z[k] - z[k]; math.Hypot(real(d), imag(d)) > 1e-12 {
				t.Errorf("n %d line %d: off by %g", n, k, d)
			}
		}
	}
}

func BenchmarkSums(b *testing.B) {
	y := make([]float64, 96000)
	for i := range y {
		y[i] = math.Sin(float64(i))
	}
	nu := []float64{0.01, 0.02, 0.03, 0.04}
	S := make([]complex128, 4)
	for i := 0; i < b.N; i++ {
		Sums(y, nu, S, nil)
	}
	b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(b.N)/96000/4, "ns/sample/line")
}
