package budget

import (
	"math"

	"gonum.org/v1/gonum/mathext"
)

// mostCoverage bounds k: erfc(37/sqrt 2) = 6e-300 is the last tail that
// float64 holds as a normal number.
const mostCoverage = 37

// student returns t with P(|T| <= t) = erf(k/sqrt 2) for Student's law with
// nu degrees of freedom. Relative error under 1e-9 for k up to mostCoverage,
// beyond which k counts as that.
//
// The probability is matched on the side where it is the smaller number, so
// that neither tiny k nor large k loses digits. t >= k always, since
// Student's tails are the heavier ones; the root is bracketed from there and
// halved in lg t, as t may reach 1e299 at one degree of freedom.
func student(k, nu float64) float64 {
	if !(k > 0) {
		return k
	}
	k = math.Min(k, mostCoverage)
	inside, outside := math.Erf(k/math.Sqrt2), math.Erfc(k/math.Sqrt2)
	tooLow := func(t float64) bool {
		if outside < inside {
			return twoTails(t, nu) > outside
		}
		return middle(t, nu) < inside
	}
	lo, hi := math.Log(k), math.Log(k)+1
	for tooLow(math.Exp(hi)) {
		lo, hi = hi, hi+(hi-lo)*2
	}
	for range 100 {
		mid := lo + (hi-lo)/2
		if mid <= lo || mid >= hi {
			break
		}
		if tooLow(math.Exp(mid)) {
			lo = mid
		} else {
			hi = mid
		}
	}
	return math.Exp(hi)
}

// twoTails is P(|T| > t) = I_{nu/(nu+t^2)}(nu/2, 1/2), the regularised
// incomplete beta function (Abramowitz and Stegun 26.7.1 with 26.5.27).
func twoTails(t, nu float64) float64 {
	r := t / math.Sqrt(nu) // squared only once it is known not to overflow
	if r > 1e150 {
		// Leading term: x^(nu/2) / ((nu/2) B(nu/2, 1/2)) with x = 1/r^2.
		return math.Exp(-nu*math.Log(r) - math.Log(nu/2) - mathext.Lbeta(nu/2, 0.5))
	}
	return mathext.RegIncBeta(nu/2, 0.5, 1/(1+r*r))
}

// middle is P(|T| <= t).
func middle(t, nu float64) float64 {
	r := t * t / nu
	return mathext.RegIncBeta(0.5, nu/2, r/(1+r))
}

// Conforming is the probability that a quantity with best estimate 0 and
// standard uncertainty 1 lies below z: the normal law with 50 effective
// degrees of freedom and more, else Student's with nu truncated (JCGM 101
// 6.4.9.4 gives that law to a value with type A uncertainty). nu may be +Inf.
func Conforming(z, nu float64) float64 {
	if !(nu < scatteredBelow) {
		return math.Erfc(-z/math.Sqrt2) / 2
	}
	tail := twoTails(math.Abs(z), Truncate(nu)) / 2
	if z > 0 {
		return 1 - tail
	}
	return tail
}
