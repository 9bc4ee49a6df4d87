package main

import (
	"encoding/csv"
	"encoding/json"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"unicode"
)

// slipFor runs a job of the bench's takes and returns its slip.json.
func slipFor(t *testing.T, checks string) string {
	t.Helper()
	path := jobFolder(t, checks)
	if status, _, stderr := call(t, "run", path, "--quiet"); status == 2 {
		t.Fatal(stderr)
	}
	return filepath.Join(filepath.Dir(path), "slip", "slip.json")
}

// edited writes a slip with one text replaced beside it.
func edited(t *testing.T, path, old, now string) string {
	t.Helper()
	data, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	if !strings.Contains(string(data), old) {
		t.Fatalf("the slip holds no %q", old)
	}
	out := filepath.Join(t.TempDir(), "slip.json")
	if err := os.WriteFile(out, []byte(strings.Replace(string(data), old, now, 1)), 0o666); err != nil {
		t.Fatal(err)
	}
	return out
}

func TestCompareStatuses(t *testing.T) {
	// The tone's gain is 20.004 dB; channels 1 and 2 of the other check read
	// 10 times apart.
	good := slipFor(t, gainCheck("Gain", `max = "30 dB"`)+"[[checks]]\nname = \"Level\"\nmeasure = \"level\"\ntake = \"tone\"\nband = \"20 Hz .. 7 kHz\"\nout = 2\nmax = \"9 V\"\n")
	worse := slipFor(t, gainCheck("Gain", `max = "30 dB"`)+"[[checks]]\nname = \"Level\"\nmeasure = \"level\"\ntake = \"tone\"\nband = \"20 Hz .. 7 kHz\"\nout = 1\nmax = \"9 V\"\n")
	less := slipFor(t, gainCheck("Gain", `max = "30 dB"`))
	for _, c := range []struct {
		name   string
		slips  []string
		status int
	}{
		{"with itself", []string{good, good}, 0},
		{"better", []string{worse, good}, 0},
		{"worse", []string{good, worse}, 1},
		{"a row missing", []string{good, less}, 3},
		{"worse and missing", []string{good, less, worse}, 1},
		{"three of the same", []string{good, good, good}, 0},
	} {
		status, stdout, stderr := call(t, append([]string{"compare"}, c.slips...)...)
		if status != c.status || stderr != "" || stdout == "" {
			t.Errorf("%s: status %d, wanted %d; %s\n%s", c.name, status, c.status, stderr, stdout)
		}
		status, asJSON, _ := call(t, append([]string{"compare", "--json"}, c.slips...)...)
		var doc struct {
			Checks []struct {
				Name                    string
				Difference, Uncertainty *float64
				Significant             *bool
			}
		}
		if err := json.Unmarshal([]byte(asJSON), &doc); err != nil || status != c.status || len(doc.Checks) != 2 || doc.Checks[0].Significant == nil {
			t.Errorf("%s: --json status %d, %v, %s", c.name, status, err, asJSON)
		}
	}
}

func TestCompareFiles(t *testing.T) {
	a := slipFor(t, gainCheck("Gain", `max = "30 dB"`)+"[[checks]]\nname = \"Hum\"\nmeasure = \"hum\"\ntake = \"hum\"\nmax = \"1 V\"\n")
	b := edited(t, a, `"name": "Gain"`, `"name": "=Gain \u001b[31m\u202e<script>"`)
	dir := t.TempDir()
	page, table := filepath.Join(dir, "c.html"), filepath.Join(dir, "c.csv")
	status, stdout, stderr := call(t, "compare", a, b, "--html", page, "--csv", table)
	if status != 3 || stderr != "" {
		t.Fatalf("status %d: %s", status, stderr)
	}
	_, asJSON, _ := call(t, "compare", a, b, "--json")
	for _, out := range []string{stdout, asJSON} {
		if i := strings.IndexFunc(out, func(r rune) bool { return r != '\n' && unicode.IsControl(r) || r == 0x202e }); i >= 0 {
			t.Errorf("a control code at %d", i)
		}
	}
	data, err := os.ReadFile(page)
	if err != nil {
		t.Fatal(err)
	}
	checkPage(t, string(data))
	if !strings.Contains(string(data), "<svg") {
		t.Error("no curves over each other")
	}
	file, err := os.Open(table)
	if err != nil {
		t.Fatal(err)
	}
	defer file.Close()
	rows, err := csv.NewReader(file).ReadAll() // refuses rows of other widths
	if err != nil || len(rows) != 4 {
		t.Fatalf("%d rows, %v", len(rows), err)
	}
	for _, r := range rows {
		if strings.ContainsAny(r[0][:1], "=+-@\t\r") {
			t.Errorf("a cell that a spreadsheet would run: %q", r[0])
		}
	}
	for _, c := range []struct {
		args []string
		part string
	}{
		{[]string{"compare"}, "no slip"},
		{[]string{"compare", a}, "two slips"},
		{[]string{"compare", a, "none.json"}, "none.json"},
		{[]string{"compare", a, filepath.Join(bench, "tone.wav")}, "tone.wav"},
		{[]string{"compare", a, "-"}, "standard input"},
		{[]string{"compare", a, b, "--html", a}, "input"},
		{[]string{"recheck"}, "one slip"},
		{[]string{"recheck", "none.json"}, "none.json"},
		{[]string{"recheck", b}, "--job"},
		{[]string{"recheck", a, "--job", "none.toml"}, "none.toml"},
	} {
		status, stdout, stderr := call(t, c.args...)
		if status != 2 || stdout != "" || !strings.Contains(stderr, c.part) || strings.Count(stderr, "\n") != 1 {
			t.Errorf("%q: status %d, stdout %q, stderr %q, wanted %q", c.args, status, stdout, stderr, c.part)
		}
	}
}

func TestRecheckStatuses(t *testing.T) {
	path := jobFolder(t, gainCheck("Gain", `max = "30 dB"`))
	dir := filepath.Dir(path)
	if status, _, stderr := call(t, "run", path, "--quiet"); status != 0 {
		t.Fatal(stderr)
	}
	at := filepath.Join(dir, "slip", "slip.json")
	if status, stdout, stderr := call(t, "recheck", at); status != 0 || !strings.HasPrefix(stdout, "same") || stderr != "" {
		t.Errorf("same: status %d, %q, %q", status, stdout, stderr)
	}
	before := tree(t, dir)
	far := filepath.Join(t.TempDir(), "slip.json")
	data, err := os.ReadFile(at)
	if err != nil {
		t.Fatal(err)
	}
	if err := os.WriteFile(far, data, 0o666); err != nil {
		t.Fatal(err)
	}
	if status, stdout, _ := call(t, "recheck", far, "--job", path); status != 0 || !strings.HasPrefix(stdout, "same") {
		t.Errorf("--job: status %d, %q", status, stdout)
	}
	for name, text := range tree(t, dir) {
		if before[name] != text {
			t.Errorf("recheck wrote %s", name)
		}
	}
	change := func(name, old, now string) {
		file := filepath.Join(dir, filepath.FromSlash(name))
		text, err := os.ReadFile(file)
		if err != nil {
			t.Fatal(err)
		}
		if err := os.WriteFile(file, []byte(strings.Replace(string(text), old, now, 1)), 0o666); err != nil {
			t.Fatal(err)
		}
	}
	change("bench.toml", `max = "30 dB"`, `max = "25 dB"`)
	if status, stdout, _ := call(t, "recheck", at); status != 1 || !strings.Contains(stdout, "limits have changed") || !strings.Contains(stdout, "Gain: max 30 then, 25 now") {
		t.Errorf("limits: status %d, %q", status, stdout)
	}
	change("bench.toml", `max = "25 dB"`, `max = "30 dB"`)
	pair, err := os.ReadFile(filepath.Join(dir, "takes", "pair.wav"))
	if err != nil {
		t.Fatal(err)
	}
	if err := os.WriteFile(filepath.Join(dir, "takes", "tone.wav"), pair, 0o666); err != nil {
		t.Fatal(err)
	}
	if status, stdout, _ := call(t, "recheck", at); status != 1 || !strings.Contains(stdout, "take tone (takes/tone.wav) has changed") {
		t.Errorf("a take: status %d, %q", status, stdout)
	}
}
