package main

import (
	"os"
	"path/filepath"
	"strings"
	"testing"

	"benchslip/analyze/job"
	"benchslip/analyze/keys"
	"benchslip/cmd/benchslip/internal/templates"
)

// Each folder loads without a fault, plans, and runs with every take missing:
// open, and nothing fails that nobody has measured.
func TestNew(t *testing.T) {
	used := map[string]bool{}
	for _, k := range templates.Kinds() {
		t.Run(k.Name, func(t *testing.T) {
			dir := filepath.Join(t.TempDir(), "a folder")
			status, stdout, stderr := call(t, "new", k.Name, dir)
			if status != 0 || stderr != "" {
				t.Fatalf("status %d: %s", status, stderr)
			}
			found, _ := filepath.Glob(filepath.Join(dir, "*.toml"))
			if len(found) != 1 || !strings.Contains(stdout, filepath.ToSlash(found[0])) {
				t.Fatalf("job files %v, stdout %q", found, stdout)
			}
			text, err := os.ReadFile(found[0])
			if err != nil {
				t.Fatal(err)
			}
			for _, want := range []string{"format = 1", "EVERY LIMIT BELOW IS AN EXAMPLE", "full_scale_sine", "full_scale_peak", "protective earth", "Phantom", `measure = "entered"`} {
				if want == "Phantom" && k.Name == "speaker-stage" {
					continue
				}
				if !strings.Contains(string(text), want) {
					t.Errorf("the job does not say %q", want)
				}
			}
			j, err := job.Load(found[0], job.Options{Headers: header})
			if err != nil {
				t.Fatal(err)
			}
			read := map[string]bool{}
			for _, c := range j.Checks {
				used[c.Measure] = true
				for _, row := range c.Rows() {
					for _, q := range row.Main {
						read[q.Name] = true
					}
				}
				for _, r := range c.Roles {
					for _, q := range r.Takes {
						read[q.Name] = true
					}
				}
			}
			for _, q := range j.Takes {
				if !read[q.Name] {
					t.Errorf("no check reads take %s", q.Name)
				}
			}
			for _, q := range planJSON(t, found[0]) {
				if !q.Missing || len(q.Wiring) == 0 {
					t.Errorf("%s: missing %v, wiring %q", q.Name, q.Missing, q.Wiring)
				}
			}
			if status, _, _ := call(t, "run", found[0], "--quiet"); status != 3 {
				t.Errorf("run with every take missing: status %d", status)
			}
			before := tree(t, dir)
			if status, stdout, stderr := call(t, "new", k.Name, dir); status != 2 || stdout != "" || !strings.Contains(stderr, "already") {
				t.Errorf("a second time: status %d, %q", status, stderr)
			}
			for name, data := range tree(t, dir) {
				if before[name] != data {
					t.Errorf("%s was changed", name)
				}
			}
		})
	}
	for _, m := range keys.MeasureNames() {
		if !used[m] && !setAside[m] {
			t.Errorf("no template shows the measure %s", m)
		}
	}
	for _, args := range [][]string{{"new"}, {"new", "preamp"}, {"new", "preampp", "x"}, {"new", "preamp", filepath.Join(bench, "tone.wav", "x")}} {
		if status, stdout, stderr := call(t, args...); status != 2 || stdout != "" || strings.Count(stderr, "\n") != 1 {
			t.Errorf("%q: status %d, stdout %q, stderr %q", args, status, stdout, stderr)
		}
	}
}

// setAside are measures that one of their family stands for.
var setAside = map[string]bool{
	"peak": true, "crest": true, "tone_frequency": true, "sinad": true, "fall_time": true, "settling_time": true, "droop": true,
	"corner_high": true, "balance": true,
}
