package main

import (
	"bytes"
	"path/filepath"

	"github.com/spf13/cobra"

	"benchslip/analyze/job"
	"benchslip/analyze/plan"
	"benchslip/report/html"
	"benchslip/report/json"
	"benchslip/report/text"
)

func (a *app) planCommand() *cobra.Command {
	var asJSON, allowOutside bool
	var page string
	cmd := &cobra.Command{
		Use:   "plan JOB.toml",
		Short: "say which takes are still to record, and how",
		Long: `Says which takes a job still lacks, in the order in which to record them: what to
connect, what to play, the level to set, how long and why, and the cautions that
come before each step. Also what would make a check not measurable, while that
can still be changed.`,
		Example: "benchslip plan preamp.toml\nbenchslip plan preamp.toml --html plan.html",
		Args:    exactly(1, "one job"),
	}
	f := cmd.Flags()
	f.SortFlags = false
	f.BoolVar(&asJSON, "json", false, "print it for a program instead")
	f.StringVar(&page, "html", "", "write a page to print into `FILE`")
	f.BoolVar(&allowOutside, "allow-outside", false, "let takes lie outside the job's folder")
	cmd.RunE = func(cmd *cobra.Command, args []string) error {
		_, p, err := a.planOf(args[0], allowOutside)
		if p == nil || err != nil {
			return err
		}
		if page != "" {
			var b bytes.Buffer
			if err := html.Plan(&b, p); err != nil {
				return err
			}
			if err := notOver(page, args[0]); err != nil {
				return err
			}
			if err := writeFile(page, b.Bytes()); err != nil {
				return err
			}
		}
		if asJSON {
			a.raw = true
			return json.Write(&a.out, p)
		}
		return text.Plan(&a.out, p)
	}
	return cmd
}

// planOf loads a job and plans it; nil when the job itself is at fault, which
// has been told then.
func (a *app) planOf(path string, allowOutside bool) (*job.Job, *plan.Plan, error) {
	j, err := job.Load(path, job.Options{AllowOutside: allowOutside, Headers: header})
	if err != nil {
		a.jobFaults(err)
		return nil, nil, nil
	}
	return j, plan.Make(j, plan.Options{Header: header, Exists: isFile, Describes: describes}), nil
}

// notOver keeps an output from being written over an input.
func notOver(out string, inputs ...string) error {
	for _, in := range inputs {
		if filepath.Clean(out) == filepath.Clean(in) {
			return usagef("%s: is an input and is not written over; name another file", out)
		}
	}
	return nil
}
