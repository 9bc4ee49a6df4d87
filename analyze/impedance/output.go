package impedance

import (
	"fmt"
	"math"
	"math/cmplx"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
)

var outputImpedance = &analyze.Measure{
	Name:  "output_impedance",
	Title: "output impedance from the fall of the level under a load",
	Doc: "Magnitude of the impedance at the tone, from takes without (`open`) and with (`loaded`) the resistor `load` at the output. With the stimulus on an `in` channel of " +
		"both takes it is complex and the generator's level cancels; else the level has to be the same in both, or `in_level` stated for each.",
	Formula:  "Z = load |U_open / U_loaded - 1|",
	Standard: "IEC 60268-3 (output source impedance)",
	Unit:     "ohm",
	Roles:    []string{"open", "loaded"},
	Keys:     []string{"at", "load"},
	Run:      runOutput,
}

func runOutput(p *analyze.Pass) analyze.Result {
	if p.Params.Load == nil {
		return analyze.Refuse(ohm, analyze.NotEnoughPoints, "no `load` is stated", "state the load's resistance")
	}
	s, bad := hearStep(p, "open", "loaded")
	if bad != nil {
		return analyze.RefuseWith(ohm, bad)
	}
	load := p.Params.Load.Value.Linear()
	r := s.describe(p)
	d, seen := s.size()
	if !seen {
		v := load * s.upper()
		r.Bound = &analyze.Bound{Upper: true, Value: v}
		r.Details["upper_bound"] = v
		r.Refusal = &analyze.Refusal{Code: analyze.BelowDetection,
			Text:   fmt.Sprintf("the load of %.4g ohm changes the level by no more than noise does", load),
			Advice: fmt.Sprintf("use a smaller load than %.4g ohm that the output stands, or record longer", load)}
		if u, _ := budget.Combine(s.lines); !s.phases && d < -4*u {
			r.Bound = nil
			delete(r.Details, "upper_bound")
			r.Refusal.Code, r.Refusal.Text = analyze.Impossible, fmt.Sprintf("the level rises by %.3g dB under the load", -20*math.Log10(real(s.r)))
			r.Refusal.Advice = "check that `open` and `loaded` are not exchanged and the generator level is the same"
		}
		return r
	}
	v := load * d
	r.Value = &v
	var b budget.Budget
	for _, l := range s.lines {
		l.U *= load
		b.Lines = append(b.Lines, l)
	}
	b.Stated("load", p.Params.Load, v)
	b.Into(&r)
	r.Details["damping_factor"] = load / v
	if s.phases {
		parts(&r, complex(load, 0)*s.d(), s.hz)
		if math.Abs(cmplx.Phase(s.d())) > math.Pi/2 {
			r.Notes = append(r.Notes, "the level rises under the load: the real part of the impedance is negative")
		}
	}
	small(&r, s, "a load nearer to the impedance makes a larger step")
	return r
}
