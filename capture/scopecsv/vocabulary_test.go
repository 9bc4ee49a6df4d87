package scopecsv

import (
	"math"
	"math/rand/v2"
	"strings"
	"testing"
)

// TestVocabulary keeps each name under one kind only, in the plain form that
// plainKey gives.
func TestVocabulary(t *testing.T) {
	seen := map[string]settingKind{}
	for kind, names := range settingNames {
		for _, n := range strings.Split(names, "|") {
			if k, twice := seen[n]; twice {
				t.Errorf("%q stands under %d and %d", n, k, kind)
			}
			seen[n] = kind
			if p, _ := plainKey(n); p != n && !strings.ContainsAny(n, "'\u0394") {
				t.Errorf("%q is %q in plain form", n, p)
			}
		}
	}
}

func TestStatedFigures(t *testing.T) {
	st := style{sep: ',', mark: '.'}
	for _, c := range []struct {
		text, unit string
		want       float64
		q          quantity
		ok         bool
	}{
		{"1.0E-6", "", 1e-6, unknown, true},
		{"100 us", "", 1e-4, seconds, true},
		{"2.0uS", "", 2e-6, seconds, true},
		{"250.00 MSa/s", "", 250e6, hertz, true},
		{"10KSa/s", "", 1e4, hertz, true},
		{"1 MHz", "", 1e6, hertz, true},
		{"48", "kHz", 48e3, hertz, true},
		{"1", "ms/sample", 1e-3, seconds, true},
		{"10k", "pts", 0, unknown, true},
		{"Analog:700000", "", 700000, unknown, true},
		{"-0.0005s", "", -5e-4, seconds, true},
		{"500 us/div", "", 0, unknown, false},
		{"12:34:56", "", 0, unknown, false},
		{"fast", "", 0, unknown, false},
		{"", "", 0, unknown, false},
		{"9.9E37", "", 0, unknown, false},
	} {
		f, ok := st.stated(c.text, c.unit)
		if ok != c.ok || ok && c.want != 0 && (math.Abs(f.v-c.want) > 1e-12*math.Abs(c.want) || f.q != c.q) {
			t.Errorf("%q %q: got %v %v %v", c.text, c.unit, f.v, f.q, ok)
		}
	}
}

func TestHeaders(t *testing.T) {
	for _, c := range []struct {
		text, name, unit string
		q                quantity
	}{
		{"CH1", "CH1", "", unknown},
		{"CH1 (V)", "CH1", "V", volts},
		{"CH2 [mV]", "CH2", "mV", volts},
		{"Time(\u00b5s)", "Time", "\u00b5s", seconds},
		{"time_s", "time_s", "s", seconds},
		{"voltage_CH1_V", "voltage_CH1_V", "V", volts},
		{"U/V", "U/V", "V", volts},
		{"t/ms", "t/ms", "ms", seconds},
		{"Channel_A", "Channel_A", "", unknown},
		{"CH1_min", "CH1_min", "", unknown},
		{"CH1_mA", "CH1_mA", "mA", other},
		{"I (A)", "I", "A", other},
		{"CH1 (filtered once)", "CH1 (filtered once)", "", unknown},
		{"CH1 (AC)", "CH1 (AC)", "", unknown},
		{"V(out)", "V(out)", "V", volts},
		{"CH2mV", "CH2mV", "mV", volts},
		{"Volt", "Volt", "Volt", volts},
		{"A", "A", "", unknown},
		{"Time (ms) - input 1", "Time - input 1", "ms", seconds},
		{"pressure (hPa)", "pressure", "hPa", other},
		{"CH1 (counts)", "CH1", "counts", counts},
	} {
		h := readHeader(c.text)
		if h.full != c.text || h.name != c.name || h.unit != c.unit || h.q != c.q {
			t.Errorf("%q: got name %q, unit %q, kind %d, want %q, %q, %d", c.text, h.name, h.unit, h.q, c.name, c.unit, c.q)
		}
	}
}

func TestStamps(t *testing.T) {
	for _, c := range []struct {
		text string
		s, q float64
		date bool
	}{
		{"12:34:56", 45296, 1, false},
		{"12:34:56.789", 45296.789, 1e-3, false},
		{"12:34:56,7", 45296.7, 0.1, false},
		{"12:34:56:250", 45296.25, 1e-3, false},
		{"02:03.5", 123.5, 0.1, false},
		{"12:34", 45240, 60, false},
		{"12:05:00 AM", 300, 1, false},
		{"1:05:00 pm", 47100, 1, false},
		{"2026-12-01 00:00:01.5", 1.5, 0.1, true},
		{"2026-12-01T00:00:01+02:00", 1, 1, true},
		{"31.12.2026 00:00:02", 2, 1, true},
		{"31-Dec-2026 00:00:03", 3, 1, true},
		{"13/12/2026 00:00:04", 4, 1, true},
	} {
		st, ok := readStamp([]byte(c.text))
		if !ok || st.s != c.s || st.q != c.q || st.hasDate != c.date {
			t.Errorf("%q: got %+v, %v", c.text, st, ok)
		}
	}
	for _, text := range []string{"12:60:00", "1:2:3", "32.13.2026", "13/13/2026", "2026-13-01", "12:34:56x", "1.2.3.4", "10-20", "12:", "::", "13:00:00 PM"} {
		if st, ok := readStamp([]byte(text)); ok {
			t.Errorf("%q was read as %+v", text, st)
		}
	}
	// Day numbers: differences across month ends, a leap day and a century
	// without one, counted on a calendar.
	day := func(y, m, d int) int { return stamp{y: y, m: m, d: d}.day(true) }
	for _, c := range []struct{ got, want int }{
		{day(2026, 3, 1) - day(2026, 2, 28), 1},
		{day(2028, 3, 1) - day(2028, 2, 28), 2},
		{day(2027, 1, 1) - day(2026, 1, 1), 365},
		{day(2100, 3, 1) - day(2100, 2, 28), 1},
		{day(2000, 1, 1) - day(1970, 1, 1), 10957},
	} {
		if c.got != c.want {
			t.Errorf("days: got %d, want %d", c.got, c.want)
		}
	}
}

func TestCodeStep(t *testing.T) {
	// A converter of 8 bits over 1.6 V printed to 0.1 mV: steps of 6.25 mV.
	var v []float64
	for i := range 300 {
		v = append(v, roundTo(float64(i*i%251-125)*0.00625, 1e-4))
	}
	if g := codeStep(v, 1e-4, 5); g < 0.00624 || g > 0.00626 {
		t.Errorf("got %g, want 0.00625", g)
	}
	r := rand.New(rand.NewPCG(8, 8))
	// Values that use every printed digit show no step of their own.
	for i := range v {
		v[i] = roundTo(r.NormFloat64(), 1e-4)
	}
	if g := codeStep(v, 1e-4, 5); g != 0 {
		t.Errorf("got %g, want none", g)
	}
	// The least difference may be two steps: levels 0, 2, 5, 7, 10 ... of 0.04.
	v = v[:0]
	for i := range 200 {
		v = append(v, roundTo(float64([]int{0, 2, 5, 7, 10, 13, 15}[i%7])*0.04, 1e-2))
	}
	if g := codeStep(v, 1e-2, 3); g < 0.0399 || g > 0.0401 {
		t.Errorf("got %g, want 0.04", g)
	}
}

func roundTo(v, q float64) float64 {
	n := v / q
	if n < 0 {
		return -float64(int(-n+0.5)) * q
	}
	return float64(int(n+0.5)) * q
}
