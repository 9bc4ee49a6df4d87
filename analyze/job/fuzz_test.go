package job

import (
	"errors"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

// Whatever the text, reading it ends with a job or with clean lines that
// point into it.
func FuzzJob(f *testing.F) {
	whole, err := os.ReadFile(filepath.Join("testdata", "whole.toml"))
	if err != nil {
		f.Fatal(err)
	}
	f.Add(string(whole))
	for _, c := range faulty {
		text, _ := unmark(c.text)
		f.Add(text)
	}
	for _, s := range []string{"a.b.c.d = 1\n[a.b]\n", "[[a]]\n[[a.b]]\n[a.b.c]\n", "x = [[[[1]]]]\n", "[takes]\n[takes.a.csv]\n", "include = [[]]\n",
		"checks = [{}, {name = 1}, 3]\n", "gear = {a = {kind = \"audio\", channel = {1 = {}}}}\n", "x = \"\"\"\nabc", "'a' = {b.c = 1, b.d = 2}\n", "[\"\"]\n\"\" = \"\"\n"} {
		f.Add(s)
	}
	f.Fuzz(func(t *testing.T, text string) {
		j, err := parse("job.toml", "testdata", []byte(text), Options{Headers: fakeHeaders})
		if (err == nil) == (j == nil) {
			t.Fatalf("job %v with error %v", j, err)
		}
		var list Errors
		if err != nil && !errors.As(err, &list) {
			t.Fatalf("error of another kind: %v", err)
		}
		lines := strings.Count(text, "\n") + 1
		for _, e := range list {
			s := e.Error()
			if strings.ContainsAny(s, "\n\r\x1b\x00") || len(s) > 1000 {
				t.Fatalf("not a clean line: %q", s)
			}
			if e.File == "job.toml" && (e.Line < 0 || e.Line > lines || e.Line > 0 && e.Col < 1) {
				t.Fatalf("points at %d:%d of %d lines", e.Line, e.Col, lines)
			}
		}
		if j != nil {
			for _, c := range j.Checks {
				for _, r := range c.Rows() {
					if l := r.Limits; l.Min != nil && l.Max != nil && l.Min.Linear() > l.Max.Linear() {
						t.Fatalf("limits %v .. %v", l.Min, l.Max)
					}
					r.Roles()
				}
			}
		}
	})
}
