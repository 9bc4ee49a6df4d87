package scopecsv

import (
	"strings"
)

// readSettings collects what the rows before and behind the samples, and the
// header's own columns, state.
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
	for _, r := range a.t.footer {
		a.readPair(r)
	}
}

// readPair reads one row of settings: a name and one value a channel.
func (a *assembly) readPair(r row) {
	key, value := keyValue(r.text, a.lay.sep)
	if key == "" {
		return
	}
	if len(a.set.text) < 512 {
		if _, twice := a.set.text[key]; !twice {
			a.set.text[key] = value
		}
	}
	kind, unit := settingOf(key)
	if kind == noSetting || kind == otherSetting {
		return
	}
	var values []string
	for _, v := range split([]byte(value), a.lay.sep, nil) {
		if w := words(trimmed(v)); w != "" {
			values = append(values, w)
		}
	}
	a.note(kind, key, unit, values, r.line)
}

// note takes in one setting.
func (a *assembly) note(kind settingKind, key, unit string, values []string, line int) {
	s := a.set
	if len(values) == 0 {
		s.named = append(s.named, key)
		return
	}
	switch kind {
	case timeUnitSetting, valueUnitSetting:
		q, f := unitOf(values[0])
		fig := figure{v: f, q: q, text: values[0], key: key, line: line}
		if q == seconds {
			s.timeUnit = fig
		} else if s.valUnit.text == "" {
			s.valUnit = fig
		}
		return
	case modeSetting:
		if s.mode == "" {
			s.mode, s.modeLine = values[0], line
		}
		return
	case offsetSetting:
		s.offset = true
		return
	}
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
		fig.key, fig.line = key, line
		switch {
		case fig.q == hertz && (kind == intervalSetting || kind == rateSetting):
			s.rate = append(s.rate, fig)
		case fig.q == seconds && (kind == intervalSetting || kind == rateSetting):
			s.interval = append(s.interval, fig)
		case kind == intervalSetting && fig.q == unknown:
			s.interval = append(s.interval, fig)
		case kind == rateSetting && fig.q == unknown:
			s.rate = append(s.rate, fig)
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
}

// assignColumns decides which column is time and which are channels.
func (a *assembly) assignColumns(numeric []bool) error {
	for c, is := range numeric {
		if is && a.time < 0 && (timeWord(a.heads.col[c].full) || a.heads.col[c].full == "" && c == a.lay.first) {
			a.time = c
		}
	}
	for c, is := range numeric {
		if is && c != a.time {
			a.chans = append(a.chans, c)
		}
	}
	_ = strings.ToLower
	return nil
}
