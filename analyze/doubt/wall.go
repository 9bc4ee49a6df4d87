package doubt

import (
	"fmt"
	"math"
	"slices"

	"benchslip/analyze/internal/spectrum"
	"benchslip/capture/recording"
)

// floor is the noise of a recording over frequency: the lower quartile over
// many stretches, so that what passes (sweeps, bursts) leaves no mark.
type floor struct {
	s      []float64 // density, V^2/Hz; relative height matters alone
	stepHz float64
}

const (
	floorPoints    = 4096
	floorStretches = 48
)

// quietest reads the floor of a channel.
func (l *listening) quietest() *floor {
	if l.floor != nil {
		return l.floor
	}
	n := l.sig.Len()
	m := spectrum.FastLength(min(floorPoints, max(n/8, 64)))
	count := min(floorStretches, n/m)
	window := spectrum.BlackmanHarris(m)
	parts := make([][]float64, 0, count)
	for i := range count {
		from := int(int64(n-m) * int64(i) / int64(max(count-1, 1)))
		x := make([]float64, m)
		if l.sig.Read(x, from) < m {
			break
		}
		mean := 0.0
		for _, v := range x {
			mean += v / float64(m)
		}
		for k := range x {
			x[k] -= mean
		}
		src := func(dst []float64, at int) int { return copy(dst, x[min(at, m):]) }
		parts = append(parts, spectrum.Welch(src, m, l.sig.RateHz, window, m, m).S)
	}
	f := &floor{stepHz: l.sig.RateHz / float64(m), s: make([]float64, m/2+1)}
	col := make([]float64, len(parts))
	for k := range f.s {
		for i, p := range parts {
			col[i] = p[k]
		}
		slices.Sort(col)
		if len(col) > 0 {
			f.s[k] = col[len(col)/4]
		}
	}
	l.floor = f
	return f
}

// medianOf is the median of the floor between two frequencies: lines count
// little.
func (f *floor) medianOf(lo, hi float64) float64 {
	a, b := max(1, int(math.Ceil(lo/f.stepHz))), min(len(f.s)-1, int(hi/f.stepHz))
	if b < a {
		return 0
	}
	return median(f.s[a : b+1])
}

const (
	wallDB = 30 // within a twelfth of an octave; a filter of 20th order falls by 10 dB there
	// wallLow and wallHigh bound the search, the latter as a share of the
	// rate: converters' own filters fall from 0.45 of it on.
	wallLow  = 3000 // Hz
	wallHigh = 0.44
)

// wall looks for a spectrum that ends like a cliff, well below half the rate:
// a rate conversion or a coder that throws the top away. Where noise or a
// sweep was played, the wall is that of the stimulus.
func wall(l *listening) []Finding {
	if l.kind != recording.Audio || l.driven() && !l.toneMakesMost() {
		return nil
	}
	f := l.quietest()
	half := math.Pow(2, 1.0/24)
	best, at := 0.0, 0.0
	for hz := float64(wallLow); hz*half < 0.49*l.sig.RateHz; hz *= math.Pow(2, 1.0/96) {
		below, above := f.medianOf(hz/half/half, hz/half), f.medianOf(hz*half, hz*half*half)
		if below <= 0 {
			break
		}
		if d := decibels(below, above); d > best {
			best, at = d, hz
		}
	}
	if best < wallDB || at > wallHigh*l.sig.RateHz {
		return nil
	}
	// The whole of the spectrum below stands, and all above it is low.
	drop := decibels(f.medianOf(at/2, at/half), f.medianOf(at*half, 0.49*l.sig.RateHz))
	if drop < wallDB {
		return nil
	}
	text := fmt.Sprintf("%.0f dB", best)
	if best > 150 {
		text = "over 150 dB"
	}
	out := l.found(recording.ResampledLooking, 0, l.sig.Len(),
		fmt.Sprintf("the noise falls by %s within a twelfth of an octave at %.4g Hz, far below half the sample rate of %.6g Hz, and stays there: the recording went through a rate conversion or a lossy path; record without",
			text, at, l.sig.RateHz))
	out.WallHz = at
	return []Finding{out}
}

// decibels is how far power b lies under power a; what is 200 dB down counts
// as that.
func decibels(a, b float64) float64 { return 10 * math.Log10(a/math.Max(b, 1e-20*a)) }

// toneMakesMost: one line holds most of what the channel carries.
func (l *listening) toneMakesMost() bool {
	on := 0
	for _, t := range l.frames.tones() {
		on += t.len()
	}
	return 2*on >= len(l.frames.list)
}
