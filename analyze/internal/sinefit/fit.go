package sinefit

import (
	"errors"
	"math"
)

// Fit is a block's least-squares solution.
type Fit struct {
	N    int
	DC   float64
	Z    []complex128 // one per line, peak phasor at the middle
	Gain []float64    // variance of Re z (and of Im z) per sigma^2: 2/N for a line that stands alone
	DCg  float64      // variance of DC per sigma^2: 1/N alone
	// Cond is the largest ratio of Gain to 2/N: what the neighbourhood of
	// other lines costs in variance.
	Cond float64
}

// ErrSingular: two lines (or a line and DC) cannot be told apart in the block.
var ErrSingular = errors.New("lines too close to each other for this length")

// Solver solves joint fits for one set of frequencies and one block length;
// its factorisation is reused for every block (and channel) that shares them.
type Solver struct {
	N        int
	Nu       []float64
	cos, sin cholesky // cos has DC first
	gain     []float64
	dcGain   float64
	cond     float64
}

// kernel is sum_i cos(2 pi nu t_i) over n samples with t from the middle.
func kernel(nu float64, n int) float64 {
	half := math.Sin(math.Pi * nu)
	if math.Abs(half) < 1e-9 {
		// Near a whole number w: t are halves for even n, so the sum is n
		// or, for odd w, -n.
		w := math.Round(nu)
		near := math.Pi * (nu - w)
		v := float64(n) * (1 - near*near*(float64(n)*float64(n)-1)/6)
		if n%2 == 0 && math.Mod(w, 2) != 0 {
			return -v
		}
		return v
	}
	return math.Sin(2*math.Pi*Turns(nu, float64(n)/2)) / half
}

// NewSolver prepares the joint fit of DC and lines nu (cycles per sample,
// 0 < nu < 1/2) to blocks of n samples.
func NewSolver(nu []float64, n int) (*Solver, error) {
	k := len(nu)
	s := &Solver{N: n, Nu: nu, cos: newCholesky(k + 1), sin: newCholesky(k)}
	s.cos.set(0, 0, float64(n))
	for a := 0; a < k; a++ {
		s.cos.set(a+1, 0, kernel(nu[a], n))
		for b := 0; b <= a; b++ {
			minus, plus := kernel(nu[a]-nu[b], n), kernel(nu[a]+nu[b], n)
			s.cos.set(a+1, b+1, (minus+plus)/2)
			s.sin.set(a, b, (minus-plus)/2)
		}
	}
	if !s.cos.factor() || !s.sin.factor() {
		return nil, ErrSingular
	}
	gc, gs := s.cos.inverseDiagonal(), s.sin.inverseDiagonal()
	s.dcGain = gc[0]
	s.gain = make([]float64, k)
	s.cond = 1
	for a := range s.gain {
		s.gain[a] = math.Max(gc[a+1], gs[a])
		s.cond = math.Max(s.cond, s.gain[a]*float64(n)/2)
	}
	return s, nil
}

// Solve turns correlations (sum of y, Sums' S) into a Fit.
func (s *Solver) Solve(sum float64, S []complex128) Fit {
	k := len(s.Nu)
	c := make([]float64, k+1)
	d := make([]float64, k)
	c[0] = sum
	for i, v := range S {
		c[i+1], d[i] = real(v), -imag(v)
	}
	s.cos.solve(c)
	s.sin.solve(d)
	f := Fit{N: s.N, DC: c[0], Z: make([]complex128, k), Gain: s.gain, DCg: s.dcGain, Cond: s.cond}
	for i := range f.Z {
		f.Z[i] = complex(c[i+1], -d[i])
	}
	return f
}

// Block fits y (not changed) in one go.
func (s *Solver) Block(y []float64) Fit {
	S := make([]complex128, len(s.Nu))
	Sums(y, s.Nu, S, nil)
	return s.Solve(total(y), S)
}

func total(y []float64) float64 {
	sum, part := 0.0, 0.0
	for i, v := range y {
		part += v
		if i&1023 == 1023 {
			sum += part
			part = 0
		}
	}
	return sum + part
}

// Comb is a set of lines at whole multiples of one frequency.
type Comb struct {
	Nu     float64   // base frequency, cycles per sample
	Orders []float64 // multiples present
	Free   bool      // Refine may move Nu
}

// Refined is the outcome of Refine.
type Refined struct {
	Fit               // lines in the order of the combs and their orders
	Nu      []float64 // base frequency of each comb
	SSR     float64   // sum of squared residuals, never under the rounding of the sums
	Steps   int
	Settled []bool // by comb: its last step was far below the noise, or below rounding
}

// Refine is the four-parameter fit of IEEE Std 1057 widened to several combs,
// the base frequency of each free one found by Gauss-Newton with amplitudes
// and DC solved exactly at every step. Each step reads the samples once: the
// residual's correlation with t times a line is that of the samples less that
// of the model, which has a closed form. The curvature is taken without
// coupling to the amplitudes or other combs, which makes steps a little short
// when the block holds few periods, never long. Steps end when all are below
// a ten thousandth of the Cramer-Rao bound, or no longer shrink for rounding. A
// comb that leaves its start by more than limit (cycles per sample) is put
// back there and held; one that has not come to rest after 16 steps (a line
// that is hardly there) is left where it is.
func Refine(y []float64, combs []Comb, limit float64) (Refined, error) {
	n := float64(len(y))
	var lines []float64
	for _, c := range combs {
		lines = append(lines, c.Orders...)
	}
	S := make([]complex128, len(lines))
	T := make([]complex128, len(lines))
	out := Refined{Nu: make([]float64, len(combs)), Settled: make([]bool, len(combs))}
	held := make([]bool, len(combs))
	last := make([]float64, len(combs))
	for g, c := range combs {
		out.Nu[g], held[g], last[g] = c.Nu, !c.Free, math.Inf(1)
	}
	sum := total(y)
	energy := 0.0
	for _, v := range y {
		energy += v * v
	}
	done := false
	for out.Steps = 1; ; out.Steps++ {
		i := 0
		for g, c := range combs {
			for _, o := range c.Orders {
				lines[i] = o * out.Nu[g]
				i++
			}
		}
		sv, err := NewSolver(lines, len(y))
		if err != nil {
			return out, err
		}
		Sums(y, lines, S, T)
		out.Fit = sv.Solve(sum, S)
		left := energy - sum*out.DC
		for k, z := range out.Z {
			left -= real(z)*real(S[k]) + imag(z)*imag(S[k])
		}
		out.SSR = math.Max(left, 1e-15*energy)
		if done || out.Steps > 40 {
			return out, nil
		}
		takeModel(T, lines, out.Fit)
		done = true
		first := 0
		for g, c := range combs {
			// Residual against the derivative of the model by nu:
			// sum_h 2 pi h t (-a sin + b cos), z = a - jb.
			grad, curve := 0.0, 0.0
			for i, o := range c.Orders {
				z := out.Z[first+i]
				a, b := real(z), -imag(z)
				grad += 2 * math.Pi * o * (a*imag(T[first+i]) + b*real(T[first+i]))
				curve += 2 * math.Pi * math.Pi * o * o * (a*a + b*b)
			}
			first += len(c.Orders)
			if held[g] || curve == 0 || out.Steps > 16 && out.Settled[g] {
				continue
			}
			curve *= n * (n*n - 1) / 12
			step := grad / curve
			size := math.Abs(step)
			bound := math.Sqrt(out.SSR / n / curve) // Cramer-Rao, white noise
			out.Settled[g] = size*n < 1e-12 || (size*n < 1e-7 && size >= 0.7*last[g])
			if out.Settled[g] {
				continue
			}
			if size < 1e-4*bound { // the amplitudes no longer notice
				out.Nu[g] += step
				out.Settled[g] = true
				continue
			}
			if out.Steps >= 16 && g > 0 {
				held[g] = true
				continue
			}
			last[g] = size
			out.Nu[g] += step
			done = false
			if math.Abs(out.Nu[g]-c.Nu) > limit || out.Nu[g] <= 0 {
				out.Nu[g], held[g] = c.Nu, true
			}
		}
	}
}

// slope is sum_i t_i sin(2 pi nu t_i), minus the derivative of kernel.
func slope(nu float64, n int) float64 {
	s, c := math.Sincos(math.Pi * nu)
	N := float64(n)
	if math.Abs(s)*N < 3e-4 && math.Abs(nu) < 0.25 {
		return math.Pi * nu * N * (N*N - 1) / 6
	}
	if s == 0 {
		return 0
	}
	sn, cn := math.Sincos(2 * math.Pi * Turns(nu, N/2))
	return (sn*c - N*cn*s) / (2 * s * s)
}

// takeModel takes the model's own sums of t x(t) exp(-j w t) off T.
func takeModel(T []complex128, nu []float64, f Fit) {
	for k, v := range nu {
		var re, im float64
		im = -f.DC * slope(v, f.N)
		for l, z := range f.Z {
			c := (slope(nu[l]+v, f.N) + slope(nu[l]-v, f.N)) / 2
			d := (slope(v+nu[l], f.N) + slope(v-nu[l], f.N)) / 2
			re += -imag(z) * c
			im -= real(z) * d
		}
		T[k] -= complex(re, im)
	}
}

// cholesky is a small dense symmetric positive definite system, lower half.
type cholesky struct {
	n int
	l []float64
}

func newCholesky(n int) cholesky { return cholesky{n, make([]float64, n*n)} }

func (c *cholesky) set(i, j int, v float64) { c.l[i*c.n+j] = v }

// factor turns the matrix into L with L L' = A; false when it is singular to
// working accuracy (a pivot below 1e-9 of its diagonal).
func (c *cholesky) factor() bool {
	n := c.n
	for i := 0; i < n; i++ {
		ri := c.l[i*n : i*n+n]
		diag := ri[i]
		for j := 0; j <= i; j++ {
			rj := c.l[j*n : j*n+n]
			v := ri[j]
			for k := 0; k < j; k++ {
				v -= ri[k] * rj[k]
			}
			if j < i {
				ri[j] = v / rj[j]
				continue
			}
			if !(v > 1e-9*diag) || diag <= 0 {
				return false
			}
			ri[i] = math.Sqrt(v)
		}
	}
	return true
}

func (c *cholesky) solve(b []float64) {
	n := c.n
	for i := 0; i < n; i++ {
		row := c.l[i*n : i*n+n]
		v := b[i]
		for k := 0; k < i; k++ {
			v -= row[k] * b[k]
		}
		b[i] = v / row[i]
	}
	for i := n - 1; i >= 0; i-- {
		v := b[i]
		for k := i + 1; k < n; k++ {
			v -= c.l[k*n+i] * b[k]
		}
		b[i] = v / c.l[i*n+i]
	}
}

// inverseDiagonal is the diagonal of A^-1.
func (c *cholesky) inverseDiagonal() []float64 {
	d := make([]float64, c.n)
	e := make([]float64, c.n)
	for j := range d {
		for i := range e {
			e[i] = 0
		}
		e[j] = 1
		// Column j of L^-1 is zero above j; its squares sum to (A^-1)_jj.
		for i := j; i < c.n; i++ {
			row := c.l[i*c.n : i*c.n+c.n]
			v := e[i]
			for k := j; k < i; k++ {
				v -= row[k] * e[k]
			}
			e[i] = v / row[i]
			d[j] += e[i] * e[i]
		}
	}
	return d
}
