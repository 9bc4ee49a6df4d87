package response

import (
	"fmt"
	"math"
	"math/cmplx"

	"benchslip/analyze"
	"benchslip/analyze/internal/transfer"
)

var flatness = &analyze.Measure{
	Name:  "flatness",
	Title: "largest deviation of the response in a band",
	Doc: howFound + "The largest |20 lg|H/H(ref)|| over the tones in the band, or over all frequencies of a sweep or noise in it, ends of the band included; positive. " +
		"The stimulus has to cover the band within 5 %.",
	Formula:  "max over the band of |20 lg |H(f) / H(ref)||",
	Standard: "IEC 60268-3 (frequency response); AES17",
	Unit:     "dB",
	Roles:    []string{"take"},
	Keys:     []string{"band", "ref"},
	Run:      runFlatness,
}

// edge is how far a band's edge may lie from the stimulus' own, and the hair
// by which measured frequencies may miss nominal ones.
const (
	edge = 1.05
	hair = 1.001
)

func runFlatness(p *analyze.Pass) analyze.Result {
	c, ref, bad := found(p)
	if bad != nil {
		return analyze.RefuseWith(dB, bad)
	}
	band := p.Params.BandOr(20, 20000)
	if c.LowHz > band.Low*edge*hair || c.HighHz*edge*hair < band.High {
		return analyze.Refuse(dB, analyze.Bandwidth,
			fmt.Sprintf("take %q: the stimulus covers %.5g Hz to %.5g Hz, not the band %.5g Hz .. %.5g Hz", c.Out.Take.Name, c.LowHz, c.HighHz, band.Low, band.High),
			"play a stimulus that covers the band, or state a narrower one")
	}
	inside, out := within(c, band)
	r := analyze.Result{Unit: dB}
	describe(&r, c, ref)
	r.Details["band_hz"] = []float64{band.Low, band.High}
	if len(inside) == 0 || out > len(inside) {
		r.Refusal = &analyze.Refusal{Code: analyze.NotEnoughPoints,
			Text:   fmt.Sprintf("take %q: %d of %d frequencies in the band have no support", c.Out.Take.Name, out, out+len(inside)),
			Advice: "raise the level, or play the stimulus longer"}
		return r
	}
	if low, high := ends(inside); low > band.Low*edge*hair || high*edge*hair < band.High {
		r.Refusal = &analyze.Refusal{Code: analyze.NotEnoughPoints,
			Text: fmt.Sprintf("take %q: the frequencies that count reach from %.5g Hz to %.5g Hz, not over the band %.5g Hz .. %.5g Hz; %d in it have no support",
				c.Out.Take.Name, low, high, band.Low, band.High, out),
			Advice: "raise the level, or play longer steps"}
		return r
	}
	worst, plus, minus := inside[0], math.Inf(-1), math.Inf(1)
	for _, q := range inside {
		d := level(q.H) - level(ref.H)
		plus, minus = math.Max(plus, d), math.Min(minus, d)
		if math.Abs(d) > math.Abs(level(worst.H)-level(ref.H)) {
			worst = q
		}
	}
	v := cmplx.Abs(worst.H) / cmplx.Abs(ref.H)
	if v < 1 {
		v = 1 / v
	}
	r.Value = &v
	b := ratioBudget(c, worst, ref, v)
	b.Into(&r)
	r.Details["plus_db"], r.Details["minus_db"], r.Details["worst_hz"] = plus, minus, worst.Hz
	r.Notes = append(r.Notes, fmt.Sprintf("%+.4g dB to %+.4g dB in the band; the largest deviation lies at %.5g Hz", plus, minus, worst.Hz))
	if out > 0 {
		r.Conditional = fmt.Sprintf("%d of %d frequencies in the band have no support", out, out+len(inside))
	}
	return r
}

// ends are the lowest and the highest frequency of points.
func ends(points []transfer.Point) (low, high float64) {
	low = math.Inf(1)
	for _, q := range points {
		low, high = math.Min(low, q.Hz), math.Max(high, q.Hz)
	}
	return low, high
}

// within lists the points in a band that count, and how many do not. Curves
// that fill the band get its edges too.
func within(c *transfer.Curve, band analyze.Band) (inside []transfer.Point, out int) {
	for _, q := range c.Points {
		switch {
		case q.Hz < band.Low/hair || q.Hz > band.High*hair:
		case q.Used:
			inside = append(inside, q)
		default:
			out++
		}
	}
	if !c.Dense {
		return inside, out
	}
	for _, hz := range []float64{band.Low, band.High} {
		if hz < c.LowHz || hz > c.HighHz {
			continue
		}
		if q, bad := c.At(hz); bad == nil && q.Used {
			inside = append(inside, q)
		}
	}
	return inside, out
}
