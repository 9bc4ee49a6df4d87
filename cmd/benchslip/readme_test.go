package main

import (
	"flag"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"testing"
)

var update = flag.Bool("update", false, "write the session of the README anew")

// TestReadme runs the demo as the README says, and the README's session in
// it: what every command prints stands there.
func TestReadme(t *testing.T) {
	if testing.Short() {
		t.Skip("runs the whole demo")
	}
	readme, err := filepath.Abs("../../README.md")
	if err != nil {
		t.Fatal(err)
	}
	text, err := os.ReadFile(readme)
	if err != nil {
		t.Fatal(err)
	}
	const begin, end = "<!-- session -->\n```console\n", "```\n<!-- end -->"
	before, rest, ok := strings.Cut(string(text), begin)
	session, after, ok2 := strings.Cut(rest, end)
	if !ok || !ok2 {
		t.Fatal("the README has no session")
	}
	dir := t.TempDir()
	status, stdout, stderr := call(t, "demo", dir)
	if status != 0 || stderr != "" {
		t.Fatalf("demo: status %d: %s", status, stderr)
	}
	for _, verdict := range []string{"FAIL", "fail ", "conditional"} {
		if !strings.Contains(stdout, verdict) {
			t.Errorf("the demo shows no %q:\n%s", verdict, stdout)
		}
	}
	t.Chdir(filepath.Join(dir, "preamp"))
	var got strings.Builder
	commands := 0
	for line := range strings.Lines(session) {
		command, ok := strings.CutPrefix(line, "$ benchslip ")
		if !ok {
			continue
		}
		commands++
		_, stdout, stderr := call(t, split(strings.TrimSpace(command))...)
		got.WriteString(line + stdout + stderr + "\n")
	}
	if commands == 0 {
		t.Fatal("the README's session has no commands")
	}
	out := strings.TrimSpace(got.String()) + "\n"
	if *update {
		if err := os.WriteFile(readme, []byte(before+begin+out+end+after), 0o666); err != nil {
			t.Fatal(err)
		}
		return
	}
	if why := unlike(session, out); why != "" {
		t.Errorf("the README's session is not what the commands print: %s (go test ./cmd/benchslip -run Readme -update writes it anew)", why)
	}
}

// unlike says where two texts differ: in a word, or in a number by more than
// 2 % and two units of its last place. Sheet numbers are not compared: they
// hold the version.
func unlike(want, got string) string {
	w, g := strings.Fields(want), strings.Fields(got)
	for i := range min(len(w), len(g)) {
		if w[i] == g[i] || i > 0 && w[i-1] == "slip" {
			continue
		}
		x, err1 := strconv.ParseFloat(strings.TrimRight(w[i], ",:;"), 64)
		y, err2 := strconv.ParseFloat(strings.TrimRight(g[i], ",:;"), 64)
		place := 1.0
		if _, decimals, ok := strings.Cut(strings.TrimRight(w[i], ",:;"), "."); ok {
			place = math.Pow10(-len(decimals))
		}
		if err1 != nil || err2 != nil || math.Abs(x-y) > 0.02*math.Abs(x)+2.5*place {
			return fmt.Sprintf("%q stands there, %q is printed", strings.Join(w[max(0, i-4):i+1], " "), strings.Join(g[max(0, i-4):i+1], " "))
		}
	}
	if len(w) != len(g) {
		return fmt.Sprintf("%d words stand there, %d are printed", len(w), len(g))
	}
	return ""
}

// split parts a command at blanks outside double quotes.
func split(command string) []string {
	var out []string
	quoted := false
	fields := strings.FieldsFunc(command, func(r rune) bool {
		if r == '"' {
			quoted = !quoted
		}
		return r == ' ' && !quoted
	})
	for _, f := range fields {
		out = append(out, strings.ReplaceAll(f, `"`, ""))
	}
	return out
}
