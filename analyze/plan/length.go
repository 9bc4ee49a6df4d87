package plan

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"benchslip/analyze"
	"benchslip/capture/stimulus"
	"benchslip/capture/unit"
)

// length is how long to record, with the reason that decides.
type length struct {
	seconds float64 // 0: a length that no number says
	why     string
	least   float64 // below which a check refuses, s
}

// Lengths in s that are common practice, no source.
const (
	toneS   = 8  // a low-leakage window needs about 8 bins between two lines: 1 Hz apart in 8 s
	quietS  = 20 // one 1 Hz line is known within 4.34/sqrt(20) = 1 dB
	pickupS = 30
	dcS     = 2  // a whole number of periods of 50 and of 60 Hz
	switchS = 20 // 5 s quiet, then 15 s in which it settles
	watchS  = 60
	burstS  = 5 // full level, before anything gets hot
	marginS = 1 // the first and last half second are for hands and keys
)

// length finds the longest of what the checks of a take need.
func (p *planner) length(t *analyze.Take, uses []use, s stimulusOf) length {
	var out length
	put := func(seconds, least float64, format string, args ...any) {
		out.least = math.Max(out.least, least)
		if seconds > out.seconds {
			out.seconds, out.why = seconds, fmt.Sprintf(format, args...)
		}
	}
	scope := isScope(t)
	for _, u := range uses {
		switch n := need(u); {
		case u.check.Measure == "events":
			put(watchS, 1, "rare events need a long watch")
		case u.check.Measure == "thump":
			put(switchS, 2, "5 s of quiet before switching, then 15 s to settle")
		case n == needSquare:
			p.edgeLength(u, put)
		case n == needTone && !scope && (s.spec == nil || steadyTone(*s.spec)):
			p.toneLength(u, put)
		case n == needNothing:
			p.quietLength(u, scope, put)
		}
	}
	if s.spec != nil {
		put(s.spec.TotalS()+marginS, s.spec.TotalS(), "the whole of the stimulus, %s, with a second for starting and stopping", seconds(s.spec.TotalS()))
	}
	for _, u := range uses {
		if sp := t.Wiring.Over(u.check.Params.Wiring).Span; sp != nil && sp.HasTo {
			put(sp.To+marginS/2., sp.To, "the span %s lies in it", sp.Text)
		}
	}
	if out.seconds >= 1 {
		out.seconds = math.Ceil(out.seconds)
	}
	return out
}

type put func(seconds, least float64, format string, args ...any)

// toneLength: a tone is told from its neighbours. A mains line at a distance d
// needs 4/d (from 2/d on it is measured with a larger uncertainty; below,
// refused), and five periods.
func (p *planner) toneLength(u use, put put) {
	if slices.Contains(partFullMeasures, u.check.Measure) {
		put(burstS, 1, "full level for seconds only")
		return
	}
	put(toneS, 1, "lines 1 Hz apart are told apart in about 8 s")
	for _, f := range u.check.Params.At {
		put(10/f, 5/f, "ten periods of %s", hertz(f))
		if gap, line := p.gapToMains(f); gap > 0 {
			put(4/gap, 2/gap, "the tone lies %s from the mains line at %s: 4/%.3g Hz", hertz(gap), hertz(line), gap)
		}
	}
}

// steadyTone reports whether a stimulus holds its tones for its whole length.
func steadyTone(s stimulus.Spec) bool {
	return slices.Contains([]string{"tone", "pilot", "multitone", "modulation-pair", "difference-pair"}, s.Kind)
}

// gapToMains is the distance of a tone from the nearest of the first five
// mains lines, and that line; of both usual supplies where the job does not
// say which.
func (p *planner) gapToMains(f float64) (gap, line float64) {
	supplies := []float64{p.job.MainsHz}
	if p.job.MainsHz == 0 {
		supplies = []float64{50, 60}
	}
	gap = math.Inf(1)
	for _, fm := range supplies {
		for h := 1.0; h <= 5; h++ {
			if d := math.Abs(f - h*fm); d < gap {
				gap, line = d, h*fm
			}
		}
	}
	return gap, line
}

// quietLength: a take without signal. Noise power over a bandwidth B is known
// within 1/sqrt(B T) (one standard uncertainty), and ten periods of its lowest
// frequency must fit; density at f is taken over a sixth of an octave.
func (p *planner) quietLength(u use, scope bool, put put) {
	c := u.check
	switch c.Measure {
	case "noise", "ein", "snr":
		lo := 20.0
		if c.Params.Band != nil {
			lo = c.Params.Band.Low
		}
		put(15, 0, "noise of the whole audio band is known to 0.01 dB and its lowest octave to about 0.3 dB in 15 s")
		put(20/lo, 10/lo, "twenty periods of the band's lower end, %s", hertz(lo))
	case "noise_density":
		if len(c.Params.At) == 0 {
			return
		}
		f := c.Params.At[0]
		width := f * (math.Pow(2, 1./12) - math.Pow(2, -1./12))
		put(15, 0, "noise density needs averages")
		put(100/width, 25/width, "a hundred averages of the sixth of an octave about %s, %s wide", hertz(f), hertz(width))
	case "hum", "hum_ratio", "mains_frequency":
		put(quietS, 10/p.mainsHz(), "one mains line is told from the noise within about 1 dB in 20 s")
	case "pickup":
		put(pickupS, 10/p.mainsHz(), "the phase against the mains reference is averaged over 30 s")
	case "dc", "ripple", "level", "peak", "crest":
		if !scope && c.Measure != "dc" {
			put(toneS, 0, "as long as a tone")
			return
		}
		put(dcS, 0.2, "mains ripple averages out over a hundred of its periods")
	case "oscillation":
		above := 20e3
		if c.Params.Above != nil {
			above = *c.Params.Above
		}
		put(1000/above, 10/above, "a thousand periods of %s", hertz(above))
	}
}

func (p *planner) mainsHz() float64 {
	if p.job.MainsHz > 0 {
		return p.job.MainsHz
	}
	return 50
}

// edgeLength: a one-shot take holds the flat part before the edge and after
// it.
func (p *planner) edgeLength(u use, put put) {
	for _, row := range u.check.Rows() {
		q := row.Limits.Max
		if q == nil || q.Unit.Dim != unit.Second || q.Linear() <= 0 {
			continue
		}
		put(20*q.Linear(), 2*q.Linear(), "twenty times the limit of %s, with at least four samples in the edge", q)
	}
}

// rate is the sample rate to record at, in Hz; 0 where the scope decides.
func (p *planner) rate(t *analyze.Take, uses []use, s stimulusOf) float64 {
	if isScope(t) {
		return 0
	}
	if g := t.Gear; g != nil && g.Rate > 0 {
		return g.Rate
	}
	top := 0.0
	for _, u := range uses {
		if b := u.check.Params.Band; b != nil {
			top = math.Max(top, b.High)
		}
		for _, f := range u.check.Params.At {
			top = math.Max(top, f)
		}
	}
	if s.spec != nil && s.spec.RateHz > 48000 || top > 0.45*48e3 {
		return math.Max(96e3, 48e3*math.Ceil(top/(0.45*48e3)))
	}
	return 48e3
}

// spanFor is the stretch of a take in which a steady signal sounds, half a
// second in from its ends, when recorder and player start together. Stepped
// signals, sweeps and pulses are found where they are. "" where the take states
// its own, or nothing needs to be cut off.
func spanFor(t *analyze.Take, s stimulusOf) string {
	if t.Wiring.Span != nil || s.spec == nil {
		return ""
	}
	if !steadyTone(*s.spec) && !strings.HasSuffix(s.spec.Kind, "-noise") {
		return ""
	}
	start, long := s.spec.Span()
	if long < 2 || s.spec.BeforeS == 0 && s.spec.AfterS == 0 {
		return ""
	}
	return fmt.Sprintf("%.4g s .. %.4g s", start+0.5, start+long-0.5)
}
