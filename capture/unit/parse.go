package unit

import (
	"fmt"
	"math"
	"strconv"
	"strings"
	"unicode"
)

// Quantity is a number with its unit as someone typed it.
type Quantity struct {
	Number float64 // in Unit
	Unit   Unit
	Text   string // as typed, trimmed
}

// Linear returns the quantity in the linear SI base unit of its dimension.
func (q Quantity) Linear() float64 { return q.Unit.ToLinear(q.Number) }

// String returns the quantity as typed, or number and unit when it was not.
func (q Quantity) String() string {
	if q.Text != "" {
		return q.Text
	}
	return strings.TrimSpace(strconv.FormatFloat(q.Number, 'g', -1, 64) + " " + q.Unit.Symbol)
}

// New makes a quantity of a number in a unit written in the program.
func New(number float64, symbol string) Quantity {
	q := Quantity{Number: number, Unit: MustLookup(symbol)}
	q.Text = q.String()
	return q
}

// Parse reads a quantity: a decimal number, then a unit with or without a
// space between ("39.5 dB", "-125 dBu", "4.92V", "0.33 uF"). A number alone
// is a plain count (Dim None): whether one will do is for the caller to say.
// Infinite and non-finite numbers, hexadecimal, digit groups and decimal
// commas are refused, as is a number too large for its unit.
func Parse(s string) (Quantity, error) {
	text := strings.TrimSpace(s)
	if text == "" {
		return Quantity{}, fmt.Errorf("empty quantity: expected a number with a unit, like \"39.5 dB\"")
	}
	num, rest := splitNumber(text)
	if err := checkNumber(text, num, rest); err != nil {
		return Quantity{}, err
	}
	n, err := strconv.ParseFloat(strings.Replace(num, "\u2212", "-", 1), 64)
	if err != nil || math.IsInf(n, 0) {
		return Quantity{}, fmt.Errorf("%q: number out of range", clip(text))
	}
	u, err := Lookup(rest)
	if err != nil {
		return Quantity{}, fmt.Errorf("%q: %w", clip(text), err)
	}
	q := Quantity{Number: n, Unit: u, Text: text}
	if x := q.Linear(); math.IsInf(x, 0) || math.IsNaN(x) || u.IsLog() && x == 0 {
		return Quantity{}, fmt.Errorf("%q: number out of range for %s", clip(text), u.Symbol)
	}
	return q, nil
}

// splitNumber cuts the leading decimal number off s: sign (also U+2212),
// digits with one point, exponent only when digits follow it.
func splitNumber(s string) (num, rest string) {
	i := 0
	if strings.HasPrefix(s, "\u2212") {
		i = len("\u2212")
	} else if s[0] == '+' || s[0] == '-' {
		i = 1
	}
	digits := func() (n int) {
		for i < len(s) && s[i] >= '0' && s[i] <= '9' {
			i, n = i+1, n+1
		}
		return n
	}
	n := digits()
	if i < len(s) && s[i] == '.' {
		i++
		n += digits()
	}
	if n == 0 {
		return "", s
	}
	if i < len(s) && (s[i] == 'e' || s[i] == 'E') {
		mark := i
		i++
		if i < len(s) && (s[i] == '+' || s[i] == '-') {
			i++
		}
		if digits() == 0 {
			i = mark
		}
	}
	return s[:i], strings.TrimSpace(s[i:])
}

// checkNumber refuses what looks like a number but is not one we take.
func checkNumber(text, num, rest string) error {
	shown := clip(text)
	switch {
	case num == "":
		switch word := strings.ToLower(strings.TrimLeft(text, "+-")); {
		case strings.HasPrefix(word, "nan"), strings.HasPrefix(word, "inf"):
			return fmt.Errorf("%q: not a finite number", shown)
		}
		return fmt.Errorf("%q: expected a number with a unit, like \"39.5 dB\"", shown)
	case strings.HasPrefix(rest, ",") && len(rest) > 1 && isDigit(rest[1]):
		return fmt.Errorf("%q has a decimal comma: write %q", shown, clip(strings.Replace(text, ",", ".", 1)))
	case strings.HasPrefix(rest, "_"):
		return fmt.Errorf("%q: digits are written together: %q", shown, clip(strings.ReplaceAll(text, "_", "")))
	case (num == "0" || num == "-0" || num == "+0") && (strings.HasPrefix(rest, "x") || strings.HasPrefix(rest, "X")) && len(rest) > 1 && isHex(rest[1]):
		return fmt.Errorf("%q: hexadecimal is not taken: write a decimal number", shown)
	case rest != "" && isDigit(rest[0]):
		return fmt.Errorf("%q: one number expected: write the digits together, then the unit", shown)
	case strings.HasPrefix(rest, "."):
		return fmt.Errorf("%q: one decimal point expected (a range is written \"20 Hz .. 20 kHz\")", shown)
	}
	return nil
}

func isDigit(b byte) bool { return b >= '0' && b <= '9' }

func isHex(b byte) bool {
	return isDigit(b) || unicode.ToLower(rune(b)) >= 'a' && unicode.ToLower(rune(b)) <= 'f'
}

// ParseRange reads "20 Hz .. 20 kHz", or with one end open "0.5 s .." and
// ".. 7 s"; an open end is nil. Both ends are of one dimension and the first
// is below the second. Two bare numbers pass as plain counts.
func ParseRange(s string) (lo, hi *Quantity, err error) {
	text := strings.TrimSpace(s)
	a, b, ok := strings.Cut(text, "..")
	if !ok {
		return nil, nil, fmt.Errorf("%q: expected a range, like \"20 Hz .. 20 kHz\"", clip(text))
	}
	if strings.HasPrefix(b, ".") {
		return nil, nil, fmt.Errorf("%q: a range has two points: \"20 Hz .. 20 kHz\"", clip(text))
	}
	for _, end := range []struct {
		text string
		dst  **Quantity
	}{{a, &lo}, {b, &hi}} {
		if strings.TrimSpace(end.text) == "" {
			continue
		}
		q, err := Parse(end.text)
		if err != nil {
			return nil, nil, err
		}
		*end.dst = &q
	}
	switch {
	case lo == nil && hi == nil:
		return nil, nil, fmt.Errorf("%q: a range needs at least one end", clip(text))
	case lo == nil || hi == nil:
		return lo, hi, nil
	case lo.Unit.Dim == None && hi.Unit.Dim != None:
		return nil, nil, fmt.Errorf("%q: the first end has no unit: write \"%s %s .. %s\"", clip(text), lo.Text, plain(hi.Unit).Symbol, hi.Text)
	case hi.Unit.Dim == None && lo.Unit.Dim != None:
		return nil, nil, fmt.Errorf("%q: the second end has no unit: write \"%s .. %s %s\"", clip(text), lo.Text, hi.Text, plain(lo.Unit).Symbol)
	case lo.Unit.Dim != hi.Unit.Dim:
		return nil, nil, fmt.Errorf("%q: the ends differ in kind: %s and %s", clip(text), lo.Unit.Dim, hi.Unit.Dim)
	case lo.Linear() >= hi.Linear():
		return nil, nil, fmt.Errorf("%q runs backwards: write the lower end first", clip(text))
	}
	return lo, hi, nil
}

// plain is the unit without its prefix, for suggestions.
func plain(u Unit) Unit {
	if u.IsLog() {
		return u
	}
	return u.Dim.Base()
}
