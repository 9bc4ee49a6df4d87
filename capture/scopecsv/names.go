package scopecsv

import (
	"bytes"
	"fmt"
	"slices"
	"strings"

	"benchslip/capture/recording"
)

// heads are the headers of the columns of samples.
type heads struct {
	col   []header
	named bool           // a header row was found
	line  int            // its line
	used  map[int]bool   // rows before the samples that belong to the header
	extra map[int]string // names over columns without samples
	under map[int]string // what the units row holds there
}

// commentMarks may stand before a header.
const commentMarks = "#%!*;/"

// maxBetween is how many rows of settings or markers may stand between the
// header and the samples.
const maxBetween = 4

// findHeads reads the names and units over the samples from the rows right
// before them, walking upward: a units row and a row of names, in either
// order; couplings, markers such as "data" and settings may stand between.
// numeric tells which columns hold numbers.
func (f *file) findHeads(lay *layout, numeric []bool) (*heads, error) {
	h := &heads{col: make([]header, lay.width), used: map[int]bool{}, extra: map[int]string{}, under: map[int]string{}}
	var units []string
	unitsLine, passed := 0, 0
	for i := len(lay.pre) - 1; i >= 0 && passed <= maxBetween && !(h.named && units != nil); i-- {
		r := lay.pre[i]
		cells := f.cellsOf(lay, r, numeric)
		switch {
		case cells != nil && couplings(cells):
			h.used[i] = true
			continue
		case cells != nil && units == nil && f.isUnits(lay, cells, numeric):
			units, unitsLine = cells, r.line
			h.used[i] = true
			continue
		case cells != nil && !h.named && f.isNames(lay, cells, numeric, units != nil, passed > 0) && !f.isRemark(lay, cells, numeric, i):
			if err := f.takeNames(lay, h, cells, numeric, r); err != nil {
				return nil, err
			}
			h.used[i] = true
			continue
		}
		if h.named {
			break
		}
		if units == nil && !f.isSetting(lay, r) {
			// A row right over the samples that cannot be laid over them may
			// hold a name or unit that matters, or samples.
			if err := f.misfit(lay, r, numeric, cells); err != nil {
				return nil, err
			}
		}
		passed++
	}
	for c := range h.col {
		if c >= len(units) || units[c] == "" || !numeric[c] {
			continue
		}
		if !h.named {
			h.col[c].full, h.col[c].name = units[c], units[c]
		}
		if unit, q, fac, ok := unitsCell(units[c]); ok {
			h.col[c].unit, h.col[c].q, h.col[c].f, h.col[c].from = unit, q, fac, fmt.Sprintf("the units row, line %d", unitsLine)
		}
	}
	// Settings over columns of their own: "Start", "Increment", their values
	// in the row below, which may be missing.
	for c := range h.extra {
		h.under[c] = ""
		if c < len(units) {
			h.under[c] = units[c]
		}
	}
	return h, nil
}

// takeNames takes a row of names, and what stands over columns without samples.
func (f *file) takeNames(lay *layout, h *heads, cells []string, numeric []bool, r row) error {
	h.named, h.line = true, r.line
	for c, t := range cells {
		if c < lay.width {
			h.col[c] = readHeader(t)
		}
		if t == "" || c < lay.width && numeric[c] {
			continue
		}
		h.extra[c] = t
		_, q, _, unit := unitsCell(t)
		if k := lay.read([]byte(t)).kind; k == number || c >= lay.width && unit && (q == volts || q == seconds) {
			return f.fault(r.line, recording.ErrAmbiguous, fmt.Sprintf("the header goes on (%q) where no column of numbers is", short(t)), "mend the row: a line end or separator may be lost")
		}
	}
	return nil
}

// isSetting says whether a row is a setting or a comment by its look.
func (f *file) isSetting(lay *layout, r row) bool {
	if t := bytes.TrimLeft(r.text, " \t"); len(t) > 0 && bytes.IndexByte([]byte("#%!*;"), t[0]) >= 0 {
		return !hasUnit(words(r.text))
	}
	key, _ := keyValue(r.text, lay.sep)
	kind, _ := settingOf(key)
	if kind == noSetting || timeWord(key) {
		return false
	}
	filled := 0
	for _, c := range split(r.text, lay.sep, nil) {
		if len(trimmed(c)) > 0 {
			filled++
		}
	}
	return kind != otherSetting || filled <= 2
}

// isRemark says whether a lone word over one column is a remark: a header with
// a unit, or a name that is known, stands right above it.
func (f *file) isRemark(lay *layout, cells []string, numeric []bool, i int) bool {
	only := ""
	for c, t := range cells {
		if t == "" || c < len(numeric) && !numeric[c] {
			continue
		}
		if only != "" {
			return false
		}
		only = t
	}
	if i == 0 || readHeader(only).q != unknown || channelName(only) {
		return false
	}
	above := f.cellsOf(lay, lay.pre[i-1], numeric)
	if above == nil || f.isSetting(lay, lay.pre[i-1]) {
		return false
	}
	for c, t := range above {
		if t != "" && c < len(numeric) && numeric[c] && (readHeader(t).q != unknown || channelName(t)) {
			return true
		}
	}
	return false
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
		// The header may be parted otherwise than the samples.
		for _, sep := range []byte{'\t', ';', ',', '|'} {
			if count < 2 || sep == lay.sep || len(parts) > 1 {
				continue
			}
			parts = parts[:0]
			for _, c := range split(text, sep, nil) {
				parts = append(parts, words(trimmed(c)))
			}
			if len(parts) == count && !slices.Contains(parts, "") {
				return fit(parts)
			}
			parts = parts[:1]
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
		known = known || readHeader(t).q != unknown || timeWord(t) || indexWord(t) || channelName(t)
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

// misfit refuses a row right over the samples that is neither header nor
// setting, yet names times or units, or mixes several words with numbers: a
// header of another width, or one that ran into the first samples.
func (f *file) misfit(lay *layout, r row, numeric []bool, cells []string) error {
	t := words(r.text)
	text, numbers := 0, 0
	for _, c := range split(r.text, lay.sep, nil) {
		switch k := lay.read(c).kind; {
		case k == prose:
			text++
		case k != blank:
			numbers++
		}
	}
	count := 0
	for _, is := range numeric {
		if is {
			count++
		}
	}
	first, _ := keyValue(r.text, lay.sep)
	if lay.sep == ' ' {
		first = strings.Fields(t + " x")[0]
	}
	switch {
	case text == 0 || text == 1 && numbers <= 1 && !hasUnit(t) && !timeWord(first):
		return nil
	case numbers == 0 && cells == nil && (hasUnit(t) || timeWord(first) || text > 1 && count > text && lay.sep != ' '),
		text > 1 && numbers > 0 && (lay.sep != ' ' || hasUnit(t) || timeWord(first)):
		return f.fault(r.line, recording.ErrAmbiguous,
			fmt.Sprintf("the row %q over the samples has %d names, the rows below have %d columns of numbers", short(t), text+numbers, count),
			`mend it, or say how the file is written: [takes.NAME.csv] separator, decimal or skip`)
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
