package main

import (
	"encoding/json"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"unicode"

	"benchslip/capture"
	"benchslip/capture/stimulus"
)

const sweepTake = `[takes.sweep]
file = "takes/lost.wav"
gear = "box"
in = 2
stimulus = "played/sweep.wav"
[[checks]]
name = "Flatness"
measure = "flatness"
take = "sweep"
max = "0.5 dB"
`

type plannedTake struct {
	Name, File, Stimulus string
	Missing              bool
	Cautions, Wiring     []string
}

func planJSON(t *testing.T, path string) []plannedTake {
	t.Helper()
	status, stdout, stderr := call(t, "plan", path, "--json")
	if status != 0 || stderr != "" {
		t.Fatalf("status %d: %s", status, stderr)
	}
	var doc struct {
		Format int
		Takes  []plannedTake
	}
	if err := json.Unmarshal([]byte(stdout), &doc); err != nil || doc.Format != 1 {
		t.Fatalf("format %d, %v", doc.Format, err)
	}
	return doc.Takes
}

// One entry a take, the lost one missing; in words every file, `missing`, and
// cautions before the step they belong to.
func TestPlan(t *testing.T) {
	path := jobFolder(t, gainCheck("Gain", `min = "19 dB"`)+lostCheck)
	takes := planJSON(t, path)
	if len(takes) != 6 {
		t.Fatalf("%d takes", len(takes))
	}
	_, words, _ := call(t, "plan", path)
	for _, k := range takes {
		if k.Missing != (k.Name == "lost") {
			t.Errorf("%s: missing %v", k.Name, k.Missing)
		}
		if !strings.Contains(words, k.File) {
			t.Errorf("the plan in words lacks %s", k.File)
		}
		at := strings.Index(words, ". "+k.Name+" (")
		if at < 0 {
			t.Errorf("no step for %s", k.Name)
			continue
		}
		step := words[at:]
		caution, connect := strings.Index(step, "  caution"), strings.Index(step, "  connect")
		if len(k.Cautions) > 0 && !(caution > 0 && caution < connect) {
			t.Errorf("%s: a caution at %d, connected at %d", k.Name, caution, connect)
		}
	}
	if !strings.Contains(words, "missing") {
		t.Error("nothing is missing in words")
	}
	page := filepath.Join(t.TempDir(), "plan.html")
	if status, _, stderr := call(t, "plan", path, "--html", page); status != 0 {
		t.Fatalf("--html: %s", stderr)
	}
	data, err := os.ReadFile(page)
	if err != nil {
		t.Fatal(err)
	}
	for _, k := range takes {
		if !strings.Contains(string(data), k.File) {
			t.Errorf("the page lacks %s", k.File)
		}
	}
	if status, _, stderr := call(t, "plan", path, "--html", path); status != 2 || !strings.Contains(stderr, "input") {
		t.Errorf("the page over the job: status %d, %q", status, stderr)
	}
}

// Pages for people follow the rules of the sheet: declared, titled, one h1,
// nothing fetched, nothing run, header cells with a scope.
func checkPage(t *testing.T, page string) {
	t.Helper()
	if !strings.HasPrefix(page, "<!DOCTYPE html>\n<html lang=\"en\">") {
		t.Errorf("the page begins with %.60q", page)
	}
	for part, n := range map[string]int{"<h1>": 1, "<title>": 1, "charset=\"utf-8\"": 1, "<script": 0, "<form": 0, "<iframe": 0, "<link": 0,
		"http:": 0, "https:": 0, "@import": 0, " onload": 0, " onclick": 0, "<th>": 0} {
		head, _, _ := strings.Cut(page, "<svg")
		count := strings.Count(page, part)
		if part == "<title>" {
			count = strings.Count(head, part)
		}
		if count != n {
			t.Errorf("%d times %s, wanted %d", count, part, n)
		}
	}
}

func TestPlanHostileText(t *testing.T) {
	path := jobFolder(t, gainCheck(`Gain \u001b[31m\u202e\u0007 <script>alert(1)</script>&`, `min = "19 dB"`)+
		"[takes.\"\\u001b]0;x\"]\nfile = \"takes/none.wav\"\nnote = \"<img src=x onerror=1>\\u202e\"\nwhere = { \"a<b\" = \"=1+1\" }\n")
	page := filepath.Join(t.TempDir(), "plan.html")
	status, stdout, stderr := call(t, "plan", path, "--html", page)
	if status != 0 {
		t.Fatalf("status %d: %s", status, stderr)
	}
	_, asJSON, _ := call(t, "plan", path, "--json")
	for _, out := range []string{stdout, asJSON} {
		if i := strings.IndexFunc(out, func(r rune) bool { return r != '\n' && unicode.IsControl(r) || r == 0x202e }); i >= 0 {
			t.Errorf("a control code at %d: %q", i, out[max(0, i-20):i+1])
		}
	}
	data, err := os.ReadFile(page)
	if err != nil {
		t.Fatal(err)
	}
	checkPage(t, string(data))
	if strings.Contains(string(data), "<img") {
		t.Error("markup of the job became markup of the page")
	}
}

// `stimulus JOB` writes what the plan names, again without harm, and never
// over something else.
func TestStimulusOfJob(t *testing.T) {
	path := jobFolder(t, gainCheck("Gain", `min = "19 dB"`)+sweepTake)
	dir := filepath.Dir(path)
	status, stdout, stderr := call(t, "stimulus", path)
	if status != 0 || stderr != "" || !strings.Contains(stdout, "caution") {
		t.Fatalf("status %d, stderr %q, stdout %q", status, stderr, stdout)
	}
	named := 0
	for _, k := range planJSON(t, path) {
		if k.Stimulus == "" {
			continue
		}
		named++
		rec, err := capture.Open(filepath.Join(dir, filepath.FromSlash(k.Stimulus)), capture.Options{})
		if err != nil {
			t.Fatal(err)
		}
		info := rec.Info()
		spec, ok := stimulus.FromInfo(info.Text)
		if !ok || info.RateHz < 44100 || !strings.Contains(stdout, k.Stimulus) || !strings.Contains(stdout, spec.String()) {
			t.Errorf("%s: %v at %g Hz, described %v", k.Stimulus, spec, info.RateHz, ok)
		}
		x := [][]float64{make([]float64, info.Frames), nil}
		if n, err := rec.ReadAt(x, 0); err != nil || int64(n) != info.Frames {
			t.Fatal(n, err)
		}
		peak := 0.0
		for _, v := range x[0] {
			peak = max(peak, v, -v)
		}
		if !(peak > 0.1 && peak < 1) {
			t.Errorf("%s: peak %g", k.Stimulus, peak)
		}
		rec.Close()
	}
	if named < 2 {
		t.Fatalf("%d takes are played something", named)
	}
	before := tree(t, dir)
	if status, again, stderr := call(t, "stimulus", path); status != 0 || !strings.Contains(again, "already") {
		t.Errorf("again: status %d, %q", status, stderr)
	}
	file := filepath.Join(dir, "played", "sweep.wav")
	if err := os.WriteFile(file, []byte("a recording of mine"), 0o666); err != nil {
		t.Fatal(err)
	}
	os.RemoveAll(filepath.Join(dir, "stimuli"))
	status, stdout, stderr = call(t, "stimulus", path)
	if status != 2 || stdout != "" || !strings.Contains(stderr, "played/sweep.wav") || strings.Count(stderr, "\n") != 1 {
		t.Errorf("over another file: status %d, stdout %q, stderr %q", status, stdout, stderr)
	}
	before["played/sweep.wav"] = "a recording of mine"
	for name, data := range tree(t, dir) {
		if data != before[name] {
			t.Errorf("%s was changed or left behind", name)
		}
	}
}

func TestStimulusByKind(t *testing.T) {
	file := filepath.Join(t.TempDir(), "x.wav")
	for _, k := range stimulus.Kinds() {
		os.Remove(file)
		args := []string{"stimulus", k.Name, "before=0s", "--out", file}
		status, stdout, stderr := call(t, args...)
		if status != 0 || stderr != "" || !strings.Contains(stdout, k.Name) || !strings.Contains(stdout, "caution") {
			t.Errorf("%s: status %d, stderr %q", k.Name, status, stderr)
		}
		if text, ok := describes(file); !ok || !strings.HasPrefix(text, k.Name+" ") {
			t.Errorf("%s: the file says %q", k.Name, text)
		}
	}
	if status, _, stderr := call(t, "stimulus", "tone", "length=1s", "--out", file); status != 2 || !strings.Contains(stderr, "not written over") {
		t.Errorf("over another file: status %d, %q", status, stderr)
	}
	for _, c := range []struct {
		args []string
		part string
	}{
		{[]string{"stimulus"}, "no job"},
		{[]string{"stimulus", "-"}, "standard input"},
		{[]string{"stimulus", "swep", "--out", file}, `did you mean "sweep"`},
		{[]string{"stimulus", "tone"}, "--out"},
		{[]string{"stimulus", "tone", "--out", "x.mp3"}, ".wav"},
		{[]string{"stimulus", "tone", "att=1kHz", "--out", file}, `did you mean "at"`},
		{[]string{"stimulus", "tone", "at=1kV", "--out", file}, "frequency"},
		{[]string{"stimulus", "tone", "peak=3dBFS", "--out", file}, "peak"},
		{[]string{"stimulus", "tone", "--out", filepath.Join(file, "y.wav")}, file},
		{[]string{"stimulus", "none.toml"}, "none.toml"},
		{[]string{"plan", "none.toml"}, "none.toml"},
		{[]string{"plan"}, "one job"},
		{[]string{"plan", "-"}, "standard input"},
	} {
		status, stdout, stderr := call(t, c.args...)
		if status != 2 || stdout != "" || !strings.Contains(stderr, c.part) || strings.Count(stderr, "\n") != 1 {
			t.Errorf("%q: status %d, stdout %q, stderr %q, wanted %q", c.args, status, stdout, stderr, c.part)
		}
	}
}
