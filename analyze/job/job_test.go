package job

import (
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"benchslip/capture/recording"
)

// read parses text as job.toml in an empty folder.
func read(t *testing.T, text string, o Options) (*Job, error) {
	t.Helper()
	return parse("job.toml", t.TempDir(), []byte(text), o)
}

func mustRead(t *testing.T, text string) *Job {
	t.Helper()
	j, err := read(t, text, Options{})
	if err != nil {
		t.Fatalf("job refused:\n%v", err)
	}
	return j
}

func near(t *testing.T, name string, got, want, tol float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tol) {
		t.Errorf("%s: got %.12g, want %.12g", name, got, want)
	}
}

// The job of the manual, with the channel table and includes left as they
// are, comes out as typed.
func TestWholeJob(t *testing.T) {
	path := filepath.Join("testdata", "whole.toml")
	j, err := Load(path, Options{})
	if err != nil {
		t.Fatal(err)
	}
	if j.Title != "Preamp after soldering" || j.Date != "2026-12-01" || j.MainsHz != 50 || j.Mains != "50 Hz" {
		t.Errorf("head: %+v", j)
	}
	if len(j.Unit) != 3 || j.Unit[1] != (Entry{"serial", "017"}) || j.Unit[2] != (Entry{"boards", "2"}) {
		t.Errorf("unit: %v", j.Unit)
	}
	if j.Decision != "four-way" || j.Coverage != 2 {
		t.Errorf("rule: %v %v", j.Decision, j.Coverage)
	}
	box, scope := j.Gearbox("box"), j.Gearbox("scope")
	near(t, "full scale", box.FullScalePeak, 4.92, 0)
	near(t, "standard uncertainty", *box.ScaleU, 0.0025, 1e-15) // 0.5 % at k = 2
	if box.DC || !scope.DC || box.Coupling != "ac" || box.Calibrated != "2026-11-12" || box.FullScale != "4.92 V peak" {
		t.Errorf("box: %+v", box)
	}
	near(t, "offset", scope.OffsetU, 0.001, 1e-15)
	near(t, "clock", box.Gear.Clock, 50e-6, 1e-18)
	two := box.For(2)
	// 13 dBu is sqrt(0.6) V x 10^(13/20) = 3.4600 V RMS, 4.8932 V peak.
	near(t, "channel 2", two.FullScalePeak, math.Sqrt2*math.Sqrt(0.6)*math.Pow(10, 13.0/20), 1e-12)
	if two.ScaleU != nil || !two.OwnScale || two.Calibrated != "2026-11-12" || two.DC {
		t.Errorf("channel 2: %+v", two)
	}
	if box.For(1) != box.Gear {
		t.Error("channel 1 has an entry of its own")
	}

	tone := j.Takes[0]
	if tone.Name != "tone" || tone.File != "takes/tone.wav" || tone.Path != filepath.Join("testdata", "takes", "tone.wav") || tone.Gear != box.Gear {
		t.Errorf("tone: %+v", tone)
	}
	if tone.Wiring.Out != "1" || tone.Wiring.In != "2" || tone.Wiring.Span.From != 0.5 || tone.Wiring.Span.To != 7.5 {
		t.Errorf("tone is wired %+v", tone.Wiring)
	}
	if v, ok := tone.Condition("source"); !ok || v != "150 ohm" || tone.Where[0].Key != "gain" {
		t.Errorf("tone where: %v", tone.Where)
	}
	if j.Takes[1].Gear != box.Gear {
		t.Error("the default gear was not taken")
	}

	var rows []Row
	for _, c := range j.Checks {
		rows = append(rows, c.Rows()...)
	}
	want := []struct {
		name     string
		min, max string
	}{
		{"Gain at the 40 dB step", "39.5 dB", "40.5 dB"},
		{"Gain steps: g20", "19.5 dB", "20.5 dB"}, {"Gain steps: g30", "29.5 dB", "30.5 dB"}, {"Gain steps: g40", "39.5 dB", "40.5 dB"},
		{"Supply rail", "14.5 V", "15.5 V"},
	}
	if len(rows) != len(want) {
		t.Fatalf("%d rows", len(rows))
	}
	for i, w := range want {
		if rows[i].Name != w.name || rows[i].Limits.Min.Text != w.min || rows[i].Limits.Max.Text != w.max {
			t.Errorf("row %d: %q %v %v", i, rows[i].Name, rows[i].Limits.Min, rows[i].Limits.Max)
		}
	}
	if c := j.Checks[0]; len(c.Params.At) != 1 || c.Params.At[0] != 1042 || c.Line != path+":61" || rows[0].Roles()["take"][0] != tone {
		t.Errorf("check: %+v", c)
	}
	if rows[2].Roles()["take"][0].Name != "g30" {
		t.Error("a row of each reads another take")
	}
	if p := j.Checks[2].Params; p.Value.Number != 14.98 || p.Uncertainty.Number != 0.02 || p.With != "bench meter" {
		t.Errorf("entered: %+v", p)
	}
	if raw, _ := os.ReadFile(path); len(j.Sources) != 1 || string(j.Sources[0].Data) != string(raw) {
		t.Error("the bytes of the job were not kept")
	}
}

// fakeHeaders answers for every path that ends in .wav (two channels) or .csv
// (time, CH1, CH2).
func fakeHeaders(path string, _ recording.Options) (*recording.Info, error) {
	switch {
	case strings.HasSuffix(path, ".wav"):
		return &recording.Info{Kind: recording.Audio, Channels: make([]recording.Channel, 2)}, nil
	case strings.HasSuffix(path, ".csv"):
		return &recording.Info{Kind: recording.Scope, Channels: []recording.Channel{
			{Name: "CH1", Full: "CH1 (V)", Unit: "V"}, {Name: "CH2", Full: "CH2 (V)", Unit: "V"}}}, nil
	}
	return nil, os.ErrNotExist
}
