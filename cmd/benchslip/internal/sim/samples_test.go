package sim

import (
	"bytes"
	"encoding/json"
	"flag"
	"math"
	"math/cmplx"
	"os"
	"path/filepath"
	"testing"

	"benchslip/capture/recording"
	"benchslip/capture/wav"
)

var update = flag.Bool("update", false, "write the small recordings of testdata/bench again")

// known is a value that a small recording holds, from the circuit or signal it
// was made of. Take, At and Channel say where; Tolerance is absolute, about
// five standard deviations of an efficient estimator, or the model's own limit.
type known struct {
	Measure   string  `json:"measure"`
	File      string  `json:"file"`
	Common    string  `json:"common,omitempty"` // cmrr: the other take
	Channel   int     `json:"channel,omitempty"`
	In        int     `json:"in,omitempty"`
	AtHz      float64 `json:"at_hz,omitempty"`
	Order     int     `json:"order,omitempty"`
	LowHz     float64 `json:"low_hz,omitempty"`
	HighHz    float64 `json:"high_hz,omitempty"`
	Value     float64 `json:"value"`
	Unit      string  `json:"unit"`
	Tolerance float64 `json:"tolerance"`
	From      string  `json:"from"` // where the value comes from
}

const benchFolder = "../../../../testdata/bench"

// small describes the recordings of testdata/bench: 16 kHz, 24 bits, the full
// scale exactly 4 V, so that no calibration stands between file and truth.
func small(dir string) ([]known, error) {
	rec := func(seed uint64) Recorder {
		return Recorder{RateHz: 16000, Bits: 24, FullScalePeak: 4, NoiseDensity: 60e-9, PPM: 42, WanderPPM: 0.1, WanderS: 5, Seed: seed}
	}
	supply := Mains{FreqHz: 50.021, DriftHz: 0.008, DriftS: 9, StartTurns: 0.2}
	unit := skerryPreamp(sp017at20, supply)
	unit.Output.LoadOhm = 0
	unit.Output.K2, unit.Output.K3 = 1.4e-4, 4e-5

	var list []known
	record := func(name string, seconds float64, seed uint64, channels ...Source) error {
		return rec(seed).Record(filepath.Join(dir, name), seconds, "", channels...)
	}

	// A tone through the difference amplifier; channel 2 its input.
	const emf = 0.12
	out, in := unit.Driven(Tones{{FreqHz: testHz, RMS: emf, Turns: 0.1}}, Differential(sourceOhm), Pins.Input, 301)
	if err := record("tone.wav", 3, 301, out, in); err != nil {
		return nil, err
	}
	g := unit.Gain(testHz, sourceOhm)
	before := math.Sqrt2 * emf * cmplx.Abs(unit.Amp.Solve(testHz, Differential(sourceOhm)).Out)
	h := Curve{K2: unit.Output.K2, K3: unit.Output.K3}.HarmonicsOf(before)
	gain := cmplx.Abs(g) * h[1] / before // the curve's share of the fundamental
	line := unit.Noise(sourceOhm, 0).At(testHz) / math.Sqrt(3)
	list = append(list,
		known{Measure: "gain", File: "tone.wav", Channel: 1, In: 2, AtHz: testHz, Value: decibel(gain), Unit: "dB", Tolerance: 1e-4, From: "R1..R4, op-amp bandwidth, curve"},
		known{Measure: "phase", File: "tone.wav", Channel: 1, In: 2, AtHz: testHz, Value: cmplx.Phase(g) * 180 / math.Pi, Unit: "deg", Tolerance: 1e-3, From: "R1..R4, C2, C4, op-amp bandwidth"},
		known{Measure: "tone_frequency", File: "tone.wav", Channel: 1, Value: rec(0).Apparent(testHz), Unit: "Hz", Tolerance: testHz * 2e-7, From: "42 ppm of the recorder's crystal; wander 0.1 ppm"},
		known{Measure: "harmonic", File: "tone.wav", Channel: 1, AtHz: testHz, Order: 2, Value: decibel(h[2] / h[1]), Unit: "dB", Tolerance: 5 * 8.7 * line * math.Sqrt2 / h[2], From: "K2 A^2/2"},
		known{Measure: "harmonic", File: "tone.wav", Channel: 1, AtHz: testHz, Order: 3, Value: decibel(h[3] / h[1]), Unit: "dB", Tolerance: 5 * 8.7 * line * math.Sqrt2 / h[3], From: "K3 A^3/4"},
		known{Measure: "thd", File: "tone.wav", Channel: 1, AtHz: testHz, Value: 100 * math.Hypot(h[2], h[3]) / h[1], Unit: "%", Tolerance: 100 * 5 * line * math.Sqrt2 / h[1], From: "K2, K3"},
	)

	// Common mode of the same amplifier.
	drive := func(rms float64) Tones { return Tones{{FreqHz: testHz, RMS: rms, Turns: 0.4}} }
	out, in = unit.Driven(drive(0.1), Differential(0), Pins.Input, 302)
	if err := record("pair.wav", 2, 302, out, in); err != nil {
		return nil, err
	}
	out, in = unit.Driven(drive(1), Common(0), Pins.HotLeg, 303)
	if err := record("joined.wav", 2, 303, out, in); err != nil {
		return nil, err
	}
	list = append(list, known{Measure: "cmrr", File: "pair.wav", Common: "joined.wav", Channel: 1, In: 2, AtHz: testHz,
		Value: decibel(unit.Amp.CMRR(testHz)), Unit: "dB", Tolerance: 1e-3, From: "R1..R4, C2, C4"})

	// A drifting comb in white noise, one channel.
	comb := supply.With(Line{Order: 1, RMS: 4e-3, Turns: 0.1}, Line{Order: 3, RMS: 1.5e-3, Turns: 0.3},
		Line{Order: 5, RMS: 0.6e-3, Turns: 0.55}, Line{Order: 9, RMS: 0.2e-3, Turns: 0.8})
	hiss := Noise{Density: 4e-6, Seed: 304}
	if err := record("hum.wav", 5, 304, Sum{comb, hiss}); err != nil {
		return nil, err
	}
	heardHz := supply.MeanHz(0, 5) / (1 + 42e-6)
	list = append(list,
		known{Measure: "mains_frequency", File: "hum.wav", Channel: 1, Value: heardHz, Unit: "Hz", Tolerance: 1e-3, From: "the comb's phase over 5 s, 42 ppm of the recorder; blocks of 1 s leave 0.2 mHz"},
		known{Measure: "hum", File: "hum.wav", Channel: 1, Value: comb.Total(), Unit: "V", Tolerance: 1e-5, From: "root of the sum of the lines' squares"},
		known{Measure: "noise", File: "hum.wav", Channel: 1, LowHz: 20, HighHz: 7000,
			Value: math.Sqrt(hiss.BandRMS(20, 7000)*hiss.BandRMS(20, 7000) + 60e-9*60e-9*6980 + comb.Total()*comb.Total()),
			Unit:  "V", Tolerance: 5 * hiss.BandRMS(20, 7000) * math.Sqrt(1/(4*6980.0*5)), From: "density, recorder's noise and lines, as powers"},
		known{Measure: "noise_density", File: "hum.wav", Channel: 1, AtHz: 1000, Value: math.Hypot(4e-6, 60e-9), Unit: "V/rtHz", Tolerance: 4e-6 * 5 * math.Sqrt(1/(4*115.6*5)), From: "as made"},
	)
	for _, l := range comb.Harmonics {
		list = append(list, known{Measure: "hum", File: "hum.wav", Channel: 1, Order: l.Order, Value: l.RMS, Unit: "V", Tolerance: 5 * 4e-6 * math.Sqrt(1/(2*5.0)), From: "as made"})
	}

	// An offset on an 8-bit scope's screen.
	scope := Scope{RateHz: 2000, StartS: -0.1, Bits: 8, Divs: 8, Seed: 305, Inputs: []Probe{{Name: "Output", VoltsPerDiv: 0.01, NoiseRMS: 0.4e-3}}}
	if err := scope.Record(filepath.Join(dir, "offset.csv"), 1, Sum{DC(-7.3e-3), comb}); err != nil {
		return nil, err
	}
	list = append(list, known{Measure: "dc", File: "offset.csv", Channel: 1, Value: -7.3e-3, Unit: "V", Tolerance: 5 * 0.4e-3 / math.Sqrt(2000), From: "as made; 8-bit steps of 0.3125 mV, 0.4 mV of noise"})
	return list, nil
}

// TestSmallRecordings makes the recordings of testdata/bench again and compares
// them with those stored, which other rooms' tests read.
func TestSmallRecordings(t *testing.T) {
	dir := t.TempDir()
	if *update {
		dir = benchFolder
		if err := os.MkdirAll(dir, 0o755); err != nil {
			t.Fatal(err)
		}
	}
	list, err := small(dir)
	if err != nil {
		t.Fatal(err)
	}
	text, err := json.MarshalIndent(list, "", " ")
	if err != nil {
		t.Fatal(err)
	}
	truth := filepath.Join(benchFolder, "truth.json")
	if *update {
		if err := os.WriteFile(truth, append(text, '\n'), 0o644); err != nil {
			t.Fatal(err)
		}
		return
	}
	var stored []known
	b, err := os.ReadFile(truth)
	if err != nil {
		t.Fatal(err)
	}
	if err := json.Unmarshal(b, &stored); err != nil {
		t.Fatal(err)
	}
	if len(stored) != len(list) || len(list) == 0 {
		t.Fatalf("%d values stored, %d made", len(stored), len(list))
	}
	for i, v := range stored {
		near(t, v.File+" "+v.Measure, v.Value, list[i].Value, 1e-9)
	}
	for _, name := range []string{"tone.wav", "pair.wav", "joined.wav", "hum.wav"} {
		sameSamples(t, filepath.Join(benchFolder, name), filepath.Join(dir, name))
	}
	one, err := os.ReadFile(filepath.Join(benchFolder, "offset.csv"))
	if err != nil {
		t.Fatal(err)
	}
	two, _ := os.ReadFile(filepath.Join(dir, "offset.csv"))
	if !bytes.Equal(one, two) {
		t.Error("offset.csv differs")
	}
}

// sameSamples allows one step of 24 bits: processors round differently.
func sameSamples(t *testing.T, a, b string) {
	t.Helper()
	read := func(path string) [][]float64 {
		r, err := wav.Open(path)
		if err != nil {
			t.Fatal(err)
		}
		defer r.Close()
		x, err := recording.ReadAll(r)
		if err != nil {
			t.Fatal(err)
		}
		return x
	}
	x, y := read(a), read(b)
	if len(x) != len(y) || len(x[0]) != len(y[0]) {
		t.Fatalf("%s: another shape", a)
	}
	for c := range x {
		for i := range x[c] {
			if math.Abs(x[c][i]-y[c][i]) > 0x1p-23 {
				t.Fatalf("%s: channel %d, frame %d differs", a, c+1, i)
			}
		}
	}
}

// TestSmallRecordingsHoldTheTruth fits what the stored files say.
func TestSmallRecordingsHoldTheTruth(t *testing.T) {
	list, err := small(t.TempDir())
	if err != nil {
		t.Fatal(err)
	}
	read := func(name string) [][]float64 {
		r, err := wav.Open(filepath.Join(benchFolder, name))
		if err != nil {
			t.Fatal(err)
		}
		defer r.Close()
		x, err := recording.ReadAll(r)
		if err != nil {
			t.Fatal(err)
		}
		for c := range x {
			for i := range x[c] {
				x[c][i] *= 4
			}
		}
		return x
	}
	f := testHz / (1 + 42e-6)
	checked := 0
	for _, v := range list {
		if v.Channel != 1 || v.File == "offset.csv" {
			continue
		}
		x := read(v.File)
		var got float64
		switch v.Measure {
		case "gain", "phase":
			out, _ := fit(x[0], 16000, f)
			in, _ := fit(x[1], 16000, f)
			if got = decibel(cmplx.Abs(out[0] / in[0])); v.Measure == "phase" {
				got = cmplx.Phase(out[0]/in[0]) * 180 / math.Pi
			}
		case "harmonic":
			u, _ := fit(x[0], 16000, f, 2*f, 3*f)
			got = decibel(cmplx.Abs(u[v.Order-1]) / cmplx.Abs(u[0]))
		case "cmrr":
			y := read(v.Common)
			gain := func(x [][]float64) float64 {
				out, _ := fit(x[0], 16000, f)
				in, _ := fit(x[1], 16000, f)
				return cmplx.Abs(out[0] / in[0])
			}
			got = decibel(gain(x) / gain(y))
		default:
			continue // the rooms that read these files answer for the rest
		}
		checked++
		within(t, v.File+" "+v.Measure, got, v.Value, v.Tolerance)
	}
	if checked < 5 {
		t.Errorf("only %d values were checked", checked)
	}
}
