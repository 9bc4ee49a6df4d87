package scopecsv

import (
	"bytes"
	"fmt"
	"strings"

	"benchslip/capture/num"
	"benchslip/capture/recording"
)

// file is a table being read.
type file struct {
	path string
	opt  recording.Options
	text []byte
	how  string // coding

	monthFirst bool // dates with slashes are month/day/year
	day0       int  // day number of the first date met
}

func (f *file) fault(line int, class error, what, fix string) error {
	return &recording.Error{Path: f.path, Line: line, Offset: -1, What: what, Fix: fix, Class: class}
}

// find works out the layout of the file.
func (f *file) find() (*layout, error) {
	p, line := 0, 1
	for i := 0; i < f.opt.Skip && p < len(f.text); i++ {
		_, p = lineAt(f.text, p)
		line++
	}
	b := f.text[p:]
	rows := windows(b, line)
	if len(rows) == 0 {
		return nil, f.fault(0, recording.ErrFormat, "the file holds no text but blank lines", "record it again")
	}
	st, err := f.findStyle(rows)
	if err != nil {
		return nil, err
	}
	f.findDateOrder(st, rows)
	lay := &layout{style: st}
	if err := f.findColumns(lay, rows); err != nil {
		return nil, err
	}
	return lay, f.findStart(lay, p, line)
}

// findDateOrder settles whether dates with slashes are month/day or day/month:
// by a figure over 12, else by the order in which the record is shorter.
func (f *file) findDateOrder(st style, rows []sampled) {
	var first, last stamp
	var buf [][]byte
	over := [2]bool{} // a figure over 12 in the first or second place
	for _, r := range rows {
		if bytes.IndexByte(r.text, '/') < 0 && bytes.IndexByte(r.text, '-') < 0 {
			continue
		}
		buf = split(r.text, st.sep, buf)
		for _, c := range buf {
			d, ok := readStamp(trimmed(c))
			if !ok || !d.slashes {
				continue
			}
			over[0] = over[0] || d.m > 12
			over[1] = over[1] || d.d > 12
			if !first.hasDate {
				first = d
			}
			last = d
		}
	}
	switch {
	case over[0] != over[1]:
		f.monthFirst = over[1]
	case first.hasDate:
		span := func(monthFirst bool) int {
			if d := last.day(monthFirst) - first.day(monthFirst); d >= 0 {
				return d
			}
			return 1 << 30
		}
		f.monthFirst = span(true) < span(false)
	}
}

// profile is what the cells of a row are.
func (st style) profile(text []byte, buf [][]byte, kinds []kind) ([][]byte, []kind) {
	buf = split(text, st.sep, buf)
	kinds = kinds[:0]
	for _, c := range buf {
		kinds = append(kinds, st.read(c).kind)
	}
	return buf, kinds
}

func (k kind) holds() bool { return k == number || k == clock || k == marker }

// findColumns finds the usual width and the columns that hold numbers, from
// the sampled rows at least two thirds full of them.
func (f *file) findColumns(lay *layout, rows []sampled) error {
	var buf [][]byte
	var kinds []kind
	widths := map[int]int{}
	type tally struct{ data, rows, named, clocks int }
	byWidth := map[int][]tally{}
	for _, r := range rows {
		buf, kinds = lay.profile(r.text, buf, kinds)
		data, filled := 0, 0
		for c, k := range kinds {
			if k.holds() {
				data++
			}
			if k != blank && !(k == prose && isUnitWord(words(trimmed(buf[c])))) {
				filled++
			}
		}
		if data == 0 || data*2 <= filled || len(kinds) > maxWidth {
			continue
		}
		w := len(kinds)
		widths[w]++
		t := byWidth[w]
		if t == nil {
			t = make([]tally, w)
			byWidth[w] = t
		}
		for c, k := range kinds {
			t[c].rows++
			if k.holds() {
				t[c].data++
				if k == clock {
					t[c].clocks++
				}
				if c > 0 && kinds[c-1] == prose && settingWord(words(trimmed(buf[c-1]))) {
					t[c].named++
				}
			}
		}
	}
	best := 0
	for w, n := range widths {
		if n > widths[best] || n == widths[best] && w > best {
			best = w
		}
	}
	if best == 0 {
		return f.notSamples(lay, rows)
	}
	lay.width = best
	lay.core, lay.clock = make([]bool, best), make([]bool, best)
	cores := 0
	for c, t := range byWidth[best] {
		if lay.core[c] = t.data*2 >= t.rows; lay.core[c] {
			cores++
		}
		lay.clock[c] = t.clocks*2 > t.data
	}
	for c, t := range byWidth[best] {
		// In a short table settings may stand beside every row: a value with
		// its name to the left, before two or more other columns.
		if c > 0 && lay.core[c] && t.named*2 >= t.rows && cores > 2 {
			lay.core[c] = false
			cores--
		}
	}
	lay.first = -1
	for c := range lay.core {
		if lay.core[c] && lay.first < 0 {
			lay.first = c
		}
	}
	if lay.first < 0 {
		return f.notSamples(lay, rows)
	}
	return nil
}

// otherClock says whether a row is one of samples but for a number where the
// others have a clock time, or the other way round.
func (lay *layout) otherClock(kinds []kind) bool {
	alien, fits := false, false
	for c, k := range kinds {
		if c < lay.width && lay.core[c] {
			if k != number && k != clock {
				return false
			}
			alien = alien || lay.alien(c, k)
			fits = fits || k == number && !lay.clock[c]
		}
	}
	return alien && fits && len(kinds) >= lay.width
}

func (f *file) twoClocks(r row) error {
	return f.fault(r.line, recording.ErrAmbiguous, fmt.Sprintf("a column is written as numbers in some rows and as clock times in others (%q)", short(words(r.text))), "export it again with one form of time")
}

// alien says whether a cell is a clock time in a column of numbers or the
// other way round: the row that holds it is no row of samples.
func (lay *layout) alien(c int, k kind) bool {
	return k == clock && !lay.clock[c] || k == number && lay.clock[c]
}

// isData says whether a row reads as samples: something in a core column, no
// other text there, and not a name with its value.
func (lay *layout) isData(kinds []kind) bool {
	if len(kinds) > lay.width {
		for _, k := range kinds[lay.width:] {
			if k != blank {
				return false
			}
		}
	}
	any := false
	named := false // text further left: a setting beside the samples has its own value and unit
	for c, k := range kinds[:min(len(kinds), lay.width)] {
		if !lay.core[c] {
			if k == prose && c == lay.first-1 && !named {
				return false // a setting: its value stands in the first column of numbers
			}
			named = named || k == prose
			continue
		}
		if k == prose || lay.alien(c, k) {
			return false
		}
		any = any || k.holds()
	}
	return any
}

// findStart walks from the top to the first row of samples: one whose next
// filled row is one too, and two of the next three.
func (f *file) findStart(lay *layout, p, line int) error {
	var buf [][]byte
	var kinds []kind
	data := func(text []byte) bool {
		buf, kinds = lay.profile(text, buf, kinds)
		return lay.isData(kinds)
	}
	stray := 0 // line of a row of numbers that nothing follows
	for p < len(f.text) {
		text, next, n := logicalLine(f.text, p)
		if len(text) > maxRow {
			return f.fault(line, recording.ErrUnsupported, fmt.Sprintf("a row of %d bytes; rows are read up to %d", len(text), maxRow), "export one record a row")
		}
		if filled(text) {
			if data(text) {
				seen, good, first := 0, 0, true
				for q, tries := next, 0; seen < 3 && tries < 16 && q < len(f.text); tries++ {
					more, after, _ := logicalLine(f.text, q)
					q = after
					if filled(more) {
						seen++
						if data(more) {
							good++
						} else if seen == 1 {
							first = false
						}
					}
				}
				if first && good*2 > seen || seen == 0 {
					lay.start, lay.line = p, line
					if err := f.stepBack(lay); err != nil {
						return err
					}
					if stray > 0 {
						return f.fault(stray, recording.ErrAmbiguous, "a row of numbers stands alone before the samples", fmt.Sprintf("say how many rows to leave out: [takes.NAME.csv] skip = %d", line-1))
					}
					return nil
				}
				stray = line
			} else if numbersOnly(kinds) && stray == 0 {
				stray = line
			}
			if len(lay.pre) < maxPreamble {
				lay.pre = append(lay.pre, row{line, p, text})
			}
		}
		p = next
		line += n
	}
	if stray > 0 {
		return f.fault(stray, recording.ErrFormat, "a row of numbers stands among text; no table of samples was found", "export the samples as a table")
	}
	return f.fault(0, recording.ErrFormat, "no row of samples was found", "export the samples as a table")
}

// stepBack takes in rows right before the first row of samples that begin
// with a number or time in the first column and are as wide, yet hold a bad
// cell: they are samples too. One of another width is refused.
func (f *file) stepBack(lay *layout) error {
	for len(lay.pre) > 0 {
		r := lay.pre[len(lay.pre)-1]
		buf, kinds := lay.profile(r.text, nil, nil)
		if len(buf) <= lay.first {
			return nil
		}
		like := kinds[lay.first] == prose && numberLike(trimmed(buf[lay.first]))
		if !like && lay.width < 2 || !like && kinds[lay.first] != number && kinds[lay.first] != clock {
			return nil
		}
		if len(buf) > lay.width {
			return f.wideRow(lay, r.line, r.text)
		}
		if sep := lay.otherSeparator(r.text); like && sep != 0 {
			return f.mixedSeparators(lay, r, sep)
		}
		if like && len(buf) < lay.width {
			return f.narrowRow(lay, r.line)
		}
		if lay.otherClock(kinds) {
			return f.twoClocks(r)
		}
		if len(buf) < lay.width || lay.alien(lay.first, kinds[lay.first]) {
			return nil
		}
		lay.pre = lay.pre[:len(lay.pre)-1]
		lay.start, lay.line = r.pos, r.line
	}
	return nil
}

// filled says whether a row holds more than separators.
func filled(text []byte) bool { return len(bytes.Trim(text, " \t\x00,;|\"")) > 0 }

// numbersOnly says whether a row holds numbers and no text.
func numbersOnly(kinds []kind) bool {
	n := 0
	for _, k := range kinds {
		if k == prose {
			return false
		}
		if k == number {
			n++
		}
	}
	return n > 0
}

// maxPreamble bounds the rows of settings that are kept.
const maxPreamble = 4096

// notSamples says what a file without samples seems to be.
func (f *file) notSamples(lay *layout, rows []sampled) error {
	pairs, figures, heads := 0, 0, 0
	for _, r := range rows {
		k, v := keyValue(r.text, lay.sep)
		if k != "" && v != "" {
			pairs++
			if _, n := num.Scan([]byte(v), lay.mark); n > 0 {
				figures++
			}
			if timeWord(k) || hasUnit(words(r.text)) {
				heads++
			}
		}
		if i := bytes.IndexAny(r.text, "{["); i > 0 && bytes.IndexAny(r.text[i:], "}]") > 0 && bytes.IndexByte(r.text[i:], ':') > 0 {
			return f.fault(r.line, recording.ErrFormat, fmt.Sprintf("a cell holds structured text (%q): a summary, not samples", short(words(r.text[i:]))), "export the samples as a table of numbers")
		}
	}
	switch {
	case heads > 0 && len(rows) == heads:
		return f.fault(rows[0].line, recording.ErrFormat, "a header and no samples", "export it again")
	case pairs*2 > len(rows) && figures > 0:
		return f.fault(rows[0].line, recording.ErrFormat, fmt.Sprintf("the file holds settings (%d names with a value) and no samples", pairs), "name the file with the samples; state its rate as "+rateKey)
	}
	return f.fault(rows[0].line, recording.ErrFormat, fmt.Sprintf("no table of samples: the file begins with %q", short(words(rows[0].text))), "export the samples as a table of numbers")
}

const rateKey = `[takes.NAME.csv] rate = "1 MHz"`

// keyValue splits a setting: "key<sep>value", "key: value", "key = value".
func keyValue(text []byte, sep byte) (key, value string) {
	t := strings.TrimSpace(strings.TrimLeft(words(text), "#%!*;/ \""))
	cut := func(i, n int) (string, string) {
		return strings.Trim(t[:i], " \t\":="), strings.Trim(t[i+n:], " \t\";")
	}
	if sep != ' ' && sep != 0 {
		if i := bytes.IndexByte(text, sep); i >= 0 {
			k := strings.Trim(words(text[:i]), " \t\"#%!*;/:=")
			v := strings.Trim(words(bytes.Trim(text[i+1:], string(sep)+" \t\"")), " ")
			if k != "" {
				return k, v
			}
		}
	}
	for _, d := range []string{": ", "=", ":", "\t", ",", ";"} {
		if i := strings.Index(t, d); i > 0 {
			return cut(i, len(d))
		}
	}
	return "", ""
}
