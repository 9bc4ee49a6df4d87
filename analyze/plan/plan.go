// Package plan says what is still to be recorded for a job: the takes in a
// sensible order, each with its wiring, the file to play, the level to set, how
// long to record and why, and the cautions that come before it. It also says
// what would make a check not measurable while that can still be changed.
//
// A plan reads the job and the headers of files that are there already. It
// reads no sample and no clock.
package plan

import (
	"errors"
	"fmt"
	"io/fs"
	"path/filepath"
	"sort"
	"strings"

	"benchslip/analyze"
	"benchslip/analyze/job"
	"benchslip/capture/recording"
)

// Plan is what to do for a job, in order. It is what `plan --json` prints:
// keys are added, none is renamed.
type Plan struct {
	Format   int       `json:"format"` // 1
	Title    string    `json:"title"`
	Job      string    `json:"job"`      // base name of the job file
	Missing  int       `json:"missing"`  // takes still to record
	First    []string  `json:"first"`    // what comes before everything else
	Readings []Reading `json:"readings"` // rows typed in by hand
	Takes    []Take    `json:"takes"`    // one a take, in the order of recording
	Gear     []string  `json:"gear"`     // what to mind about the gear
}

// Reading is a row that someone reads off a meter.
type Reading struct {
	Name  string `json:"name"`
	Value string `json:"value"` // as typed
	With  string `json:"with"`
}

// Take is one recording to make.
type Take struct {
	Name            string    `json:"name"`
	File            string    `json:"file"`
	Missing         bool      `json:"missing"`
	Fault           string    `json:"fault"` // the file is there and cannot be read
	Found           string    `json:"found"` // what is there: format, rate, length
	Step            string    `json:"step"`  // which part of the work this is
	Setup           string    `json:"setup"`
	Gear            string    `json:"gear"`
	Conditions      []string  `json:"conditions"` // "gain = 40 dB"
	Cautions        []string  `json:"cautions"`   // before anything is connected
	Wiring          []string  `json:"wiring"`     // lines of a drawing
	Channels        []Channel `json:"channels"`
	Stimulus        string    `json:"stimulus"` // file to play, relative to the job's folder; "" nothing is played
	StimulusMissing bool      `json:"stimulus_missing"`
	Signal          string    `json:"signal"` // what is in it, in the words of `stimulus`
	Source          string    `json:"source"` // what else drives the unit: "a square wave from a generator"
	Level           string    `json:"level"`  // what to set
	Span            string    `json:"span"`   // to state for the take, when recording and playing start together; "" the whole
	LengthS         *float64  `json:"length_s"`
	LengthWhy       string    `json:"length_why"`
	RateHz          *float64  `json:"rate_hz"` // to record at
	Checks          []string  `json:"checks"`  // rows that read it
	Doubts          []string  `json:"doubts"`  // what would make a row not measurable
	Note            string    `json:"note"`

	rank, index int
}

// Channel is what goes to one channel of the recording.
type Channel struct {
	Channel string `json:"channel"` // as the job names it
	Key     string `json:"key"`     // "out", "in", ...
	What    string `json:"what"`
}

// Options of making a plan.
type Options struct {
	// Header reads a file's header. nil: no file is looked at, every take is
	// taken as missing.
	Header func(path string, opt recording.Options) (*recording.Info, error)
	// Exists reports whether a file is there; nil: no stimulus is.
	Exists func(path string) bool
	// File reads a stimulus' header: the description that stands in it.
	Describes func(path string) (string, bool)
}

// use is one check that reads a take, and what for.
type use struct {
	check *job.Check
	role  string // "take", "floor", "differential" ...
}

// planner makes one plan.
type planner struct {
	job  *job.Job
	opt  Options
	uses map[*analyze.Take][]use
	play map[*analyze.Take]stimulusOf
}

// Make plans a job.
func Make(j *job.Job, o Options) *Plan {
	p := &planner{job: j, opt: o, uses: usesOf(j)}
	p.play = p.stimuli()
	out := &Plan{Format: 1, Title: j.Title, Job: filepath.Base(j.File), Readings: []Reading{}, Takes: []Take{}, Gear: p.gearDoubts()}
	for _, c := range j.Checks {
		if c.Measure == "entered" && c.Params.Value != nil {
			out.Readings = append(out.Readings, Reading{c.Name, c.Params.Value.String(), c.Params.With})
		}
	}
	for i, t := range j.Takes {
		e := p.take(t)
		e.index = i
		if e.Missing {
			out.Missing++
		}
		out.Takes = append(out.Takes, e)
	}
	sort.SliceStable(out.Takes, func(a, b int) bool { return out.Takes[a].rank < out.Takes[b].rank })
	out.First = p.first()
	return out
}

// usesOf lists for every take the checks that read it, in the order of the
// job.
func usesOf(j *job.Job) map[*analyze.Take][]use {
	uses := map[*analyze.Take][]use{}
	for _, c := range j.Checks {
		add := func(role string, takes []*analyze.Take) {
			for _, t := range takes {
				uses[t] = append(uses[t], use{c, role})
			}
		}
		add("take", c.Each)
		add("take", c.Repeat)
		for _, r := range c.Roles {
			add(r.Name, r.Takes)
		}
		if c.Against != nil {
			add("take", []*analyze.Take{c.Against})
		}
	}
	return uses
}

// take plans one recording.
func (p *planner) take(t *analyze.Take) Take {
	uses := p.uses[t]
	part := partOf(t, uses)
	e := Take{
		Name: t.Name, File: t.File, Missing: true, Step: part.words, Setup: t.Setup, Note: t.Note, rank: part.rank,
		Conditions: []string{}, Channels: channels(t, uses), Checks: []string{}, Doubts: []string{},
	}
	if t.Gear != nil {
		e.Gear = t.Gear.Name
	}
	for _, c := range t.Where {
		e.Conditions = append(e.Conditions, c.Key+" = "+c.Value)
	}
	for _, u := range uses {
		e.Checks = appendNew(e.Checks, u.check.Name)
	}
	s := p.play[t]
	e.Stimulus, e.Signal, e.Source = s.file, s.words(), s.source
	e.StimulusMissing = s.file != "" && !(p.opt.Exists != nil && p.opt.Exists(p.path(s.file)))
	info := p.found(t, &e)
	e.Level, e.Span = p.level(t, part), spanFor(t, s)
	rate := p.rate(t, uses, s)
	if rate > 0 {
		e.RateHz = &rate
	}
	n := p.length(t, uses, s)
	if n.seconds > 0 {
		e.LengthS = &n.seconds
	}
	e.LengthWhy = n.why
	e.Cautions = p.cautions(t, part)
	e.Wiring = p.wiring(t, part)
	e.Doubts = append(e.Doubts, s.doubts...)
	e.Doubts = append(e.Doubts, p.doubts(t, uses, info, n, rate)...)
	if len(uses) == 0 {
		e.Doubts = append(e.Doubts, "no check reads this take")
	}
	return e
}

// found looks at what is there of a take.
func (p *planner) found(t *analyze.Take, e *Take) *recording.Info {
	if p.opt.Header == nil || t.Path == "" {
		return nil
	}
	info, err := p.opt.Header(t.Path, t.CSV)
	switch {
	case errors.Is(err, fs.ErrNotExist):
		return nil
	case err != nil:
		e.Missing = false
		e.Fault = faultWords(t, err)
		return nil
	}
	e.Missing = false
	e.Found = foundWords(info)
	return info
}

func faultWords(t *analyze.Take, err error) string {
	var f *recording.Error
	if errors.As(err, &f) {
		here := *f // under the name the job gives it
		here.Path = t.File
		return here.Error()
	}
	return t.File + ": " + err.Error()
}

func foundWords(in *recording.Info) string {
	n := "1 channel"
	if len(in.Channels) != 1 {
		n = fmt.Sprintf("%d channels", len(in.Channels))
	}
	if in.RateHz <= 0 {
		return fmt.Sprintf("%s, %s, rate unknown", in.Format, n)
	}
	return fmt.Sprintf("%s, %s, %s, %s", in.Format, n, hertz(in.RateHz), seconds(in.DurationS()))
}

// path is where a file of the job's folder lies.
func (p *planner) path(file string) string {
	if filepath.IsAbs(file) {
		return filepath.FromSlash(file)
	}
	return filepath.Join(p.job.Dir, filepath.FromSlash(file))
}

func appendNew(list []string, s string) []string {
	for _, x := range list {
		if x == s {
			return list
		}
	}
	return append(list, s)
}

func joinWords(list []string) string {
	if n := len(list); n > 1 {
		return strings.Join(list[:n-1], ", ") + " and " + list[n-1]
	}
	return strings.Join(list, "")
}
