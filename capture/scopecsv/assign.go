package scopecsv

import (
	"bytes"
	"fmt"
	"maps"
	"math"
	"slices"
	"strconv"
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

// holdsNumbers says which columns hold numbers or clock times at all, leaving
// out settings that stand beside the samples.
func (a *assembly) holdsNumbers() []bool {
	numeric := make([]bool, a.lay.width)
	for c := range numeric {
		k := a.t.col[c].count
		numeric[c] = k[number]+k[clock] > 0
	}
	a.beside = a.findBeside(numeric)
	for c, is := range a.beside {
		if is {
			numeric[c] = false
		}
	}
	// Notes in a few rows of a long table: a start, an increment, two clocks.
	if a.t.n >= 10 {
		for c, is := range numeric {
			k := a.t.col[c].count
			if n := k[number] + k[clock]; is && n <= 2 && (k[blank]+k[prose])*5 >= a.t.n*4 && a.atEnds(c) {
				numeric[c] = false
				a.notes = append(a.notes, c)
			}
		}
	}
	return numeric
}

// atEnds says whether the values of a column all stand in the first three rows
// or the last one.
func (a *assembly) atEnds(c int) bool {
	v := a.t.col[c].v
	for i := 3; i < len(v)-1; i++ {
		if v[i] == v[i] {
			return false
		}
	}
	return true
}

// maxBeside is the largest number of rows in which settings stand beside the
// samples.
const maxBeside = 64

// findBeside finds columns of settings beside the samples: a column of text in
// the first rows only, and the columns up to the next one that goes on.
func (a *assembly) findBeside(numeric []bool) []bool {
	beside := make([]bool, a.lay.width)
	n := a.t.n
	for c := 0; c < a.lay.width; c++ {
		k := &a.t.col[c]
		if k.count[prose] == 0 || numeric[c] && k.count[number]*4 > k.count[prose] {
			continue
		}
		end := 0 // row after the last text
		for _, l := range k.lost {
			if l.kind == prose {
				end = l.to
			}
		}
		if end > maxBeside || k.count[prose]*2 < end {
			continue
		}
		if end >= n && !a.knownSetting(c, end) {
			continue
		}
		for d := c; d < a.lay.width; d++ {
			kd := &a.t.col[d]
			if d > c && kd.count[number]+kd.count[clock] > 0 && (end < n && kd.lastFilled(n) > end || end >= n && d > c+1) {
				break
			}
			if d > c+1 && kd.count[prose] > 0 && a.isKeyColumn(d) {
				break
			}
			beside[d] = true
		}
	}
	return beside
}

func (a *assembly) isKeyColumn(c int) bool {
	return c+1 < a.lay.width && a.t.col[c+1].count[number] > 0 && a.knownSetting(c, min(a.t.n, maxBeside))
}

// lastFilled returns the row after the last one with a value.
func (k *column) lastFilled(n int) int {
	end := n
	for i := len(k.lost) - 1; i >= 0 && k.lost[i].to == end; i-- {
		end = k.lost[i].from
	}
	return end
}

// knownSetting says whether column c names a known setting in its first rows.
func (a *assembly) knownSetting(c, rows int) bool {
	found := false
	a.firstRows(rows, func(_ int, cells [][]byte) {
		if c < len(cells) && settingWord(words(trimmed(cells[c]))) {
			found = true
		}
	})
	return found
}

// firstRows splits the first rows of samples again.
func (a *assembly) firstRows(rows int, do func(line int, cells [][]byte)) {
	p, line := a.lay.start, a.lay.line
	var cells [][]byte
	for i := 0; i < rows && p < len(a.text); {
		text, next, n := logicalLine(a.text, p)
		if filled(text) {
			cells = split(text, a.lay.sep, cells)
			do(line, cells)
			i++
		}
		p = next
		line += n
	}
}

// readSettings collects what the rows before, beside and behind the samples
// state, and notes in the header's own columns.
func (a *assembly) readSettings() {
	s := &settings{text: map[string]string{}}
	a.set = s
	used := map[int]bool{}
	for _, i := range a.heads.pre {
		used[i] = true
	}
	for i, r := range a.lay.pre {
		if !used[i] {
			a.readPair(r)
		}
	}
	for c := 0; c < a.lay.width; c++ {
		if a.beside[c] && (c == 0 || !a.beside[c-1] || a.isKeyColumn(c)) {
			a.firstRows(min(a.t.n, maxBeside), func(line int, cells [][]byte) {
				if c >= len(cells) {
					return
				}
				key := words(trimmed(cells[c]))
				var values []string
				for d := c + 1; d < len(cells) && d < len(a.beside) && a.beside[d]; d++ {
					if w := words(trimmed(cells[d])); w != "" {
						values = append(values, w)
					}
				}
				a.takePair(key, values, line)
			})
		}
	}
	for _, c := range a.notes {
		h := a.heads.col[c]
		kind, unit := settingOf(h.full)
		for i, v := range a.t.col[c].v {
			if kind != noSetting && v == v && a.t.col[c].count[number] > 0 {
				a.takeNote(kind, h.full, unit, []string{strconv.FormatFloat(v, 'g', -1, 64)}, a.t.lineOf(i))
				break
			}
		}
	}
	// "t0 = -1e-3" and "dt = 1e-6" in cells of the header row.
	for _, c := range sortedKeys(a.heads.extra) {
		if key, value := keyValue([]byte(a.heads.extra[c]), 0); value != "" {
			a.takePair(key, []string{value}, a.heads.line)
		}
	}
	for _, c := range sortedKeys(a.heads.under) {
		v := a.heads.under[c]
		kind, unit := settingOf(a.heads.extra[c])
		if kind != noSetting {
			var values []string
			if v != "" {
				values = []string{v}
			}
			a.takeNote(kind, a.heads.extra[c], unit, values, a.heads.line)
		}
	}
	for _, r := range a.t.footer {
		a.readPair(r)
	}
}

func sortedKeys(m map[int]string) []int {
	return slices.Sorted(maps.Keys(m))
}

// readPair reads one row of settings: a name and one value a channel.
func (a *assembly) readPair(r row) {
	cells := split(r.text, a.lay.sep, nil)
	if a.lay.sep != ' ' && len(cells) > 1 {
		var values []string
		for _, v := range cells[1:] {
			if w := words(trimmed(v)); w != "" {
				values = append(values, w)
			}
		}
		if key := words(trimmed(bytes.TrimLeft(cells[0], commentMarks))); key != "" {
			a.takePair(key, values, r.line)
			return
		}
	}
	if key, value := keyValue(r.text, 0); value != "" {
		a.takePair(key, []string{value}, r.line)
	}
}

func (a *assembly) takePair(key string, values []string, line int) {
	if key == "" {
		return
	}
	if len(a.set.text) < 512 && len(values) > 0 {
		if _, twice := a.set.text[key]; !twice {
			a.set.text[key] = strings.Join(values, ", ")
		}
	}
	if kind, unit := settingOf(key); kind != noSetting && kind != otherSetting {
		a.takeNote(kind, key, unit, values, line)
	}
}

// takeNote takes in one setting of a known kind.
func (a *assembly) takeNote(kind settingKind, key, unit string, values []string, line int) {
	s := a.set
	if len(values) == 0 {
		s.named = append(s.named, key)
		return
	}
	switch kind {
	case timeUnitSetting, valueUnitSetting:
		for _, v := range values {
			if i := strings.LastIndexByte(v, ':'); i >= 0 {
				v = v[i+1:]
			}
			if _, in, ok := bracketed(v); ok {
				v = in
			}
			q, f := unitOf(v)
			if q == unknown && !looksUnit(v) {
				continue
			}
			fig := figure{v: f, q: q, text: v, key: key, line: line}
			if q == seconds && (kind == timeUnitSetting || s.timeUnit.text == "") {
				s.timeUnit = fig
			} else if kind == valueUnitSetting && q != seconds {
				s.valUnit = append(s.valUnit, fig)
			}
		}
		return
	case modeSetting:
		if s.mode == "" {
			s.mode, s.modeLine = values[0], line
		}
		return
	case offsetSetting:
		s.offset = key
		return
	}
	got := false
	for i, v := range values {
		behind := unit
		if i+1 < len(values) {
			if _, _, ok := rateUnit(values[i+1]); ok {
				behind = values[i+1]
			}
		}
		fig, ok := a.lay.stated(v, behind)
		if !ok {
			continue
		}
		if plain, _ := plainKey(key); plain == "clock" && fig.q == unknown {
			continue // a clock without a unit may be anything
		}
		got = true
		fig.key, fig.line = key, line
		switch {
		case (kind == intervalSetting || kind == rateSetting) && !(fig.v > 0):
		case fig.q == hertz && (kind == intervalSetting || kind == rateSetting), kind == rateSetting && fig.q == unknown:
			fig.half /= fig.v * fig.v // as an interval
			fig.rate, fig.v = fig.v, 1/fig.v
			s.interval = append(s.interval, fig)
		case fig.q == seconds && kind == rateSetting, kind == intervalSetting && (fig.q == seconds || fig.q == unknown):
			fig.rate = 1 / fig.v
			s.interval = append(s.interval, fig)
		case kind == startSetting && (fig.q == unknown || fig.q == seconds):
			s.start = append(s.start, fig)
		case kind == lengthSetting && fig.q == unknown:
			s.length = append(s.length, fig)
		case kind == scaleSetting && (fig.q == unknown || fig.q == volts):
			s.scale = append(s.scale, fig)
		case kind == probeSetting:
			s.probe = append(s.probe, fig)
		}
	}
	if !got && (kind == intervalSetting || kind == rateSetting) {
		s.named = append(s.named, key)
	}
}

// extraWords name columns that are no channel even when they hold numbers.
var extraWords = map[string]bool{"event": true, "events": true, "marker": true, "markers": true, "comment": true, "comments": true, "signature": true, "alarm": true, "alarms": true, "alarm text": true,
	"status": true, "flag": true, "flags": true, "checksum": true, "crc": true, "annotation": true, "annotations": true, "note": true, "notes": true, "remark": true, "remarks": true, "date": true, "valid": true, "trigger event": true, "error": true, "errors": true, "state": true}

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
		case extraWords[strings.ToLower(strings.TrimSpace(h.name))] && a.t.col[c].times == 0:
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
		if sign := pick(k.say, whyOf(k)); data == 0 && k.varies == 0 && (sign == "+" || sign == "-") || data == 0 && k.words == false && k.say == "+" {
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
		if sep := a.otherSeparator([]byte(k.say)); sep != 0 {
			return a.fault(k.text, recording.ErrFormat, fmt.Sprintf("cells are parted by %s and by %s in one file (%q)", sepName(a.lay.sep), sepName(sep), short(k.say)), "export it again without a detour through a spreadsheet")
		}
		if k.count[prose]*10 > data+k.count[prose] && !extraWords[strings.ToLower(a.heads.col[c].name)] {
			return a.fault(k.text, recording.ErrFormat, fmt.Sprintf("%s mixes numbers with text (%q and %d more cells)", a.title(c), short(k.say), k.count[prose]-1), "export the samples as numbers")
		}
	}
	if k.glued > 0 && k.bare > 0 && k.unit != "" {
		return a.fault(k.bareAt, recording.ErrAmbiguous, fmt.Sprintf("%s has numbers with a unit behind them and numbers without", a.title(c)), "export it with one fixed unit")
	}
	return nil
}

// whyOf is the first mark in a column without values.
func whyOf(k *column) string {
	for _, l := range k.lost {
		if l.kind == marker {
			return l.why
		}
	}
	return ""
}

// otherSeparator tells a separator other than the file's under which text
// falls into two or more numbers, 0 when there is none.
func (a *assembly) otherSeparator(text []byte) byte {
	for _, s := range separators {
		if s.sep == a.lay.sep {
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

// rising says whether a column only rises or only falls.
func (a *assembly) rising(c int) bool {
	up, down := 0, 0
	v := a.t.col[c].v
	for i := 1; i < len(v); i++ {
		switch {
		case v[i] > v[i-1]:
			up++
		case v[i] < v[i-1]:
			down++
		}
	}
	return up == 0 || down == 0
}

// counting says whether a column holds whole numbers that rise by 1 in nearly
// all rows.
func (a *assembly) counting(c int) bool {
	k := &a.t.col[c]
	if !k.whole || k.count[number] == 0 || k.count[clock] > 0 || k.glued > 0 {
		return false
	}
	one := 0
	for i := 1; i < len(k.v); i++ {
		if k.v[i]-k.v[i-1] == 1 {
			one++
		}
	}
	return one >= (len(k.v)-1)*9/10
}

// evenAxis says whether a column rises (or falls) in even steps as a time
// column does.
func (a *assembly) evenAxis(c int) bool {
	k := &a.t.col[c]
	if k.count[number] < 3 || k.count[number] < a.t.n {
		return false
	}
	v := k.v
	if v[len(v)-1] < v[0] {
		v = reversedCopy(v)
	}
	m := measureTime(v, rounding(k.last, k.digits))
	return m.step > 0 && m.usable && len(m.breaks)*20 <= a.t.n
}

func reversedCopy(v []float64) []float64 {
	out := make([]float64, len(v))
	for i, x := range v {
		out[len(v)-1-i] = x
	}
	return out
}

// timeByOption takes the time column that the job names.
func (a *assembly) timeByOption() error {
	want := strings.TrimSpace(a.opt.TimeColumn)
	if strings.EqualFold(want, "none") {
		for c, r := range a.role {
			if r == dateRole || r == channel && a.t.col[c].count[clock] > 0 {
				a.role[c] = leftOut
			}
		}
		return nil
	}
	found := -1
	for c, h := range a.heads.col {
		if h.full != "" && h.full == want {
			found = c
		}
	}
	for c, h := range a.heads.col {
		if found < 0 && h.name != "" && strings.EqualFold(h.name, want) {
			found = c
		}
	}
	if n, err := strconv.Atoi(want); found < 0 && err == nil && n >= 1 && n <= a.lay.width {
		found = n - 1
	}
	if found < 0 || a.role[found] == leftOut {
		return a.fault(a.headLine(), recording.ErrAmbiguous, fmt.Sprintf("no column of numbers is called %q", want), "correct csv.time_column in the job file: a header text or a number from 1")
	}
	a.setTime(found)
	a.how0 = "csv.time_column of the job"
	return nil
}

func (a *assembly) setTime(c int) {
	a.time = c
	a.role[c] = timeRole
}

// timeByLook finds the time column by unit, then by name, then by its even
// steps; a column that counts rows is no time.
func (a *assembly) timeByLook() error {
	var byUnit, byName, byClock []int
	for c, r := range a.role {
		if r != channel {
			continue
		}
		h, k := a.heads.col[c], &a.t.col[c]
		q, _ := unitOf(k.unit)
		switch {
		case k.count[clock]*2 > k.count[number]:
			byClock = append(byClock, c)
		case k.glued > 0 && q == seconds, k.glued == 0 && h.q == seconds:
			byUnit = append(byUnit, c)
		case h.q == unknown && timeWord(h.full) && k.glued == 0:
			byName = append(byName, c)
		}
	}
	if len(byClock) > 0 {
		byUnit = a.takeMillis(byClock[0], byUnit)
	}
	for _, list := range [][]int{byUnit, byName} {
		for _, c := range list {
			if a.time < 0 && (a.axisLike(c) || len(list) == 1 && timeWord(a.heads.col[c].full)) {
				a.setTime(c)
				a.how0 = "its header"
			}
		}
	}
	if a.time < 0 && len(byClock) > 0 {
		a.setTime(byClock[0])
		a.how0 = "its clock times"
	}
	if a.time < 0 {
		a.timeByShape()
	}
	if a.time < 0 {
		return nil
	}
	// Row numbers beside a time column are no channel; nor is a copy of it.
	first := -1
	for c, r := range a.role {
		if r != channel {
			continue
		}
		h := a.heads.col[c]
		if first < 0 {
			first = c
		}
		if a.counting(c) && (indexWord(h.full) || c < a.time && h.q == unknown) {
			a.role[c] = indexRole
			a.assume("%s left out: it counts the rows", a.title(c))
			continue
		}
		again := h.q == seconds || h.q == unknown && timeWord(h.full)
		if !again && h.full == "" && c > a.time+1 && a.sameAs(c, a.time) {
			again = true
		}
		if again && a.axisLike(c) {
			if !a.sameAs(c, a.time) {
				return a.fault(a.headLine(), recording.ErrAmbiguous, fmt.Sprintf("%s and %s are both time and differ", a.title(a.time), a.title(c)), "export the channels on one time axis, or say [takes.NAME.csv] time_column")
			}
			a.role[c] = leftOut
			a.assume("%s left out: it repeats the time column", a.title(c))
		}
	}
	return nil
}

// takeMillis adds a column of milliseconds 0..999 to a clock that shows whole
// seconds.
func (a *assembly) takeMillis(c int, byUnit []int) []int {
	if a.t.col[c].q < 1 {
		return byUnit
	}
	for i, d := range byUnit {
		k, h := &a.t.col[d], a.heads.col[d]
		if h.f != 1e-3 || k.glued > 0 {
			continue
		}
		fits := true
		for _, v := range k.v {
			fits = fits && !(v < 0 || v >= 1000)
		}
		if fits {
			a.role[d] = leftOut
			a.millis = d
			return append(byUnit[:i:i], byUnit[i+1:]...)
		}
	}
	return byUnit
}

// axisLike says whether a column rises or falls in most rows.
func (a *assembly) axisLike(c int) bool {
	up, down, n := 0, 0, 0
	v := a.t.col[c].v
	for i := 1; i < len(v); i++ {
		switch {
		case v[i] > v[i-1]:
			up++
			n++
		case v[i] < v[i-1]:
			down++
			n++
		case v[i] == v[i-1]:
			n++
		}
	}
	return n > 0 && (down*10 <= up || up*10 <= down) && up+down > 0
}

// sameAs says whether two columns hold the same values wherever both do.
func (a *assembly) sameAs(c, d int) bool {
	x, y := a.t.col[c], a.t.col[d]
	fx, fy := a.factor(c), a.factor(d)
	tol := math.Max(pow10(x.last)*fx, pow10(y.last)*fy)
	for i := range x.v {
		if diff := math.Abs(x.v[i]*fx - y.v[i]*fy); diff > tol {
			return false
		}
	}
	return true
}

func (a *assembly) factor(c int) float64 {
	if h := a.heads.col[c]; h.q == seconds && a.t.col[c].glued == 0 {
		return h.f
	}
	return 1
}

// timeByShape takes the first column of numbers as time when nothing says
// otherwise and it steps evenly.
func (a *assembly) timeByShape() {
	for c, r := range a.role {
		if r != channel {
			continue
		}
		h := a.heads.col[c]
		others := 0
		for d, rd := range a.role {
			if d > c && rd == channel {
				others++
			}
		}
		if others == 0 || h.q != unknown || a.t.col[c].glued > 0 {
			return
		}
		if a.counting(c) {
			if h.full == "" && len(a.lay.pre) == 0 && others == 1 {
				// Two bare columns are seconds and volts; whole numbers may
				// as well be a count.
				a.setTime(c)
				a.how0 = "two columns without a header"
				a.maybeCount = true
				return
			}
			a.role[c] = indexRole
			a.index = c
			a.assume("%s counts the rows", a.title(c))
			// A count may be followed by the time.
			for d := c + 1; d < len(a.role); d++ {
				if a.role[d] == channel {
					hd := a.heads.col[d]
					if hd.full == "" && others > 1 && hd.q == unknown && a.evenAxis(d) && !a.counting(d) {
						a.setTime(d)
						a.how0 = "its even steps"
					}
					break
				}
			}
			return
		}
		if channelName(h.name) && len(a.set.interval) > 0 {
			return
		}
		if h.full == "" || !channelName(h.name) {
			if a.axisLike(c) && (h.full != "" || a.t.col[c].count[number] == a.t.n) {
				a.setTime(c)
				a.how0 = "its even steps"
				if h.full == "" {
					a.how0 = "its place and even steps, no header"
				}
			}
		}
		return
	}
}

// channelName says whether a header names a channel or a voltage.
func channelName(t string) bool {
	w := strings.ToLower(strings.TrimSpace(t))
	if w == "" {
		return false
	}
	for _, p := range []string{"volt", "spannung", "tension", "ampl", "signal", "value", "wert", "data", "input", "output", "u_", "v_", "vin", "vout", "current", "level", "adc", "y"} {
		if strings.HasPrefix(w, p) {
			return true
		}
	}
	return channelWord(strings.Fields(strings.NewReplacer("_", " ", "-", " ").Replace(w))[0]) && w != "a"
}
