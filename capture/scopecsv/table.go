package scopecsv

import (
	"fmt"
	"math"
	"strconv"

	"benchslip/capture/recording"
)

// parse turns the bytes of a file into a recording.
func parse(path string, raw []byte, size int64, opt recording.Options) (*table, error) {
	f := &file{path: path, opt: opt}
	f.text, f.how = plainText(raw)
	if err := f.refuseForeign(); err != nil {
		return nil, err
	}
	lay, err := f.find()
	if err != nil {
		return nil, err
	}
	t, err := f.scan(lay)
	if err != nil {
		return nil, err
	}
	return f.assemble(lay, t, size)
}

// assembly gathers the recording.
type assembly struct {
	*file
	lay    *layout
	t      *body
	heads  *heads
	set    *settings
	beside []bool // columns of settings beside the samples
	keyed  []bool // columns that name a known setting in the first rows
	notes  []int  // columns with one or two values
	role   []role
	info   recording.Info

	time       int                   // column of time; -1: none
	index      int                   // column that counts rows; -1: none
	millis     int                   // column of milliseconds beside a clock of whole seconds; -1: none
	timeFrom   string                // how the time column was found
	maybeCount bool                  // the time column may be a count
	stamp      []float64             // s, one a row; nil without time column
	grain      func(float64) float64 // rounding of a stamp, s
	timed      *timing
	reversed   bool  // the rows were turned round
	joints     []int // rows that do not follow the one before
	rows       int   // rows in the file
	chans      []int // columns of channels
	out        [][]float64
}

func (a *assembly) assume(format string, args ...any) {
	a.info.Assumptions = append(a.info.Assumptions, fmt.Sprintf(format, args...))
}

func (a *assembly) flag(code string, channel int, from, to *float64, format string, args ...any) {
	a.info.Flags = append(a.info.Flags, recording.Flag{Code: code, Channel: channel, FromS: from, ToS: to, Message: fmt.Sprintf(format, args...)})
}

func (f *file) assemble(lay *layout, t *body, size int64) (*table, error) {
	a := &assembly{file: f, lay: lay, t: t, time: -1, index: -1, millis: -1, rows: t.n}
	a.info = recording.Info{Format: "scope CSV", Kind: recording.Scope, Bytes: size, Frames: int64(t.n)}
	numeric := a.holdsNumbers()
	var err error
	if a.heads, err = f.findHeads(lay, numeric); err != nil {
		return nil, err
	}
	a.readSettings()
	mark := "a point"
	if lay.mark == ',' {
		mark = "a comma"
	}
	a.assume("%s, cells parted by %s, decimals behind %s", f.how, sepName(lay.sep), mark)
	for _, step := range []func() error{
		func() error { return a.assignColumns(numeric) },
		a.checkBreaches, a.readTime, a.fixRate, a.flagBreaches, a.channels, a.checkLength,
	} {
		if err := step(); err != nil {
			return nil, err
		}
	}
	a.finish()
	return &table{info: a.info, columns: a.out}, nil
}

// headLine is the line that messages about a column's header name.
func (a *assembly) headLine() int {
	if a.heads.line > 0 {
		return a.heads.line
	}
	return a.lay.line
}

// title is how messages name a column.
func (a *assembly) title(c int) string {
	if n := a.heads.col[c].full; n != "" {
		return fmt.Sprintf("column %d %q", c+1, short(n))
	}
	return "column " + strconv.Itoa(c+1)
}

// plural counts things.
func plural(n int, one string) string {
	if n == 1 {
		return "1 " + one
	}
	return strconv.Itoa(n) + " " + one + "s"
}

func (a *assembly) placeOf(n int) float64 {
	if a.stamp != nil && n < len(a.stamp) && a.stamp[n] == a.stamp[n] {
		return a.stamp[n]
	}
	if a.info.RateHz > 0 {
		return a.info.StartS + float64(n)/a.info.RateHz
	}
	return math.NaN()
}

// place returns pointers for a flag, nil when no time is known.
func (a *assembly) place(from, to int) (*float64, *float64) {
	x, y := a.placeOf(from), a.placeOf(to)
	if x != x {
		return nil, nil
	}
	if y != y {
		y = x
		if a.info.RateHz > 0 {
			y += float64(to-from) / a.info.RateHz
		}
	}
	return recording.Place(x, y)
}

// finish adds what concerns the whole file.
func (a *assembly) finish() {
	a.info.Text = a.set.text
	if n := len(a.t.footer); n > 0 {
		a.assume("%s of text behind the samples left out (from line %d: %q)", plural(n, "row"), a.t.footer[0].line, short(words(a.t.footer[0].text)))
	}
	if a.t.nuls > 0 {
		a.assume("%s before rows left out", plural(a.t.nuls, "NUL byte"))
	}
}
