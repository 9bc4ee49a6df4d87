package transfer

import (
	"math"
)

// leastSquares solves a weighted fit of six columns by Householder's QR; var
// is the diagonal of the covariance, scaled by the scatter.
func leastSquares(rows [][6]float64, rhs, w []float64) (x, variance [6]float64, ok bool) {
	const n = 6
	m := len(rows)
	a := make([][n + 1]float64, m)
	var scale [n]float64
	for i := range a {
		s := math.Sqrt(w[i])
		for j := 0; j < n; j++ {
			a[i][j] = rows[i][j] * s
			scale[j] += a[i][j] * a[i][j]
		}
		a[i][n] = rhs[i] * s
	}
	for j := range scale {
		scale[j] = math.Sqrt(scale[j])
		if scale[j] == 0 {
			return x, variance, false
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
		if math.Abs(norm) < 1e-12 {
			return x, variance, false
		}
		v := make([]float64, m-j)
		for i := range v {
			v[i] = a[i+j][j]
		}
		v[0] -= norm
		vv := 0.0
		for _, e := range v {
			vv += e * e
		}
		for k := j; k <= n; k++ {
			dot := 0.0
			for i, e := range v {
				dot += e * a[i+j][k]
			}
			dot *= 2 / vv
			for i, e := range v {
				a[i+j][k] -= dot * e
			}
		}
	}
	ssr := 0.0
	for i := n; i < m; i++ {
		ssr += a[i][n] * a[i][n]
	}
	var inv [n][n]float64
	for c := 0; c < n; c++ {
		for i := n - 1; i >= 0; i-- {
			v := 0.0
			if i == c {
				v = 1
			}
			for k := i + 1; k < n; k++ {
				v -= a[i][k] * inv[k][c]
			}
			inv[i][c] = v / a[i][i]
		}
	}
	sigma2 := ssr / float64(max(m-n, 1))
	for i := 0; i < n; i++ {
		for k := 0; k < n; k++ {
			x[i] += inv[i][k] * a[k][n]
			variance[i] += inv[i][k] * inv[i][k]
		}
		x[i] /= scale[i]
		variance[i] *= sigma2 / (scale[i] * scale[i])
	}
	return x, variance, true
}
