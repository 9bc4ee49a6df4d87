package main

import (
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

// slipFiles makes the files of a slip whose slip.json lists the others.
func slipFiles(t *testing.T, version string, names ...string) []outFile {
	t.Helper()
	type entry struct {
		Name   string `json:"name"`
		SHA256 string `json:"sha256"`
	}
	doc := struct {
		Version string  `json:"version"`
		Files   []entry `json:"files"`
	}{Version: version}
	var files []outFile
	for _, n := range names {
		data := []byte(version + " of " + n)
		sum := sha256.Sum256(data)
		files = append(files, outFile{n, data})
		doc.Files = append(doc.Files, entry{n, hex.EncodeToString(sum[:])})
	}
	data, err := json.Marshal(doc)
	if err != nil {
		t.Fatal(err)
	}
	// In the middle: being last is the publisher's task, not the list's.
	return append([]outFile{{mainFile, data}}, files...)
}

// tree lists all files below dir with their content.
func tree(t *testing.T, dir string) map[string]string {
	t.Helper()
	got := map[string]string{}
	err := filepath.WalkDir(dir, func(path string, d fs.DirEntry, err error) error {
		if err != nil || d.IsDir() {
			return err
		}
		data, err := os.ReadFile(path)
		rel, _ := filepath.Rel(dir, path)
		got[filepath.ToSlash(rel)] = string(data)
		return err
	})
	if err != nil {
		t.Fatal(err)
	}
	return got
}

// whole reports which version's slip stands in the tree; "" when none does.
// A slip.json whose files are not all there, as it lists them, is a failure.
func whole(t *testing.T, got map[string]string) string {
	t.Helper()
	data, ok := got[mainFile]
	if !ok {
		return ""
	}
	var doc struct {
		Version string
		Files   []struct{ Name, SHA256 string }
	}
	if err := json.Unmarshal([]byte(data), &doc); err != nil {
		t.Fatalf("slip.json is not whole: %v", err)
	}
	for _, f := range doc.Files {
		sum := sha256.Sum256([]byte(got[f.Name]))
		if hex.EncodeToString(sum[:]) != f.SHA256 {
			t.Errorf("slip.json of %s stands beside a %s that is not its own", doc.Version, f.Name)
		}
	}
	return doc.Version
}

type killed struct{}

// publishUntil publishes and stops, as a kill would, before action number n.
// It reports whether that action was reached.
func publishUntil(t *testing.T, dir string, files []outFile, n int) (reached bool) {
	t.Helper()
	defer func() {
		if r := recover(); r != nil {
			if _, ok := r.(killed); !ok {
				panic(r)
			}
			reached = true
		}
	}()
	count := 0
	p := publisher{before: func(string) {
		if count == n {
			panic(killed{})
		}
		count++
	}}
	if err := p.publish(dir, files); err != nil {
		t.Fatal(err)
	}
	return false
}

func TestPublishKilledAtEveryMoment(t *testing.T) {
	oldFiles := slipFiles(t, "old", "slip.html", "slip.txt", "plots/1-a.svg", "plots/2-gone.svg", "only-old/x.csv")
	newFiles := slipFiles(t, "new", "slip.html", "slip.txt", "plots/1-a.svg", "plots/3-more.svg")
	moments := 0
	for n := 0; ; n++ {
		dir := filepath.Join(t.TempDir(), "out")
		if err := (publisher{}).publish(dir, oldFiles); err != nil {
			t.Fatal(err)
		}
		foreign := filepath.Join(dir, "plots", "mine.txt")
		if err := os.WriteFile(foreign, []byte("mine"), 0o666); err != nil {
			t.Fatal(err)
		}
		reached := publishUntil(t, dir, newFiles, n)
		got := tree(t, dir)
		if got["plots/mine.txt"] != "mine" {
			t.Errorf("moment %d: a foreign file is gone", n)
		}
		standing := whole(t, got)
		if !reached && standing != "new" {
			t.Errorf("an undisturbed run leaves %q", standing)
		}
		// Killed once more at the same place, then let through.
		publishUntil(t, dir, newFiles, n)
		whole(t, tree(t, dir))
		if err := (publisher{}).publish(dir, newFiles); err != nil {
			t.Fatalf("moment %d: the next run fails: %v", n, err)
		}
		got = tree(t, dir)
		if v := whole(t, got); v != "new" {
			t.Errorf("moment %d: the next run leaves %q", n, v)
		}
		for name := range got {
			_, ours := map[string]bool{mainFile: true, "slip.html": true, "slip.txt": true, "plots/1-a.svg": true, "plots/3-more.svg": true, "plots/mine.txt": true}[name]
			if !ours {
				t.Errorf("moment %d: the next run leaves %s behind", n, name)
			}
		}
		if !reached {
			break
		}
		moments++
	}
	if moments < 12 {
		t.Errorf("only %d moments to be killed at: does the test still see each step?", moments)
	}
}

func TestPublishKeepsWhatOthersChanged(t *testing.T) {
	dir := t.TempDir()
	if err := (publisher{}).publish(dir, slipFiles(t, "old", "slip.html", "plots/2.svg")); err != nil {
		t.Fatal(err)
	}
	edited := filepath.Join(dir, "plots", "2.svg")
	if err := os.WriteFile(edited, []byte("annotated by hand"), 0o666); err != nil {
		t.Fatal(err)
	}
	if err := (publisher{}).publish(dir, slipFiles(t, "new", "slip.html")); err != nil {
		t.Fatal(err)
	}
	if got := tree(t, dir)["plots/2.svg"]; got != "annotated by hand" {
		t.Errorf("a file changed by hand was removed or replaced: %q", got)
	}
}

// Only files that a slip lists go, and only inside its folder.
func TestPublishNeverReachesOutside(t *testing.T) {
	top := t.TempDir()
	dir := filepath.Join(top, "out")
	outside := filepath.Join(top, "precious.wav")
	if err := os.WriteFile(outside, []byte("take"), 0o666); err != nil {
		t.Fatal(err)
	}
	sum := sha256.Sum256([]byte("take"))
	forged := `{"files": [{"name": "../precious.wav", "sha256": "` + hex.EncodeToString(sum[:]) + `"}]}`
	if err := os.Mkdir(dir, 0o777); err != nil {
		t.Fatal(err)
	}
	if err := os.WriteFile(filepath.Join(dir, mainFile), []byte(forged), 0o666); err != nil {
		t.Fatal(err)
	}
	if err := (publisher{}).publish(dir, slipFiles(t, "new", "slip.html")); err != nil {
		t.Fatal(err)
	}
	if _, err := os.Stat(outside); err != nil {
		t.Errorf("a file outside the slip's folder is gone: %v", err)
	}
	if err := (publisher{}).publish(dir, []outFile{{"../escape", nil}}); err == nil {
		t.Error("a file name that leaves the folder was taken")
	}
}

func TestPublishLeavesNothingWhereItCannotWrite(t *testing.T) {
	top := t.TempDir()
	file := filepath.Join(top, "file")
	if err := os.WriteFile(file, []byte("x"), 0o666); err != nil {
		t.Fatal(err)
	}
	blocked := filepath.Join(top, "blocked")
	if err := os.MkdirAll(filepath.Join(blocked, "slip.html"), 0o777); err != nil {
		t.Fatal(err)
	}
	for _, dir := range []string{file, filepath.Join(file, "sub", "dir"), blocked} {
		before := tree(t, top)
		err := (publisher{}).publish(dir, slipFiles(t, "new", "slip.html"))
		if err == nil {
			t.Fatalf("writing into %s passed", dir)
		}
		if !strings.Contains(err.Error(), filepath.Base(top)) || strings.Contains(err.Error(), "\n") {
			t.Errorf("the message is not one line naming the path: %v", err)
		}
		if after := tree(t, top); len(after) != len(before) {
			t.Errorf("files were left behind: %v", after)
		}
		if entries, _ := os.ReadDir(blocked); len(entries) != 1 {
			t.Errorf("%v left in %s", entries, blocked)
		}
	}
}
