// Package run executes a job: it opens the takes, runs the measure of every
// row, has it judged, and gives back the slip.
//
// The slip depends on the job and its takes alone. Takes and rows are worked
// on several at once, but every result has its place by index, and nothing is
// summed in the order in which workers happen to finish.
package run

import (
	"context"
	"runtime"
	"sync"

	"benchslip/analyze"
	"benchslip/analyze/doubt"
	"benchslip/analyze/intake"
	"benchslip/analyze/job"
	"benchslip/analyze/judge"
	"benchslip/analyze/measures"
	"benchslip/analyze/slip"
)

// Options of a run.
type Options struct {
	Workers int    // goroutines; 0: as many as the machine runs at once
	Version string // of the program, for the slip and its sheet number

	// FullScale lets volt measures of takes without a calibration give their
	// value in fractions of full scale, flagged. A job refuses them, unless
	// a limit is written in dBFS.
	FullScale bool

	// Progress is told after each step how many of all are done; it may be
	// called from several goroutines, one at a time.
	Progress func(done, all int, what string)

	// Measure finds a measure by its name; nil: the list of all measures.
	Measure func(name string) *analyze.Measure
}

// runner is one run.
type runner struct {
	job    *job.Job
	opt    Options
	stages *analyze.Stages

	findings map[*analyze.Take][]doubt.Finding // all flags of each take
}

// Run executes the job. A missing or unreadable take does not stop it: rows
// that read it say so. The error is that of ctx alone.
func Run(ctx context.Context, j *job.Job, opt Options) (*slip.Slip, error) {
	if opt.Workers <= 0 {
		opt.Workers = runtime.GOMAXPROCS(0)
	}
	if opt.Measure == nil {
		opt.Measure = measures.ByName
	}
	var rows []job.Row
	for _, c := range j.Checks {
		rows = append(rows, c.Rows()...)
	}
	tell := counter(opt.Progress, len(j.Takes)+len(rows))

	defer closeTakes(j.Takes)
	if err := openTakes(ctx, j.Takes, j.Date, opt, tell); err != nil {
		return nil, err
	}
	r := &runner{job: j, opt: opt, stages: analyze.NewStages()}
	if err := r.doubts(ctx, j.Takes, rows); err != nil {
		return nil, err
	}
	s := &slip.Slip{Format: 1, Tool: slip.Tool{Name: "benchslip", Version: opt.Version},
		Checks: make([]slip.Check, len(rows)), Takes: make([]slip.Take, len(j.Takes))}
	err := parallel(ctx, opt.Workers, len(rows), func(i int) {
		s.Checks[i] = r.check(rows[i])
		tell("measured " + rows[i].Name)
	})
	if err != nil {
		return nil, err
	}
	byGain(s.Checks, rows)
	r.compareSetups(s.Checks, rows)
	sayOnce(s.Checks)
	for i, t := range j.Takes {
		s.Takes[i] = intake.Entry(t)
	}
	about(s, j)
	s.Sheet = sheet(opt.Version, j, j.Takes)
	s.LimitsSHA256 = limitsHash(rows)
	s.Verdict = judge.Overall(s.Checks)
	s.Cautions = cautions(j)
	return s, nil
}

// counter counts finished steps for progress.
func counter(progress func(done, all int, what string), all int) func(what string) {
	if progress == nil {
		return func(string) {}
	}
	var mu sync.Mutex
	done := 0
	return func(what string) {
		mu.Lock()
		defer mu.Unlock()
		done++
		progress(done, all, what)
	}
}
