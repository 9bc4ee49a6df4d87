package commonmode

import (
	"fmt"
	"math"
	"math/cmplx"

	"benchslip/analyze/internal/budget"
)

// The common-mode gain of a balanced input, turned so that its differential
// gain is real and positive, falls into three parts that tell their causes
// apart by phase and course over frequency:
//
//	c(f) = flat + j (rise f - fall/f)
//
// flat: legs of unequal ratio (resistors, the op-amp's own rejection), in phase
// or inverted. rise: unequal capacitances to ground, +20 dB a decade at +-90
// deg. fall: unequal coupling capacitors, -20 dB a decade at -+90 deg.

// parts is that model fitted to the points of a row.
type parts struct {
	flat, flatU float64 // V/V; standard uncertainties
	rise, riseU float64 // V/V a Hz
	fall, fallU float64 // V/V Hz
	// split: rise and fall were told apart; else the quadrature part of the only
	// frequency stands at hz.
	split      bool
	quad, at   float64 // quadrature part and its frequency where not split
	quadU      float64
	low, high  float64 // Hz, the points used
	gd         float64 // |differential gain| at the point nearest to 1 kHz
	quadAtHigh float64
}

// modelShare is how far a point may stray from the three parts, of its size:
// what the differential gain's own course and other poles leave.
const modelShare = 0.02

// turned is the common-mode gain with the differential one's phase taken off:
// what inverts or delays both alike is gone.
func (pt point) turned() complex128 {
	return pt.gc * cmplx.Rect(1, -cmplx.Phase(pt.gd))
}

// gcU is the standard uncertainty of each part of the common-mode gain.
func (pt point) gcU() float64 {
	u, _ := budget.Combine(pt.lines)
	return u / pt.value * cmplx.Abs(pt.gc)
}

func (pt point) good() bool { return pt.refusal == nil && pt.phases }

// near1k is the good point nearest to 1 kHz, where trims are made; -1: none.
func near1k(points []point) int {
	best := -1
	for i, pt := range points {
		if pt.good() && (best < 0 || math.Abs(math.Log(pt.hz/1000)) < math.Abs(math.Log(points[best].hz/1000))) {
			best = i
		}
	}
	return best
}

// partsOf fits the parts by weighted least squares; ok is false without a
// point whose phase is known.
func partsOf(points []point) (parts, bool) {
	mid := near1k(points)
	if mid < 0 {
		return parts{}, false
	}
	q := parts{gd: cmplx.Abs(points[mid].gd), low: math.Inf(1)}
	n := 0
	var w0, r0, sff, sii, sn, yf, yi float64
	for _, pt := range points {
		if !pt.good() {
			continue
		}
		n++
		c := pt.turned()
		v := math.Pow(pt.gcU(), 2) + math.Pow(modelShare*cmplx.Abs(c), 2)
		w, f := 1/v, pt.hz
		w0 += w
		r0 += w * real(c)
		sff += w * f * f
		sii += w / (f * f)
		sn += w
		yf += w * f * imag(c)
		yi += w * imag(c) / f
		q.low = math.Min(q.low, f)
		if f >= q.high {
			q.high, q.quadAtHigh = f, imag(c)
		}
	}
	q.flat, q.flatU = r0/w0, math.Sqrt(1/w0)
	if n < 2 || q.high < 3*q.low {
		pt := points[mid]
		q.quad, q.quadU, q.at = imag(pt.turned()), pt.gcU(), pt.hz
		return q, true
	}
	// imag = rise f - fall/f: normal matrix [sff -sn; -sn sii].
	det := sff*sii - sn*sn
	q.split = true
	q.rise, q.fall = (sii*yf-sn*yi)/det, -(sff*yi-sn*yf)/det
	q.riseU, q.fallU = math.Sqrt(sii/det), math.Sqrt(sff/det)
	return q, true
}

// at is the part's size at f.
func (q parts) quadrature(f float64) float64 {
	if !q.split {
		return q.quad
	}
	return q.rise*f - q.fall/f
}

// details of the parts, gains as V/V with sign, uncertainties expanded (k = 2).
func (q parts) details() map[string]any {
	d := map[string]any{"in_phase": q.flat, "in_phase_uncertainty": 2 * q.flatU}
	if q.split {
		d["rising_at_10khz"], d["rising_uncertainty"] = q.rise*1e4, 2*q.riseU*1e4
		d["falling_at_100hz"], d["falling_uncertainty"] = q.fall/100, 2*q.fallU/100
		return d
	}
	d["quadrature"], d["quadrature_uncertainty"], d["quadrature_hz"] = q.quad, 2*q.quadU, q.at
	return d
}

// Which parts matter: clear of their uncertainty, and at least a third of the
// whole at the end of the range where they are largest.
func (q parts) matters(part, u, whole float64) bool {
	return math.Abs(part) > 2*u && math.Abs(part) > whole/3
}

func (q parts) whole(f float64) float64 { return math.Hypot(q.flat, q.quadrature(f)) }

// opinions name the parts that matter.
func (q parts) opinions() []string {
	var out []string
	level := func(x float64) string { return fmt.Sprintf("%.1f dB", 20*math.Log10(math.Abs(x)/q.gd)) }
	mid := math.Sqrt(q.low * q.high)
	if q.matters(q.flat, q.flatU, q.whole(mid)) {
		phase := "in phase with the drive"
		if q.flat < 0 {
			phase = "inverted against the drive"
		}
		out = append(out, fmt.Sprintf("a common-mode part that does not depend on frequency, %s (%s re the differential gain): consistent with resistor ratios that differ between the legs; "+
			"to confirm, put 0.1 %% in series with one arm: the part moves by a known step", phase, level(q.flat)))
	}
	if !q.split {
		if q.matters(q.quad, q.quadU, q.whole(q.at)) {
			out = append(out, fmt.Sprintf("a common-mode part in quadrature (%s at %.4g Hz): consistent with unequal capacitances to ground or unequal coupling capacitors; "+
				"to confirm, measure at ten times and a tenth of the frequency: the first rises, the second falls with it", level(q.quad), q.at))
		}
		return out
	}
	if q.matters(q.rise*q.high, q.riseU*q.high, q.whole(q.high)) {
		side := "pin 2 (hot)"
		if q.rise > 0 {
			side = "pin 3 (cold)"
		}
		out = append(out, fmt.Sprintf("a common-mode part in quadrature that rises with frequency (%s at %.4g Hz): consistent with more capacitance to ground on the %s side (filter capacitors, layout, cable); "+
			"to confirm, hold a known small capacitor from the other pin to ground: the part shrinks", level(q.rise*q.high), q.high, side))
	}
	if q.matters(q.fall/q.low, q.fallU/q.low, q.whole(q.low)) {
		side := "pin 3 (cold)"
		if q.fall < 0 {
			side = "pin 2 (hot)"
		}
		out = append(out, fmt.Sprintf("a common-mode part in quadrature that falls with frequency (%s at %.4g Hz): consistent with unequal coupling capacitors, that of %s the smaller; "+
			"to confirm, put a like capacitor in parallel with it", level(q.fall/q.low), q.low, side))
	}
	return out
}
