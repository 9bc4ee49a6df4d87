// Package response holds the measures of a unit over frequency: response,
// flatness, corners and delay, from sweeps, stepped tones, multitones, steady
// noise or pulses. The transfer function itself is found once a take by
// package transfer; here it becomes values with budgets.
//
// All values are ratios of one channel pair at two frequencies (or
// frequencies and times), so calibrations and the match of the channels
// cancel; what is left is noise, the time base, and the skew of the channels.
package response

import (
	"fmt"
	"math"
	"math/cmplx"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
	"benchslip/analyze/internal/transfer"
	"benchslip/capture/recording"
	"benchslip/capture/unit"
)

var (
	dB     = unit.MustLookup("dB")
	hertz  = unit.MustLookup("Hz")
	second = unit.MustLookup("s")
)

// Measures lists the measures of this package.
func Measures() []*analyze.Measure {
	return []*analyze.Measure{response, flatness, cornerLow, cornerHigh, delay}
}

const howFound = "The stimulus is recognised on the take's `in` channel (exponential sweep, stepped tones with short silences, multitone, steady noise, pulses), " +
	"or stated with `stimulus` for a take of one channel, against which clock offset and delay are then found and removed. "

var response = &analyze.Measure{
	Name:  "response",
	Title: "gain at one frequency relative to a reference frequency",
	Doc: howFound + "Of steps and tones the nearest within 1/24 octave of `at` counts, and the nearest within half an octave of `ref` (1 kHz unless stated); " +
		"sweeps and noise are interpolated in lg f. Frequencies that noise hides are left out and listed.",
	Formula:  "20 lg |H(at) / H(ref)|, H = output / input",
	Standard: "IEC 60268-3 (frequency response); AES17",
	Unit:     "dB",
	Roles:    []string{"take"},
	Keys:     []string{"at", "ref"},
	Run:      runResponse,
}

// refHz is the frequency that others are related to.
func refHz(p *analyze.Pass) float64 {
	if p.Params.Ref != nil {
		return *p.Params.Ref
	}
	return 1000
}

// found is the curve of the pass's take with its reference point.
func found(p *analyze.Pass) (*transfer.Curve, transfer.Point, *analyze.Refusal) {
	c, bad := transfer.Of(p, p.Take("take"), "take")
	if bad != nil {
		return nil, transfer.Point{}, bad
	}
	r, bad := c.Ref(refHz(p))
	return c, r, bad
}

func runResponse(p *analyze.Pass) analyze.Result {
	if len(p.Params.At) == 0 {
		return analyze.Refuse(dB, analyze.NotEnoughPoints, "no frequency is stated", "state `at`")
	}
	c, ref, bad := found(p)
	if bad != nil {
		return analyze.RefuseWith(dB, bad)
	}
	q, bad := c.At(p.Params.At[0])
	if bad != nil {
		return analyze.RefuseWith(dB, bad)
	}
	r := analyze.Result{Unit: dB}
	describe(&r, c, ref)
	r.Details["at_hz"] = q.Hz
	if !q.Used {
		unsupported(&r, c, q, ref)
		return r
	}
	v := cmplx.Abs(q.H) / cmplx.Abs(ref.H)
	r.Value = &v
	b := ratioBudget(c, q, ref, v)
	b.Into(&r)
	r.Details["phase_deg"] = c.PhaseDeg(q)
	return r
}

// ratioBudget is the budget of v = |H(q)/H(ref)|.
func ratioBudget(c *transfer.Curve, q, ref transfer.Point, v float64) budget.Budget {
	var b budget.Budget
	if q.Hz == ref.Hz {
		return b
	}
	addPoint(&b, c, "", q, v)
	addPoint(&b, c, " at the reference", ref, v)
	// A clock off by d reads both responses at frequencies off by d.
	b.Clock(c.Out, v*(c.LogSlope(q.Hz)-c.LogSlope(ref.Hz)))
	return b
}

func addPoint(b *budget.Budget, c *transfer.Curve, where string, q transfer.Point, value float64) {
	b.A("noise"+where, q.U*value, q.Dof)
	b.B("converter steps"+where, q.StepU*value)
	b.B(modelName(c)+where, q.ModelU*value)
}

// modelName says what a point's ModelU stands for.
func modelName(c *transfer.Curve) string {
	if c.Dense {
		return "resolution of the stimulus"
	}
	return "settling of the step"
}

// unsupported says why a point has no value, and what can be said instead.
func unsupported(r *analyze.Result, c *transfer.Curve, q, ref transfer.Point) {
	r.Refusal = &analyze.Refusal{Code: analyze.NotEnoughPoints,
		Text:   fmt.Sprintf("take %q: %.6g Hz has no support (%s)", c.Out.Take.Name, q.Hz, q.Why),
		Advice: "raise the level, or play the stimulus longer"}
	if q.Share <= 0 || q.H == 0 {
		return
	}
	r.Refusal.Code = analyze.BelowDetection
	upper, ok := budget.UpperBound(abs2(q.H), q.Share, 1, 0.95)
	if !ok {
		upper = budget.ShareThreshold(q.Share, 1e-3)
	}
	v := upper / cmplx.Abs(ref.H)
	r.Bound = &analyze.Bound{Upper: true, Value: v}
	r.Details["upper_bound"] = dB.FromLinear(v)
}

func abs2(z complex128) float64 { return real(z)*real(z) + imag(z)*imag(z) }

// describe puts what every measure of a curve tells into a result.
func describe(r *analyze.Result, c *transfer.Curve, ref transfer.Point) {
	d := map[string]any{
		"stimulus":    c.Kind,
		"covered_hz":  []float64{c.LowHz, c.HighHz},
		"delay_s":     c.DelayS,
		"ref_hz":      ref.Hz,
		"ref_gain_db": level(ref.H),
		"points":      points(c, ref),
	}
	r.Details = d
	left := len(c.Points) - len(c.Used())
	d["left_out"] = left
	if left > 0 {
		r.Notes = append(r.Notes, fmt.Sprintf("%d of %d frequencies have no support and are left out", left, len(c.Points)))
	}
	r.Notes = append(r.Notes, fmt.Sprintf("phases are given after a common delay of %.6g us was removed", c.DelayS*1e6))
	switch c.Kind {
	case transfer.Steps:
		r.Notes = append(r.Notes, "each step is used without its first fifth and its last 20 ms")
	case transfer.Sweep:
		r.Notes = append(r.Notes, "harmonic responses of the sweep are fitted apart and not counted")
	}
	if c.Stated {
		d["clock_ppm"], d["clock_uncertainty_ppm"], d["stimulus_start_s"] = c.ClockPPM, 2*c.ClockU, c.StartS
		r.Notes = append(r.Notes, fmt.Sprintf("found against the stated stimulus: the player ran %+.3g ppm against the recorder and began at %.6g s; "+
			"the responses of player and recorder are in the result", c.ClockPPM, c.StartS))
		if math.Abs(c.ClockPPM) > clockDoubt {
			r.Flags = append(r.Flags, recording.Flag{Code: recording.RateDoubt,
				Message: fmt.Sprintf("player and recorder differ by %.0f ppm; crystals stay within %d ppm", c.ClockPPM, clockDoubt)})
		}
	}
	r.Figures = append(r.Figures, gainFigure(c, ref), phaseFigure(c))
}

// clockDoubt is how far two clocks may differ before a sample rate is in
// doubt, ppm (common practice: crystals are good to 100).
const clockDoubt = 500

// level is 20 lg|h|; very low for 0.
func level(h complex128) float64 { return 20 * math.Log10(math.Max(cmplx.Abs(h), 1e-15)) }

// points is details.points.
func points(c *transfer.Curve, ref transfer.Point) []map[string]any {
	groups := c.GroupDelays()
	list := make([]map[string]any, 0, len(c.Points))
	for i, q := range c.Points {
		e := map[string]any{"frequency_hz": q.Hz, "used": q.Used, "gain_db": nil, "phase_deg": nil, "relative_db": nil}
		if q.H != 0 {
			e["gain_db"], e["phase_deg"], e["relative_db"] = level(q.H), c.PhaseDeg(q), level(q.H)-level(ref.H)
		}
		if q.Used {
			u := 2 * budget.RSS(q.U, q.StepU, q.ModelU)
			skew := 0.0 // deg; of two channels only
			if !c.Stated {
				skew = 2 * 360 * q.Hz * c.Out.Gear.Skew
			}
			e["uncertainty_db"], e["uncertainty_deg"] = budget.DecibelsPer(unit.Ratio)*u, math.Hypot(u*180/math.Pi, skew)
			e["coherence"], e["group_delay_s"] = q.Coherence, groups[i]
		} else {
			e["why"] = q.Why
		}
		if q.ToS > q.FromS {
			e["from_s"], e["to_s"] = q.FromS, q.ToS
		}
		list = append(list, e)
	}
	return list
}
