package main

import (
	"encoding/json"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"benchslip/capture"
	"benchslip/cmd/benchslip/internal/sim"
)

// The whole way, as someone at a bench goes it: plan, write the files to play,
// play them through a unit into a recorder whose clock is 60 ppm off and that
// starts 3.7 ms early, calibrate, run, compare with another unit, recheck. The
// unit's gain and distortion are known from its curve.

const (
	loopPPM    = 60.0
	loopDelayS = 3.7e-3
	loopFull   = 4.92 * 1.0021 // V at digital full scale of the simulated recorder
	playerV    = 0.02          // V peak at digital full scale of the player, behind a pad
)

const loopJob = `format = 1
title = "A unit nobody has seen"
include = ["gear.toml"]
[unit]
serial = "SERIAL"
[mains]
frequency = "50 Hz"
[defaults]
gear = "box"
[takes.tone]
file = "takes/tone.wav"
in = 2
span = "0.8 s .. 3.8 s"
stimulus = "tone at=1042Hz length=4s before=500ms after=500ms peak=-3dBFS"
where = { gain = "40 dB" }
[takes.sweep]
file = "takes/sweep.wav"
in = 2
stimulus = "sweep from=20Hz to=20kHz length=4s before=500ms after=500ms peak=-3dBFS"
where = { gain = "40 dB" }
[takes.quiet]
file = "takes/quiet.wav"
where = { gain = "40 dB" }
[[checks]]
name = "Gain"
measure = "gain"
take = "tone"
at = "1042 Hz"
nominal = "40 dB"
within = "1 dB"
[[checks]]
name = "Level"
measure = "level"
take = "tone"
max = "2 V"
[[checks]]
name = "THD"
measure = "thd"
take = "tone"
at = "1042 Hz"
max = "0.1 %"
[[checks]]
name = "Clock"
measure = "tone_frequency"
take = "tone"
at = "1042 Hz"
[[checks]]
name = "Flatness"
measure = "flatness"
take = "sweep"
band = "30 Hz .. 15 kHz"
max = "0.2 dB"
[[checks]]
name = "Noise"
measure = "noise"
take = "quiet"
max = "1 mV"
`

// playing is a stimulus file played from time delay on, V at digital full
// scale volts: its samples with a windowed sinc between them, as behind a
// player's filter.
type playing struct {
	x           []float64
	rate, delay float64
	volts       float64
}

func play(t *testing.T, path string, volts float64) playing {
	t.Helper()
	rec, err := capture.Open(path, capture.Options{})
	if err != nil {
		t.Fatal(err)
	}
	defer rec.Close()
	in := rec.Info()
	p := playing{make([]float64, in.Frames), in.RateHz, loopDelayS, volts}
	if _, err := rec.ReadAt([][]float64{p.x, nil}, 0); err != nil {
		t.Fatal(err)
	}
	return p
}

// Add implements sim.Source. Kaiser window, beta 9: stop band below -90 dB.
func (p playing) Add(dst []float64, g *sim.Grid) {
	const half, beta, steps = 24, 9.0, 512
	bessel := func(x float64) float64 {
		sum, term := 1.0, 1.0
		for k := 1.0; k < 40; k++ {
			term *= x / 2 / k * x / 2 / k
			sum += term
		}
		return sum
	}
	window := make([]float64, half*steps+2)
	for i := range window {
		r := math.Min(1, float64(i)/(half*steps))
		window[i] = bessel(beta*math.Sqrt(1-r*r)) / bessel(beta)
	}
	for i, s := range g.T {
		at := (s - p.delay) * p.rate
		k0 := int(math.Floor(at)) - half + 1
		// sin(pi(at - k)) alternates in sign from sample to sample.
		sine := math.Sin(math.Pi*(at-float64(k0))) / math.Pi
		for k := k0; k < k0+2*half; k++ {
			if k >= 0 && k < len(p.x) && p.x[k] != 0 {
				d := at - float64(k)
				w := math.Abs(d) * steps
				j := int(w)
				weight := window[j] + (w-float64(j))*(window[j+1]-window[j])
				if math.Abs(d) < 1e-9 {
					dst[i] += p.volts * p.x[k]
				} else {
					dst[i] += p.volts * p.x[k] * sine / d * weight
				}
			}
			sine = -sine
		}
	}
}

// unit is a gain with a little second and third order.
type loopUnit struct{ gain, k2, k3 float64 }

func (u loopUnit) out(in sim.Source) sim.Source {
	amplified := sim.Func(func(dst []float64, g *sim.Grid) {
		x := make([]float64, len(dst))
		in.Add(x, g)
		for i := range x {
			dst[i] += u.gain * x[i]
		}
	})
	return sim.Sum{sim.Curve{K2: u.k2, K3: u.k3, Of: amplified}, sim.Noise{Density: 5e-7, Seed: 3}}
}

func loopRecorder(seed uint64) sim.Recorder {
	return sim.Recorder{RateHz: 48000, Bits: 24, FullScalePeak: loopFull, NoiseDensity: 40e-9, LowCutHz: 1, PPM: loopPPM, Seed: seed}
}

// loopFolder makes the folder of one unit, records what the plan asks for and
// runs the job; it returns the slip.
func loopFolder(t *testing.T, serial string, u loopUnit, gear string) (slip string) {
	t.Helper()
	dir := t.TempDir()
	path := filepath.Join(dir, "unit.toml")
	for name, text := range map[string]string{path: strings.Replace(loopJob, "SERIAL", serial, 1), filepath.Join(dir, "gear.toml"): gear} {
		if err := os.WriteFile(name, []byte(text), 0o666); err != nil {
			t.Fatal(err)
		}
	}
	if err := os.Mkdir(filepath.Join(dir, "takes"), 0o777); err != nil {
		t.Fatal(err)
	}
	if status, _, stderr := call(t, "stimulus", path); status != 0 {
		t.Fatal(stderr)
	}
	for i, k := range planJSON(t, path) {
		if !k.Missing {
			t.Errorf("%s is planned as recorded", k.Name)
		}
		var in sim.Source = sim.Noise{Density: 1.6e-9, Seed: 9} // 150 ohm
		seconds := 3.0
		if k.Stimulus != "" {
			p := play(t, filepath.Join(dir, filepath.FromSlash(k.Stimulus)), playerV)
			in, seconds = p, float64(len(p.x))/p.rate
		}
		if err := loopRecorder(uint64(100+i)).Record(filepath.Join(dir, filepath.FromSlash(k.File)), seconds, "", u.out(in), in); err != nil {
			t.Fatal(err)
		}
	}
	for _, k := range planJSON(t, path) {
		if k.Missing {
			t.Errorf("%s is still missing", k.Name)
		}
	}
	if status, stdout, stderr := call(t, "run", path); status != 0 || stderr != "" {
		t.Errorf("run: status %d, %s\n%s", status, stderr, stdout)
	}
	return filepath.Join(dir, "slip", "slip.json")
}

// calibrated records a tone at two levels with a meter across the input, and
// returns the gear entry.
func calibrated(t *testing.T) string {
	t.Helper()
	dir := t.TempDir()
	args := []string{"calibrate", "--gear", "box", "--accuracy", "0.2 %", "--date", "2026-12-01"}
	for i, rms := range []float64{1.3, 0.13} {
		file := filepath.Join(dir, fmt.Sprintf("cal%d.wav", i))
		tone := sim.Tone{FreqHz: 220, RMS: rms, Turns: 0.1}
		if err := loopRecorder(uint64(50+i)).Record(file, 2, "", tone); err != nil {
			t.Fatal(err)
		}
		args = append(args, file, "--reading", fmt.Sprintf("%.5f V", rms))
	}
	status, stdout, stderr := call(t, args...)
	if status != 0 || stderr != "" {
		t.Fatalf("calibrate: status %d, %s", status, stderr)
	}
	return stdout
}

func TestFromPlanToTicket(t *testing.T) {
	if testing.Short() {
		t.Skip("simulates two units")
	}
	gear := calibrated(t)
	u := loopUnit{gain: 98.7, k2: 2e-4, k3: 1e-4}
	good := loopFolder(t, "A1", u, gear)

	// The truth, from the curve: peak 0.02 V x 10^(-3/20) x gain before it.
	a := playerV * math.Pow(10, -3.0/20) * u.gain
	h := sim.Curve{K2: u.k2, K3: u.k3}.HarmonicsOf(a)
	truth := map[string]float64{
		"Gain":     20 * math.Log10(u.gain*h[1]/a),
		"Level":    h[1] / math.Sqrt2,
		"THD":      100 * math.Hypot(h[2], h[3]) / h[1],
		"Clock":    1042 / (1 + loopPPM*1e-6),
		"Flatness": 0,
		// In mV, as its limit; from 20 Hz to 20 kHz, the source's 1.6 nV amplified beside 0.5 uV.
		"Noise": 1000 * math.Hypot(5e-7, 1.6e-9*u.gain) * math.Sqrt(19980),
	}
	var doc struct {
		Checks []struct {
			Name               string
			Value, Uncertainty *float64
			Details            map[string]any
		}
	}
	data, err := os.ReadFile(good)
	if err != nil {
		t.Fatal(err)
	}
	if err := json.Unmarshal(data, &doc); err != nil {
		t.Fatal(err)
	}
	for _, c := range doc.Checks {
		if c.Value == nil || c.Uncertainty == nil {
			t.Errorf("%s: no value", c.Name)
			continue
		}
		// 1.5 U: one row of a dozen may lie a little beyond U.
		slack := 1.5 * *c.Uncertainty
		if c.Name == "Flatness" {
			slack = 0.003 // dB: what a few microvolts of noise leave of the largest deviation
		}
		if math.Abs(*c.Value-truth[c.Name]) > slack {
			t.Errorf("%s: %.7g +- %.2g, wanted %.7g", c.Name, *c.Value, *c.Uncertainty, truth[c.Name])
		}
		if ppm, ok := c.Details["ppm"].(float64); ok && math.Abs(ppm+loopPPM) > 0.1 {
			t.Errorf("the clock reads %.3f ppm off, wanted %g", ppm, -loopPPM)
		}
	}

	// Another unit, 0.3 dB low and three times as bent.
	other := loopFolder(t, "A2", loopUnit{gain: 98.7 / math.Pow(10, 0.3/20), k2: 6e-4, k3: 3e-4}, gear)
	status, stdout, stderr := call(t, "compare", good, other, "--json")
	var cmp struct {
		Checks []struct {
			Name        string
			Difference  float64
			Significant bool
			State       string
		}
	}
	if err := json.Unmarshal([]byte(stdout), &cmp); err != nil || status != 1 {
		t.Fatalf("compare: status %d, %v, %s", status, err, stderr)
	}
	for _, c := range cmp.Checks {
		switch c.Name {
		case "Gain":
			if math.Abs(c.Difference+0.3) > 0.01 || !c.Significant {
				t.Errorf("gain: %.4f dB, significant %v", c.Difference, c.Significant)
			}
		case "THD":
			if c.State != "worse" {
				t.Errorf("THD: %s", c.State)
			}
		}
	}
	if status, _, _ := call(t, "compare", good, good); status != 0 {
		t.Errorf("compare with itself: status %d", status)
	}
	if status, stdout, stderr := call(t, "recheck", good); status != 0 || !strings.HasPrefix(stdout, "same") {
		t.Errorf("recheck: status %d, %q, %q", status, stdout, stderr)
	}
}
