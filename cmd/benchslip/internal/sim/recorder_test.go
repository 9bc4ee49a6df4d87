package sim

import (
	"bytes"
	"encoding/csv"
	"math"
	"math/cmplx"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"testing"

	"benchslip/capture/recording"
	"benchslip/capture/wav"
)

// TestDither: TPDF dither leaves an error of half a step RMS whatever the
// signal (Lipshitz, Wannamaker, Vanderkooy 1992: 1/12 + 2/12 step squared).
func TestDither(t *testing.T) {
	for _, level := range []float64{0, 1e-5, 0.3} {
		r := Recorder{RateHz: 48000, Bits: 16, FullScalePeak: 1, Seed: 3}
		tone := Tone{FreqHz: 1042, RMS: level}
		x := r.Samples(2, tone)[0]
		for i, v := range wave(tone, 48000, len(x)) {
			x[i] -= v
		}
		near(t, "error RMS", rms(x), 0.5/32768, 0.01)
		within(t, "error mean", mean(x), 0, 0.01/32768)
	}
}

func TestConverterStopsAtFullScale(t *testing.T) {
	r := Recorder{RateHz: 8000, Bits: 16, FullScalePeak: 2, Undithered: true}
	x := r.Samples(0.1, Tone{FreqHz: 100, RMS: 2})[0]
	lo, hi := 0.0, 0.0
	for _, v := range x {
		lo, hi = min(lo, v), max(hi, v)
	}
	if lo != -1 || hi != 32767.0/32768 {
		t.Errorf("range %v .. %v, wanted the extreme codes -1 and 32767/32768", lo, hi)
	}
}

// TestClock: a recorder that runs fast by 80 ppm shows a tone 80 ppm low, and
// a clock that wanders by w sin(2 pi t/P) takes frame n late or early by the
// integral of its error.
func TestClock(t *testing.T) {
	r := Recorder{RateHz: 48000, Bits: 32, FullScalePeak: 1, PPM: 80, Undithered: true}
	x := r.Samples(4, Tone{FreqHz: 1000, RMS: 0.5})[0]
	u, rest := fit(x, 48000, r.Apparent(1000))
	near(t, "peak", cmplx.Abs(u[0]), 0.5*math.Sqrt2, 1e-8)
	if rest > 1e-8 {
		t.Errorf("rest %.3g: the tone is not at %.6f Hz", rest, r.Apparent(1000))
	}
	near(t, "apparent frequency", r.Apparent(1000), 999.920006, 1e-9)

	r = Recorder{RateHz: 1000, Bits: 24, FullScalePeak: 1, WanderPPM: 50, WanderS: 8}
	g := r.Grid(10)
	for n := 0; n < len(g.T); n += 500 {
		// counted periods at time T[n]: integral of rate (1 + error)
		count := 1000 * (g.T[n] + 50e-6*8/(2*math.Pi)*(1-math.Cos(2*math.Pi*g.T[n]/8)))
		within(t, "count", count, float64(n), 1e-4)
	}
}

// TestLowCut: half power at the corner, nothing of the DC left when the take
// starts.
func TestLowCut(t *testing.T) {
	r := Recorder{RateHz: 48000, Bits: 32, FullScalePeak: 1, LowCutHz: 10, Undithered: true}
	x := r.Samples(2, Sum{Tone{FreqHz: 10, RMS: 0.1}, DC(0.5)})[0]
	u, _ := fit(x, 48000, 10)
	near(t, "at the corner", cmplx.Abs(u[0]), 0.1, 1e-3)
	within(t, "lead", cmplx.Phase(u[0]), math.Pi/4, 2e-3)
	within(t, "DC", mean(x[:4800]), 0, 1e-5)
	u, _ = fit(r.Samples(1, Tone{FreqHz: 1000, RMS: 0.1})[0], 48000, 1000)
	near(t, "far above", cmplx.Abs(u[0]), 0.1*math.Sqrt2, 1e-4)
}

func TestInputNoiseAndMatch(t *testing.T) {
	r := Recorder{RateHz: 48000, Bits: 24, FullScalePeak: 4, NoiseDensity: 1e-6, Match: []float64{0, 0.01}, Seed: 9}
	x := r.Samples(4, DC(0), DC(0))
	want := 1e-6 * math.Sqrt(24000) / 4
	near(t, "left", rms(x[0]), want, 0.01)
	near(t, "right", rms(x[1]), 1.01*want, 0.01)
	var both float64
	for i := range x[0] {
		both += x[0][i] * x[1][i] / (want * want) / float64(len(x[0]))
	}
	within(t, "correlation of the channels", both, 0, 4/math.Sqrt(float64(len(x[0]))))
}

func TestLeak(t *testing.T) {
	r := Recorder{RateHz: 48000, Bits: 32, FullScalePeak: 1, Leak: 1e-3, Undithered: true}
	x := r.Samples(0.5, DC(0), Tone{FreqHz: 1000, RMS: 0.5})
	near(t, "heard", rms(x[0]), 0.5e-3, 1e-4)
	near(t, "driven", rms(x[1]), 0.5, 1e-4)
}

// TestWAVHoldsTheSamples reads a recording back and compares every code.
func TestWAVHoldsTheSamples(t *testing.T) {
	r := Recorder{RateHz: 44100, Bits: 24, FullScalePeak: 2, NoiseDensity: 1e-7, Seed: 4}
	path := filepath.Join(t.TempDir(), "take.wav")
	sources := []Source{Tone{FreqHz: 997, RMS: 1}, Noise{Density: 1e-5, Seed: 8}}
	if err := r.Record(path, 0.3, "two channels", sources...); err != nil {
		t.Fatal(err)
	}
	rec, err := wav.Open(path)
	if err != nil {
		t.Fatal(err)
	}
	defer rec.Close()
	in := rec.Info()
	if in.RateHz != 44100 || len(in.Channels) != 2 || in.Frames != 13230 || in.Channels[0].Bits != 24 || len(in.Flags) != 0 {
		t.Fatalf("read back %+v", in)
	}
	got, err := recording.ReadAll(rec)
	if err != nil {
		t.Fatal(err)
	}
	for c, want := range r.Samples(0.3, sources...) {
		for i, v := range want {
			if got[c][i] != v {
				t.Fatalf("channel %d, frame %d: %v, wanted %v", c+1, i, got[c][i], v)
			}
		}
	}
}

// TestScope checks steps, edges of the screen, gain and offset errors, and that
// the file's text gives the samples back.
func TestScope(t *testing.T) {
	s := Scope{RateHz: 1e4, StartS: -0.1, Bits: 8, Divs: 8, Seed: 2, Inputs: []Probe{
		{Name: "A", VoltsPerDiv: 0.5, GainError: 0.02, OffsetError: 0.03, NoiseRMS: 0.02},
		{Name: "B", VoltsPerDiv: 0.001, LowCutHz: 10},
	}}
	sources := []Source{DC(0.4), Sum{DC(15), Tone{FreqHz: 1000, RMS: 1e-3}}}
	x := s.Samples(1, sources...)
	near(t, "step", s.Step(0), 4.0/256, 1e-12)
	within(t, "mean", mean(x[0]), 0.4*1.02+0.03, 4*0.02/100+1e-6)
	within(t, "AC-coupled mean", mean(x[1]), 0, 1e-6)
	near(t, "AC-coupled RMS", rms(x[1]), 1e-3, 0.01)
	for c := range x {
		for _, v := range x[c] {
			if k := v / s.Step(c); math.Abs(k-math.Round(k)) > 1e-9 || k < -128 || k > 127 {
				t.Fatalf("input %d: %v V is no code", c+1, v)
			}
		}
	}
	over := s.Samples(0.01, DC(5), DC(0))[0]
	near(t, "edge of the screen", over[0], 127*4.0/256, 1e-12)

	text := s.CSV(1, sources...)
	_, rows, ok := bytes.Cut(text, []byte("\n\n"))
	if !ok {
		t.Fatal("no blank row before the data")
	}
	cells, err := csv.NewReader(bytes.NewReader(rows)).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	if got := strings.Join(cells[0], "|"); got != "Time (s)|A (V)|B (V)" {
		t.Errorf("header %q", got)
	}
	if len(cells) != 10001 {
		t.Fatalf("%d rows, wanted 10001", len(cells))
	}
	for i, row := range cells[1:] {
		var v [3]float64
		for k := range v {
			if v[k], err = strconv.ParseFloat(row[k], 64); err != nil {
				t.Fatal(err)
			}
		}
		within(t, "time", v[0], -0.1+float64(i)/1e4, 1e-9)
		within(t, "A", v[1], x[0][i], 1e-6*2)
		within(t, "B", v[2], x[1][i], 1e-6*4e-3)
	}
}

func TestRecordersRefuseNonsense(t *testing.T) {
	path := filepath.Join(t.TempDir(), "x.wav")
	if err := (Recorder{RateHz: 48000, Bits: 24}).Record(path, 1, "", DC(0)); err == nil {
		t.Error("no full scale: wanted an error")
	}
	if err := (Scope{RateHz: 1e4, Bits: 8, Divs: 8}).Record(path, 1, DC(0)); err == nil {
		t.Error("no inputs: wanted an error")
	}
	if _, err := os.Stat(path); err == nil {
		t.Error("a file was left behind")
	}
}
