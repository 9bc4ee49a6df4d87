package health_test

import (
	"path/filepath"
	"testing"

	"benchslip/capture/health"
	"benchslip/capture/recording"
	"benchslip/capture/stimulus"
	"benchslip/capture/wav"
)

// TestStimuliAreHealthy scans a stimulus file of every kind: digital tones
// without noise, short silences between steps, periodic signals - all that
// repeats or is zero on purpose. The second channel of a file may be a copy of
// the first.
func TestStimuliAreHealthy(t *testing.T) {
	for _, text := range []string{
		"tone length=1s", "tone at=1kHz length=2s before=500ms", "pilot before=100ms after=100ms length=600ms",
		"stepped-tones count=9 each=100ms", "stepped-tones at=47Hz,137Hz,1kHz,10.5kHz each=200ms gap=0s",
		"stepped-tones at=100Hz,200Hz,1kHz,2kHz,10kHz each=100ms gap=50ms",
		"stepped-levels count=6 each=100ms", "stepped-levels count=4 each=200ms gap=20ms", "sweep length=2s", "multitone period=200ms length=800ms from=50Hz",
		"multitone at=1kHz,2kHz,3kHz period=10ms length=1s", "modulation-pair length=1s", "difference-pair length=1s",
		"pulse length=1s", "white-noise length=1s", "pink-noise length=1s seed=7", "level-ramp length=1s",
	} {
		t.Run(text, func(t *testing.T) {
			spec, err := stimulus.Parse(text)
			if err != nil {
				t.Fatal(err)
			}
			path := filepath.Join(t.TempDir(), "stimulus.wav")
			if err := stimulus.Write(path, spec); err != nil {
				t.Fatal(err)
			}
			rec, err := wav.Open(path)
			if err != nil {
				t.Fatal(err)
			}
			defer rec.Close()
			r, err := health.Scan(rec)
			if err != nil {
				t.Fatal(err)
			}
			for _, f := range r.Flags {
				if f.Code == recording.IdenticalChannels || f.Code == recording.Silent && f.Channel == 2 {
					continue
				}
				t.Errorf("%s: channel %d: %s", f.Code, f.Channel, f.Message)
			}
		})
	}
}
