package report

import (
	"strings"
	"unicode"
	"unicode/utf8"
)

// Clean makes text that people typed safe to print in one line anywhere:
// line breaks and tabs become blanks, every other control character, every
// direction mark and everything that is no character becomes U+FFFD, so that
// it is seen that something stood there. A terminal is never sent an escape
// sequence and a direction mark never turns a verdict around.
func Clean(s string) string { return clean(s, false) }

// CleanLines is Clean that keeps line breaks as "\n".
func CleanLines(s string) string { return clean(s, true) }

func clean(s string, lines bool) string {
	s = strings.ReplaceAll(s, "\r\n", "\n")
	return strings.Map(func(r rune) rune {
		switch {
		case r == '\n' && lines:
			return r
		case r == '\n' || r == '\t' || r == '\r' || r == 0x2028 || r == 0x2029:
			return ' '
		case !Printable(r) || IsDirection(r):
			return utf8.RuneError
		}
		return r
	}, s)
}

// Printable is false for control characters and for code points that are no
// characters; XML 1.0 (section 2.2) forbids most of the same.
func Printable(r rune) bool {
	return !unicode.Is(unicode.Cc, r) && r&0xfffe != 0xfffe && (r < 0xfdd0 || r > 0xfdef) && r != utf8.RuneError &&
		!unicode.Is(unicode.Cs, r)
}

// IsDirection reports the explicit direction marks of UAX #9, table 1 and
// section 2: embeddings, overrides, isolates and the implicit marks.
func IsDirection(r rune) bool {
	return r >= 0x202a && r <= 0x202e || r >= 0x2066 && r <= 0x2069 || r == 0x200e || r == 0x200f || r == 0x061c
}

// Width is the number of terminal cells that s takes: 0 for combining marks
// and format characters, 2 for wide scripts, else 1.
func Width(s string) (n int) {
	for _, r := range s {
		n += runeWidth(r)
	}
	return n
}

func runeWidth(r rune) int {
	switch {
	case unicode.In(r, unicode.Mn, unicode.Me, unicode.Cf):
		return 0
	case r >= 0x1100 && r <= 0x115f, r >= 0x2e80 && r <= 0xa4cf && r != 0x303f, r >= 0xac00 && r <= 0xd7a3,
		r >= 0xf900 && r <= 0xfaff, r >= 0xfe30 && r <= 0xfe6f, r >= 0xff00 && r <= 0xff60, r >= 0xffe0 && r <= 0xffe6,
		r >= 0x1f300 && r <= 0x1faff, r >= 0x20000 && r <= 0x3fffd:
		return 2
	}
	return 1
}

// Wrap breaks s at blanks into lines of at most width cells; a longer word is
// cut. There is always at least one line.
func Wrap(s string, width int) []string {
	var lines []string
	line, used := "", 0
	for _, word := range strings.Fields(s) {
		for {
			w := Width(word)
			switch {
			case used == 0 && w <= width:
				line, used = word, w
			case used > 0 && used+1+w <= width:
				line, used = line+" "+word, used+1+w
			case used > 0:
				lines, line, used = append(lines, line), "", 0
				continue
			default: // a word longer than a line
				cut := cutAt(word, width)
				lines, word = append(lines, word[:cut]), word[cut:]
				continue
			}
			break
		}
	}
	if used > 0 || lines == nil {
		lines = append(lines, line)
	}
	return lines
}

// cutAt returns the byte index where width cells are full, at least one rune.
func cutAt(s string, width int) int {
	used := 0
	for i, r := range s {
		used += runeWidth(r)
		if used > width && i > 0 {
			return i
		}
	}
	return len(s)
}

// Cell writes text as one CSV field (RFC 4180). Spreadsheets run a cell that
// begins with = + - @ as a formula: such text gets an apostrophe before it.
// Numbers do not pass through here.
func Cell(s string) string {
	s = Clean(s)
	if t := strings.TrimLeft(s, " "); t != "" && strings.ContainsRune("=+-@", rune(t[0])) {
		s = "'" + s
	}
	if strings.ContainsAny(s, "\",\r\n") || s != strings.TrimSpace(s) {
		return `"` + strings.ReplaceAll(s, `"`, `""`) + `"`
	}
	return s
}
