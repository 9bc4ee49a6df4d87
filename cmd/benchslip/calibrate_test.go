package main

import (
	"encoding/json"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"regexp"
	"strconv"
	"strings"
	"testing"

	"benchslip/analyze/job"
)

// played writes a stimulus file that stands for a recording of itself: a tone
// of -20 dBFS has an RMS of 0.1/sqrt 2 of full scale.
func played(t *testing.T, words ...string) string {
	t.Helper()
	path := filepath.Join(t.TempDir(), "take.wav")
	if status, _, stderr := call(t, append(append([]string{"stimulus"}, words...), "--out", path)...); status != 0 {
		t.Fatal(stderr)
	}
	return path
}

var fullScaleOf = regexp.MustCompile(`full_scale_peak = "([0-9.]+) V"`)

func TestCalibrate(t *testing.T) {
	loud, soft := played(t, "tone", "at=220Hz", "length=2s", "peak=-6dBFS"), played(t, "tone", "at=220Hz", "length=2s", "peak=-26dBFS")
	const full = 4.92
	read := func(dBFS float64) string {
		return fmt.Sprintf("%.6f V", full/math.Sqrt2*math.Pow(10, dBFS/20))
	}
	status, stdout, stderr := call(t, "calibrate", loud, "--reading", read(-6), soft, "--reading", read(-26),
		"--channel", "1", "--gear", "box", "--uncertainty", "0.5 %", "--date", "2026-12-01", "--mode", "line")
	if status != 0 || stderr != "" {
		t.Fatalf("status %d: %s", status, stderr)
	}
	m := fullScaleOf.FindStringSubmatch(stdout)
	if m == nil {
		t.Fatalf("no full scale in\n%s", stdout)
	}
	if v, _ := strconv.ParseFloat(m[1], 64); math.Abs(v/full-1) > 2e-5 {
		t.Errorf("%g V at full scale, wanted %g", v, full)
	}
	// What is printed is an included file as it stands.
	dir := t.TempDir()
	for name, text := range map[string]string{"gear.toml": stdout,
		"job.toml": "format = 1\ninclude = [\"gear.toml\"]\n[takes.x]\nfile = \"x.wav\"\ngear = \"box\"\n"} {
		if err := os.WriteFile(filepath.Join(dir, name), []byte(text), 0o666); err != nil {
			t.Fatal(err)
		}
	}
	j, err := job.Load(filepath.Join(dir, "job.toml"), job.Options{})
	if err != nil || j.Gear[0].Calibrated != "2026-12-01" {
		t.Fatalf("%v, %+v", err, j)
	}
	// One file, both channels, each with an entry.
	status, stdout, _ = call(t, "calibrate", loud, "--reading", read(-6), "--channel", "1", loud, "--reading", read(-6), "--channel", "2")
	if status != 0 || !strings.Contains(stdout, "[gear.recorder.channel.2]") {
		t.Errorf("two channels: status %d\n%s", status, stdout)
	}
	for _, c := range []struct {
		args []string
		part string
	}{
		{[]string{"calibrate"}, "no recording"},
		{[]string{"calibrate", loud}, "each FILE"},
		{[]string{"calibrate", loud, "--reading", "1 Hz"}, "voltage"},
		{[]string{"calibrate", loud, "--reading", "1,3 V"}, "1.3 V"},
		{[]string{"calibrate", loud, "--reading", "-1 V"}, "above 0"},
		{[]string{"calibrate", loud, "--reading", "1 V", "--channel", "0"}, "--channel"},
		{[]string{"calibrate", loud, "--reading", "1 V", "--channel", "3"}, "channel 3"},
		{[]string{"calibrate", loud, "--reading", "1 V", "--date", "yesterday"}, "--date"},
		{[]string{"calibrate", loud, "--reading", "1 V", "--uncertainty", "1 s"}, "--uncertainty"},
		{[]string{"calibrate", loud, "--reading", "1 V", "--accuracy", "good"}, "--accuracy"},
		{[]string{"calibrate", loud, "--reading", "1 V", "--meter-band", "400 Hz"}, "--meter-band"},
		{[]string{"calibrate", loud, "--reading", "1 V", "--meter-band", "300 Hz .. 400 Hz"}, "outside"},
		{[]string{"calibrate", loud, "--reading", read(-6), soft, "--reading", read(-25)}, "gain control"},
		{[]string{"calibrate", played(t, "white-noise", "length=2s"), "--reading", "1 V"}, "no"},
		{[]string{"calibrate", "none.wav", "--reading", "1 V"}, "none.wav"},
		{[]string{"calibrate", "-", "--reading", "1 V"}, "standard input"},
		{[]string{"calibrate", "--loop", loud}, "--out"},
		{[]string{"calibrate", "--loop", "none.wav", "--out", filepath.Join(dir, "out")}, "none.wav"},
	} {
		status, stdout, stderr := call(t, c.args...)
		if status != 2 || stdout != "" || !strings.Contains(stderr, c.part) || strings.Count(stderr, "\n") != 1 {
			t.Errorf("%q: status %d, stdout %q, stderr %q, wanted %q", c.args[1:], status, stdout, stderr, c.part)
		}
	}
	if _, err := os.Stat(filepath.Join(dir, "out")); err == nil {
		t.Error("a slip of nothing was written")
	}
}

// A loopback that is the stimulus itself: level as described, no clock error,
// and the separation of a channel that holds dither alone.
func TestLoopback(t *testing.T) {
	file := played(t, "pilot", "at=1042Hz", "length=4s", "before=2s", "after=1s", "peak=-10dBFS", "second=silent")
	out := filepath.Join(t.TempDir(), "loop")
	status, stdout, stderr := call(t, "calibrate", "--loop", file, "--out", out, "--gear", "box")
	if status != 0 || stderr != "" {
		t.Fatalf("status %d: %s\n%s", status, stderr, stdout)
	}
	var doc struct {
		Verdict string
		Checks  []struct {
			Name, Measure, Unit string
			Value               *float64
			Details             map[string]any
		}
	}
	data, err := os.ReadFile(filepath.Join(out, "slip.json"))
	if err != nil {
		t.Fatal(err)
	}
	if err := json.Unmarshal(data, &doc); err != nil || doc.Verdict != "not-judged" {
		t.Fatalf("verdict %q, %v", doc.Verdict, err)
	}
	seen := map[string]bool{}
	for _, c := range doc.Checks {
		seen[c.Measure] = true
		switch c.Measure {
		case "level":
			if c.Value == nil || c.Unit != "dBFS" || math.Abs(*c.Value+10) > 0.001 {
				t.Errorf("%s: %v %s, wanted -10 dBFS", c.Name, c.Value, c.Unit)
			}
		case "tone_frequency":
			if ppm, _ := c.Details["ppm"].(float64); math.Abs(ppm) > 0.01 {
				t.Errorf("%s: %g ppm", c.Name, ppm)
			}
		}
	}
	for _, m := range []string{"level", "noise", "hum", "thd", "thdn", "tone_frequency", "crosstalk"} {
		if !seen[m] {
			t.Errorf("the slip lacks %s", m)
		}
	}
	if _, err := job.Load(filepath.Join(out, "loop.toml"), job.Options{}); err != nil {
		t.Errorf("the generated job: %v", err)
	}
	sweep := played(t, "sweep", "length=4s", "peak=-10dBFS")
	status, stdout, stderr = call(t, "calibrate", "--loop", sweep, "--stimulus", "sweep length=4s peak=-10dBFS", "--out", out)
	if status != 0 || !strings.Contains(stdout, "Flatness, channel 2") {
		t.Errorf("sweep: status %d, %s\n%s", status, stderr, stdout)
	}
}
