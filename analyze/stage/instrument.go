package stage

import (
	"fmt"
	"math"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
	"benchslip/capture/recording"
)

// Residual is the power in a band of all but the fundamental: noise,
// harmonics, hum, other lines.
func Residual(l *Lines, b Band) Power {
	rest := NoiseIn(l, b, nil)
	if len(l.Harm) > 0 {
		rest = rest.Plus(LinesIn(b, nil, l.Harm[1:]))
	}
	return rest.Plus(LinesIn(b, nil, l.Mains, l.Others))
}

// Everything is the power in a band of all there is, DC left out, under gain.
func Everything(l *Lines, b Band, gain func(float64) float64) Power {
	return NoiseIn(l, b, gain).Plus(LinesIn(b, gain, l.Harm, l.Mains, l.Others))
}

// Floored is a power with the instrument's own floor taken off.
type Floored struct {
	Net     Power
	Limited bool    // total under 3 dB over the floor: no value
	Ratio   float64 // total over floor, dB
	Flags   []recording.Flag
	Details map[string]any
}

// TakeFloor takes the power that read gives for the take of role "floor" off
// total. Powers add, since the floor's noise has nothing to do with the
// unit's: corrected from 6 dB over the floor on, corrected and flagged
// near-floor from 3 to 6 dB, floor-limited below. ok is false without such a
// take.
func TakeFloor(p *analyze.Pass, total Power, read func(*analyze.Signal) (Power, *analyze.Refusal)) (f Floored, ok bool, bad *analyze.Refusal) {
	if !p.Has("floor") {
		return Floored{Net: total}, false, nil
	}
	sig, bad := p.Signal("floor", "out")
	if bad != nil {
		return f, true, bad
	}
	floor, bad := read(sig)
	if bad != nil {
		return f, true, bad
	}
	f.Net = Power{total.P - floor.P, math.Hypot(total.U, floor.U)}
	f.Ratio = math.Inf(1)
	if floor.P > 0 {
		f.Ratio = 10 * math.Log10(total.P/floor.P)
	}
	name := p.Take("floor").Name
	f.Details = map[string]any{"floor_v": math.Sqrt(math.Max(floor.P, 0)), "uncorrected_v": math.Sqrt(math.Max(total.P, 0)), "floor_take": name}
	if !math.IsInf(f.Ratio, 0) {
		f.Details["over_floor_db"] = f.Ratio
	}
	switch {
	case f.Ratio < 3:
		f.Limited = true
	case f.Ratio < 6:
		f.Flags = append(f.Flags, recording.Flag{Code: recording.NearFloor, Take: name,
			Message: fmt.Sprintf("only %.1f dB over the instrument's own floor; corrected by power", f.Ratio)})
	}
	return f, true, nil
}

// FloorLimited turns a result into a bound: the uncorrected value with its
// uncertainty on top.
func FloorLimited(r analyze.Result, uncorrected float64, upper bool, ratioDB float64) analyze.Result {
	u, _ := budget.Combine(r.Budget)
	v := uncorrected + 2*u
	if !upper {
		v = uncorrected - 2*u
	}
	r.Value, r.Budget = nil, nil
	r.Bound = &analyze.Bound{Upper: upper, Value: v}
	r.Refusal = &analyze.Refusal{Code: analyze.FloorLimited,
		Text:   fmt.Sprintf("the reading is only %.1f dB over the instrument's own floor", ratioDB),
		Advice: "use a quieter recorder input, or more gain before it"}
	if r.Details == nil {
		r.Details = map[string]any{}
	}
	key := "upper_bound"
	if !upper {
		key = "lower_bound"
	}
	r.Details[key] = r.Unit.FromLinear(v)
	return r
}

// ResidualFloor applies `floor` and `loop` to a THD+N (or its inverse).
func ResidualFloor(p *analyze.Pass, l *Lines, b Band, rest Power, fundamental float64, r analyze.Result, inverse bool) analyze.Result {
	value := func(q float64) float64 {
		v := math.Sqrt(q / (q + fundamental))
		if inverse {
			return 1 / v
		}
		return v
	}
	f, ok, bad := TakeFloor(p, rest, func(s *analyze.Signal) (Power, *analyze.Refusal) {
		if _, bad := BandFor(s, b.Band); bad != nil {
			return Power{}, bad
		}
		return Everything(Decompose(p, s, Options{}), b, nil), nil
	})
	if bad != nil {
		return analyze.RefuseWith(r.Unit, bad)
	}
	if ok {
		for k, v := range f.Details {
			r.Details[k] = v
		}
		r.Flags = append(r.Flags, f.Flags...)
		if f.Limited {
			return FloorLimited(r, *r.Value, !inverse, f.Ratio)
		}
		v := value(f.Net.P)
		grow := 1.0
		if rest.U > 0 {
			grow = v / *r.Value * rest.P / f.Net.P * f.Net.U / rest.U
		}
		r.Value = &v
		for i := range r.Budget {
			r.Budget[i].U *= grow
		}
		rest = f.Net
	}
	return loopResidual(p, l, b, rest, fundamental, r, value)
}

// Floor puts a floored power into a result that is the root of the total
// power: value, growth of the budget's statistical part, flags and details,
// or the bound when the floor is too near.
func Floor(r analyze.Result, f Floored) analyze.Result {
	for k, v := range f.Details {
		r.Details[k] = v
	}
	r.Flags = append(r.Flags, f.Flags...)
	old := *r.Value
	if f.Limited {
		return FloorLimited(r, old, true, f.Ratio)
	}
	v := math.Sqrt(f.Net.P)
	for i := range r.Budget {
		if r.Budget[i].Kind == "A" {
			r.Budget[i].U = f.Net.U / (2 * v)
		} else {
			r.Budget[i].U *= v / old
		}
	}
	r.Value = &v
	return r
}
