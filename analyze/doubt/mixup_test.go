package doubt

import (
	"math"
	"strings"
	"testing"
)

// Sizes of the rungs that have a closed form.
func TestLadderSizes(t *testing.T) {
	lg := math.Log10
	for _, c := range []struct {
		name      string
		size, dec float64
	}{
		{"22.05/20 kHz", 10 * lg(22.05/20), 0.42}, {"24/20 kHz", 10 * lg(24./20), 0.79}, {"48/20 kHz", 10 * lg(48./20), 3.80},
		{"150 ohm into 2 kohm", 20 * lg(2150./2000), 0.63}, {"150 ohm into 1.5 kohm", 20 * lg(1650./1500), 0.83},
		{"mean-responding on noise", -20 * lg(math.Sqrt(math.Pi)/2), 1.05}, {"dBu and dBV", -10 * lg(0.6), 2.22},
		{"peak and RMS", 10 * lg(2), 3.01}, {"double", 20 * lg(2), 6.02}, {"peak-to-peak and RMS", 10 * lg(8), 9.03},
		{"+4 dBu and -10 dBV", 4 + 10*lg(0.6) + 10, 11.78}, {"decade", 20, 20}, {"gain of 20", 20 * lg(20), 26.02},
	} {
		found := false
		for _, r := range ladder {
			found = found || math.Abs(r.dB-c.size) < 0.025
		}
		if !found || math.Abs(c.size-c.dec) > 0.006 {
			t.Errorf("%s: %.3f dB: no rung there, or not %.2f", c.name, c.size, c.dec)
		}
	}
	// A-weighting of flat noise from 20 Hz to 20 kHz: -2.05 dB (IEC 61672-1
	// pole formula, integrated).
	num, den := 0.0, 0.0
	for f := 20.5; f < 20000; f++ {
		f2 := f * f
		a := 12194 * 12194 * f2 * f2 / ((f2 + 20.6*20.6) * math.Sqrt((f2+107.7*107.7)*(f2+737.9*737.9)) * (f2 + 12194*12194))
		num, den = num+a*a, den+1
	}
	if d := 10*lg(num/den) + 2.00; math.Abs(d+2.05) > 0.01 {
		t.Errorf("A-weighting of flat noise: %.3f dB", d)
	}
}

func TestMixUp(t *testing.T) {
	for _, c := range []struct {
		measure string
		d, u    float64
		want    []string // one word of each opinion; none: no opinion
	}{
		{"gain", -6.02, 0.06, []string{"one leg"}},
		{"gain", -6.15, 0.06, nil},                  // beyond the uncertainty
		{"gain", -6.15, 1, []string{"one leg"}},     // within practice
		{"gain", -6.30, 1, nil},                     // never beyond 0.2 dB
		{"gain", -6.05, 0.001, []string{"one leg"}}, // parts scatter more than that
		{"gain", 20.0, 0.1, []string{"decade"}},
		{"gain", -2.05, 0.1, nil}, // no weighting in a gain
		{"gain", 0.83, 0.1, nil},  // a load never raises it
		{"gain", -0.83, 0.05, []string{"1.5 kohm"}},
		{"noise", -2.05, 0.05, []string{"A-weighting"}},
		{"noise", 0.79, 0.05, []string{"48 kHz"}},
		{"noise", -0.79, 0.05, nil},
		{"snr", -0.79, 0.05, []string{"48 kHz"}},
		{"noise", 2.13, 0.2, []string{"A-weighting", "dBV"}},
		{"level", 2.2185, 0.02, []string{"dBV"}},
		{"level", 3.01, 0.1, []string{"peak value"}},
		{"thd", 6.02, 0.1, nil}, {"cmrr", 20, 0.1, nil}, {"gain", 0, 1, nil},
	} {
		got := MixUp(c.measure, c.d, c.u)
		if len(got) != len(c.want) {
			t.Errorf("%s %+.2f +- %g: %q", c.measure, c.d, c.u, got)
			continue
		}
		for i, w := range c.want {
			if !strings.Contains(got[i], w) || !strings.Contains(got[i], "consistent with") {
				t.Errorf("%s %+.2f: %q, want %q", c.measure, c.d, got[i], w)
			}
		}
	}
}
