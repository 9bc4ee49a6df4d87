package response

import "math"

// mostTerms of a polynomial.
const mostTerms = 5

// poly is a polynomial of few terms fitted by weighted least squares.
type poly struct {
	c   []float64   // coefficients, constant first
	inv [][]float64 // rows of R^-1 of the QR factorisation: covariance is inv inv'
	chi float64     // chi-square over its degrees of freedom
}

// polynomial fits z = c_0 + c_1 v + ... (n terms) with weights 1/variance, by
// Householder's QR on scaled columns. ok is false when the points do not tell
// all terms.
func polynomial(v, z, w []float64, n int) (poly, bool) {
	m := len(v)
	if n > mostTerms || m <= n {
		return poly{}, false
	}
	a := make([][]float64, m) // columns and the right side
	scale := make([]float64, n)
	for i := range a {
		a[i] = make([]float64, n+1)
		s := math.Sqrt(w[i])
		x := s
		for j := 0; j < n; j++ {
			a[i][j] = x
			scale[j] += x * x
			x *= v[i]
		}
		a[i][n] = z[i] * s
	}
	for j := range scale {
		scale[j] = math.Sqrt(scale[j])
		if !(scale[j] > 0) {
			return poly{}, false
		}
		for i := range a {
			a[i][j] /= scale[j]
		}
	}
	for j := 0; j < n; j++ {
		norm := 0.0
		for i := j; i < m; i++ {
			norm += a[i][j] * a[i][j]
		}
		norm = math.Copysign(math.Sqrt(norm), -a[j][j])
		if !(math.Abs(norm) > 1e-9) {
			return poly{}, false
		}
		h := make([]float64, m-j)
		for i := range h {
			h[i] = a[i+j][j]
		}
		h[0] -= norm
		hh := 0.0
		for _, e := range h {
			hh += e * e
		}
		for k := j; k <= n; k++ {
			dot := 0.0
			for i, e := range h {
				dot += e * a[i+j][k]
			}
			dot *= 2 / hh
			for i, e := range h {
				a[i+j][k] -= dot * e
			}
		}
	}
	p := poly{c: make([]float64, n), inv: make([][]float64, n)}
	for i := range p.inv {
		p.inv[i] = make([]float64, n)
	}
	for col := 0; col < n; col++ {
		for i := n - 1; i >= 0; i-- {
			x := 0.0
			if i == col {
				x = 1
			}
			for k := i + 1; k < n; k++ {
				x -= a[i][k] * p.inv[k][col] * scale[k]
			}
			p.inv[i][col] = x / a[i][i] / scale[i]
		}
	}
	for i := range p.c {
		for k := range p.c {
			p.c[i] += p.inv[i][k] * a[k][n]
		}
	}
	for i := n; i < m; i++ {
		p.chi += a[i][n] * a[i][n] / float64(m-n)
	}
	return p, true
}

func (p *poly) value(v float64) float64 {
	s := 0.0
	for i := len(p.c) - 1; i >= 0; i-- {
		s = s*v + p.c[i]
	}
	return s
}

func (p *poly) slope(v float64) float64 {
	s := 0.0
	for i := len(p.c) - 1; i >= 1; i-- {
		s = s*v + float64(i)*p.c[i]
	}
	return s
}

// spread is the standard uncertainty of the value at v.
func (p *poly) spread(v float64) float64 {
	sum := 0.0
	for k := range p.c {
		s, x := 0.0, 1.0
		for i := range p.c {
			s += x * p.inv[i][k]
			x *= v
		}
		sum += s * s
	}
	return math.Sqrt(sum)
}

// rises finds where the polynomial rises through goal between lo and hi,
// looked for on a grid of a fiftieth of an octave and halved.
func (p *poly) rises(goal, lo, hi float64) (float64, bool) {
	const step = 1.014
	for a := lo; a < hi; a *= step {
		b := a * step
		if p.value(a) > goal || p.value(b) <= goal {
			continue
		}
		for range 60 {
			m := (a + b) / 2
			if p.value(m) <= goal {
				a = m
			} else {
				b = m
			}
		}
		return b, p.slope(b) > 0
	}
	return 0, false
}
