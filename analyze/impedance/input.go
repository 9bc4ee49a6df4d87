package impedance

import (
	"fmt"
	"math"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
)

var inputImpedance = &analyze.Measure{
	Name:  "input_impedance",
	Title: "input impedance from the fall of the level behind a series resistor",
	Doc: "Magnitude of the impedance at the tone, from the output in takes without (`direct`) and with (`series_take`) the resistor `series` before the input. `source` is the " +
		"generator's own resistance (0 if not stated). With the generator's voltage, taken before the resistor, on an `in` channel of both takes the impedance is complex and " +
		"the level cancels; else the generator level has to be the same in both.",
	Formula:  "Z = series / (U_direct / U_series - 1) - source",
	Standard: "IEC 60268-3 (input impedance)",
	Unit:     "ohm",
	Roles:    []string{"direct", "series_take"},
	Keys:     []string{"at", "source", "temperature", "input_resistance", "plane", "load", "series"},
	Run:      runInput,
}

func runInput(p *analyze.Pass) analyze.Result {
	if p.Params.Series == nil {
		return analyze.Refuse(ohm, analyze.NotEnoughPoints, "no `series` is stated", "state the series resistor")
	}
	s, bad := hearStep(p, "direct", "series_take")
	if bad != nil {
		return analyze.RefuseWith(ohm, bad)
	}
	series, source := p.Params.Series.Value.Linear(), 0.0
	if p.Params.Source != nil {
		source = p.Params.Source.Value.Linear()
	}
	r := s.describe(p)
	d, seen := s.size()
	if !seen {
		u, _ := budget.Combine(s.lines)
		if !s.phases && d < -4*u {
			r.Refusal = &analyze.Refusal{Code: analyze.Impossible,
				Text:   fmt.Sprintf("the level rises by %.3g dB behind the series resistor", -20*math.Log10(real(s.r))),
				Advice: "check that `direct` and `series_take` are not exchanged and the generator level is the same"}
			return r
		}
		v := math.Max(series/s.upper()-source, 0)
		r.Bound = &analyze.Bound{Upper: false, Value: v}
		r.Details["lower_bound"] = v
		r.Refusal = &analyze.Refusal{Code: analyze.BelowDetection,
			Text:   fmt.Sprintf("the series resistor of %.4g ohm changes the level by no more than noise does", series),
			Advice: fmt.Sprintf("use a larger series resistor than %.4g ohm, or record longer", series)}
		return r
	}
	z := complex(series, 0)/s.d() - complex(source, 0)
	v := math.Hypot(real(z), imag(z))
	if !s.phases {
		v = series/d - source
		z = complex(v, 0)
	}
	if v <= 0 {
		r.Refusal = &analyze.Refusal{Code: analyze.Impossible,
			Text:   fmt.Sprintf("the step gives %.4g ohm, no more than the stated source of %.4g ohm", series/d, source),
			Advice: "check `series` and `source`"}
		return r
	}
	r.Value = &v
	var b budget.Budget
	// |dZ/dd| = series/|d|^2: the smaller the step, the more its noise weighs.
	for _, l := range s.lines {
		l.U *= series / (d * d)
		b.Lines = append(b.Lines, l)
	}
	b.Stated("series resistor", p.Params.Series, series/d)
	b.Stated("source", p.Params.Source, -source)
	b.Into(&r)
	// 1/d is bent: upwards it reaches further than its slope says.
	if u, _ := budget.Combine(s.lines); 2*u < d {
		bent := series/(d-2*u) - series/d - 2*u*series/(d*d)
		if bent > 0.01*v {
			r.Interval = &[2]float64{v, v + bent}
		}
	}
	if s.phases {
		parts(&r, z, s.hz)
	}
	small(&r, s, "a series resistor nearer to the impedance makes a larger step")
	return r
}
