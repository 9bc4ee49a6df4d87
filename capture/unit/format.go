package unit

import (
	"math"
	"strconv"
	"strings"
)

// Format prints a number given in unit u, rounded to the place of its expanded
// uncertainty (same unit) at two significant digits (JCGM 100:2008 7.2.6),
// in keyboard spelling: "39.980 dB", "1.234 mV". A unit without prefix gets
// the SI prefix that suits the value; one with a prefix keeps it. Without a
// usable uncertainty (0, negative, NaN, infinite) four significant digits are
// shown, two decimals in decibel units. A non-finite number prints as "-".
func Format(number float64, u Unit, uncertainty float64) string {
	n, _, s := Split(number, u, uncertainty)
	return join(n, s)
}

// FormatProper is Format with the signs of print: "1.234 µV", "1.50 kΩ".
func FormatProper(number float64, u Unit, uncertainty float64) string {
	n, _, s := Split(number, u, uncertainty)
	return join(n, proper(s))
}

// Pretty prints a linear value of a dimension to four significant digits in
// its base unit with a fitting prefix: Pretty(0.0012345, Volt) is "1.234 mV".
func Pretty(linear float64, d Dim) string { return Format(linear, d.Base(), 0) }

// PrettyProper is Pretty with the signs of print.
func PrettyProper(linear float64, d Dim) string { return FormatProper(linear, d.Base(), 0) }

// Split is Format in parts: the number, its uncertainty rounded to two
// significant digits in the same (perhaps prefixed) unit, "" when there is
// none, and that unit's keyboard symbol.
func Split(number float64, u Unit, uncertainty float64) (value, plusMinus, symbol string) {
	if !finite(number) {
		return "-", "", u.Symbol
	}
	known := uncertainty > 0 && finite(uncertainty)
	if !known {
		uncertainty = 0
	}
	exp, symbol := pickPrefix(math.Max(math.Abs(number), uncertainty), u)
	for {
		places := decimals(shift(number, -exp), shift(uncertainty, -exp), u)
		value = fixed(shift(number, -exp), places)
		if known {
			plusMinus = fixed(shift(uncertainty, -exp), places)
		}
		// rounding may carry 999.96 to 1000.0: then the next prefix fits
		if r, _ := strconv.ParseFloat(value, 64); math.Abs(r) < 1000 {
			return value, plusMinus, symbol
		}
		next, s, ok := nextPrefix(exp, u)
		if !ok {
			return value, plusMinus, symbol
		}
		exp, symbol = next, s
	}
}

// steps are the prefixes chosen when printing.
var steps = []struct {
	exp    int
	letter string
}{{-15, "f"}, {-12, "p"}, {-9, "n"}, {-6, "u"}, {-3, "m"}, {0, ""}, {3, "k"}, {6, "M"}, {9, "G"}}

// allowed keeps to prefixes people use: no kiloseconds, no kilovolts per
// root hertz, no kelvin but plain.
func allowed(exp int, d Dim) bool {
	switch d {
	case Second, VoltPerRootHertz, VoltPerMetre:
		return exp <= 0
	case Farad:
		return exp < 0
	case Kelvin:
		return exp == 0
	case Metre:
		return exp >= -6 && exp <= 3
	case Hertz:
		return exp >= -3
	}
	return true
}

// pickPrefix returns the power of ten and symbol for a magnitude in u.
func pickPrefix(size float64, u Unit) (int, string) {
	if !u.bare || size == 0 {
		return 0, u.Symbol
	}
	exp, symbol, found := 0, u.Symbol, false
	for _, s := range steps {
		if allowed(s.exp, u.Dim) && (!found || size >= math.Pow10(s.exp)) {
			exp, symbol, found = s.exp, s.letter+u.Symbol, true
		}
	}
	return exp, symbol
}

func nextPrefix(exp int, u Unit) (int, string, bool) {
	for _, s := range steps {
		if u.bare && s.exp > exp && allowed(s.exp, u.Dim) {
			return s.exp, s.letter + u.Symbol, true
		}
	}
	return 0, "", false
}

// decimals is the number of decimals to show; negative: places before the
// point that are rounded away.
func decimals(number, uncertainty float64, u Unit) int {
	switch {
	case uncertainty > 0:
		return 1 - exponent(uncertainty, 2)
	case u.IsLog():
		return 2
	case number == 0 || number == math.Trunc(number) && u.Dim == None:
		return 0
	}
	return 3 - exponent(number, 4)
}

// exponent is the power of ten of x's first digit once x is rounded to digits
// significant digits: exponent(0.0996, 2) is -1, as 0.0996 becomes 0.10.
func exponent(x float64, digits int) int {
	s := strconv.FormatFloat(math.Abs(x), 'e', digits-1, 64)
	e, _ := strconv.Atoi(s[strings.IndexByte(s, 'e')+1:])
	return e
}

// fixed prints x with the given decimals, never "-0". Numbers that would need
// more than nine decimals are printed with an exponent instead.
func fixed(x float64, places int) string {
	var s string
	switch {
	case places > 9 && x != 0:
		digits := max(places+exponent(x, 15), 0)
		s = strconv.FormatFloat(x, 'e', digits, 64)
	case places > 9:
		return "0"
	case places < 0:
		p := math.Pow10(-places)
		s = strconv.FormatFloat(math.RoundToEven(x/p)*p, 'f', 0, 64)
	default:
		s = strconv.FormatFloat(x, 'f', places, 64)
	}
	if strings.Trim(s, "-0.") == "" {
		s = strings.TrimPrefix(s, "-")
	}
	return s
}

func join(number, symbol string) string {
	if symbol == "" {
		return number
	}
	return number + " " + symbol
}

func finite(x float64) bool { return !math.IsNaN(x) && !math.IsInf(x, 0) }
