package response

import (
	"fmt"
	"math"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
	"benchslip/capture/unit"
)

// Preferred values of IEC 60063 in one decade.
var (
	e12 = []float64{1, 1.2, 1.5, 1.8, 2.2, 2.7, 3.3, 3.9, 4.7, 5.6, 6.8, 8.2}
	e24 = []float64{1, 1.1, 1.2, 1.3, 1.5, 1.6, 1.8, 2, 2.2, 2.4, 2.7, 3, 3.3, 3.6, 3.9, 4.3, 4.7, 5.1, 5.6, 6.2, 6.8, 7.5, 8.2, 9.1}
)

// preferred is the value of a series with the smallest ratio to x.
func preferred(series []float64, x float64) float64 {
	decade := math.Floor(math.Log10(x))
	best, away := 0.0, math.Inf(1)
	for d := decade - 1; d <= decade+1; d++ {
		for _, m := range series {
			v := m * math.Pow(10, d)
			if a := math.Abs(math.Log(v / x)); a < away {
				best, away = v, a
			}
		}
	}
	return best
}

// capacitor adds what the pole says of a coupling (or filter) capacitor when
// the job states the resistance: C = 1/(2 pi R f_p).
func capacitor(p *analyze.Pass, r *analyze.Result, f *corner) {
	s := p.Params.Resistance
	if s == nil {
		return
	}
	R := s.Value.Linear()
	C := 1 / (2 * math.Pi * R * f.pole)
	rel := f.poleU
	if s.Uncertainty != nil {
		rel = math.Hypot(rel, budget.Relative(s.Value, *s.Uncertainty))
	} else {
		r.Unstated = append(r.Unstated, s.Key)
	}
	d := r.Details
	d["resistance_ohm"], d["capacitance_f"], d["capacitance_uncertainty_f"] = R, C, 2*rel*C
	text := fmt.Sprintf("with %s the half-power pole at %.4g Hz is that of %s", s.Value, f.pole, farads(C))
	for _, series := range []struct {
		name   string
		values []float64
	}{{"E12", e12}, {"E24", e24}} {
		v := preferred(series.values, C)
		pole := 1 / (2 * math.Pi * R * v)
		key := "nearest_" + map[string]string{"E12": "e12", "E24": "e24"}[series.name]
		d[key+"_f"], d[key+"_pole_hz"] = v, pole
		text += fmt.Sprintf("; nearest %s value %s, pole %.4g Hz", series.name, farads(v), pole)
	}
	if f.order != 1 {
		text += "; the fall is not that of a single pole, so this holds only if one capacitor rules it"
	}
	r.Notes = append(r.Notes, text)
}

// farads prints a capacitance with a prefix.
func farads(c float64) string {
	for _, u := range []string{"mF", "uF", "nF"} {
		if q := unit.MustLookup(u); c >= q.ToLinear(1)*0.0999 {
			return fmt.Sprintf("%.3g %s", q.FromLinear(c), u)
		}
	}
	return fmt.Sprintf("%.3g pF", unit.MustLookup("pF").FromLinear(c))
}
