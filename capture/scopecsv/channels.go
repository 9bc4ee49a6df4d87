package scopecsv

import (
	"fmt"
	"math"
	"sort"
	"strings"

	"benchslip/capture/recording"
)

// channels scales the columns of values into volts and lists what is missing.
func (a *assembly) channels() error {
	var units []string
	for i, c := range a.chans {
		k, h := &a.t.col[c], a.heads.col[c]
		ch := recording.Channel{Name: h.name, Full: h.full, Unit: "V"}
		f, from, err := a.valueUnit(i, c, &ch)
		if err != nil {
			return err
		}
		if f != 1 {
			for j, v := range k.v {
				k.v[j] = scaled(v, f)
			}
		}
		ch.Step = codeStep(k.v, pow10(k.last)*f, k.digits)
		a.info.Channels = append(a.info.Channels, ch)
		a.out = append(a.out, k.v)
		units = append(units, from)
	}
	a.sayUnits(units)
	a.listMissing()
	a.flagMode()
	return nil
}

// valueUnit finds the unit of channel i (column c): factor to volts and where
// it was found. Columns that are no volts keep their numbers, no unit, and a
// flag.
func (a *assembly) valueUnit(i, c int, ch *recording.Channel) (f float64, from string, err error) {
	k, h := &a.t.col[c], a.heads.col[c]
	not := func(format string, args ...any) (float64, string, error) {
		ch.Unit = ""
		a.flag(recording.Uncalibrated, i+1, nil, nil, format, args...)
		return 1, "", nil
	}
	q, _ := unitOf(k.unit)
	switch {
	case a.opt.ValueUnit != "":
		q, f := unitOf(a.opt.ValueUnit)
		if q != volts {
			return 0, "", a.fault(0, recording.ErrFormat, fmt.Sprintf("csv.value_unit %q is no unit of volts", a.opt.ValueUnit), `write "V", "mV" or "uV"`)
		}
		if k.glued > 0 {
			f = 1 // the cells' own unit was applied
		}
		return f, "csv.value_unit of the job", nil
	case k.glued > 0 && q == volts:
		return 1, "V (cells)", nil
	case k.glued > 0 && k.unit != "":
		return not("%s is in %s, not in volts; its numbers are as written", a.title(c), k.unit)
	case h.q == volts:
		return h.f, h.unit + " (" + h.from + ")", nil
	case h.q == counts, h.q == unknown && countName(h.name):
		return a.countsToVolts(c, not)
	case h.q != unknown:
		return not("%s is in %s, not in volts; its numbers are as written", a.title(c), h.unit)
	}
	if len(a.set.valUnit) > 0 {
		u := a.set.valUnit[min(i, len(a.set.valUnit)-1)]
		switch u.q {
		case volts:
			return u.v, fmt.Sprintf("%s (%q, line %d)", u.text, u.key, u.line), nil
		case counts:
			return a.countsToVolts(c, not)
		default:
			return not("%q (line %d) says %q, which is not volts; numbers are as written", u.key, u.line, u.text)
		}
	}
	if w := otherQuantity(h.name); w != "" {
		return not("%s names a %s and states no unit; its numbers are as written", a.title(c), w)
	}
	if k.whole && k.glued == 0 && countLike(k.v) {
		return not("%s holds whole numbers and states no unit: raw counts, perhaps; say [takes.NAME.csv] value_unit = \"V\" if they are volts", a.title(c))
	}
	return 1, "V (no unit stated)", nil
}

// countsToVolts applies a stated number of volts a count, and nothing else.
func (a *assembly) countsToVolts(c int, not func(string, ...any) (float64, string, error)) (float64, string, error) {
	switch {
	case len(a.set.scale) == 0:
		return not("%s holds raw counts and the file does not say how many volts one is; its numbers are as written", a.title(c))
	case a.set.offset != "":
		return not("%s holds raw counts with an offset of their own (%q); its numbers are as written", a.title(c), a.set.offset)
	}
	s := a.set.scale[0]
	for _, o := range a.set.scale[1:] {
		if o.v != s.v {
			return not("%s holds raw counts and the file states several scales; its numbers are as written", a.title(c))
		}
	}
	return s.v, fmt.Sprintf("V from counts (%q, line %d: %s)", s.key, s.line, short(s.text)), nil
}

func countName(t string) bool {
	for _, w := range strings.FieldsFunc(strings.ToLower(t), func(r rune) bool { return !(r >= 'a' && r <= 'z') }) {
		switch w {
		case "count", "counts", "adc", "raw", "code", "codes", "lsb":
			return true
		}
	}
	return false
}

// countLike says whether whole numbers look like converter codes rather than
// volts: at least 16 of them, beyond 50.
func countLike(v []float64) bool {
	if len(v) < 16 {
		return false
	}
	for _, x := range v {
		if math.Abs(x) >= 50 {
			return true
		}
	}
	return false
}

// otherQuantity recognises names of quantities that are not voltage.
func otherQuantity(name string) string {
	for _, w := range strings.FieldsFunc(strings.ToLower(name), func(r rune) bool { return !(r >= 'a' && r <= 'z') }) {
		switch w {
		case "current", "amps", "ampere", "temperature", "temp", "humidity", "pressure", "power", "resistance", "force", "speed", "rpm", "acceleration", "frequency", "freq", "distance", "phase", "torque", "strain", "position", "impedance", "charge", "energy":
			return w
		}
	}
	return ""
}

// sayUnits states the units of all channels, equal ones together.
func (a *assembly) sayUnits(units []string) {
	for i := 0; i < len(units); {
		j := i
		for j+1 < len(units) && units[j+1] == units[i] {
			j++
		}
		what := "channel " + fmt.Sprint(i+1)
		if j > i {
			what = fmt.Sprintf("channels %d..%d", i+1, j+1)
		}
		if units[i] != "" {
			a.assume("%s in %s", what, units[i])
		}
		i = j + 1
	}
	for _, p := range a.set.probe {
		if p.v != 1 {
			a.assume("%q, line %d, is %s: not applied, the volts are taken as already scaled", p.key, p.line, short(p.text))
			break
		}
	}
}

// listMissing lists the samples without a value and flags each channel that
// has some, and the joints between stretches.
func (a *assembly) listMissing() {
	for i, c := range a.chans {
		k := &a.t.col[c]
		if len(k.lost) == 0 {
			continue
		}
		n := 0
		for _, l := range k.lost {
			a.info.Missing = append(a.info.Missing, recording.Run{Channel: i + 1, From: int64(l.from), To: int64(l.to), Why: l.why})
			n += l.to - l.from
		}
		first, last := k.lost[0], k.lost[len(k.lost)-1]
		from, to := a.place(first.from, last.to)
		more := ""
		if len(k.lost) > 1 {
			more = fmt.Sprintf(", in %d places", len(k.lost))
		}
		a.flag(recording.Overrange, i+1, from, to, "%s of %d without a value (%s, first in line %d%s)", plural(n, "sample"), a.t.n, first.why, first.line, more)
	}
	sort.Ints(a.joints)
	at := -1
	for _, b := range a.joints {
		if b != at {
			a.info.Missing = append(a.info.Missing, recording.Run{From: int64(b), To: int64(b), Why: "samples missing between two rows"})
			at = b
		}
	}
	sort.SliceStable(a.info.Missing, func(i, j int) bool {
		x, y := a.info.Missing[i], a.info.Missing[j]
		if x.Channel != y.Channel {
			return x.Channel < y.Channel
		}
		return x.From < y.From
	})
}

// flagMode flags modes in which a stored value is no plain sample.
func (a *assembly) flagMode() {
	mode := strings.ToLower(a.set.mode)
	switch {
	case strings.Contains(mode, "peak"), strings.Contains(mode, "envelope"):
		a.flag(recording.PeakDetect, 0, nil, nil, "the settings say %q (line %d): values are extremes, not samples", a.set.mode, a.set.modeLine)
		return
	case strings.HasPrefix(mode, "averag"):
		a.flag(recording.Averaged, 0, nil, nil, "the settings say %q (line %d): noise is lower than in one sweep", a.set.mode, a.set.modeLine)
	}
	for _, ch := range a.info.Channels {
		if l := strings.ToLower(ch.Name); strings.Contains(l, "peak detect") || strings.Contains(l, "peak-detect") || strings.Contains(l, "envelope") {
			a.flag(recording.PeakDetect, 0, nil, nil, "column %q holds extremes, not samples", ch.Full)
			return
		}
	}
	names := map[string]bool{}
	for _, ch := range a.info.Channels {
		names[strings.ToLower(ch.Name)] = true
	}
	for _, ch := range a.info.Channels {
		l := strings.ToLower(ch.Name)
		if o := strings.Replace(l, "min", "max", 1); o != l && names[o] {
			a.flag(recording.PeakDetect, 0, nil, nil, "columns %q and its maximum stand side by side: extremes, not samples", ch.Full)
			return
		}
	}
}
