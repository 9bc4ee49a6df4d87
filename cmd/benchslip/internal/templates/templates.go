// Package templates holds the job folders that `benchslip new` writes: one
// commented job file a kind of work, and a text for the folder of takes.
package templates

import (
	"embed"
	"fmt"
	"os"
	"path/filepath"
)

//go:embed preamp.toml cable.toml speaker-stage.toml
var files embed.FS

// Kind is one kind of work.
type Kind struct{ Name, Doc string }

// Kinds lists them in the order of the help.
func Kinds() []Kind {
	return []Kind{
		{"preamp", "verify a microphone preamp after building or repair"},
		{"cable", "quantify what a long balanced run picks up"},
		{"speaker-stage", "verify a small speaker stage into a load"},
	}
}

// note is what stands in the folder of takes.
const note = `Recordings go here, under the names that the job file gives them. Write down
beside them what no recording shows: knob positions, pad, phantom power, load,
source, supply, warm-up, room temperature.
`

// Write makes the folder dir with the job file of a kind, a folder for takes
// and one for gear entries, and returns the job file's path. It comes whole or
// not at all: it is made beside its place under a dot name and then renamed. A
// dir that exists is not touched.
func Write(kind, dir string) (job string, err error) {
	text, err := files.ReadFile(kind + ".toml")
	if err != nil {
		return "", fmt.Errorf("no kind %q", kind)
	}
	if _, err := os.Lstat(dir); err == nil {
		return "", fmt.Errorf("%s: is there already and is not written over; name a new folder", dir)
	}
	dir = filepath.Clean(dir)
	part := filepath.Join(filepath.Dir(dir), ".new-"+filepath.Base(dir))
	if err := os.RemoveAll(part); err != nil {
		return "", err
	}
	defer os.RemoveAll(part)
	for _, sub := range []string{"takes", "gear"} {
		if err := os.MkdirAll(filepath.Join(part, sub), 0o777); err != nil {
			return "", err
		}
	}
	name := kind + ".toml"
	for path, data := range map[string][]byte{name: text, "takes/README.txt": []byte(note)} {
		if err := os.WriteFile(filepath.Join(part, filepath.FromSlash(path)), data, 0o666); err != nil {
			return "", err
		}
	}
	if err := os.Rename(part, dir); err != nil {
		return "", err
	}
	return filepath.Join(dir, name), nil
}
