package stage

import (
	"math"
	"math/cmplx"
)

// Folded is a waveform folded on the mains period.
type Folded struct {
	Mean    []float64 // V, by phase from 0 to one turn
	Periods int       // periods averaged
}

// foldSeconds is how much of a take is folded: phases of harmonics wander
// against the fundamental, so not much more than a second.
const foldSeconds = 2

// FoldMains averages a stretch about the middle of a signal over its mains
// periods: DC, tone and other lines taken off, phase 0 where the fundamental
// rises through zero (phase 0 of the track where it does not stand out).
func FoldMains(l *Lines, bins int) Folded {
	f := Folded{Mean: make([]float64, bins)}
	if l.MainsTrack == nil || bins < 1 || len(l.Blocks) == 0 {
		return f
	}
	n := min(l.Sig.Len(), int(foldSeconds*l.Sig.RateHz))
	from := (l.Sig.Len() - n) / 2
	y := make([]float64, n)
	y = y[:l.Sig.Read(y, from)]
	var others []*Line
	for _, q := range l.all() {
		if !l.isMains(q) {
			others = append(others, q)
		}
	}
	r := l.newRemover(others)
	r.take(y, from)
	start := 0.0 // turns
	if q := l.Mains; len(q) > 0 && !q[0].Dropped && q[0].Power > 4*q[0].Share {
		middle := l.Sig.Len() / 2
		for m, b := range l.Blocks {
			if b.From <= middle && middle < b.To {
				start = cmplx.Phase(q[0].Blocks[m])/(2*math.Pi) + 0.25
			}
		}
	}
	count := make([]int, bins)
	for i, v := range y {
		turn := l.MainsTrack.Turns(float64(from+i)) + start
		k := int((turn - math.Floor(turn)) * float64(bins))
		k = min(k, bins-1)
		f.Mean[k] += v
		count[k]++
	}
	for k := range f.Mean {
		if count[k] > 0 {
			f.Mean[k] /= float64(count[k])
		} else if k > 0 {
			f.Mean[k] = f.Mean[k-1] // fewer samples a period than bins
		}
	}
	f.Periods = int(float64(len(y)) / l.Sig.RateHz * l.MainsHz)
	return f
}
