package scopecsv

import (
	"bytes"
	"math"
	"strings"

	"benchslip/capture/num"
)

// kind is what a cell holds.
type kind uint8

const (
	blank  kind = iota // nothing
	number             // a number, perhaps with a unit glued to it
	marker             // a word or figure that stands for "no value"
	clock              // a time of day, a date or both
	prose              // any other text
)

// style is how a file writes its cells.
type style struct {
	sep   byte // ',', ';', '\t', '|', or ' ' for runs of blanks and tabs
	mark  byte // decimal mark, '.' or ','
	group byte // digit grouping in threes, 0 for none
}

// cell is one cell, read.
type cell struct {
	kind kind
	num.Decimal
	unit  string // unit glued to the number, canonical; "" for none
	stamp stamp  // for kind clock
	why   string // for kind marker
	raw   []byte // for kind prose: the text
}

// overrange is the value from which a number is taken as a marker: instruments
// write 9.9E37 for infinity and 9.91E37 for "no number" (SCPI-1999, volume 1,
// 7.2.1.4 and 7.2.1.5; from memory). No bench voltage comes near.
const overrange = 9e36

// trimmed cuts blanks, NULs and one pair of quotes from a cell.
func trimmed(b []byte) []byte {
	b = trim(b)
	if len(b) >= 2 && b[0] == '"' && b[len(b)-1] == '"' {
		b = trim(b[1 : len(b)-1])
	}
	return b
}

func trim(b []byte) []byte {
	for len(b) > 0 && (b[0] == ' ' || b[0] == '\t' || b[0] == 0) {
		b = b[1:]
	}
	for len(b) > 0 && (b[len(b)-1] == ' ' || b[len(b)-1] == '\t' || b[len(b)-1] == 0) {
		b = b[:len(b)-1]
	}
	// a no-break space in UTF-8
	for bytes.HasPrefix(b, nbsp) {
		b = trim(b[2:])
	}
	for bytes.HasSuffix(b, nbsp) {
		b = trim(b[:len(b)-2])
	}
	return b
}

var nbsp = []byte("\u00a0")

// read says what a cell holds.
func (s style) read(b []byte) cell {
	b = trimmed(b)
	if len(b) == 0 {
		return cell{kind: blank}
	}
	if why := noValue(b); why != "" {
		return cell{kind: marker, why: why}
	}
	text := b
	if bytes.HasPrefix(b, minusSign) { // U+2212
		text = append([]byte{'-'}, b[len(minusSign):]...)
	}
	if s.group != 0 {
		text = s.ungroup(text)
	}
	if d, n := num.Scan(text, s.mark); n > 0 {
		if n == len(text) {
			return valued(cell{kind: number, Decimal: d})
		}
		if u, ok := gluedUnit(text[n:]); ok {
			return valued(cell{kind: number, Decimal: d, unit: u})
		}
	}
	if st, ok := readStamp(b); ok {
		return cell{kind: clock, stamp: st}
	}
	return cell{kind: prose, raw: b}
}

var minusSign = []byte("\u2212")

func valued(c cell) cell {
	switch a := math.Abs(c.V); {
	case a > math.MaxFloat64:
		return cell{kind: marker, why: "infinite"}
	case a >= overrange:
		return cell{kind: marker, why: "overrange"}
	}
	return c
}

// noValue recognises the ways to write that there is no value; the result
// says which, "" when b is something else.
func noValue(b []byte) string {
	if len(b) == 0 {
		return ""
	}
	if len(b) > 16 {
		if strings.Trim(string(b), "#") == "" {
			return "####"
		}
		return ""
	}
	c := b[0]
	if c >= '0' && c <= '9' && !bytes.Contains(b, []byte("#")) {
		return ""
	}
	t := strings.ToLower(string(b))
	if w, ok := noValues[t]; ok {
		return w
	}
	switch {
	case strings.Trim(t, "#") == "", strings.Trim(t, "*") == "", strings.Trim(t, "?") == "":
		return t
	case strings.Trim(t, "-") == "", strings.Trim(t, "\u2012\u2013\u2014\u2212") == "", strings.Trim(t, ".") == "", strings.Trim(t, "_") == "":
		return t
	case strings.HasPrefix(t, "#") && strings.ContainsAny(t[len(t)-1:], "?!a"):
		return t // a spreadsheet's error word: #NAME?, #VALUE!, #N/A
	case strings.Contains(t, ".#"): // 1.#QNAN, -1.#IND, 1.#INF of one C library
		return "not a number"
	case (c == '<' || c == '>') && len(t) > 1 && (t[1] >= '0' && t[1] <= '9' || t[1] == '-' || t[1] == '+' || t[1] == ' '):
		return "overrange"
	}
	return ""
}

var noValues = map[string]string{
	"nan": "not a number", "+nan": "not a number", "-nan": "not a number", "nan(ind)": "not a number", "-nan(ind)": "not a number",
	"inf": "infinite", "+inf": "infinite", "-inf": "infinite", "infinity": "infinite", "+infinity": "infinite", "-infinity": "infinite",
	"\u221e": "infinite", "+\u221e": "infinite", "-\u221e": "infinite", "\u2212\u221e": "infinite",
	"ol": "overrange", "-ol": "overrange", "+ol": "overrange", "o.l": "overrange", "o.l.": "overrange", ".ol": "overrange", "over": "overrange", "+over": "overrange", "-over": "overrange",
	"overload": "overrange", "overrange": "overrange", "over range": "overrange", "under": "overrange", "underrange": "overrange", "ovl": "overrange", "ovld": "overrange", "ovr": "overrange",
	"ovf": "overrange", "ovfl": "overrange", "overflow": "overrange", "underflow": "overrange", "clip": "overrange", "clipped": "overrange", "clipping": "overrange", "sat": "overrange",
	"n/a": "n/a", "na": "n/a", "n.a.": "n/a", "null": "null", "nil": "null", "none": "none", "(null)": "null", "<null>": "null",
	"invalid": "invalid", "error": "error", "err": "error", "bad": "invalid", "missing": "missing", "no data": "missing", "nodata": "missing", "burnout": "overrange", "open": "overrange",
}

// grouped reports whether b is digits in threes parted by g, the first group
// of one to three digits not beginning with 0, then at most a decimal part
// after mark. groups is how many g there are.
func grouped(b []byte, g, mark byte) (groups int, ok bool) {
	if len(b) > 0 && (b[0] == '-' || b[0] == '+') {
		b = b[1:]
	}
	i := 0
	for i < len(b) && b[i]-'0' <= 9 {
		i++
	}
	if i == 0 || i > 3 || b[0] == '0' {
		return 0, false
	}
	for i < len(b) && b[i] == g {
		if i+4 > len(b) || b[i+1]-'0' > 9 || b[i+2]-'0' > 9 || b[i+3]-'0' > 9 {
			return 0, false
		}
		groups++
		i += 4
	}
	if groups == 0 || i < len(b) && b[i]-'0' <= 9 {
		return 0, false
	}
	if i < len(b) && b[i] == mark {
		for i++; i < len(b) && b[i]-'0' <= 9; i++ {
		}
	}
	return groups, i == len(b)
}

// ungroup takes the grouping out of a number that has it.
func (s style) ungroup(b []byte) []byte {
	if _, ok := grouped(b, s.group, s.mark); !ok {
		return b
	}
	out := make([]byte, 0, len(b))
	for _, c := range b {
		if c != s.group {
			out = append(out, c)
		}
	}
	return out
}

// split cuts a row into cells, which keep their blanks and quotes. With blank
// as separator, runs of blanks and tabs part cells and those at the ends of
// the row are nothing.
func split(line []byte, sep byte, cells [][]byte) [][]byte {
	cells = cells[:0]
	if sep == ' ' {
		i := 0
		for {
			for i < len(line) && isBlank(line[i]) {
				i++
			}
			if i == len(line) {
				return cells
			}
			j := cellEnd(line, i, sep)
			cells = append(cells, line[i:j])
			i = j
		}
	}
	i := 0
	for {
		j := cellEnd(line, i, sep)
		cells = append(cells, line[i:j])
		if j >= len(line) {
			return cells
		}
		i = j + 1
	}
}

func isBlank(c byte) bool { return c == ' ' || c == '\t' || c == 0 }

// cellEnd returns the end of the cell that starts at i: the next separator
// outside quotes. Quotes count only where they open a cell.
func cellEnd(line []byte, i int, sep byte) int {
	j := i
	if sep != ' ' {
		for j < len(line) && (line[j] == ' ' || line[j] == '\t') && line[j] != sep {
			j++
		}
	}
	if j < len(line) && line[j] == '"' {
		k := j + 1
		for k < len(line) {
			if line[k] == '"' {
				if k+1 < len(line) && line[k+1] == '"' {
					k += 2
					continue
				}
				j = k + 1
				break
			}
			k++
		}
	}
	for j < len(line) {
		if line[j] == sep || sep == ' ' && isBlank(line[j]) {
			break
		}
		j++
	}
	return j
}
