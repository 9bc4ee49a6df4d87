package run

import (
	"context"
	"fmt"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"sync/atomic"
	"testing"
	"time"

	"benchslip/analyze"
	"benchslip/analyze/job"
	"benchslip/analyze/slip"
	"benchslip/capture/recording"
	"benchslip/capture/unit"
)

const bench = "../../testdata/bench"

// load reads a job that lies in dir, or in a new folder, with the bench's
// tone under takes/.
func load(t *testing.T, text string) *job.Job {
	t.Helper()
	dir := t.TempDir()
	if err := os.Mkdir(filepath.Join(dir, "takes"), 0o777); err != nil {
		t.Fatal(err)
	}
	for _, name := range []string{"tone.wav", "pair.wav", "joined.wav", "hum.wav"} {
		data, err := os.ReadFile(filepath.Join(bench, name))
		if err != nil {
			t.Fatal(err)
		}
		if err := os.WriteFile(filepath.Join(dir, "takes", name), data, 0o666); err != nil {
			t.Fatal(err)
		}
	}
	path := filepath.Join(dir, "job.toml")
	if err := os.WriteFile(path, []byte("format = 1\n"+text), 0o666); err != nil {
		t.Fatal(err)
	}
	j, err := job.Load(path, job.Options{})
	if err != nil {
		t.Fatal(err)
	}
	return j
}

func execute(t *testing.T, text string, opt Options) *slip.Slip {
	t.Helper()
	s, err := Run(context.Background(), load(t, text), opt)
	if err != nil {
		t.Fatal(err)
	}
	return s
}

// fixed is a measure that gives the same result for every pass.
func fixed(res analyze.Result) func(string) *analyze.Measure {
	return func(name string) *analyze.Measure {
		return &analyze.Measure{Name: name, Unit: "V", Roles: []string{"take"}, Run: func(*analyze.Pass) analyze.Result { return res }}
	}
}

func volts(x float64) analyze.Result {
	return analyze.Result{Value: &x, Unit: unit.MustLookup("V"), Budget: []analyze.Contributor{{Name: "noise", Kind: "A", U: 0.01, Dof: 9}}}
}

const toneJob = `
[gear.box]
kind = "audio"
full_scale_peak = "4 V"
uncertainty = "1 %"
[takes.tone]
file = "takes/tone.wav"
gear = "box"
in = 2
where = { gain = "20 dB", pad = "off" }
`

const levelRow = "[[checks]]\nname = \"Level\"\nmeasure = \"level\"\ntake = \"tone\"\n"

// Rows keep their order whatever finishes first.
func TestOrderOfRows(t *testing.T) {
	text := toneJob
	for i := range 40 {
		text += fmt.Sprintf("[[checks]]\nname = \"row %d\"\nmeasure = \"level\"\ntake = \"tone\"\n", i)
	}
	var calls atomic.Int64
	measure := func(name string) *analyze.Measure {
		return &analyze.Measure{Name: name, Unit: "V", Run: func(*analyze.Pass) analyze.Result {
			time.Sleep(time.Duration(calls.Add(1)%3) * time.Millisecond)
			return volts(1)
		}}
	}
	var steps []int
	s := execute(t, text, Options{Workers: 8, Measure: measure, Progress: func(done, all int, _ string) {
		if all != 41 { // one take
			t.Errorf("%d steps in all", all)
		}
		steps = append(steps, done)
	}})
	for i, c := range s.Checks {
		if c.Name != fmt.Sprintf("row %d", i) {
			t.Errorf("row %d is %q", i, c.Name)
		}
	}
	if len(steps) != 41 || !slices.IsSorted(steps) {
		t.Errorf("progress went %v", steps)
	}
}

// A panic in a measure reaches the caller's goroutine.
func TestPanicIsRaisedAgain(t *testing.T) {
	defer func() {
		if r := recover(); r != "bang" {
			t.Errorf("recovered %v", r)
		}
	}()
	execute(t, toneJob+levelRow, Options{Measure: func(string) *analyze.Measure {
		return &analyze.Measure{Run: func(*analyze.Pass) analyze.Result { panic("bang") }}
	}})
	t.Error("no panic")
}

func TestCancelled(t *testing.T) {
	ctx, stop := context.WithCancel(context.Background())
	j := load(t, toneJob+levelRow)
	s, err := Run(ctx, j, Options{Measure: func(string) *analyze.Measure {
		return &analyze.Measure{Run: func(*analyze.Pass) analyze.Result { stop(); return volts(1) }}
	}})
	if s != nil || err != context.Canceled {
		t.Errorf("got %v, %v", s, err)
	}
}

// What a value cannot be never gets onto a slip.
func TestNoNumber(t *testing.T) {
	nan := volts(1)
	*nan.Value = *nan.Value - *nan.Value
	*nan.Value /= *nan.Value
	c := execute(t, toneJob+levelRow, Options{Measure: fixed(nan)}).Checks[0]
	if c.Value != nil || c.Verdict != slip.NotMeasurable {
		t.Errorf("got %v, %s", c.Value, c.Verdict)
	}
	c = execute(t, toneJob+levelRow, Options{Measure: func(string) *analyze.Measure { return nil }}).Checks[0]
	if c.Verdict != slip.NotMeasurable || !strings.HasPrefix(c.Reason, analyze.Unsupported) {
		t.Errorf("an unknown measure: %s, %s", c.Verdict, c.Reason)
	}
}

func TestConditionsOfTakes(t *testing.T) {
	for _, c := range []struct {
		where   string
		applies bool
	}{
		{`gain = "20 dB"`, true},
		{`gain = "20.0 dB"`, true},
		{`gain = "10 x"`, true}, // 20 lg 10
		{`gain = "20.1 dB"`, false},
		{`gain = "20"`, false},
		{`pad = "off"`, true},
		{`pad = "Off"`, false},
		{`low_cut = "off"`, false},
		{`gain = "20 dB", pad = "off"`, true},
		{`gain = "20 dB", pad = "on"`, false},
	} {
		s := execute(t, toneJob+levelRow+"max = \"2 V\"\nwhere = { "+c.where+" }\n", Options{Measure: fixed(volts(1))})
		if got := s.Checks[0].Verdict; (got == slip.Pass) != c.applies || !c.applies && got != slip.NotApplicable {
			t.Errorf("%s: %s (%s)", c.where, got, s.Checks[0].Reason)
		}
	}
}

func TestStaleCalibration(t *testing.T) {
	for _, c := range []struct {
		name, record, gear, where string
		flagged                   bool
	}{
		{"no dates", "", "", "", false},
		{"no record date", "", "calibrated = 2020-01-01", "", false},
		{"365 days", "[record]\ndate = 2026-12-01\n", "calibrated = 2025-12-01", "", false},
		{"366 days", "[record]\ndate = 2026-12-01\n", "calibrated = 2025-11-30", "", true},
		{"over a leap day", "[record]\ndate = 2024-12-01\n", "calibrated = 2023-12-02", "", false},
		{"same rate", "", `rate = "16 kHz"`, "", false},
		{"other rate", "", `rate = "48 kHz"`, "", true},
		{"same mode", "", `mode = "line"`, `mode = "line"`, false},
		{"other mode", "", `mode = "line"`, `mode = "mic"`, true},
		{"mode not stated", "", `mode = "line"`, "", false},
	} {
		text := c.record + "[gear.box]\nkind = \"audio\"\nfull_scale_peak = \"4 V\"\nuncertainty = \"1 %\"\n" + c.gear + `
[takes.tone]
file = "takes/hum.wav"
gear = "box"
where = { ` + c.where + " }\n" + levelRow
		s := execute(t, text, Options{Measure: fixed(volts(1))})
		flags := s.Takes[0].Flags
		if flagged := len(flags) == 1 && flags[0].Code == recording.StaleCalibration && flags[0].Take == "tone"; flagged != c.flagged || len(flags) > 1 {
			t.Errorf("%s: flags %+v", c.name, flags)
		}
		if len(s.Checks[0].Flags) != len(flags) {
			t.Errorf("%s: the row carries %d flags, its take %d", c.name, len(s.Checks[0].Flags), len(flags))
		}
	}
}

// The hash of the limits changes when a limit does, not when it is written in
// another unit or the rows stand in another order.
func TestLimitsHash(t *testing.T) {
	hash := func(checks ...string) string {
		text := toneJob
		for i, c := range checks {
			text += fmt.Sprintf("[[checks]]\nname = \"%c\"\nmeasure = \"level\"\ntake = \"tone\"\n%s\n", c[0], c[2:])
			_ = i
		}
		return execute(t, text, Options{Measure: fixed(volts(1))}).LimitsSHA256
	}
	base := hash(`a min = "1 V"`, `b max = "0 dBu"`)
	if other := hash(`b max = "0 dBu"`, `a min = "1000 mV"`); other != base {
		t.Error("the order of the rows or the unit of a limit changes the hash")
	}
	for _, c := range [][]string{
		{`a min = "1.001 V"`, `b max = "0 dBu"`},
		{`a max = "1 V"`, `b max = "0 dBu"`},
		{`a min = "1 V"`, `c max = "0 dBu"`},
		{`a min = "1 V"`, `b max = "0 dBV"`},
	} {
		if hash(c...) == base {
			t.Errorf("%q does not change the hash", c)
		}
	}
}

// The sheet number depends on version, job text and takes, not on where they
// lie.
func TestSheetNumber(t *testing.T) {
	run := func(version, text string, change bool) string {
		j := load(t, text)
		if change {
			data, err := os.ReadFile(j.Takes[0].Path)
			if err != nil {
				t.Fatal(err)
			}
			data[len(data)-1] ^= 1
			if err := os.WriteFile(j.Takes[0].Path, data, 0o666); err != nil {
				t.Fatal(err)
			}
		}
		s, err := Run(context.Background(), j, Options{Version: version, Measure: fixed(volts(1))})
		if err != nil {
			t.Fatal(err)
		}
		return s.Sheet
	}
	base := run("1", toneJob+levelRow, false)
	if len(base) != 12 || strings.Trim(base, "0123456789abcdef") != "" {
		t.Errorf("sheet %q", base)
	}
	if again := run("1", toneJob+levelRow, false); again != base {
		t.Error("the same job in another folder has another number")
	}
	for name, other := range map[string]string{
		"version": run("2", toneJob+levelRow, false),
		"job":     run("1", toneJob+levelRow+"# remark\n", false),
		"take":    run("1", toneJob+levelRow, true),
	} {
		if other == base {
			t.Errorf("another %s has the same number", name)
		}
	}
}

// repeat, against and each reach the right takes.
func TestRowsOfSeveralTakes(t *testing.T) {
	text := `
[gear.box]
kind = "audio"
full_scale_peak = "4 V"
uncertainty = "1 %"
[defaults]
gear = "box"
[takes.a]
file = "takes/tone.wav"
[takes.b]
file = "takes/pair.wav"
[takes.c]
file = "takes/joined.wav"
[[checks]]
name = "mean"
measure = "level"
repeat = ["a", "b", "c"]
[[checks]]
name = "relative"
measure = "level"
take = "b"
against = "a"
max = "20 dB"
[[checks]]
name = "row"
measure = "level"
each = ["c", "a"]
max = { a = "1.5 V", c = "3.5 V" }
`
	value := map[string]float64{"a": 1, "b": 2, "c": 3}
	s := execute(t, text, Options{Measure: func(name string) *analyze.Measure {
		return &analyze.Measure{Name: name, Unit: "V", Run: func(p *analyze.Pass) analyze.Result { return volts(value[p.Take("take").Name]) }}
	}})
	near := func(i int, name string, want float64, take string, roles int) {
		t.Helper()
		c := s.Checks[i]
		if c.Name != name || c.Value == nil || *c.Value < want-1e-9 || *c.Value > want+1e-9 {
			t.Errorf("row %d: %q, %v, wanted %q, %g", i, c.Name, c.Value, name, want)
		}
		if (c.Take == nil) != (take == "") || c.Take != nil && *c.Take != take || len(c.Takes) != roles {
			t.Errorf("row %d: take %v, roles %v", i, c.Take, c.Takes)
		}
	}
	near(0, "mean", 2, "", 3)
	near(1, "relative", 6.02059991327962, "b", 2) // 20 lg 2
	near(2, "row: c", 3, "c", 1)
	near(3, "row: a", 1, "a", 1)
	if s.Checks[1].Takes[1] != (slip.Role{Role: "against", Name: "a"}) {
		t.Errorf("roles %v", s.Checks[1].Takes)
	}
}

// A flag of a take bears on the rows that read its channel within its span.
func TestFlagsOfTakesOnRows(t *testing.T) {
	from, to := recording.Place(0.2, 0.3)
	j := load(t, toneJob+levelRow+"[[checks]]\nname = \"Later\"\nmeasure = \"level\"\ntake = \"tone\"\nspan = \"0.5 s ..\"\n")
	j.Takes[0].Flags = []recording.Flag{
		{Code: recording.Gap, Take: "tone", Message: "m", FromS: from, ToS: to},
		{Code: recording.FlatTop, Take: "tone", Channel: 2, Message: "m"},
		{Code: recording.Silent, Take: "tone", Channel: 3, Message: "another channel"},
	}
	s, err := Run(context.Background(), j, Options{Measure: fixed(volts(1))})
	if err != nil {
		t.Fatal(err)
	}
	codes := func(i int) (out []string) {
		for _, f := range s.Checks[i].Flags {
			out = append(out, f.Code)
		}
		return out
	}
	if got := codes(0); !slices.Equal(got, []string{recording.Gap, recording.FlatTop}) {
		t.Errorf("whole take: %v", got)
	}
	if got := codes(1); !slices.Equal(got, []string{recording.FlatTop}) {
		t.Errorf("span without the gap: %v", got)
	}
}

// Cautions go with what is measured, and none suggests lifting an earth.
func TestCautions(t *testing.T) {
	for _, c := range []struct {
		checks string
		part   string // "": none at all
	}{
		{levelRow, ""},
		{"[[checks]]\nname = \"Hum\"\nmeasure = \"hum\"\ntake = \"tone\"\n", "protective earth"},
		{"[[checks]]\nname = \"Hum\"\nmeasure = \"hum\"\ntake = \"tone\"\n", "Phantom"},
		{"[[checks]]\nname = \"Hum\"\nmeasure = \"hum\"\ntake = \"tone\"\n", "clip"},
		{"[[checks]]\nname = \"EIN\"\nmeasure = \"ein\"\ntake = \"tone\"\ngain = \"40 dB\"\n", "Phantom"},
		{"[[checks]]\nname = \"Power\"\nmeasure = \"power\"\ntake = \"tone\"\nload = \"8 ohm\"\n", "resistor"},
		{"[[checks]]\nname = \"Power\"\nmeasure = \"power\"\ntake = \"tone\"\nload = \"8 ohm\"\n", "hearing"},
	} {
		all := strings.Join(execute(t, toneJob+c.checks, Options{Measure: fixed(volts(1))}).Cautions, "\n")
		if c.part == "" && all != "" || !strings.Contains(all, c.part) {
			t.Errorf("%s: cautions lack %q:\n%s", c.checks, c.part, all)
		}
	}
}
