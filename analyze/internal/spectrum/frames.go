package spectrum

import "gonum.org/v1/gonum/dsp/fourier"

// Frames computes the one-sided power density (V^2/Hz, as in Welch) of every
// frame of x under a window of even length 2^a 3^b 5^c, hop samples apart, and
// hands it to emit with the index of the frame's first sample. The slice is
// used again for the next frame. Frames end within x. emit returns false to
// stop.
func Frames(x []float64, rate float64, w Window, hop int, emit func(at int, s []float64) bool) {
	m := len(w.W)
	plan := fourier.NewFFT(m)
	seg := make([]float64, m)
	coef := make([]complex128, m/2+1)
	s := make([]float64, m/2+1)
	scale := 2 / (rate * w.SumSq)
	for at := 0; at+m <= len(x); at += hop {
		for i, v := range w.W {
			seg[i] = v * x[at+i]
		}
		plan.Coefficients(coef, seg)
		for k, c := range coef {
			s[k] = (real(c)*real(c) + imag(c)*imag(c)) * scale
		}
		s[0] /= 2
		s[m/2] /= 2
		if !emit(at, s) {
			return
		}
	}
}
