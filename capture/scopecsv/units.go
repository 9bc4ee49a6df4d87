package scopecsv

import "strings"

// quantity is what kind of thing a unit measures.
type quantity uint8

const (
	unknown quantity = iota
	volts
	seconds
	hertz
	counts // raw converter codes
	other  // a unit of something else: amperes, degrees ...
)

// unitOf says what a unit word measures and the factor to V or s. Words are
// those met in headers: symbols with prefixes and the plain names.
func unitOf(word string) (q quantity, factor float64) {
	w := strings.TrimSpace(word)
	for _, r := range []string{"\u00b5", "\u03bc", "\u00c2\u00b5"} { // both micro signs, and one misread
		w = strings.ReplaceAll(w, r, "u")
	}
	w = strings.TrimSuffix(w, ".")
	if f, ok := exactUnits[w]; ok {
		return f.q, f.factor
	}
	if f, ok := plainUnits[strings.ToLower(w)]; ok {
		return f.q, f.factor
	}
	return unknown, 0
}

type unitWord struct {
	q      quantity
	factor float64
}

// exactUnits are symbols, where case carries meaning.
var exactUnits = map[string]unitWord{
	"V": {volts, 1}, "mV": {volts, 1e-3}, "uV": {volts, 1e-6}, "nV": {volts, 1e-9}, "kV": {volts, 1e3}, "MV": {volts, 1e6}, "v": {volts, 1},
	"mv": {volts, 1e-3}, "MVolts": {volts, 1e6}, "uv": {volts, 1e-6}, "UV": {volts, 1e-6}, "KV": {volts, 1e3}, "kv": {volts, 1e3},
	"s": {seconds, 1}, "S": {seconds, 1}, "ms": {seconds, 1e-3}, "mS": {seconds, 1e-3}, "us": {seconds, 1e-6}, "uS": {seconds, 1e-6},
	"ns": {seconds, 1e-9}, "nS": {seconds, 1e-9}, "ps": {seconds, 1e-12}, "pS": {seconds, 1e-12}, "fs": {seconds, 1e-15}, "ks": {seconds, 1e3},
	"Hz": {hertz, 1}, "kHz": {hertz, 1e3}, "MHz": {hertz, 1e6}, "GHz": {hertz, 1e9}, "mHz": {hertz, 1e-3},
}

// plainUnits are words, compared without case.
var plainUnits = unitWords([]unitNames{
	{volts, 1, "volt|volts|dcv|dc v|vdc|v dc|vac"},
	{volts, 1e-3, "millivolt|millivolts|mvolt|mvolts|dcmv|dc mv|mv dc|mvdc"},
	{volts, 1e-6, "microvolt|microvolts|uvolt|uvolts"},
	{volts, 1e3, "kilovolt|kilovolts"},
	{seconds, 1, "sec|secs|second|seconds|sekunde|sekunden|secondes|segundos|secondi"},
	{seconds, 1e-3, "millisecond|milliseconds|msec|msecs|millis"},
	{seconds, 1e-6, "microsecond|microseconds|usec|usecs|micros"},
	{seconds, 1e-9, "nanosecond|nanoseconds|nsec|nanos"},
	{seconds, 1e-12, "picoseconds"},
	{seconds, 60, "minute|minutes|min"},
	{seconds, 3600, "hour|hours|hrs|h|hr"},
	{hertz, 1, "hertz|hz"},
	{hertz, 1e3, "khz"},
	{hertz, 1e9, "ghz"},
	{counts, 1, "count|counts|code|codes|lsb|lsbs|adc|raw|adu|bits|adc counts|dn|digits|int|int16|uint8|cts|steps"},
	{other, 1, "a|ma|ua|na|ka|pa|amp|amps|ampere|amperes|arms|vrms|vpp|w|mw|kw|uw|watt|watts|va|wh|j|ah|mah|ohm|" +
		"ohms|kohm|mohm|\u2126|\u03c9|k\u2126|k\u03c9|m\u2126|m\u03c9|degc|deg c|\u00b0c|\u2103|c|k|f|" +
		"\u00b0f|celsius|kelvin|degf|%|%rh|rh|ppm|db|dbm|dbv|dbu|dbuv|dbfs|dbmv|deg|\u00b0|rad|degree|" +
		"degrees|rpm|n|kn|nm|mpa|kpa|hpa|bar|mbar|psi|g|kg|m/s2|m/s^2|m/s\u00b2|m/s|m|mm|um|cm|t|mt|ut|gauss|" +
		"lux|lx|lm|cd|l/min|m3/h|vv|v^2|v\u00b2|v*v|v/s|vs|v*s|v/a|aa|a*a|v2|va*s|sa|s/s|c/s|arb|a.u.|au|a.u|" +
		"uf|nf|pf|uh|mh|siemens|v/v|mv/v|v/hz|v/m|fs|strain|ustrain"},
})

type unitNames struct {
	q      quantity
	factor float64
	names  string // parted by bars
}

func unitWords(list []unitNames) map[string]unitWord {
	m := map[string]unitWord{}
	for _, u := range list {
		for _, n := range strings.Split(u.names, "|") {
			m[n] = unitWord{u.q, u.factor}
		}
	}
	return m
}

// gluedUnit reads a unit behind a number in one cell: "514.1mV", "-5 us".
func gluedUnit(b []byte) (string, bool) {
	if c := b[0] | 0x20; len(b) > 16 || !(c >= 'a' && c <= 'z' || c == ' ' || c == '%' || c >= 0x80) {
		return "", false
	}
	w := words(b)
	if _, ok := prefix(w); ok && w != "" {
		return w, true // "514.1m": a prefix without its unit
	}
	q, _ := unitOf(w)
	return w, q != unknown && q != counts
}

// header is what the text over a column says.
type header struct {
	full string // as written
	name string // without a unit in brackets
	unit string // as written; "" for none
	q    quantity
	f    float64
	from string // where the unit was found: "its header", "the units row" ...
}

// readHeader takes the unit out of a column's name: in brackets at the end,
// or glued on with an underscore, a blank, a slash or a comma.
func readHeader(text string) header {
	t := strings.TrimRight(strings.TrimSpace(text), ": ")
	h := header{full: text, name: t}
	if q, f := unitOf(t); q != unknown && q != other && !bareWord(t) {
		h.unit, h.q, h.f, h.from = t, q, f, "its header"
		return h
	}
	if t == "V" || strings.HasPrefix(t, "V(") || strings.HasPrefix(t, "v(") {
		h.unit, h.q, h.f, h.from = "V", volts, 1, "its header" // V(node), as circuit simulators write
		return h
	}
	if strings.HasPrefix(t, "I(") {
		h.unit, h.q, h.f, h.from = "A", other, 1, "its header"
		return h
	}
	if name, in, ok := bracketed(t); ok {
		q, f := unitOf(in)
		if q == unknown && looksUnit(in) {
			q = other
		}
		if q != unknown {
			h.name, h.unit, h.q, h.f, h.from = name, in, q, f, "its header"
			return h
		}
	}
	if name, in, ok := bracketInside(t); ok {
		h.name, h.unit, h.from = name, in, "its header"
		h.q, h.f = unitOf(in)
		return h
	}
	// A unit right behind a channel's number: CH1V, CH2mV.
	if n := len(t) - 1; n > 1 && t[n] == 'V' {
		if t[n-1] == 'm' || t[n-1] == 'u' {
			n--
		}
		if t[n-1] >= '0' && t[n-1] <= '9' && channelWord(strings.ToLower(t[:n])) {
			h.unit, h.from = t[n:], "its header"
			h.q, h.f = unitOf(t[n:])
			return h
		}
	}
	i := strings.LastIndexAny(t, "_ /,.-")
	if i > 0 && i < len(t)-1 {
		last := strings.TrimSpace(t[i+1:])
		if q, f := unitOf(last); q == volts || q == seconds && !bareWord(last) || q == hertz || t[i] == '/' && q != unknown || t[i] != '.' && gluedOther[last] {
			h.unit, h.q, h.f, h.from = last, q, f, "its header"
		} else if q == counts {
			h.unit, h.q, h.f, h.from = last, q, f, "its header"
		}
	}
	return h
}

// gluedOther are units of other quantities that are taken as such behind an
// underscore or blank too; a bare A, C or K there is a channel's letter.
var gluedOther = map[string]bool{"mA": true, "uA": true, "nA": true, "mW": true, "kW": true, "degC": true, "dB": true, "dBm": true, "dBV": true, "rpm": true, "RPM": true, "ohm": true, "Amps": true, "amps": true, "ppm": true, "hPa": true, "kPa": true}

// bareWord tells words that are units inside brackets but names outside:
// "min" is a minimum, "h" or "S" a channel, "raw" a column.
func bareWord(w string) bool {
	switch w {
	case "min", "Min", "MIN", "h", "H", "S", "hr":
		return true
	}
	return false
}

// bracketed splits "name (unit)", "name [unit]", "name<unit>", "name{unit}".
func bracketed(t string) (name, in string, ok bool) {
	for _, pair := range []string{"()", "[]", "<>", "{}"} {
		if !strings.HasSuffix(t, pair[1:]) {
			continue
		}
		if i := strings.LastIndex(t, pair[:1]); i >= 0 {
			return strings.TrimSpace(t[:i]), strings.TrimSpace(t[i+1 : len(t)-1]), true
		}
	}
	return "", "", false
}

// bracketInside finds a unit of time or volts in brackets within a name:
// "Time (ms) - input 1".
func bracketInside(t string) (name, in string, ok bool) {
	for i := 0; i < len(t); i++ {
		if t[i] != '(' && t[i] != '[' {
			continue
		}
		j := strings.IndexAny(t[i:], ")]")
		if j < 0 {
			break
		}
		in = strings.TrimSpace(t[i+1 : i+j])
		if q, _ := unitOf(in); q == seconds || q == volts {
			return strings.Join(strings.Fields(t[:i]+" "+t[i+j+1:]), " "), in, true
		}
	}
	return "", "", false
}

// looksUnit says whether an unknown word in brackets has the form of a unit
// rather than of a remark.
func looksUnit(w string) bool {
	if w == "" || len(w) > 8 {
		return false
	}
	switch strings.ToUpper(w) {
	case "RELATIVE", "ELAPSED", "LOCAL", "UTC", "GMT", "ABSOLUTE", "TIME", "SAMPLES", "PROBE", "TIP", "RING", "HOT", "COLD", "RED", "BLUE", "SCREEN", "AC", "DC", "AVG", "MIN", "MAX", "REL", "ABS", "IN", "OUT", "L", "R", "+", "-", "X", "Y", "REF", "MATH", "FFT", "LEFT", "RIGHT", "CALC", "HI", "LO", "TRIG", "GND", "P", "N", "POS", "NEG", "INPUT", "OUTPUT":
		return false
	}
	if strings.HasPrefix(strings.ToUpper(w), "CH") {
		return false
	}
	letters := false
	for i, r := range w {
		switch {
		case r >= '0' && r <= '9':
			if i > 0 && !strings.ContainsAny(w[:i], "/^*.") && w[i-1] > '9' && len(w) > i+1 {
				return false
			}
		case r == '/', r == '^', r == '*', r == '.':
		case r >= 'a' && r <= 'z', r >= 'A' && r <= 'Z', r > 0x7f, r == '%', r == '?':
			letters = true
		default:
			return false
		}
	}
	return letters
}

// unitsCell reads a cell of a units row: a unit alone, bare or in brackets.
func unitsCell(text string) (unit string, q quantity, f float64, ok bool) {
	t := strings.TrimSpace(text)
	in := t
	if name, w, is := bracketed(t); is {
		if name != "" {
			return "", unknown, 0, false
		}
		in = w
	}
	q, f = unitOf(in)
	if q == unknown {
		if in != t && (looksUnit(in) || in == "") {
			return in, other, 1, true
		}
		return "", unknown, 0, false
	}
	return in, q, f, true
}
