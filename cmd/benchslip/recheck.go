package main

import (
	"fmt"
	"path/filepath"

	"github.com/spf13/cobra"

	"benchslip/analyze/compare"
	"benchslip/report"
	"benchslip/report/renderers"
)

func (a *app) recheckCommand() *cobra.Command {
	o := &runOptions{quiet: false}
	var jobPath string
	cmd := &cobra.Command{
		Use:   "recheck SLIP.json",
		Short: "run a slip's job again and say whether it comes out the same",
		Long: `Hashes the takes again, runs the job again, and says "same", "same within
rounding", or which rows differ and whether takes, job, limits or the version
changed. Nothing is written. The job is looked for beside the slip's folder.

Exit status: 0 same, or same within rounding; 1 it differs; 2 it could not run.`,
		Example: "benchslip recheck slip/slip.json\nbenchslip recheck archive/slip.json --job preamp.toml",
		Args:    exactly(1, "one slip.json"),
	}
	f := cmd.Flags()
	f.SortFlags = false
	f.StringVar(&jobPath, "job", "", "the job `FILE`, where it does not lie beside the slip's folder")
	f.StringVar(&o.takeRoot, "takes", "", "the `DIR` that the takes lie in, for the slip of one of several units")
	f.BoolVar(&o.allowOutside, "allow-outside", false, "let takes lie outside the job's folder")
	o.addWorkers(cmd)
	cmd.RunE = func(cmd *cobra.Command, args []string) error {
		if err := o.check(cmd); err != nil {
			return err
		}
		s, before, err := compare.Read(args[0])
		if err != nil {
			return err
		}
		path := jobPath
		if path == "" {
			name := s.Job.File
			if name == "" || name != filepath.Base(filepath.FromSlash(name)) {
				return usagef("%s: names no job; name it with --job FILE", args[0])
			}
			dir, err := filepath.Abs(filepath.Dir(args[0]))
			if err != nil {
				return err
			}
			path = filepath.Join(filepath.Dir(dir), name)
			if !isFile(path) {
				return usagef("%s: its job %s does not lie beside its folder; name it with --job FILE", args[0], name)
			}
		}
		o.redact = s.Redacted
		if o.takeRoot != "" {
			o.unit = s.Unit[unitKey]
		}
		again, _, err := a.slipOf(cmd.Context(), path, o)
		if again == nil || err != nil {
			return err
		}
		built, err := renderers.Build(again)
		if err != nil {
			return err
		}
		for _, file := range built {
			if file.Name != mainFile {
				continue
			}
			r, err := compare.Recheck(before, file.Data)
			if err != nil {
				return fmt.Errorf("%s: %w", args[0], err)
			}
			a.printAgain(r)
		}
		return nil
	}
	return cmd
}

func (a *app) printAgain(r *compare.Again) {
	switch {
	case r.Same:
		fmt.Fprintln(&a.out, "same: every byte of slip.json, and with it every other file of the slip")
		return
	case r.Rounding:
		fmt.Fprintln(&a.out, "same within rounding: no number differs beyond it, and takes, job and limits are those of then")
		return
	}
	a.status = exitWorse
	switch n := len(r.Rows); n {
	case 0:
		fmt.Fprintln(&a.out, "no row differs, but what they rest on does")
	case 1:
		fmt.Fprintln(&a.out, "1 row differs")
	default:
		fmt.Fprintf(&a.out, "%d rows differ\n", n)
	}
	for _, l := range r.Rows {
		fmt.Fprintf(&a.out, "  row      %s\n", report.Clean(l))
	}
	for _, l := range r.Causes {
		fmt.Fprintf(&a.out, "  changed  %s\n", report.Clean(l))
	}
	if len(r.Causes) == 0 {
		fmt.Fprintln(&a.out, "  takes, job, limits and version are those of then: a fault of the program, or a slip that was edited")
	}
}
