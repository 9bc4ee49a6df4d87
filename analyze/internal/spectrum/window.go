// Package spectrum holds the project's only Fourier transforms: windows,
// averaged periodograms, weighting curves and the integration of densities.
//
// Conventions: forward transform with exp(-j 2 pi k n/N), unnormalised;
// densities are one-sided, V^2/Hz, every bin doubled except 0 Hz and (even
// lengths) half the rate. Lengths are products of 2, 3 and 5 only.
package spectrum

import "math"

// Window is a periodic window with its two figures of merit.
type Window struct {
	W     []float64
	Sum   float64 // sum of weights: tones divide by it
	SumSq float64 // sum of squared weights: densities divide by it
	Lobe  float64 // half width of the main lobe in bins
	NENBW float64 // equivalent noise bandwidth in bins
}

func cosines(n int, lobe float64, a ...float64) Window {
	w := Window{W: make([]float64, n), Lobe: lobe}
	for i := range w.W {
		x := 2 * math.Pi * float64(i) / float64(n)
		v, sign := a[0], -1.0
		for k := 1; k < len(a); k++ {
			v += sign * a[k] * math.Cos(float64(k)*x)
			sign = -sign
		}
		w.W[i] = v
		w.Sum += v
		w.SumSq += v * v
	}
	w.NENBW = float64(n) * w.SumSq / (w.Sum * w.Sum)
	return w
}

// Hann is the periodic raised cosine: sidelobes -31 dB falling 18 dB an
// octave, NENBW 1.5.
func Hann(n int) Window { return cosines(n, 2, 0.5, 0.5) }

// BlackmanHarris is the periodic 4-term window of Harris 1978: sidelobes below
// -92 dB, NENBW 2.0044.
func BlackmanHarris(n int) Window {
	return cosines(n, 4, 0.35875, 0.48829, 0.14128, 0.01168)
}

// FastLength is the largest product of 2, 3 and 5 that is even and at most n
// (2 for smaller n).
func FastLength(n int) int {
	best := 2
	for a := 2; a <= n; a *= 2 {
		for b := a; b <= n; b *= 3 {
			for c := b; c <= n; c *= 5 {
				if c > best {
					best = c
				}
			}
		}
	}
	return best
}

// FastLengthUp is the smallest even product of 2, 3 and 5 that is at least n.
func FastLengthUp(n int) int {
	best := math.MaxInt
	for a := 2; a < 2*n || a == 2; a *= 2 {
		for b := a; ; b *= 3 {
			for c := b; ; c *= 5 {
				if c >= n {
					if c < best {
						best = c
					}
					break
				}
			}
			if b >= n {
				break
			}
		}
	}
	return best
}
