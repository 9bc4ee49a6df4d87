package main

import (
	"flag"
	"os"
	"path/filepath"
	"runtime"
	"strings"
	"testing"
)

var update = flag.Bool("update", false, "write the session of the README anew")

// TestReadme runs the demo as the README says, and the README's session in
// it: every command's output stands there as it is.
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
	// Other processors round differently far behind the digits shown, and the
	// recordings' hashes with them.
	if runtime.GOARCH == "amd64" && out != session {
		t.Errorf("the README's session is not what the commands print (go test ./cmd/benchslip -run Readme -update writes it anew):\n%s", out)
	}
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
