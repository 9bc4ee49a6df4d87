package noise

import (
	"math"
	"testing"

	"benchslip/analyze"
	"benchslip/analyze/internal/trial"
)

// A tone 60 dB below full scale over white noise: SNR from the noise's band
// share, dynamic range by AES17 from the noise bandwidth of the 468 curve with
// 0 dB at 2 kHz, 107334.5/3.6552 Hz (independent integral); a residual 42.3 dB
// below the tone is a range of 102.3 dB.
func TestDynamicRange(t *testing.T) {
	const rms = 3e-6
	tone := math.Pow(10, -60.0/20)
	for _, own := range []float64{-60, -58} {
		amp := math.Pow(10, own/20)
		tk := trial.Take("t", trial.New(48000, 8).Tone(997.3, amp, 0.1).Noise(rms, 3))
		r := trial.Run(snr, analyze.Params{}, tk)
		if r.Value == nil {
			t.Fatal(r.Refusal)
		}
		want := db(amp / math.Sqrt2 / (rms * math.Sqrt(19980.0/24000)))
		if got := db(*r.Value); math.Abs(got-want) > 0.06 {
			t.Errorf("SNR %.3f dB, want %.3f", got, want)
		}
		dr := db(1 / math.Sqrt2 / (rms * math.Sqrt(107334.5/3.6552/24000)))
		if got, _ := r.Details["dynamic_range_db"].(float64); math.Abs(got-dr) > 0.06 {
			t.Errorf("dynamic range %v dB, want %.3f", r.Details["dynamic_range_db"], dr)
		}
	}
	// 42.3 dB of weighted residual below a tone at -60 dBFS.
	rest := tone / math.Sqrt2 * math.Pow(10, -42.3/20) / math.Sqrt(107334.5/3.6552/24000)
	r := trial.Run(snr, analyze.Params{}, trial.Take("t", trial.New(48000, 8).Tone(997.3, tone, 0.1).Noise(rest, 3)))
	if got, _ := r.Details["dynamic_range_db"].(float64); math.Abs(got-102.3) > 0.06 {
		t.Errorf("dynamic range %v dB, want 102.3", got)
	}
	loud := trial.Run(snr, analyze.Params{}, trial.Take("t", trial.New(48000, 2).Tone(997.3, 0.5, 0.1).Noise(rest, 3)))
	if loud.Details["dynamic_range_db"] != nil {
		t.Error("a tone at -6 dBFS has a dynamic range")
	}
}
