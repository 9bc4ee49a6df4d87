package spectrum

import "gonum.org/v1/gonum/dsp/fourier"

// Whole transforms whole takes: one plan, one length.
type Whole struct {
	n    int
	plan *fourier.FFT
}

// NewWhole plans transforms of n samples (even, a product of 2, 3 and 5). It
// is for one goroutine.
func NewWhole(n int) *Whole { return &Whole{n, fourier.NewFFT(n)} }

// Forward is X[k] = sum_i x[i] exp(-j 2 pi k i/n), k = 0 .. n/2, of x padded
// with zeros or cut to n samples.
func (w *Whole) Forward(x []float64) []complex128 {
	if len(x) != w.n {
		full := make([]float64, w.n)
		copy(full, x)
		x = full
	}
	return w.plan.Coefficients(nil, x)
}

// Back is the inverse of Forward.
func (w *Whole) Back(X []complex128) []float64 {
	x := w.plan.Sequence(nil, X)
	for i := range x {
		x[i] /= float64(w.n)
	}
	return x
}
