package oneshot

import "math"

// poly is a least-squares polynomial through equally spaced samples 0 .. n-1,
// as a sum of Legendre polynomials of u = 2 i/(n-1) - 1, which keeps the
// equations well conditioned.
type poly struct {
	c   []float64
	n   int
	inv [][]float64 // inverse of the normal matrix: covariance for unit noise
	rms float64     // of what is left, degrees of freedom counted
}

// fitPoly fits a polynomial of a degree below len(y).
func fitPoly(y []float64, degree int) poly {
	m := min(degree, len(y)-1) + 1
	p := poly{n: len(y), c: make([]float64, m)}
	a := make([][]float64, m) // normal matrix with the unit matrix beside it
	for j := range a {
		a[j] = make([]float64, 2*m+1)
		a[j][m+1+j] = 1
	}
	phi := make([]float64, m)
	for i, v := range y {
		p.basis(phi, float64(i))
		for j, f := range phi {
			for k := 0; k <= j; k++ {
				a[j][k] += f * phi[k]
			}
			a[j][m] += f * v
		}
	}
	for j := range a {
		for k := j + 1; k < m; k++ {
			a[j][k] = a[k][j]
		}
	}
	for j := range a { // Gauss and Jordan; the matrix is positive definite
		d := a[j][j]
		for k := range a[j] {
			a[j][k] /= d
		}
		for i := range a {
			if f := a[i][j]; i != j && f != 0 {
				for k := range a[i] {
					a[i][k] -= f * a[j][k]
				}
			}
		}
	}
	p.inv = make([][]float64, m)
	for j := range a {
		p.c[j] = a[j][m]
		p.inv[j] = a[j][m+1:]
	}
	if len(y) > m {
		for i, v := range y {
			d := v - p.at(float64(i))
			p.rms += d * d
		}
		p.rms = math.Sqrt(p.rms / float64(len(y)-m))
	}
	return p
}

func (p poly) basis(dst []float64, i float64) {
	u := 0.0
	if p.n > 1 {
		u = 2*i/float64(p.n-1) - 1
	}
	dst[0] = 1
	if len(dst) > 1 {
		dst[1] = u
	}
	for k := 2; k < len(dst); k++ {
		dst[k] = (float64(2*k-1)*u*dst[k-1] - float64(k-1)*dst[k-2]) / float64(k)
	}
}

// at is the value at sample index i.
func (p poly) at(i float64) float64 {
	var phi [maxDegree + 1]float64
	p.basis(phi[:len(p.c)], i)
	v := 0.0
	for j, c := range p.c {
		v += c * phi[j]
	}
	return v
}

// maxDegree of a polynomial.
const maxDegree = 8

// spread is the standard deviation of at(i) for noise of 1 a sample.
func (p poly) spread(i float64) float64 {
	var phi [maxDegree + 1]float64
	p.basis(phi[:len(p.c)], i)
	v := 0.0
	for j := range p.c {
		for k := range p.c {
			v += phi[j] * p.inv[j][k] * phi[k]
		}
	}
	return math.Sqrt(math.Max(v, 0))
}

// contrast is the standard deviation of w at(i) - at(k) for noise of 1 a sample.
func (p poly) contrast(w, i, k float64) float64 {
	var a, b [maxDegree + 1]float64
	p.basis(a[:len(p.c)], i)
	p.basis(b[:len(p.c)], k)
	v := 0.0
	for j := range p.c {
		for l := range p.c {
			v += (w*a[j] - b[j]) * p.inv[j][l] * (w*a[l] - b[l])
		}
	}
	return math.Sqrt(math.Max(v, 0))
}

// solve finds i in [0, n-1] where the polynomial takes the value v, the root
// nearest to start; ok is false when there is none.
func (p poly) solve(v, start float64) (i float64, ok bool) {
	const cuts = 64
	best := math.Inf(1)
	last := float64(p.n - 1)
	a, fa := 0.0, p.at(0)-v
	for k := 1; k <= cuts; k++ {
		b := last * float64(k) / cuts
		fb := p.at(b) - v
		if fa == 0 || (fa < 0) != (fb < 0) {
			lo, hi, flo := a, b, fa
			for range 50 {
				mid := (lo + hi) / 2
				if f := p.at(mid) - v; (f < 0) == (flo < 0) {
					lo = mid
				} else {
					hi = mid
				}
			}
			if r := (lo + hi) / 2; math.Abs(r-start) < math.Abs(best-start) {
				best = r
			}
		}
		a, fa = b, fb
	}
	return best, !math.IsInf(best, 1)
}

// slopeAt is the derivative at i, per sample.
func (p poly) slopeAt(i float64) float64 { return (p.at(i+0.5) - p.at(i-0.5)) }
