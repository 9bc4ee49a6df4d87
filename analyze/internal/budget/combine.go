// Package budget is the arithmetic of uncertainty: how the contributors of a
// value combine, which coverage factor they deserve, what differences let
// cancel, and what can still be said when noise hides a line.
//
// It follows JCGM 100:2008 (the GUM). All uncertainties inside are standard
// ones, in the linear unit of the value, sensitivities already applied;
// people state and read expanded ones.
package budget

import (
	"math"

	"benchslip/analyze"
)

// Combine returns the combined standard uncertainty of the contributors and
// its effective degrees of freedom (+Inf when none is finite).
//
// Lines without a Source are independent and add in squares (JCGM 100
// 5.1.2). Lines with one Source are one and the same error: they add first,
// with their signs (5.2.2 with r = 1). Degrees of freedom by Welch and
// Satterthwaite (G.4.1): nu = u^4 / sum(u_i^4 / nu_i), not truncated here.
func Combine(lines []analyze.Contributor) (u, nu float64) {
	// Scaled by the largest term, so that squares of nanovolts stay normal
	// numbers and huge ones do not overflow.
	groups := together(lines)
	top := 0.0
	for _, g := range groups {
		top = math.Max(top, math.Abs(g.U))
	}
	if top == 0 || math.IsInf(top, 0) {
		return top, math.Inf(1)
	}
	var sum, quartic float64
	for _, g := range groups {
		r := g.U / top
		sum += r * r
		if g.Dof > 0 {
			quartic += r * r * r * r / g.Dof
		}
	}
	nu = math.Inf(1)
	if quartic > 0 {
		nu = sum * sum / quartic
	}
	return top * math.Sqrt(sum), nu
}

// RSS is the root of the sum of squares.
func RSS(u ...float64) float64 {
	sum := 0.0
	for _, x := range u {
		sum = math.Hypot(sum, x)
	}
	return sum
}

// TypeA returns mean, standard uncertainty of the mean s/sqrt(n) and its
// degrees of freedom n - 1 of independent readings (JCGM 100 4.2). One
// reading has no scatter: u and dof are 0.
func TypeA(x []float64) (mean, u, dof float64) {
	if len(x) == 0 {
		return 0, 0, 0
	}
	n := float64(len(x))
	for _, v := range x {
		mean += v / n
	}
	if len(x) == 1 {
		return mean, 0, 0
	}
	sum := 0.0
	for _, v := range x {
		sum += (v - mean) * (v - mean)
	}
	return mean, math.Sqrt(sum / (n - 1) / n), n - 1
}

// Standard uncertainties of +-a (JCGM 100 4.3.7, 4.3.9; the arcsine law is
// that of a sinusoidal ripple or an unknown phase, common practice).
func Rectangular(a float64) float64 { return math.Abs(a) / math.Sqrt(3) }
func Triangular(a float64) float64  { return math.Abs(a) / math.Sqrt(6) }
func ArcSine(a float64) float64     { return math.Abs(a) / math.Sqrt2 }

// scatteredBelow is the number of degrees of freedom from which a normal law
// is good enough: at 50 Student's factor for 95.45 % is 2.05.
const scatteredBelow = 50

// Coverage returns the factor k to use for an expanded uncertainty. coverage
// is the one asked for, a positive number that stands for the two-sided
// probability erf(coverage/sqrt 2): 2 for 95.45 %. With fewer than 50
// effective degrees of freedom nu, truncated to an integer, Student's law
// gives the factor of the same probability (JCGM 100 G.3, G.4.1).
func Coverage(coverage, nu float64) float64 {
	if !(nu < scatteredBelow) {
		return coverage
	}
	return student(coverage, Truncate(nu))
}

// Truncate cuts degrees of freedom to the next lower integer, at least 1.
// 1e-9: a quotient that should be an integer and came out just below.
func Truncate(nu float64) float64 { return math.Max(1, math.Floor(nu*(1+1e-9))) }

// Expand combines the contributors and expands: U = k u.
func Expand(lines []analyze.Contributor, coverage float64) (U, k, u, nu float64) {
	u, nu = Combine(lines)
	k = Coverage(coverage, nu)
	return k * u, k, u, nu
}
