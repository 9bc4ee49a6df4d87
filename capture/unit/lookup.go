package unit

import (
	"fmt"
	"sort"
	"strings"
)

// stem is a unit without its prefix.
type stem struct {
	Unit
	prefixes string // prefixes it takes: a string of the letters in prefixExp
}

// prefixExp are the SI prefixes (SI Brochure, 9th edition, table 7) that a
// bench meets. No unit on a bench needs the others.
var prefixExp = map[byte]int{'f': -15, 'p': -12, 'n': -9, 'u': -6, 'm': -3, 'c': -2,
	'k': 3, 'M': 6, 'G': 9, 'T': 12}

const allPrefixes = "fpnumkMGT"

func linear(symbol string, d Dim, prefixes string) stem {
	return stem{Unit{Symbol: symbol, Dim: d, bare: prefixes != ""}, prefixes}
}

func scaled(symbol string, d Dim, exp10 int, factor, offset float64) stem {
	return stem{Unit{Symbol: symbol, Dim: d, exp10: exp10, factor: factor, offset: offset}, ""}
}

func decibel(symbol string, d Dim, perDecade, ref float64) stem {
	return stem{Unit{Symbol: symbol, Dim: d, perDecade: perDecade, ref: ref}, ""}
}

// stems in the order in which help lists them. "degC" stands for 0 degC =
// 273.15 K (SI Brochure, 9th edition, 2.3.1).
var stems = []stem{
	linear("V", Volt, allPrefixes),
	decibel("dBu", Volt, 20, RefDBu),
	decibel("dBV", Volt, 20, 1),
	linear("x", Ratio, ""),
	decibel("dB", Ratio, 20, 1),
	scaled("%", Ratio, -2, 0, 0),
	scaled("ppm", Ratio, -6, 0, 0),
	linear("Hz", Hertz, allPrefixes),
	linear("s", Second, allPrefixes),
	scaled("min", Second, 0, 60, 0),
	scaled("h", Second, 0, 3600, 0),
	linear("ohm", Ohm, allPrefixes),
	linear("F", Farad, allPrefixes),
	linear("W", Watt, allPrefixes),
	decibel("dBm", Watt, 10, 1e-3),
	linear("m", Metre, allPrefixes+"c"),
	linear("K", Kelvin, "m"),
	scaled("degC", Kelvin, 0, 0, 273.15),
	linear("deg", Degree, ""),
	linear("A", Ampere, allPrefixes),
	linear("V/m", VoltPerMetre, allPrefixes),
	linear("V/s", VoltPerSecond, allPrefixes),
	linear("V/rtHz", VoltPerRootHertz, allPrefixes),
	linear("FS", FullScale, ""),
	decibel("dBFS", FullScale, 20, FullScaleSine),
	linear("FS/rtHz", FullScalePerRootHertz, ""),
	linear("FS/s", FullScalePerSecond, ""),
}

// denominators that a per-unit may have beside its own, with the power of ten
// they bring to the whole.
var denominators = []struct {
	stem, as string
	exp10    int
}{
	{"V/s", "V/ms", 3}, {"V/s", "V/us", 6}, {"V/s", "V/ns", 9},
	{"V/m", "V/mm", 3}, {"V/m", "V/cm", 2}, {"V/m", "V/km", -3},
}

// table holds every unit under its canonical symbol, names the symbols in
// sorted order. Built once: about 200 entries.
var table, names = build()

func build() (map[string]Unit, []string) {
	all := append([]stem(nil), stems...)
	for _, d := range denominators {
		all = append(all, stem{Unit{Symbol: d.as, Dim: dimOf(d.stem), exp10: d.exp10}, allPrefixes})
	}
	t := map[string]Unit{"": {}}
	for _, s := range all {
		t[s.Symbol] = s.Unit
	}
	for _, s := range all {
		for i := 0; i < len(s.prefixes); i++ {
			u := s.Unit
			u.Symbol = s.prefixes[i:i+1] + s.Symbol
			u.exp10 += prefixExp[s.prefixes[i]]
			u.bare = false
			if _, taken := t[u.Symbol]; !taken {
				t[u.Symbol] = u
			}
		}
	}
	var n []string
	for k := range t {
		if k != "" {
			n = append(n, k)
		}
	}
	sort.Strings(n)
	return t, n
}

func dimOf(symbol string) Dim {
	for _, s := range stems {
		if s.Symbol == symbol {
			return s.Dim
		}
	}
	panic("unit: no stem " + symbol)
}

// spellings turn accepted ways to write a unit into the canonical one:
// U+00B5 and U+03BC are the two micro signs, U+2126 and U+03A9 the two omega
// signs.
var spellings = strings.NewReplacer(
	"\u00b5", "u", "\u03bc", "u",
	"\u2126", "ohm", "\u03a9", "ohm",
	"sqrtHz", "rtHz", "\u221aHz", "rtHz",
	"\u00b0C", "degC", "\u2103", "degC", "\u00b0", "deg",
)

// canonical is spellings plus the one name of a ratio that is no symbol.
func canonical(s string) string {
	s = spellings.Replace(s)
	if s == "V/V" {
		return "x"
	}
	return s
}

// proper puts the signs of print back.
func proper(symbol string) string {
	switch symbol {
	case "deg":
		return "°"
	case "degC":
		return "°C"
	}
	s := strings.Replace(symbol, "ohm", "Ω", 1)
	s = strings.Replace(s, "rtHz", "√Hz", 1)
	if len(s) > 1 && s[0] == 'u' {
		s = "µ" + s[1:]
	}
	return strings.Replace(s, "/us", "/µs", 1)
}

// saidAs are words people write for a unit and the unit that is meant; they
// are not accepted, but named in the message.
var saidAs = map[string]string{
	"volt": "V", "volts": "V", "vrms": "V", "vpp": "V", "vp": "V", "vpk": "V", "mvrms": "mV",
	"hertz": "Hz", "cps": "Hz", "khz": "kHz", "mhz": "MHz", "hz": "Hz",
	"sec": "s", "secs": "s", "second": "s", "seconds": "s", "minute": "min", "minutes": "min",
	"mins": "min", "hr": "h", "hrs": "h", "hour": "h", "hours": "h", "msec": "ms", "usec": "us",
	"ohms": "ohm", "r": "ohm", "k": "kohm", "kohms": "kohm", "kr": "kohm", "meg": "Mohm",
	"watt": "W", "watts": "W", "amp": "A", "amps": "A", "farad": "F", "farads": "F",
	"meter": "m", "meters": "m", "metre": "m", "metres": "m", "c": "degC", "celsius": "degC",
	"kelvin": "K", "degree": "deg", "degrees": "deg", "degk": "K", "percent": "%", "pct": "%",
	"times": "x", "decibel": "dB", "decibels": "dB", "fs": "FS", "n": "nF", "u": "uF", "p": "pF",
	"nv/hz": "nV/rtHz", "v/hz": "V/rtHz", "v/sqrt(hz)": "V/rtHz", "nv/sqrt(hz)": "nV/rtHz",
	"nv/rt(hz)": "nV/rtHz", "dbr": "dB", "dbspl": "dB",
}

// Lookup finds a unit by its symbol in any accepted spelling; "" is the plain
// count. The error names the nearest unit.
func Lookup(symbol string) (Unit, error) {
	if u, ok := table[canonical(strings.TrimSpace(symbol))]; ok {
		return u, nil
	}
	if near := nearestUnit(symbol); near != "" {
		return Unit{}, fmt.Errorf("unknown unit %q: did you mean %q?", clip(symbol), near)
	}
	return Unit{}, fmt.Errorf("unknown unit %q: expected one like V, dBu, dB, %%, Hz, s, ohm, F, W, m, K, V/rtHz", clip(symbol))
}

// MustLookup is Lookup for symbols written in the program; it panics on an
// unknown one.
func MustLookup(symbol string) Unit {
	u, err := Lookup(symbol)
	if err != nil {
		panic("unit: " + err.Error())
	}
	return u
}

// nearestUnit returns the unit someone most likely meant, or "".
func nearestUnit(s string) string {
	s = canonical(strings.TrimSpace(s))
	low := strings.ToLower(s)
	if u, ok := saidAs[low]; ok {
		return u
	}
	for _, n := range names {
		if strings.ToLower(n) == low {
			return n
		}
	}
	return Nearest(s, names)
}

// clip shortens user text for messages.
func clip(s string) string {
	const most = 40
	if r := []rune(s); len(r) > most {
		return string(r[:most]) + "..."
	}
	return s
}
