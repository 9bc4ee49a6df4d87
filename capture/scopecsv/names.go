package scopecsv

import (
	"bytes"
	"fmt"
	"strings"

	"benchslip/capture/recording"
)

// heads are the headers of the columns of samples.
type heads struct {
	col   []header
	named bool // a header row was found
	line  int  // the header row's line
	pre   []int
	extra map[int]string // names over columns without samples
	under map[int]string // what the units row holds there
}

// comment marks that may stand before a header.
const commentMarks = "#%!*;/"

// findHeads reads the names and units over the samples from the rows right
// before them. columns tells which columns hold numbers.
func (f *file) findHeads(lay *layout, numeric []bool) (*heads, error) {
	h := &heads{col: make([]header, lay.width)}
	i := len(lay.pre) - 1
	var units []string
	unitsLine := -1
	marker := false
	for ; i >= 0; i-- {
		cells := f.cellsOf(lay, lay.pre[i], numeric)
		if cells == nil { // one cell of prose over several columns: a marker such as "data"
			if marker || h.named || hasUnit(words(lay.pre[i].text)) {
				break
			}
			marker = true
			continue
		}
		if couplings(cells) {
			h.pre = append(h.pre, i)
			continue
		}
		if units == nil && f.isUnits(lay, cells, numeric) {
			units, unitsLine = cells, i
			h.pre = append(h.pre, i)
			if h.named {
				break
			}
			continue
		}
		if h.named || !f.isNames(lay, cells, numeric, units != nil, marker) {
			break
		}
		for c, t := range cells {
			if c >= lay.width || !numeric[c] {
				if k := lay.read([]byte(t)).kind; k == number {
					return nil, f.fault(lay.pre[i].line, recording.ErrAmbiguous, fmt.Sprintf("the header holds a number (%q) where no column of numbers is", short(t)), "mend the row: a line end may be lost")
				}
			}
		}
		h.named, h.line = true, lay.pre[i].line
		h.pre = append(h.pre, i)
		h.extra = map[int]string{}
		for c, t := range cells {
			if c < lay.width {
				h.col[c] = readHeader(t)
			}
			if t != "" && (c >= lay.width || !numeric[c]) {
				h.extra[c] = t
			}
		}
		if units != nil {
			break
		}
	}
	if !h.named && units == nil && len(lay.pre) > 0 {
		// A row that looks like a header but cannot be laid over the columns
		// may hold a unit that matters.
		last := lay.pre[len(lay.pre)-1]
		if err := f.misfit(lay, last, numeric); err != nil {
			return nil, err
		}
	}
	for c := range h.col {
		if c < len(units) && units[c] != "" && numeric[c] {
			if !h.named {
				h.col[c].full, h.col[c].name = units[c], units[c]
			}
			if unit, q, fac, ok := unitsCell(units[c]); ok {
				h.col[c].unit, h.col[c].q, h.col[c].f, h.col[c].from = unit, q, fac, fmt.Sprintf("the units row, line %d", lay.pre[unitsLine].line)
			}
		}
	}
	// Settings over columns of their own: "Start", "Increment", their values
	// in the row below, which may be missing.
	h.under = map[int]string{}
	for c := range h.extra {
		h.under[c] = ""
		if c < len(units) {
			h.under[c] = units[c]
		}
	}
	return h, nil
}

// cellsOf lays a row over the columns: by position when it is as wide as the
// samples, else name by column of numbers when the counts agree. nil when it
// is neither.
func (f *file) cellsOf(lay *layout, r row, numeric []bool) []string {
	text := bytes.TrimLeft(r.text, " \t")
	if t := bytes.TrimLeft(text, commentMarks); len(t) < len(text) {
		text = bytes.TrimLeft(t, " ")
		if lay.sep != '\t' {
			text = bytes.TrimLeft(text, " \t")
		}
	} else {
		text = r.text
	}
	last, count := 0, 0
	for c, is := range numeric {
		if is {
			last = c
			count++
		}
	}
	fit := func(parts []string) []string {
		for len(parts) > 0 && parts[len(parts)-1] == "" {
			parts = parts[:len(parts)-1]
		}
		filled := 0
		for _, p := range parts {
			if p != "" {
				filled++
			}
		}
		if filled == 0 {
			return nil
		}
		if len(parts) >= last+1 && len(parts) <= maxWidth {
			ok := true
			for c, is := range numeric {
				if is && parts[c] == "" && filled == count {
					ok = false // as many names as columns, yet beside them
				}
			}
			if ok {
				return parts
			}
		}
		if filled == count {
			out := make([]string, lay.width)
			k := 0
			for _, p := range parts {
				if p == "" {
					continue
				}
				for !numeric[k] {
					k++
				}
				out[k] = p
				k++
			}
			return out
		}
		return nil
	}
	var parts []string
	for _, c := range split(text, lay.sep, nil) {
		parts = append(parts, words(trimmed(c)))
	}
	if lay.sep != ' ' {
		if got := fit(parts); got != nil && (len(parts) > 1 || count == 1) {
			return got
		}
		return nil
	}
	// Blanks part names and stand inside them: tabs and wide gaps part best,
	// then single blanks with units joined to their names.
	for _, cut := range []func(string) []string{
		func(s string) []string { return fieldsOn(s, "\t") },
		func(s string) []string { return fieldsOn(s, "  ") },
		func(s string) []string { return fieldsOn(s, ",") },
		joinUnits,
		strings.Fields,
	} {
		if p := cut(string(bytes.TrimSpace(text))); len(p) == count || len(p) >= last+1 && len(p) <= lay.width {
			for i := range p {
				p[i] = words(trimmed([]byte(p[i])))
			}
			if got := fit(p); got != nil {
				return got
			}
		}
	}
	return nil
}

func fieldsOn(s, sep string) []string {
	var out []string
	for _, p := range strings.Split(s, sep) {
		if p = strings.TrimSpace(p); p != "" {
			out = append(out, p)
		}
	}
	return out
}

// joinUnits splits at blanks and puts "(V)" back behind its name.
func joinUnits(s string) []string {
	var out []string
	for _, p := range strings.Fields(s) {
		if len(out) > 0 && (p[0] == '(' || p[0] == '[') {
			out[len(out)-1] += " " + p
		} else {
			out = append(out, p)
		}
	}
	return out
}

// isUnits says whether the cells over the columns of numbers are units; a
// column that counts may have a word such as "Sequence" there.
func (f *file) isUnits(lay *layout, cells []string, numeric []bool) bool {
	n := 0
	for c, t := range cells {
		if t == "" || c >= len(numeric) || !numeric[c] {
			continue
		}
		if c > 0 && !numeric[c-1] && settingWord(cells[c-1]) {
			return false
		}
		if u, q, _, ok := unitsCell(t); ok && (q != other || u != t || len(t) > 1) {
			n++
		} else if ok && !timeWord(t) {
			// A bare letter, A or C, may be a unit or a channel's name: the
			// other cells decide.
		} else if !indexWord(t) && !(lay.clock[c] && timeWord(t)) {
			return false
		}
	}
	return n > 0
}

// couplings says whether a row holds nothing but couplings and switches.
func couplings(cells []string) bool {
	for _, t := range cells {
		switch strings.ToLower(strings.Trim(t, "()[] ")) {
		case "", "dc", "ac", "gnd", "on", "off":
		default:
			return false
		}
	}
	return true
}

// isNames says whether a row can be the names over the samples.
func (f *file) isNames(lay *layout, cells []string, numeric []bool, units, marker bool) bool {
	first, filled := true, 0
	known := false
	var over []string // names over columns of numbers
	for c, t := range cells {
		if t == "" || c >= len(numeric) || !numeric[c] {
			continue
		}
		if c > 0 && !numeric[c-1] && settingWord(cells[c-1]) {
			return false
		}
		filled++
		over = append(over, t)
		switch cl := lay.read([]byte(t)); cl.kind {
		case number, clock:
			// Channels may be called 1, 2, 4; the first name is a word.
			if first || cl.V != float64(int(cl.V)) || cl.V < 0 || cl.V > 999 || strings.ContainsAny(t, ".,eE+-:/") {
				return false
			}
		}
		known = known || readHeader(t).q != unknown || timeWord(t)
		first = false
	}
	if filled == 0 || marker && !known {
		return false
	}
	for i, t := range over {
		if strings.Contains(t, "=") || i == 0 && strings.HasSuffix(t, ":") && !known {
			return false
		}
	}
	// "Vertical Units,V" before two columns is a setting, not a header; and so
	// is a setting whose name is known.
	if filled >= 2 && !timeWord(over[0]) && !indexWord(over[0]) {
		bare := !units // all names but the first are units
		for _, t := range over[1:] {
			_, _, _, ok := unitsCell(t)
			bare = bare && ok
		}
		if _, _, _, ok := unitsCell(over[0]); bare && !ok || settingWord(over[0]) && over[0] != "Source" {
			return false
		}
	}
	if filled == 1 {
		if t := over[0]; strings.ContainsAny(t, ":=") || settingWord(t) && !channelName(t) || len(t) > 60 {
			return false
		}
	}
	return true
}

// hasUnit says whether text names a unit in brackets or the word time.
func hasUnit(t string) bool {
	for _, w := range strings.FieldsFunc(t, func(r rune) bool { return strings.ContainsRune(" \t,;|", r) }) {
		if _, in, ok := bracketed(w); ok {
			if q, _ := unitOf(in); q == volts || q == seconds {
				return true
			}
		}
	}
	return false
}

// misfit refuses a last row before the samples that looks like a header of
// another width.
func (f *file) misfit(lay *layout, r row, numeric []bool) error {
	if f.cellsOf(lay, r, numeric) != nil {
		return nil
	}
	t := words(r.text)
	cells := split(r.text, lay.sep, nil)
	filled, text := 0, 0
	for _, c := range cells {
		switch lay.read(c).kind {
		case blank:
		case prose:
			text++
			filled++
		default:
			filled++
		}
	}
	count := 0
	for _, is := range numeric {
		if is {
			count++
		}
	}
	key, value := keyValue(r.text, lay.sep)
	kind, _ := settingOf(key)
	setting := kind != noSetting && (kind != otherSetting || filled <= 2) || filled == 2 && value != "" && lay.read([]byte(value)).kind == number
	timed := len(cells) > 0 && timeWord(words(trimmed(bytes.TrimLeft(cells[0], commentMarks))))
	if setting && !timed || filled == 0 || text < filled && !(filled > 2 && hasUnit(t)) {
		return nil
	}
	if hasUnit(t) || timed || filled > 1 && filled == text && count > filled {
		return f.fault(r.line, recording.ErrAmbiguous,
			fmt.Sprintf("the header %q has %d names, the rows below have %d columns of numbers", short(t), filled, count),
			`say how the file is written: [takes.NAME.csv] separator, decimal or skip`)
	}
	return nil
}

// timeWord says whether a header names time.
func timeWord(t string) bool {
	h := readHeader(t)
	w := strings.ToLower(strings.Trim(h.name, " \t\"'#%.:"))
	if timeWords[w] {
		return true
	}
	for _, p := range []string{"time", "zeit", "temps", "tiempo", "tempo"} {
		if strings.HasPrefix(w, p) && len(w) > len(p) && !(w[len(p)] >= 'a' && w[len(p)] <= 'z') || strings.HasSuffix(w, " "+p) || strings.HasSuffix(w, "_"+p) {
			return true
		}
	}
	return h.q == seconds
}

func indexWord(t string) bool {
	w := strings.ToLower(strings.Trim(t, " \t\"'"))
	if indexWords[w] {
		return true
	}
	if name, _, ok := bracketed(w); ok {
		return indexWords[strings.TrimSpace(name)]
	}
	return false
}
