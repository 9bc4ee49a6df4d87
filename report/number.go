package report

import (
	"math"
	"strconv"
	"strings"

	"benchslip/analyze/slip"
	"benchslip/capture/unit"
)

// Scale prints the numbers of one check alike: one SI prefix and one last
// digit for value, uncertainty, limits and margin. Numbers go in in the
// check's own unit.
type Scale struct {
	from, to unit.Unit
	known    bool // the unit is one of ours; else numbers are printed as they stand
	raw      string
	places   int  // decimals shown; negative: rounded before the point
	rounded  bool // places come from an uncertainty
}

// ScaleOf chooses prefix and last digit for a check: the prefix that suits
// its value (or bound, or limit), the last digit that of the expanded
// uncertainty at two significant digits (JCGM 100:2008, 7.2.6); four
// significant digits without one, two decimals in decibel units.
func ScaleOf(c *slip.Check) Scale {
	sc := Scale{raw: Clean(c.Unit)}
	size := 0.0
	for _, x := range []*float64{c.Value, boundOf(c), c.Max, c.Min} {
		if x != nil {
			size = *x
			break
		}
	}
	u := 0.0
	if c.Uncertainty != nil && *c.Uncertainty > 0 {
		u = *c.Uncertainty
	}
	if from, err := unit.Lookup(c.Unit); err == nil {
		sc.from, sc.known = from, true
		_, _, symbol := unit.Split(size, from, u)
		sc.to = unit.MustLookup(symbol)
	}
	switch {
	case u > 0:
		sc.places, sc.rounded = 1-exponent(sc.convert(u), 2), true
	case sc.isLog():
		sc.places = 2
	default:
		sc.places = defaultPlaces(sc.convert(size))
	}
	if c.Value != nil {
		sc.tellApart(*c.Value, c.Min, c.Max)
	}
	return sc
}

func boundOf(c *slip.Check) *float64 {
	if c.Bound == nil {
		return nil
	}
	return &c.Bound.Value
}

// tellApart adds up to four decimals when a value that differs from a limit
// would be printed as if it were equal to it.
func (sc *Scale) tellApart(value float64, limits ...*float64) {
	for _, l := range limits {
		if l == nil || *l == value {
			continue
		}
		for range 4 {
			a := fixed(sc.convert(value), sc.places)
			b := fixed(sc.convert(*l), sc.places)
			if a != b {
				break
			}
			sc.places++
		}
	}
}

func (sc Scale) isLog() bool { return sc.known && sc.to.IsLog() }

// convert turns a number or a difference of the check's unit into the shown
// one. Only the prefix changes, so one factor serves both.
func (sc Scale) convert(x float64) float64 {
	if !sc.known || sc.from == sc.to {
		return x
	}
	return sc.to.FromLinear(sc.from.ToLinear(x))
}

// Unit is the unit as printed: "µV", "dBu", "%", "" for a count.
func (sc Scale) Unit() string {
	if !sc.known {
		return sc.raw
	}
	return sc.to.Proper()
}

// DiffUnit is the unit of differences: dB for every level unit.
func (sc Scale) DiffUnit() string {
	switch {
	case sc.isLog():
		return "dB"
	case sc.known && sc.to.Symbol == "degC":
		return "K"
	}
	return sc.Unit()
}

// Number prints a number of the check's unit, without the unit.
func (sc Scale) Number(x float64) string { return fixed(sc.convert(x), sc.places) }

// Value prints a number with the unit.
func (sc Scale) Value(x float64) string { return with(sc.Number(x), sc.Unit()) }

// Diff prints a difference (uncertainty, margin) with its unit.
func (sc Scale) Diff(x float64) string { return with(sc.Number(x), sc.DiffUnit()) }

// Small prints a part of an uncertainty, to two significant digits.
func (sc Scale) Small(x float64) string {
	return with(fixed(sc.convert(x), 1-exponent(sc.convert(x), 2)), sc.DiffUnit())
}

// Exact prints a limit as it was set, without rounding beyond 12 digits.
func (sc Scale) Exact(x float64) string { return plain(sc.convert(x)) }

// PlusMinus prints value and expanded uncertainty: "39.980 ± 0.060 dB",
// "-127.31 dBu ± 0.25 dB".
func (sc Scale) PlusMinus(value, u float64) string {
	if u <= 0 {
		return sc.Value(value)
	}
	// The uncertainty keeps its two digits where the value shows more.
	pm := fixed(sc.convert(u), min(sc.places, 1-exponent(sc.convert(u), 2)))
	if sc.DiffUnit() != sc.Unit() {
		return sc.Value(value) + " ± " + with(pm, sc.DiffUnit())
	}
	return with(sc.Number(value)+" ± "+pm, sc.Unit())
}

// Outward prints a bound at three significant digits (two decimals in decibel
// units), rounded to the side that claims less: an upper bound up, a lower
// bound down.
func (sc Scale) Outward(x float64, up bool) string {
	x = sc.convert(x)
	places := 2
	if !sc.isLog() {
		places = 2 - exponent(x, 15)
	}
	s := fixed(x, places)
	step := math.Pow10(-places)
	if y, err := strconv.ParseFloat(s, 64); err == nil {
		slack := 1e-9 * math.Abs(x) // what decimal printing itself may move
		if up && y < x-slack {
			s = fixed(y+step, places)
		} else if !up && y > x+slack {
			s = fixed(y-step, places)
		}
	}
	return with(s, sc.Unit())
}

func with(number, unit string) string {
	if unit == "" {
		return number
	}
	return number + " " + unit
}

// exponent is the power of ten of x's first digit once x is rounded to digits
// significant digits: exponent(0.0996, 2) is -1.
func exponent(x float64, digits int) int {
	s := strconv.FormatFloat(math.Abs(x), 'e', digits-1, 64)
	e, _ := strconv.Atoi(s[strings.IndexByte(s, 'e')+1:])
	return e
}

// defaultPlaces shows four significant digits, whole numbers as they are.
func defaultPlaces(x float64) int {
	if x == math.Trunc(x) && math.Abs(x) < 1e15 {
		return 0
	}
	return 3 - exponent(x, 4)
}

// fixed prints x with the given decimals, never "-0"; with an exponent where
// that would take more than nine decimals.
func fixed(x float64, places int) string {
	var s string
	switch {
	case math.IsNaN(x) || math.IsInf(x, 0):
		return "-"
	case places > 9:
		s = strconv.FormatFloat(x, 'e', max(0, places+exponent(x, 15)), 64)
	case places < 0:
		p := math.Pow10(-places)
		s = strconv.FormatFloat(math.Round(x/p)*p, 'f', 0, 64)
	default:
		s = strconv.FormatFloat(x, 'f', places, 64)
	}
	if strings.Trim(s, "-0.e+") == "" {
		s = strings.TrimPrefix(s, "-")
	}
	return s
}

// plain is the shortest decimal of x at 12 significant digits.
func plain(x float64) string {
	x, _ = strconv.ParseFloat(strconv.FormatFloat(x, 'e', 11, 64), 64)
	if a := math.Abs(x); a != 0 && (a < 1e-5 || a >= 1e9) {
		return strconv.FormatFloat(x, 'e', -1, 64)
	}
	if x == 0 {
		return "0"
	}
	return strconv.FormatFloat(x, 'f', -1, 64)
}

// Number prints a number for programs, as slip.json and slip.csv do: the
// shortest decimal that reads back as the float64 rounded to 12 significant
// digits.
func Number(x float64) string {
	x, _ = strconv.ParseFloat(strconv.FormatFloat(x, 'e', 11, 64), 64)
	if x == 0 {
		return "0" // no negative zero
	}
	if a := math.Abs(x); a < 1e-6 || a >= 1e21 {
		return strconv.FormatFloat(x, 'e', -1, 64)
	}
	return strconv.FormatFloat(x, 'f', -1, 64)
}

// Digits prints any other number of a sheet to at most n significant digits,
// without trailing zeros.
func Digits(x float64, n int) string {
	a := math.Abs(x)
	switch {
	case math.IsNaN(x) || math.IsInf(x, 0):
		return "-"
	case x == math.Trunc(x) && a < 1e9:
		return plain(x)
	case a < 1e-4 || a >= 1e9:
		return strconv.FormatFloat(x, 'e', n-1, 64)
	}
	s := fixed(x, n-1-exponent(x, n))
	if strings.Contains(s, ".") {
		s = strings.TrimRight(strings.TrimRight(s, "0"), ".")
	}
	return s
}
