package budget

import (
	"math"

	"gonum.org/v1/gonum/mathext"
)

// A line of RMS value U, read over T seconds in noise of density e_n, has
// both quadratures of its reading spread by half of its noise share
//
//	share = e_n^2 NENBW / T        (V^2, as a mean square)
//
// so that the power read, R, has the mean U^2 + share, and 2 R/share follows
// the noncentral chi-square law with 2 degrees of freedom and noncentrality
// 2 U^2/share. Sums over lines of one share add degrees and noncentralities.

// Share is the noise power in one line's reading, in squares of the density's
// unit times Hz: density in V/rtHz over seconds of rectangular window. With
// another window multiply by its noise bandwidth in bins.
func Share(density, seconds float64) float64 { return density * density / seconds }

// Threshold is the RMS a single line's reading must reach to count as
// detected, with a probability p that noise alone does so:
// density sqrt(ln(1/p)/T). Looking at n lines, give p/n.
func Threshold(density, seconds, p float64) float64 {
	return ShareThreshold(Share(density, seconds), p)
}

// ShareThreshold is Threshold from the noise share.
func ShareThreshold(share, p float64) float64 { return math.Sqrt(share * math.Log(1/p)) }

// LineU is the standard uncertainty of one line's power after its share was
// taken off: the reading's own spread, and that of the share when it was
// found from noise with dof degrees of freedom (2 an average; 0: known).
// power is the corrected one, clipped at 0 here. Sum over lines with RSS.
func LineU(power, share, dof float64) float64 {
	v := share*share + 2*share*math.Max(power, 0)
	if dof > 0 {
		v += 2 * share * share / dof
	}
	return math.Sqrt(v)
}

// UpperBound returns the RMS for which a reading below the one seen has the
// probability 1 - confidence (5 % for 0.95). power is the sum of the squared
// RMS readings over the lines, noise share included; share that of one line.
// ok is false when even no signal at all would read that little less often
// than so: then only the threshold can be stated.
func UpperBound(power, share float64, lines int, confidence float64) (rms float64, ok bool) {
	return upperBound(power, share, 2*float64(lines), confidence)
}

// UpperBoundOf is UpperBound for lines whose shares differ. The law of the
// sum is matched by its first two moments: effective share sum n^2 / sum n,
// which leans to the noisiest lines, with 2 (sum n)^2 / sum n^2 degrees of
// freedom.
func UpperBoundOf(power float64, shares []float64, confidence float64) (rms float64, ok bool) {
	share, dof := effective(shares)
	return upperBound(power, share, dof, confidence)
}

// SumThreshold is the RMS that a sum over lines reaches by noise alone with
// probability p. For one line it equals ShareThreshold.
func SumThreshold(shares []float64, p float64) float64 {
	share, dof := effective(shares)
	if share == 0 {
		return 0
	}
	return math.Sqrt(share * mathext.GammaIncRegCompInv(dof/2, p))
}

// MeanThreshold is the mean of m equal noise powers, over their expectation,
// that noise alone exceeds with probability p: chi-square with 2 m degrees of
// freedom over 2 m. For m = 1 it is ln(1/p).
func MeanThreshold(m, p float64) float64 { return mathext.GammaIncRegCompInv(m, p) / m }

func effective(shares []float64) (share, dof float64) {
	top := 0.0
	for _, n := range shares {
		top = math.Max(top, n)
	}
	if top == 0 {
		return 0, 2 * math.Max(1, float64(len(shares)))
	}
	var sum, squares float64
	for _, n := range shares {
		sum += n / top
		squares += n / top * (n / top)
	}
	return top * squares / sum, 2 * sum * sum / squares
}

func upperBound(power, share, dof, confidence float64) (float64, bool) {
	if !(power > 0) {
		return 0, false
	}
	if share == 0 {
		return math.Sqrt(power), true
	}
	x := 2 * power / share
	miss := 1 - confidence
	if NoncentralChiSquare(x, dof, 0) <= miss {
		return 0, false
	}
	// The law falls as the noncentrality grows; its mean is dof + lambda and
	// its variance 2 (dof + 2 lambda), which bounds the search. 60 halvings
	// of that bracket: 1e-15 of it.
	lo, hi := 0.0, x+10*math.Sqrt(x)+10
	for NoncentralChiSquare(x, dof, hi) > miss {
		lo, hi = hi, 2*hi
	}
	for range 60 {
		mid := (lo + hi) / 2
		if NoncentralChiSquare(x, dof, mid) > miss {
			lo = mid
		} else {
			hi = mid
		}
	}
	return math.Sqrt(share * (lo + hi) / 2 / 2), true
}

// Detection is the probability that a line of the given RMS exceeds a
// threshold: Marcum's Q with M = 1.
func Detection(rms, threshold, share float64) float64 {
	return MarcumQ(1, rms*math.Sqrt(2/share), threshold*math.Sqrt(2/share))
}

// MarcumQ is the generalised Marcum function Q_m(a, b): the probability that
// the length of a 2m-dimensional unit normal vector, offset by a, exceeds b.
func MarcumQ(m int, a, b float64) float64 {
	return 1 - NoncentralChiSquare(b*b, 2*float64(m), a*a)
}

// NoncentralChiSquare is the probability of a value <= x under the noncentral
// chi-square law with dof degrees of freedom (need not be an integer) and
// noncentrality lambda: the Poisson mixture of central laws (Abramowitz and
// Stegun 26.4.25),
//
//	sum_j e^{-lambda/2} (lambda/2)^j / j!  P(dof/2 + j, x/2),
//
// summed outwards from its largest weight, with P stepped by
// P(a+1, y) = P(a, y) - y^a e^-y / Gamma(a+1). Absolute error under 1e-11.
func NoncentralChiSquare(x, dof, lambda float64) float64 {
	if !(x > 0) {
		return 0
	}
	y, h, a := x/2, lambda/2, dof/2
	if h == 0 {
		return mathext.GammaIncReg(a, y)
	}
	j0 := math.Floor(h)
	lg, _ := math.Lgamma(j0 + 1)
	w0 := math.Exp(j0*math.Log(h) - h - lg) // weight of the middle term
	lg, _ = math.Lgamma(a + j0 + 1)
	t0 := math.Exp((a+j0)*math.Log(y) - y - lg) // P(a+j0) - P(a+j0+1)
	p0 := mathext.GammaIncReg(a+j0, y)

	const small = 1e-18
	sum := 0.0
	for j, w, t, p := j0, w0, t0, p0; w > small*w0 && p > small; j++ {
		sum += w * p
		p -= t
		t *= y / (a + j + 1)
		w *= h / (j + 1)
	}
	for j, w, t, p := j0, w0, t0, p0; j >= 1 && w > small*w0; {
		t *= (a + j) / y
		p = math.Min(1, p+t)
		w *= j / h
		j--
		sum += w * p
	}
	return math.Min(1, sum)
}
