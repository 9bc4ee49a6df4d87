package scopecsv

import (
	"fmt"
	"math"
	"sort"

	"benchslip/capture/recording"
)

// body is the table as it was read.
type body struct {
	col []column
	n   int // rows of samples

	jumps    []jump   // where the line number is not the row's plus the same again
	breaches []breach // text among the samples, at most maxBreaches
	holes    []hole   // blank rows among the samples, at most maxLost
	nHoles   int

	footer     []row // text rows behind the samples, at most maxBreachRows
	footerRows int   // how many there are
	cut        int   // line of a last row that was cut off and left out; 0: none
	short      int   // line from which rows end early; 0: none
	shortAt    int   // its row
	nuls       int   // NUL bytes before rows
}

// breach is a place where text stands among the samples: before row at.
type breach struct {
	at    int
	line  int
	rows  []row // at most maxBreachRows
	count int
}

// hole is a place of blank rows among the samples: before row at.
type hole struct{ at, line, rows int }

// jump says that rows from row on stand at lines row + off.
type jump struct{ row, off int }

const (
	maxBreaches   = 1 << 12
	maxBreachRows = 64
	maxLost       = 1 << 16 // runs or holes kept
)

func newBody(width int) *body {
	t := &body{col: make([]column, width)}
	for c := range t.col {
		t.col[c].last = math.MaxInt
		t.col[c].whole = true
	}
	return t
}

// makeRoom lets one more row fit: capacity follows the rows that are there.
func (t *body) makeRoom() {
	if t.n < len(t.col[0].v) {
		return
	}
	room := max(1024, t.n+t.n/2)
	for c := range t.col {
		grown := make([]float64, room)
		copy(grown, t.col[c].v[:t.n])
		t.col[c].v = grown
	}
}

// lineOf is the line of row n.
func (t *body) lineOf(n int) int {
	i := sort.Search(len(t.jumps), func(i int) bool { return t.jumps[i].row > n })
	if i == 0 {
		return n
	}
	return n + t.jumps[i-1].off
}

func (t *body) addHole(line, rows int) {
	t.nHoles++
	if len(t.holes) < maxLost {
		t.holes = append(t.holes, hole{t.n, line, rows})
	}
}

// close takes what stands behind the last sample as a footer, and leaves out a
// last row that was cut off: one that is shorter than the others, or that ends
// within a number.
func (t *body) close(f *file, lay *layout) {
	for c := range t.col {
		t.col[c].v = t.col[c].v[:t.n]
	}
	if i := len(t.breaches) - 1; i >= 0 && t.breaches[i].at == t.n {
		t.footer, t.footerRows = t.breaches[i].rows, t.breaches[i].count
		t.breaches = t.breaches[:i]
	}
	switch {
	case t.short > 0 && t.shortAt == t.n-1 && t.n > 2:
		t.cut = t.short
		t.dropLast()
	case t.cut == 0 && t.n > 4 && f.cutNumber(lay, t.n):
		t.cut = t.lineOf(t.n - 1)
		t.dropLast()
	}
}

// cutNumber says whether the file ends within a number: no line end behind
// it, and its last number has fewer decimals or exponent digits than all of up
// to 64 rows above, which agree.
func (f *file) cutNumber(lay *layout, rows int) bool {
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
	for i := 0; i < min(65, rows); i++ {
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
