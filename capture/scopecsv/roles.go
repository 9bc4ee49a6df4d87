package scopecsv

import (
	"fmt"
	"strings"

	"benchslip/capture/recording"
)

// roles of a column.
type role uint8

const (
	leftOut role = iota // text, notes, settings beside the samples, row numbers
	channel
	timeRole
	dateRole // a date whose time of day stands in another column
	indexRole
)

// assignColumns decides which column is time and which are channels.
func (a *assembly) assignColumns(numeric []bool) error {
	w := a.lay.width
	a.role = make([]role, w)
	for c := range w {
		if err := a.checkText(c, numeric[c]); err != nil {
			return err
		}
		if !numeric[c] {
			continue
		}
		a.role[c] = channel
		h := &a.heads.col[c]
		switch {
		case extraWords[strings.ToLower(strings.TrimSpace(h.name))] && a.t.col[c].times == 0 && a.t.col[c].whole:
			if a.t.col[c].dates > 0 {
				a.role[c] = dateRole
			} else {
				a.role[c] = leftOut
				a.assume("%s left out: its name says that it is no channel", a.title(c))
			}
		case a.t.col[c].dates > 0 && a.t.col[c].times == 0:
			a.role[c] = dateRole
		}
	}
	if n := a.countRole(channel); n > 32 && n > 4*a.t.n {
		return a.fault(a.lay.line, recording.ErrUnsupported, fmt.Sprintf("%s of %d numbers each: the samples seem to run along the rows", plural(a.t.n, "row"), n), "export one sample a row")
	}
	for c := range w {
		if err := a.unitColumn(c, numeric); err != nil {
			return err
		}
	}
	if err := a.frequencyAxis(numeric); err != nil {
		return err
	}
	if a.opt.TimeColumn != "" {
		if err := a.timeByOption(); err != nil {
			return err
		}
	} else if err := a.timeByLook(); err != nil {
		return err
	}
	for c, r := range a.role {
		if r == channel && a.t.col[c].count[clock] > 0 {
			a.role[c] = leftOut
			a.assume("%s left out: clock times beside the time column", a.title(c))
		}
		if a.role[c] == channel {
			a.chans = append(a.chans, c)
		}
	}
	if len(a.chans) == 0 {
		return a.fault(a.lay.line, recording.ErrFormat, "the table holds one column of time and no column of values", "export the samples too, or say [takes.NAME.csv] time_column = \"none\"")
	}
	return nil
}

func (a *assembly) countRole(r role) int {
	n := 0
	for _, x := range a.role {
		if x == r {
			n++
		}
	}
	return n
}

// unitColumn takes a column of unit words as the unit of the numbers to its
// left (or right, when none stand left). Units that change are refused.
func (a *assembly) unitColumn(c int, numeric []bool) error {
	k := &a.t.col[c]
	if numeric[c] || a.beside[c] || k.text == 0 || !k.words {
		return nil
	}
	q, f := unitOf(k.say)
	if q == counts || q == other && len(k.say) < 2 && !strings.Contains(strings.ToLower(a.heads.col[c].full), "unit") {
		return nil
	}
	d := c - 1
	if d < 0 || !numeric[d] || a.t.col[d].count[clock] > 0 {
		if d = c + 1; d >= len(numeric) || !numeric[d] || a.t.col[d].count[clock] > 0 {
			return nil
		}
	}
	if k.varies > 0 {
		return a.fault(k.varies, recording.ErrAmbiguous, fmt.Sprintf("the unit of %s changes from row to row (%q at first)", a.title(d), k.say), "export it with one fixed range")
	}
	h := &a.heads.col[d]
	if h.q != unknown && (h.q != q || h.f != f) {
		return a.fault(k.text, recording.ErrAmbiguous, fmt.Sprintf("%s is in %q by its header and in %q by the column beside it", a.title(d), h.unit, k.say), `say [takes.NAME.csv] value_unit = "V"`)
	}
	h.unit, h.q, h.f, h.from = k.say, q, f, "the column beside it"
	return nil
}

// checkText judges text in a column: a column of words is left out, damage is
// refused, single bad cells are marked missing later.
func (a *assembly) checkText(c int, numeric bool) error {
	k := &a.t.col[c]
	data := k.count[number] + k.count[clock]
	if a.beside[c] || k.count[prose]+data+k.count[marker] == 0 {
		if !a.beside[c] && a.heads.col[c].full != "" {
			a.assume("%s left out: it is empty", a.title(c))
		}
		return nil
	}
	if k.say != "" && (k.say[0] == '{' || k.say[0] == '[') {
		return a.fault(k.text, recording.ErrFormat, fmt.Sprintf("a cell holds structured text (%q): a summary, not samples", short(k.say)), "export the samples as a table of numbers")
	}
	if !numeric {
		if sign := signOf(k); data == 0 && k.varies == 0 && (sign == "+" || sign == "-") || data == 0 && !k.words && k.say == "+" {
			return a.fault(max(k.text, a.lay.line), recording.ErrFormat, fmt.Sprintf("column %d holds signs apart from their numbers", c+1), "export numbers with their signs")
		}
		if data == 0 {
			if k.count[prose] == 0 && a.lay.core[c] {
				a.flag(recording.Overrange, 0, nil, nil, "%s left out: no cell of it holds a value (%s)", a.title(c), k.lost[0].why)
			} else {
				a.assume("%s left out: it holds text", a.title(c))
			}
		} else {
			a.assume("%s left out: it holds %s in %d rows", a.title(c), plural(data, "value"), a.t.n)
		}
		return nil
	}
	if k.count[prose] > 0 {
		if sep := a.lay.otherSeparator([]byte(k.say)); sep != 0 {
			return a.fault(k.text, recording.ErrFormat, fmt.Sprintf("cells are parted by %s and by %s in one file (%q)", sepName(a.lay.sep), sepName(sep), short(k.say)), "export it again without a detour through a spreadsheet")
		}
		if k.count[prose]*10 > data+k.count[prose] && !extraWords[strings.ToLower(a.heads.col[c].name)] {
			return a.fault(k.text, recording.ErrFormat, fmt.Sprintf("%s mixes numbers with text (%q and %d more cells)", a.title(c), short(k.say), k.count[prose]-1), "export the samples as numbers")
		}
	}
	if k.mixed > 0 {
		return a.fault(k.mixed, recording.ErrAmbiguous, fmt.Sprintf("%s changes its unit here (%q at first)", a.title(c), k.unit), "export it with one fixed unit")
	}
	if k.glued > 0 && k.bare > 0 && k.unit != "" {
		return a.fault(k.bareAt, recording.ErrAmbiguous, fmt.Sprintf("%s has numbers with a unit behind them and numbers without", a.title(c)), "export it with one fixed unit")
	}
	return nil
}

// signOf is the first text or mark in a column without values.
func signOf(k *column) string {
	if k.say != "" {
		return k.say
	}
	for _, l := range k.lost {
		if l.kind == marker {
			return l.why
		}
	}
	return ""
}

// frequencyAxis refuses a table over frequency: the first column's unit is Hz,
// or its name says frequency and its unit is none of time (a unit beats a name).
func (a *assembly) frequencyAxis(numeric []bool) error {
	for c, is := range numeric {
		if !is || a.role[c] != channel {
			continue
		}
		h := a.heads.col[c]
		if a.counting(c) && h.q == unknown && c+1 < len(numeric) {
			continue // row numbers
		}
		name := strings.ToLower(h.name)
		named := strings.HasPrefix(name, "freq") || strings.Contains(name, "frequency") || name == "f" || strings.HasPrefix(name, "frequenz")
		if (h.q == hertz || named && h.q == unknown) && a.rising(c) {
			return a.fault(a.headLine(), recording.ErrUnsupported, fmt.Sprintf("%s is a frequency: a response or a spectrum, not samples over time", a.title(c)), "export the waveform")
		}
		return nil
	}
	return nil
}
