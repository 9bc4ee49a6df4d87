package sim

import (
	"bytes"
	"embed"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
)

//go:embed jobs/preamp.toml jobs/cable.toml
var jobs embed.FS

// take is one recording of the demo.
type take struct {
	job, file string // "preamp", "takes/tone20.wav"
	write     func(path string) error
}

// WriteDemo writes the demo's two jobs with their recordings, DIR/preamp and
// DIR/cable, and returns the paths of the job files. The bytes are the same
// every time. A folder that holds something else is left alone: error.
func WriteDemo(dir string) ([]string, error) {
	var paths []string
	texts := map[string][]byte{}
	for _, job := range []string{"preamp", "cable"} {
		text, err := jobs.ReadFile("jobs/" + job + ".toml")
		if err != nil {
			return nil, err
		}
		path := filepath.Join(dir, job, job+".toml")
		if err := free(path, text); err != nil {
			return nil, err
		}
		paths, texts[path] = append(paths, path), text
	}
	for _, path := range paths {
		if err := os.MkdirAll(filepath.Join(filepath.Dir(path), "takes"), 0o755); err != nil {
			return nil, err
		}
		// The job first: a demo that was cut short is recognised by it.
		if err := os.WriteFile(path, texts[path], 0o644); err != nil {
			return nil, err
		}
	}
	for _, t := range demoTakes() {
		if err := t.write(filepath.Join(dir, t.job, filepath.FromSlash(t.file))); err != nil {
			return nil, err
		}
	}
	return paths, nil
}

// free reports nil when the folder of a job's path is new, empty, or holds the
// demo's own job.
func free(path string, text []byte) error {
	folder := filepath.Dir(path)
	entries, err := os.ReadDir(folder)
	switch {
	case errors.Is(err, fs.ErrNotExist) || err == nil && len(entries) == 0:
		return nil
	case err != nil:
		return err
	}
	if old, err := os.ReadFile(path); err == nil && bytes.Equal(old, text) {
		return nil
	}
	return fmt.Errorf("%s: the folder holds other files, or the demo's job with changes; name another folder for the demo", folder)
}

// The demo's conditions of each take.
const (
	floorS, toneS, commonS, noiseS, cableS, scopeS = 4, 3, 2.5, 6, 8, 2
	testHz                                         = 1042
)

// commonHz are the tones of the common-mode takes: clear of every multiple of
// 50 and 60 Hz.
var commonHz = []float64{137, 1042, 9730}

// demoTakes lists the recordings with their circuits. Seeds differ, so that no
// two takes share noise; the supply has another frequency and phase in each.
func demoTakes() []take {
	wav := func(job, name string, seconds float64, seed uint64, text string, channels ...Source) take {
		return take{job, "takes/" + name + ".wav", func(path string) error {
			return skerryRecorder(seed).Record(path, seconds, text, channels...)
		}}
	}
	// idle is a recorder input closed with 150 ohm.
	idle := func(seed uint64) Source { return Noise{Density: Thermal(sourceOhm, RoomK), Seed: seed} }

	// tone and mode are takes with a drive: output and what drives it.
	tone := func(name string, a arms, emf float64, seed uint64) take {
		out, in := skerryPreamp(a, demoMains(seed)).Driven(generator(emf, testHz), Differential(sourceOhm), Pins.Input, seed)
		return wav("preamp", name, toneS, seed, "SP-017, 1042 Hz; left output, right input terminals", out, in)
	}
	mode := func(job, name string, a arms, d Drive, seen func(Pins) complex128, emf float64, seed uint64) take {
		out, in := skerryPreamp(a, demoMains(seed)).Driven(generator(emf, commonHz...), d, seen, seed)
		return wav(job, name, commonS, seed, "137 Hz, 1042 Hz and 9.73 kHz together; left output, right drive", out, in)
	}

	takes := []take{
		wav("preamp", "floor", floorS, 101, "recorder inputs closed with 150 ohm", idle(111), idle(112)),
		tone("tone20", sp017at20, 0.215, 102),
		tone("tone30", sp017at30, 0.066, 103),
		tone("tone40", sp017at40, 0.0216, 104),
		wav("preamp", "noise40", noiseS, 105, "SP-017, 40 dB, input closed with 150 ohm; left output",
			skerryPreamp(sp017at40, demoMains(105)).Quiet(sourceOhm, 105), idle(115)),
		mode("preamp", "pair20", sp017at20, Differential(sourceOhm), Pins.Input, 0.032, 106),
		mode("preamp", "joined20", sp017at20, Common(0), Pins.HotLeg, 0.5, 107),
		mode("preamp", "pair40", sp017at40, Differential(sourceOhm), Pins.Input, 0.0032, 108),
		mode("preamp", "joined40", sp017at40, Common(0), Pins.HotLeg, 0.5, 109),
		{"preamp", "takes/dc.csv", func(path string) error {
			supply := demoMains(110)
			return skerryScope(110).Record(path, scopeS,
				skerryPreamp(sp017at40, supply).Quiet(sourceOhm, 110), rail(supply))
		}},

		wav("cable", "socket", noiseS, 201, "SP-016, 40 dB, 150 ohm in its own socket; left output, right mains wire",
			skerryPreamp(sp016at40, demoMains(201)).Quiet(sourceOhm, 201), mainsWire(demoMains(201))),
		wav("cable", "run", cableS, 202, "SP-016, 40 dB, 85 m run, 150 ohm at the far end; left output, right mains wire",
			onTheRun(202), mainsWire(demoMains(202))),
		mode("cable", "pair", sp016at40, skerryCable.Load(Differential(sourceOhm)), Pins.Input, 0.0032, 203),
		mode("cable", "joined", sp016at40, skerryCable.Load(Common(sourceOhm)), Pins.HotLeg, 0.5, 204),
	}
	return takes
}

// demoMains is the supply during the take of that seed.
func demoMains(seed uint64) Mains {
	k := float64(seed % 10)
	return skerryMains(49.982+0.003*k, 0.37*k)
}

// rail is the positive rail with its ripple, V: full-wave, 2.2 mV at twice the
// supply's frequency.
func rail(supply Mains) Source {
	return Sum{DC(14.98), supply.With(
		Line{Order: 2, RMS: 2.2e-3, Turns: 0.2}, Line{Order: 4, RMS: 0.55e-3, Turns: 0.45}, Line{Order: 6, RMS: 0.25e-3, Turns: 0.7},
	)}
}

// receiver is SP-016 at the end of the run: the pair's pick-up adds to its own
// hum, both as EMFs in series with the source.
func receiver(supply Mains) Preamp {
	p := skerryPreamp(sp016at40, supply)
	p.InputHum.Harmonics = append(p.InputHum.Harmonics, skerryCable.Induced(shieldCurrent(supply)).Harmonics...)
	return p
}

// onTheRun is the receiver's output with the run connected and 150 ohm at its
// far end.
func onTheRun(seed uint64) Source {
	return receiver(demoMains(seed)).Quiet(sourceOhm+skerryCable.LoopOhm(), seed)
}
