package main

import (
	"bytes"
	"encoding/json"
	"encoding/xml"
	"io"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

func TestLook(t *testing.T) {
	tone, hum, csv := filepath.Join(bench, "tone.wav"), filepath.Join(bench, "hum.wav"), filepath.Join(bench, "offset.csv")
	status, stdout, stderr := call(t, "look", tone, hum, csv)
	if status != 0 || stderr != "" {
		t.Fatalf("status %d: %s", status, stderr)
	}
	for _, part := range []string{"tone.wav", "2 channels", "tone 1042 Hz at ", "nothing clipped", "50 Hz hum", "mains hum, strongest line 50.02", "scope CSV"} {
		if !strings.Contains(stdout, part) {
			t.Errorf("stdout lacks %q:\n%s", part, stdout)
		}
	}
}

// lookDoc is what tests read of look --json.
type lookDoc struct {
	Format int
	Files  []struct {
		File     string
		RateHz   *float64 `json:"rate_hz"`
		Channels *int
		Frames   *int64
		Flags    []struct{ Code string }
		Levels   []struct {
			Channel                        int
			Unit                           string
			Mean, RMS, Min, Max, Peak, Cre *float64
			Lines                          []struct {
				FrequencyHz float64 `json:"frequency_hz"`
				RMS         float64
			}
		}
	}
}

func TestLookJSON(t *testing.T) {
	hum, bad := filepath.Join(bench, "hum.wav"), filepath.Join(bench, "README.md")
	status, stdout, stderr := call(t, "look", "--json", hum, bad)
	if status != 2 || strings.Count(stderr, "\n") != 1 || !strings.Contains(stderr, "README.md") {
		t.Errorf("one bad file of two: status %d, stderr %q", status, stderr)
	}
	var doc lookDoc
	if err := json.Unmarshal([]byte(stdout), &doc); err != nil || doc.Format != 1 || len(doc.Files) != 1 {
		t.Fatalf("%v in %s", err, stdout)
	}
	f := doc.Files[0]
	if f.RateHz == nil || *f.RateHz != 16000 || f.Frames == nil || *f.Frames != 80000 || *f.Channels != 1 || len(f.Flags) != 0 {
		t.Errorf("got %+v", f)
	}
	// truth.json: the mains fundamental is 4 mV RMS in 4 V peak at full scale,
	// at 50.0233 Hz; -60 dB of full scale.
	l := f.Levels[0]
	if l.Unit != "FS" || len(l.Lines) == 0 || math.Abs(l.Lines[0].RMS-0.001) > 2e-6 || math.Abs(l.Lines[0].FrequencyHz-50.0233) > 0.01 {
		t.Errorf("strongest line: %+v", l)
	}
	if *l.Peak != math.Max(*l.Max, -*l.Min) {
		t.Errorf("peak %g of %g .. %g", *l.Peak, *l.Min, *l.Max)
	}
	if status, stdout, _ := call(t, "look", "--json", bad); status != 2 || stdout != "" {
		t.Errorf("nothing readable: status %d, stdout %q", status, stdout)
	}
}

func TestLookPlot(t *testing.T) {
	file := filepath.Join(t.TempDir(), "tone.svg")
	tone := filepath.Join(bench, "tone.wav")
	if status, _, stderr := call(t, "look", tone, "--plot", file); status != 0 || stderr != "" {
		t.Fatalf("status %d: %s", status, stderr)
	}
	data, err := os.ReadFile(file)
	if err != nil {
		t.Fatal(err)
	}
	d := xml.NewDecoder(bytes.NewReader(data))
	drawings := 0
	for {
		tok, err := d.Token()
		if err == io.EOF {
			break
		}
		if err != nil {
			t.Fatalf("no XML: %v", err)
		}
		if e, ok := tok.(xml.StartElement); ok && e.Name.Local == "svg" {
			drawings++
		}
	}
	if drawings != 5 { // the document, waveform and spectrum of two channels
		t.Errorf("%d drawings", drawings)
	}
	for _, part := range []string{"1.042 kHz", "Frequency", "Waveform"} {
		if !strings.Contains(strings.ToLower(string(data)), strings.ToLower(part)) {
			t.Errorf("the drawing lacks %q", part)
		}
	}
	for _, args := range [][]string{{"look", tone, tone, "--plot", file}, {"look", tone, "--plot", "x.png"}} {
		if status, stdout, stderr := call(t, args...); status != 2 || stdout != "" || !strings.Contains(stderr, "--plot") {
			t.Errorf("%q: status %d, %q", args, status, stderr)
		}
	}
	if status, stdout, stderr := call(t, "look", tone, "--plot", filepath.Join(t.TempDir(), "none", "x.svg")); status != 2 || !strings.Contains(stderr, "x.svg") {
		t.Errorf("an unwritable plot: status %d, %q, %q", status, stdout, stderr)
	}
}
