package health

import (
	"math"

	"benchslip/capture/recording"
)

// again reads single channels a second time, a bounded stretch each.
type again struct {
	rec recording.Recording
	in  *recording.Info
}

// maxStretch bounds what is read again at a time, in frames.
const maxStretch = 1 << 20

// stretch reads the frames [from, to) of channel c, less what lies outside
// the recording or beyond maxStretch; from is where it starts.
func (g again) stretch(c int, from, to int64) (x []float64, start int64, err error) {
	from, to = max(from, 0), min(to, g.in.Frames)
	if to <= from {
		return nil, from, nil
	}
	to = min(to, from+maxStretch)
	x = make([]float64, to-from)
	dst := make([][]float64, len(g.in.Channels))
	for got := int64(0); got < int64(len(x)); {
		dst[c] = x[got:]
		n, err := g.rec.ReadAt(dst, from+got)
		if err != nil {
			return nil, from, err
		}
		if n == 0 {
			return x[:got], from, nil
		}
		got += int64(n)
	}
	return x, from, nil
}

// sineAt fits a sine around frame at of channel c, on a stretch that is
// widened until it holds fitPeriods periods.
func (g again) sineAt(c int, at int64) (fit sineFit, x []float64, ok bool, err error) {
	for size := int64(4096); ; size *= 4 {
		x, _, err = g.stretch(c, at-size/2, at+size/2)
		if err != nil {
			return fit, nil, false, err
		}
		whole := int64(len(x)) == g.in.Frames || size >= maxStretch
		period, found := crossingPeriod(x)
		if found && (whole || float64(len(x)) >= fitPeriods*period) {
			fit, ok = fitSine(x)
			return fit, x, ok, nil
		}
		if whole {
			return fit, x, false, nil
		}
	}
}

// ownRun is the longest run of equal samples that a sine shows at its peak
// when its samples are rounded to multiples of step: the time it spends
// within one step of the peak. Half a step more is allowed for uneven steps
// and for noise.
func (f sineFit) ownRun(step float64) int64 {
	c := 1 - 1.5*step/f.peak
	if c <= -1 {
		return math.MaxInt64
	}
	return int64(2*math.Acos(c)/f.omega) + 1
}

// leastStep is the smallest difference of neighbouring samples that differ.
func leastStep(x []float64) float64 {
	least := math.Inf(1)
	for i := 1; i < len(x); i++ {
		if d := math.Abs(x[i] - x[i-1]); d > 0 && d < least {
			least = d
		}
	}
	return least
}

// longestBetween is the longest run of equal samples that are neither lo nor
// hi.
func longestBetween(x []float64, lo, hi float64) int64 {
	best, n := int64(0), int64(0)
	for i, v := range x {
		if i > 0 && v == x[i-1] && v != lo && v != hi {
			n++
		} else {
			n = 1
		}
		best = max(best, n)
	}
	return best
}
