package health

import (
	"fmt"
	"math"

	"benchslip/capture/recording"
)

const (
	// sineShare is the part of the AC power that the fundamental must hold
	// for a signal to be judged as a sine. A square wave holds 8/pi^2 = 81 %,
	// a half-wave rectified sine 84 %; a sine clipped to half its peak 95 %.
	sineShare = 0.85

	// fewSteps: a tone of fewer converter steps peak to peak carries the flag.
	// Rounding then lies at about -(6.02 lb 64 + 1.76) = -38 dB. A full screen
	// of 8 bits has 255 steps and is not flagged: single measures refuse what
	// lies below its rounding.
	fewSteps = 64

	// leastTone is -40 dBFS: what is smaller in an audio recording is no
	// tone to be judged. Where full scale is unknown a tone must cover
	// leastSteps steps.
	leastTone  = 0.01
	leastSteps = 4
)

// flatTopFlag looks for a flat top below full scale: a run of equal samples
// at the largest or smallest value that is longer than a sine of that size
// and frequency can show after rounding.
//
// A signal that stands still elsewhere just as long (a converter's staircase,
// every sample repeated) has no flat top.
func flatTopFlag(g again, c int, ch *channel) (*recording.Flag, error) {
	var first, last, places, longest, own int64 = math.MaxInt64, 0, 0, 0, 0
	var level, share float64
	ends := ""
	for _, r := range []*rail{&ch.top, &ch.bottom} {
		if ch.atFullScale(r) || r.places == 0 || ch.silent() {
			continue
		}
		n := r.longest.To - r.longest.From
		// The longest run may lie where the tone starts; then the middle one.
		var fit sineFit
		var x []float64
		ok := false
		for _, run := range []recording.Run{r.longest, r.runs[len(r.runs)/2]} {
			var err error
			if fit, x, ok, err = g.sineAt(c, (run.From+run.To)/2); err != nil {
				return nil, err
			}
			if ok = ok && fit.share > sineShare; ok {
				break
			}
		}
		if !ok {
			continue
		}
		limit := fit.ownRun(leastStep(x))
		if n <= limit || 20*longestBetween(x, -ch.bottom.value, ch.top.value) >= 9*n {
			continue
		}
		first, last = min(first, r.runs[0].From), max(last, r.runs[len(r.runs)-1].To)
		places += r.places
		if n > longest {
			longest, own, level, share = n, limit, r.sign*r.value, fit.share
		}
		if ends != "" {
			ends = "top and bottom"
		} else if r.sign > 0 {
			ends = "top"
		} else {
			ends = "bottom"
		}
	}
	if ends == "" {
		return nil, nil
	}
	f := &recording.Flag{Code: recording.FlatTop, Channel: c + 1}
	f.FromS, f.ToS = place(g.in, first, last)
	who := "the unit or a stage before the recorder limits"
	if !ch.fs {
		who = "the unit, a stage before the instrument, or the instrument's own range limits"
	}
	f.Message = fmt.Sprintf("flat %s at %.6g %s in %s: up to %d equal samples where a sine of this size and frequency shows at most %d (fundamental %.1f %% of the power), first at %s; %s",
		ends, level, g.in.Channels[c].Unit, count(places, "place"), longest, own, 100*share, where(g.in, first), who)
	return f, nil
}

// fewCodesFlag looks for a tone that uses few converter steps. They must show
// as rounding, too, a rest of about step/sqrt(12) against a sine: a tone of a
// quarter of the sample rate visits few even values, but lies on them exactly.
func fewCodesFlag(g again, c int, ch *channel) (*recording.Flag, error) {
	step := ch.codes.step()
	if ch.codes.full || ch.codes.n < 3 || ch.codes.n > 2*fewSteps || step <= 0 {
		return nil, nil
	}
	fit, x, ok, err := g.sineAt(c, ch.top.first)
	if err != nil || !ok {
		return nil, err
	}
	steps := 2 * fit.peak / step
	if fit.share <= sineShare || steps >= fewSteps || fit.rest < step/12 {
		return nil, nil
	}
	if ch.fs && fit.peak < leastTone || !ch.fs && steps < leastSteps {
		return nil, nil
	}
	// Spacings wider than the format's own step: where few values come from few
	// phases (a triangle in step with the sample rate) they are no steps.
	if step > 1.5*g.in.Channels[c].Step {
		if p := innerPeriod(x[:min(len(x), fitPoints)]); p > 0 && p <= 2*ch.codes.n {
			return nil, nil
		}
	}
	f := &recording.Flag{Code: recording.FewCodes, Channel: c + 1}
	f.FromS, f.ToS = place(g.in, 0, g.in.Frames)
	f.Message = fmt.Sprintf("the tone spans only %.0f converter steps of %.6g %s peak to peak (%d different values): rounding alone lies %.0f dB below it; use more of the range",
		steps, step, g.in.Channels[c].Unit, ch.codes.n, 20*math.Log10(fit.peak/math.Sqrt2/(step/math.Sqrt(12))))
	return f, nil
}
