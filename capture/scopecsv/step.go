package scopecsv

import (
	"math"
	"sort"
)

// codeStep finds the step of a converter behind the values: the largest step
// of which all differences are whole multiples within the rounding q of the
// printed digits. 0 when there is none, or when the step cannot be told from
// the rounding itself (under two units of the last digit).
func codeStep(v []float64, q float64, digits int) float64 {
	const look = 1 << 16
	stride := max(1, len(v)/look)
	var s []float64
	hi := 0.0
	for i := 0; i < len(v); i += stride {
		if x := v[i]; x == x {
			s = append(s, x)
			hi = math.Max(hi, math.Abs(x))
		}
	}
	if len(s) < 16 || hi == 0 {
		return 0
	}
	// The digits of the largest value may be coarser than the finest digit.
	q = math.Max(q, pow10(int(math.Floor(math.Log10(hi)))-digits+1))
	sort.Float64s(s)
	u := s[:1]
	for _, x := range s[1:] {
		if x-u[len(u)-1] > 1.01*q {
			u = append(u, x)
		}
	}
	if len(u) < 3 {
		return 0
	}
	least := math.Inf(1)
	for i := 1; i < len(u); i++ {
		least = math.Min(least, u[i]-u[i-1])
	}
	for part := 1; part <= 4; part++ { // the least difference may be 2..4 steps
		g := fitStep(u, least/float64(part))
		// Values that have nothing to do with steps of g fall onto their grid
		// with this chance: too likely shows nothing, unless values repeat so
		// often that they are steps for sure.
		chance := math.Pow(2*tolerance(g, q)/g, float64(len(u)-2))
		if g < 1.9*q || chance > 1e-9 && len(u)*4 > len(s) {
			continue
		}
		if onGrid(v, u[0], g, q) {
			return g
		}
	}
	return 0
}

// fitStep refines a step from the levels u, walking outward so that the count
// of steps never slips.
func fitStep(u []float64, g float64) float64 {
	for span := 4.0; ; span *= 4 {
		var num, den float64
		for _, x := range u[1:] {
			d := x - u[0]
			if d > span*g {
				break
			}
			k := math.Round(d / g)
			num += k * d
			den += k * k
		}
		if den > 0 {
			g = num / den
		}
		if span*g > u[len(u)-1]-u[0] {
			return g
		}
	}
}

// tolerance is how far from a multiple of the step g a printed value may lie:
// its own rounding and that of the level it is measured from.
func tolerance(g, q float64) float64 { return math.Min(1.05*q, 0.3*g) + 1e-12*g }

// onGrid says whether every value lies on base + k g within the rounding.
func onGrid(v []float64, base, g, q float64) bool {
	tol := tolerance(g, q)
	for _, x := range v {
		if x != x {
			continue
		}
		d := (x - base) / g
		if math.Abs(d-math.Round(d))*g > tol+1e-12*math.Abs(x-base) {
			return false
		}
	}
	return true
}
