package report

import (
	"strings"
	"testing"

	"benchslip/analyze/slip"
)

func ptr[T any](v T) *T { return &v }

// Expected texts follow from JCGM 100:2008, 7.2.6: an uncertainty is given to
// at most two significant digits and the value to the same last place.
func TestValueAndUncertainty(t *testing.T) {
	for _, c := range []struct {
		name          string
		value, u      float64
		unit, want    string
		min, max      *float64
		limits, small string
	}{
		{name: "two digits", value: 39.9802, u: 0.0605, unit: "dB", want: "39.980 ± 0.060 dB"},
		{name: "carry", value: 1, u: 0.0996, unit: "dB", want: "1.00 ± 0.10 dB"},
		{name: "level units differ in dB", value: -127.312, u: 0.25, unit: "dBu", want: "-127.31 dBu ± 0.25 dB"},
		{name: "prefix by the value", value: 0.0012345, u: 0.0000123, unit: "V", want: "1.234 ± 0.012 mV", max: ptr(0.002), limits: "max 2 mV"},
		{name: "prefix as the limit was typed", value: 0.5, u: 0.01, unit: "mV", want: "0.500 ± 0.010 mV", max: ptr(2.0), limits: "max 2 mV"},
		{name: "uncertainty above the value", value: 0.4, u: 12, unit: "uV", want: "0 ± 12 µV"},
		{name: "large uncertainty", value: 12345, u: 321, unit: "ppm", want: "12350 ± 320 ppm"},
		{name: "signs of print", value: 1.5e3, u: 20, unit: "ohm", want: "1.500 ± 0.020 kΩ"},
		{name: "density", value: 4.2e-9, u: 1e-10, unit: "V/rtHz", want: "4.20 ± 0.10 nV/√Hz"},
		{name: "count", value: 3, u: 0, unit: "", want: "3", min: ptr(0.0), max: ptr(0.0), limits: "exactly 0"},
		{name: "no uncertainty", value: 39.9802, unit: "dB", want: "39.98 dB", min: ptr(39.5), max: ptr(40.5), limits: "39.5 .. 40.5 dB"},
		{name: "negative zero", value: -0.0001, u: 0.1, unit: "dB", want: "0.00 ± 0.10 dB"},
		{name: "never shown equal to a limit it misses", value: 40.5001, u: 0.12, unit: "dB", want: "40.5001 ± 0.12 dB", max: ptr(40.5), limits: "max 40.5 dB"},
		{name: "unknown unit", value: 2.5, u: 0.1, unit: "wobbles", want: "2.50 ± 0.10 wobbles"},
	} {
		t.Run(c.name, func(t *testing.T) {
			check := &slip.Check{Value: &c.value, Uncertainty: &c.u, Unit: c.unit, Min: c.min, Max: c.max}
			r := RowOf(check, 1, slip.Rule{})
			if r.Value != c.want {
				t.Errorf("value %q, want %q", r.Value, c.want)
			}
			if c.limits != "" && r.Limits != c.limits {
				t.Errorf("limits %q, want %q", r.Limits, c.limits)
			}
		})
	}
}

// A bound is rounded to the side that claims less.
func TestBoundsRoundOutward(t *testing.T) {
	for _, c := range []struct {
		kind  string
		value float64
		unit  string
		want  string
	}{
		{"upper", 0.000412345, "%", "below 0.000413 %"},
		{"upper", 0.0004, "%", "below 0.000400 %"},
		{"lower", 96.129, "dB", "above 96.12 dB"},
		{"upper", -68.4217, "dB", "below -68.42 dB"},
		{"lower", 1.23456, "V", "above 1.23 V"},
		{"upper", 9.9951e-6, "V", "below 10.00 µV"},
		{"upper", 0, "%", "below 0.00 %"},
	} {
		check := &slip.Check{Unit: c.unit, Bound: &slip.Bound{Kind: c.kind, Value: c.value, Unit: c.unit, Confidence: 0.95}}
		if got := RowOf(check, 1, slip.Rule{}).Value; got != c.want {
			t.Errorf("%s %v %s: %q, want %q", c.kind, c.value, c.unit, got, c.want)
		}
	}
}

func TestBoundaryRowsSpeakPlainly(t *testing.T) {
	c := &slip.Check{Value: ptr(40.45), Uncertainty: ptr(0.12), Unit: "dB", Min: ptr(39.5), Max: ptr(40.5), Margin: ptr(0.05),
		Probability: ptr(0.798), Verdict: slip.ConditionalPass}
	want := "measured 40.45 dB, limit 40.5 dB, uncertainty 0.12 dB: passes, but not beyond doubt (about 80 in 100)"
	if got := RowOf(c, 1, slip.Rule{Decision: "four-way"}).Say; got != want {
		t.Errorf("got  %q\nwant %q", got, want)
	}
	c.Reason = "uncertainty too large"
	if got := RowOf(c, 1, slip.Rule{}).Say; !strings.HasSuffix(got, "; uncertainty too large") {
		t.Errorf("the reason is lost: %q", got)
	}
}

func TestReasons(t *testing.T) {
	for in, want := range map[string][2]string{
		"clipped: take x":       {"clipped", "take x"},
		"missing-take":          {"missing-take", ""},
		"":                      {"", ""},
		"uncertainty too large": {"", "uncertainty too large"},
		"too-short (2 periods)": {"too-short", "(2 periods)"},
	} {
		if a, b := SplitReason(in); a != want[0] || b != want[1] {
			t.Errorf("SplitReason(%q) = %q, %q", in, a, b)
		}
	}
}

func TestCounts(t *testing.T) {
	check := func(class, verdict string) slip.Check { return slip.Check{Class: class, Verdict: verdict} }
	set := check("major", slip.NotApplicable)
	set.Optional = true
	gone := check("minor", slip.NotMeasurable)
	gone.Optional, gone.Reason = true, "missing-take: x"
	s := &slip.Slip{Checks: []slip.Check{check("critical", slip.Pass), check("critical", slip.Pass), check("critical", slip.Pass),
		check("major", slip.Fail), check("minor", slip.Fail), check("minor", slip.Fail), check("major", slip.ConditionalFail),
		check("minor", slip.NotMeasurable), check("info", slip.NotMeasurable), check("major", slip.NotJudged), set, gone}}
	got := strings.Join(Count(s).Counts(), "; ")
	want := "fails: 1 major, 2 minor; open: 1 major, 1 minor; passes: critical 3 of 3, major 0 of 2, minor 0 of 3; " +
		"shown, not judged: 2; optional, set aside: 2"
	if got != want {
		t.Errorf("got  %s\nwant %s", got, want)
	}
}

func TestLead(t *testing.T) {
	one := func(v ...string) *slip.Slip {
		s := &slip.Slip{}
		for _, x := range v {
			s.Checks = append(s.Checks, slip.Check{Class: "major", Verdict: x})
		}
		return s
	}
	for _, c := range []struct {
		s    *slip.Slip
		want string
	}{
		{one(), "The job has no checks."},
		{one(slip.NotJudged), "No limits were set: values are shown, nothing is judged."},
		{one(slip.Pass), "The one judged row passes."},
		{one(slip.Pass, slip.Pass), "All 2 judged rows pass."},
		{one(slip.Pass, slip.ConditionalPass), "Nothing fails, but 1 row is open; 1 of 2 pass."},
		{one(slip.Fail, slip.Pass), "1 row fails; 1 of 2 pass."},
		{one(slip.Fail, slip.Fail, slip.NotApplicable), "2 rows fail, 1 is open; 0 of 3 pass."},
	} {
		if got := HeadOf(c.s, Rows(c.s)).Lead; got != c.want {
			t.Errorf("got %q, want %q", got, c.want)
		}
	}
}

func TestBudgetIsSortedAndConverted(t *testing.T) {
	c := &slip.Check{Value: ptr(1.0), Uncertainty: ptr(0.01), Unit: "mV", Contributors: []slip.Contributor{
		{Name: "small", StandardUncertainty: 1e-6, Unit: "V", Kind: "A", Dof: ptr(9.0)},
		{Name: "large", StandardUncertainty: 0.003, Unit: "mV", Kind: "B"},
		{Name: "none", StandardUncertainty: 0, Unit: "mV", Kind: "B"},
	}}
	r := RowOf(c, 1, slip.Rule{})
	b := r.Budget()
	if b[0].Name != "large" || b[0].U != "0.0030 mV" || b[0].Percent != "90 %" || b[0].Dof != "∞" || b[1].U != "0.0010 mV" || b[1].Dof != "9" {
		t.Errorf("budget %+v", b)
	}
	if got := r.TwoLargest(); got != "large 0.0030 mV (90 %), small 0.0010 mV (10 %)" {
		t.Errorf("two largest: %q", got)
	}
}

func TestFlagsOnce(t *testing.T) {
	f := slip.Flag{Code: "clipped", Take: "a", Channel: ptr(1), Message: "m", FromS: ptr(0.5), ToS: ptr(0.75)}
	s := &slip.Slip{Takes: []slip.Take{{Name: "a", Flags: []slip.Flag{f}}},
		Checks: []slip.Check{{Flags: []slip.Flag{f}}, {}, {Take: ptr("b"), Flags: []slip.Flag{f, {Code: "ratio", Message: "n"}}}}}
	got := Flags(s)
	if len(got) != 2 || got[0].RowsText() != "rows 1, 3" || got[0].Place != "channel 1, 0.5 s .. 0.75 s" || got[1].Take != "b" || got[1].RowsText() != "row 3" {
		t.Errorf("%+v", got)
	}
}

func TestClean(t *testing.T) {
	for in, want := range map[string]string{
		"plain Ω µ é 漢":     "plain Ω µ é 漢",
		"a\r\nb\tc":         "a b c",
		"\x1b[31m\x00":      "\ufffd[31m\ufffd",
		"\u009b31m":         "\ufffd31m",
		"\u202eexe\u2069":   "\ufffdexe\ufffd",
		"\xff\xfe":          "\ufffd\ufffd",
		"\ufffe\U0001ffff":  "\ufffd\ufffd",
		"x\u200dy":          "x\u200dy",
		"line\u2028\u2029p": "line  p",
	} {
		if got := Clean(in); got != want {
			t.Errorf("Clean(%q) = %q, want %q", in, got, want)
		}
	}
	if got := CleanLines("a\r\nb\n"); got != "a\nb\n" {
		t.Errorf("CleanLines keeps breaks: %q", got)
	}
}

func TestWrap(t *testing.T) {
	for _, c := range []struct {
		in    string
		width int
		want  string
	}{
		{"", 5, ""}, {"one two", 7, "one two"}, {"one two", 6, "one|two"}, {"abcdefgh", 3, "abc|def|gh"},
		{"a abcdefgh b", 4, "a|abcd|efgh|b"}, {"漢字漢字", 5, "漢字|漢字"}, {"漢", 1, "漢"},
	} {
		if got := strings.Join(Wrap(c.in, c.width), "|"); got != c.want {
			t.Errorf("Wrap(%q, %d) = %q, want %q", c.in, c.width, got, c.want)
		}
	}
}

func TestTakeFacts(t *testing.T) {
	take := slip.Take{File: "a.wav", Format: ptr("WAV 24-bit PCM"), Channels: ptr(1), RateHz: ptr(44100.0), DurationS: ptr(0.002048), Bytes: ptr(int64(4612345))}
	if got := TakeLine(&take); got != "a.wav, WAV 24-bit PCM, 1 channel, 44.1 kHz, 2.048 ms, 4.61 MB" {
		t.Error(got)
	}
	take = slip.Take{File: "a.wav", Fault: "missing-take: not there"}
	if got := TakeLine(&take); got != "a.wav: missing-take: not there" {
		t.Error(got)
	}
}
