package tone

import (
	"fmt"
	"math"
	"math/cmplx"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
	"benchslip/analyze/stage"
)

var thd = &analyze.Measure{
	Name:  "thd",
	Title: "total harmonic distortion",
	Doc: "Root of the summed powers of harmonics 2 to `harmonics` (10 unless stated) that lie inside the band, over the fundamental, or over the root of all " +
		"of them with reference = \"total\". Harmonics are fitted jointly with the fundamental; the noise's share in each is taken off. Needs five periods.",
	Formula:  "THD = sqrt(sum_h U_h^2) / U_1",
	Standard: "IEC 60268-3 (which refers it to the total; ours to the fundamental unless said)",
	Unit:     "%",
	Roles:    []string{"take"},
	Keys:     []string{"at", "band", "harmonics", "reference", "loop"},
	Run:      runTHD,
}

// inBand lists the harmonics 2..top of a tone inside a band's upper edge.
func inBand(l *stage.Lines, top int, high float64) []stage.Line {
	var set []stage.Line
	for _, q := range l.Harm {
		if q.Order >= 2 && q.Order <= top && q.Hz <= high*(1+1e-3) {
			set = append(set, q)
		}
	}
	return set
}

// sum of a set of lines: power, uncertainty, power read (shares not taken
// off), the shares, and whether any line is detected.
type sum struct {
	stage.Power
	read   float64
	shares []float64
	seen   bool
}

func add(set []stage.Line) sum {
	var s sum
	v := 0.0
	for _, q := range set {
		s.P += q.Power
		v += q.U * q.U
		s.read += q.Power + q.Share
		s.shares = append(s.shares, q.Share)
		s.seen = s.seen || detected(q, len(set))
	}
	s.U = math.Sqrt(v)
	return s
}

// detected: the reading of one line among n passes for noise in fewer than
// one in a thousand cases.
func detected(q stage.Line, n int) bool {
	return q.Power+q.Share > q.Share*math.Log(float64(n)/stage.FalseAlarm) && q.Power+q.Share > 0
}

func runTHD(p *analyze.Pass) analyze.Result {
	top := p.Params.Harmonics
	if top == 0 {
		top = 10
	}
	band := p.Params.BandOr(20, 20000)
	h, bad := stage.Listen(p, "take", top)
	if bad == nil {
		bad = h.Tone.FullPeriods(h.Out)
	}
	if bad != nil {
		return analyze.RefuseWith(percent, bad)
	}
	set := inBand(h.Lo, top, band.High)
	if len(set) == 0 {
		return analyze.Refuse(percent, analyze.Bandwidth,
			fmt.Sprintf("no harmonic of %.6g Hz lies below %.6g Hz and half the sample rate", h.Tone.Hz, band.High),
			"use a lower tone, a wider band or a higher sample rate")
	}
	s := add(set)
	p1 := h.Lo.Fundamental().Power
	ref := p1
	if p.Params.Reference == "total" {
		ref = p1 + math.Max(s.P, 0)
	}
	r := analyze.Result{Unit: percent}
	var b budget.Budget
	if s.P > 0 {
		v := math.Sqrt(s.P / ref)
		b.A("noise at the harmonics", s.U/(2*math.Sqrt(s.P*ref)), 0)
		b.B("converter steps", stage.StepU(h.Lo)/math.Sqrt2/math.Sqrt(ref))
		b.A("noise at the fundamental", v*stage.NoiseU(h.Lo), 0)
		r.Value = &v
	}
	finish(&r, &b, p, h)
	r.Details["harmonics"] = harmonicList(h.Lo, top, band.High)
	r.Details["band_hz"] = []float64{band.Low, band.High}
	r.Details["reference"] = p.Params.Reference
	if p.Params.Reference == "" {
		r.Details["reference"] = "fundamental"
	}
	overSteps(p, h, &r)
	if s.seen {
		r.Opinions = append(r.Opinions, clipping(h, math.Sqrt(math.Max(s.P, 0)/p1))...)
	}
	if !s.seen {
		r.Value, r.Budget = nil, nil
		bound, ok := budget.UpperBoundOf(s.read, s.shares, 0.95)
		if !ok {
			bound = budget.SumThreshold(s.shares, stage.FalseAlarm)
		}
		bound += stage.StepU(h.Lo)
		setBound(&r, bound/math.Sqrt(ref), analyze.BelowDetection,
			fmt.Sprintf("no harmonic of %.6g Hz stands out of the noise", h.Tone.Hz), longerTake(h))
	}
	if _, all, few := stage.FewCodes(h.Lo); few && s.P < all*all/2 {
		r.Value, r.Budget = nil, nil
		setBound(&r, math.Max(all/math.Sqrt2/math.Sqrt(ref), boundOf(r)), analyze.FloorLimited,
			fmt.Sprintf("the tone uses %.0f converter steps to its peak, whose own harmonics reach this far", cmplx.Abs(h.Lo.Phasor())/h.Out.Step),
			"use a converter with more bits, or more of its range")
	}
	return stage.LoopHarmonics(p, h.Lo, set, r, math.Sqrt(ref))
}

func boundOf(r analyze.Result) float64 {
	if r.Bound == nil {
		return 0
	}
	return r.Bound.Value
}

func setBound(r *analyze.Result, v float64, code, text, advice string) {
	r.Bound = &analyze.Bound{Upper: true, Value: v}
	r.Refusal = &analyze.Refusal{Code: code, Text: text, Advice: advice}
	r.Details["upper_bound"] = r.Unit.FromLinear(v)
}

func longerTake(h *stage.Heard) string {
	return fmt.Sprintf("record longer: %.3g s halve the bound", 4*h.Out.DurationS())
}

// harmonicList is details.harmonics, the fundamental first.
func harmonicList(l *stage.Lines, top int, high float64) []map[string]any {
	var list []map[string]any
	p1 := l.Fundamental().Power
	phase := cmplx.Phase(l.Phasor())
	for _, q := range l.Harm {
		if q.Order > max(top, 1) {
			break
		}
		e := map[string]any{"order": q.Order, "frequency_hz": q.Hz, "rms_v": q.RMS(), "relative_db": nil,
			"in_band": q.Hz <= high*(1+1e-3), "detected": detected(q, len(l.Harm)), "uncertainty_v": rmsU(q)}
		if q.Power > 0 {
			e["relative_db"] = 10 * math.Log10(q.Power/p1)
			turn := cmplx.Phase(q.Z) - float64(q.Order)*phase
			e["phase_deg"] = math.Remainder(turn, 2*math.Pi) * 180 / math.Pi
		}
		list = append(list, e)
	}
	return list
}

// rmsU is the standard uncertainty of a line's RMS.
func rmsU(q stage.Line) float64 {
	if q.Power > q.U {
		return q.U / (2 * math.Sqrt(q.Power))
	}
	return math.Sqrt(q.U / 2)
}

var harmonic = &analyze.Measure{
	Name:     "harmonic",
	Title:    "one harmonic against the fundamental",
	Doc:      "Level of the harmonic of `order` relative to the fundamental; the band does not matter, half the sample rate does.",
	Formula:  "20 lg(U_order / U_1)",
	Standard: "IEC 60268-3 (nth-order distortion, there re total)",
	Unit:     "dB",
	Roles:    []string{"take"},
	Keys:     []string{"at", "order", "loop"},
	Run:      runHarmonic,
}

func runHarmonic(p *analyze.Pass) analyze.Result {
	order := p.Params.Order
	if order == 0 {
		order = 2
	}
	h, bad := stage.Listen(p, "take", order)
	if bad != nil {
		return analyze.RefuseWith(dB, bad)
	}
	var q *stage.Line
	for i := range h.Lo.Harm {
		if h.Lo.Harm[i].Order == order {
			q = &h.Lo.Harm[i]
		}
	}
	if q == nil {
		return analyze.Refuse(dB, analyze.Bandwidth,
			fmt.Sprintf("harmonic %d of %.6g Hz lies above half the sample rate, or on another line", order, h.Tone.Hz),
			"record at a higher rate, or use a lower tone")
	}
	u1 := math.Sqrt(h.Lo.Fundamental().Power)
	r := analyze.Result{Unit: dB}
	var b budget.Budget
	if q.Power > 0 {
		v := math.Sqrt(q.Power) / u1
		b.A("noise at the harmonic", rmsU(*q)/u1, 0)
		b.B("converter steps", stage.StepU(h.Lo)/math.Sqrt2/u1)
		b.A("noise at the fundamental", v*stage.NoiseU(h.Lo), 0)
		r.Value = &v
	}
	finish(&r, &b, p, h)
	r.Details["harmonics"] = harmonicList(h.Lo, order, h.Out.RateHz/2)
	if !detected(*q, 1) {
		r.Value, r.Budget = nil, nil
		bound, ok := budget.UpperBound(q.Power+q.Share, q.Share, 1, 0.95)
		if !ok {
			bound = budget.ShareThreshold(q.Share, stage.FalseAlarm)
		}
		setBound(&r, (bound+stage.StepU(h.Lo))/u1, analyze.BelowDetection,
			fmt.Sprintf("harmonic %d does not stand out of the noise", order), longerTake(h))
	}
	if one, _, few := stage.FewCodes(h.Lo); few && q.Power < one*one/2 {
		r.Value, r.Budget = nil, nil
		setBound(&r, math.Max(one/math.Sqrt2/u1, boundOf(r)), analyze.FloorLimited,
			"the converter's own steps make harmonics this large", "use a converter with more bits, or more of its range")
	}
	return stage.LoopHarmonics(p, h.Lo, []stage.Line{*q}, r, u1)
}

var thdn = &analyze.Measure{
	Name:  "thdn",
	Title: "total harmonic distortion and noise",
	Doc: "RMS of all that is left in the band when the fundamental is taken out, over the RMS of everything in the band, DC left out. " +
		"Noise, hum, harmonics and other lines count; no weighting. The fundamental is removed by a fitted sine that follows slow drift, not by a notch " +
		"filter: a notch of Q 1.2 to 3 also takes 0.2 to 1.2 dB off the second harmonic.",
	Formula:  "THD+N = sqrt(P_total - P_fundamental) / sqrt(P_total)",
	Standard: "AES17 (THD+N), with a fitted sine in place of the notch",
	Unit:     "%",
	Roles:    []string{"take"},
	Keys:     []string{"at", "band", "floor", "loop"},
	Run:      func(p *analyze.Pass) analyze.Result { return runResidual(p, false) },
}

var sinad = &analyze.Measure{
	Name:     "sinad",
	Title:    "signal with noise and distortion over noise and distortion",
	Doc:      "The inverse of thdn in dB: everything in the band over what is left when the fundamental is taken out.",
	Formula:  "SINAD = -20 lg(THD+N)",
	Standard: "AES17",
	Unit:     "dB",
	Roles:    []string{"take"},
	Keys:     []string{"at", "band", "floor", "loop"},
	Run:      func(p *analyze.Pass) analyze.Result { return runResidual(p, true) },
}

func runResidual(p *analyze.Pass, inverse bool) analyze.Result {
	u := percent
	if inverse {
		u = dB
	}
	h, bad := stage.Listen(p, "take", 0)
	if bad == nil {
		bad = h.Tone.FullPeriods(h.Out)
	}
	var band stage.Band
	if bad == nil {
		band, bad = stage.BandFor(h.Out, p.Params.BandOr(20, 20000))
	}
	if bad != nil {
		return analyze.RefuseWith(u, bad)
	}
	f := h.Lo.Fundamental()
	if !band.InLine(f.Hz) {
		return analyze.Refuse(u, analyze.Bandwidth,
			fmt.Sprintf("the tone at %.6g Hz lies outside the band %.6g Hz .. %.6g Hz", f.Hz, band.Low, band.High), "state a band that holds the tone")
	}
	rest := stage.Residual(h.Lo, band)
	total := rest.P + f.Power
	r := analyze.Result{Unit: u}
	var b budget.Budget
	if rest.P > 0 {
		v := math.Sqrt(rest.P / total)
		du := rest.U / (2 * math.Sqrt(rest.P*total)) * f.Power / total
		if inverse {
			inv := 1 / v
			b.A("noise in the band", du*inv*inv, 0)
			r.Value = &inv
		} else {
			b.A("noise in the band", du, 0)
			r.Value = &v
		}
	}
	finish(&r, &b, p, h)
	r.Details["band_hz"] = []float64{band.Low, band.High}
	r.Details["method"] = "fitted sine, no notch filter; a notch of Q 1.2 to 3 reads up to 1.2 dB lower when the second harmonic dominates"
	r.Details["residual_v"] = math.Sqrt(math.Max(rest.P, 0))
	r.Details["total_v"] = math.Sqrt(total)
	r.Details["harmonics"] = harmonicList(h.Lo, 10, band.High)
	if band.Open {
		r.Details["lower_edge_resolved"] = false
		r.Notes = append(r.Notes, "the span is too short for the lower band edge: everything but DC up to the upper edge counts")
	}
	overSteps(p, h, &r)
	r.Opinions = append(r.Opinions, clipping(h, math.Sqrt(math.Max(rest.P, 0)/total))...)
	if r.Value == nil {
		setBound(&r, math.Sqrt(2*rest.U/total), analyze.BelowDetection, "nothing is left beside the tone", "none needed")
		if inverse {
			r.Bound = &analyze.Bound{Upper: false, Value: math.Sqrt(total / (2 * rest.U))}
		}
		return r
	}
	return stage.ResidualFloor(p, h.Lo, band, rest, f.Power, r, inverse)
}
