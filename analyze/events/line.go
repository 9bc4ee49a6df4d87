package events

import (
	"math"
	"math/cmplx"

	"benchslip/analyze/internal/sinefit"
)

// liner fits DC and one line of known frequency to pieces of hop samples by
// least squares (three parameters, IEEE Std 1057), so that neither the mean nor
// the line's image at the negative frequency leaks into a short piece.
type liner struct {
	nu       float64 // periods a sample
	hop      int
	cos, sin []float64 // from the middle of the piece
	cc, ss   float64   // sums of cos^2, sin^2
	c        float64   // sum of cos
}

func newLiner(nu float64, hop int) *liner {
	l := &liner{nu: nu, hop: hop, cos: make([]float64, hop), sin: make([]float64, hop)}
	for i := range hop {
		w := sinefit.Phasor(sinefit.Turns(nu, float64(i)-float64(hop-1)/2))
		l.cos[i], l.sin[i] = real(w), imag(w)
		l.c += real(w)
		l.cc += real(w) * real(w)
		l.ss += imag(w) * imag(w)
	}
	return l
}

// start is the line's own phasor at the middle of piece k.
func (l *liner) start(k int) complex128 {
	return sinefit.Phasor(sinefit.Turns(l.nu, float64(k*l.hop)+float64(l.hop-1)/2))
}

// read is the peak phasor in piece k of x, turned back by the frequency.
func (l *liner) read(x []float64, k int) complex128 {
	part := x[k*l.hop : (k+1)*l.hop]
	cos, sin := l.cos[:len(part)], l.sin[:len(part)]
	var sum, re, im float64
	for i, v := range part {
		sum += v
		re += v * cos[i]
		im += v * sin[i]
	}
	n := float64(l.hop)
	a := (re - sum*l.c/n) / (l.cc - l.c*l.c/n)
	b := im / l.ss
	return complex(a, -b) * cmplx.Conj(l.start(k))
}

// line is the phasor of a frequency over time, pieces weighted 1 2 1.
func (l *liner) line(x []float64) []complex128 {
	n := len(x) / l.hop
	raw := make([]complex128, n)
	for k := range raw {
		raw[k] = l.read(x, k)
	}
	z := make([]complex128, n)
	for k := range z {
		z[k] = (raw[max(k-1, 0)] + 2*raw[k] + raw[min(k+1, n-1)]) / 4
	}
	return z
}

// less is x without the line of which z are the phasors.
func (l *liner) less(x []float64, z []complex128) []float64 {
	y := append([]float64(nil), x...)
	for k, w := range z {
		w *= l.start(k)
		part := y[k*l.hop : (k+1)*l.hop]
		cos, sin := l.cos[:len(part)], l.sin[:len(part)]
		re, im := real(w), imag(w)
		for i := range part {
			part[i] -= re*cos[i] - im*sin[i]
		}
	}
	return y
}

// decimate is the mean of every n samples.
func decimate(x []float64, n int) []float64 {
	y := make([]float64, len(x)/n)
	for k := range y {
		sum := 0.0
		for _, v := range x[k*n : (k+1)*n] {
			sum += v
		}
		y[k] = sum / float64(n)
	}
	return y
}

// meanSquareOf a line of a peak phasor.
func meanSquareOf(z complex128) float64 {
	return (real(z)*real(z) + imag(z)*imag(z)) / 2
}

// usual is a number that stands for the size of a set of phasors.
func usual(z []complex128) float64 {
	a := make([]float64, 0, len(z))
	for _, v := range z {
		a = append(a, cmplx.Abs(v))
	}
	return math.Max(median(a), 1e-300)
}
