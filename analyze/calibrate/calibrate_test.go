package calibrate

import (
	"context"
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"benchslip/analyze"
	"benchslip/analyze/job"
	"benchslip/capture/recording"
	"benchslip/capture/stimulus"
	"benchslip/capture/unit"
	"benchslip/capture/wav"
)

const rate = 48000

// record writes a take of the given channels, 24 bits, dithered.
func record(t *testing.T, name string, seconds float64, channels ...func(s float64) float64) string {
	t.Helper()
	path := filepath.Join(t.TempDir(), name)
	w, err := wav.Create(path, wav.Format{RateHz: rate, Channels: len(channels), Bits: 24}, nil)
	if err != nil {
		t.Fatal(err)
	}
	n := int(seconds * rate)
	block := make([][]float64, len(channels))
	for c, f := range channels {
		block[c] = make([]float64, n)
		for i := range block[c] {
			block[c][i] = math.Max(-1, math.Min(f(float64(i)/rate), 1-1.0/(1<<23)))
		}
	}
	if err := w.WriteBlock(block); err != nil {
		t.Fatal(err)
	}
	if err := w.Close(); err != nil {
		t.Fatal(err)
	}
	return path
}

func tone(peak, hz float64) func(float64) float64 {
	return func(s float64) float64 { return peak * math.Sin(2*math.Pi*hz*s+0.4) }
}

func volts(t *testing.T, text string) unit.Quantity {
	t.Helper()
	q, err := unit.Parse(text)
	if err != nil {
		t.Fatal(err)
	}
	return q
}

func point(t *testing.T, path string, channel int, reading string) Point {
	return Point{File: filepath.Base(path), Path: path, Channel: channel, Reading: volts(t, reading)}
}

func pct(x float64) *unit.Quantity { q := unit.New(x, "%"); return &q }

// A tone of peak A FS that a meter reads as U RMS: U sqrt2 / A volts peak at
// full scale, by the definition of RMS of a sine.
func TestFullScale(t *testing.T) {
	loud, soft := record(t, "loud.wav", 3, tone(0.5, 220)), record(t, "soft.wav", 3, tone(0.05, 220))
	const full = 4.92
	e, err := Run(context.Background(), []Point{
		point(t, loud, 1, fmt.Sprintf("%.5f V", 0.5*full/math.Sqrt2)),
		point(t, soft, 1, fmt.Sprintf("%.6f V", 0.05*full/math.Sqrt2)),
	}, Options{Gear: "box", Date: "2026-12-01", Mode: "line", Meter: Meter{Expanded: pct(0.5)}})
	if err != nil {
		t.Fatal(err)
	}
	c := e.Channels[0]
	if math.Abs(c.Factor/full-1) > 2e-5 {
		t.Errorf("%.6f V at full scale, wanted %g", c.Factor, full)
	}
	// The meter's 0.5 % decides; all else is far below.
	if !(c.U >= 0.005 && c.U < 0.00505) {
		t.Errorf("uncertainty %g, wanted 0.005", c.U)
	}
	text := e.TOML() + "[takes.x]\nfile = \"x.wav\"\ngear = \"box\"\n"
	j, err := job.Parse("gear.toml", t.TempDir(), []byte(text), job.Options{})
	if err != nil {
		t.Fatalf("%v in\n%s", err, text)
	}
	g := j.Gear[0]
	if math.Abs(g.FullScalePeak/full-1) > 2e-5 || g.Calibrated != "2026-12-01" || g.Mode != "line" || g.Rate != rate || g.ScaleU == nil || *g.ScaleU < 0.0025 {
		t.Errorf("the entry reads as %+v", g.Gear)
	}
	if notes := strings.Join(e.Notes, "; "); notes != "" {
		t.Errorf("notes on a clean calibration: %s", notes)
	}
}

// A data sheet's limit of error is rectangular: expanded 2/sqrt 3 of it
// (JCGM 100, 4.3.7). 0.5 % of 2 V and 2 mV are 0.6 % together.
func TestMeterLimit(t *testing.T) {
	l, err := ParseLimit("0.5 % + 2 mV")
	if err != nil {
		t.Fatal(err)
	}
	u, known := Meter{Limit: l}.share(2)
	if !known || math.Abs(u-0.006/math.Sqrt(3)) > 1e-9 {
		t.Errorf("u = %g, wanted %g", u, 0.006/math.Sqrt(3))
	}
	for _, bad := range []string{"", "fast", "1 Hz", "-1 %", "0.5 % + 2 dBu"} {
		if _, err := ParseLimit(bad); err == nil {
			t.Errorf("%q is taken", bad)
		}
	}
}

// The last digit of a reading counts as rectangular: 0.130 V may be off by
// half a millivolt, 0.38 %.
func TestLastDigit(t *testing.T) {
	for _, c := range []struct {
		text string
		want float64 // relative standard uncertainty
	}{
		{"1.300 V", 0.0005 / 1.3 / math.Sqrt(3)},
		{"0.130 V", 0.0005 / 0.13 / math.Sqrt(3)},
		{"130.0 mV", 0.05 / 130 / math.Sqrt(3)},
		{"2 V", 0.5 / 2 / math.Sqrt(3)},
		{"4.00 dBu", 0.005 * math.Ln10 / 20 / math.Sqrt(3)},
	} {
		if got := digit(volts(t, c.text)); math.Abs(got-c.want) > 1e-3*c.want {
			t.Errorf("%s: %g, wanted %g", c.text, got, c.want)
		}
	}
}

func TestRefusals(t *testing.T) {
	ok := record(t, "ok.wav", 3, tone(0.5, 220), tone(0.4, 200))
	random := rand.New(rand.NewPCG(1, 2))
	for _, c := range []struct {
		name   string
		points []Point
		meter  Meter
		want   string
	}{
		{"clipped", []Point{point(t, record(t, "clip.wav", 3, func(s float64) float64 { return math.Max(-1, math.Min(1, tone(1.3, 200)(s))) }), 1, "1.300 V")}, Meter{}, "full scale"},
		{"silent", []Point{point(t, record(t, "silent.wav", 3, func(float64) float64 { return 0 }), 1, "1.300 V")}, Meter{}, "silent.wav"},
		{"noise", []Point{point(t, record(t, "noise.wav", 3, func(float64) float64 { return 0.1 * random.NormFloat64() }), 1, "1.300 V")}, Meter{}, "noise.wav"},
		{"square wave", []Point{point(t, record(t, "square.wav", 3, func(s float64) float64 { return math.Copysign(0.3, tone(1, 200)(s)) }), 1, "1.300 V")}, Meter{}, "no clean tone"},
		{"a gain control", []Point{point(t, ok, 1, "1.300 V"), point(t, record(t, "agc.wav", 3, tone(0.055, 200)), 1, "0.1300 V")}, Meter{}, "gain control"},
		{"nothing wrong", []Point{point(t, ok, 1, "1.300 V")}, Meter{}, ""},
		{"outside the meter's band", []Point{point(t, record(t, "high.wav", 3, tone(0.5, 1042)), 1, "1.300 V")}, meterTo(400), "outside"},
		{"no such channel", []Point{point(t, ok, 3, "1.300 V")}, Meter{}, "channel 3"},
		{"no such file", []Point{point(t, filepath.Join(t.TempDir(), "none.wav"), 1, "1.300 V")}, Meter{}, "none.wav"},
	} {
		_, err := Run(context.Background(), c.points, Options{Gear: "box", Meter: c.meter})
		var f *Fault
		if c.want == "" {
			if err != nil {
				t.Errorf("%s: %v", c.name, err)
			}
			continue
		}
		if !errors.As(err, &f) || !strings.Contains(f.Text, c.want) {
			t.Errorf("%s: %v, wanted %q", c.name, err, c.want)
		}
	}
}

func meterTo(hz float64) Meter {
	m := Meter{Expanded: pct(1)}
	m.Band = &analyze.Band{Low: 40, High: hz}
	return m
}

// Two levels that differ because the meter shows few digits are no fault: the
// entry is weighted to the better one and says so. 0.12 V stands for 0.12374 V.
func TestFewDigits(t *testing.T) {
	const full = 3.5
	e, err := Run(context.Background(), []Point{
		point(t, record(t, "loud.wav", 3, tone(0.5, 220)), 1, fmt.Sprintf("%.5f V", 0.5*full/math.Sqrt2)),
		point(t, record(t, "soft.wav", 3, tone(0.05, 220)), 1, "0.12 V"),
	}, Options{Gear: "box", Meter: Meter{Expanded: pct(0.5)}})
	if err != nil {
		t.Fatal(err)
	}
	if f := e.Channels[0].Factor; math.Abs(f/full-1) > 1e-3 {
		t.Errorf("%g V, wanted %g within 0.1 %%", f, full)
	}
	if !strings.Contains(strings.Join(e.Notes, " "), "last digit") {
		t.Errorf("nothing is said of the digits: %q", e.Notes)
	}
}

// Silence before and after the tone is cut off: a stimulus file as it stands
// does.
func TestSilenceAround(t *testing.T) {
	spec, err := stimulus.Parse("tone at=200Hz length=3s before=1s after=1s peak=-6dBFS")
	if err != nil {
		t.Fatal(err)
	}
	path := filepath.Join(t.TempDir(), "tone.wav")
	if err := stimulus.Write(path, spec); err != nil {
		t.Fatal(err)
	}
	e, err := Run(context.Background(), []Point{point(t, path, 1, "1.0000 V"), point(t, path, 2, "1.0000 V")}, Options{Gear: "box", Meter: Meter{Expanded: pct(0.1)}})
	if err != nil {
		t.Fatal(err)
	}
	want := math.Sqrt2 / math.Pow(10, -6.0/20)
	for _, c := range e.Channels {
		r := c.Points[0]
		if math.Abs(c.Factor/want-1) > 1e-5 || r.FromS < 1 || r.ToS > 4.1 {
			t.Errorf("channel %d: %.6f V from %g s to %g s, wanted %.6f", c.Number, c.Factor, r.FromS, r.ToS, want)
		}
	}
	if !strings.Contains(e.TOML(), "[gear.box.channel.2]") {
		t.Errorf("no entry for channel 2:\n%s", e.TOML())
	}
}

// A scope's file that is ten times too small: its probe factor, and a word on
// it.
func TestScopeProbe(t *testing.T) {
	path := filepath.Join(t.TempDir(), "scope.csv")
	var b strings.Builder
	b.WriteString("Time (s),CH1 (V)\n")
	for i := range 20000 {
		s := float64(i) / 10000
		fmt.Fprintf(&b, "%.6f,%.6f\n", s, tone(0.2, 100)(s))
	}
	if err := os.WriteFile(path, []byte(b.String()), 0o666); err != nil {
		t.Fatal(err)
	}
	e, err := Run(context.Background(), []Point{point(t, path, 1, "1.4142 V")}, Options{Gear: "scope", Meter: Meter{Expanded: pct(0.5)}})
	if err != nil {
		t.Fatal(err)
	}
	if e.Kind != recording.Scope || math.Abs(e.Channels[0].Factor-10) > 1e-3 {
		t.Errorf("%s, factor %g, wanted 10", e.Kind, e.Channels[0].Factor)
	}
	if !strings.Contains(strings.Join(e.Notes, " "), "factor of ten") || !strings.Contains(e.TOML(), "probe = ") {
		t.Errorf("entry:\n%s", e.TOML())
	}
}

// A tone on a mains line is taken, with a word on it; hum there would add as a
// vector of unknown phase.
func TestOnMains(t *testing.T) {
	path := record(t, "mains.wav", 4, func(s float64) float64 { return tone(0.5, 200)(s) + tone(0.002, 150)(s) })
	e, err := Run(context.Background(), []Point{point(t, path, 1, "1.0000 V")}, Options{Gear: "box", Meter: Meter{Expanded: pct(0.1)}})
	if err != nil {
		t.Fatal(err)
	}
	// 0.002 of 0.5 at 150 Hz: as much at 200 Hz would be 0.4 % peak, arc-sine 0.28 %.
	c := e.Channels[0]
	if u := 2 * 0.004 / math.Sqrt2; c.U < u || c.U > 1.2*u || !strings.Contains(strings.Join(e.Notes, " "), "mains") {
		t.Errorf("U %g, notes %q", c.U, e.Notes)
	}
}

// Text that people typed neither ends a line nor a string of the entry.
func TestHostileNames(t *testing.T) {
	path := record(t, "x.wav", 2, tone(0.5, 220))
	e, err := Run(context.Background(), []Point{{File: "a\nb\x1b[31m.wav", Path: path, Channel: 1, Reading: volts(t, "1.300 V")}},
		Options{Gear: "a b\"]\nx", Mode: "m\"\\\u202e\n", Meter: Meter{Name: "m\n[gear.evil]"}})
	if err != nil {
		t.Fatal(err)
	}
	j, err := job.Parse("gear.toml", t.TempDir(), []byte(e.TOML()), job.Options{})
	if err != nil {
		t.Fatalf("%v in\n%s", err, e.TOML())
	}
	if len(j.Gear) != 1 || j.Gear[0].Name != "a b\"]\nx" {
		t.Errorf("gear %q", j.Gear[0].Name)
	}
	if strings.ContainsAny(e.TOML(), "\x1b\u202e") {
		t.Error("a control code in the entry")
	}
}

// A loopback of one driven channel beside a silent one, after and before
// silence: the job has what it can say, and reads.
func TestLoopJob(t *testing.T) {
	spec, err := stimulus.Parse("pilot at=1042Hz length=4s before=2s after=2s second=silent")
	if err != nil {
		t.Fatal(err)
	}
	dir := t.TempDir()
	path := filepath.Join(dir, "loop.wav")
	if err := stimulus.Write(path, spec); err != nil {
		t.Fatal(err)
	}
	text, err := LoopJob(context.Background(), []Loopback{{"loop.wav", path, &spec}}, LoopOptions{Gear: "box", Date: "2026-12-01"})
	if err != nil {
		t.Fatal(err)
	}
	j, err := job.Parse("loop.toml", dir, []byte(text), job.Options{})
	if err != nil {
		t.Fatalf("%v in\n%s", err, text)
	}
	got := map[string]int{}
	for _, c := range j.Checks {
		got[c.Measure]++
		for _, row := range c.Rows() {
			if row.Limits.Any() {
				t.Errorf("%s has limits", c.Name)
			}
		}
	}
	for m, n := range map[string]int{"noise": 4, "hum": 2, "level": 1, "thd": 1, "thdn": 1, "tone_frequency": 1, "crosstalk": 1, "balance": 0} {
		if got[m] != n {
			t.Errorf("%d rows of %s, wanted %d", got[m], m, n)
		}
	}
	for _, q := range j.Takes {
		sp := q.Wiring.Span
		switch {
		case sp == nil:
			t.Errorf("take %s has no span", q.Name)
		case q.Name == "tone1" && (sp.From < 2 || sp.To > 6.1):
			t.Errorf("the tone is read from %s", sp.Text)
		case q.Name == "quiet1" && sp.To > 2 && sp.From < 6:
			t.Errorf("the floor is read from %s", sp.Text)
		}
	}
}
