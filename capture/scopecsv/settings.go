package scopecsv

import (
	"math"
	"strings"

	"benchslip/capture/num"
)

// figure is a quantity stated in the settings.
type figure struct {
	v    float64 // in s, V or plain
	half float64 // half a unit of the last digit written, in the same unit
	rate float64 // 1/v as written, for intervals
	text string  // as written
	key  string
	line int
	q    quantity
}

// settings are what the rows beside the samples say.
type settings struct {
	text     map[string]string // all pairs, as written
	interval []figure          // s between samples, from an interval or a rate
	start    []figure          // s, time of the first sample
	length   []figure          // number of samples
	scale    []figure          // V per count
	offset   string            // name of a setting that gives counts an offset too
	timeUnit figure            // unit stated for the horizontal axis
	valUnit  []figure          // units stated for the vertical axis, one a channel
	probe    []figure
	mode     string // acquisition mode, as written
	modeLine int
	named    []string // names of settings met without a value
}

// plainKey brings a setting's name into words in lower case: "Sample_Rate:" -> "sample rate".
// The unit in brackets is cut off and returned.
func plainKey(key string) (plain, unit string) {
	key = strings.Trim(key, " \t\"#%!*;:=")
	if name, in, ok := bracketed(key); ok && name != "" {
		key, unit = name, in
	} else if i := strings.LastIndex(key, " in "); i > 0 {
		if q, _ := unitOf(key[i+4:]); q == seconds || q == hertz || q == volts {
			key, unit = key[:i], key[i+4:]
		}
	}
	var b strings.Builder
	prev := rune(0)
	for _, r := range key {
		if r >= 'A' && r <= 'Z' && prev >= 'a' && prev <= 'z' {
			b.WriteByte(' ')
		}
		switch r {
		case '_', '-', '.', ':', '/', '\t':
			b.WriteByte(' ')
		default:
			b.WriteString(strings.ToLower(string(r)))
		}
		prev = r
	}
	return strings.Join(strings.Fields(b.String()), " "), unit
}

// settingKind is what a setting's name stands for.
type settingKind uint8

const (
	noSetting settingKind = iota
	intervalSetting
	rateSetting
	startSetting
	lengthSetting
	scaleSetting
	offsetSetting
	timeUnitSetting
	valueUnitSetting
	probeSetting
	modeSetting
	otherSetting
)

func settingOf(key string) (settingKind, string) {
	plain, unit := plainKey(key)
	if k, ok := settingWords[plain]; ok {
		return k, unit
	}
	// A channel's name before or behind a known setting: "CH1 sample interval".
	if i := strings.IndexByte(plain, ' '); i > 0 && channelWord(plain[:i]) {
		if k, ok := settingWords[plain[i+1:]]; ok {
			return k, unit
		}
	}
	if i := strings.LastIndexByte(plain, ' '); i > 0 && (channelWord(plain[i+1:]) || isUnitWord(plain[i+1:])) {
		if k, ok := settingWords[plain[:i]]; ok {
			if isUnitWord(plain[i+1:]) && unit == "" {
				unit = plain[i+1:]
			}
			return k, unit
		}
	}
	return noSetting, unit
}

func isUnitWord(w string) bool {
	q, _ := unitOf(w)
	return q == seconds || q == hertz || q == volts
}

func settingWord(key string) bool {
	k, _ := settingOf(key)
	return k != noSetting
}

// channelWord says whether a word in lower case names a channel.
func channelWord(w string) bool {
	for _, p := range []string{"ch", "chan", "channel", "c", "analog", "a", "kanal", "voie", "canal", "trace", "input"} {
		if r := strings.TrimPrefix(w, p); r != w && r != "" && strings.Trim(r, "0123456789abcd") == "" && len(r) <= 2 {
			return true
		}
	}
	return len(w) == 1 && (w[0] >= '1' && w[0] <= '9' || w[0] >= 'a' && w[0] <= 'd')
}

// stated reads a figure with its unit: "1.0e-6", "1 us", "250 MSa/s", "10k".
// unit is one stated elsewhere (behind the name or in the next cell).
func (st style) stated(value, unit string) (figure, bool) {
	t := strings.TrimSpace(strings.Trim(value, "\""))
	// "Analog:700000", "CH1:2.0": a name before the figure
	if i := strings.LastIndexAny(t, ":="); i > 0 && t[0] > '9' && i < len(t)-1 {
		t = strings.TrimSpace(t[i+1:])
	}
	fig := figure{text: t}
	b := []byte(t)
	mark := st.mark
	if _, n := num.Scan(b, '.'); mark == ',' && n == len(b) && strings.Contains(t, ".") {
		mark = '.' // settings may keep the point where samples have commas
	}
	d, n := num.Scan(b, mark)
	if n == 0 {
		return fig, false
	}
	rest := strings.TrimSpace(t[n:])
	if rest == "" {
		rest = unit
	}
	factor := 1.0
	if rest != "" {
		q, f, ok := rateUnit(rest)
		if !ok {
			return fig, false
		}
		fig.q, factor = q, f
	}
	fig.v = d.V * factor
	fig.half = math.Min(0.5*pow10(d.Last)*factor, maxRounding*math.Abs(fig.v))
	return fig, fig.v == fig.v && fig.v < overrange && fig.v > -overrange
}

// maxRounding is the largest relative error that a stated figure's few digits
// excuse: "1" is not taken for a rounded 0.59.
const maxRounding = 2e-3

// rateUnit reads the unit of a stated figure: of time, of rate, or a prefix.
func rateUnit(w string) (quantity, float64, bool) {
	w = strings.Trim(w, " ()[]")
	if q, f := unitOf(w); q == seconds || q == hertz || q == volts {
		return q, f, true
	}
	w = strings.ReplaceAll(w, " ", "")
	l := strings.ToLower(w)
	before := func(tail string) (float64, bool) {
		if len(l) != len(w) || !strings.HasSuffix(l, tail) {
			return 0, false
		}
		return prefix(w[:len(w)-len(tail)])
	}
	for _, u := range perSecond {
		if f, ok := before(u); ok {
			return hertz, f, true
		}
	}
	for _, u := range []string{"s/sample", "sec/sample", "s/sa", "s/pt", "s/point"} {
		if f, ok := before(u); ok {
			return seconds, f, true
		}
	}
	switch l {
	case "pts", "points", "point", "samples", "sample", "sa", "pt", "x", ":1", "/sec":
		return unknown, 1, true
	case "kpts", "ksa", "kpt", "kpoints", "ksamples":
		return unknown, 1e3, true
	case "mpts", "msa", "mpt", "mpoints", "msamples":
		return unknown, 1e6, true
	}
	if f, ok := prefix(w); ok {
		return unknown, f, true
	}
	if strings.HasPrefix(l, "v/") || strings.HasPrefix(l, "mv/") || strings.HasPrefix(l, "uv/") || strings.HasPrefix(l, "volts/") {
		f := 1.0
		switch l[0] {
		case 'm':
			f = 1e-3
		case 'u':
			f = 1e-6
		}
		return volts, f, !strings.HasSuffix(l, "/div")
	}
	return unknown, 0, false
}

// perSecond are the ways to write samples a second, in lower case.
var perSecond = []string{"samples/second", "samples/sec", "samples/s", "sample/s", "sa/sec", "sa/s", "pts/s", "points/s", "s/sec", "s/second", "s/s", "smp/s", "samp/s", "sps", "readings/s", "scans/s", "hz"}

func prefix(w string) (float64, bool) {
	switch strings.TrimSpace(w) {
	case "k", "K":
		return 1e3, true
	case "M", "meg":
		return 1e6, true
	case "G":
		return 1e9, true
	case "m":
		return 1e-3, true
	case "u", "\u00b5", "\u03bc":
		return 1e-6, true
	case "n":
		return 1e-9, true
	case "p":
		return 1e-12, true
	case "":
		return 1, true
	}
	return 0, false
}
