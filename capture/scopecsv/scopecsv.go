// Package scopecsv reads the text exports of oscilloscopes and loggers: tables
// of samples with or without headers, settings, a time column.
//
// It works from structure, numbers and units and knows no maker. A file is
// read once, whole, into planar float64 volts. What had to be assumed is
// listed in Info.Assumptions; what is doubtful carries a flag; what cannot be
// told apart is refused with the line and the job-file key that settles it.
package scopecsv

import (
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"

	"benchslip/capture/recording"
)

// Limits of what is read. Memory stays below 10 bytes a byte of text: the
// text, and 8 bytes a cell of at least one byte.
const (
	maxFile  = 1 << 29 // bytes of a file
	maxRow   = 1 << 18 // bytes of a row
	maxField = 1 << 15 // bytes of a cell
	maxWidth = 1 << 10 // cells of a row
)

// table is a recording held in memory. ReadAt only reads it, so it may be
// called from several goroutines.
type table struct {
	info    recording.Info
	columns [][]float64 // planar, one slice of Info.Frames a channel
}

func (t *table) Info() *recording.Info { return &t.info }

func (t *table) Close() error { return nil }

func (t *table) ReadAt(dst [][]float64, frame int64) (int, error) {
	if len(dst) != len(t.columns) {
		return 0, fmt.Errorf("scopecsv: %d buffers for %d channels", len(dst), len(t.columns))
	}
	if frame < 0 {
		return 0, fmt.Errorf("scopecsv: frame %d is before the start", frame)
	}
	n := 0
	for c, d := range dst {
		if d != nil && frame < t.info.Frames {
			n = copy(d, t.columns[c][frame:])
		}
	}
	return n, nil
}

// Sniff reports whether a file that begins with head may be a text table: it
// is text in UTF-8, UTF-16 or an 8-bit code, perhaps after a run of NULs.
// Files that turn out to hold something else are refused by Open by name.
func Sniff(head []byte) bool {
	if len(head) == 0 {
		return false
	}
	if wide, _, _ := utf16Order(head); wide {
		return true
	}
	text, control := 0, 0
	for _, c := range head {
		switch {
		case c >= 0x20, c == '\t', c == '\n', c == '\r', c == '\f', c == 0x1a:
			text++
		case c != 0:
			control++
		}
	}
	// A few stray control bytes are Open's to report, with their line.
	return text > 0 && control*20 <= text && !foreign(head)
}

// Open reads the table at path. Errors are *recording.Error: ErrFormat for
// what is no table of samples or is broken, ErrUnsupported for tables of
// another kind, ErrAmbiguous where opt (a take's csv keys) must help.
func Open(path string, opt recording.Options) (recording.Recording, error) {
	text, size, err := load(path)
	if err != nil {
		return nil, err
	}
	return parse(path, text, size, opt)
}

// load reads a regular file of bounded size.
func load(path string) ([]byte, int64, error) {
	bad := func(class error, what, fix string) error {
		return &recording.Error{Path: path, Offset: -1, What: what, Fix: fix, Class: class}
	}
	st, err := os.Stat(path)
	if err != nil {
		return nil, 0, bad(err, cause(err), "")
	}
	if !st.Mode().IsRegular() {
		return nil, 0, bad(recording.ErrFormat, "is not an ordinary file", "name a recording")
	}
	if st.Size() > maxFile {
		return nil, 0, bad(recording.ErrUnsupported, fmt.Sprintf("the file has %d bytes; tables are read up to %d", st.Size(), maxFile), "split it, or export it as WAV")
	}
	f, err := os.Open(path)
	if err != nil {
		return nil, 0, bad(err, cause(err), "")
	}
	defer f.Close()
	text := make([]byte, 0, st.Size()+1) // the size the file has, bounded above
	for {
		n, err := f.Read(text[len(text):cap(text)])
		text = text[:len(text)+n]
		if errors.Is(err, io.EOF) {
			return text, int64(len(text)), nil
		}
		if err != nil {
			return nil, 0, bad(err, cause(err), "")
		}
		if len(text) > maxFile {
			return nil, 0, bad(recording.ErrUnsupported, "the file grows while it is read", "wait until the instrument has finished")
		}
		if len(text) == cap(text) {
			text = append(text, 0)[:len(text)]
		}
	}
}

// cause words a file-system error without its path, which the error repeats.
func cause(err error) string {
	var pe *fs.PathError
	switch {
	case errors.Is(err, fs.ErrNotExist):
		return "there is no such file"
	case errors.As(err, &pe):
		return pe.Err.Error()
	}
	return err.Error()
}
