package main

import (
	"bytes"
	"context"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"unicode"

	"benchslip/report/json/jsontest"
)

// everything is a job that reads every small recording.
const everything = `
[[checks]]
name = "Gain"
measure = "gain"
take = "tone"
nominal = "20 dB"
within = "0.5 dB"
[[checks]]
name = "THD"
measure = "thd"
take = "tone"
band = "20 Hz .. 10 kHz"
max = "0.05 %"
[[checks]]
name = "CMRR"
measure = "cmrr"
differential = "pair"
common = "joined"
at = "1042 Hz"
min = "65 dB"
[[checks]]
name = "Hum"
measure = "hum"
take = "hum"
max = "10 mV"
[[checks]]
name = "Offset"
measure = "dc"
take = "offset"
max = "10 mV"
[[checks]]
name = "Lost"
measure = "level"
take = "lost"
max = "1 V"
`

// The slip's bytes depend on the job and its takes alone: not on the worker
// count, the working directory, how the path is written, the place of the
// folder, or the environment.
func TestSlipBytesAreTheSame(t *testing.T) {
	path := jobFolder(t, everything)
	dir := filepath.Dir(path)
	first := filepath.Join(t.TempDir(), "first")
	if status, _, stderr := call(t, "run", path, "--out", first); status != 1 {
		t.Fatalf("status %d: %s", status, stderr)
	}
	want := tree(t, first)
	if len(want) < 2 {
		t.Fatalf("only %d files in the slip", len(want))
	}
	schema, err := os.ReadFile("../../testdata/slip.schema.json")
	if err != nil {
		t.Fatal(err)
	}
	faults, err := jsontest.Validate(schema, []byte(want[mainFile]))
	if err != nil {
		t.Fatal(err)
	}
	for _, f := range faults {
		t.Errorf("slip.json against its schema: %s", f)
	}
	same := func(what, out string, args ...string) {
		t.Helper()
		if status, _, stderr := call(t, append([]string{"run", "--out", out}, args...)...); status != 1 {
			t.Fatalf("%s: status %d: %s", what, status, stderr)
		}
		got := tree(t, out)
		if len(got) != len(want) {
			t.Errorf("%s: %d files, not %d", what, len(got), len(want))
		}
		for name, data := range want {
			if got[name] != data {
				t.Errorf("%s: %s differs", what, name)
			}
		}
	}
	same("one worker", filepath.Join(t.TempDir(), "out"), path, "--workers", "1")
	same("many workers, written twice", first, path, "--workers", "7")
	t.Setenv("TZ", "Pacific/Kiritimati")
	t.Setenv("LANG", "de_DE.UTF-8")
	t.Setenv("COLUMNS", "40")
	moved := filepath.Join(t.TempDir(), "moved folder")
	if err := os.CopyFS(moved, os.DirFS(dir)); err != nil {
		t.Fatal(err)
	}
	t.Chdir(moved)
	same("another folder, a relative path, another environment", filepath.Join(t.TempDir(), "out"), "bench.toml")
}

func TestRunJSONIsTheFile(t *testing.T) {
	path := jobFolder(t, gainCheck("Gain", `min = "19 dB"`))
	status, stdout, stderr := call(t, "run", path, "--json")
	data, err := os.ReadFile(filepath.Join(filepath.Dir(path), "slip", "slip.json"))
	if err != nil || status != 0 || stderr != "" {
		t.Fatalf("status %d, %q, %v", status, stderr, err)
	}
	if stdout != string(data) {
		t.Error("--json does not print slip.json")
	}
	if status, _, stderr := call(t, "run", path, "--verbose"); status != 0 || !strings.Contains(stderr, "measured ") {
		t.Errorf("--verbose: status %d, stderr %q", status, stderr)
	}
	if status, stdout, stderr := call(t, "run", path, "--quiet"); status != 0 || stdout != "" || stderr != "" {
		t.Errorf("--quiet: status %d, %q, %q", status, stdout, stderr)
	}
}

// Several jobs get a folder each; the worst status counts, and a job that is
// wrong does not keep the others from running.
func TestRunSeveral(t *testing.T) {
	good := jobFolder(t, gainCheck("Gain", `min = "19 dB"`))
	dir := filepath.Dir(good)
	text, err := os.ReadFile(good)
	if err != nil {
		t.Fatal(err)
	}
	write := func(name, text string) string {
		p := filepath.Join(dir, name)
		if err := os.WriteFile(p, []byte(text), 0o666); err != nil {
			t.Fatal(err)
		}
		return p
	}
	open := write("open.toml", strings.Replace(string(text), `min = "19 dB"`, `max = "20.005 dB"`, 1))
	failing := write("failing.toml", strings.Replace(string(text), `min = "19 dB"`, `min = "21 dB"`, 1))
	wrong := write("wrong.toml", "format = 1\ncheks = 1\n")
	for _, c := range []struct {
		jobs   []string
		status int
	}{
		{[]string{good, good[:len(good)-len("bench.toml")] + "open.toml"}, 3},
		{[]string{good, open, failing}, 1},
		{[]string{wrong, good, failing}, 2},
	} {
		out := filepath.Join(t.TempDir(), "out")
		status, _, _ := call(t, append([]string{"run", "-o", out}, c.jobs...)...)
		if status != c.status {
			t.Errorf("%v: status %d, wanted %d", c.jobs, status, c.status)
		}
		for _, j := range c.jobs {
			name := strings.TrimSuffix(filepath.Base(j), ".toml")
			_, err := os.Stat(filepath.Join(out, name, "slip.json"))
			if (err == nil) == (j == wrong) {
				t.Errorf("%v: slip of %s: %v", c.jobs, name, err)
			}
		}
	}
	if status, _, _ := call(t, "run", good, open); status != 3 {
		t.Errorf("two jobs beside each other: %d", status)
	}
	for _, name := range []string{"slip-bench", "slip-open"} {
		if _, err := os.Stat(filepath.Join(dir, name, "slip.json")); err != nil {
			t.Error(err)
		}
	}
}

func TestRunCannotWrite(t *testing.T) {
	path := jobFolder(t, gainCheck("Gain", `min = "19 dB"`))
	file := filepath.Join(t.TempDir(), "file")
	if err := os.WriteFile(file, nil, 0o666); err != nil {
		t.Fatal(err)
	}
	for _, out := range []string{file, filepath.Join(file, "below")} {
		status, stdout, stderr := call(t, "run", path, "--out", out)
		if status != 2 || stdout != "" || !strings.Contains(stderr, file) || strings.Count(stderr, "\n") != 1 {
			t.Errorf("%s: status %d, stdout %q, stderr %q", out, status, stdout, stderr)
		}
	}
}

// An interrupted run ends with status 2 and writes nothing.
func TestRunInterrupted(t *testing.T) {
	path := jobFolder(t, gainCheck("Gain", `min = "19 dB"`))
	ctx, stop := context.WithCancel(context.Background())
	stop()
	var stdout, stderr bytes.Buffer
	if status := Run(ctx, []string{"run", path}, nil, &stdout, &stderr); status != 2 || stdout.Len() > 0 {
		t.Errorf("status %d, stdout %q", status, stdout.String())
	}
	if _, err := os.Stat(filepath.Join(filepath.Dir(path), "slip")); err == nil {
		t.Error("a slip was written")
	}
}

// Takes that are no recordings, or not where they may be.
func TestRunUnfitTakes(t *testing.T) {
	level := "[takes.odd]\nfile = \"FILE\"\ngear = \"box\"\n[[checks]]\nname = \"Level\"\nmeasure = \"level\"\ntake = \"odd\"\nmax = \"1 V\"\n"
	for _, c := range []struct {
		name, file string
		status     int
		part       string
	}{
		{"a text", "takes/README.md", 3, "unreadable"},
		{"a folder", "takes", 3, "unreadable"},
		{"empty", "takes/empty.wav", 3, "unreadable"},
		{"outside", "../outside.wav", 2, "outside"},
		{"out and in again", "../BASE/takes/tone.wav", 2, ".."},
		{"absolute", "/dev/null", 2, "absolute"},
	} {
		t.Run(c.name, func(t *testing.T) {
			path := jobFolder(t, "")
			dir := filepath.Dir(path)
			file := strings.Replace(c.file, "BASE", filepath.Base(dir), 1)
			text, err := os.ReadFile(path)
			if err != nil {
				t.Fatal(err)
			}
			text = append(text, strings.Replace(level, "FILE", file, 1)...)
			if err := os.WriteFile(path, text, 0o666); err != nil {
				t.Fatal(err)
			}
			if err := os.WriteFile(filepath.Join(dir, "takes", "empty.wav"), nil, 0o666); err != nil {
				t.Fatal(err)
			}
			status, _, stderr := call(t, "run", path)
			if status != c.status || !strings.Contains(stderr, c.part) || !strings.Contains(stderr, file) {
				t.Errorf("status %d, stderr %q", status, stderr)
			}
			if strings.Contains(stderr, dir) && c.status == 3 {
				t.Errorf("the message of a take shows where the folder lies: %q", stderr)
			}
		})
	}
}

// Text that people typed never reaches a terminal as control codes, and a
// name may hold anything.
func TestRunHostileText(t *testing.T) {
	path := jobFolder(t, gainCheck(`Gain \u001b[31m\u202e\u0007 <b>&`, "min = \"19 dB\"\nclause = \"\\u001b]0;x\\u0007\""))
	status, stdout, stderr := call(t, "run", path)
	if status != 0 {
		t.Fatalf("status %d: %s", status, stderr)
	}
	_, asJSON, _ := call(t, "run", path, "--json")
	for _, out := range []string{stdout, asJSON} {
		if i := strings.IndexFunc(out, func(r rune) bool { return r != '\n' && unicode.IsControl(r) || r == 0x202e }); i >= 0 {
			t.Errorf("a control code at %d: %q", i, out[max(0, i-20):i+1])
		}
	}
}
