package main

import (
	"encoding/json"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"
)

// truth is one entry of testdata/bench/truth.json: what a recording holds by
// the circuit model that made it.
type truth struct {
	Measure, File, Common, Unit string
	Channel, In, Order          int
	AtHz                        float64 `json:"at_hz"`
	LowHz                       float64 `json:"low_hz"`
	HighHz                      float64 `json:"high_hz"`
	Value, Tolerance            float64
}

func truths(t *testing.T) []truth {
	t.Helper()
	data, err := os.ReadFile(filepath.Join(bench, "truth.json"))
	if err != nil {
		t.Fatal(err)
	}
	var list []truth
	if err := json.Unmarshal(data, &list); err != nil {
		t.Fatal(err)
	}
	if len(list) < 10 {
		t.Fatalf("only %d truths", len(list))
	}
	return list
}

// keys of the check that measures a truth, in the order option, value.
func (x truth) keys() [][2]string {
	var k [][2]string
	add := func(name, value string) { k = append(k, [2]string{name, value}) }
	if x.In > 0 || x.File == "tone.wav" { // the tone is followed in both channels
		add("in", "2")
	}
	if x.AtHz > 0 {
		add("at", fmt.Sprintf("%g Hz", x.AtHz))
	}
	if x.Order > 0 {
		add("order", fmt.Sprint(x.Order))
	}
	if x.HighHz > 0 {
		add("band", fmt.Sprintf("%g Hz .. %g Hz", x.LowHz, x.HighHz))
	}
	if x.Measure == "thd" {
		add("band", "20 Hz .. 10 kHz")
	}
	return k
}

// TestTruth: run and measure give the same value for every truth, and it is
// the truth.
func TestTruth(t *testing.T) {
	list := truths(t)
	var checks strings.Builder
	for i, x := range list {
		take := strings.TrimSuffix(x.File, filepath.Ext(x.File))
		fmt.Fprintf(&checks, "[[checks]]\nname = \"%d\"\nmeasure = %q\n", i, x.Measure)
		if x.Common != "" {
			fmt.Fprintf(&checks, "differential = %q\ncommon = %q\n", take, strings.TrimSuffix(x.Common, ".wav"))
		} else {
			fmt.Fprintf(&checks, "take = %q\n", take)
		}
		for _, k := range x.keys() {
			value := fmt.Sprintf("%q", k[1])
			if k[0] == "in" || k[0] == "order" {
				value = k[1]
			}
			fmt.Fprintf(&checks, "%s = %s\n", k[0], value)
		}
	}
	path := jobFolder(t, checks.String())
	status, stdout, stderr := call(t, "run", path, "--json")
	if status == 2 {
		t.Fatalf("status %d: %s", status, stderr)
	}
	byRun := rowsOf(t, stdout)
	for i, x := range list {
		name := fmt.Sprintf("%s %s", x.Measure, x.File)
		args := []string{"measure", x.Measure, "--json", "--mains-frequency", "50 Hz", "--gear-uncertainty", "0.5 %"}
		if strings.HasSuffix(x.File, ".wav") {
			args = append(args, "--full-scale-peak", "4 V")
		}
		if x.Common != "" {
			args = append(args, "--differential", filepath.Join(bench, x.File), "--common", filepath.Join(bench, x.Common))
		} else {
			args = append(args, filepath.Join(bench, x.File))
		}
		for _, k := range x.keys() {
			args = append(args, "--"+k[0], k[1])
		}
		status, stdout, stderr := call(t, args...)
		if status == 2 {
			t.Errorf("%s: status %d: %s", name, status, stderr)
			continue
		}
		byMeasure := rowsOf(t, stdout)
		a, b := byRun[i], byMeasure[0]
		if a.Value == nil || b.Value == nil {
			t.Errorf("%s: no value: %s / %s", name, a.Reason, b.Reason)
			continue
		}
		if *a.Value != *b.Value || a.Unit != b.Unit {
			t.Errorf("%s: run gives %g %s, measure %g %s", name, *a.Value, a.Unit, *b.Value, b.Unit)
		}
		if a.Unit != x.Unit || math.Abs(*a.Value-x.Value) > x.Tolerance {
			t.Errorf("%s: %.9g %s, truth %.9g %s within %g", name, *a.Value, a.Unit, x.Value, x.Unit, x.Tolerance)
		}
	}
}

// jsonRow is what the tests read of a check.
type jsonRow struct {
	Name, Measure, Unit, Verdict, Reason string
	Value, Uncertainty                   *float64
	Flags                                []struct{ Code string }
}

func rowsOf(t *testing.T, doc string) []jsonRow {
	t.Helper()
	var d struct {
		Format int
		Checks []jsonRow
	}
	if err := json.Unmarshal([]byte(doc), &d); err != nil || d.Format != 1 || len(d.Checks) == 0 {
		t.Fatalf("no rows (%v) in %s", err, doc)
	}
	return d.Checks
}

// Without volts at full scale: levels in dBFS, flagged; a limit in volts
// cannot be judged, one in dBFS can.
func TestMeasureUncalibrated(t *testing.T) {
	wav := filepath.Join(bench, "hum.wav")
	for _, c := range []struct {
		args   []string
		status int
		unit   string
		value  bool
	}{
		{[]string{"hum", wav}, 0, "dBFS", true},
		{[]string{"noise", wav, "--band", "20 Hz .. 7 kHz"}, 0, "dBFS", true},
		{[]string{"level", wav, "--band", "20 Hz .. 7 kHz"}, 0, "dBFS", true},
		{[]string{"peak", wav}, 0, "FS", true},
		{[]string{"noise_density", wav, "--at", "1 kHz"}, 0, "FS/rtHz", true},
		{[]string{"thd", filepath.Join(bench, "tone.wav"), "--band", "20 Hz .. 8 kHz"}, 0, "%", true},
		{[]string{"hum", wav, "--max", "1 V"}, 3, "V", false},
		{[]string{"hum", wav, "--max", "0 dBFS"}, 0, "dBFS", true},
		{[]string{"hum", wav, "--max", "-90 dBFS"}, 1, "dBFS", true},
	} {
		status, stdout, stderr := call(t, append(append([]string{"measure"}, c.args...), "--json")...)
		if status != c.status || stderr != "" {
			t.Errorf("%q: status %d, wanted %d: %s", c.args, status, c.status, stderr)
			continue
		}
		row := rowsOf(t, stdout)[0]
		if row.Unit != c.unit || (row.Value != nil) != c.value {
			t.Errorf("%q: unit %q, value %v, %s", c.args, row.Unit, row.Value, row.Reason)
		}
		flagged := false
		for _, f := range row.Flags {
			flagged = flagged || f.Code == "uncalibrated"
		}
		if c.value && strings.HasSuffix(c.unit, "FS") && !slices.Contains(c.args, "--max") && !flagged {
			t.Errorf("%q: not flagged", c.args)
		}
		if strings.Contains(stdout, "_v\"") {
			t.Errorf("%q: fractions of full scale are called volts", c.args)
		}
		if c.status == 3 && !strings.HasPrefix(row.Reason, "uncalibrated") {
			t.Errorf("%q: reason %q", c.args, row.Reason)
		}
	}
}

// The main takes are the files, a row each, with text for people.
func TestMeasureText(t *testing.T) {
	a, b := filepath.Join(bench, "tone.wav"), filepath.Join(bench, "pair.wav")
	status, stdout, stderr := call(t, "measure", "gain", a, b, "--in", "2", "--at", "1042 Hz", "--min", "19 dB")
	if status != 0 || stderr != "" {
		t.Fatalf("status %d: %s", status, stderr)
	}
	for _, part := range []string{"tone.wav: 20.00", "pair.wav: ", "verdict   pass", "at 1.042 kHz"} {
		if !strings.Contains(stdout, part) {
			t.Errorf("stdout lacks %q:\n%s", part, stdout)
		}
	}
	status, stdout, stderr = call(t, "measure", "gain", filepath.Join(bench, "README.md"), "--in", "2")
	if status != 2 || stdout != "" || strings.Count(stderr, "\n") != 1 || !strings.Contains(stderr, "README.md") {
		t.Errorf("an unreadable file: status %d, stdout %q, stderr %q", status, stdout, stderr)
	}
}
