// Package sinefit fits sums of sinusoids to blocks of samples by least
// squares (IEEE Std 1057: three parameters with the frequency known, four with
// it free), any number of lines jointly, and follows a slowly drifting
// frequency from block to block.
//
// Time runs in samples from the middle of a block: t = i - (n-1)/2. With that
// choice cosine and sine columns are orthogonal for any set of frequencies,
// amplitude and phase at the middle do not depend on small errors of the
// frequency, and the normal equations fall into two small halves whose
// elements are Dirichlet kernels in closed form.
//
// Frequencies are in cycles per sample (nu = f/rate), phases in turns where
// said so, else in rad. A line is Re(z exp(j 2 pi nu t)): z is its peak phasor
// at the middle.
package sinefit

import "math"

// chunk is the number of samples that share one table of phasors; a table
// costs one sine and cosine an entry, a chunk start one.
const chunk = 64

// Turns is the fractional part of nu*m in [-1/2, 1/2], exact to the rounding
// of nu: the product's rounding error is recovered by a fused multiply-add, so
// that a sine of 20 000 periods keeps its phase to 1e-11 rad.
func Turns(nu, m float64) float64 {
	p := nu * m
	e := math.FMA(nu, m, -p)
	return p - math.Round(p) + e
}

// Phasor is exp(j 2 pi turns).
func Phasor(turns float64) complex128 {
	s, c := math.Sincos(2 * math.Pi * turns)
	return complex(c, s)
}

// table of exp(j 2 pi nu i), i = 0 .. chunk-1.
type table struct{ re, im [chunk]float64 }

func (t *table) fill(nu float64) {
	for i := range t.re {
		t.im[i], t.re[i] = math.Sincos(2 * math.Pi * Turns(nu, float64(i)))
	}
}

// Sums fills S[k] = sum_i y[i] exp(-j 2 pi nu[k] t_i) and, when T is not nil,
// T[k] = sum_i t_i y[i] exp(-j 2 pi nu[k] t_i).
func Sums(y []float64, nu []float64, S, T []complex128) {
	mid := float64(len(y)-1) / 2
	var tab table
	var ramp [chunk]float64
	for k, v := range nu {
		tab.fill(v)
		var s, t complex128
		for at := 0; at < len(y); at += chunk {
			part := y[at:min(at+chunk, len(y))]
			start := float64(at) - mid
			rot := Phasor(-Turns(v, start))
			re, im := dot(part, &tab)
			c := rot * complex(re, -im)
			s += c
			if T != nil {
				for i, x := range part {
					ramp[i] = float64(i) * x
				}
				re, im = dot(ramp[:len(part)], &tab)
				t += complex(start, 0)*c + rot*complex(re, -im)
			}
		}
		S[k] = s
		if T != nil {
			T[k] = t
		}
	}
}

// dot is the pair of inner products of y with the table, four running sums
// each so that additions need not wait for each other.
func dot(y []float64, t *table) (re, im float64) {
	var r0, r1, r2, r3, i0, i1, i2, i3 float64
	n := len(y) &^ 3
	for i := 0; i < n; i += 4 {
		q := y[i : i+4 : i+4]
		a, b := t.re[i:i+4:i+4], t.im[i:i+4:i+4]
		r0 += q[0] * a[0]
		r1 += q[1] * a[1]
		r2 += q[2] * a[2]
		r3 += q[3] * a[3]
		i0 += q[0] * b[0]
		i1 += q[1] * b[1]
		i2 += q[2] * b[2]
		i3 += q[3] * b[3]
	}
	for i := n; i < len(y); i++ {
		r0 += y[i] * t.re[i]
		i0 += y[i] * t.im[i]
	}
	return (r0 + r1) + (r2 + r3), (i0 + i1) + (i2 + i3)
}

// Subtract takes dc and the lines (phasors z at the block's middle) off y.
func Subtract(y []float64, dc float64, nu []float64, z []complex128) {
	mid := float64(len(y)-1) / 2
	for i := range y {
		y[i] -= dc
	}
	var tab table
	for k, v := range nu {
		if z[k] == 0 {
			continue
		}
		tab.fill(v)
		for at := 0; at < len(y); at += chunk {
			part := y[at:min(at+chunk, len(y))]
			w := z[k] * Phasor(Turns(v, float64(at)-mid))
			wr, wi := real(w), imag(w)
			for i := range part {
				part[i] -= wr*tab.re[i] - wi*tab.im[i]
			}
		}
	}
}

// Oscillator takes one line of nearly constant frequency off successive
// stretches of samples; its table is made once for a frequency.
type Oscillator struct {
	nu  float64
	set bool
	tab table
}

// Piece is the longest stretch that Subtract of an Oscillator takes.
const Piece = chunk

// Subtract takes Re(z exp(j 2 pi nu i)), i = 0 .. len(y)-1, off y, at most
// Piece samples.
func (o *Oscillator) Subtract(y []float64, nu float64, z complex128) {
	if !o.set || o.nu != nu {
		o.tab.fill(nu)
		o.nu, o.set = nu, true
	}
	wr, wi := real(z), imag(z)
	re, im := o.tab.re[:len(y)], o.tab.im[:len(y)]
	for i := range y {
		y[i] -= wr*re[i] - wi*im[i]
	}
}
