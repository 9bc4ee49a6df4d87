package scopecsv

import (
	"bytes"
	"maps"
	"slices"
	"strconv"
	"strings"
)

// readSettings collects what the rows before, beside and behind the samples
// state, and notes in the header's own columns.
func (a *assembly) readSettings() {
	s := &settings{text: map[string]string{}}
	a.set = s
	for i, r := range a.lay.pre {
		if !a.heads.used[i] {
			a.readPair(r)
		}
	}
	a.readBeside()
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
		if i := strings.IndexAny(value, ",;\t"); i > 0 && strings.ContainsAny(value[i+1:], ",;\t") {
			value = value[:i] // several cells under another separator
		}
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
