package sim

import (
	"crypto/sha256"
	"io/fs"
	"math"
	"math/cmplx"
	"os"
	"path/filepath"
	"regexp"
	"slices"
	"strings"
	"testing"

	"benchslip/capture/recording"
	"benchslip/capture/wav"
)

// demo is written once for all tests.
var demo string

func TestMain(m *testing.M) {
	dir, err := os.MkdirTemp("", "demo")
	if err != nil {
		panic(err)
	}
	if _, err := WriteDemo(dir); err != nil {
		panic(err)
	}
	demo = dir
	code := m.Run()
	os.RemoveAll(dir)
	os.Exit(code)
}

// hashes lists the files below dir with the hash of their bytes.
func hashes(t *testing.T, dir string) (list []string, bytes int64) {
	t.Helper()
	err := filepath.WalkDir(dir, func(path string, d fs.DirEntry, err error) error {
		if err != nil || d.IsDir() {
			return err
		}
		b, err := os.ReadFile(path)
		if err != nil {
			return err
		}
		h := sha256.Sum256(b)
		rel, _ := filepath.Rel(dir, path)
		list, bytes = append(list, filepath.ToSlash(rel)+" "+string(h[:])), bytes+int64(len(b))
		return nil
	})
	if err != nil {
		t.Fatal(err)
	}
	return list, bytes
}

func TestDemoIsTheSameEveryTime(t *testing.T) {
	dir := t.TempDir()
	paths, err := WriteDemo(dir)
	if err != nil {
		t.Fatal(err)
	}
	if len(paths) != 2 || filepath.Base(paths[0]) != "preamp.toml" || filepath.Base(paths[1]) != "cable.toml" {
		t.Errorf("jobs %v", paths)
	}
	one, size := hashes(t, demo)
	two, _ := hashes(t, dir)
	if !slices.Equal(one, two) {
		t.Error("two demos differ")
	}
	if size > 40e6 {
		t.Errorf("%d bytes, wanted at most 40 MB", size)
	}
}

func TestDemoLeavesOthersAlone(t *testing.T) {
	dir := t.TempDir()
	path := filepath.Join(dir, "cable", "cable.toml")
	os.MkdirAll(filepath.Dir(path), 0o755)
	os.WriteFile(path, []byte("mine"), 0o644)
	if _, err := WriteDemo(dir); err == nil || !strings.Contains(err.Error(), filepath.Join(dir, "cable")) {
		t.Errorf("error %v, wanted one that names the folder", err)
	}
	if b, _ := os.ReadFile(path); string(b) != "mine" {
		t.Error("the file was overwritten")
	}
	if _, err := os.Stat(filepath.Join(dir, "preamp")); err == nil {
		t.Error("half of the demo was written")
	}
}

// TestJobsNameTheTakes: every recording stands in its job and every file a job
// names is there.
func TestJobsNameTheTakes(t *testing.T) {
	for _, job := range []string{"preamp", "cable"} {
		text, err := os.ReadFile(filepath.Join(demo, job, job+".toml"))
		if err != nil {
			t.Fatal(err)
		}
		var named, there []string
		for _, m := range regexp.MustCompile(`(?m)^file\s*=\s*"(.*)"`).FindAllStringSubmatch(string(text), -1) {
			named = append(named, m[1])
		}
		files, _ := filepath.Glob(filepath.Join(demo, job, "takes", "*"))
		for _, f := range files {
			there = append(there, "takes/"+filepath.Base(f))
		}
		slices.Sort(named)
		if len(named) < 4 || !slices.Equal(named, there) {
			t.Errorf("%s names %v, there are %v", job, named, there)
		}
	}
}

// volts reads a demo recording, in V by the recorder's true calibration.
func volts(t *testing.T, job, name string) [][]float64 {
	t.Helper()
	rec, err := wav.Open(filepath.Join(demo, job, "takes", name+".wav"))
	if err != nil {
		t.Fatal(err)
	}
	defer rec.Close()
	x, err := recording.ReadAll(rec)
	if err != nil {
		t.Fatal(err)
	}
	r := skerryRecorder(0)
	for c := range x {
		for i := range x[c] {
			x[c][i] *= r.FullScalePeak / (1 + r.Match[c])
		}
	}
	return x
}

// heard is a generator's tone as it stands in a file, Hz.
func heard(f float64) float64 { return skerryRecorder(0).Apparent(f * (1 - 12e-6)) }

func truth(t *testing.T, job, check string) float64 {
	t.Helper()
	for _, v := range Truths() {
		if v.Job == job && v.Check == check {
			return v.Value
		}
	}
	t.Fatalf("no truth for %s, %q", job, check)
	return 0
}

// TestRecordingsHoldTheTruth fits the demo's recordings with the plain
// least squares of this file's neighbours and compares with the circuits.
func TestRecordingsHoldTheTruth(t *testing.T) {
	tone := heard(testHz)
	for _, name := range []string{"tone20", "tone30", "tone40"} {
		x := volts(t, "preamp", name)
		out, _ := fit(x[0], recordHz, tone)
		in, _ := fit(x[1], recordHz, tone)
		within(t, name, decibel(cmplx.Abs(out[0]/in[0])), truth(t, "preamp", "Gain steps: "+name), 1e-3)
	}

	x := volts(t, "preamp", "tone40")
	in, _ := fit(x[1], recordHz, tone)
	u, _ := fit(x[0], recordHz, tone, 2*tone, 3*tone)
	within(t, "phase", cmplx.Phase(u[0]/in[0])*180/math.Pi, truth(t, "preamp", "Phase at 1 kHz"), 0.01)
	// The line noise in 4 s is 0.3 uV against harmonics of 45 and 20 uV.
	near(t, "THD", 100*math.Hypot(cmplx.Abs(u[1]), cmplx.Abs(u[2]))/cmplx.Abs(u[0]), truth(t, "preamp", "THD at +8 dBu"), 0.03)

	// Noise over the whole 24 kHz: the white part, its 1/f part from the
	// recorder's 3 Hz corner up, the hum, the recorder's own noise.
	x = volts(t, "preamp", "noise40")
	p := skerryPreamp(sp017at40, demoMains(105))
	n := p.Noise(sourceOhm, 0)
	own := skerryRecorder(0).NoiseDensity * math.Sqrt(24000)
	want := math.Hypot(math.Hypot(n.BandRMS(3, 24000), p.Hum(sourceOhm).Total()), own)
	near(t, "noise", rms(x[0]), want, 4*math.Sqrt(1/(2.0*noiseS*48000)))

	for _, step := range []struct {
		pair, joined string
		arms         arms
	}{{"pair20", "joined20", sp017at20}, {"pair40", "joined40", sp017at40}} {
		freqs := []float64{heard(137), heard(1042), heard(9730)}
		gains := func(name string) []complex128 {
			x := volts(t, "preamp", name)
			out, _ := fit(x[0], recordHz, freqs...)
			in, _ := fit(x[1], recordHz, freqs...)
			for i := range out {
				out[i] /= in[i]
			}
			return out
		}
		d, c := gains(step.pair), gains(step.joined)
		amp := skerryPreamp(step.arms, demoMains(0)).Amp
		for i, f := range commonHz {
			// At 40 dB, 137 Hz the output is 0.1 mV; the line noise of 0.4 uV
			// makes 0.03 dB of it, here three times that.
			within(t, "CMRR", decibel(cmplx.Abs(d[i]/c[i])), decibel(amp.CMRR(f)), 0.1)
		}
	}
}

// TestFailingResistorIsWhatTheDemoShows: with the right part in R4 the 20 dB
// step would pass its 65 dB, with the 1 % part it cannot.
func TestFailingResistorIsWhatTheDemoShows(t *testing.T) {
	bad := skerryPreamp(sp017at20, demoMains(0)).Amp
	good := bad
	good.R4 = 10000 * 0.999 // the far end of a 0.1 % part
	if decibel(bad.CMRR(testHz)) > 64 || decibel(good.CMRR(testHz)) < 66 {
		t.Errorf("CMRR %.2f dB as built, %.2f dB with the right part: wanted them on both sides of 65 dB",
			decibel(bad.CMRR(testHz)), decibel(good.CMRR(testHz)))
	}
	near(t, "mismatch", bad.Mismatch(), 0.0082, 0.1)
}
