package judge

import (
	"fmt"
	"math"
	"strings"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
	"benchslip/capture/recording"
	"benchslip/capture/unit"
)

// cell is one value with what belongs to it: a row's, or that of one of its
// points.
type cell struct {
	value    *float64
	budget   []analyze.Contributor
	interval *[2]float64
	bound    *analyze.Bound
	refusal  *analyze.Refusal
}

func cellOf(r analyze.Result) cell { return cell{r.Value, r.Budget, r.Interval, r.Bound, r.Refusal} }

func (c cell) into(r *analyze.Result) {
	r.Value, r.Budget, r.Interval, r.Bound, r.Refusal = c.value, c.budget, c.interval, c.bound, c.refusal
}

// Repeat is the mean of the results of two takes or more, named in order. The
// scatter between takes decides the type A part when it is larger than what
// the takes say of themselves:
//
//	u_A = max(s, RMS of the takes' u_A) / sqrt M
//
// with the degrees of freedom of the one used. Type B is common to all takes
// and does not shrink. A refused take refuses the mean, with the loosest bound
// where all takes have a value or a bound of one kind.
func Repeat(names []string, results []analyze.Result) analyze.Result {
	if len(results) == 1 {
		return results[0]
	}
	out := joined(names, results)
	cells := make([]cell, len(results))
	for i, r := range results {
		cells[i] = cellOf(r)
		if r.Unit.Dim != results[0].Unit.Dim {
			return analyze.RefuseWith(results[0].Unit, unlike(names[0], names[i]))
		}
	}
	if out.Unit.Dim == unit.Degree {
		unwrap(cells)
	}
	c := meanOf(names, cells)
	if c.value != nil && out.Unit.Dim == unit.Degree {
		*c.value -= 360 * math.Ceil((*c.value-180)/360)
	}
	c.into(&out)
	for i, p := range results[0].Points {
		cells = cells[:0]
		for _, r := range results {
			if len(r.Points) == len(results[0].Points) && r.Points[i].Label == p.Label {
				q := r.Points[i]
				cells = append(cells, cell{q.Value, q.Budget, nil, q.Bound, q.Refusal})
			}
		}
		if len(cells) != len(results) {
			out.Points = nil
			break
		}
		c := meanOf(names, cells)
		out.Points = append(out.Points, analyze.Point{Label: p.Label, Value: c.value, Budget: c.budget, Bound: c.bound, Refusal: c.refusal, Limit: p.Limit})
	}
	var values []float64
	for _, r := range results {
		if r.Value != nil {
			if x := r.Unit.FromLinear(*r.Value); finite(x) {
				values = append(values, x)
			}
		}
	}
	out.Details["repeat"] = map[string]any{"takes": names, "values": values, "details_of": names[0]}
	out.Notes = append(out.Notes, fmt.Sprintf("mean of %d takes: %s", len(names), strings.Join(names, ", ")))
	return out
}

// unwrap takes phases in degrees to the turn of the first, so that 179 and
// -179 have the mean 180.
func unwrap(cells []cell) {
	for i, c := range cells {
		if i == 0 || c.value == nil || cells[0].value == nil {
			continue
		}
		x := *c.value - 360*math.Round((*c.value-*cells[0].value)/360)
		cells[i].value = &x
	}
}

// joined starts a result from several: what describes the first, with the
// flags, opinions, notes and unstated figures of all.
func joined(names []string, results []analyze.Result) analyze.Result {
	out := analyze.Result{Unit: results[0].Unit, FullScaleSine: results[0].FullScaleSine,
		Figures: results[0].Figures, Details: map[string]any{}}
	for k, v := range results[0].Details {
		out.Details[k] = v
	}
	delete(out.Details, "points") // those of one take
	for _, r := range results {
		if r.FullScaleSine != out.FullScaleSine {
			out.FullScaleSine = 0
		}
		if out.Conditional == "" {
			out.Conditional = r.Conditional
		}
		for _, f := range r.Flags {
			out.Flags = addFlag(out.Flags, f)
		}
		for _, s := range r.Opinions {
			out.Opinions = once(out.Opinions, s)
		}
		for _, s := range r.Notes {
			out.Notes = once(out.Notes, s)
		}
		for _, s := range r.Unstated {
			out.Unstated = once(out.Unstated, s)
		}
		for _, s := range r.Lacking {
			out.Lacking = once(out.Lacking, s)
		}
	}
	return out
}

func addFlag(list []recording.Flag, f recording.Flag) []recording.Flag {
	for _, have := range list {
		if have.Code == f.Code && have.Take == f.Take && have.Channel == f.Channel && have.Message == f.Message {
			return list
		}
	}
	return append(list, f)
}

func unlike(a, b string) *analyze.Refusal {
	return &analyze.Refusal{Code: analyze.NotApplicable,
		Text:   fmt.Sprintf("takes %q and %q give values of different kinds (volts, full scale)", a, b),
		Advice: "use one gear entry for both"}
}

// meanOf averages cells.
func meanOf(names []string, cells []cell) cell {
	for i, c := range cells {
		if c.value == nil {
			return cell{refusal: because(names[i], c.refusal), bound: loosest(cells)}
		}
	}
	values := make([]float64, len(cells))
	ranged := false
	for i, c := range cells {
		values[i] = *c.value
		ranged = ranged || c.interval != nil
	}
	mean, scatter, dof := budget.TypeA(values)
	out := cell{value: &mean, budget: typeA(cells, scatter, dof)}
	out.budget = append(out.budget, common(cells)...)
	if ranged {
		out.interval = &[2]float64{}
		for _, c := range cells {
			lo, hi := ends(c)
			out.interval[0] += lo / float64(len(cells))
			out.interval[1] += hi / float64(len(cells))
		}
	}
	return out
}

// ends of a cell's own range: its value twice when it has none.
func ends(c cell) (lo, hi float64) {
	if c.interval != nil {
		return c.interval[0], c.interval[1]
	}
	return *c.value, *c.value
}

// because names the take in a refusal.
func because(take string, r *analyze.Refusal) *analyze.Refusal {
	if r == nil {
		r = fault("no value and no reason")
	}
	return &analyze.Refusal{Code: r.Code, Text: fmt.Sprintf("take %q: %s", take, r.Text), Advice: r.Advice}
}

// typeA is the statistical line of a mean of M cells: scatter = s/sqrt M
// against the RMS of their own u_A over sqrt M.
func typeA(cells []cell, scatter, dof float64) []analyze.Contributor {
	var own, quartic float64
	for _, c := range cells {
		var lines []analyze.Contributor
		for _, l := range c.budget {
			if l.Kind == "A" {
				lines = append(lines, l)
			}
		}
		u, nu := budget.Combine(lines)
		own = math.Hypot(own, u)
		quartic += u * u * u * u / nu
	}
	m := float64(len(cells))
	line := analyze.Contributor{Name: fmt.Sprintf("scatter of %d takes", len(cells)), Kind: "A", U: scatter, Dof: dof}
	if pooled := own / m; pooled > scatter { // RMS/sqrt M = root of the sum over M
		line = analyze.Contributor{Name: fmt.Sprintf("statistics of %d takes", len(cells)), Kind: "A", U: pooled}
		if quartic > 0 {
			line.Dof = math.Pow(own, 4) / quartic
		}
	}
	if line.U == 0 {
		return nil
	}
	return []analyze.Contributor{line}
}

// common averages the type B lines of cells, each matched by what it is: the
// same error in every take.
func common(cells []cell) []analyze.Contributor {
	var out []analyze.Contributor
	at := map[string]int{}
	for _, c := range cells {
		seen := map[string]int{}
		for _, l := range c.budget {
			if l.Kind == "A" {
				continue
			}
			id := "source " + l.Source
			if l.Source == "" {
				id = "name " + l.Name
			}
			seen[id]++
			id = fmt.Sprint(id, " ", seen[id])
			u := l.U / float64(len(cells))
			if l.Sign < 0 {
				u = -u
			}
			i, have := at[id]
			if !have {
				i = len(out)
				at[id] = i
				l.U = 0
				out = append(out, l)
			}
			out[i].U += u
		}
	}
	for i := range out {
		if out[i].U < 0 {
			out[i].U = -out[i].U
			out[i].Sign = -1
		} else if out[i].Source != "" {
			out[i].Sign = 1
		}
	}
	return out
}

// loosest is the bound that holds for the mean of cells when some have only a
// bound: the loosest of them and of the others' values with twice their
// standard uncertainty. nil when one has neither or the kinds differ.
func loosest(cells []cell) *analyze.Bound {
	var out *analyze.Bound
	for _, c := range cells {
		if c.value == nil && c.bound == nil || c.bound != nil && out != nil && c.bound.Upper != out.Upper {
			return nil
		}
		if c.bound != nil && out == nil {
			b := *c.bound
			out = &b
		}
	}
	if out == nil {
		return nil
	}
	for _, c := range cells {
		lo, hi := reach(c)
		if out.Upper {
			out.Value = math.Max(out.Value, hi)
		} else {
			out.Value = math.Min(out.Value, lo)
		}
	}
	return out
}

// reach is where a quantity may lie at 95 % and better: value with range and
// twice the standard uncertainty, or the bound on its side.
func reach(c cell) (lo, hi float64) {
	if c.value == nil {
		return c.bound.Value, c.bound.Value
	}
	u, _ := budget.Combine(c.budget)
	lo, hi = ends(c)
	return lo - 2*u, hi + 2*u
}
