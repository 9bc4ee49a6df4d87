package scopecsv

import (
	"bytes"
	"unicode/utf16"
	"unicode/utf8"
)

// utf16Order tells UTF-16 by its byte-order mark or, without one, by NULs in
// nearly every second byte of text that is mostly ASCII. skip is the length
// of the mark.
func utf16Order(b []byte) (wide, big bool, skip int) {
	if len(b) >= 2 {
		switch {
		case b[0] == 0xff && b[1] == 0xfe:
			return true, false, 2
		case b[0] == 0xfe && b[1] == 0xff:
			return true, true, 2
		}
	}
	n := min(len(b), 512) &^ 1
	if n < 8 {
		return false, false, 0
	}
	var nul, char [2]int
	for i := range n {
		switch c := b[i]; {
		case c == 0:
			nul[i&1]++
		case c >= 0x20 && c < 0x7f || c == '\t' || c == '\r' || c == '\n':
			char[i&1]++
		}
	}
	half := n / 2
	switch {
	case nul[1] > half*9/10 && char[0] > half*9/10:
		return true, false, 0
	case nul[0] > half*9/10 && char[1] > half*9/10:
		return true, true, 0
	}
	return false, false, 0
}

// plainText turns the bytes of a file into bytes whose separators, digits and
// line ends are ASCII: UTF-16 becomes UTF-8, a byte-order mark goes, and a
// trailing end-of-file character (0x1A) goes. how names the coding.
func plainText(b []byte) (text []byte, how string) {
	how = "text"
	if wide, big, skip := utf16Order(b); wide {
		how = "UTF-16 text"
		out := make([]byte, 0, len(b)/2+16)
		var pending rune
		for i := skip; i+1 < len(b); i += 2 {
			u := rune(b[i]) | rune(b[i+1])<<8
			if big {
				u = rune(b[i])<<8 | rune(b[i+1])
			}
			switch {
			case pending != 0:
				out = utf8.AppendRune(out, utf16.DecodeRune(pending, u))
				pending = 0
			case u >= 0xd800 && u < 0xdc00:
				pending = u
			case u < 0x80:
				out = append(out, byte(u))
			default:
				out = utf8.AppendRune(out, u)
			}
		}
		b = out
	}
	b = bytes.TrimPrefix(b, []byte("\xef\xbb\xbf"))
	for len(b) > 0 && b[len(b)-1] == 0x1a {
		b = b[:len(b)-1]
	}
	return b, how
}

// words makes text printable: bytes that are no UTF-8 are read as the 8-bit
// code whose characters 0xA0..0xFF stand at the same numbers, which holds the
// micro and degree signs; control characters go.
func words(b []byte) string {
	if !utf8.Valid(b) {
		var out []rune
		for len(b) > 0 {
			r, n := utf8.DecodeRune(b)
			if r == utf8.RuneError && n == 1 {
				r = rune(b[0])
			}
			out = append(out, r)
			b = b[n:]
		}
		b = []byte(string(out))
	}
	b = bytes.Map(func(r rune) rune {
		if r < 0x20 || r >= 0x7f && r < 0xa0 {
			if r == '\t' || r == '\n' || r == '\r' {
				return ' '
			}
			return -1
		}
		if r == 0xa0 || r == 0xfeff {
			return ' '
		}
		return r
	}, b)
	return string(bytes.TrimSpace(b))
}

// short cuts text for a message.
func short(s string) string {
	const most = 40
	if utf8.RuneCountInString(s) <= most {
		return s
	}
	return string([]rune(s)[:most]) + "..."
}

// lineAt returns the line that starts at p without its end, and where the
// next one starts. Lines end in LF, CR LF, CR CR LF or CR alone.
func lineAt(b []byte, p int) (line []byte, next int) {
	q := p
	for q < len(b) && b[q] != '\n' && b[q] != '\r' {
		q++
	}
	return b[p:q], lineEnd(b, q)
}

// lineEnd returns the position after the line end at q.
func lineEnd(b []byte, q int) int {
	if q >= len(b) {
		return len(b)
	}
	if b[q] == '\r' {
		r := q + 1
		for r < len(b) && r < q+3 && b[r] == '\r' {
			r++
		}
		if r < len(b) && b[r] == '\n' {
			return r + 1
		}
	}
	return q + 1
}

// logicalLine is lineAt, but a quoted cell may hold line ends: up to 16 lines
// are joined until the quotes are closed; when they never are, the line stands
// alone. lines is how many physical lines it covers.
func logicalLine(b []byte, p int) (line []byte, next, lines int) {
	line, next = lineAt(b, p)
	if bytes.Count(line, quote)&1 == 0 {
		return line, next, 1
	}
	for q, n := next, 2; n <= 16 && q < len(b) && q-p < maxField; n++ {
		more, after := lineAt(b, q)
		if bytes.Count(more, quote)&1 == 1 {
			return b[p : q+len(more)], after, n
		}
		q = after
	}
	return line, next, 1
}

var quote = []byte{'"'}
