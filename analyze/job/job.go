// Package job reads the job file: which unit, which gear, which takes, which
// checks with which limits. It is strict. Every fault is told at once, each
// in one line with file, line and column, the text in question, what was
// expected, and where it can, what to write. No sample is read.
package job

import (
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"

	"benchslip/analyze"
	"benchslip/capture/recording"
	"benchslip/capture/unit"
)

// Job is a job file, resolved: references are pointers, defaults are merged,
// quantities have units that fit.
type Job struct {
	File    string // as the user named it; "" for a measure without a job file
	Dir     string // folder of the job file
	Sources []Text // the job file, then its included files in order, as read
	Slips   []Text // slips that limits_from took values from, in order of use

	Title    string
	Unit     []Entry // free text about the unit, in the order of the file
	Record   []Entry // in the order of the file
	Date     string  // record.date, "2026-12-01" or ""
	Decision string  // "four-way", "guarded", "simple"
	Coverage float64 // k
	Mains    string  // as typed: "50 Hz", "find"; "" not stated
	MainsHz  float64 // nominal; 0: to be found

	Gear   []*Gear         // in the order of the file
	Takes  []*analyze.Take // in the order of the file; not opened
	Checks []*Check        // in the order of the file, included ones last
}

// Text is a file as read.
type Text struct {
	Name string // as typed
	Data []byte
}

// Entry is a free key with its text.
type Entry struct{ Key, Value string }

// Gear is a gear entry with what the sheet says about it.
type Gear struct {
	*analyze.Gear
	FullScale   string // as typed with its kind: "4.92 V peak", "13 dBu sine"; "" not stated
	Uncertainty string // as typed; "unknown"; "" not stated
	Coupling    string // "ac", "dc"
	Clock       bool   // clock was stated
	Match       bool   // channel_match was stated
}

// Check is one entry of [[checks]].
type Check struct {
	Name     string
	Measure  string
	Class    string // "critical", "major", "minor", "info"
	Clause   string
	Optional bool
	Line     string // place of the entry: "job.toml:40"

	Roles   []Role          // takes it reads but the main one of each row, in the order of the keys
	Each    []*analyze.Take // one row each; nil: one row
	Repeat  []*analyze.Take // takes whose mean is judged; nil: none
	Against *analyze.Take   // judged relative to the same measure of this take; nil: not

	Params analyze.Params
	Where  []analyze.Condition
	Waiver *Waiver

	rows []Row
}

// Role is what takes are for: "take" (the main one, or several for measures
// that read a list), "floor", "differential" ...
type Role struct {
	Name  string
	Takes []*analyze.Take
}

// Waiver is printed with a row; verdict and exit stay.
type Waiver struct{ By, Why, Ticket string }

// Limits of one row. Nominal and Within have become Min and Max.
type Limits struct {
	Min, Max, Typical *unit.Quantity // nil: none; Min and Max have one unit
	Nominal, Within   *unit.Quantity // as stated, for the sheet; nil: none
	From              string         // limits_from as typed
}

// Any reports whether there is something to judge by.
func (l Limits) Any() bool { return l.Min != nil || l.Max != nil }

// Row is one line of the slip.
type Row struct {
	Name   string // the check's, or "NAME: take" with each
	Check  *Check
	Main   []*analyze.Take // takes of the role "take"; with Repeat: the M takes, each measured alone
	Limits Limits
}

// Rows gives the check's rows: one, or one a take of `each`.
func (c *Check) Rows() []Row { return append([]Row(nil), c.rows...) }

// Roles gives the takes by role for one evaluation of the row. main stands
// in for the role "take": one take of Repeat in turn, or Against; without it
// the row's own.
func (r Row) Roles(main ...*analyze.Take) map[string][]*analyze.Take {
	out := map[string][]*analyze.Take{}
	for _, role := range r.Check.Roles {
		out[role.Name] = role.Takes
	}
	if main == nil {
		main = r.Main
	}
	if len(main) > 0 {
		out["take"] = main
	}
	return out
}

// Gearbox returns the gear entry of that name, nil when there is none.
func (j *Job) Gearbox(name string) *Gear {
	for _, g := range j.Gear {
		if g.Name == name {
			return g
		}
	}
	return nil
}

// Options of reading a job.
type Options struct {
	// AllowOutside lets takes, includes and slips lie outside the job's folder.
	AllowOutside bool
	// TakeRoot is the folder that take paths are relative to and must stay
	// in; "" is the job's folder.
	TakeRoot string
	// Headers opens a recording's header, to check channels against it. nil:
	// channels are not checked. A file that cannot be opened is left for the
	// run, which says so.
	Headers func(path string, opt recording.Options) (*recording.Info, error)
}

// mostBytes bounds a job file, an included file and a slip read for limits.
const mostBytes = 4 << 20

// Load reads the job file at path. Faults of the job come as Errors.
func Load(path string, o Options) (*Job, error) {
	data, err := readText(path)
	if err != nil {
		return nil, fmt.Errorf("%s: %w", path, err)
	}
	return parse(path, filepath.Dir(path), data, o)
}

// readText reads a small ordinary file.
func readText(path string) ([]byte, error) {
	st, err := os.Stat(path)
	if err != nil {
		return nil, reason(err)
	}
	if st.IsDir() {
		return nil, errors.New("is a folder, not a file")
	}
	if !st.Mode().IsRegular() {
		return nil, errors.New("is no ordinary file")
	}
	file, err := os.Open(path)
	if err != nil {
		return nil, reason(err)
	}
	defer file.Close()
	data, err := io.ReadAll(io.LimitReader(file, mostBytes+1))
	if err != nil {
		return nil, reason(err)
	}
	if len(data) > mostBytes {
		return nil, fmt.Errorf("is larger than %d MiB, which no job needs", mostBytes>>20)
	}
	return data, nil
}

// reason words a file error without the path, which the caller names.
func reason(err error) error {
	switch {
	case errors.Is(err, fs.ErrNotExist):
		return errors.New("there is no such file")
	case errors.Is(err, fs.ErrPermission):
		return errors.New("may not be read")
	}
	var pe *fs.PathError
	if errors.As(err, &pe) {
		return pe.Err
	}
	return err
}

// parse reads a job text that lies in dir.
func parse(name, dir string, data []byte, o Options) (*Job, error) {
	r := newReader(name, dir, o)
	main := newSource(name, 0, data)
	r.job.Sources = []Text{{filepath.ToSlash(name), data}}
	root := parseTree(main, &r.faults)
	trees := append([]*node{root}, r.includes(root)...)
	r.top(root)
	r.all(trees)
	if err := r.err(); err != nil {
		return nil, err
	}
	return r.job, nil
}
