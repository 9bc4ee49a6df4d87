package unit

import (
	"math"
	"testing"
)

// near compares within an absolute tolerance.
func near(t *testing.T, name string, got, want, tol float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tol) {
		t.Errorf("%s: got %.12g, want %.12g within %g", name, got, want, tol)
	}
}

func must(t *testing.T, s string) Quantity {
	t.Helper()
	q, err := Parse(s)
	if err != nil {
		t.Fatalf("Parse(%q): %v", s, err)
	}
	return q
}

// Level arithmetic from the definitions: 0 dBu is the voltage of 1 mW in
// 600 ohm, 0 dBV is 1 V, 0 dBm is 1 mW, 0 dBFS is the RMS of a full-scale
// sine (AES17). Each number was worked out by hand calculator from them.
func TestLevels(t *testing.T) {
	in := func(s, u string) float64 {
		v, err := Convert(must(t, s).Linear(), MustLookup(u).Dim, MustLookup(u))
		if err != nil {
			t.Fatal(err)
		}
		return v
	}
	near(t, "0 dBu in V", in("0 dBu", "V"), 0.774596669, 1e-9)
	near(t, "1 mW in 600 ohm", math.Sqrt(must(t, "0 dBm").Linear()*must(t, "600 ohm").Linear()), 0.774596669, 1e-9)
	near(t, "dBV less dBu", in("1 V", "dBV")-in("1 V", "dBu"), -2.2184875, 1e-6)
	near(t, "+4 dBu in V", in("+4 dBu", "V"), 1.22765299, 1e-6)
	near(t, "-10 dBV in dBu", in("-10 dBV", "dBu"), -7.7815125, 1e-6)
	if got := in("60 dB", "x"); got != 1000 {
		t.Errorf("60 dB = %.17g x, want 1000 exactly", got)
	}
	near(t, "full-scale square", in("1 FS", "dBFS"), 3.01029996, 1e-6)
	near(t, "full-scale sine re FS", 20*math.Log10(in("0 dBFS", "FS")), -3.01029996, 1e-6)
	near(t, "power sum of -60 and -60 dB",
		MustLookup("dB").FromLinear(math.Hypot(must(t, "-60 dB").Linear(), must(t, "-60 dB").Linear())), -56.9897, 1e-6)
	near(t, "coherent sum of -60 and -60 dB",
		MustLookup("dB").FromLinear(2*must(t, "-60 dB").Linear()), -53.9794001, 1e-6)
	a, b := must(t, "-100 dBV").Linear(), must(t, "-106 dBV").Linear()
	near(t, "floor taken off", MustLookup("dBV").FromLinear(math.Sqrt(a*a-b*b)), -101.256276, 1e-6)
	near(t, "dBm of 1 V in 600 ohm", MustLookup("dBm").FromLinear(1.0/600), 2.2184875, 1e-6)
}

func TestConversions(t *testing.T) {
	for _, c := range []struct {
		text string
		dim  Dim
		want float64 // exact: the nearest float64 to the decimal value
	}{
		{"4.92V", Volt, 4.92}, {"39 mV", Volt, 0.039}, {"10 uV", Volt, 1e-5}, {"1.5 kV", Volt, 1500},
		{"0.33 uF", Farad, 0.33e-6}, {"150 ohm", Ohm, 150}, {"6.8 kohm", Ohm, 6800}, {"10 Mohm", Ohm, 1e7},
		{"10 nV/rtHz", VoltPerRootHertz, 1e-8}, {"100 ppm", Ratio, 1e-4}, {"0.02 %", Ratio, 2e-4},
		{"40 x", Ratio, 40}, {"0.5 V/V", Ratio, 0.5}, {"2 s", Second, 2}, {"5 min", Second, 300},
		{"1 h", Second, 3600}, {"250 us", Second, 250e-6}, {"20 kHz", Hertz, 20000}, {"1042 Hz", Hertz, 1042},
		{"0 degC", Kelvin, 273.15}, {"290 K", Kelvin, 290}, {"85 m", Metre, 85}, {"2 km", Metre, 2000},
		{"20 cm", Metre, 0.2}, {"2 V/us", VoltPerSecond, 2e6}, {"500 mV/us", VoltPerSecond, 5e5},
		{"3 uV/m", VoltPerMetre, 3e-6}, {"12 V/s", VoltPerSecond, 12}, {"-3 deg", Degree, -3},
		{"3 mA", Ampere, 0.003}, {"20 W", Watt, 20}, {"0", None, 0}, {"-1", None, -1},
		{"0.25 FS", FullScale, 0.25}, {"1e3 Hz", Hertz, 1000}, {"1E-3V", Volt, 0.001}, {".5 s", Second, 0.5},
	} {
		q := must(t, c.text)
		if q.Unit.Dim != c.dim || q.Linear() != c.want {
			t.Errorf("%s: got %.17g (%v), want %.17g (%v)", c.text, q.Linear(), q.Unit.Dim, c.want, c.dim)
		}
		near(t, c.text+" back", q.Unit.FromLinear(q.Linear()), q.Number, 1e-12*(1+math.Abs(q.Number)))
	}
	near(t, "20 degC", must(t, "20 degC").Linear(), 293.15, 1e-12) // SI Brochure 2.3.1
}

func TestSpellings(t *testing.T) {
	for _, group := range [][]string{
		{"uV", "µV", "μV"}, {"ohm", "Ω", "Ω"}, {"kohm", "kΩ", "kΩ"}, {"uohm", "µΩ", "μΩ"},
		{"nV/rtHz", "nV/sqrtHz", "nV/√Hz"}, {"degC", "°C", "℃"}, {"deg", "°"}, {"x", "V/V"},
		{"V/us", "V/µs", "V/μs"}, {"uF", "µF", " uF "},
	} {
		want := MustLookup(group[0])
		for _, s := range group {
			u, err := Lookup(s)
			if err != nil || u != want {
				t.Errorf("%q: got %v, %v, want %v", s, u, err, want)
			}
		}
		if back := MustLookup(want.Proper()); back != want {
			t.Errorf("%q printed as %q reads back as %q", group[0], want.Proper(), back.Symbol)
		}
	}
}

// Every symbol of the table reads back to itself, keeps its dimension and
// undoes its own conversion.
func TestTable(t *testing.T) {
	if len(names) < 150 {
		t.Fatalf("only %d units", len(names))
	}
	for _, n := range names {
		u := MustLookup(n)
		if u.Symbol != n || MustLookup(u.Proper()) != u {
			t.Errorf("%q does not read back", n)
		}
		near(t, n, u.FromLinear(u.ToLinear(7.25))/7.25, 1, 1e-12)
		if u.IsLog() != (len(n) > 1 && n[:2] == "dB") || u.DB() != u.IsLog() {
			t.Errorf("%q: IsLog %v", n, u.IsLog())
		}
	}
	for d := None; d < dims; d++ {
		if b := d.Base(); b.Dim != d || b.ToLinear(1) != 1 {
			t.Errorf("%v: base %q", d, b.Symbol)
		}
	}
	if Dim(-1).String() == "" || dims.String() == "" || dims.Base() != (Unit{}) {
		t.Error("a dimension outside the list must not panic")
	}
}

func TestConvertMismatch(t *testing.T) {
	if v, err := Convert(2, Volt, MustLookup("mV")); err != nil || v != 2000 {
		t.Errorf("2 V in mV: %v, %v", v, err)
	}
	for _, c := range []struct {
		from Dim
		to   string
		part string
	}{
		{Volt, "dBFS", "full_scale_peak"}, {FullScale, "dBu", "full_scale_peak"},
		{FullScalePerSecond, "V/us", "full_scale_peak"}, {Volt, "Hz", "frequency"},
		{None, "x", "plain count"}, {Ratio, "", "plain count"}, {Watt, "dBu", "voltage"},
	} {
		_, err := Convert(1, c.from, MustLookup(c.to))
		if err == nil || !contains(err.Error(), c.part) {
			t.Errorf("%v to %q: %v, want %q in it", c.from, c.to, err, c.part)
		}
	}
}

// A limit typed in one unit judges a value of another the same way: at the
// limit itself and one step of the number either side the order is kept.
func TestThresholds(t *testing.T) {
	for _, s := range []string{"39.5 dB", "-125 dBu", "4.92 V", "0.02 %", "1042 Hz", "12 dBm", "-60 dBFS", "20 degC", "3 V/us"} {
		q := must(t, s)
		at := q.Linear()
		below := q.Unit.ToLinear(math.Nextafter(q.Number, math.Inf(-1)))
		above := q.Unit.ToLinear(math.Nextafter(q.Number, math.Inf(1)))
		if below > at || at > above {
			t.Errorf("%s: order lost: %.17g, %.17g, %.17g", s, below, at, above)
		}
		if again := must(t, s).Linear(); again != at {
			t.Errorf("%s: not the same twice", s)
		}
	}
}

func TestLogOfNothing(t *testing.T) {
	u := MustLookup("dBu")
	if !math.IsInf(u.FromLinear(0), -1) || !math.IsNaN(u.FromLinear(-1)) {
		t.Error("documented: 0 gives -Inf, negative gives NaN")
	}
}
