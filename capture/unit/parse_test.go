package unit

import (
	"math"
	"strings"
	"testing"
)

func contains(s, part string) bool { return strings.Contains(s, part) }

func TestParseRefuses(t *testing.T) {
	for _, c := range []struct{ text, part string }{
		{"", "empty"}, {"  ", "empty"}, {"dB", "expected a number"}, {"-", "expected a number"},
		{"39,5 dB", `write "39.5 dB"`}, {"1,000 Hz", `write "1.000 Hz"`},
		{"NaN dB", "finite"}, {"nan", "finite"}, {"inf V", "finite"}, {"-Inf", "finite"}, {"+infinity V", "finite"},
		{"0x10 V", "hexadecimal"}, {"0X1p4 V", "hexadecimal"}, {"1_000 Hz", `"1000 Hz"`},
		{"1e400 V", "out of range"}, {"1e308 kV", "out of range"}, {"1e6 dB", "out of range"}, {"-1e6 dB", "out of range"},
		{"1.2.3 V", "one decimal point"}, {"20 .. 30 Hz", "range"}, {"1 000 Hz", "digits together"}, {". V", "expected a number"},
		{"5 Hzz", `did you mean "Hz"`}, {"5 KHz", `did you mean "kHz"`}, {"5 hz", `"Hz"`}, {"3 DBU", `"dBu"`},
		{"3 db", `"dB"`}, {"10 Ohm", `"ohm"`}, {"10 ohms", `"ohm"`}, {"10k", `"kohm"`}, {"1 Vrms", `"V"`},
		{"2 seconds", `"s"`}, {"20 C", `"degC"`}, {"4 nV/Hz", `"nV/rtHz"`}, {"5 furlongs", "unknown unit"},
		{"5 V V", "unknown unit"}, {"e5 V", "expected a number"}, {"--3 V", "expected a number"},
		{"5 \x00V", "unknown unit"}, {strings.Repeat("9", 500) + " V", "out of range"},
	} {
		q, err := Parse(c.text)
		if err == nil {
			t.Errorf("%q gave %v, want an error with %q", c.text, q, c.part)
		} else if !contains(err.Error(), c.part) {
			t.Errorf("%q: %v, want %q in it", c.text, err, c.part)
		} else if len(err.Error()) > 300 {
			t.Errorf("%q: message of %d bytes", c.text, len(err.Error()))
		}
	}
}

func TestParseKeepsText(t *testing.T) {
	q := must(t, "  -125.50  dBu ")
	if q.Text != "-125.50  dBu" || q.Number != -125.5 || q.Unit.Symbol != "dBu" {
		t.Errorf("got %+v", q)
	}
	if q := must(t, "\u22123 dB"); q.Number != -3 { // minus sign of print
		t.Errorf("got %+v", q)
	}
	if q := must(t, "20\u00a0kHz"); q.Linear() != 20000 { // no-break space
		t.Errorf("got %+v", q)
	}
	if q := must(t, "0 x"); q.Unit.Dim != Ratio {
		t.Errorf("got %+v", q)
	}
}

func TestParseRange(t *testing.T) {
	inf := math.Inf(1)
	for _, c := range []struct {
		text   string
		lo, hi float64
	}{
		{"20 Hz .. 20 kHz", 20, 20000}, {"20Hz..20kHz", 20, 20000}, {"0.5 s ..", 0.5, inf}, {".. 7 s", -inf, 7},
		{"-2 ms .. 0.5 s", -0.002, 0.5}, {"1 .. 3", 1, 3},
	} {
		lo, hi, err := ParseRange(c.text)
		if err != nil {
			t.Errorf("%q: %v", c.text, err)
			continue
		}
		l, h := -inf, inf
		if lo != nil {
			l = lo.Linear()
		}
		if hi != nil {
			h = hi.Linear()
		}
		if l != c.lo || h != c.hi {
			t.Errorf("%q: got %v .. %v", c.text, l, h)
		}
	}
	for _, c := range []struct{ text, part string }{
		{"20 Hz - 20 kHz", "expected a range"}, {"20 Hz", "expected a range"}, {"..", "at least one end"},
		{"20 kHz .. 20 Hz", "backwards"}, {"1 s .. 1 s", "backwards"}, {"20 .. 20 kHz", `write "20 Hz .. 20 kHz"`},
		{"20 Hz .. 20000", `write "20 Hz .. 20000 Hz"`}, {"20 Hz ... 20 kHz", "two points"},
		{"1 s .. 3 Hz", "differ in kind"}, {"1,5 s .. 3 s", `write "1.5 s"`}, {"1 s .. 2 s .. 3 s", "unknown unit"},
	} {
		if _, _, err := ParseRange(c.text); err == nil || !contains(err.Error(), c.part) {
			t.Errorf("%q: %v, want %q in it", c.text, err, c.part)
		}
	}
}

func TestNearest(t *testing.T) {
	words := []string{"at", "band", "weighting", "harmonics", "tolerance", "gain"}
	for _, c := range []struct{ text, want string }{
		{"wieghting", "weighting"}, {"Band", "band"}, {"bands", "band"}, {"harmonic", "harmonics"},
		{"tolerence", "tolerance"}, {"agin", "gain"}, {"AT", "at"}, {"zebra", ""}, {"", ""}, {strings.Repeat("a", 1e6), ""},
	} {
		if got := Nearest(c.text, words); got != c.want {
			t.Errorf("%.20q: got %q, want %q", c.text, got, c.want)
		}
	}
}

func FuzzParse(f *testing.F) {
	for _, s := range []string{"39.5 dB", "-125 dBu", "4.92V", "0.33 uF", "10 nV/√Hz", "39,5 dB", "20 Hz .. 20 kHz",
		"0.5 s ..", ".. 7 s", "NaN", "0x1p3", "1e999 V", "−3 °C", "\xff\xfe", "5 µΩ", "1e", "+.e+", "0x", "..."} {
		f.Add(s)
	}
	f.Fuzz(func(t *testing.T, s string) {
		if q, err := Parse(s); err == nil {
			x := q.Linear()
			if math.IsNaN(x) || math.IsInf(x, 0) {
				t.Fatalf("%q is not finite", s)
			}
			again, err := Parse(q.Text)
			if err != nil || again != q {
				t.Fatalf("%q read twice: %+v, %+v, %v", s, q, again, err)
			}
			_ = Format(q.Number, q.Unit, math.Abs(q.Number)/100)
		}
		if lo, hi, err := ParseRange(s); err == nil && lo != nil && hi != nil && lo.Linear() >= hi.Linear() {
			t.Fatalf("%q runs backwards", s)
		}
	})
}
