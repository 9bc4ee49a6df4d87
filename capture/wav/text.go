package wav

import (
	"bytes"
	"fmt"
	"strings"
	"unicode/utf8"
)

// Bounds on what is kept of descriptive chunks.
const (
	maxTextBytes  = 1 << 18 // of one chunk
	maxTextFields = 256     // of one file
)

// readInfoList adds the fields of a LIST chunk of type INFO to text under
// their four-letter names (ICMT comment, INAM title, ISFT software ...).
// Fields that do not fit are left out: they describe, they do not measure.
func readInfoList(text map[string]string, b []byte) {
	if len(b) < 4 || string(b[:4]) != "INFO" {
		return
	}
	for b = b[4:]; len(b) >= 8; {
		id, size := string(b[:4]), int64(le.Uint32(b[4:]))
		if !printable(b) {
			return
		}
		b = b[8:]
		if size > int64(len(b)) {
			size = int64(len(b))
		}
		addText(text, id, b[:size])
		b = b[min(size+size%2, int64(len(b))):]
	}
}

// readBroadcast adds the fields of a bext chunk (EBU Tech 3285: fixed widths,
// then the coding history after byte 602).
func readBroadcast(text map[string]string, b []byte) {
	at := 0
	for _, f := range []struct {
		name  string
		width int
	}{
		{"description", 256}, {"originator", 32}, {"originator reference", 32},
		{"origination date", 10}, {"origination time", 8},
	} {
		if at+f.width > len(b) {
			return
		}
		addText(text, "bext "+f.name, b[at:at+f.width])
		at += f.width
	}
	if at+8 <= len(b) {
		if t := le.Uint64(b[at:]); t != 0 {
			addText(text, "bext time reference", fmt.Append(nil, t)) // frames since midnight
		}
	}
	if len(b) > 602 {
		addText(text, "bext coding history", b[602:])
	}
}

// addText stores b, cut at its first NUL, under name. Bytes that are no UTF-8
// are taken as Latin-1. A second field of one name is stored as "name 2".
func addText(text map[string]string, name string, b []byte) {
	if i := bytes.IndexByte(b, 0); i >= 0 {
		b = b[:i]
	}
	s := string(b)
	if !utf8.ValidString(s) {
		r := make([]rune, len(b))
		for i, c := range b {
			r[i] = rune(c)
		}
		s = string(r)
	}
	if s = strings.TrimSpace(s); s == "" || len(text) == maxTextFields {
		return
	}
	key := name
	for n := 2; ; n++ {
		if _, taken := text[key]; !taken {
			break
		}
		if n > 9 {
			return
		}
		key = fmt.Sprintf("%s %d", name, n)
	}
	text[key] = s
}
