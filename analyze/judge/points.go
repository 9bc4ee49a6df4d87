package judge

import (
	"fmt"

	"benchslip/analyze"
	"benchslip/analyze/slip"
)

// worst ranks verdicts, the worst first.
var worst = []string{slip.Fail, slip.ConditionalFail, slip.NotMeasurable, slip.NotApplicable,
	slip.ConditionalPass, slip.Pass, slip.NotJudged}

func rank(verdict string) int {
	for i, v := range worst {
		if v == verdict {
			return i
		}
	}
	return len(worst)
}

// points judges each of several results of a row, by a limit of its own or by
// those of the row. The row shows the value the measure chose, else the
// smallest; its verdict is the worst of all points, whose reason and advice it
// takes over.
func (r *row) points(res analyze.Result) {
	judged := make([]slip.Check, len(res.Points))
	for i, p := range res.Points {
		one := slip.Check{Measure: r.Measure, Class: r.Class, Details: map[string]any{}}
		part := *r
		part.Check = &one
		var problem *analyze.Refusal
		if p.Limit != nil {
			part.lim = Limits{Max: p.Limit}
			part.view, problem = viewOf(res, part.lim)
		}
		part.limits(&one, part.lim)
		one.Verdict = slip.NotJudged
		switch {
		case problem != nil:
			part.refused(problem, nil)
		case p.Value != nil:
			part.value(*p.Value, nil, p.Budget)
			if p.Limit != nil && one.Verdict == slip.Fail && one.Reason == "" {
				one.Reason = fmt.Sprintf("%s: over its own limit of %s", p.Label, p.Limit)
			}
		case p.Refusal != nil:
			part.refused(p.Refusal, p.Bound)
		}
		judged[i] = one
	}
	main := mainPoint(res)
	switch {
	case res.Value != nil:
		r.value(*res.Value, res.Interval, res.Budget)
	case main >= 0 && res.Points[main].Value != nil:
		r.value(*res.Points[main].Value, nil, res.Points[main].Budget)
	case res.Refusal != nil:
		r.refused(res.Refusal, res.Bound)
		r.ownBound(res)
	case main >= 0:
		r.refused(res.Points[main].Refusal, res.Points[main].Bound)
		r.ownBound(analyze.Result{Unit: res.Unit, Bound: res.Points[main].Bound})
	}
	for i := range judged {
		j := &judged[i]
		judges := r.judges() || res.Points[i].Limit != nil && r.Class != Info
		if rank(j.Verdict) < rank(r.Verdict) && (judges || j.Verdict == slip.NotMeasurable) {
			r.Verdict, r.Advice = j.Verdict, j.Advice
			r.Reason = ""
			if j.Reason != "" {
				r.Reason = at(res.Points[i].Label, j.Reason)
			}
			for _, n := range j.Notes {
				r.Notes = once(r.Notes, res.Points[i].Label+": "+n)
			}
		}
	}
	r.Details["points"] = merged(r.Details["points"], res.Points, judged)
}

// at puts a point's label behind the code of its reason.
func at(label, reason string) string {
	for i := range reason {
		if reason[i] == ':' {
			return reason[:i+1] + " at " + label + reason[i:]
		}
	}
	return reason
}

// mainPoint is the point with the smallest value; without values, that with
// the loosest bound; without bounds, the first with a refusal; -1 for none.
func mainPoint(res analyze.Result) int {
	best := -1
	class := func(p analyze.Point) int {
		switch {
		case p.Value != nil:
			return 0
		case p.Refusal != nil && p.Bound != nil:
			return 1
		case p.Refusal != nil:
			return 2
		}
		return 3
	}
	for i, p := range res.Points {
		if class(p) == 3 {
			continue
		}
		if best < 0 || class(p) < class(res.Points[best]) {
			best = i
			continue
		}
		q := res.Points[best]
		switch {
		case class(p) != class(q):
		case p.Value != nil:
			if *p.Value < *q.Value {
				best = i
			}
		case p.Bound != nil:
			if p.Bound.Upper == q.Bound.Upper && (p.Bound.Value > q.Bound.Value) == p.Bound.Upper && p.Bound.Value != q.Bound.Value {
				best = i
			}
		}
	}
	return best
}

// merged adds the judgement of each point to the measure's own list in the
// details, or makes one.
func merged(own any, points []analyze.Point, judged []slip.Check) []map[string]any {
	entries := make([]map[string]any, len(points))
	given, _ := own.([]map[string]any)
	for i := range entries {
		e := map[string]any{"label": points[i].Label}
		if len(given) == len(points) {
			for k, v := range given[i] {
				e[k] = v
			}
		} else {
			e["unit"] = judged[i].Unit
			set(e, "value", judged[i].Value)
			set(e, "uncertainty", judged[i].Uncertainty)
		}
		e["verdict"] = judged[i].Verdict
		set(e, "margin", judged[i].Margin)
		if points[i].Limit != nil {
			e["limit"] = points[i].Limit.String()
		}
		set(e, "probability", judged[i].Probability)
		if b := judged[i].Bound; b != nil {
			e[b.Kind+"_bound"] = b.Value
		}
		if judged[i].Reason != "" {
			e["reason"] = judged[i].Reason
		}
		entries[i] = e
	}
	return entries
}

func set(e map[string]any, key string, x *float64) {
	if x != nil {
		e[key] = *x
	}
}
