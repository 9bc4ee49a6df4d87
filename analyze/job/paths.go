package job

import (
	"os"
	"path/filepath"
	"regexp"
	"strings"
)

// confine turns a path of the job file into one that can be opened, or says
// why it may not be used. Paths are written with / and stay inside root: no
// dots that climb (not even when they come back), no absolute path, no link
// that leads out. outside lifts that. Nothing is opened; whether the file is
// there, or is a file at all, is for the run to see.
func confine(root, typed string, outside bool) (path, why string) {
	switch {
	case strings.TrimSpace(typed) == "":
		return "", "is empty: expected the name of a file"
	case strings.Contains(typed, `\`):
		return "", "has a backslash: use / in paths"
	}
	absolute := strings.HasPrefix(typed, "/") || drive.MatchString(typed)
	if outside {
		if absolute {
			return filepath.FromSlash(typed), ""
		}
		return filepath.Join(root, filepath.FromSlash(typed)), ""
	}
	const stay = ", outside the job's folder: move the file there, or run with --allow-outside"
	if absolute {
		return "", "is an absolute path" + stay
	}
	for _, part := range strings.Split(typed, "/") {
		if part == ".." {
			return "", "climbs with .." + stay
		}
	}
	local := filepath.FromSlash(typed)
	if !filepath.IsLocal(local) { // reserved names of some systems
		return "", "is no path inside the job's folder"
	}
	path = filepath.Join(root, local)
	if leadsOut(root, path) {
		return "", "is a link" + stay
	}
	return path, ""
}

// drive finds paths with a drive letter.
var drive = regexp.MustCompile(`^[A-Za-z]:`)

// leadsOut follows the links of path and reports whether it ends outside
// root. A file that is not there yet is judged by where it would be made.
func leadsOut(root, path string) bool {
	base, err := truePath(root, 0)
	if err != nil {
		return true
	}
	end, err := truePath(path, 0)
	if err != nil {
		return true
	}
	rel, err := filepath.Rel(base, end)
	return err != nil || rel == ".." || strings.HasPrefix(rel, ".."+string(filepath.Separator))
}

// truePath resolves the links of a path of which the last parts may be missing.
func truePath(path string, links int) (string, error) {
	const deepest = 64 // links behind links; more is a circle
	if links > deepest {
		return "", os.ErrInvalid
	}
	path, err := filepath.Abs(path)
	if err != nil {
		return "", err
	}
	if p, err := filepath.EvalSymlinks(path); err == nil {
		return p, nil
	}
	parent := filepath.Dir(path)
	if parent == path {
		return path, nil
	}
	if to, err := os.Readlink(path); err == nil { // a link to nothing
		if !filepath.IsAbs(to) {
			to = filepath.Join(parent, to)
		}
		return truePath(to, links+1)
	}
	up, err := truePath(parent, links)
	if err != nil {
		return "", err
	}
	return filepath.Join(up, filepath.Base(path)), nil
}
