package unit

import (
	"math"
	"strings"
	"testing"
)

// Rounding follows JCGM 100:2008 7.2.6: two significant digits of the
// expanded uncertainty, the value to the same place. The third case is the
// form of its example in 7.2.6 (10.057 62 ohm with u = 27 mohm: 10.058 ohm).
func TestFormat(t *testing.T) {
	for _, c := range []struct {
		number float64
		unit   string
		u      float64
		want   string
	}{
		{39.98012, "dB", 0.0621, "39.980 dB"},
		{0.0012344, "V", 1.2e-6, "1.2344 mV"},
		{10.05762, "ohm", 0.027, "10.058 ohm"},
		{1234, "Hz", 150, "1.23 kHz"},
		{123.4, "mV", 2.2, "123.4 mV"},
		{4500, "mV", 2.2, "4500.0 mV"}, // a prefix someone chose is kept
		{0.99999996, "V", 1e-7, "999.99996 mV"},
		{0.9999999999, "V", 1e-6, "1.0000000 V"}, // rounding carries to the next prefix
		{-0.0001, "dB", 0.05, "0.000 dB"},
		{0.0001, "V", 0.005, "0.1 mV"},
		{12, "dB", 150, "10 dB"},
		{5, "dB", 0.0996, "5.00 dB"},    // 0.0996 becomes 0.10
		{5, "dB", 0.00994, "5.0000 dB"}, // 0.00994 becomes 0.0099
		{5, "dB", 0.00996, "5.000 dB"},
		{-125.3456, "dBu", 0, "-125.35 dBu"},
		{1.23456e-9, "V/rtHz", 0, "1.235 nV/rtHz"},
		{0.0004, "%", 0.00002, "0.000400 %"},
		{3.2e-12, "FS/rtHz", 1e-13, "3.20e-12 FS/rtHz"},
		{1, "", 0, "1"}, {0, "", 0, "0"}, {0, "V", 0, "0 V"},
		{3600, "s", 1, "3600.0 s"},
		{22000, "ohm", 220, "22.00 kohm"},
		{4.7e-6, "F", 0, "4.700 uF"},
		{293.15, "K", 0.5, "293.15 K"},
		{math.NaN(), "V", 1, "- V"}, {math.Inf(1), "dB", 1, "- dB"},
		{1.5, "V", math.Inf(1), "1.500 V"}, {1.5, "V", math.NaN(), "1.500 V"},
	} {
		if got := Format(c.number, MustLookup(c.unit), c.u); got != c.want {
			t.Errorf("%v %s, U %v: got %q, want %q", c.number, c.unit, c.u, got, c.want)
		}
	}
}

// The prefix changes at the threshold itself, and one step below it only when
// the printed figure does not round up to it.
func TestPrefixThreshold(t *testing.T) {
	one := MustLookup("V")
	if got := Format(1, one, 0); got != "1.000 V" {
		t.Errorf("at: %q", got)
	}
	if got := Format(math.Nextafter(1, 0), one, 0); got != "1.000 V" {
		t.Errorf("one step below: %q", got)
	}
	if got := Format(math.Nextafter(1, 2), one, 0); got != "1.000 V" {
		t.Errorf("one step above: %q", got)
	}
	if got := Format(0.9994, one, 0); got != "999.4 mV" {
		t.Errorf("below: %q", got)
	}
}

func TestSplit(t *testing.T) {
	v, pm, s := Split(0.0012344, MustLookup("V"), 1.26e-5)
	if v != "1.234" || pm != "0.013" || s != "mV" {
		t.Errorf("got %q %q %q", v, pm, s)
	}
	if _, pm, _ := Split(1, MustLookup("V"), 0); pm != "" {
		t.Errorf("no uncertainty: got %q", pm)
	}
}

func TestProper(t *testing.T) {
	for _, c := range []struct{ got, want string }{
		{FormatProper(1.5e-6, MustLookup("V"), 0), "1.500 µV"},
		{FormatProper(1500, MustLookup("ohm"), 0), "1.500 kΩ"},
		{PrettyProper(1e-8, VoltPerRootHertz), "10.00 nV/√Hz"},
		{FormatProper(20, MustLookup("degC"), 0.5), "20.00 °C"},
		{Pretty(1.5e-6, Volt), "1.500 uV"}, {Pretty(1042, Hertz), "1.042 kHz"}, {Pretty(0.5, Ratio), "0.5000 x"},
	} {
		if c.got != c.want {
			t.Errorf("got %q, want %q", c.got, c.want)
		}
	}
	for d := None; d < dims; d++ {
		if s := Pretty(1.25e-5, d); strings.ContainsFunc(s, func(r rune) bool { return r > 126 }) {
			t.Errorf("%q is not plain ASCII", s)
		}
	}
}
