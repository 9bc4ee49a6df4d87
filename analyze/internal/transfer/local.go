package transfer

import (
	"math"
	"math/cmplx"
	"sort"
)

// The local polynomial method (Pintelon, Schoukens, Vandersteen and Barbe,
// Mech. Syst. Signal Process. 24 (2010) 573): about a frequency f0, over 2B
// neighbouring lines of the spectra X of the input and Y of the output,
//
//	Y(f) = sum_p h_p r^p X(f) + sum_n d_n e^{j 2 pi f T_n} X(f) + sum_q t_q r^q + noise,
//	r = (f - f0)/B
//
// is solved by least squares. h_0 is H(f0). The second sum takes up what an
// exponential sweep leaves of the unit's distortion: the response of order n
// is the sweep's own spectrum, T_n = L ln n earlier (Farina, AES 108th
// Convention 2000, preprint 5093; Novak, Lotton and Simon, JAES 63 (2015)
// 786). The third, for steady signals only, takes up what was there before
// the record began and what is cut off at its end. Lines count by a window
// (tricube), which keeps the responses of other orders from leaking through
// wide stretches.
type regression struct {
	X, Y    [][]complex128 // spectra, by block
	centre  float64        // of f0, in lines
	half    float64        // B, in lines
	order   int            // of h
	leads   []float64      // T_n in turns a line
	edges   int            // terms of t
	noiseX  float64        // mean |noise|^2 of a line of X, to be taken off |X|^2
	stretch float64        // lines for each independent one: zeros were added to the record
	delay   float64        // turns a line by which Y lags X, taken out before
}

// estimate is what the regression finds at its centre.
type estimate struct {
	H         complex128
	Slope     complex128 // dH a line
	Share     float64    // variance of H: mean square of its error
	Dof       float64    // degrees of freedom of Share
	Coherence float64
	Orders    []complex128 // d_n
	ok        bool
}

const mostTerms = 12

// solve finds the estimate, after which lines that stand out of the noise by
// more than chance allows (hum, other lines) are left out and it is found
// again.
func (g *regression) solve() estimate {
	terms := g.order + 1 + len(g.leads) + g.edges
	lo := int(math.Ceil(g.centre - g.half))
	hi := int(math.Floor(g.centre + g.half))
	lo = max(lo, 1)
	hi = min(hi, len(g.X[0])-2)
	if terms > mostTerms || (hi-lo+1)*len(g.X) < terms+4 {
		return estimate{}
	}
	e, left := g.fit(lo, hi, terms, nil, (hi-lo+1)*len(g.X) >= 4*terms)
	if left != nil {
		e, _ = g.fit(lo, hi, terms, left, false)
	}
	return e
}

// row fills the regressors of line k of a block.
func (g *regression) row(phi []complex128, x complex128, k int) (weight float64) {
	d := float64(k) - g.centre
	r := d / g.half
	u := math.Abs(r)
	w := 1 - u*u*u
	w = math.Max(w*w*w, 0)
	if g.delay != 0 {
		x *= turnsOf(-g.delay * d)
	}
	t := x
	for p := 0; p <= g.order; p++ {
		phi[p] = t
		t *= complex(r, 0)
	}
	n := g.order + 1
	for i, lead := range g.leads {
		phi[n+i] = x * turnsOf(lead*d)
	}
	n += len(g.leads)
	t = 1
	for q := 0; q < g.edges; q++ {
		phi[n+q] = t
		t *= complex(r, 0)
	}
	return w
}

func turnsOf(t float64) complex128 {
	s, c := math.Sincos(2 * math.Pi * t)
	return complex(c, s)
}

// fit solves the normal equations over lines lo..hi. out names lines to leave
// out, by block and line; test asks for those that should be.
func (g *regression) fit(lo, hi, terms int, out map[[2]int]bool, test bool) (estimate, map[[2]int]bool) {
	var A, B [mostTerms][mostTerms]complex128
	var b [mostTerms]complex128
	var phi [mostTerms]complex128
	var yy, wsum, w2 float64
	count := 0
	for m := range g.X {
		X, Y := g.X[m], g.Y[m]
		for k := lo; k <= hi; k++ {
			if out != nil && out[[2]int{m, k}] {
				continue
			}
			w := g.row(phi[:terms], X[k], k)
			if w == 0 {
				continue
			}
			y := Y[k]
			count++
			wsum += w
			w2 += w * w
			yy += w * (real(y)*real(y) + imag(y)*imag(y))
			for i := 0; i < terms; i++ {
				c := complex(real(phi[i])*w, -imag(phi[i])*w)
				b[i] += c * y
				for j := 0; j <= i; j++ {
					v := c * phi[j]
					A[i][j] += v
					B[i][j] += complex(real(v)*w, imag(v)*w)
				}
			}
			if g.noiseX > 0 { // errors in the input make |X|^2 too large
				r := (float64(k) - g.centre) / g.half
				p := w * g.noiseX
				for i := 0; i <= g.order; i++ {
					q := p
					for j := 0; j <= i; j++ {
						A[i][j] -= complex(q*math.Pow(r, float64(i)), 0)
						q *= r
					}
				}
			}
		}
	}
	if count < terms+4 || yy == 0 {
		return estimate{}, nil
	}
	inv, ok := inverse(&A, terms)
	if !ok {
		return estimate{}, nil
	}
	var h [mostTerms]complex128
	for i := 0; i < terms; i++ {
		for j := 0; j < terms; j++ {
			h[i] += inv[i][j] * b[j]
		}
	}
	// Residual power, noise variance a line, covariance A^-1 B A^-1.
	ssr := 0.0
	var size []float64
	for m := range g.X {
		X, Y := g.X[m], g.Y[m]
		for k := lo; k <= hi; k++ {
			if out != nil && out[[2]int{m, k}] {
				continue
			}
			w := g.row(phi[:terms], X[k], k)
			if w == 0 {
				continue
			}
			r := Y[k]
			for i := 0; i < terms; i++ {
				r -= h[i] * phi[i]
			}
			s := real(r)*real(r) + imag(r)*imag(r)
			ssr += w * s
			if test {
				size = append(size, s)
			}
		}
	}
	for i := 0; i < terms; i++ {
		for j := i + 1; j < terms; j++ {
			B[i][j] = cmplx.Conj(B[j][i])
		}
	}
	trace := 0.0
	var top [mostTerms]complex128 // row 0 of A^-1 B
	for i := 0; i < terms; i++ {
		for j := 0; j < terms; j++ {
			trace += real(inv[i][j] * B[j][i])
			top[i] += inv[0][j] * B[j][i]
		}
	}
	variance := ssr / math.Max(wsum-trace, 1e-9*wsum)
	share := 0.0
	for i := 0; i < terms; i++ {
		share += real(top[i] * inv[i][0])
	}
	e := estimate{H: h[0], Share: math.Abs(share) * variance * g.stretch, ok: true}
	e.Dof = 2 * math.Max((wsum*wsum/w2-float64(terms))/g.stretch, 1)
	e.Coherence = math.Max(0, 1-ssr/yy)
	if g.order > 0 {
		e.Slope = h[1] / complex(g.half, 0)
	}
	e.Slope -= h[0] * complex(0, 2*math.Pi*g.delay)
	for i, lead := range g.leads { // the terms have no phase at the centre
		e.Orders = append(e.Orders, h[g.order+1+i]*turnsOf(-lead*g.centre))
	}
	if !test {
		return e, nil
	}
	return e, g.outliers(size, lo, hi)
}

// outliers lists the lines whose residual is so large that noise brings one
// about in a thousand stretches: |r|^2 of noise is exponential, its median
// ln 2 times its mean.
func (g *regression) outliers(size []float64, lo, hi int) map[[2]int]bool {
	rare := math.Log(float64(len(size)) * 1e3)
	largest, mean := 0.0, 0.0
	for _, s := range size {
		largest = math.Max(largest, s)
		mean += s / float64(len(size))
	}
	if largest <= rare*mean { // the mean is never far under what the median gives
		return nil
	}
	sorted := append([]float64(nil), size...)
	sort.Float64s(sorted)
	limit := sorted[len(sorted)/2] / math.Ln2 * rare
	var out map[[2]int]bool
	i := 0
	var phi [mostTerms]complex128
	terms := g.order + 1 + len(g.leads) + g.edges
	for m := range g.X {
		for k := lo; k <= hi; k++ {
			if w := g.row(phi[:terms], g.X[m][k], k); w == 0 {
				continue
			}
			if size[i] > limit {
				if out == nil {
					out = map[[2]int]bool{}
				}
				out[[2]int{m, k}] = true
			}
			i++
		}
	}
	if 4*len(out) > len(size) { // no stray lines: the model does not fit
		return nil
	}
	return out
}

// inverse of a Hermitian positive definite matrix given by its lower half,
// rows and columns scaled to a diagonal of 1 first.
func inverse(A *[mostTerms][mostTerms]complex128, n int) (inv [mostTerms][mostTerms]complex128, ok bool) {
	var d [mostTerms]float64
	for i := 0; i < n; i++ {
		v := real(A[i][i])
		if !(v > 0) {
			return inv, false
		}
		d[i] = 1 / math.Sqrt(v)
	}
	var l [mostTerms][mostTerms]complex128 // Cholesky: L L^H
	for i := 0; i < n; i++ {
		for j := 0; j <= i; j++ {
			v := A[i][j] * complex(d[i]*d[j], 0)
			for k := 0; k < j; k++ {
				v -= l[i][k] * cmplx.Conj(l[j][k])
			}
			if i == j {
				if real(v) < 1e-12 {
					return inv, false
				}
				l[i][i] = complex(math.Sqrt(real(v)), 0)
			} else {
				l[i][j] = v / l[j][j]
			}
		}
	}
	for c := 0; c < n; c++ {
		var x [mostTerms]complex128
		for i := c; i < n; i++ {
			v := complex128(0)
			if i == c {
				v = 1
			}
			for k := c; k < i; k++ {
				v -= l[i][k] * x[k]
			}
			x[i] = v / l[i][i]
		}
		for i := n - 1; i >= 0; i-- {
			v := x[i]
			for k := i + 1; k < n; k++ {
				v -= cmplx.Conj(l[k][i]) * x[k]
			}
			x[i] = v / l[i][i]
		}
		for i := 0; i < n; i++ {
			inv[i][c] = x[i] * complex(d[i]*d[c], 0)
		}
	}
	return inv, true
}
