package judge

import (
	"fmt"
	"math"
	"strings"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
	"benchslip/analyze/slip"
	"benchslip/capture/unit"
)

// explain adds what a reader of a row near its limit must know: the plain
// sentence, the reason where the uncertainty is to blame, and the cheapest
// thing that would settle the row.
func (r *row) explain(e estimate) {
	doubtful := e.verdict(FourWay)
	if doubtful != slip.ConditionalPass && doubtful != slip.ConditionalFail {
		return
	}
	r.Notes = append(r.Notes, r.boundary(e))
	if r.rule.Decision == Simple || r.rule.Decision == Guarded && !e.inside(e.y) {
		return
	}
	if e.tooWide() {
		r.Reason = fmt.Sprintf("uncertainty too large: the limits are %s apart, which is less than twice the uncertainty of %s",
			r.sizeText(r.size(*e.max-*e.min, e.y)), r.sizeText(*r.Uncertainty))
	}
	r.Advice = r.settle(e)
}

// boundary is the plain sentence of a row within its uncertainty of a limit.
func (r *row) boundary(e estimate) string {
	u := 0.0
	if r.Uncertainty != nil {
		u = *r.Uncertainty
	}
	s := fmt.Sprintf("measured %s, limit %s, uncertainty %s: ", unit.Format(*r.Value, r.view.unit, u), r.nearest(e), r.sizeText(u))
	p := chances(e.probability())
	switch {
	case r.rule.Decision == Guarded && e.inside(e.y):
		return s + "within the limit, but by less than the uncertainty, so the guarded rule fails it (" + p + " that it conforms)"
	case e.inside(e.y):
		return s + "passes, but not beyond doubt (" + p + ")"
	}
	return s + "fails, but not beyond doubt (" + p + " that it conforms)"
}

// nearest is the limit that decides, as typed.
func (r *row) nearest(e estimate) *unit.Quantity {
	switch {
	case e.min == nil:
		return r.lim.Max
	case e.max == nil:
		return r.lim.Min
	case math.Abs(*e.max-e.y) < math.Abs(e.y-*e.min):
		return r.lim.Max
	}
	return r.lim.Min
}

// chances puts a probability as "about 80 in 100".
func chances(p float64) string {
	switch n := math.Round(100 * p); {
	case n >= 100:
		return "over 99 in 100"
	case n <= 0:
		return "under 1 in 100"
	default:
		return fmt.Sprintf("about %.0f in 100", n)
	}
}

// settle names the cheapest thing that would settle an open row: the
// uncertainty that would do, and how to get there. Type A falls with the
// square root of a take's length; type B needs a better figure.
func (r *row) settle(e estimate) string {
	room := e.room()
	if math.Abs(room) <= e.slack(e.y) && e.low == e.high {
		return "the value lies on its limit, where no smaller uncertainty decides: adjust the unit, or agree on the limit"
	}
	if room <= 0 {
		return "the range that the take leaves open reaches across the limit: " + rangeAdvice(r.Measure)
	}
	goal := r.size(room, e.y)
	needs := "needs U <= " + r.goalText(floor2(goal)) + ": "
	var a float64
	var largest analyze.Contributor // of type B
	for _, l := range e.lines {
		if l.Kind == "A" {
			a = math.Hypot(a, l.U)
		} else if l.U > largest.U {
			largest = l
		}
	}
	// What type B leaves of the goal for type A to reach, squared; the factor
	// k is that of the rule, as longer takes have more degrees of freedom.
	rest := math.Max(0, e.u*e.u-a*a)
	left := room*room/(r.rule.Coverage*r.rule.Coverage) - rest
	switch {
	case len(e.lines) == 0:
		return "narrow the range: " + rangeAdvice(r.Measure)
	case left > 0 && r.seconds > 0 && r.seconds*a*a/left <= longestTake:
		return needs + "record " + duration(r.seconds*a*a/left)
	case left > 0 && a*a > rest:
		return fmt.Sprintf("%smean of %.0f takes under repeat", needs, math.Max(2, math.Ceil(a*a/left*(1-1e-9))))
	case a*a > rest:
		return needs + "a longer take and " + better(largest)
	}
	return needs + better(largest)
}

// goalText prints a step without the noughts that end its decimals.
func (r *row) goalText(x float64) string {
	number, symbol, _ := strings.Cut(r.sizeText(x), " ")
	if strings.Contains(number, ".") && !strings.ContainsAny(number, "eE") {
		number = strings.TrimRight(strings.TrimRight(number, "0"), ".")
	}
	return strings.TrimSpace(number + " " + symbol)
}

// room is the expanded uncertainty with which the estimate would be decided.
func (e estimate) room() float64 {
	room := math.Inf(1)
	if e.inside(e.y) {
		if e.max != nil {
			room = math.Min(room, *e.max-e.high)
		}
		if e.min != nil {
			room = math.Min(room, e.low-*e.min)
		}
		return room
	}
	if e.above(e.y, e.max) {
		return e.low - *e.max
	}
	return *e.min - e.high
}

// longestTake is the longest recording that anybody is asked for, s.
const longestTake = 1800

// duration prints a length that is long enough, in two figures.
func duration(s float64) string {
	if s = -floor2(-s); s < 120 {
		return fmt.Sprintf("%.3g s", s)
	}
	return fmt.Sprintf("%.0f min", math.Ceil(s/60))
}

// floor2 rounds down to two significant digits (up for negative numbers'
// size); 1e-9 keeps round figures.
func floor2(x float64) float64 {
	if x == 0 || !finite(x) {
		return x
	}
	p := math.Pow(10, math.Floor(math.Log10(math.Abs(x)))-1)
	return math.Floor(x/p*(1+math.Copysign(1e-9, x))) * p
}

// better says what would make a line of type B smaller.
func better(l analyze.Contributor) string {
	if name, ok := strings.CutPrefix(l.Source, "gear "); ok {
		if name, ok := strings.CutSuffix(name, " scale"); ok {
			name = strings.Replace(name, " channel ", ".channel.", 1)
			return "a better calibration: gear." + name + ".uncertainty is the largest part"
		}
	}
	if l.Name == "" {
		return "a better calibration"
	}
	return "a better figure for the largest part, " + l.Name
}

// rangeAdvice is how to narrow a range that the estimator leaves open.
func rangeAdvice(measure string) string {
	switch measure {
	case "pickup":
		return "record a mains reference on a second channel and name it in `mains`"
	case "thd", "harmonic", "thdn", "sinad":
		return "state `in` for the take and its `loop`, so that phases are known, or use a source 20 dB cleaner"
	}
	return "see the notes of the row"
}

// OffNominal gives measured minus expected in dB with the expanded uncertainty
// of that difference, for rows that fail or lie off their expected value by
// more than their uncertainty. Expected is the nominal value, else the typical
// one, else the middle of two limits. ok is false for all other rows, and for
// quantities that are not compared in dB (signed, or without a value).
func OffNominal(c *slip.Check, lim Limits) (dB, u float64, ok bool) {
	if c.Value == nil || c.Class == Info {
		return 0, 0, false
	}
	shown, err := unit.Lookup(c.Unit)
	if err != nil {
		return 0, 0, false
	}
	switch shown.Dim {
	case unit.Volt, unit.Ratio, unit.Watt, unit.FullScale, unit.VoltPerMetre, unit.VoltPerRootHertz:
	default:
		return 0, 0, false
	}
	want := lim.Nominal
	if want == nil {
		want = lim.Typical
	}
	var expected float64
	switch {
	case want != nil && want.Unit.Dim == shown.Dim:
		expected = want.Linear()
	case want == nil && c.Min != nil && c.Max != nil:
		expected = shown.ToLinear((*c.Min + *c.Max) / 2)
	}
	y := shown.ToLinear(*c.Value)
	if !(expected > 0 && y > 0) {
		return 0, 0, false
	}
	per := budget.DecibelsPer(shown.Dim)
	dB = per * math.Log(y/expected)
	if c.Uncertainty != nil {
		u = *c.Uncertainty
		if !shown.IsLog() {
			u = per * u / math.Abs(*c.Value)
		}
	}
	failing := c.Verdict == slip.Fail || c.Verdict == slip.ConditionalFail
	return dB, u, failing || math.Abs(dB) > u
}
