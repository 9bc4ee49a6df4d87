package main

import (
	"archive/zip"
	"bytes"
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"io"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"testing"
)

// batchFolder makes a job and a folder of units, each with the bench's takes.
func batchFolder(t *testing.T, checks string, units ...string) (job, dir string) {
	t.Helper()
	job = jobFolder(t, checks)
	takes := filepath.Join(filepath.Dir(job), "takes")
	dir = filepath.Join(t.TempDir(), "batch")
	for _, u := range units {
		if err := os.MkdirAll(filepath.Join(dir, u), 0o777); err != nil {
			t.Fatal(err)
		}
		if err := os.CopyFS(filepath.Join(dir, u, "takes"), os.DirFS(takes)); err != nil {
			t.Fatal(err)
		}
	}
	return job, dir
}

// One slip a unit and a summary; what is no unit is left alone; the second run
// gives the same bytes, also with the slips among the units.
func TestUnits(t *testing.T) {
	job, dir := batchFolder(t, gainCheck("Gain", `min = "19 dB"`), "u1", "u2", "u3")
	if err := os.MkdirAll(filepath.Join(dir, "old"), 0o777); err != nil {
		t.Fatal(err)
	}
	for _, name := range []string{"old/slip.json", "notes.txt"} {
		if err := os.WriteFile(filepath.Join(dir, name), []byte("{}"), 0o666); err != nil {
			t.Fatal(err)
		}
	}
	os.Remove(filepath.Join(dir, "u3", "takes", "tone.wav"))
	out := filepath.Join(dir, "slips")
	status, stdout, stderr := call(t, "run", job, "--units", dir, "--out", out)
	if status != 3 || !strings.Contains(stderr, "unit u3: take tone") || strings.Count(stderr, "\n") != 1 {
		t.Fatalf("status %d, stderr %q", status, stderr)
	}
	var doc struct {
		Verdict string
		Units   []struct {
			Name, Verdict, Slip string
			Open                []string
		}
		Checks []struct {
			Name  string
			Group struct {
				Count int
				Mean  *float64
			}
		}
	}
	data, err := os.ReadFile(filepath.Join(out, "summary.json"))
	if err != nil {
		t.Fatal(err)
	}
	if err := json.Unmarshal(data, &doc); err != nil || doc.Verdict != "inconclusive" || len(doc.Units) != 3 {
		t.Fatalf("%v: %s", err, data)
	}
	if u := doc.Units[2]; u.Name != "u3" || len(u.Open) != 1 {
		t.Errorf("u3: %+v", u)
	}
	if g := doc.Checks[0].Group; g.Count != 2 || g.Mean == nil || *g.Mean < 20 || *g.Mean > 20.01 {
		t.Errorf("group %+v", g)
	}
	page, err := os.ReadFile(filepath.Join(out, "summary.html"))
	if err != nil {
		t.Fatal(err)
	}
	checkPage(t, string(page))
	for _, u := range doc.Units {
		if _, err := os.Stat(filepath.Join(out, filepath.FromSlash(u.Slip))); err != nil {
			t.Error(err)
		}
		if !strings.Contains(stdout, u.Name+": ") {
			t.Errorf("stdout does not name %s", u.Name)
		}
	}
	before := tree(t, out)
	if status, _, _ := call(t, "run", job, "--units", dir, "--out", out); status != 3 {
		t.Errorf("a second time: status %d", status)
	}
	for name, text := range tree(t, out) {
		if before[name] != text {
			t.Errorf("%s differs the second time", name)
		}
	}
	if status, again, stderr := call(t, "recheck", filepath.Join(out, "u1", "slip.json"), "--job", job, "--takes", filepath.Join(dir, "u1")); status != 0 || !strings.HasPrefix(again, "same") {
		t.Errorf("recheck: status %d, %q, %q", status, again, stderr)
	}
	for _, args := range [][]string{
		{"run", job, "--units", filepath.Join(dir, "none")},
		{"run", job, "--units", filepath.Join(dir, "u1", "takes")},
		{"run", job, job, "--units", dir},
		{"run", job, "--units", dir, "--json"},
		{"run", job, "--units", dir, "--bundle", "x.zip"},
	} {
		if status, stdout, stderr := call(t, args...); status != 2 || stdout != "" || strings.Count(stderr, "\n") != 1 {
			t.Errorf("%q: status %d, stdout %q, stderr %q", args[1:], status, stdout, stderr)
		}
	}
}

// What is withheld is in none of the files, wherever it stood; the rest stays,
// and a recheck knows of it.
func TestRedact(t *testing.T) {
	const who, client = "Quenby Underhay", "Zennor Archive"
	path := jobFolder(t, gainCheck("Gain", "min = \"19 dB\"\nwaiver = { by = \""+who+"\", why = \"for "+client+"\" }"))
	text, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	fields := "customer = \"" + client + "\"\nnotes = \"asked for by " + client + "\"\n[record]\noperator = \"" + who + "\"\n[mains]\n"
	if err := os.WriteFile(path, []byte(strings.Replace(string(text), "[mains]\n", fields, 1)), 0o666); err != nil {
		t.Fatal(err)
	}
	dir, plain, packed := filepath.Dir(path), filepath.Join(t.TempDir(), "plain"), filepath.Join(t.TempDir(), "r.zip")
	if status, _, stderr := call(t, "run", path, "--out", plain); status != 0 {
		t.Fatal(stderr)
	}
	if status, _, stderr := call(t, "run", path, "--redact", "operator,customer", "--bundle", packed); status != 0 {
		t.Fatal(stderr)
	}
	open := 0
	for name, data := range tree(t, plain) {
		if strings.Contains(data, who) && strings.Contains(data, client) {
			open++
		}
		_ = name
	}
	if open < 3 {
		t.Fatalf("only %d files of the plain slip hold the names: the test sees nothing", open)
	}
	files := tree(t, filepath.Join(dir, "slip"))
	for name, data := range unzip(t, packed) {
		files["bundle "+name] = data
	}
	for name, data := range files {
		if strings.Contains(data, who) || strings.Contains(data, client) {
			t.Errorf("%s holds a withheld name", name)
		}
	}
	if !strings.Contains(files["slip.json"], "(withheld)") || !strings.Contains(files["slip.json"], `"serial": "007"`) {
		t.Error("the redacted slip does not say so, or lost its serial number")
	}
	if status, stdout, stderr := call(t, "recheck", filepath.Join(dir, "slip", "slip.json")); status != 0 || !strings.HasPrefix(stdout, "same") {
		t.Errorf("recheck: status %d, %q, %q", status, stdout, stderr)
	}
	if status, _, stderr := call(t, "run", path, "--redact", "operatr"); status != 2 || !strings.Contains(stderr, "operator") {
		t.Errorf("no such field: status %d, %q", status, stderr)
	}
}

func unzip(t *testing.T, path string) map[string]string {
	t.Helper()
	z, err := zip.OpenReader(path)
	if err != nil {
		t.Fatal(err)
	}
	defer z.Close()
	out := map[string]string{}
	for _, f := range z.File {
		r, err := f.Open()
		if err != nil {
			t.Fatal(err)
		}
		data, err := io.ReadAll(r)
		if err != nil {
			t.Fatal(err)
		}
		r.Close()
		out[f.Name] = string(data)
	}
	return out
}

func TestBundle(t *testing.T) {
	path := jobFolder(t, gainCheck("Gain", `min = "19 dB"`))
	dir := filepath.Dir(path)
	file := filepath.Join(t.TempDir(), "slip.zip")
	status, stdout, stderr := call(t, "run", path, "--bundle", file)
	if status != 0 || stderr != "" || !strings.Contains(stdout, "bundle ") {
		t.Fatalf("status %d: %s", status, stderr)
	}
	got := unzip(t, file)
	for name, data := range tree(t, filepath.Join(dir, "slip")) {
		if got[name] != data {
			t.Errorf("%s is not in the bundle as it stands in the slip", name)
		}
	}
	job, _ := os.ReadFile(path)
	take, err := os.ReadFile(filepath.Join(dir, "takes", "tone.wav"))
	if err != nil {
		t.Fatal(err)
	}
	sum := sha256.Sum256(take)
	if got["job/bench.toml"] != string(job) || !strings.Contains(got["takes.sha256"], hex.EncodeToString(sum[:])+"  takes/tone.wav\n") {
		t.Errorf("the job or the takes' hashes are missing: %q", got["takes.sha256"])
	}
	if _, there := got["job/takes/tone.wav"]; there {
		t.Error("a take is in it unasked")
	}
	first, _ := os.ReadFile(file)
	call(t, "run", path, "--bundle", file, "--workers", "3")
	if second, _ := os.ReadFile(file); !bytes.Equal(first, second) {
		t.Error("the same slip gives another bundle")
	}
	with := filepath.Join(t.TempDir(), "takes.zip")
	if status, _, stderr := call(t, "run", path, "--bundle", with, "--bundle-takes", "--bundle-limit", "20 MB"); status != 0 {
		t.Fatal(stderr)
	}
	if unzip(t, with)["job/takes/tone.wav"] != string(take) {
		t.Error("the take is not in the bundle")
	}
	// Under a limit that all of it does not meet the figures go; under one that
	// nothing meets no bundle is written.
	small := filepath.Join(t.TempDir(), "small.zip")
	status, stdout, _ = call(t, "run", path, "--bundle", small, "--bundle-limit", strconv.Itoa(len(first)-100))
	if st, err := os.Stat(small); status != 0 || err != nil || st.Size() > int64(len(first)-100) || !strings.Contains(stdout, "without its") {
		t.Errorf("a little less: status %d, %v, all of it takes %d bytes\n%s", status, err, len(first), stdout)
	}
	none := filepath.Join(t.TempDir(), "none.zip")
	if status, _, stderr := call(t, "run", path, "--bundle", none, "--bundle-limit", "1 kB"); status != 2 || !strings.Contains(stderr, none) {
		t.Errorf("1 kB: status %d, %q", status, stderr)
	}
	for _, left := range []string{none, filepath.Join(filepath.Dir(none), ".new-none.zip")} {
		if _, err := os.Stat(left); err == nil {
			t.Errorf("%s was left", left)
		}
	}
	for _, args := range [][]string{
		{"run", path, "--bundle", "x.tar"},
		{"run", path, "--bundle", "x.zip", "--bundle-limit", "big"},
		{"run", path, "--bundle-takes"},
		{"run", path, "--bundle", filepath.Join(path, "x.zip")},
	} {
		if status, _, stderr := call(t, args...); status != 2 || strings.Count(stderr, "\n") != 1 {
			t.Errorf("%q: status %d, stderr %q", args[1:], status, stderr)
		}
	}
}
