package main

import (
	"errors"
	"fmt"
	"path/filepath"
	"slices"
	"strings"

	"github.com/spf13/cobra"
	"github.com/spf13/pflag"

	"benchslip/analyze"
	"benchslip/analyze/job"
	"benchslip/analyze/judge"
	"benchslip/analyze/keys"
	"benchslip/analyze/measures"
	"benchslip/analyze/run"
	"benchslip/analyze/slip"
	"benchslip/capture/unit"
	"benchslip/report"
	"benchslip/report/json"
)

func (a *app) measureCommand() *cobra.Command {
	cmd := &cobra.Command{
		Use:   "measure NAME FILE...",
		Short: "measure one thing without a job file",
		Long: `Measures one thing in each FILE, with the same engine and the same words as a job:
the keys of a check are options here. "benchslip measure NAME --help" says what
is measured, by which formula and standard, and lists the options.`,
		Example: "benchslip measure thdn takes/tone.wav --max \"0.02 %\"\nbenchslip measure gain takes/tone.wav --in 2 --at \"1042 Hz\"",
		// Options belong to the measure; an unknown measure is told first.
		FParseErrWhitelist: cobra.FParseErrWhitelist{UnknownFlags: true},
		RunE: func(cmd *cobra.Command, args []string) error {
			if len(args) == 0 {
				return usagef("measure: no measure named; see benchslip measure --help")
			}
			if near := unit.Nearest(args[0], measureNames()); near != "" {
				return usagef("measure: unknown measure %q; did you mean %q?", args[0], near)
			}
			return usagef("measure: unknown measure %q; benchslip measure --help lists them", args[0])
		},
	}
	for _, m := range measures.All() {
		cmd.AddCommand(a.oneMeasure(m))
	}
	return cmd
}

func measureNames() []string {
	var names []string
	for _, m := range measures.All() {
		names = append(names, m.Name)
	}
	return names
}

func (a *app) oneMeasure(m *analyze.Measure) *cobra.Command {
	use := m.Name + " FILE..."
	if !slices.Contains(m.Roles, "take") {
		use = m.Name
		for _, role := range m.Roles {
			use += " --" + dashed(role) + " FILE"
		}
	}
	o := &runOptions{}
	cmd := &cobra.Command{Use: use, Short: m.Title, Long: measureText(m)}
	cmd.RunE = func(cmd *cobra.Command, args []string) error {
		if err := o.check(cmd); err != nil {
			return err
		}
		if err := noStdin(cmd, args); err != nil {
			return err
		}
		opts := map[string]string{}
		cmd.Flags().Visit(func(f *pflag.Flag) {
			if k, ok := f.Annotations[keyOfOption]; ok {
				opts[k[0]] = f.Value.String()
			}
		})
		return a.measure(cmd, m, args, opts, o)
	}
	// Options are made for the measure that is asked about alone: all of
	// them together would be over a thousand.
	if slices.Contains(a.args, m.Name) {
		cmd.Flags().SortFlags = false
		cmd.Flags().BoolVar(&o.json, "json", false, "print takes and checks for a program instead")
		o.addWorkers(cmd)
		for _, k := range job.MeasureKeys(m.Name) {
			addKey(cmd, k)
		}
	}
	return cmd
}

// keyOfOption marks an option with the job key that it stands for.
const keyOfOption = "benchslip-key"

func addKey(cmd *cobra.Command, k job.MeasureKey) {
	name := dashed(k.Option)
	if cmd.Flags().Lookup(name) != nil {
		return
	}
	about := strings.ReplaceAll(k.Doc, "`", "")
	if len(k.Words) > 0 {
		about += ": " + strings.Join(k.Words, " ")
	}
	if k.Default != "" {
		about += " (default: " + strings.ReplaceAll(k.Default, "`", "") + ")"
	}
	cmd.Flags().String(name, "", about)
	f := cmd.Flags().Lookup(name)
	f.Annotations = map[string][]string{keyOfOption: {k.Option}, valueOf: {placeholder(k.Key)}}
}

// placeholder shows what a key's value looks like.
func placeholder(k keys.Key) string {
	switch k.Kind {
	case keys.Integer, keys.Number:
		return "N"
	case keys.Word:
		return "WORD"
	case keys.Quantity, keys.Quantities, keys.Uncertainty:
		if k.Unit != "" {
			return "\"N " + k.Unit + "\""
		}
		return "QUANTITY"
	case keys.Limit:
		return "QUANTITY"
	case keys.Range:
		return "\"A .. B\""
	case keys.Channels:
		return "CHANNEL"
	case keys.TakeRef, keys.Path:
		return "FILE"
	case keys.TakeRefs, keys.Paths:
		return "FILE,FILE"
	case keys.Date:
		return "DATE"
	}
	return "TEXT"
}

func dashed(key string) string { return strings.ReplaceAll(key, "_", "-") }

// measureText is the definition of a measure, from the measure itself.
func measureText(m *analyze.Measure) string {
	var b strings.Builder
	fmt.Fprintf(&b, "%s\n", m.Title)
	if m.Doc != "" {
		fmt.Fprintf(&b, "\n%s\n", strings.Join(report.Wrap(m.Doc, 80), "\n"))
	}
	for _, part := range [][2]string{{"formula", m.Formula}, {"standard", m.Standard}, {"unit", unitWords(m.Unit)}} {
		if part[1] != "" {
			lines := report.Wrap(part[1], 70)
			fmt.Fprintf(&b, "\n%-9s %s", part[0], strings.Join(lines, "\n          "))
		}
	}
	own := "those that every measure takes"
	if names := keys.Own(m.Name); len(names) > 0 {
		own = strings.Join(names, ", ") + ", and " + own
	}
	fmt.Fprintf(&b, "\n%-9s %s", "keys", strings.Join(report.Wrap(own, 70), "\n          "))
	return b.String()
}

func unitWords(symbol string) string {
	if symbol == "" {
		return "a plain count"
	}
	return symbol
}

// measure runs one measure and prints its rows.
func (a *app) measure(cmd *cobra.Command, m *analyze.Measure, args []string, opts map[string]string, o *runOptions) error {
	var paths []string
	for _, p := range args {
		paths = append(paths, filepath.ToSlash(p))
	}
	j, err := job.FromMeasure(m.Name, paths, opts, job.Options{AllowOutside: true, Headers: header})
	if err != nil {
		var list job.Errors
		if !errors.As(err, &list) {
			return err
		}
		for _, e := range list {
			text := e.Error()
			if !strings.HasPrefix(text, "measure ") {
				text = "measure " + m.Name + ": " + text
			}
			a.fault(errors.New(text))
		}
		return nil
	}
	bar := newProgress(a, false)
	s, err := run.Run(cmd.Context(), j, run.Options{Workers: o.workers, Version: version, FullScale: true, Progress: bar.step})
	bar.done()
	if err != nil {
		return err
	}
	lost := map[string]bool{}
	for _, t := range s.Takes {
		if t.Fault != "" {
			lost[t.Name] = true
			_, text := report.SplitReason(t.Fault)
			a.fault(errors.New(text))
		}
	}
	takes := slices.DeleteFunc(s.Takes, func(t slip.Take) bool { return lost[t.Name] })
	checks := slices.DeleteFunc(s.Checks, func(c slip.Check) bool {
		return slices.ContainsFunc(c.Takes, func(r slip.Role) bool { return lost[r.Name] })
	})
	if len(checks) == 0 {
		return nil
	}
	a.status = judge.Worse(a.status, judge.Exit(judge.Overall(checks)))
	if o.json {
		a.raw = true
		return json.Write(&a.out, struct {
			Format int          `json:"format"`
			Takes  []slip.Take  `json:"takes"`
			Checks []slip.Check `json:"checks"`
		}{1, takes, checks})
	}
	for i := range checks {
		a.printRow(report.RowOf(&checks[i], i+1, s.Rule))
	}
	return nil
}

// printRow prints one result in a few lines: the value first, then what it
// holds for, how it is judged, and what to mind.
func (a *app) printRow(r report.Row) {
	out := &a.out
	value := r.Value
	if r.Cover != "" {
		value += " (" + r.Cover + ")"
	}
	fmt.Fprintf(out, "%s: %s\n", r.Name, value)
	line := func(name, text string) {
		if text == "" {
			return
		}
		for i, l := range report.Wrap(text, 84) {
			if i > 0 {
				name = ""
			}
			fmt.Fprintf(out, "  %-9s %s\n", name, l)
		}
	}
	c := r.Check
	line("range", r.Wide)
	if r.Limits != "none" {
		text := r.Verdict + ", limits " + r.Limits
		if r.Margin != "" {
			text += ", margin " + r.Margin
		}
		line("verdict", text)
	}
	why := r.Say
	if r.Code != "" && c.Verdict != slip.Pass {
		why = r.Code + ": " + strings.TrimPrefix(why, r.Code)
	}
	line("why", strings.TrimSuffix(why, ": "))
	line("settle", r.Advice)
	line("for", report.Clean(strings.Join(c.Conditions, ", ")))
	line("largest", r.TwoLargest())
	if len(c.Unstated) > 0 {
		line("left out", report.Clean(strings.Join(c.Unstated, ", "))+" (not stated)")
	}
	pairs, tables := report.Details(c)
	var details []string
	for _, p := range pairs {
		details = append(details, p.Key+" "+p.Value)
	}
	line("details", strings.Join(details, ", "))
	for _, t := range tables {
		rows := append([][]string{t.Columns}, t.Rows...)
		fmt.Fprintf(out, "  %s\n%s", t.Name, columns(rows, "    "))
	}
	for _, f := range c.Flags {
		line("flag", flagText(f))
	}
	for _, n := range c.Notes {
		line("note", report.Clean(n))
	}
	for _, o := range c.Opinions {
		line("opinion", report.Clean(o))
	}
}
