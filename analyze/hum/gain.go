package hum

import (
	"fmt"
	"math"

	"benchslip/analyze"
	"benchslip/capture/unit"
)

// leastApart is how far two gain settings must differ (dB) before they say
// where hum enters; agree is how near to one of the two answers hum must
// follow.
const (
	leastApart = 6.0
	agree      = 3.0
)

// beforeOrAfter compares the hum of a take with that of the one it is judged
// against, made at another gain setting (`where.gain` in both): hum that
// follows the gain enters before the gain stage, hum that stays enters after.
func beforeOrAfter(p *analyze.Pass, r *reading, c comb, res *analyze.Result) {
	other := p.Take("against")
	if other == nil || other == r.Sig.Take || !c.seen || c.P <= 0 {
		return
	}
	step, ok := gainStep(r.Sig.Take, other)
	if !ok {
		return
	}
	s, bad := p.SignalOf(other, "against", "out")
	if bad != nil {
		return
	}
	q, bad := read(p, "against", s, highest(p.Params))
	if bad != nil {
		return
	}
	d := q.sum(p.Params.Order, highest(p.Params), nil, nil)
	e := r.sum(p.Params.Order, highest(p.Params), nil, nil)
	if !d.seen || d.P <= 0 || e.P <= 0 || s.Unit != r.Sig.Unit {
		return
	}
	hum := 10 * math.Log10(e.P/d.P)
	res.Details["gain_step_db"], res.Details["hum_step_db"] = step, hum
	res.Details["enters"], _ = enters(step, hum)
	_, words := enters(step, hum)
	res.Opinions = append(res.Opinions, fmt.Sprintf("gain differs by %.1f dB between takes %s and %s, hum by %.1f dB: %s", step, r.Sig.Take.Name, other.Name, hum, words))
}

// gainStep is the difference of two takes' gain settings in dB.
func gainStep(a, b *analyze.Take) (float64, bool) {
	x, okA := a.Condition("gain")
	y, okB := b.Condition("gain")
	if !okA || !okB {
		return 0, false
	}
	p, errA := unit.Parse(x)
	q, errB := unit.Parse(y)
	if errA != nil || errB != nil || p.Unit.Dim != unit.Ratio || q.Unit.Dim != unit.Ratio || p.Linear() <= 0 || q.Linear() <= 0 {
		return 0, false
	}
	return 20 * math.Log10(p.Linear()/q.Linear()), true
}

// enters says where hum enters, from the step of the gain and that of the hum.
func enters(gainDB, humDB float64) (word, words string) {
	switch {
	case math.Abs(gainDB) < leastApart:
		return "unknown", fmt.Sprintf("settings at least %.0f dB apart are needed to tell where it enters", leastApart)
	case math.Abs(humDB-gainDB) <= agree:
		return "before", "consistent with hum that enters before the gain stage (cable, source, input wiring); to confirm, put 150 ohm in the input socket, then at the board"
	case math.Abs(humDB) <= agree:
		return "after", "consistent with hum that enters after the gain stage (output wiring, measuring gear, a loop through it); to confirm, " +
			"record on a battery or through a transformer in the output lead"
	case humDB*gainDB > 0 && math.Abs(humDB) < math.Abs(gainDB):
		return "both", "consistent with hum from both sides of the gain stage, or with a change between the takes; to confirm, add a take at a third setting"
	}
	return "unknown", "neither before nor after the gain stage explains it; something else changed between the takes, record both again"
}
