package commonmode

import (
	"fmt"
	"math"
	"math/cmplx"

	"benchslip/analyze"
	"benchslip/capture/unit"
)

// A difference stage of one op-amp: R1 from pin 3 (cold) to the inverting
// input, R2 from the output back to it, R3 from pin 2 (hot) to the other input,
// R4 from that to 0 V. With a = R2/R1 and b = R4/R3
//
//	G_c = (b - a)/(1 + b),  G_d = [a + b (1 + a)/(1 + b)]/2
//
// so that small mismatches e = b/a - 1 give G_c = e a/(1 + a) and a rejection
// of (1 + a)/e.

// ratios are a and b of a stage that holds all the gain, from its two gains:
// a = |G_d| - Re G_c/2, b = (a + Re G_c)/(1 - Re G_c). It needs phases.
func (pt point) ratios() (a, b float64, ok bool) {
	if !pt.good() {
		return 0, 0, false
	}
	c := real(pt.turned())
	a = cmplx.Abs(pt.gd) - c/2
	if a <= 0 || c >= 1 {
		return 0, 0, false
	}
	return a, (a + c) / (1 - c), true
}

// mismatch is b/a - 1, signed, with its standard uncertainty.
func (pt point) mismatch() (e, u float64, ok bool) {
	a, b, ok := pt.ratios()
	if !ok {
		return 0, 0, false
	}
	// d(b/a)/dG_c = (1 + a)(1 + b)/... which is (1 + a)/a for a small G_c.
	return b/a - 1, pt.gcU() * (1 + a) / a, true
}

// stageOf reads the stated resistors; ok only where all four are.
func stageOf(q *analyze.Params) (r [5]float64, ok bool) {
	for i, v := range []*float64{q.R1, q.R2, q.R3, q.R4} {
		if v == nil || !(*v > 0) {
			return r, false
		}
		r[i+1] = *v
	}
	return r, true
}

// legOhms is the resistance that each leg shows to a common-mode drive: R1 +
// R2 and R3 + R4 of a stated stage, else 4 kohm, a low microphone input.
func legOhms(q *analyze.Params) float64 {
	if r, ok := stageOf(q); ok {
		return math.Min(r[1]*(1+r[4]/r[3]), r[3]+r[4])
	}
	return 4000
}

// fixtureLimit is the rejection (V/V) at which the fixture's own resistors,
// source/2 in each leg matched to source_match, stop the reading: unequal ones
// dR convert dR/Z.
func fixtureLimit(q *analyze.Params) (limit float64, ok bool) {
	if q.Source == nil || q.SourceMatch == nil {
		return 0, false
	}
	dr := q.Source.Value.Linear() * *q.SourceMatch // each of two source/2 off by match, opposite ways
	if dr <= 0 {
		return 0, false
	}
	return legOhms(q) / dr, true
}

// fixture prints how far the fixture itself lets the reading go.
func fixture(p *analyze.Pass) []string {
	limit, ok := fixtureLimit(p.Params)
	if !ok {
		return nil
	}
	return []string{fmt.Sprintf("fixture: two %.4g ohm resistors matched to %.3g %% stop the reading near %.1f dB at %.4g kohm a leg; printed, not applied",
		p.Params.Source.Value.Linear()/2, *p.Params.SourceMatch*100, dB.FromLinear(limit), legOhms(p.Params)/1000)}
}

func ohms(x float64) string { return unit.Format(x, unit.MustLookup("ohm"), math.Abs(x)/50) }

func farads(x float64) string { return unit.Format(x, unit.MustLookup("F"), math.Abs(x)/50) }

// trim is what would null the flat part: which arm, how many ohms, and what
// rejection to expect then. It stops where the mismatch is no larger than its
// uncertainty, or than what the fixture may make.
func trim(p *analyze.Pass, points []point, q parts) (text []string, details map[string]any) {
	r, ok := stageOf(p.Params)
	mid := near1k(points)
	if !ok || mid < 0 {
		return nil, nil
	}
	pt := points[mid]
	e, u, ok := pt.mismatch()
	if !ok {
		return nil, nil
	}
	a, _, _ := pt.ratios()
	U := 2 * u
	details = map[string]any{"mismatch": e, "mismatch_uncertainty": U, "at_hz": pt.hz}
	stated := r[2] / r[1]
	if math.Abs(math.Log(a/stated)) > math.Log(1.05) {
		return []string{fmt.Sprintf("no trim advice: the measured gain (R2/R1 = %.4g) is not that of the stated resistors (%.4g), so the stage does not hold all the gain", a, stated)}, details
	}
	fixed := 0.0 // mismatch that the fixture may pretend
	if limit, ok := fixtureLimit(p.Params); ok {
		fixed = (1 + a) / limit
	}
	switch {
	case math.Abs(e) <= U:
		return []string{fmt.Sprintf("no trim: the ratio mismatch of %+.2g %% is within its uncertainty of %.2g %%", 100*e, 100*U)}, details
	case math.Abs(e) <= fixed:
		return []string{fmt.Sprintf("no trim: the ratio mismatch of %+.2g %% is no more than the fixture's resistors may make (%.2g %%); match them better first", 100*e, 100*fixed)}, details
	}
	arm, series, shuntArm, shunt := "R2", e*r[2], "R4", r[4]/e
	if e < 0 {
		d := -e / (1 + e) // b (1 + d) = a
		arm, series, shuntArm, shunt = "R4", d*r[4], "R2", r[2]/d
	}
	// What is left: the mismatch's uncertainty, the quadrature part, the fixture.
	left := func(f float64) float64 {
		flat := U * a / (1 + a)
		c := math.Hypot(flat, q.quadrature(f)) / cmplx.Abs(pt.gd)
		if limit, ok := fixtureLimit(p.Params); ok {
			c += 1 / limit
		}
		return 1 / c
	}
	details["arm"], details["series_ohm"], details["shunt_arm"], details["shunt_ohm"] = arm, series, shuntArm, shunt
	details["expected_db"] = dB.FromLinear(left(pt.hz))
	s := fmt.Sprintf("trim: ratio mismatch (R4/R3)/(R2/R1) - 1 = %+.3g %%; add %s in series with %s, or put %s across %s; expect at least %.0f dB at %.4g Hz",
		100*e, ohms(series), arm, ohms(shunt), shuntArm, dB.FromLinear(left(pt.hz)), pt.hz)
	if q.high > 3*pt.hz {
		details["expected_db_at_top"] = dB.FromLinear(left(q.high))
		s += fmt.Sprintf(" and %.0f dB at %.4g Hz, where the quadrature part stays", dB.FromLinear(left(q.high)), q.high)
	}
	return []string{s + "; trim at 1 kHz or lower, then check at 10 to 20 kHz"}, details
}

// capacitors is what would null the rising part: on which side how many
// farads are missing. Across R4 a capacitance C turns b by -j w R4 C, across R2
// it turns a likewise; from a pin to ground behind R ohm it turns that leg by
// -j w R C.
func capacitors(p *analyze.Pass, q parts) (text []string, details map[string]any) {
	if !q.split || math.Abs(q.rise) <= 2*q.riseU || math.Abs(q.rise)*q.high < 0.1*q.whole(q.high) {
		return nil, nil
	}
	// Too much on the hot side makes the part negative: add on the cold one.
	pin, arm := "pin 3", "R2"
	if q.rise > 0 {
		pin, arm = "pin 2", "R4"
	}
	details = map[string]any{}
	slope := math.Abs(q.rise) / (2 * math.Pi) // V/V per rad/s
	var ways []string
	if r, ok := stageOf(p.Params); ok {
		a := r[2] / r[1]
		across := r[2]
		if arm == "R4" {
			across = r[4]
		}
		c := slope * (1 + a) / (a * across)
		details["across"], details["across_f"] = arm, c
		ways = append(ways, fmt.Sprintf("%s across %s", farads(c), arm))
	}
	if s := p.Params.Source; s != nil && s.Value.Linear() > 0 {
		c := slope / (q.gd * s.Value.Linear() / 2)
		details["pin"], details["pin_f"] = pin, c
		ways = append(ways, fmt.Sprintf("%s from %s to ground (behind %.4g ohm a leg)", farads(c), pin, s.Value.Linear()/2))
	}
	if len(ways) == 0 {
		return nil, nil
	}
	s := ways[0]
	if len(ways) > 1 {
		s += ", or " + ways[1]
	}
	return []string{"the rising quadrature part would be balanced by " + s}, details
}

// coupling says what unequal coupling capacitors would make the falling part:
// the capacitance of which a tenth is missing on one side.
func coupling(p *analyze.Pass, q parts) (text []string, details map[string]any) {
	r, ok := stageOf(p.Params)
	if !ok || !q.split || math.Abs(q.fall) <= 2*q.fallU || math.Abs(q.fall)/q.low < 0.1*q.whole(q.low) {
		return nil, nil
	}
	// |c| = G_d (dC/C)/(w R C): fall = G_d (dC/C)/(2 pi R C).
	leg := r[3] + r[4]
	c := 0.1 * q.gd / (2 * math.Pi * leg * math.Abs(q.fall))
	side := "pin 3"
	if q.fall < 0 {
		side = "pin 2"
	}
	return []string{fmt.Sprintf("the falling quadrature part is what coupling capacitors of %s make when that of %s is 10 %% smaller (into %.4g kohm a leg)", farads(c), side, leg/1000)},
		map[string]any{"smaller_side": side, "capacitor_f_at_10_percent": c}
}

// loading is what the stage itself makes of a source: its legs load a balanced
// source unequally, R1 against R3 + R4, and resistances in the legs add to R1
// and R3.
func loading(p *analyze.Pass) (text []string, details map[string]any) {
	r, ok := stageOf(p.Params)
	if !ok {
		return nil, nil
	}
	a := r[2] / r[1]
	// Ten ohms more in one leg turn a or b by 10/(R + source/2).
	rs := 0.0
	if s := p.Params.Source; s != nil {
		rs = s.Value.Linear() / 2
	}
	imbalance := (1 + r[2]/(r[1]+rs)) / (10 / (math.Min(r[1], r[3]) + rs))
	details = map[string]any{"hot_ohm": r[3] + r[4], "cold_ohm": r[1], "with_10_ohm_db": dB.FromLinear(imbalance)}
	text = append(text, fmt.Sprintf("the legs load a balanced source unequally: %s against %s to the cold one driven alone; 10 ohm more in one leg (IEC 60268-3, the worse of both) would leave about %.0f dB",
		ohms(r[3]+r[4]), ohms(r[1]), dB.FromLinear(imbalance)))
	if rs > 0 {
		e := (r[1]+rs)/(r[3]+rs)*(r[3]/r[1]) - 1
		details["source_mismatch"] = e
		if c := math.Abs(e) * a / (1 + a); c > 1e-6 {
			text = append(text, fmt.Sprintf("equal source resistors of %.4g ohm change the ratio mismatch by %+.2g %%, because R1 and R3 differ", rs, 100*e))
		}
	}
	return text, details
}
