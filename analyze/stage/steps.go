package stage

import (
	"fmt"
	"math"

	"benchslip/analyze"
	"benchslip/capture/recording"
)

// StepU is the standard uncertainty (peak, in the signal's unit) that
// converter steps bring to one line when no dither hides them: the error
// stays within a quarter of a step, taken as rectangular. 0 with dither
// (triangular: 0.5 step RMS of noise; the border is 0.45) or without known
// steps.
func StepU(l *Lines) float64 {
	q := l.Sig.Step
	if q == 0 || math.Sqrt(l.Residual) > 0.45*q {
		return 0
	}
	return q / 4 / math.Sqrt(3)
}

// ScatterU is the relative standard uncertainty of the fundamental's level
// from its scatter over blocks, 0 unless it scatters by more than the noise
// explains.
func (l *Lines) ScatterU() float64 {
	f := l.Fundamental()
	if f == nil || len(l.Blocks) < 3 || l.drifting(f) == 0 {
		return 0
	}
	mean, n := 0.0, float64(len(f.Blocks))
	for _, z := range f.Blocks {
		mean += math.Sqrt(abs2(z)) / n
	}
	v := 0.0
	for _, z := range f.Blocks {
		d := math.Sqrt(abs2(z)) - mean
		v += d * d
	}
	return math.Sqrt(v/(n-1)/n) / mean
}

// FewCodes is the amplitude (V, peak) under which a harmonic (one) and the
// root of the sum of them (all) cannot be told from a converter's own steps,
// for a sine of 5 to 500 steps; ok is false for larger ones and without steps.
// The bounds 0.4 and 0.75 q sqrt(q/A) come from simulations of ideal
// quantisers over random amplitudes and phases; a tone locked to the sample
// rate repeats its codes and reaches three times as far.
func FewCodes(l *Lines) (one, all float64, ok bool) {
	q := l.Sig.Step
	f := l.Fundamental()
	if q == 0 || f == nil {
		return 0, 0, false
	}
	a := math.Sqrt(abs2(f.Z))
	if a < 5*q || a > 500*q {
		return 0, 0, false
	}
	scale := q * math.Sqrt(q/a)
	if locked(l.Tone.Hz/l.Sig.RateHz, l.Sig.Len()) {
		scale *= 3
	}
	return 0.4 * scale, 0.75 * scale, true
}

// locked: the tone's period and the sample period share a common multiple of
// at most 4096 samples that hardly slips over the record.
func locked(nu float64, samples int) bool {
	for m := 2; m <= 4096 && m <= samples/4; m++ {
		x := nu * float64(m)
		if slip := math.Abs(x - math.Round(x)); slip*float64(samples)/float64(m) < 0.25/float64(m)*math.Max(1, float64(m)/16) {
			return true
		}
	}
	return false
}

// ToneOnMainsFlag says that the test tone hides a mains order.
func ToneOnMainsFlag(l *Lines, order int) recording.Flag {
	return recording.Flag{Code: recording.ToneOnMains, Take: l.Sig.Take.Name, Channel: l.Sig.Channel(),
		Message: fmt.Sprintf("the tone at %.6g Hz lies on mains order %d (%.6g Hz), which cannot be told from it", l.Tone.Hz, order, float64(order)*l.MainsHz)}
}

// Rails refuses a result whose output exceeds the stated supply rails: no
// stage swings past them, so the volts must be wrong.
func Rails(p *analyze.Pass, l *Lines, r analyze.Result) analyze.Result {
	if p.Params.Rails == nil || r.Value == nil || l.Sig.Unit != "V" {
		return r
	}
	rail := math.Abs(p.Params.Rails.Value.Linear())
	peak := math.Sqrt(abs2(l.Phasor()))
	if peak <= rail*1.02 {
		return r
	}
	return analyze.Refuse(r.Unit, analyze.Impossible,
		fmt.Sprintf("the output would swing %.4g V peak past rails of %.4g V", peak, rail),
		"check full_scale_peak or the probe factor of the gear")
}
