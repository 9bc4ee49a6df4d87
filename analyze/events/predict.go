package events

import "math"

// order of the linear prediction: two coefficients a tone, and some for the
// colour of the noise.
const order = 24

// predictor says a sample from the order ones before it.
type predictor [order]float64

// train fits a predictor by least squares (covariance method, exact for
// tones) to segments of x. Segments in which something happens are left out: a
// second fit uses those whose largest error is within eight times the median
// RMS of all.
func train(x []float64) (p predictor, ok bool) {
	const size, most = 2048, 8
	n := min(most, len(x)/size)
	if n == 0 {
		if len(x) < 8*order {
			return p, false
		}
		return fit([][]float64{x})
	}
	var segments [][]float64
	for k := range n {
		// Middles of n equal parts.
		at := (2*k+1)*len(x)/(2*n) - size/2
		at = max(0, min(at, len(x)-size))
		segments = append(segments, x[at:at+size])
	}
	if p, ok = fit(segments); !ok {
		return p, false
	}
	var quiet [][]float64
	rms, peak := make([]float64, n), make([]float64, n)
	e := make([]float64, size)
	for k, s := range segments {
		p.errors(e, s)
		for _, v := range e[order:] {
			rms[k] += v * v
			peak[k] = math.Max(peak[k], math.Abs(v))
		}
		rms[k] = math.Sqrt(rms[k] / (size - order))
	}
	typical := median(rms)
	for k, s := range segments {
		if peak[k] < 8*typical {
			quiet = append(quiet, s)
		}
	}
	if len(quiet) == n || len(quiet) < 2 {
		return p, true
	}
	return fit(quiet)
}

// fit solves the normal equations over all segments; a ridge of 1e-13 of their
// trace stands for the noise that a clean computed tone lacks.
func fit(segments [][]float64) (p predictor, ok bool) {
	var a [order][order]float64
	var b [order]float64
	for _, s := range segments {
		for i := order; i < len(s); i++ {
			w := s[i-order : i]
			v := s[i]
			for j := range order {
				c := w[order-1-j]
				b[j] += c * v
				row := &a[j]
				for k := 0; k <= j; k++ {
					row[k] += c * w[order-1-k]
				}
			}
		}
	}
	trace := 0.0
	for j := range order {
		trace += a[j][j]
	}
	if !(trace > 0) {
		return p, false
	}
	for j := range order {
		a[j][j] += 1e-13 * trace
	}
	// Cholesky.
	for j := range order {
		for k := 0; k <= j; k++ {
			v := a[j][k]
			for i := range k {
				v -= a[j][i] * a[k][i]
			}
			if j > k {
				a[j][k] = v / a[k][k]
				continue
			}
			if v <= 0 {
				return p, false
			}
			a[j][j] = math.Sqrt(v)
		}
	}
	for j := range order {
		for i := range j {
			b[j] -= a[j][i] * b[i]
		}
		b[j] /= a[j][j]
	}
	for j := order - 1; j >= 0; j-- {
		for i := j + 1; i < order; i++ {
			b[j] -= a[i][j] * b[i]
		}
		b[j] /= a[j][j]
	}
	return b, true
}

// errors fills e with x less its prediction; the first order ones are 0.
func (p *predictor) errors(e, x []float64) {
	clear(e[:min(order, len(e))])
	var c [order]float64 // turned round: c[k] meets x[i-order+k]
	for k := range c {
		c[k] = p[order-1-k]
	}
	for i := order; i < len(x); i++ {
		w := x[i-order : i : i]
		var s0, s1, s2, s3 float64
		for k := 0; k < order; k += 4 {
			s0 += c[k] * w[k]
			s1 += c[k+1] * w[k+1]
			s2 += c[k+2] * w[k+2]
			s3 += c[k+3] * w[k+3]
		}
		e[i] = x[i] - (s0 + s1) - (s2 + s3)
	}
}
