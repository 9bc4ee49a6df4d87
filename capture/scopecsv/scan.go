package scopecsv

import (
	"bytes"
	"fmt"
	"math"
	"slices"

	"benchslip/capture/num"
	"benchslip/capture/recording"
)

// scanner reads the rows of samples into the columns of a body. Plain numbers
// and blanks are read in place; anything else goes through style.read. Every
// byte is seen a bounded number of times.
type scanner struct {
	f      *file
	lay    *layout
	t      *body
	clocks bool // a column holds clock times: no row is all numbers

	// The row at hand.
	line   int   // its line
	cells  int   // cells seen
	plain  int   // of these, plain numbers
	wide   bool  // a cell beyond the width is filled
	last   []int // by column: power of ten of the last digit, or blankCell
	digits []int // by column: significant digits
	odds   []oddCell

	open    *breach // text rows since the last row of samples
	gapAt   int     // line of the first blank row since then; 0: none
	gapRows int     // how many
	off     int     // line of row n, less n
	spare   int     // bytes of text not yet spent on missing cells
}

// oddCell is a cell of column c that is no plain number.
type oddCell struct {
	c int
	cell
}

// blankCell stands for a blank in the list of last digits.
const blankCell = math.MinInt

// scan reads the table that the layout describes.
func (f *file) scan(lay *layout) (*body, error) {
	s := &scanner{
		f: f, lay: lay, t: newBody(lay.width), line: lay.line,
		clocks: slices.Contains(lay.clock, true),
		last:   make([]int, lay.width), digits: make([]int, lay.width),
		off: math.MinInt, spare: len(f.text) - lay.start + lay.width,
	}
	for p := lay.start; p < len(f.text); {
		s.t.makeRoom()
		end, lines, err := s.row(p)
		if err != nil {
			return nil, err
		}
		if len(s.odds) == 0 && s.cells >= lay.width && !s.wide && !s.clocks {
			err = s.regular()
		} else {
			err = s.irregular(p, end)
		}
		if err != nil {
			return nil, err
		}
		p = lineEnd(f.text, end)
		s.line += lines
	}
	s.t.close(f, lay)
	return s.t, nil
}

// row reads the cells of the row at p and returns where it ends and how many
// lines it covers.
func (s *scanner) row(p int) (end, lines int, err error) {
	b, sep, width, n := s.f.text, s.lay.sep, s.lay.width, s.t.n
	start := p
	lines = 1
	for p < len(b) && b[p] == 0 {
		p++
		s.t.nuls++
	}
	c, plain := 0, 0
	s.wide = false
	s.odds = s.odds[:0]
	for {
		for p < len(b) && (b[p] == ' ' || b[p] == 0 || b[p] == '\t' && sep != '\t') {
			p++
		}
		if sep == ' ' && (p == len(b) || b[p] == '\n' || b[p] == '\r') {
			break
		}
		from := p
		d, size := num.Scan(b[p:], s.lay.mark)
		p += size
		for p < len(b) && b[p] == ' ' {
			p++
		}
		if p < len(b) && b[p] != sep && b[p] != '\n' && b[p] != '\r' && !(sep == ' ' && (p > from+size || b[p] == '\t')) {
			size = -1 // something else, or more than a number
			var more int
			if p, more = s.endOfCell(start, from); more > 1 {
				lines = more
			}
			if p-from > maxField {
				return 0, 0, s.f.fault(s.line, recording.ErrUnsupported, fmt.Sprintf("a cell of %d bytes; cells are read up to %d", p-from, maxField), "export the samples as a table")
			}
		}
		switch {
		case c >= width:
			s.wide = s.wide || size != 0 && s.lay.read(b[from:p]).kind != blank
		case size > 0 && d.V < overrange && d.V > -overrange:
			s.t.col[c].v[n] = d.V
			s.last[c], s.digits[c] = d.Last, d.Digits
			plain++
		default:
			s.t.col[c].v[n] = math.NaN()
			switch {
			case size != 0:
				s.odds = append(s.odds, oddCell{c, s.lay.read(b[from:p])})
			case s.lay.core[c]:
				s.odds = append(s.odds, oddCell{c: c})
			default:
				s.last[c] = blankCell
			}
		}
		c++
		if p-start > maxRow {
			return 0, 0, s.f.fault(s.line, recording.ErrUnsupported, fmt.Sprintf("a row of over %d bytes", maxRow), "export one record a row")
		}
		if p == len(b) || b[p] == '\n' || b[p] == '\r' {
			break
		}
		if sep != ' ' {
			if p++; p == len(b) {
				break
			}
		}
	}
	s.cells, s.plain = c, plain
	return p, lines, nil
}

// endOfCell finds the end of the cell at from in the row at start. Quotes may
// carry it over several lines.
func (s *scanner) endOfCell(start, from int) (end, lines int) {
	b := s.f.text
	text, _ := lineAt(b, from)
	end = from + cellEnd(text, 0, s.lay.sep)
	if end == from+len(text) && bytes.IndexByte(text, '"') >= 0 {
		joined, _, n := logicalLine(b, start)
		if to := start + len(joined); to > end {
			return from + cellEnd(b[from:to], 0, s.lay.sep), n
		}
	}
	return end, 1
}

// regular takes a row of plain numbers, and blanks beside them.
func (s *scanner) regular() error {
	if s.t.short > 0 {
		return s.f.narrowRow(s.lay, s.t.short)
	}
	s.begin()
	for c := range s.t.col {
		s.plainCell(c)
	}
	s.t.n++
	return nil
}

// begin opens a row of samples: closes what stood before it.
func (s *scanner) begin() {
	if s.gapAt > 0 && s.open == nil {
		s.t.addHole(s.gapAt, s.gapRows)
	}
	s.open, s.gapAt, s.gapRows = nil, 0, 0
	if s.line-s.t.n != s.off {
		s.off = s.line - s.t.n
		s.t.jumps = append(s.t.jumps, jump{s.t.n, s.off})
	}
}

// plainCell counts the number or blank of column c.
func (s *scanner) plainCell(c int) {
	k := &s.t.col[c]
	if s.last[c] == blankCell {
		k.lose(s.t.n, blank, "blank", s.line)
		return
	}
	k.take(s.last[c], s.digits[c], s.line)
	if k.glued > 0 && k.v[s.t.n] != 0 {
		k.noteBare(s.line)
	}
}

// irregular takes a row with odd cells: samples with cells missing, blanks, or
// text.
func (s *scanner) irregular(start, end int) error {
	t, w := s.t, s.lay.width
	what := s.judge()
	if what == isSamples && (s.cells < w || s.wide) {
		switch {
		case s.wide:
			return s.f.wideRow(s.lay, s.line, s.f.text[start:end])
		case end == len(s.f.text) && t.n > 1:
			t.cut = s.line // the file ends within the row
			return nil
		case t.short == 0:
			t.short, t.shortAt = s.line, t.n
		}
	}
	switch what {
	case isNothing:
		if s.gapRows++; s.gapAt == 0 {
			s.gapAt = s.line
		}
		return nil
	case isText:
		return s.text(start, end)
	}
	if t.short > 0 && s.cells >= w {
		return s.f.narrowRow(s.lay, t.short)
	}
	if s.spare -= w - min(s.cells, w); t.n*w > s.spare {
		return s.f.fault(s.line, recording.ErrFormat, fmt.Sprintf("most rows have fewer cells than the %d expected", w), "export the samples as a table")
	}
	s.begin()
	next := 0
	for c := range t.col {
		switch {
		case next < len(s.odds) && s.odds[next].c == c:
			s.f.storeOdd(&t.col[c], &s.odds[next].cell, t.n, s.line)
			next++
		case c >= s.cells:
			t.col[c].v[t.n] = math.NaN()
			t.col[c].lose(t.n, blank, "blank", s.line)
		default:
			s.plainCell(c)
		}
	}
	t.n++
	return nil
}

// text keeps a row of text among the samples.
func (s *scanner) text(start, end int) error {
	t := s.t
	if s.open == nil {
		if len(t.breaches) == maxBreaches {
			return s.f.fault(s.line, recording.ErrFormat, fmt.Sprintf("text stands among the samples in over %d places", maxBreaches), "export the samples alone")
		}
		t.breaches = append(t.breaches, breach{at: t.n, line: s.line})
		s.open = &t.breaches[len(t.breaches)-1]
	}
	s.open.count++
	if len(s.open.rows) < maxBreachRows {
		s.open.rows = append(s.open.rows, row{s.line, start, s.f.text[start:end]})
	}
	return nil
}

// What an irregular row is.
const (
	isSamples = iota
	isNothing
	isText
)

// judge says what an irregular row is.
func (s *scanner) judge() int {
	lay := s.lay
	any := s.plain > 0 || s.wide
	holds := s.plain            // cells anywhere that hold data
	core, text := 0, false      // core cells that hold data; one that holds text
	first, like := false, false // text in the first core column; it looks like a number
	for i, next := 0, 0; i < min(s.cells, lay.width); i++ {
		o := oddCell{c: i, cell: cell{kind: number}}
		if next < len(s.odds) && s.odds[next].c == i {
			o = s.odds[next]
			next++
			any = any || o.kind != blank
			if o.kind.holds() {
				holds++
			}
		}
		switch {
		case !lay.core[i]:
		case o.kind == prose, lay.alien(i, o.kind):
			text = true
			// A damaged number or clock time in the first column is a bad cell
			// of a row of samples; any other text makes the row text.
			if i == lay.first {
				like = o.kind == prose && numberLike(o.raw)
				first = !like
			}
		case o.kind.holds():
			core++
		}
	}
	switch {
	case !any:
		return isNothing
	case like:
		return isSamples
	case first, text && core == 0, core == 0 && (s.wide || holds == 0):
		return isText
	}
	return isSamples
}

// numberLike says whether text looks like a damaged number or clock time: one
// word, half of it digits, that begins as they do or has a decimal point.
func numberLike(b []byte) bool {
	digits, point := 0, false
	for i, c := range b {
		switch {
		case c == ' ':
			return false
		case c-'0' <= 9:
			digits++
		case (c == '.' || c == ',') && i > 0 && i+1 < len(b) && b[i-1]-'0' <= 9 && b[i+1]-'0' <= 9:
			point = true
		}
	}
	if len(b) == 0 || digits*2 < len(b) {
		return false
	}
	return b[0]-'0' <= 9 || b[0] == '-' || b[0] == '+' || b[0] == '.' || point && len(b) > 3
}
