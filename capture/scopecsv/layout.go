package scopecsv

import (
	"bytes"
	"fmt"

	"benchslip/capture/num"
	"benchslip/capture/recording"
)

// layout is how a file is written and where its samples stand.
type layout struct {
	style
	width int    // cells of a row of samples, trailing blanks included
	core  []bool // columns that hold numbers or clock times in most rows
	clock []bool // of these, the ones with clock times
	first int    // the leftmost of them
	start int    // position of the first row of samples
	line  int    // its line, from 1
	pre   []row  // what stands before, blank lines left out
}

// row is one line of text outside the samples.
type row struct {
	line int
	pos  int // where it begins in the text
	text []byte
}

// sampled is a row looked at to find the layout.
type sampled struct {
	line int // 0 when not known
	text []byte
}

// windows takes up to 300 filled lines (256 KiB, but 8 lines at least) each
// from the beginning, the middle and the end of the text, or all lines of a
// small file.
func windows(b []byte, line int) []sampled {
	const lines, span, most = 300, 1 << 16, 1 << 18
	take := func(p, line int) (got []sampled, next int) {
		for from := p; p < len(b) && len(got) < lines && (p-from < most || len(got) < 8); {
			text, next, n := logicalLine(b, p)
			if len(bytes.Trim(text, " \t\x00,;")) > 0 && len(text) <= maxRow {
				got = append(got, sampled{line, text})
			}
			if line > 0 {
				line += n
			}
			p = next
		}
		return got, p
	}
	rows, next := take(0, line)
	for _, from := range []int{len(b) / 2, len(b) - span} {
		if from <= next {
			from = next
		} else {
			_, from = lineAt(b, from)
		}
		var more []sampled
		more, next = take(max(from, next), 0)
		rows = append(rows, more...)
	}
	return rows
}

// shape is how a cell looks before the decimal mark is known.
type shape uint8

const (
	noNumber   shape = iota
	plainInt         // digits alone
	dotted           // one point, not a grouping
	dotGroup         // one point that may also part thousands: 1.234
	commaed          // one comma, not a grouping
	commaGroup       // one comma that may also part thousands: 1,234
	dotLast          // both, the point last: 1,234.5; or several commas
	commaLast        // both, the comma last: 1.234,5; or several points
	clockCell
	emptyCell
	markCell
)

// shapeOf looks at a cell under both decimal marks.
func shapeOf(b []byte) shape {
	b = trimmed(b)
	if len(b) == 0 {
		return emptyCell
	}
	if c := b[0]; (c|0x20 >= 'a' && c|0x20 <= 'z') && noValue(b) == "" {
		if _, ok := readStamp(b); !ok {
			return noNumber
		}
	}
	if len(b) > len(minusSign) {
		b = bytes.TrimPrefix(b, minusSign)
	}
	whole := func(mark byte) bool {
		_, n := num.Scan(b, mark)
		if n == 0 || n == len(b) {
			return n > 0
		}
		_, ok := gluedUnit(b[n:])
		return ok
	}
	dot, comma := whole('.'), whole(',')
	body := b
	if i := bytes.IndexFunc(b, func(r rune) bool { return !(r >= '0' && r <= '9' || r == '.' || r == ',' || r == '+' || r == '-') }); i >= 0 {
		body = b[:i] // without exponent or unit
	}
	switch {
	case dot && comma:
		return plainInt
	case dot:
		if _, ok := grouped(body, '.', ','); ok && len(body) == len(b) {
			return dotGroup
		}
		return dotted
	case comma:
		if _, ok := grouped(body, ',', '.'); ok && len(body) == len(b) {
			return commaGroup
		}
		return commaed
	}
	if n, ok := grouped(body, ',', '.'); ok && len(body) > 0 && (n > 1 || bytes.IndexByte(body, '.') > 0) {
		return dotLast
	}
	if n, ok := grouped(body, '.', ','); ok && (n > 1 || bytes.IndexByte(body, ',') > 0) {
		return commaLast
	}
	if noValue(b) != "" {
		return markCell
	}
	if _, ok := readStamp(b); ok {
		return clockCell
	}
	return noNumber
}

// holds says whether a shape counts as data.
func (s shape) holds() bool { return s != noNumber && s != emptyCell }

// score rates a separator: the mean over the rows of the cube of the share of
// filled cells that hold data. The cube keeps rows of settings ("key,1.0",
// one half) from outvoting rows of samples.
func score(rows []sampled, sep byte) (mean float64, cells int) {
	var buf [][]byte
	for _, r := range rows {
		buf = split(r.text, sep, buf)
		data, filled := 0, 0
		for _, c := range buf {
			s := shapeOf(c)
			if s.holds() {
				data++
			}
			if s != emptyCell {
				filled++
			}
		}
		if data > 0 && filled > 0 {
			q := float64(data) / float64(filled)
			mean += q * q * q
			cells += data
		}
	}
	return mean / float64(max(1, len(rows))), cells
}

var separators = []struct {
	sep  byte
	word string // as a job file says it
	name string
}{
	{'\t', "tab", "tabs"}, {';', ";", "semicolons"}, {',', ",", "commas"}, {'|', "|", "bars"}, {' ', "blank", "blanks"},
}

func sepName(sep byte) string {
	for _, s := range separators {
		if s.sep == sep {
			return s.name
		}
	}
	return string(sep)
}

// findStyle chooses separator and decimal mark from the sampled rows.
func (f *file) findStyle(rows []sampled) (style, error) {
	st := style{mark: '.'}
	if w := f.opt.Separator; w != "" {
		for _, s := range separators {
			if w == s.word || w == string(s.sep) {
				st.sep = s.sep
			}
		}
		if st.sep == 0 {
			return st, f.fault(0, recording.ErrFormat, fmt.Sprintf("csv.separator %q is none of \",\", \";\", \"tab\", \"blank\"", w), "correct it in the job file")
		}
	} else {
		st.sep = bestSeparator(rows)
	}
	return f.findMark(rows, st)
}

func bestSeparator(rows []sampled) byte {
	best, top, most := byte(','), -1.0, 0
	var marks [256]float64
	for _, s := range separators {
		m, cells := score(rows, s.sep)
		marks[s.sep] = m
		switch {
		case m > top+0.02,
			m > top-0.02 && cells > most && s.sep != ' ',
			m > top-0.02 && cells > most && s.sep == ' ' && most <= len(rows):
			best, top, most = s.sep, max(m, top), cells
		}
	}
	if best == ',' {
		// One column of decimal commas looks like two of whole numbers; the
		// rows of text around it tell which.
		for _, sep := range []byte{'\t', ';', '|'} {
			if marks[sep] > top-0.02 && onlyIn(rows, sep) {
				return sep
			}
		}
	}
	return best
}

// onlyIn says whether rows of text are parted by sep and never by a comma.
func onlyIn(rows []sampled, sep byte) bool {
	seen := false
	for _, r := range rows {
		if sh := shapeOf(r.text); sh.holds() {
			continue
		}
		switch {
		case bytes.IndexByte(r.text, sep) >= 0:
			seen = true
		case bytes.IndexByte(r.text, ',') >= 0:
			return false
		}
	}
	return seen
}

// findMark tells the decimal mark and digit grouping from all cells of the
// sampled rows that look like data.
func (f *file) findMark(rows []sampled, st style) (style, error) {
	var seen [markCell + 1]int
	var at [markCell + 1]sampled
	var buf [][]byte
	for _, r := range rows {
		buf = split(r.text, st.sep, buf)
		data, filled := 0, 0
		var here [markCell + 1]int
		for _, c := range buf {
			s := shapeOf(c)
			here[s]++
			if s.holds() {
				data++
			}
			if s != emptyCell {
				filled++
			}
		}
		if filled == 0 || data*3 < filled*2 { // settings and headers may write otherwise
			continue
		}
		for s, n := range here {
			if n > 0 && seen[s] == 0 {
				at[s] = r
			}
			seen[s] += n
		}
	}
	comma := seen[commaed] + seen[commaLast]
	dot := seen[dotted] + seen[dotLast]
	ask := `[takes.NAME.csv] decimal = "," or "."`
	switch f.opt.Decimal {
	case ",":
		st.mark = ','
		if seen[commaLast] > 0 {
			st.group = '.'
		}
		return st, nil
	case ".":
		if seen[dotLast] > 0 {
			st.group = ','
		}
		return st, nil
	case "":
	default:
		return st, f.fault(0, recording.ErrFormat, fmt.Sprintf("csv.decimal %q is neither \".\" nor \",\"", f.opt.Decimal), "correct it in the job file")
	}
	if f.opt.Separator == "" && st.sep == ',' && dot == 0 && comma == 0 {
		if r, is := splitDecimals(rows); is {
			return st, f.fault(r.line, recording.ErrAmbiguous, "cells parted by commas hold whole numbers only, some with leading zeros or after a bare minus: decimal commas, it seems, in a file parted by commas too",
				`export it with another separator, or say [takes.NAME.csv] separator, decimal`)
		}
	}
	switch {
	case comma > 0 && dot > 0:
		r := at[commaed]
		if seen[commaed] == 0 {
			r = at[commaLast]
		}
		return st, f.fault(r.line, recording.ErrAmbiguous, "numbers are written with decimal points and with decimal commas in one file", "export it again, or say "+ask)
	case comma > 0:
		st.mark = ','
		if seen[commaLast] > 0 {
			st.group = '.'
		} else if seen[dotGroup] > 0 {
			return st, f.fault(at[dotGroup].line, recording.ErrAmbiguous, "a point parts either decimals or thousands here, beside decimal commas", "say "+ask)
		}
	case seen[commaGroup] > 0 && seen[dotLast] == 0:
		return st, f.fault(at[commaGroup].line, recording.ErrAmbiguous, "a comma before three digits may be a decimal comma or part thousands", "say "+ask)
	case seen[dotLast] > 0:
		st.group = ','
	}
	return st, nil
}

// splitDecimals recognises numbers with decimal commas torn apart by commas
// as separators: every second cell is unsigned and some begin with a 0 before
// more digits ("0,05" becomes 0 and 05), or a cell is -0.
func splitDecimals(rows []sampled) (sampled, bool) {
	var hint sampled
	found := false
	var buf [][]byte
	for _, r := range rows {
		buf = split(r.text, ',', buf)
		whole := len(buf) > 1
		for i, c := range buf {
			c = trimmed(c)
			if shapeOf(c) != plainInt {
				whole = false
				break
			}
			if i&1 == 1 && (c[0] == '-' || c[0] == '+') {
				return hint, false
			}
			if !found && (i&1 == 1 && len(c) > 1 && c[0] == '0' || string(c) == "-0") {
				hint, found = r, true
			}
		}
		if whole && len(buf)&1 == 1 {
			return hint, false
		}
	}
	return hint, found
}

// otherSeparator tells a separator other than the file's under which text
// falls into two or more numbers, 0 when there is none.
func (lay *layout) otherSeparator(text []byte) byte {
	for _, s := range separators {
		if s.sep == lay.sep {
			continue
		}
		numbers, clocks, texts, first := 0, 0, 0, noNumber
		for i, c := range split(text, s.sep, nil) {
			sh := shapeOf(c)
			if i == 0 || first == emptyCell {
				first = sh
			}
			switch sh {
			case clockCell:
				clocks++
			case noNumber:
				texts++
			case emptyCell, markCell:
			default:
				numbers++
			}
		}
		if numbers > 0 && numbers+clocks >= 2 && first != noNumber && (texts == 0 || s.sep != ' ') {
			return s.sep
		}
	}
	return 0
}

// mixedSeparators refuses a row whose cells are parted by another separator
// than those of the file.
func (f *file) mixedSeparators(lay *layout, r row, sep byte) error {
	return f.fault(r.line, recording.ErrFormat, fmt.Sprintf("cells are parted by %s here and by %s in other rows (%q)", sepName(sep), sepName(lay.sep), short(words(r.text))),
		"export it again without a detour through a spreadsheet")
}
