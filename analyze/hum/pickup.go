package hum

import (
	"fmt"
	"math"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
	"benchslip/analyze/stage"
	"benchslip/capture/recording"
)

var pickup = &analyze.Measure{
	Name:  "pickup",
	Title: "hum picked up by a cable run, a metre",
	Doc: "Hum that a run adds to its `baseline` (terminated at the receiver), over its `length` and, where stated, the gain to the receiver's input. With a mains " +
		"reference on a second channel of both takes (`mains`; an insulated wire laid beside a mains lead, nothing connected to the mains) the two subtract as " +
		"complex numbers, each order turned back by order times the phase of the reference's fundamental, block by block; what wandering phases may hide enters " +
		"the uncertainty. Without, the value is that of the larger at each order and the interval runs from the difference to the sum. Without `baseline` it " +
		"is the hum of the run over its length, flagged no-baseline. Orders count that stand out of the noise in either take. It assumes pick-up along the length.",
	Formula:  "U' = sqrt(sum_h |R_h - B_h|^2) / (length G)",
	Standard: "common practice",
	Unit:     "V/m",
	Roles:    []string{"take"},
	Keys:     []string{"length", "length_uncertainty", "baseline", "mains", "harmonics", "gain", "gain_take", "gain_uncertainty", "ref_level"},
	Run:      runPickup,
}

func runPickup(p *analyze.Pass) analyze.Result {
	s, bad := p.Signal("take", "out")
	if bad != nil {
		return analyze.RefuseWith(perMetre, bad)
	}
	if s.Unit != "V" {
		return analyze.Refuse(perMetre, analyze.Uncalibrated, fmt.Sprintf("take %q has no volts at full scale", s.Take.Name),
			"state full_scale_peak or full_scale_sine for its gear (benchslip calibrate finds it)")
	}
	if p.Params.Length == nil || !(p.Params.Length.Value.Linear() > 0) {
		return analyze.Refuse(perMetre, analyze.Unsupported, "pickup needs the length of the run", "state `length`")
	}
	length := p.Params.Length.Value.Linear()
	top := highest(p.Params)
	var baseSig *analyze.Signal
	if p.Has("baseline") {
		if baseSig, bad = p.Signal("baseline", "out"); bad == nil {
			bad = comparable(s, baseSig)
		}
		if bad != nil {
			return analyze.RefuseWith(perMetre, bad)
		}
	}
	run, bad := read(p, "take", s, top)
	if bad != nil {
		return analyze.RefuseWith(perMetre, bad)
	}
	c := run.sum(0, top, nil, nil)
	if bad := readable(run, c); bad != nil {
		return analyze.RefuseWith(perMetre, bad)
	}
	g, referred, bad := stage.InputGain(p)
	if bad != nil {
		return analyze.RefuseWith(perMetre, bad)
	}
	res := analyze.Result{Unit: perMetre}
	res.Details = map[string]any{"mains_hz": run.hz, "harmonics": list(run, c, g, referred, p.Params.RefLevel), "length_m": length,
		"span_s": spanOf(s), "run_setup": s.Take.Setup, "detector": "RMS"}
	res.Notes = append(res.Notes, "assumes pick-up along the length, not at one point: halve the run or move a loop of it to tell")
	if baseSig == nil {
		res.Flags = append(res.Flags, recording.Flag{Code: recording.NoBaseline, Take: s.Take.Name, Channel: s.Channel(),
			Message: "no baseline was named: the receiver's own hum is in the value"})
		if c.seen && c.P > 0 {
			v := math.Sqrt(c.P)
			perLength(&res, v, rmsBudget(run, v, c.Power), nil, s, g, p.Params.Length)
		} else {
			res.Refusal, res.Bound = belowDetection(run), &analyze.Bound{Upper: true, Value: run.bound(p, c) / g.G / length}
		}
	} else {
		base, bad := read(p, "baseline", baseSig, top)
		if bad != nil {
			return analyze.RefuseWith(perMetre, bad)
		}
		difference(p, &res, run, base, c, top, g)
	}
	if res.Bound != nil {
		res.Details["upper_bound"] = res.Bound.Value
	}
	if referred {
		res.Details["referred_to"], res.Details["gain_db"] = "receiver input", 20*math.Log10(g.G)
	} else {
		res.Details["referred_to"] = "recorder input"
		res.Notes = append(res.Notes, "at the recorder's input, not referred to the receiver's")
	}
	nominalOverLength(&res, p, s, length)
	run.describe(p, c, &res)
	return res
}

// difference fills in what the run adds to its baseline.
func difference(p *analyze.Pass, res *analyze.Result, run, base *reading, c comb, top int, g stage.Gain) {
	length := p.Params.Length.Value.Linear()
	a := add(run, base, top)
	a.details(res.Details, g.G)
	res.Details["baseline_setup"] = base.Sig.Take.Setup
	if len(a.orders) == 0 || a.phases && !a.seen {
		// What both may hold unseen, or what the difference may be, its range
		// of noise and of wander on top.
		b := a.value + 2*a.noise + a.lost + 2*a.driftU()
		if len(a.orders) == 0 {
			b = run.bound(p, c) + base.bound(p, base.sum(0, top, nil, nil))
		}
		res.Bound = &analyze.Bound{Upper: true, Value: b / g.G / length}
		res.Refusal = &analyze.Refusal{Code: analyze.BelowDetection,
			Text:   fmt.Sprintf("what take %q adds to take %q does not stand out of the noise", run.Sig.Take.Name, base.Sig.Take.Name),
			Advice: fmt.Sprintf("record %.3g s or more of both to lower the bound", 4*run.Sig.DurationS())}
		return
	}
	var b budget.Budget
	b.A("noise at the lines", a.noise, 0)
	b.B("phases that wander against the reference", budget.Rectangular(a.lost))
	b.B("level change of the mains reference", a.driftU())
	b.B("converter steps", stage.StepU(run.Lines))
	b.Scale(run.Sig, a.value)
	var interval *[2]float64
	if !a.phases {
		interval = &[2]float64{a.low, a.high}
		res.Notes = append(res.Notes, "phases not known ("+a.why+"): lay an insulated wire beside a mains lead and record it on a second channel of both takes")
	} else {
		res.Notes = append(res.Notes, "the wire of the mains reference is taken to lie alike in both takes")
	}
	perLength(res, a.value, b, interval, run.Sig, g, p.Params.Length)
	res.Opinions = append(res.Opinions, a.blame(run.Sig.Take.Name, base.Sig.Take.Name))
}

// perLength puts a voltage at the recorder over gain and length into a result.
func perLength(res *analyze.Result, v float64, own budget.Budget, interval *[2]float64, s *analyze.Signal, g stage.Gain, length *analyze.Stated) {
	x, b := stage.Refer(v, own, s, g)
	L := length.Value.Linear()
	x /= L
	for i := range b.Lines {
		b.Lines[i].U /= L
	}
	b.Stated("length of the run", length, -x)
	res.Value = &x
	if interval != nil {
		res.Interval = &[2]float64{interval[0] / g.G / L, interval[1] / g.G / L}
	}
	b.Into(res)
}

// nominalOverLength adds what the value means for the whole run: volts at the
// plane of the value, dBu, dB below the nominal level.
func nominalOverLength(res *analyze.Result, p *analyze.Pass, s *analyze.Signal, length float64) {
	if res.Value == nil || *res.Value <= 0 {
		return
	}
	v := *res.Value * length
	res.Details["whole_run_v"], res.Details["whole_run_dbu"] = v, dBu.FromLinear(v)
	if level, ok := nominal(p.Params.RefLevel, s); ok {
		res.Details["below_ref_db"] = 20 * math.Log10(level/v)
	}
}
