package look

import (
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"benchslip/analyze"
	"benchslip/analyze/stage"
	"benchslip/capture/health"
	"benchslip/capture/recording"
	"benchslip/capture/recording/memory"
)

// line is a sinusoid of a test signal.
type line struct{ hz, rms float64 }

// signal is seconds of lines, DC and white noise of the given RMS, at 48 kHz.
func signal(seconds, dc, noise float64, lines ...line) []float64 {
	const rate = 48000
	rng := rand.New(rand.NewPCG(1, 2))
	x := make([]float64, int(seconds*rate))
	for i := range x {
		x[i] = dc + noise*rng.NormFloat64()
		for _, l := range lines {
			x[i] += l.rms * math.Sqrt2 * math.Cos(2*math.Pi*l.hz*float64(i)/rate+1)
		}
	}
	return x
}

func say(t *testing.T, kind string, x []float64) string {
	t.Helper()
	rec := memory.New(kind, 48000, x)
	report, err := health.Scan(rec)
	if err != nil {
		t.Fatal(err)
	}
	take := &analyze.Take{Name: "t", Rec: rec, Health: report}
	var seen *stage.Survey
	if report.Levels[0].AC > 0 {
		seen = stage.SurveyOf(&analyze.Pass{Stages: analyze.NewStages()}, analyze.NewSignal(take, 1, 0, 0, int64(len(x)), 1))
	}
	return sentence(take, 0, seen)
}

// A full-scale sine is 1/sqrt 2 FS RMS, so -12 dBFS is 0.17762 FS; levels
// below are such closed forms.
func TestSentence(t *testing.T) {
	const full = math.Sqrt2 / 2
	db := func(x float64) float64 { return full * math.Pow(10, x/20) }
	for _, c := range []struct {
		name string
		kind string
		x    []float64
		want string
	}{
		{"tone over hum", recording.Audio, signal(4, 0, db(-110), line{1042, db(-12)}, line{50, db(-74)}),
			"tone 1042 Hz at -12.0 dBFS, nothing clipped, 50 Hz hum 62 dB below it"},
		{"tone alone", recording.Audio, signal(4, 0, db(-110), line{1042.3, db(-12)}),
			"tone 1042.3 Hz at -12.0 dBFS, nothing clipped, no mains hum seen"},
		{"a tone on a high multiple of the mains", recording.Audio, signal(4, 0, db(-110), line{9750, db(-12)}, line{50, db(-100)}),
			"tone 9750 Hz at -12.0 dBFS, nothing clipped, 50 Hz hum 88 dB below it"},
		{"60 Hz hum", recording.Audio, signal(4, 0, db(-110), line{59.98, db(-40)}, line{179.94, db(-46)}),
			"mains hum, strongest line 59.98 Hz at -40.0 dBFS, nothing clipped, 60 Hz hum -39.0 dBFS in all"},
		{"noise", recording.Audio, signal(4, 0, db(-60)),
			"no line stands out, -60.0 dBFS in all, nothing clipped, no mains hum seen"},
		{"a line in noise", recording.Audio, signal(4, 0, db(-40), line{1000, db(-43)}),
			"-38.2 dBFS in all, strongest line 1000 Hz at -43.0 dBFS, nothing clipped, no mains hum seen"},
		{"two equal tones", recording.Audio, signal(4, 0, db(-110), line{1042, db(-20)}, line{9730, db(-20.5)}, line{137, db(-20.5)}),
			"-15.6 dBFS in all, strongest line 1042 Hz at -20.0 dBFS, nothing clipped, no mains hum seen"},
		{"DC", recording.Scope, signal(4, 14.98, 1e-4, line{100, 2e-3}),
			"mains hum, strongest line 100 Hz at 2.000 mV, 50 Hz hum 2.000 mV in all, DC 14.98 V"},
		{"too short for hum", recording.Scope, signal(0.01, 0, 1e-5, line{1000, 0.1}),
			"tone 1000 Hz at 100.0 mV"},
		{"silence", recording.Audio, make([]float64, 4800), "every sample is 0 FS"},
	} {
		if got := say(t, c.kind, c.x); got != c.want {
			t.Errorf("%s: %q, wanted %q", c.name, got, c.want)
		}
	}
	x := signal(1, 0, 0, line{1000, 0.9})
	for i := range x {
		x[i] = math.Max(-1, math.Min(x[i], 1))
	}
	if got := say(t, recording.Audio, x); !strings.Contains(got, "clipped first at 0.000") {
		t.Errorf("clipped: %q", got)
	}
}
