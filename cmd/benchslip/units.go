package main

import (
	"bytes"
	"context"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"strings"

	"benchslip/analyze/compare"
	"benchslip/analyze/slip"
	"benchslip/report"
	"benchslip/report/html"
	"benchslip/report/json"
	"benchslip/report/text"
)

// unitKey is the key of [unit] that holds the name of a unit's folder.
const unitKey = "folder"

// nameUnit writes the name of a unit's folder into its slip.
func nameUnit(s *slip.Slip, name string) {
	if name == "" {
		return
	}
	if _, stated := s.Unit[unitKey]; !stated {
		s.UnitKeys = append(s.UnitKeys, unitKey)
	}
	s.Unit[unitKey] = name
}

// ofUnit begins a message about one of several units.
func (o *runOptions) ofUnit() string {
	if o.unit == "" {
		return ""
	}
	return "unit " + o.unit + ": "
}

// unitFolders lists the units below dir, by name: folders that are no slip,
// not out, and not hidden.
func unitFolders(dir, out string) ([]string, error) {
	entries, err := os.ReadDir(dir)
	if err != nil {
		return nil, fmt.Errorf("%s: cannot be read: %w", dir, cause(err))
	}
	avoid, _ := filepath.Abs(out)
	var names []string
	for _, e := range entries {
		path := filepath.Join(dir, e.Name())
		full, _ := filepath.Abs(path)
		if !e.IsDir() || strings.HasPrefix(e.Name(), ".") || full == avoid || isFile(filepath.Join(path, mainFile)) {
			continue
		}
		names = append(names, e.Name())
	}
	if len(names) == 0 {
		return nil, fmt.Errorf("%s: holds no folder of a unit", dir)
	}
	return names, nil
}

// runUnits runs a job for every unit below a folder.
func (a *app) runUnits(ctx context.Context, jobs []string, o *runOptions) error {
	if len(jobs) > 1 {
		return usagef("run: --units goes with one job, got %d", len(jobs))
	}
	if o.json {
		return usagef("run: --json prints one slip; with --units read %s and each unit's %s", "summary.json", mainFile)
	}
	path, out := jobs[0], o.out
	if out == "" {
		out = filepath.Join(filepath.Dir(path), "slips")
	}
	names, err := unitFolders(o.units, out)
	if err != nil {
		return err
	}
	var in []compare.Input
	for _, name := range names {
		one := *o
		one.unit, one.takeRoot = name, filepath.Join(o.units, name)
		s, err := a.runUnit(ctx, path, filepath.Join(out, name), &one)
		if err != nil {
			return err
		}
		if s == nil { // the job itself is at fault for this unit, which was told
			continue
		}
		in = append(in, compare.Input{File: name + "/" + mainFile, Slip: s})
	}
	if len(in) == 0 {
		return nil
	}
	sum := compare.Summarise(in, unitKey)
	for _, f := range []struct {
		name  string
		write func() ([]byte, error)
	}{
		{"summary.html", func() ([]byte, error) { return bytesOf(html.Summary, sum) }},
		{"summary.txt", func() ([]byte, error) { return bytesOf(text.Units, sum) }},
		{"summary.json", func() ([]byte, error) { return bytesOf(jsonSummary, sum) }},
	} {
		data, err := f.write()
		if err != nil {
			return err
		}
		if err := writeFile(filepath.Join(out, f.name), data); err != nil {
			return err
		}
	}
	if o.quiet {
		return nil
	}
	if err := text.Units(&a.out, sum); err != nil {
		return err
	}
	fmt.Fprintf(&a.out, "\nslips of %d units and their summary written to %s\n", len(in), report.Clean(filepath.ToSlash(out)))
	return nil
}

// runUnit writes the slip of one unit without a word of its own.
func (a *app) runUnit(ctx context.Context, path, dir string, o *runOptions) (*slip.Slip, error) {
	quiet := *o
	quiet.quiet = true
	return a.runOne(ctx, path, dir, &quiet)
}

// bytesOf is what a renderer writes.
func bytesOf[T any](write func(io.Writer, T) error, v T) ([]byte, error) {
	var b bytes.Buffer
	err := write(&b, v)
	return b.Bytes(), err
}

func jsonSummary(w io.Writer, s *compare.Summary) error { return json.Write(w, s) }
