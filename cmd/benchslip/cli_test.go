package main

import (
	"bytes"
	"context"
	"encoding/json"
	"io"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"benchslip/analyze/measures"
)

// call runs the program in-process and returns its status and both streams.
func call(t *testing.T, args ...string) (status int, stdout, stderr string) {
	t.Helper()
	var out, err bytes.Buffer
	status = Run(context.Background(), args, strings.NewReader(""), &out, &err)
	return status, out.String(), err.String()
}

// bench holds small recordings with known truth; see its README.
const bench = "../../testdata/bench"

// jobFolder makes a folder with the bench's takes and a job of the given
// checks, and returns the job's path.
func jobFolder(t *testing.T, checks string) string {
	t.Helper()
	dir := t.TempDir()
	entries, err := os.ReadDir(bench)
	if err != nil || len(entries) == 0 {
		t.Fatalf("no recordings in %s: %v", bench, err)
	}
	if err := os.Mkdir(filepath.Join(dir, "takes"), 0o777); err != nil {
		t.Fatal(err)
	}
	for _, e := range entries {
		data, err := os.ReadFile(filepath.Join(bench, e.Name()))
		if err != nil {
			t.Fatal(err)
		}
		if err := os.WriteFile(filepath.Join(dir, "takes", e.Name()), data, 0o666); err != nil {
			t.Fatal(err)
		}
	}
	path := filepath.Join(dir, "bench.toml")
	text := `format = 1
title = "Bench"
[unit]
serial = "007"
[mains]
frequency = "50 Hz"
[gear.box]
kind = "audio"
full_scale_peak = "4 V"
uncertainty = "0.5 %"
channel_match = "0.01 dB"
[gear.scope]
kind = "scope"
uncertainty = "3 %"
[takes.tone]
file = "takes/tone.wav"
gear = "box"
in = 2
where = { gain = "20 dB", source = "150 ohm" }
[takes.pair]
file = "takes/pair.wav"
gear = "box"
in = 2
[takes.joined]
file = "takes/joined.wav"
gear = "box"
in = 2
[takes.hum]
file = "takes/hum.wav"
gear = "box"
[takes.offset]
file = "takes/offset.csv"
gear = "scope"
[takes.lost]
file = "takes/lost.wav"
gear = "box"
` + checks
	if !strings.Contains(checks, `"lost"`) {
		text = strings.Replace(text, "[takes.lost]\nfile = \"takes/lost.wav\"\ngear = \"box\"\n", "", 1)
	}
	if err := os.WriteFile(path, []byte(text), 0o666); err != nil {
		t.Fatal(err)
	}
	return path
}

// gainCheck is a check of the tone's gain, which is 20.004 dB, with the given
// limits and more keys.
func gainCheck(name, keys string) string {
	return "[[checks]]\nname = \"" + name + "\"\nmeasure = \"gain\"\ntake = \"tone\"\nat = \"1042 Hz\"\n" + keys + "\n"
}

const lostCheck = "[[checks]]\nname = \"Lost\"\nmeasure = \"level\"\ntake = \"lost\"\nmax = \"1 V\"\n"

func TestRunOutcomes(t *testing.T) {
	for _, c := range []struct {
		name, checks    string
		status          int
		verdict         string
		stdout, message string // parts that must be there; message "": stderr is empty
	}{
		{"pass", gainCheck("Gain", `min = "19 dB"`), 0, "pass", "pass", ""},
		{"fail", gainCheck("Gain", `min = "21 dB"`), 1, "fail", "fail", ""},
		{"on the edge", gainCheck("Gain", `max = "20.005 dB"`), 3, "inconclusive", "needs U <=", ""},
		{"guarded", "[rule]\ndecision = \"guarded\"\n" + gainCheck("Gain", `max = "20.005 dB"`), 1, "fail", "fail", ""},
		{"simple", "[rule]\ndecision = \"simple\"\n" + gainCheck("Gain", `max = "20.005 dB"`), 0, "pass", "pass", ""},
		{"no limits", gainCheck("Gain", ""), 0, "not-judged", "20.00", ""},
		{"info only", gainCheck("Gain", "min = \"21 dB\"\nclass = \"info\""), 0, "not-judged", "not judged", ""},
		{"missing take", gainCheck("Gain", `min = "19 dB"`) + lostCheck, 3, "inconclusive", "missing-take", "missing-take: takes/lost.wav"},
		{"missing take and a fail", gainCheck("Gain", `min = "21 dB"`) + lostCheck, 1, "fail", "missing-take", "missing-take: takes/lost.wav"},
		{"optional", gainCheck("Gain", `min = "19 dB"`) + lostCheck + "optional = true\n", 0, "pass", "missing-take", "missing-take: takes/lost.wav"},
		{"other conditions", gainCheck("Gain", "min = \"19 dB\"\nwhere = { gain = \"40 dB\" }"), 3, "inconclusive", "not applicable", ""},
		{"same conditions", gainCheck("Gain", "min = \"19 dB\"\nwhere = { source = \"0.15 kohm\" }"), 0, "pass", "pass", ""},
		{"condition not stated", gainCheck("Gain", "min = \"19 dB\"\nwhere = { pad = \"off\" }"), 3, "inconclusive", "does not state pad", ""},
		{"entered", "[[checks]]\nname = \"Rail\"\nmeasure = \"entered\"\nvalue = \"14.98 V\"\nuncertainty = \"0.02 V\"\nmin = \"14.5 V\"\nmax = \"15.5 V\"\n",
			0, "pass", "entered by hand", ""},
		{"no reading of DC through AC coupling", "[[checks]]\nname = \"Offset\"\nmeasure = \"dc\"\ntake = \"tone\"\nmax = \"1 V\"\n", 3, "inconclusive", "ac-coupled", ""},
	} {
		t.Run(c.name, func(t *testing.T) {
			path := jobFolder(t, c.checks)
			status, stdout, stderr := call(t, "run", path)
			if status != c.status {
				t.Errorf("status %d, wanted %d; stderr: %s", status, c.status, stderr)
			}
			if !strings.Contains(stdout, c.stdout) {
				t.Errorf("stdout lacks %q:\n%s", c.stdout, stdout)
			}
			if c.message == "" && stderr != "" || !strings.Contains(stderr, c.message) {
				t.Errorf("stderr %q, wanted %q", stderr, c.message)
			}
			if strings.Count(stderr, "\n") > 1 {
				t.Errorf("more than one line on stderr: %q", stderr)
			}
			var doc struct{ Verdict string }
			data, err := os.ReadFile(filepath.Join(filepath.Dir(path), "slip", "slip.json"))
			if err != nil {
				t.Fatal(err)
			}
			if err := json.Unmarshal(data, &doc); err != nil || doc.Verdict != c.verdict {
				t.Errorf("verdict %q (%v), wanted %q", doc.Verdict, err, c.verdict)
			}
		})
	}
}

// A job that is wrong in itself: status 2, each fault in a line that begins
// with its place, no slip.
func TestRunWrongJob(t *testing.T) {
	path := jobFolder(t, gainCheck("Gain", "mn = \"19 dB\"\nband = \"20 Hz .. 20 kHz\""))
	status, stdout, stderr := call(t, "run", path)
	if status != 2 || stdout != "" {
		t.Errorf("status %d, stdout %q", status, stdout)
	}
	lines := strings.Split(strings.TrimSpace(stderr), "\n")
	if len(lines) != 2 {
		t.Errorf("%d lines for two faults:\n%s", len(lines), stderr)
	}
	for _, l := range lines {
		if !strings.HasPrefix(l, path+":") {
			t.Errorf("a fault does not begin with its place: %s", l)
		}
	}
	if _, err := os.Stat(filepath.Join(filepath.Dir(path), "slip")); err == nil {
		t.Error("a slip was written")
	}
	if status, _, stderr := call(t, "run", filepath.Join(t.TempDir(), "none.toml")); status != 2 || !strings.Contains(stderr, "none.toml") {
		t.Errorf("a missing job: status %d, %q", status, stderr)
	}
}

func TestUsage(t *testing.T) {
	wav := filepath.Join(bench, "tone.wav")
	for _, c := range []struct {
		args []string
		part string // what stderr must hold
	}{
		{nil, "no command"},
		{[]string{"rnu", "x.toml"}, `did you mean "run"`},
		{[]string{"--nope", "rnu"}, "--nope"},
		{[]string{"--nope"}, "--nope"},
		{[]string{"run"}, "no job named"},
		{[]string{"run", "--ou", "x", "job.toml"}, "--ou"},
		{[]string{"run", "--workers", "0", "job.toml"}, "--workers"},
		{[]string{"run", "--workers", "many", "job.toml"}, "--workers"},
		{[]string{"run", "-"}, "standard input"},
		{[]string{"run", "a/x.toml", "b/x.toml", "--out", "d"}, "b/x.toml"},
		{[]string{"look"}, "no recording named"},
		{[]string{"look", "-"}, "standard input"},
		{[]string{"look", "--csv-rate", "fast", wav}, "--csv-rate"},
		{[]string{"measure"}, "no measure"},
		{[]string{"measure", "gian", wav}, `did you mean "gain"`},
		{[]string{"measure", "gian", wav, "--at", "1 kHz"}, `did you mean "gain"`},
		{[]string{"measure", "gain", wav, "--att", "1 kHz"}, "--att"},
		{[]string{"measure", "gain", wav, "--out", "2"}, "--out"},
		{[]string{"measure", "gain", wav, "--at", "1 kV", "--in", "2"}, "--at"},
		{[]string{"measure", "gain", "-"}, "standard input"},
		{[]string{"measure", "gain"}, "FILE"},
		{[]string{"demo"}, "demo"},
		{[]string{"demo", "a", "b"}, "demo"},
		{[]string{"version", "x"}, "version"},
		{[]string{"help", "nope"}, "nope"},
		{[]string{"help", "measure", "nope"}, "nope"},
		{[]string{"completion"}, "completion"},
		{[]string{"completion", "nosh"}, "nosh"},
	} {
		status, stdout, stderr := call(t, c.args...)
		if status != 2 || stdout != "" {
			t.Errorf("%q: status %d, stdout %q", c.args, status, stdout)
		}
		if !strings.Contains(stderr, c.part) || strings.Count(stderr, "\n") != 1 || len(stderr) > 1000 {
			t.Errorf("%q: stderr is not one short line with %q: %q", c.args, c.part, stderr)
		}
	}
}

func TestHelp(t *testing.T) {
	commands := [][]string{{"run"}, {"look"}, {"measure"}, {"new"}, {"plan"}, {"stimulus"}, {"stimulus", "sweep"}, {"calibrate"}, {"compare"}, {"recheck"}, {"demo"}, {"completion"}, {"version"}, {"help"}}
	for _, m := range measures.All() {
		commands = append(commands, []string{"measure", m.Name})
	}
	for _, c := range commands {
		status, stdout, stderr := call(t, append(c, "--help")...)
		if status != 0 || stderr != "" || !strings.Contains(stdout, "benchslip "+strings.Join(c, " ")) {
			t.Errorf("%q --help: status %d, stderr %q, stdout:\n%s", c, status, stderr, stdout)
		}
		if _, again, _ := call(t, append([]string{"help"}, c...)...); again != stdout {
			t.Errorf("help %q differs from --help", c)
		}
	}
	for _, args := range [][]string{{"--help"}, {"-h"}, {"help"}} {
		if status, stdout, stderr := call(t, args...); status != 0 || stderr != "" || !strings.Contains(stdout, "exit status") {
			t.Errorf("%q: status %d, stderr %q, stdout:\n%s", args, status, stderr, stdout)
		}
	}
	for _, m := range measures.All() {
		_, stdout, _ := call(t, "measure", m.Name, "--help")
		for _, part := range []string{m.Title, firstWords(m.Formula), firstWords(m.Standard), "keys"} {
			if !strings.Contains(stdout, part) {
				t.Errorf("measure %s --help lacks %q", m.Name, part)
			}
		}
	}
	if status, stdout, _ := call(t, "version"); status != 0 || stdout != "benchslip "+version+"\n" {
		t.Errorf("version: %d %q", status, stdout)
	}
	for _, shell := range []string{"bash", "zsh", "fish", "powershell"} {
		if status, stdout, _ := call(t, "completion", shell); status != 0 || !strings.Contains(stdout, "benchslip") {
			t.Errorf("completion %s: status %d", shell, status)
		}
	}
}

// firstWords is the beginning of a text, before any line break of a layout.
func firstWords(s string) string {
	f := strings.Fields(s)
	return strings.Join(f[:min(2, len(f))], " ")
}

// A fault of our own is one line and status 2, wherever it happens.
func TestPanicIsOneLine(t *testing.T) {
	var stderr bytes.Buffer
	status := Run(context.Background(), []string{"version"}, nil, bomb{}, &stderr)
	if status != 2 || strings.Count(stderr.String(), "\n") != 1 || !strings.Contains(stderr.String(), "bang") {
		t.Errorf("status %d, stderr %q", status, stderr.String())
	}
}

type bomb struct{}

func (bomb) Write([]byte) (int, error) { panic("bang") }

// A result that cannot be written is told.
func TestStdoutClosed(t *testing.T) {
	var stderr bytes.Buffer
	status := Run(context.Background(), []string{"version"}, nil, shut{}, &stderr)
	if status != 2 || !strings.Contains(stderr.String(), "could not be written") {
		t.Errorf("status %d, stderr %q", status, stderr.String())
	}
}

type shut struct{}

func (shut) Write([]byte) (int, error) { return 0, io.ErrClosedPipe }

func TestPrintable(t *testing.T) {
	for in, want := range map[string]string{
		"plain \u00b5V\n":   "plain \u00b5V\n",
		"\x1b[31mred":       `\u001b[31mred`,
		"a\u202eb\u0085c":   `a\u202eb\u0085c`,
		"tab\tand bell\a":   "tab\tand bell" + `\u0007`,
		"zero\x00, del\x7f": `zero\u0000, del\u007f`,
	} {
		if got := printable(in); got != want {
			t.Errorf("printable(%q) = %q, wanted %q", in, got, want)
		}
	}
}
