// Package judge turns results into rows of the slip: value with expanded
// uncertainty in the unit people asked for, and a verdict under the rule that
// the job fixed beforehand.
//
// Everything is decided in the linear quantity behind a measure (V, V/V, Hz),
// into which limits are converted; decibels are for display only. So the
// verdict does not depend on the unit in which a limit is written.
//
// Conformity with uncertainty follows JCGM 106:2012 (probabilities, clause 7)
// and ILAC-G8:09/2019 (four verdicts with a guard band w = U).
package judge

import (
	"fmt"
	"math"
	"sort"
	"strings"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
	"benchslip/analyze/slip"
	"benchslip/capture/recording"
	"benchslip/capture/unit"
)

// Decision rules.
const (
	FourWay = "four-way" // guard band U on both sides of a limit; the default
	Guarded = "guarded"  // pass only beyond the guard band, else fail
	Simple  = "simple"   // the value against the limit
)

// Info is the class of rows that are shown and never judged.
const Info = "info"

// Limits of a row, as typed. Min and Max are of one unit; nil: not limited.
type Limits struct {
	Min, Max *unit.Quantity
	Typical  *unit.Quantity // printed, never judged
	Nominal  *unit.Quantity // what Min and Max were made from; for OffNominal
}

// limited reports whether there is anything to judge against.
func (l Limits) limited() bool { return l.Min != nil || l.Max != nil }

// unit is that of the limits.
func (l Limits) unit() unit.Unit {
	if l.Min != nil {
		return l.Min.Unit
	}
	return l.Max.Unit
}

// unguarded measures are signs and counts: they have no guard band, whatever
// their budget says.
func unguarded(measure string) bool { return measure == "polarity" || measure == "events" }

// Row fills the judged fields of a check from its result: everything from
// Value to Advice, Details and Figures, and appends to Flags, Opinions and
// Notes. It reads Measure, Class and Take, which the caller has set. seconds
// is the length of the take, for advice on longer ones; 0: none to give.
func Row(c *slip.Check, res analyze.Result, lim Limits, rule slip.Rule, seconds float64) {
	copyOver(c, res)
	for _, k := range append(append([]string(nil), res.Unstated...), res.Lacking...) {
		c.Unstated = once(c.Unstated, k)
	}
	v, problem := viewOf(res, lim)
	v.limits(c, lim)
	r := row{c, v, lim, rule, seconds, unguarded(c.Measure)}
	if rule.Coverage <= 0 {
		r.rule.Coverage = 2
	}
	c.Verdict = slip.NotJudged
	switch {
	case problem != nil && (res.Value != nil || len(res.Points) > 0):
		r.refused(problem, nil)
	case len(res.Points) > 0:
		r.points(res)
	case res.Value != nil:
		r.value(*res.Value, res.Interval, res.Budget)
	case res.Refusal != nil:
		b := res.Bound
		if problem != nil {
			b = nil // cannot be put into the limit's unit
		}
		r.refused(res.Refusal, b)
		r.ownBound(res)
	default:
		r.refused(fault("the measure gave neither a value nor a reason"), nil)
	}
	r.lacking(res)
	r.conditional(res.Conditional)
}

// fault is a defect of a measure, which must not look like a verdict.
func fault(text string) *analyze.Refusal {
	return &analyze.Refusal{Code: analyze.Unsupported, Text: text, Advice: "report this as a fault of the program"}
}

// row is a check being judged.
type row struct {
	*slip.Check
	view
	lim       Limits
	rule      slip.Rule
	seconds   float64
	unguarded bool
}

// judges reports whether a verdict is wanted.
func (r *row) judges() bool { return r.Class != Info && r.lim.limited() }

// value judges and shows a value (linear) with its range and budget.
func (r *row) value(y float64, interval *[2]float64, lines []analyze.Contributor) {
	e := r.estimate(y, interval, lines)
	if !usable(e.y, e.low, e.high, e.u) || !r.show(e) {
		r.Value, r.Uncertainty, r.Interval, r.Coverage, r.Contributors = nil, nil, nil, nil, nil
		r.refused(fault("the result or its uncertainty is not a number that can be printed"), nil)
		return
	}
	if !r.judges() {
		return
	}
	r.Verdict = e.verdict(r.rule.Decision)
	m, p := r.margin(e), e.probability()
	r.Margin, r.Probability = &m, &p
	r.explain(e)
}

// estimate reads a value and its budget as a range to be judged.
func (r *row) estimate(y float64, interval *[2]float64, lines []analyze.Contributor) estimate {
	e := estimate{y: y, low: y, high: y, nu: math.Inf(1), k: r.rule.Coverage}
	if interval != nil {
		e.low, e.high = math.Min(y, interval[0]), math.Max(y, interval[1])
	}
	if !r.unguarded {
		e.U, e.k, e.u, e.nu = budget.Expand(lines, r.rule.Coverage)
		e.U = math.Min(e.U, mostUsable) // few degrees of freedom under a large k
		e.lines = lines
	}
	e.min, e.max = r.linear(r.lim.Min), r.linear(r.lim.Max)
	return e
}

// mostUsable is far beyond any quantity of a bench and far from overflow.
const mostUsable = 1e200

func usable(xs ...float64) bool {
	for _, x := range xs {
		if !(math.Abs(x) <= mostUsable) {
			return false
		}
	}
	return true
}

// show writes value, uncertainty, interval and contributors in the row's
// unit; false when one is no usable number there.
func (r *row) show(e estimate) bool {
	if e.y <= 0 && r.view.unit.IsLog() {
		r.view = r.view.base()
		r.limits(r.Check, r.lim)
		r.Notes = append(r.Notes, fmt.Sprintf("shown in %s: zero and negative values have no level in dB", r.Unit))
	}
	x := r.number(e.y)
	r.Value, r.Coverage = &x, &e.k
	r.Uncertainty, r.Interval = r.uncertainty(e)
	for _, l := range e.lines {
		c := slip.Contributor{Name: l.Name, StandardUncertainty: r.size(l.U, e.y), Unit: r.Unit, Kind: l.Kind, Source: l.Source}
		if l.Dof > 0 && !math.IsInf(l.Dof, 0) {
			d := l.Dof
			c.Dof = &d
		}
		if !usable(c.StandardUncertainty) {
			return false
		}
		r.Contributors = append(r.Contributors, c)
	}
	sort.SliceStable(r.Contributors, func(i, j int) bool {
		return r.Contributors[i].StandardUncertainty > r.Contributors[j].StandardUncertainty
	})
	return usable(x) && (r.Uncertainty == nil || usable(*r.Uncertainty)) && (r.Interval == nil || usable(r.Interval[:]...))
}

// refused judges a row without a value: by its bound where it has one.
func (r *row) refused(why *analyze.Refusal, b *analyze.Bound) {
	r.Reason, r.Advice = why.Code+": "+why.Text, why.Advice
	r.Verdict = slip.NotMeasurable
	if why.Code == analyze.NotApplicable {
		r.Verdict = slip.NotApplicable
		return
	}
	if b == nil {
		return
	}
	if x := r.number(b.Value); usable(x) {
		r.Bound = &slip.Bound{Kind: kind(b), Value: x, Unit: r.Unit, Confidence: 0.95}
	}
	if r.judges() {
		r.Verdict = judgeBound(b, r.linear(r.lim.Min), r.linear(r.lim.Max))
		if r.Verdict == slip.Pass || r.Verdict == slip.Fail {
			r.Advice = ""
		}
	}
}

// ownBound repeats a bound in the measure's own unit in the details.
func (r *row) ownBound(res analyze.Result) {
	if res.Bound == nil {
		return
	}
	if x := res.Unit.FromLinear(res.Bound.Value); usable(x) {
		r.Details[kind(res.Bound)+"_bound"] = x
	}
}

func kind(b *analyze.Bound) string {
	if b.Upper {
		return "upper"
	}
	return "lower"
}

// lacking keeps a row from a full pass when an uncertainty that its value
// needs was never stated.
func (r *row) lacking(res analyze.Result) {
	keys := res.Lacking
	limited := r.lim.limited()
	for _, p := range res.Points {
		limited = limited || p.Limit != nil
	}
	if len(keys) == 0 || !limited || r.Value == nil && r.Bound == nil {
		return
	}
	what := strings.Join(keys, ", ")
	f := slip.Flag{Code: recording.UncertaintyUnstated, Message: "the uncertainty leaves out " + what + ", which is not stated"}
	if r.Take != nil {
		f.Take = *r.Take
	}
	r.Flags = append(r.Flags, f)
	if r.Verdict == slip.Pass && (r.rule.Decision == FourWay || r.rule.Decision == "") {
		r.Verdict = slip.ConditionalPass
		r.Advice = "state " + what
		if r.Reason == "" {
			r.Reason = fmt.Sprintf("%s: the value needs %s, which is not stated", f.Code, what)
		}
	}
}

// conditional keeps a row from a full pass for a reason that the measure
// gives: its value holds, but not beyond doubt. The other two rules know no
// state between pass and fail, so there the reason stands as a note.
func (r *row) conditional(why string) {
	if why == "" || !r.judges() || r.Verdict != slip.Pass {
		return
	}
	if r.rule.Decision == Simple || r.rule.Decision == Guarded {
		r.Notes = once(r.Notes, why)
		return
	}
	r.Verdict = slip.ConditionalPass
	if r.Reason == "" {
		r.Reason = why
	}
	if r.Advice == "" {
		r.Advice = rangeAdvice(r.Measure)
	}
}

// copyOver takes over what is not judged.
func copyOver(c *slip.Check, res analyze.Result) {
	details := map[string]any{}
	for k, v := range c.Details {
		details[k] = v
	}
	for k, v := range res.Details {
		details[k] = v
	}
	c.Details = details
	for _, f := range res.Flags {
		c.Flags = append(c.Flags, FlagOf(f))
	}
	c.Opinions = append(c.Opinions, res.Opinions...)
	c.Notes = append(c.Notes, res.Notes...)
	c.Figures = append(c.Figures, res.Figures...)
}

// FlagOf is a recording's flag as the slip holds it.
func FlagOf(f recording.Flag) slip.Flag {
	out := slip.Flag{Code: f.Code, Take: f.Take, Message: f.Message, FromS: f.FromS, ToS: f.ToS}
	if f.Channel > 0 {
		n := f.Channel
		out.Channel = &n
	}
	return out
}

// once appends s unless list holds it.
func once(list []string, s string) []string {
	for _, have := range list {
		if have == s {
			return list
		}
	}
	return append(list, s)
}

func finite(x float64) bool { return !math.IsNaN(x) && !math.IsInf(x, 0) }
