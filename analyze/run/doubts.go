package run

import (
	"context"
	"slices"

	"benchslip/analyze"
	"benchslip/analyze/doubt"
	"benchslip/analyze/job"
	"benchslip/capture/recording"
	"benchslip/capture/stimulus"
)

// doubts looks through every take that was opened, adds what it finds to the
// take's flags, and keeps all flags of each take as findings.
func (r *runner) doubts(ctx context.Context, takes []*analyze.Take, rows []job.Row) error {
	subjects := r.subjects(takes, rows)
	found := make([][]doubt.Finding, len(takes))
	err := parallel(ctx, r.opt.Workers, len(takes), func(i int) { found[i] = doubt.Flags(subjects[i]) })
	if err != nil {
		return err
	}
	r.findings = map[*analyze.Take][]doubt.Finding{}
	for i, t := range takes {
		var all []doubt.Finding
		for _, f := range t.Flags {
			all = append(all, doubt.Finding{Flag: f})
		}
		for _, f := range found[i] {
			t.Flags = append(t.Flags, f.Flag)
		}
		r.findings[t] = append(all, found[i]...)
	}
	return nil
}

// toned measures read a tone at the frequency that a check names with `at`.
var toned = []string{"gain", "phase", "polarity", "tone_frequency", "thd", "harmonic", "thdn", "sinad", "snr", "cmrr", "ein",
	"crosstalk", "balance", "output_impedance", "input_impedance", "max_output", "power", "clip_symmetry"}

// subjects says for each take which channels its rows read, and which tones
// the job names for it.
func (r *runner) subjects(takes []*analyze.Take, rows []job.Row) []doubt.Subject {
	out := make([]doubt.Subject, len(takes))
	at := map[*analyze.Take]*doubt.Subject{}
	for i, t := range takes {
		out[i] = doubt.Subject{Take: t, MainsHz: r.job.MainsHz, Stages: r.stages}
		at[t] = &out[i]
		if s, err := stimulus.Parse(t.Stimulus); err == nil && s.Kind == "tone" {
			out[i].Nominal = append(out[i].Nominal, s.AtHz...)
		}
	}
	for _, row := range rows {
		for _, role := range r.roles(row) {
			s := at[role.take]
			if s == nil || role.take.Rec == nil {
				continue
			}
			s.Channels = append(s.Channels, role.Channels...)
			ein := row.Check.Measure == "ein" && role.Name != "gain_take"
			if slices.Contains(toned, row.Check.Measure) && !ein && role.Name != "floor" {
				for _, hz := range row.Check.Params.At {
					if !slices.Contains(s.Nominal, hz) {
						s.Nominal = append(s.Nominal, hz)
					}
				}
			}
		}
	}
	return out
}

// role is a take as a row reads it.
type role struct {
	doubt.Role
	take *analyze.Take
	span *analyze.Span
}

// roles lists the takes that a row reads with what they are for.
func (r *runner) roles(row job.Row) []role {
	var out []role
	add := func(name string, t *analyze.Take) {
		w := t.Wiring.Over(row.Check.Params.Wiring)
		out = append(out, role{doubt.Role{Name: name, Channels: channelsOf(t, w)}, t, w.Span})
	}
	for _, t := range row.Main {
		add("take", t)
	}
	for _, l := range row.Check.Roles {
		if l.Name == "take" {
			continue
		}
		for _, t := range l.Takes {
			add(l.Name, t)
		}
	}
	if t := row.Check.Against; t != nil {
		add("against", t)
	}
	return out
}

// channelsOf lists the channels of a take that its wiring names.
func channelsOf(t *analyze.Take, w analyze.Wiring) []int {
	if t.Rec == nil {
		return nil
	}
	in := t.Rec.Info()
	var out []int
	for _, text := range []string{orOne(w.Out), w.In, w.Out2, w.Driven, w.Mains} {
		if text == "" {
			continue
		}
		plus, minus, err := analyze.ResolveChannel(text, in)
		if err != nil {
			continue
		}
		for _, c := range []int{plus, minus} {
			if c > 0 && !slices.Contains(out, c) {
				out = append(out, c)
			}
		}
	}
	return out
}

// bears reports whether a flag concerns the channels and the span of a role.
func (l role) bears(f recording.Flag) bool {
	return (f.Channel == 0 || slices.Contains(l.Channels, f.Channel)) && !apart(f, l.span)
}

// unfit refuses a row that a flag of one of its takes invalidates. A refusal
// of the measure's own stays, since it names the nearer reason.
func (r *runner) unfit(row job.Row, res analyze.Result) analyze.Result {
	if res.Refusal != nil && res.Bound == nil {
		return res
	}
	for _, l := range r.roles(row) {
		for _, f := range r.findings[l.take] {
			if !l.bears(f.Flag) {
				continue
			}
			bad := doubt.Unfit(row.Check.Measure, &row.Check.Params, l.Role, f)
			if bad == nil {
				continue
			}
			out := analyze.RefuseWith(res.Unit, bad)
			out.Details, out.Figures, out.Flags, out.FullScaleSine = res.Details, res.Figures, res.Flags, res.FullScaleSine
			return out
		}
	}
	return res
}
