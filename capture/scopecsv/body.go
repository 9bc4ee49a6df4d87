package scopecsv

import (
	"bytes"
	"fmt"
	"math"
	"slices"

	"benchslip/capture/num"
	"benchslip/capture/recording"
)

// column is one column of the table as it was read.
type column struct {
	v      []float64 // one value a row; NaN where there is none
	lost   []lost    // where and why there is none
	count  [prose + 1]int
	last   int // power of ten of the finest digit printed
	digits int // most significant digits printed
	whole  bool
	unit   string // unit glued to the numbers
	glued  int    // how many cells had one
	bare   int    // how many numbers other than zero had none while others had
	bareAt int    // line of the first of them
	start  int    // line of the first number
	text   int    // line of the first cell of text
	say    string // that text
	varies int    // line of the first text that differs from it
	words  bool   // every text is a unit
	q      float64
	dates  int // clock cells with a date
	times  int // clock cells with a time
}

// lost is a run of rows [from, to) without a value.
type lost struct {
	from, to int
	kind     kind
	why      string
	line     int
}

// breach is a place where text stands among the samples: before row at.
type breach struct {
	at    int
	line  int
	rows  []row // the text rows, at most 64
	count int   // all text rows
}

// hole is a place of blank rows among the samples: before row at.
type hole struct{ at, line, rows int }

// body is the table read.
type body struct {
	col        []column
	n          int
	breaches   []breach
	holes      []hole // at most maxLost
	nHoles     int
	jumps      []jump // where line number - row changes
	cut        int    // line of a last row that was cut off and left out; 0: none
	footer     []row  // text rows behind the samples, at most 64
	footerRows int
	short      int // line from which rows end early; 0: none
	shortAt    int // its row
	nuls       int
}

// jump says that rows from row on stand at lines row + off.
type jump struct{ row, off int }

// lineOf is the line of row n.
func (t *body) lineOf(n int) int {
	off := 0
	for _, j := range t.jumps {
		if j.row > n {
			break
		}
		off = j.off
	}
	return n + off
}

// blankCell stands for a blank in the list of last digits.
const blankCell = math.MinInt

type oddCell struct {
	c int
	cell
}

// scan reads the rows of samples into columns. A cell that is a plain number
// or blank is read in place; anything else goes through style.read. The time
// is linear in the text: every byte is seen a bounded number of times.
func (f *file) scan(lay *layout) (*body, error) {
	t := &body{col: make([]column, lay.width)}
	for c := range t.col {
		t.col[c].last = math.MaxInt
		t.col[c].whole = true
	}
	var (
		b       = f.text
		p       = lay.start
		line    = lay.line
		w       = lay.width
		last    = make([]int, w)
		digits  = make([]int, w)
		room    = 0
		odds    []oddCell
		open    *breach // text rows since the last row of samples
		gapAt   int     // line of the first blank row since then
		gapRows int     // how many
		budget  = len(b) - p + w
		off     = math.MinInt
		clocks  = slices.Contains(lay.clock, true)
	)
	for p < len(b) {
		if t.n == room {
			room = max(1024, room+room/2)
			for c := range t.col {
				grown := make([]float64, room)
				copy(grown, t.col[c].v[:t.n])
				t.col[c].v = grown
			}
		}
		rowStart, rowLines := p, 1
		for p < len(b) && b[p] == 0 {
			p++
			t.nuls++
		}
		c, plain, wide := 0, 0, false
		odds = odds[:0]
		for {
			// One cell from p; after it p stands at its separator or line end.
			for p < len(b) && (b[p] == ' ' || b[p] == '\t' && lay.sep != '\t') {
				p++
			}
			if lay.sep == ' ' && (p == len(b) || b[p] == '\n' || b[p] == '\r') {
				break
			}
			from := p
			d, n := num.Scan(b[p:], lay.mark)
			q := p + n
			for q < len(b) && b[q] == ' ' {
				q++
			}
			atEnd := q == len(b) || b[q] == '\n' || b[q] == '\r'
			if !atEnd && b[q] != lay.sep && !(lay.sep == ' ' && (q > p+n || b[q] == '\t')) {
				// not a plain number: find the end of the cell
				lineText, _ := lineAt(b, from)
				q = from + cellEnd(lineText, 0, lay.sep)
				if bytes.IndexByte(b[from:min(q, len(b))], '"') >= 0 && q == from+len(lineText) {
					// quotes may span lines
					joined, _, lines := logicalLine(b, rowStart)
					if end := rowStart + len(joined); end > q {
						q = from + cellEnd(b[from:end], 0, lay.sep)
						rowLines = lines
					}
				}
				if q-from > maxField {
					return nil, f.fault(line, recording.ErrUnsupported, fmt.Sprintf("a cell of %d bytes; cells are read up to %d", q-from, maxField), "export the samples as a table")
				}
				n = -1
			}
			switch {
			case c >= w:
				if n != 0 && lay.read(b[from:q]).kind != blank {
					wide = true
				}
			case n > 0 && d.V < overrange && d.V > -overrange:
				t.col[c].v[t.n] = d.V
				last[c], digits[c] = d.Last, d.Digits
				plain++
			case n == 0 && !lay.core[c]:
				t.col[c].v[t.n] = math.NaN()
				last[c] = blankCell
			case n == 0:
				t.col[c].v[t.n] = math.NaN()
				odds = append(odds, oddCell{c, cell{kind: blank}})
			default:
				t.col[c].v[t.n] = math.NaN()
				odds = append(odds, oddCell{c, lay.read(b[from:q])})
			}
			c++
			p = q
			if p-rowStart > maxRow {
				return nil, f.fault(line, recording.ErrUnsupported, fmt.Sprintf("a row of over %d bytes", maxRow), "export one record a row")
			}
			if p >= len(b) || b[p] == '\n' || b[p] == '\r' {
				break
			}
			if lay.sep != ' ' {
				p++ // the separator
				if p == len(b) {
					break
				}
			}
		}
		rowEnd := p
		ended := p < len(b)
		p = lineEnd(b, p)
		thisLine := line
		line += rowLines

		if len(odds) == 0 && c >= w && !wide && !clocks {
			if t.short > 0 {
				return nil, f.narrowRow(lay, t.short)
			}
			open = nil
			if gapAt > 0 {
				t.addHole(gapAt, gapRows)
				gapAt, gapRows = 0, 0
			}
			if thisLine-t.n != off {
				off = thisLine - t.n
				t.jumps = append(t.jumps, jump{t.n, off})
			}
			for c := range t.col {
				k := &t.col[c]
				if last[c] == blankCell {
					k.count[blank]++
					k.lose(t.n, blank, "blank", thisLine)
					continue
				}
				if k.count[number]++; k.count[number] == 1 {
					k.start = thisLine
				}
				k.last = min(k.last, last[c])
				k.digits = max(k.digits, digits[c])
				k.whole = k.whole && last[c] >= 0
				if k.glued > 0 && k.v[t.n] != 0 {
					k.noteBare(thisLine)
				}
			}
			t.n++
			continue
		}

		// An irregular row: samples with cells missing, blank, or text.
		what := lay.judge(odds, plain, c, wide)
		if what == isSamples && (c < w || wide) {
			switch {
			case wide:
				return nil, f.wideRow(lay, thisLine, b[rowStart:rowEnd])
			case !ended && t.n > 1:
				t.cut = thisLine
				what = isNothing
			case t.short == 0:
				t.short, t.shortAt = thisLine, t.n
			}
		}
		switch what {
		case isNothing:
			if gapRows++; gapAt == 0 {
				gapAt = thisLine
			}
			continue
		case isText:
			if open == nil {
				if len(t.breaches) == maxBreaches {
					return nil, f.fault(thisLine, recording.ErrFormat, fmt.Sprintf("text stands among the samples in over %d places", maxBreaches), "export the samples alone")
				}
				t.breaches = append(t.breaches, breach{at: t.n, line: thisLine})
				open = &t.breaches[len(t.breaches)-1]
			}
			open.count++
			if len(open.rows) < 64 {
				open.rows = append(open.rows, row{thisLine, rowStart, b[rowStart:rowEnd]})
			}
			continue
		}
		if gapAt > 0 {
			if open == nil {
				t.addHole(gapAt, gapRows)
			}
			gapAt, gapRows = 0, 0
		}
		open = nil
		if t.short > 0 && c >= w && t.short != thisLine {
			return nil, f.narrowRow(lay, t.short)
		}
		if budget -= w - min(c, w); t.n*w > budget {
			return nil, f.fault(thisLine, recording.ErrFormat, fmt.Sprintf("most rows have fewer cells than the %d expected", w), "export the samples as a table")
		}
		if thisLine-t.n != off {
			off = thisLine - t.n
			t.jumps = append(t.jumps, jump{t.n, off})
		}
		next := 0
		for i := range t.col {
			k := &t.col[i]
			switch {
			case next < len(odds) && odds[next].c == i:
				f.storeOdd(k, &odds[next].cell, t.n, thisLine)
				next++
			case i >= c:
				k.v[t.n] = math.NaN()
				k.count[blank]++
				k.lose(t.n, blank, "blank", thisLine)
			case last[i] == blankCell:
				k.count[blank]++
				k.lose(t.n, blank, "blank", thisLine)
			default:
				if k.count[number]++; k.count[number] == 1 {
					k.start = thisLine
				}
				k.last = min(k.last, last[i])
				k.digits = max(k.digits, digits[i])
				k.whole = k.whole && last[i] >= 0
				if k.glued > 0 && k.v[t.n] != 0 {
					k.noteBare(thisLine)
				}
			}
		}
		t.n++
	}
	for c := range t.col {
		t.col[c].v = t.col[c].v[:t.n]
	}
	f.closeBody(lay, t)
	return t, nil
}

// verdicts of judge.
const (
	isSamples = iota
	isNothing
	isText
)

// judge says whether an irregular row holds samples, nothing, or text.
func (lay *layout) judge(odds []oddCell, plain, c int, wide bool) int {
	any := plain > 0 || wide
	holds := plain              // cells anywhere that hold data
	core, text := 0, false      // core cells that hold data; one that holds text
	first, like := false, false // text in the first core column; it looks like a number
	for i, next := 0, 0; i < min(c, lay.width); i++ {
		o := oddCell{c: i, cell: cell{kind: number}}
		if next < len(odds) && odds[next].c == i {
			o = odds[next]
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
	case first, text && core == 0, core == 0 && (wide || holds == 0):
		return isText
	}
	return isSamples
}

// numberLike says whether text looks like a damaged number, clock time or mark:
// one word, beginning as they do, half of it digits.
func numberLike(b []byte) bool {
	if len(b) == 0 || !(b[0]-'0' <= 9 || b[0] == '-' || b[0] == '+' || b[0] == '.' || b[0] == '#') {
		return false
	}
	digits := 0
	for _, c := range b {
		if c == ' ' {
			return false
		}
		if c-'0' <= 9 {
			digits++
		}
	}
	return digits*2 >= len(b) || b[0] == '#'
}

// storeOdd stores a cell that is no plain number.
func (f *file) storeOdd(k *column, c *cell, n, line int) {
	k.count[c.kind]++
	switch c.kind {
	case number:
		if k.count[number] == 1 {
			k.start = line
		}
		q, factor := unitOf(c.unit)
		if c.unit != "" {
			if p, ok := prefix(c.unit); ok && q != seconds {
				factor = p
				k.unit = pick(k.unit, "")
			} else {
				k.unit = pick(k.unit, c.unit)
			}
			if q == other && factor == 0 {
				factor = 1
			}
			if k.glued == 0 && k.count[number] > 1 {
				k.bare, k.bareAt = k.count[number]-1, k.start
			}
			k.glued++
		} else {
			factor = 1
			if k.glued > 0 && c.V != 0 {
				k.noteBare(line)
			}
		}
		k.v[n] = c.V * factor
		if factor != 1 {
			k.v[n] = scaled(c.V, factor)
		}
		exp := c.Last
		if factor != 1 {
			exp += int(math.Round(math.Log10(factor)))
		}
		k.last = min(k.last, exp)
		k.digits = max(k.digits, c.Digits)
		k.whole = k.whole && exp >= 0
	case clock:
		f.storeClock(k, c, n)
	case blank:
		k.lose(n, blank, "blank", line)
	case marker:
		k.lose(n, marker, c.why, line)
	case prose:
		k.noteText(c.raw, line)
		k.lose(n, prose, "not a number", line)
	}
}

// noteText keeps the first text of a column and whether all are units.
func (k *column) noteText(raw []byte, line int) {
	if k.text > 0 && !k.words && k.varies > 0 {
		return
	}
	say := short(words(raw[:min(len(raw), 200)]))
	if k.text == 0 {
		k.text, k.say = line, say
		k.words = true
	}
	if say != k.say && k.varies == 0 {
		k.varies = line
	}
	if q, _ := unitOf(say); q == unknown {
		k.words = false
	}
}

// noteBare counts a number without a unit in a column where others have one.
func (k *column) noteBare(line int) {
	if k.bare++; k.bareAt == 0 {
		k.bareAt = line
	}
}

// storeClock stores a clock reading as seconds from the first date's midnight.
func (f *file) storeClock(k *column, c *cell, n int) {
	st := c.stamp
	v := st.s
	if st.hasDate {
		day := st.day(f.monthFirst)
		if f.day0 == 0 {
			f.day0 = day
		}
		v += float64(day-f.day0) * 86400
		k.dates++
	}
	if st.hasTime {
		k.times++
		if k.q == 0 || st.q < k.q {
			k.q = st.q
		}
	}
	k.v[n] = v
}

// scaled multiplies by a power of ten so that 514.1 mV is the float64 nearest
// 0.5141 more often than a product with 1e-3 would be: by dividing.
func scaled(v, factor float64) float64 {
	if factor < 1 {
		return v / math.Round(1/factor)
	}
	return v * factor
}

func pick(a, b string) string {
	if a != "" {
		return a
	}
	return b
}

// lose notes that row n has no value.
func (k *column) lose(n int, kd kind, why string, line int) {
	if i := len(k.lost) - 1; i >= 0 && k.lost[i].to == n && k.lost[i].kind == kd && k.lost[i].why == why {
		k.lost[i].to++
		return
	}
	if len(k.lost) < maxLost {
		k.lost = append(k.lost, lost{n, n + 1, kd, why, line})
	} else {
		k.lost[len(k.lost)-1].to = n + 1 // too many to tell apart: one run over all of them
	}
}

const (
	maxLost     = 1 << 16 // runs or holes kept
	maxBreaches = 1 << 12 // places of text among samples
)

func (t *body) addHole(line, rows int) {
	t.nHoles++
	if len(t.holes) < maxLost {
		t.holes = append(t.holes, hole{t.n, line, rows})
	}
}

// closeBody takes what stands behind the last sample as a footer, and a
// single short last row as cut off.
func (f *file) closeBody(lay *layout, t *body) {
	if i := len(t.breaches) - 1; i >= 0 && t.breaches[i].at == t.n {
		t.footer, t.footerRows = t.breaches[i].rows, t.breaches[i].count
		t.breaches = t.breaches[:i]
	}
	switch {
	case t.short > 0 && t.shortAt == t.n-1 && t.n > 2:
		t.cut = t.short
		t.dropLast()
	case t.cut == 0 && t.n > 4 && f.cutNumber(lay, t):
		t.cut = t.lineOf(t.n - 1)
		t.dropLast()
	}
}

// cutNumber says whether the file ends within a number: no line end behind
// it, and its last number has fewer decimals or exponent digits than all of up
// to 64 rows above, which agree.
func (f *file) cutNumber(lay *layout, t *body) bool {
	b := f.text
	if b[len(b)-1] == '\n' || b[len(b)-1] == '\r' {
		return false
	}
	const whole, decimals, exponent = 0, 1, 2
	tail := func(line []byte) (form, run int) {
		j := len(line)
		for j > 0 && line[j-1]-'0' <= 9 {
			j--
		}
		run = len(line) - j
		switch {
		case j > 0 && line[j-1] == lay.mark && lay.mark != lay.sep:
			return decimals, run
		case j > 1 && (line[j-1] == '+' || line[j-1] == '-') && line[j-2]|0x20 == 'e', j > 0 && line[j-1]|0x20 == 'e':
			return exponent, run
		}
		return whole, run
	}
	var lastForm, lastRun, form, run int
	end := len(b)
	for i := 0; i < min(65, t.n); i++ {
		from := end
		for from > 0 && b[from-1] != '\n' && b[from-1] != '\r' {
			from--
		}
		fm, r := tail(b[from:end])
		switch {
		case i == 0:
			lastForm, lastRun = fm, r
		case i == 1:
			form, run = fm, r
		case fm != form || r != run:
			return false
		}
		for end = from; end > 0 && (b[end-1] == '\n' || b[end-1] == '\r'); {
			end--
		}
	}
	return form != whole && run > 0 && (lastForm != form || lastRun < run)
}

// dropLast leaves out the last row.
func (t *body) dropLast() {
	t.n--
	for c := range t.col {
		k := &t.col[c]
		if v := k.v[t.n]; v == v && k.count[clock] == 0 {
			k.count[number]--
		} else if v == v {
			k.count[clock]--
		}
		k.v = k.v[:t.n]
		if i := len(k.lost) - 1; i >= 0 && k.lost[i].to > t.n {
			k.count[k.lost[i].kind]--
			if k.lost[i].to--; k.lost[i].to == k.lost[i].from {
				k.lost = k.lost[:i]
			}
		}
	}
}

// narrowRow refuses a row with fewer cells than those before and behind it.
func (f *file) narrowRow(lay *layout, line int) error {
	return f.fault(line, recording.ErrAmbiguous, fmt.Sprintf("this row has fewer cells than the %d of the others", lay.width), "mend or remove the row: it cannot be told which cell is lost")
}

// wideRow refuses a row with more cells than the others.
func (f *file) wideRow(lay *layout, line int, text []byte) error {
	n := len(split(text, lay.sep, nil))
	return f.fault(line, recording.ErrAmbiguous, fmt.Sprintf("this row has %d cells, the others have %d", n, lay.width),
		"mend or remove the row, or say how the file is written: [takes.NAME.csv] separator, decimal")
}
