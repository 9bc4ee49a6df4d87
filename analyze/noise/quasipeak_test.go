package noise

import (
	"fmt"
	"math"
	"testing"

	"benchslip/analyze"
	"benchslip/analyze/internal/trial"
)

func shown(t *testing.T, s *trial.Signal) indicated {
	t.Helper()
	p := trial.Pass(noise, analyze.Params{}, map[string]*analyze.Take{"take": trial.Take("t", s)})
	sig, bad := p.Signal("take", "out")
	if bad != nil {
		t.Fatal(bad)
	}
	return indicate(sig)
}

// burst adds a 5 kHz burst of peak 0.3 that starts at a zero crossing and
// holds whole periods.
func burst(s *trial.Signal, from, seconds float64) {
	for i := int(math.Ceil(from * s.Rate)); i < len(s.X); i++ {
		t := float64(i)/s.Rate - from
		if t >= seconds {
			break
		}
		s.X[i] += 0.3 * math.Sin(2*math.Pi*5000*t)
	}
}

// The eleven windows of ITU-R BS.468-4 Tables 2 and 3 (from memory).
func TestBursts(t *testing.T) {
	for _, rate := range []float64{44100, 48000, 192000} {
		steady := shown(t, trial.New(rate, 2).Tone(5000, 0.3, 0)).highest
		for _, row := range table(t, "bs468_bursts.csv") {
			long, per := row[0]/1000, row[1]
			s := trial.New(rate, 0.5)
			switch {
			case per > 0:
				s = trial.New(rate, 2.5)
				for from := 0.1; from < 2.4; from += 1 / per {
					burst(s, from, long)
				}
			default:
				burst(s, 0.1, long)
			}
			got := 100 * shown(t, s).highest / steady
			if got < row[3] || got > row[4] {
				t.Errorf("rate %g, %g ms, %g a second: %.1f %%, wanted %g .. %g", rate, row[0], per, got, row[3], row[4])
			}
			if math.Abs(20*math.Log10(got/row[2])) > 0.25 {
				t.Errorf("rate %g, %g ms, %g a second: %.1f %%, nominal %g", rate, row[0], per, got, row[2])
			}
		}
	}
}

// A steady 1 kHz sine reads its RMS, whatever the rate; other tones read that
// times the curve (a detector that follows crests reads low tones within 0.2
// dB). BS.468-4 clause 2 (from memory): the other polarity of an asymmetric
// wave within 0.5 dB, a suddenly applied tone overswings by at most 0.3 dB.
func TestSteadySine(t *testing.T) {
	for _, rate := range []float64{44100, 48000, 192000} {
		q := shown(t, trial.New(rate, 3).DC(0.2).Tone(1000.3, 0.5*math.Sqrt2, 0.7))
		for name, v := range map[string]float64{"highest": q.highest, "mean": q.mean, "RMS": q.rms} {
			if dB := 20 * math.Log10(v/0.5); math.Abs(dB) > 0.05 {
				t.Errorf("rate %g: %s %.3f dB off", rate, name, dB)
			}
		}
		if over := 20 * math.Log10(q.highest/q.mean); over > 0.3 {
			t.Errorf("rate %g: overswing %.2f dB", rate, over)
		}
	}
	for i, row := range table(t, "bs468.csv") {
		if row[0] > 16000 || i%2 == 1 {
			continue
		}
		q := shown(t, trial.New(48000, 2.2).Tone(row[0], 0.1*math.Sqrt2, 0.7))
		if dB := 20*math.Log10(q.mean/0.1) - row[1]; math.Abs(dB) > 0.25 {
			t.Errorf("%g Hz: %.2f dB off the curve", row[0], dB)
		}
	}
	lopsided := func(sign float64) float64 { // a pulse train has one-sided crests
		s := trial.New(48000, 3)
		for h := 1.0; h <= 15; h++ {
			s.Tone(h*400, sign*0.02, 0)
		}
		return shown(t, s).mean
	}
	if dB := 20 * math.Log10(lopsided(1)/lopsided(-1)); math.Abs(dB) > 0.5 {
		t.Errorf("polarity changes the reading by %.2f dB", dB)
	}
}

// White Gaussian noise: mean indication 4.39 dB over the 468-weighted RMS (a
// Monte Carlo run of a quasi-peak model by other code, +-0.1 dB), that 7.30 dB
// over the flat RMS of 20 Hz to 20 kHz.
func TestQuasiPeakNoise(t *testing.T) {
	for _, rate := range []float64{44100, 48000, 96000} {
		r := trial.Run(noise, analyze.Params{Weighting: "468"}, trial.Take("t", trial.New(rate, 10).Noise(0.01, 4)))
		if r.Value == nil {
			t.Fatal(r.Refusal)
		}
		mean, rms := r.Details["mean_v"].(float64), r.Details["rms_v"].(float64)
		if dB := 20*math.Log10(mean/rms) - 4.39; math.Abs(dB) > 0.3 {
			t.Errorf("rate %g: mean indication %.2f dB off", rate, dB)
		}
		flat := 0.01 * math.Sqrt(19980/(rate/2))
		if dB := 20*math.Log10(rms/flat) - 7.3014; math.Abs(dB) > 0.08 {
			t.Errorf("rate %g: weighted RMS %.3f dB off", rate, dB)
		}
		if *r.Value < mean || *r.Value > 1.3*mean || len(r.Budget) == 0 {
			t.Errorf("rate %g: highest %.4g, mean %.4g, %v", rate, *r.Value, mean, r.Budget)
		}
	}
}

// Quasi-peak readings are never corrected for a floor; within 10 dB of it
// there is no value.
func TestQuasiPeakFloor(t *testing.T) {
	take := trial.Take("t", trial.New(48000, 3).Noise(0.01, 4))
	for below, limited := range map[float64]bool{9: true, 11: false} {
		floor := trial.Take("f", trial.New(48000, 3).Noise(0.01*math.Pow(10, -below/20), 5))
		bare := trial.Run(noise, analyze.Params{Weighting: "468"}, take)
		r := noise.Run(trial.Pass(noise, analyze.Params{Weighting: "468"}, map[string]*analyze.Take{"take": take, "floor": floor}))
		name := fmt.Sprintf("%g dB below", below)
		switch {
		case limited && (r.Value != nil || r.Bound == nil || r.Refusal.Code != analyze.FloorLimited || r.Bound.Value < *bare.Value):
			t.Errorf("%s: %+v", name, r)
		case !limited && (r.Value == nil || *r.Value != *bare.Value):
			t.Errorf("%s: %v, without a floor %v", name, r.Value, *bare.Value)
		}
	}
}
