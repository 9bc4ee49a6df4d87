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
var plainUnits = map[string]unitWord{
	"volt": {volts, 1}, "volts": {volts, 1}, "millivolt": {volts, 1e-3}, "millivolts": {volts, 1e-3}, "microvolt": {volts, 1e-6}, "microvolts": {volts, 1e-6},
	"mvolt": {volts, 1e-3}, "mvolts": {volts, 1e-3}, "uvolt": {volts, 1e-6}, "uvolts": {volts, 1e-6}, "kilovolt": {volts, 1e3}, "kilovolts": {volts, 1e3},
	"dcv": {volts, 1}, "dc v": {volts, 1}, "dcmv": {volts, 1e-3}, "dc mv": {volts, 1e-3}, "mv dc": {volts, 1e-3}, "vdc": {volts, 1}, "v dc": {volts, 1}, "vac": {volts, 1}, "mvdc": {volts, 1e-3},
	"sec": {seconds, 1}, "secs": {seconds, 1}, "second": {seconds, 1}, "seconds": {seconds, 1}, "sekunde": {seconds, 1}, "sekunden": {seconds, 1}, "secondes": {seconds, 1},
	"segundos": {seconds, 1}, "secondi": {seconds, 1}, "millisecond": {seconds, 1e-3}, "milliseconds": {seconds, 1e-3}, "msec": {seconds, 1e-3}, "msecs": {seconds, 1e-3}, "millis": {seconds, 1e-3},
	"microsecond": {seconds, 1e-6}, "microseconds": {seconds, 1e-6}, "usec": {seconds, 1e-6}, "usecs": {seconds, 1e-6}, "micros": {seconds, 1e-6},
	"nanosecond": {seconds, 1e-9}, "nanoseconds": {seconds, 1e-9}, "nsec": {seconds, 1e-9}, "nanos": {seconds, 1e-9}, "picoseconds": {seconds, 1e-12},
	"minute": {seconds, 60}, "minutes": {seconds, 60}, "hour": {seconds, 3600}, "hours": {seconds, 3600}, "hrs": {seconds, 3600}, "min": {seconds, 60}, "h": {seconds, 3600}, "hr": {seconds, 3600},
	"hertz": {hertz, 1}, "hz": {hertz, 1}, "khz": {hertz, 1e3}, "ghz": {hertz, 1e9},
	"count": {counts, 1}, "counts": {counts, 1}, "code": {counts, 1}, "codes": {counts, 1}, "lsb": {counts, 1}, "lsbs": {counts, 1}, "adc": {counts, 1}, "raw": {counts, 1}, "adu": {counts, 1},
	"bits": {counts, 1}, "adc counts": {counts, 1}, "dn": {counts, 1}, "digits": {counts, 1}, "int": {counts, 1}, "int16": {counts, 1}, "uint8": {counts, 1}, "cts": {counts, 1}, "steps": {counts, 1},
	"a": {other, 1}, "ma": {other, 1}, "ua": {other, 1}, "na": {other, 1}, "ka": {other, 1}, "pa": {other, 1}, "amp": {other, 1}, "amps": {other, 1}, "ampere": {other, 1}, "amperes": {other, 1}, "arms": {other, 1}, "vrms": {other, 1}, "vpp": {other, 1},
	"w": {other, 1}, "mw": {other, 1}, "kw": {other, 1}, "uw": {other, 1}, "watt": {other, 1}, "watts": {other, 1}, "va": {other, 1}, "wh": {other, 1}, "j": {other, 1}, "ah": {other, 1}, "mah": {other, 1},
	"ohm": {other, 1}, "ohms": {other, 1}, "kohm": {other, 1}, "mohm": {other, 1}, "\u2126": {other, 1}, "\u03c9": {other, 1}, "k\u2126": {other, 1}, "k\u03c9": {other, 1}, "m\u2126": {other, 1}, "m\u03c9": {other, 1},
	"degc": {other, 1}, "deg c": {other, 1}, "\u00b0c": {other, 1}, "\u2103": {other, 1}, "c": {other, 1}, "k": {other, 1}, "f": {other, 1}, "\u00b0f": {other, 1}, "celsius": {other, 1}, "kelvin": {other, 1}, "degf": {other, 1},
	"%": {other, 1}, "%rh": {other, 1}, "rh": {other, 1}, "ppm": {other, 1}, "db": {other, 1}, "dbm": {other, 1}, "dbv": {other, 1}, "dbu": {other, 1}, "dbuv": {other, 1}, "dbfs": {other, 1}, "dbmv": {other, 1},
	"deg": {other, 1}, "\u00b0": {other, 1}, "rad": {other, 1}, "degree": {other, 1}, "degrees": {other, 1}, "rpm": {other, 1}, "n": {other, 1}, "kn": {other, 1}, "nm": {other, 1}, "mpa": {other, 1}, "kpa": {other, 1}, "hpa": {other, 1}, "bar": {other, 1}, "mbar": {other, 1}, "psi": {other, 1},
	"g": {other, 1}, "kg": {other, 1}, "m/s2": {other, 1}, "m/s^2": {other, 1}, "m/s\u00b2": {other, 1}, "m/s": {other, 1}, "m": {other, 1}, "mm": {other, 1}, "um": {other, 1}, "cm": {other, 1}, "t": {other, 1}, "mt": {other, 1}, "ut": {other, 1}, "gauss": {other, 1}, "lux": {other, 1}, "lx": {other, 1}, "lm": {other, 1}, "cd": {other, 1},
	"l/min": {other, 1}, "m3/h": {other, 1}, "vv": {other, 1}, "v^2": {other, 1}, "v\u00b2": {other, 1}, "v*v": {other, 1}, "v/s": {other, 1}, "vs": {other, 1}, "v*s": {other, 1}, "v/a": {other, 1}, "aa": {other, 1}, "a*a": {other, 1}, "v2": {other, 1}, "va*s": {other, 1}, "sa": {other, 1}, "s/s": {other, 1}, "c/s": {other, 1}, "arb": {other, 1}, "a.u.": {other, 1}, "au": {other, 1}, "a.u": {other, 1}, "uf": {other, 1}, "nf": {other, 1}, "pf": {other, 1}, "uh": {other, 1}, "mh": {other, 1}, "siemens": {other, 1},
	"v/v": {other, 1}, "mv/v": {other, 1}, "v/hz": {other, 1}, "v/m": {other, 1}, "fs": {other, 1}, "strain": {other, 1}, "ustrain": {other, 1},
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
