package scopecsv

import (
	"bytes"
	"fmt"

	"benchslip/capture/recording"
)

// foreign tells files that open with the signature of another kind.
func foreign(head []byte) bool {
	for _, sig := range []string{"RIFF", "RF64", "BW64", "PK\x03\x04", "%PDF", "\x89PNG", "\x1f\x8b", "{\\rtf", "\x89HDF"} {
		if bytes.HasPrefix(head, []byte(sig)) {
			return true
		}
	}
	return false
}

// refuseForeign refuses text that is no table of samples, and binary bytes.
func (f *file) refuseForeign() error {
	b := f.text
	if len(bytes.Trim(b, " \t\r\n\x00")) == 0 {
		return f.fault(0, recording.ErrFormat, "the file holds nothing but blanks", "record it again")
	}
	start := bytes.TrimLeft(b[:min(len(b), 4096)], " \t\r\n\x00")
	no := func(what, fix string) error { return f.fault(1, recording.ErrFormat, what, fix) }
	switch {
	case bytes.HasPrefix(start, []byte("version http")) && bytes.Contains(start, []byte("oid ")):
		return no("a pointer to a file in a large-file store, not the file itself", "fetch the file it points to")
	case bytes.HasPrefix(start, []byte("{")), bytes.HasPrefix(start, []byte("[{")), bytes.HasPrefix(start, []byte("[\n")):
		return no("structured text in braces, not a table of samples", "export the samples as a table")
	case bytes.HasPrefix(start, []byte("<")):
		return no("markup, not a table of samples", "export the samples as a table")
	}
	for i, c := range b {
		if binary[c] {
			line, at := 1, 0
			for at < i {
				_, next := lineAt(b, at)
				if next > i {
					break
				}
				at = next
				line++
			}
			return f.fault(line, recording.ErrFormat, fmt.Sprintf("a binary byte 0x%02x at column %d in a table of text", c, i-at+1), "export the samples as a table")
		}
	}
	return nil
}

// binary marks bytes that stand in no text. NUL is dealt with by the reader,
// 0x1A was the end of text files once.
var binary = func() (t [256]bool) {
	for c := range 0x20 {
		t[c] = c != 0 && c != '\t' && c != '\n' && c != '\r' && c != '\f' && c != 0x0b && c != 0x1a
	}
	t[0x7f] = true
	return t
}()
