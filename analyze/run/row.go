package run

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"benchslip/analyze"
	"benchslip/analyze/doubt"
	"benchslip/analyze/job"
	"benchslip/analyze/judge"
	"benchslip/analyze/keys"
	"benchslip/analyze/slip"
	"benchslip/capture/recording"
	"benchslip/capture/unit"
)

// check measures and judges one row.
func (r *runner) check(row job.Row) slip.Check {
	c := row.Check
	out := slip.Check{
		Name: row.Name, Measure: c.Measure, Class: c.Class, Clause: c.Clause, Optional: c.Optional,
		Takes: []slip.Role{}, Contributors: []slip.Contributor{}, Unstated: []string{}, Flags: []slip.Flag{},
		Opinions: []string{}, Notes: []string{}, Conditions: []string{}, Details: map[string]any{},
		By: c.Params.With,
	}
	if c.Waiver != nil {
		out.Waiver = &slip.Waiver{By: c.Waiver.By, Why: c.Waiver.Why, Ticket: c.Waiver.Ticket}
	}
	for _, t := range row.Main {
		out.Takes = append(out.Takes, slip.Role{Role: "take", Name: t.Name})
	}
	for _, role := range c.Roles {
		if role.Name == "take" {
			continue // the row's own, above
		}
		for _, t := range role.Takes {
			out.Takes = append(out.Takes, slip.Role{Role: role.Name, Name: t.Name})
		}
	}
	if c.Against != nil {
		out.Takes = append(out.Takes, slip.Role{Role: "against", Name: c.Against.Name})
	}
	if len(row.Main) == 1 {
		name := row.Main[0].Name
		out.Take = &name
	}
	for _, t := range r.reads(row) {
		out.Flags = append(out.Flags, r.weakening(row, t)...)
	}
	res := r.unfit(row, r.result(row))
	if name := out.Take; name != nil {
		res.Flags = slices.Clone(res.Flags) // a stage may hold them too
		for i := range res.Flags {
			if res.Flags[i].Take == "" {
				res.Flags[i].Take = *name
			}
		}
	}
	rule := slip.Rule{Decision: r.job.Decision, Coverage: r.job.Coverage}
	lim := judge.Limits{Min: row.Limits.Min, Max: row.Limits.Max, Typical: row.Limits.Typical, Nominal: row.Limits.Nominal}
	judge.Row(&out, res, lim, rule, seconds(row))
	if dB, u, off := judge.OffNominal(&out, lim); off {
		out.Opinions = append(out.Opinions, doubt.MixUp(c.Measure, dB, u)...)
	}
	out.Flags = distinct(out.Flags)
	r.complete(&out, row)
	out.Conditions = append(out.Conditions, conditions(row, out.Details)...)
	return out
}

// reads lists the takes that a row reads, each once, the main ones first.
func (r *runner) reads(row job.Row) []*analyze.Take {
	list := append([]*analyze.Take(nil), row.Main...)
	for _, role := range row.Check.Roles {
		if role.Name != "take" {
			list = append(list, role.Takes...)
		}
	}
	if row.Check.Against != nil {
		list = append(list, row.Check.Against)
	}
	var once []*analyze.Take
	for _, t := range list {
		if !slices.Contains(once, t) {
			once = append(once, t)
		}
	}
	return once
}

// weakening lists the flags of a take that bear on a row: those of the whole
// take and of the channels that the row reads, within its span.
func (r *runner) weakening(row job.Row, t *analyze.Take) []slip.Flag {
	if t.Rec == nil {
		return nil
	}
	w := t.Wiring.Over(row.Check.Params.Wiring)
	l := role{take: t, span: w.Span}
	l.Channels = channelsOf(t, w)
	var out []slip.Flag
	for _, f := range t.Flags {
		if l.bears(f) {
			out = append(out, judge.FlagOf(f))
		}
	}
	return out
}

func orOne(out string) string {
	if out == "" {
		return "1"
	}
	return out
}

// apart reports whether a flag's place lies outside a span.
func apart(f recording.Flag, span *analyze.Span) bool {
	if span == nil || f.FromS == nil || f.ToS == nil {
		return false
	}
	return span.HasTo && *f.FromS >= span.To || span.HasFrom && *f.ToS < span.From
}

// distinct drops flags that say the same twice.
func distinct(flags []slip.Flag) []slip.Flag {
	type id struct {
		code, take, message string
		channel             int
	}
	seen := map[id]bool{}
	out := []slip.Flag{}
	for _, f := range flags {
		k := id{f.Code, f.Take, f.Message, 0}
		if f.Channel != nil {
			k.channel = *f.Channel
		}
		if !seen[k] {
			seen[k] = true
			out = append(out, f)
		}
	}
	return out
}

// result runs the measure of a row: once, or for each take of a repeat, and
// for the take that it is judged against.
func (r *runner) result(row job.Row) analyze.Result {
	c := row.Check
	own := unit.Unit{}
	if m, ok := keys.FindMeasure(c.Measure); ok {
		own = unit.MustLookup(m.Unit)
	}
	m := r.opt.Measure(c.Measure)
	if m == nil {
		return analyze.Refuse(own, analyze.Unsupported, fmt.Sprintf("this version cannot measure %s", c.Measure), "use a version that can")
	}
	if bad := unlike(row); bad != nil {
		return analyze.RefuseWith(own, bad)
	}
	one := func(mains ...*analyze.Take) analyze.Result {
		roles := row.Roles(mains...)
		if c.Against != nil { // for what two takes together tell, beside the difference
			roles["against"] = []*analyze.Take{c.Against}
		}
		res := m.Run(&analyze.Pass{Measure: m, Params: &c.Params, Roles: roles, MainsHz: r.job.MainsHz, Stages: r.stages})
		return r.calibrated(row, finite(res))
	}
	var res analyze.Result
	if len(c.Repeat) > 0 {
		results := make([]analyze.Result, len(c.Repeat))
		var each []string
		for i, t := range c.Repeat {
			results[i] = one(t)
			each = append(each, t.Name)
		}
		res = judge.Repeat(each, results)
	} else {
		res = one()
	}
	if c.Against != nil {
		res = judge.Against(c.Measure, [2]string{names(row.Main), c.Against.Name}, res, one(c.Against))
	}
	return res
}

// unlike refuses a row whose conditions are not those of the takes that its
// measure reads first. A condition that a take does not state is different.
func unlike(row job.Row) *analyze.Refusal {
	if len(row.Check.Where) == 0 {
		return nil
	}
	takes := append([]*analyze.Take(nil), row.Main...)
	if m, ok := keys.FindMeasure(row.Check.Measure); ok {
		for _, role := range row.Check.Roles {
			if role.Name != "take" && slices.Contains(m.Roles, role.Name) {
				takes = append(takes, role.Takes...)
			}
		}
	}
	for _, t := range takes {
		for _, want := range row.Check.Where {
			have, stated := t.Condition(want.Key)
			if stated && sameCondition(have, want.Value) {
				continue
			}
			text := fmt.Sprintf("the check holds for %s = %s, take %q was made with %s", want.Key, want.Value, t.Name, have)
			if !stated {
				text = fmt.Sprintf("the check holds for %s = %s, take %q does not state %s", want.Key, want.Value, t.Name, want.Key)
			}
			return &analyze.Refusal{Code: analyze.NotApplicable, Text: text, Advice: "name a take that was made so, or correct its `where`"}
		}
	}
	return nil
}

// sameCondition compares quantities by value, all else as text.
func sameCondition(a, b string) bool {
	a, b = strings.TrimSpace(a), strings.TrimSpace(b)
	if a == b {
		return true
	}
	p, err1 := unit.Parse(a)
	q, err2 := unit.Parse(b)
	if err1 != nil || err2 != nil || p.Unit.Dim != q.Unit.Dim {
		return false
	}
	x, y := p.Linear(), q.Linear()
	return math.Abs(x-y) <= 1e-9*math.Max(math.Abs(x), math.Abs(y))
}

// finite turns a value that is no number, which a measure should have refused
// itself, into a refusal.
func finite(res analyze.Result) analyze.Result {
	if res.Value == nil || !math.IsNaN(*res.Value) && !math.IsInf(*res.Value, 0) {
		return res
	}
	bad := analyze.RefuseWith(res.Unit, &analyze.Refusal{Code: analyze.Impossible, Text: "the estimate has no finite value", Advice: "look at the take"})
	bad.Details, bad.Flags = res.Details, res.Flags
	return bad
}

// fullScale lists the dimensions of takes that nobody put into volts.
var fullScale = []unit.Dim{unit.FullScale, unit.FullScalePerRootHertz, unit.FullScalePerSecond}

// inDBFS lists the measures whose uncalibrated results are levels.
var inDBFS = []string{"level", "noise", "hum", "max_output"}

// calibrated refuses a result in fractions of full scale where volts are
// wanted. A limit against full scale is judged by it, and a single measure
// shows it, with a flag.
func (r *runner) calibrated(row job.Row, res analyze.Result) analyze.Result {
	if !slices.Contains(fullScale, res.Unit.Dim) {
		return res
	}
	if lim := row.Limits; lim.Any() || row.Check.Params.MaxEach != nil {
		return res // the limit's unit decides
	}
	if r.opt.FullScale {
		if slices.Contains(inDBFS, row.Check.Measure) {
			res.Unit = unit.MustLookup("dBFS")
		}
		f := recording.Flag{Code: recording.Uncalibrated, Message: "no volts at full scale are known; dBFS is relative to the RMS of a full-scale sine"}
		res.Flags = append(slices.Clip(res.Flags), f)
		return res
	}
	return analyze.Refuse(unit.MustLookup(ownSymbol(row.Check.Measure)), analyze.Uncalibrated,
		"no volts at full scale are known for the take", "state full_scale_peak or full_scale_sine for its gear, or write a limit in dBFS")
}

func ownSymbol(measure string) string {
	m, _ := keys.FindMeasure(measure)
	return m.Unit
}

// first is the take that a row reads first; nil for entered readings.
func first(row job.Row) *analyze.Take {
	if len(row.Main) > 0 {
		return row.Main[0]
	}
	if m, ok := keys.FindMeasure(row.Check.Measure); ok && len(m.Roles) > 0 {
		for _, role := range row.Check.Roles {
			if role.Name == m.Roles[0] && len(role.Takes) > 0 {
				return role.Takes[0]
			}
		}
	}
	return nil
}

// seconds is the length of what a row reads of its first take, for advice on
// longer ones; 0 where there is none.
func seconds(row job.Row) float64 {
	from, to, ok := stretch(row)
	if !ok {
		return 0
	}
	return to - from
}

// stretch is the part of the first take that a row reads, in s on the take's
// own time axis.
func stretch(row job.Row) (from, to float64, ok bool) {
	t := first(row)
	if t == nil || t.Rec == nil {
		return 0, 0, false
	}
	in := t.Rec.Info()
	a, b, bad := analyze.Frames(t, t.Wiring.Over(row.Check.Params.Wiring).Span)
	if bad != nil || in.RateHz <= 0 {
		return 0, 0, false
	}
	return in.StartS + float64(a)/in.RateHz, in.StartS + float64(b)/in.RateHz, true
}

// complete adds the details that every row of its kind has and the measure
// itself did not give.
func (r *runner) complete(c *slip.Check, row job.Row) {
	p := &row.Check.Params
	add := func(key string, v any) {
		if _, ok := c.Details[key]; !ok {
			c.Details[key] = v
		}
	}
	if p.Band != nil {
		add("band_hz", []float64{p.Band.Low, p.Band.High})
	}
	if p.Weighting != "" {
		add("weighting", p.Weighting)
	}
	if w, ok := c.Details["weighting"].(string); ok && w == "" {
		c.Details["weighting"] = "none"
	}
	if from, to, ok := stretch(row); ok && len(row.Main) < 2 {
		add("span_s", []float64{from, to})
	}
	if t := first(row); t != nil && t.Rec != nil && !inVolts(t, p) {
		c.Details = inFS(c.Details).(map[string]any)
	}
}

// inVolts reports whether the signal that a row reads first is in volts.
func inVolts(t *analyze.Take, p *analyze.Params) bool {
	in := t.Rec.Info()
	plus, minus, err := analyze.ResolveChannel(orOne(t.Wiring.Over(p.Wiring).Out), in)
	if err != nil {
		return true
	}
	return analyze.NewSignal(t, plus, minus, 0, in.Frames, 1).Unit == "V"
}

// inFS names what it is: measures call voltages rms_v and the like, and on a
// take that nobody put into volts those are fractions of full scale, rms_fs.
func inFS(v any) any {
	switch x := v.(type) {
	case map[string]any:
		out := make(map[string]any, len(x))
		for k, e := range x {
			if base, ok := strings.CutSuffix(k, "_v"); ok && base != "" {
				k = base + "_fs"
			}
			out[k] = inFS(e)
		}
		return out
	case []map[string]any:
		out := make([]map[string]any, len(x))
		for i, e := range x {
			out[i] = inFS(e).(map[string]any)
		}
		return out
	}
	return v
}
