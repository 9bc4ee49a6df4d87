package main

import (
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
)

// A slip is there only while its slip.json is. To replace one, all files are
// written into a staging folder with a dot name; then the old slip.json is
// moved away, the others are renamed into place, and slip.json comes last. A
// run that is killed at any moment leaves the old slip, none (files without
// slip.json count as none), or the whole new one, never a mix; what it leaves
// besides lies under the two dot names, and the next run clears them.
const (
	mainFile = "slip.json"
	staging  = ".slip-new"
	retired  = ".slip-old.json"
)

// outFile is one file of a slip: its name, with / between folders, and content.
type outFile struct {
	Name string
	Data []byte
}

// publisher writes slips. before is called ahead of each change to the file
// system; tests stop there, as a kill would.
type publisher struct {
	before func(action string)
}

// publish puts files, slip.json among them, into dir. Files of the slip that
// stood there before are replaced or, when the new one has no such file,
// removed; all others stay. An error names the path; when it comes before the
// first rename nothing has changed, and folders made here are gone again.
func (p publisher) publish(dir string, files []outFile) error {
	made, err := p.makeDir(dir)
	if err != nil {
		return err
	}
	if err := p.stage(dir, files); err != nil {
		os.RemoveAll(filepath.Join(dir, staging))
		for _, d := range made {
			os.Remove(d) // empty or it stays
		}
		return err
	}
	return p.swap(dir, files)
}

// makeDir makes dir with its parents and returns those it made, deepest first.
func (p publisher) makeDir(dir string) (made []string, err error) {
	for d := filepath.Clean(dir); ; d = filepath.Dir(d) {
		st, err := os.Stat(d)
		if err == nil && !st.IsDir() {
			return nil, fmt.Errorf("%s: is a file, and a folder is wanted to write into", d)
		}
		if err == nil || d == filepath.Dir(d) {
			break
		}
		made = append(made, d)
	}
	p.step("make " + dir)
	if err := os.MkdirAll(dir, 0o777); err != nil {
		for _, d := range made {
			os.Remove(d)
		}
		return nil, fmt.Errorf("%s: cannot be made: %w", dir, cause(err))
	}
	return made, nil
}

// stage writes everything into the staging folder and looks ahead for what
// would stop the renames.
func (p publisher) stage(dir string, files []outFile) error {
	root := filepath.Join(dir, staging)
	if _, err := os.Stat(filepath.Join(dir, mainFile)); errors.Is(err, fs.ErrNotExist) {
		p.drop(dir, ownFiles(dir), files) // what a killed run put in place
	}
	p.step("clear staging")
	if err := os.RemoveAll(root); err != nil {
		return fmt.Errorf("%s: cannot be cleared: %w", root, cause(err))
	}
	for _, f := range files {
		if !filepath.IsLocal(filepath.FromSlash(f.Name)) {
			return fmt.Errorf("%q: no name for a file of a slip", f.Name)
		}
		target := filepath.Join(dir, filepath.FromSlash(f.Name))
		if st, err := os.Stat(target); err == nil && st.IsDir() {
			return fmt.Errorf("%s: is a folder, and a file of that name is to be written", target)
		}
		if st, err := os.Stat(filepath.Dir(target)); err == nil && !st.IsDir() {
			return fmt.Errorf("%s: is a file, and a folder of that name is wanted", filepath.Dir(target))
		}
		path := filepath.Join(root, filepath.FromSlash(f.Name))
		p.step("stage " + f.Name)
		if err := os.MkdirAll(filepath.Dir(path), 0o777); err != nil {
			return fmt.Errorf("%s: cannot be written: %w", dir, cause(err))
		}
		if err := os.WriteFile(path, f.Data, 0o666); err != nil {
			return fmt.Errorf("%s: cannot be written: %w", path, cause(err))
		}
	}
	return nil
}

// swap moves the old slip.json away, the new files into place, slip.json last.
func (p publisher) swap(dir string, files []outFile) error {
	old, gone := filepath.Join(dir, mainFile), filepath.Join(dir, retired)
	stale := ownFiles(dir)
	p.step("retire slip.json")
	if err := os.Rename(old, gone); err != nil && !errors.Is(err, fs.ErrNotExist) {
		os.RemoveAll(filepath.Join(dir, staging))
		return fmt.Errorf("%s: cannot be replaced: %w", old, cause(err))
	}
	put := func(f outFile) error {
		from := filepath.Join(dir, staging, filepath.FromSlash(f.Name))
		to := filepath.Join(dir, filepath.FromSlash(f.Name))
		p.step("place " + f.Name)
		err := os.MkdirAll(filepath.Dir(to), 0o777)
		if err == nil {
			err = os.Rename(from, to)
		}
		if err != nil {
			return fmt.Errorf("%s: cannot be replaced: %w; no slip stands in %s now", to, cause(err), dir)
		}
		return nil
	}
	last := -1
	for i, f := range files {
		if f.Name == mainFile {
			last = i
			continue
		}
		if err := put(f); err != nil {
			return err
		}
	}
	p.drop(dir, stale, files)
	if last < 0 {
		return errors.New("a slip without slip.json")
	}
	if err := put(files[last]); err != nil {
		return err
	}
	p.step("clear staging")
	os.Remove(gone)
	os.RemoveAll(filepath.Join(dir, staging))
	return nil
}

func (p publisher) step(action string) {
	if p.before != nil {
		p.before(action)
	}
}

// ownFiles lists the files of the slip in dir and of those that killed runs
// left there, as their slip.json names them, with their hashes.
func ownFiles(dir string) map[string]string {
	own := map[string]string{}
	for _, list := range []string{retired, filepath.Join(staging, mainFile), mainFile} {
		data, err := os.ReadFile(filepath.Join(dir, list))
		if err != nil {
			continue
		}
		var s struct {
			Files []struct{ Name, SHA256 string }
		}
		if json.Unmarshal(data, &s) != nil {
			continue // cut short by a kill: nothing of it was put in place
		}
		for _, f := range s.Files {
			own[f.Name] = f.SHA256
		}
	}
	return own
}

// drop removes the files that an earlier slip listed and the new one has not,
// while they are still what was written then.
func (p publisher) drop(dir string, stale map[string]string, keep []outFile) {
	wanted := map[string]bool{}
	for _, f := range keep {
		wanted[f.Name] = true
	}
	for name, hash := range stale {
		path := filepath.FromSlash(name)
		if wanted[name] || !filepath.IsLocal(path) {
			continue
		}
		path = filepath.Join(dir, path)
		data, err := os.ReadFile(path)
		if err != nil {
			continue
		}
		if sum := sha256.Sum256(data); hex.EncodeToString(sum[:]) != hash {
			continue // someone else's by now
		}
		p.step("drop " + name)
		os.Remove(path)
		if sub := filepath.Dir(path); sub != filepath.Clean(dir) {
			os.Remove(sub) // only when empty
		}
	}
}

// cause is what a file system error says without the path, which our message
// names itself.
func cause(err error) error {
	var pe *fs.PathError
	if errors.As(err, &pe) {
		return pe.Err
	}
	var le *os.LinkError
	if errors.As(err, &le) {
		return le.Err
	}
	return err
}
