package scopecsv

import (
	"fmt"
	"slices"

	"benchslip/capture/recording"
)

// checkBreaches judges text among the samples: a header or settings repeated,
// remarks, or the head of another table, which is refused.
func (a *assembly) checkBreaches() error {
	before := map[string]bool{}
	if len(a.t.breaches) > 0 {
		for _, r := range a.lay.pre {
			before[string(r.text)] = true
		}
	}
	for i := range a.t.breaches {
		b := &a.t.breaches[i]
		for _, r := range b.rows {
			if err := a.checkStray(r); err != nil {
				return err
			}
			if err := a.checkOther(r, len(b.rows), before); err != nil {
				return err
			}
		}
	}
	if n := a.t.footerRows; n > 64 && n > a.t.n {
		r := a.t.footer[0]
		return a.fault(r.line, recording.ErrFormat, fmt.Sprintf("%s of text follow %s of samples (%q)", plural(n, "row"), plural(a.t.n, "row"), short(words(r.text))), "export the samples alone")
	}
	for _, r := range a.t.footer {
		if err := a.checkStray(r); err != nil {
			return err
		}
	}
	// Before the samples one such row may be anything; two are samples, and so
	// is the last one.
	var strays []row
	for i, r := range a.lay.pre {
		if a.lay.otherSeparator(r.text) != 0 {
			if strays = append(strays, r); len(strays) == 2 || i == len(a.lay.pre)-1 {
				return a.checkStray(strays[0])
			}
		}
	}
	return nil
}

// checkStray refuses a row taken as text that is a row of numbers under another
// separator or with another form of time.
func (a *assembly) checkStray(r row) error {
	if _, kinds := a.lay.profile(r.text, nil, nil); a.lay.otherClock(kinds) {
		return a.twoClocks(r)
	}
	if sep := a.lay.otherSeparator(r.text); sep != 0 {
		return a.mixedSeparators(a.lay, r, sep)
	}
	return nil
}

// checkOther refuses the head of a table unlike the first one. before holds
// the rows of text before the samples.
func (a *assembly) checkOther(r row, rows int, before map[string]bool) error {
	if before[string(r.text)] {
		return nil
	}
	second := func(what string) error {
		return a.fault(r.line, recording.ErrUnsupported, "a second table begins here: "+what, "save each table as a file of its own")
	}
	numeric := make([]bool, a.lay.width)
	for c := range numeric {
		numeric[c] = a.role[c] != leftOut
	}
	cells := a.cellsOf(a.lay, r, numeric)
	if cells != nil && a.isNames(a.lay, cells, numeric, false, false) && !a.isUnits(a.lay, cells, numeric) && len(a.chans) > 0 && a.lay.width > 1 {
		var names []string
		for _, h := range a.heads.col {
			names = append(names, h.full)
		}
		if a.heads.named && !slices.Equal(names, cells[:min(len(cells), len(names))]) && len(cells) >= 2 {
			return second(fmt.Sprintf("its header %q differs", short(words(r.text))))
		}
	}
	if cells != nil && a.isUnits(a.lay, cells, numeric) {
		for c, t := range cells {
			if c >= len(a.heads.col) || !numeric[c] {
				continue
			}
			if _, q, f, ok := unitsCell(t); ok && (q != a.heads.col[c].q || f != a.heads.col[c].f) {
				return second(fmt.Sprintf("its unit %q differs", short(t)))
			}
		}
	}
	key, value := keyValue(r.text, a.lay.sep)
	kind, unit := settingOf(key)
	switch kind {
	case intervalSetting, rateSetting:
		probe := assembly{file: a.file, lay: a.lay, set: &settings{}}
		probe.takeNote(kind, key, unit, []string{value}, r.line)
		for _, fig := range probe.set.interval {
			same := len(a.set.interval) == 0
			for _, g := range a.set.interval {
				same = same || fig.v == g.v
			}
			if !same {
				return second(fmt.Sprintf("its %q differs", key))
			}
		}
	case timeUnitSetting, valueUnitSetting:
		return second(fmt.Sprintf("%q is stated again", key))
	}
	if a.time < 0 && len(a.chans) == 1 && rows > 0 {
		return second(fmt.Sprintf("%q stands between values of one column", short(words(r.text))))
	}
	return nil
}

// flagBreaches flags text and blank rows among the samples. Blank rows are no
// fault where a time column goes on evenly across them.
func (a *assembly) flagBreaches() error {
	sure := a.time >= 0 || a.index >= 0 // a missing row would show
	for i, b := range a.t.breaches {
		if !sure {
			a.breakAt(b.at)
		}
		if i < maxPlaces {
			from, to := a.place(max(b.at-1, 0), b.at)
			a.flag(recording.Gap, 0, from, to, "text stands among the samples (line %d: %q); samples may be missing there", b.line, short(words(b.rows[0].text)))
		}
	}
	if a.t.nHoles == 0 || sure {
		return nil
	}
	// A file spaced out evenly has as many blank rows in most places.
	usual := 0
	if a.t.nHoles*5 >= a.rows*2 {
		usual = a.t.holes[0].rows
		a.assume("blank rows between the rows left out")
	}
	flags := 0
	for _, h := range a.t.holes {
		if h.rows == usual {
			continue
		}
		a.breakAt(h.at)
		if flags++; flags <= maxPlaces {
			from, to := a.place(max(h.at-1, 0), h.at)
			a.flag(recording.Gap, 0, from, to, "%s among the samples at line %d; samples may be missing there", plural(h.rows, "blank row"), h.line)
		}
	}
	return nil
}
