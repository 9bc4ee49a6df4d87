// Package capture opens recordings: it looks at what a file holds, never at
// its name, and hands it to the importer that knows the format. The types of
// a recording are those of package recording, under the same names here.
package capture

import (
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"

	"benchslip/capture/recording"
	"benchslip/capture/scopecsv"
	"benchslip/capture/wav"
)

type (
	Recording = recording.Recording
	Info      = recording.Info
	Channel   = recording.Channel
	Run       = recording.Run
	Flag      = recording.Flag
	Error     = recording.Error
	Options   = recording.Options
)

// Kinds of samples.
const (
	Audio = recording.Audio
	Scope = recording.Scope
)

// Cause classes of an Error.
var (
	ErrFormat      = recording.ErrFormat
	ErrUnsupported = recording.ErrUnsupported
	ErrAmbiguous   = recording.ErrAmbiguous
)

// An Importer reads one kind of file.
type Importer struct {
	Name  string
	Sniff func(head []byte) bool // does a file that begins like this look like mine?
	Open  func(path string, opt Options) (Recording, error)
}

// Importers is the list of what can be read, asked in this order. A format
// with a signature stands before the text formats, which have none.
func Importers() []Importer {
	return []Importer{
		{"WAV", wav.Sniff, func(path string, _ Options) (Recording, error) { return wav.Open(path) }},
		{"scope CSV", scopecsv.Sniff, func(path string, opt Options) (Recording, error) { return scopecsv.Open(path, opt) }},
	}
}

// headSize is how much of a file an importer sees before it says whether the
// file is its own, in bytes.
const headSize = 4096

// Open opens the recording at path with the importer that recognises its
// content. opt helps with text files and is ignored by others.
//
// A path that is no ordinary file (a folder, a pipe, a device) is not opened.
// Errors are of type *Error with the path as it was given; a missing file
// unwraps to fs.ErrNotExist.
func Open(path string, opt Options) (Recording, error) {
	st, err := os.Stat(path)
	if err != nil {
		return nil, pathFault(path, err)
	}
	if !st.Mode().IsRegular() {
		return nil, &Error{Path: path, Offset: -1, What: "is " + kindOf(st.Mode()) + ", not a file",
			Fix: "name a recording", Class: ErrFormat}
	}
	head, err := readHead(path)
	if err != nil {
		return nil, pathFault(path, err)
	}
	if len(head) == 0 {
		return nil, &Error{Path: path, Offset: -1, What: "the file is empty", Fix: "record it again", Class: ErrFormat}
	}
	for _, im := range Importers() {
		if im.Sniff(head) {
			return im.Open(path, opt)
		}
	}
	return nil, &Error{Path: path, Offset: -1, What: "neither a WAV file nor a table of samples (the file begins with " + beginning(head) + ")",
		Fix: "export it as WAV or CSV", Class: ErrFormat}
}

func readHead(path string) ([]byte, error) {
	f, err := os.Open(path)
	if err != nil {
		return nil, err
	}
	defer f.Close()
	head := make([]byte, headSize)
	n, err := io.ReadFull(f, head)
	if err != nil && !errors.Is(err, io.EOF) && !errors.Is(err, io.ErrUnexpectedEOF) {
		return nil, err
	}
	return head[:n], nil
}

// pathFault words an error of the file system without the system's own
// prefix, which repeats the path.
func pathFault(path string, err error) error {
	e := &Error{Path: path, Offset: -1, Class: err}
	switch {
	case errors.Is(err, fs.ErrNotExist):
		e.What = "there is no such file"
	case errors.Is(err, fs.ErrPermission):
		e.What = "may not be read"
	default:
		var pe *fs.PathError
		e.What = err.Error()
		if errors.As(err, &pe) {
			e.What = pe.Err.Error()
		}
	}
	return e
}

func kindOf(m fs.FileMode) string {
	switch {
	case m.IsDir():
		return "a folder"
	case m&fs.ModeNamedPipe != 0:
		return "a pipe"
	case m&fs.ModeSocket != 0:
		return "a socket"
	case m&fs.ModeDevice != 0:
		return "a device"
	}
	return "something else"
}

// beginning shows the first bytes of a file: as text where they are text.
func beginning(head []byte) string {
	const show = 8
	head = head[:min(show, len(head))]
	for _, b := range head {
		if b < 0x20 || b > 0x7e {
			return fmt.Sprintf("bytes % x", head)
		}
	}
	return fmt.Sprintf("%q", head)
}
