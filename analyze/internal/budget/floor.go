package budget

import "math"

// Subtract takes an instrument's own noise floor off a total, both RMS:
// sqrt(total^2 - floor^2), with the relative sensitivities of the result to
// total and to floor (JCGM 100 5.1.3 on that formula). ok is false when the
// floor is not below the total.
func Subtract(total, floor float64) (net, byTotal, byFloor float64, ok bool) {
	if !(floor < total) {
		return 0, 0, 0, false
	}
	r := floor / total
	keep := (1 - r) * (1 + r)
	return total * math.Sqrt(keep), 1 / keep, r * r / keep, true
}

// VectorRange is what a reading a may have been before an error of size b and
// unknown phase was added to it: |a - b| to a + b.
func VectorRange(a, b float64) (low, high float64) { return math.Abs(a - b), a + b }
