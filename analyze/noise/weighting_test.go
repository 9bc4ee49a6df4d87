package noise

import (
	"math"
	"math/cmplx"
	"os"
	"strconv"
	"strings"
	"testing"

	"benchslip/analyze"
	"benchslip/analyze/internal/spectrum"
	"benchslip/analyze/internal/trial"
	"benchslip/analyze/stage"
)

// table reads a file of testdata: comments, a header row, numbers ("inf" too).
func table(t *testing.T, name string) [][]float64 {
	t.Helper()
	text, err := os.ReadFile("testdata/" + name)
	if err != nil {
		t.Fatal(err)
	}
	var rows [][]float64
	header := true
	for _, line := range strings.Split(strings.TrimSpace(string(text)), "\n") {
		if strings.HasPrefix(line, "#") {
			continue
		}
		if header {
			header = false
			continue
		}
		var row []float64
		for _, cell := range strings.Split(line, ",") {
			v, err := strconv.ParseFloat(cell, 64)
			if err != nil {
				t.Fatal(err)
			}
			row = append(row, v)
		}
		rows = append(rows, row)
	}
	if len(rows) < 10 {
		t.Fatalf("%s: only %d rows", name, len(rows))
	}
	return rows
}

// The goals of IEC 61672-1:2013 Table 3, rounded there to 0.1 dB, at the exact
// frequencies.
func TestAC(t *testing.T) {
	a, c := stage.Weighting("A"), stage.Weighting("C")
	for _, row := range table(t, "a_c.csv") {
		for i, curve := range []func(float64) float64{a, c} {
			if got, want := 10*math.Log10(curve(row[1])), row[2+i]; math.Abs(got-want) > 0.0502 {
				t.Errorf("%g Hz, curve %d: %.4f dB, in the table %g", row[0], i, got, want)
			}
		}
	}
}

// ITU-R BS.468-4 Table 1, rounded there to 0.1 dB (the network lies 0.0502 dB
// from it at 100 Hz), and the ladder of its Fig.
// 1a solved by chain matrices: 600 ohm source, 13.85 nF across, 12.88 mH in
// series, 26.82 nF across, 33.06 nF in series, 9.21 nF across, 26.49 mH in
// series, 31.47 nF across, 600 ohm load (values from memory, four digits).
func Test468(t *testing.T) {
	curve := stage.Weighting("468")
	at1k := cmplx.Abs(ladder(1000))
	for _, row := range table(t, "bs468.csv") {
		got := 10 * math.Log10(curve(row[0]))
		if math.Abs(got-row[1]) > 0.0505 {
			t.Errorf("%g Hz: %.4f dB, in the table %g", row[0], got, row[1])
		}
		if l := 20 * math.Log10(cmplx.Abs(ladder(row[0]))/at1k); math.Abs(got-l) > 0.01 {
			t.Errorf("%g Hz: %.4f dB, the ladder %.4f", row[0], got, l)
		}
		phase := cmplx.Phase(spectrum.Network468(row[0]) / ladder(row[0]))
		if math.Abs(phase) > 2e-3 {
			t.Errorf("%g Hz: phase %.4f rad off the ladder's", row[0], phase)
		}
	}
	if got := 20 * math.Log10(at1k); math.Abs(got+18.2387) > 2e-3 {
		t.Errorf("the ladder's insertion at 1 kHz: %.4f dB, known -18.2387", got)
	}
}

func ladder(hz float64) complex128 {
	jw := complex(0, 2*math.Pi*hz)
	type chain [4]complex128 // a b c d: U1 = a U2 + b I2, I1 = c U2 + d I2
	m := chain{1, 0, 0, 1}
	times := func(n chain) {
		m = chain{m[0]*n[0] + m[1]*n[2], m[0]*n[1] + m[1]*n[3], m[2]*n[0] + m[3]*n[2], m[2]*n[1] + m[3]*n[3]}
	}
	series := func(z complex128) { times(chain{1, z, 0, 1}) }
	across := func(y complex128) { times(chain{1, 0, y, 1}) }
	series(600)
	across(jw * 13.85e-9)
	series(jw * 12.88e-3)
	across(jw * 26.82e-9)
	series(1 / (jw * 33.06e-9))
	across(jw * 9.21e-9)
	series(jw * 26.49e-3)
	across(jw * 31.47e-9)
	across(1.0 / 600)
	return 1 / m[0]
}

// The filter in front of the quasi-peak detector has the network's response
// up to nearly half the rate, in amplitude and phase.
func TestNetwork(t *testing.T) {
	for _, rate := range []float64{44100, 48000, 88200, 96000, 192000, 1e6} {
		f := spectrum.NewFilter(spectrum.Network468, rate, 1)
		top := math.Min(0.48*rate, 40000)
		for hz := 20.0; hz < top; hz *= 1.13 {
			r := f.Response(hz) / spectrum.Network468(hz)
			if dB := 20 * math.Log10(cmplx.Abs(r)); math.Abs(dB) > 0.005 || math.Abs(cmplx.Phase(r)) > 1e-3 {
				t.Errorf("rate %g, %.0f Hz: %.4f dB, %.5f rad off", rate, hz, dB, cmplx.Phase(r))
			}
		}
	}
}

// White noise of known density over 30 s: RMS within 0.05 dB of density times
// the curve's noise bandwidth between 20 Hz and 20 kHz (12467.18, 9027.05 and
// 107334.5 Hz by an independent integral).
func TestWeightedNoise(t *testing.T) {
	if testing.Short() {
		t.Skip("30 s of noise")
	}
	const rms = 0.01
	on := trial.On(trial.Take("t", trial.New(48000, 30).Noise(rms, 12)))
	for name, bandwidth := range map[string]float64{"none": 19980, "A": 12467.18, "C": 9027.05, "468": 107334.5} {
		want := 20 * math.Log10(rms*math.Sqrt(bandwidth/24000))
		p := analyze.Params{Weighting: name, Gain: stated("gain", 0, "dB")}
		m := noise
		if name == "468" {
			m = ein // RMS there
		}
		r := on.Run(m, p)
		if r.Value == nil {
			t.Fatal(r.Refusal)
		}
		if got := 20 * math.Log10(*r.Value); math.Abs(got-want) > 0.05 {
			t.Errorf("%s: %.3f dB, want %.3f", name, got, want)
		}
	}
}
