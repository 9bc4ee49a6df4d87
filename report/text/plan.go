package text

import (
	"fmt"
	"io"
	"strings"

	"benchslip/analyze/plan"
	"benchslip/report"
)

// Plan writes a plan: what comes first, then a step a take with its cautions
// before everything else of it.
func Plan(w io.Writer, p *plan.Plan) error {
	t := &page{}
	t.line("PLAN  ", report.Clean(titleOf(p)))
	t.line("", Progress(p))
	t.list("First", p.First)
	t.list("Gear", p.Gear)
	if len(p.Readings) > 0 {
		t.title("Meter readings, typed into the job")
		for _, r := range p.Readings {
			with := ""
			if r.With != "" {
				with = ", with " + r.With
			}
			t.line("  - ", report.Clean(fmt.Sprintf("%s: stands at %s%s", r.Name, r.Value, with)))
		}
	}
	for i := range p.Takes {
		t.step(i+1, &p.Takes[i])
	}
	_, err := io.WriteString(w, t.String())
	return err
}

func titleOf(p *plan.Plan) string {
	if strings.TrimSpace(p.Title) != "" {
		return p.Title
	}
	return p.Job
}

// Progress says in one sentence how much of a plan is done.
func Progress(p *plan.Plan) string {
	n := len(p.Takes)
	switch {
	case n == 0:
		return "The job names no takes."
	case p.Missing == 0:
		return fmt.Sprintf("All %d takes are there: benchslip run judges them.", n)
	}
	return fmt.Sprintf("%d of %d takes are missing.", p.Missing, n)
}

// step writes one take.
func (t *page) step(n int, k *plan.Take) {
	state := "there"
	switch {
	case k.Missing:
		state = "missing"
	case k.Fault != "":
		state = "cannot be read"
	}
	t.title(fmt.Sprintf("%d. %s (%s): %s", n, report.Clean(k.Name), report.Clean(k.Step), state))
	for _, c := range k.Cautions {
		t.line("  caution   ", report.Clean(c))
	}
	if k.Fault != "" {
		t.line("  fault     ", report.Clean(k.Fault))
	}
	for i, l := range k.Wiring {
		name := "  connect   "
		if i > 0 {
			name = "            "
		}
		t.line(name, report.Clean(l))
	}
	item := func(name, text string) {
		if text != "" {
			t.line(fmt.Sprintf("  %-9s ", name), report.Clean(text))
		}
	}
	item("set", strings.Join(k.Conditions, ", "))
	if k.Stimulus != "" {
		lack := ""
		if k.StimulusMissing {
			lack = " (not there yet: benchslip stimulus writes it)"
		}
		item("play", k.Stimulus+lack)
		item("", k.Signal)
	}
	item("drive", k.Source)
	item("level", k.Level)
	item("record", Recording(k))
	if k.Span != "" {
		item("span", Span(k))
	}
	for _, c := range k.Channels {
		item("channel", c.Channel+": "+c.What)
	}
	item("into", k.File)
	item("holds", k.Found)
	item("for", strings.Join(k.Checks, ", "))
	item("note", k.Note)
	for _, d := range k.Doubts {
		item("mind", d)
	}
}

// Span says which stretch of a take to state in the job.
func Span(k *plan.Take) string {
	return "the file begins and ends with silence: state span = \"" + k.Span +
		"\" for the take (recorder and player started together), or record only while it sounds"
}

// Recording says how long to record and at which rate, with the reason.
func Recording(k *plan.Take) string {
	var parts []string
	if k.LengthS != nil {
		s := report.Digits(*k.LengthS, 3) + " s"
		if *k.LengthS < 1 {
			s = report.Digits(*k.LengthS*1e3, 3) + " ms"
		}
		parts = append(parts, s)
	}
	if k.RateHz != nil {
		parts = append(parts, "at "+report.Digits(*k.RateHz/1000, 6)+" kHz, 24 bits, no processing")
	}
	text := strings.Join(parts, " ")
	if k.LengthWhy != "" {
		text += " (" + k.LengthWhy + ")"
	}
	return strings.TrimSpace(text)
}
