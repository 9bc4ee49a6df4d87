package main

import (
	"context"
	"errors"
	"fmt"
	"path/filepath"
	"strings"

	"github.com/spf13/cobra"

	"benchslip/analyze/job"
	"benchslip/analyze/judge"
	"benchslip/analyze/run"
	"benchslip/analyze/slip"
	"benchslip/capture"
	"benchslip/report/renderers"
	"benchslip/report/text"
)

// runOptions are the options of the commands that run jobs.
type runOptions struct {
	out          string
	json, quiet  bool
	verbose      bool
	workers      int
	allowOutside bool

	units    string   // folder with a subfolder a unit
	takeRoot string   // folder that take paths are relative to; "" the job's
	unit     string   // name of the unit, of several
	redact   []string // fields to withhold
	bundle   bundleOptions
}

func (o *runOptions) addWorkers(cmd *cobra.Command) {
	cmd.Flags().IntVar(&o.workers, "workers", 0, "work on `N` things at once; the result is the same for any N (default: the processors)")
}

func (o *runOptions) check(cmd *cobra.Command) error {
	if o.workers < 0 || o.workers == 0 && cmd.Flags().Changed("workers") {
		return usagef("%s: --workers %d: at least 1 is needed", words(cmd), o.workers)
	}
	return nil
}

func (a *app) runCommand() *cobra.Command {
	o := &runOptions{}
	cmd := &cobra.Command{
		Use:   "run JOB.toml...",
		Short: "analyse the takes of a job, judge every check, write the slip",
		Long: `Analyses every take of a job, judges every check, and writes the slip: its files
lie in the folder "slip" beside the job, or in the one that --out names. Several
jobs get a folder each. A summary goes to stdout.

With --units, the job is run once for each subfolder of a folder, its takes' paths
relative to that: one slip a unit, and a summary of all.`,
		Example: "benchslip run preamp.toml\nbenchslip run preamp.toml --out /tmp/slip --json\nbenchslip run preamp.toml --units batch --out slips",
		Args:    files("job"),
	}
	f := cmd.Flags()
	f.SortFlags = false
	f.StringVarP(&o.out, "out", "o", "", "write the slip into `DIR`")
	f.BoolVar(&o.json, "json", false, "print slip.json to stdout instead of the summary")
	f.BoolVar(&o.quiet, "quiet", false, "print no summary and no progress")
	f.BoolVar(&o.verbose, "verbose", false, "print each step as it ends to stderr")
	f.BoolVar(&o.allowOutside, "allow-outside", false, "let takes lie outside the job's folder")
	f.StringVar(&o.units, "units", "", "run the job for each subfolder of `DIR`")
	f.StringSliceVar(&o.redact, "redact", nil, "withhold the texts of `FIELDS` of unit and record, like operator,customer")
	o.bundle.add(f)
	o.addWorkers(cmd)
	cmd.RunE = func(cmd *cobra.Command, args []string) error {
		if err := o.check(cmd); err != nil {
			return err
		}
		if err := o.bundle.check(len(args) > 1 || o.units != ""); err != nil {
			return err
		}
		if o.units != "" {
			return a.runUnits(cmd.Context(), args, o)
		}
		dirs, err := slipDirs(args, o.out)
		if err != nil {
			return err
		}
		for i, path := range args {
			if err := a.runJob(cmd.Context(), path, dirs[i], o); err != nil {
				return err
			}
		}
		return nil
	}
	return cmd
}

// slipDirs chooses the folder of each job's slip.
func slipDirs(jobs []string, out string) ([]string, error) {
	var dirs []string
	seen := map[string]string{}
	for _, path := range jobs {
		dir := out
		name := strings.TrimSuffix(filepath.Base(path), filepath.Ext(path))
		switch {
		case len(jobs) > 1 && out != "":
			dir = filepath.Join(out, name)
		case len(jobs) > 1:
			dir = filepath.Join(filepath.Dir(path), "slip-"+name)
		case out == "":
			dir = filepath.Join(filepath.Dir(path), "slip")
		}
		if first, twice := seen[filepath.Clean(dir)]; twice {
			return nil, usagef("run: %s and %s would both be written to %s; give the jobs names that differ", first, path, dir)
		}
		seen[filepath.Clean(dir)] = path
		dirs = append(dirs, dir)
	}
	return dirs, nil
}

// runJob runs one job and writes its slip. What is wrong with the job itself
// is told and makes the status 2; other jobs go on. An error ends all.
func (a *app) runJob(ctx context.Context, path, dir string, o *runOptions) error {
	_, err := a.runOne(ctx, path, dir, o)
	return err
}

// runOne is runJob that gives the slip; nil when the job is at fault.
func (a *app) runOne(ctx context.Context, path, dir string, o *runOptions) (*slip.Slip, error) {
	s, j, err := a.slipOf(ctx, path, o)
	if s == nil || err != nil {
		return nil, err
	}
	files, err := renderers.Build(s)
	if err != nil {
		return nil, err
	}
	var out []outFile
	for _, f := range files {
		out = append(out, outFile{f.Name, f.Data})
		if f.Name == mainFile && o.json {
			a.raw = true
			a.out.Write(f.Data)
		}
	}
	if err := ctx.Err(); err != nil {
		return nil, err
	}
	if err := (publisher{}).publish(dir, out); err != nil {
		return nil, err
	}
	if o.bundle.file != "" {
		if err := o.bundle.write(ctx, s, j, files, len(o.redact) > 0); err != nil {
			return nil, err
		}
	}
	a.status = judge.Worse(a.status, judge.Exit(s.Verdict))
	if o.json || o.quiet {
		return s, nil
	}
	if a.out.Len() > 0 {
		fmt.Fprintln(&a.out)
	}
	if err := text.Summary(&a.out, s); err != nil {
		return nil, err
	}
	fmt.Fprintf(&a.out, "\nslip %s written to %s\n", s.Sheet, filepath.ToSlash(dir))
	if o.bundle.file != "" {
		fmt.Fprintln(&a.out, o.bundle.done)
	}
	return s, nil
}

// slipOf loads and executes a job; nil when the job itself is at fault, which
// has been told then. Takes that could not be read are told as well.
func (a *app) slipOf(ctx context.Context, path string, o *runOptions) (*slip.Slip, *job.Job, error) {
	j, err := job.Load(path, job.Options{AllowOutside: o.allowOutside, Headers: header, TakeRoot: o.takeRoot})
	if err != nil {
		a.jobFaults(err)
		return nil, nil, nil
	}
	bar := newProgress(a, o.quiet)
	bar.each = o.verbose && !o.quiet
	s, err := run.Run(ctx, j, run.Options{Workers: o.workers, Version: version, Progress: bar.step})
	bar.done()
	if err != nil {
		return nil, nil, err
	}
	for _, t := range s.Takes {
		if t.Fault != "" {
			a.message("benchslip: %stake %s: %s", o.ofUnit(), t.Name, t.Fault)
		}
	}
	nameUnit(s, o.unit)
	if err := s.Redact(o.redact); err != nil {
		return nil, nil, usagef("run: --redact: %w", err)
	}
	return s, j, nil
}

// jobFaults tells every fault of a job in a line of its own that begins with
// its place.
func (a *app) jobFaults(err error) {
	a.status = exitFault
	var list job.Errors
	if !errors.As(err, &list) {
		a.message("benchslip: %v", err)
		return
	}
	for _, e := range list {
		a.message("%v", e)
	}
}

// header reads what a recording says about itself, for checking a job's
// channels against it.
func header(path string, opt capture.Options) (*capture.Info, error) {
	rec, err := capture.Open(path, opt)
	if err != nil {
		return nil, err
	}
	defer rec.Close()
	return rec.Info(), nil
}
