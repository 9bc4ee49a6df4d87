package stage

import (
	"math"
	"math/cmplx"

	"benchslip/analyze/internal/sinefit"
)

// lendOver: a fundamental so far over the noise share of a block (30 dB) is
// the supply's phase to 0.02 rad in every block.
const lendOver = 1000

// supplyTrack is the mains track to lend to other channels: that of the
// fundamental's own phase where it stands well out of the noise, else the
// comb's; nil without one. A comb's track follows its harmonics, whose phases
// wander; of a mains reference only the fundamental counts.
func (l *Lines) supplyTrack() *sinefit.Track {
	if l == nil || !l.MainsFound {
		return nil
	}
	t := *l.MainsTrack // a copy: lines know their kind by their track
	M := len(l.Blocks)
	if M < 2 || len(l.Mains) == 0 || l.Mains[0].Dropped || l.Mains[0].Power < lendOver*l.Mains[0].Share {
		return &t
	}
	turned := make([]float64, M) // turns, without jumps
	for m, z := range l.Mains[0].Blocks {
		turned[m] = cmplx.Phase(z) / (2 * math.Pi)
		if m > 0 {
			d := turned[m] - turned[m-1]
			turned[m] -= math.Round(d)
		}
	}
	out := &sinefit.Track{Len: t.Len, Nu: t.Nu, UNu: t.UNu}
	for m, b := range l.Blocks {
		at := b.Middle()
		from, to := max(m-1, 0), min(m+1, M-1)
		slope := (turned[to] - turned[from]) / (l.Blocks[to].Middle() - l.Blocks[from].Middle())
		// Turns leaves the deviation unreduced.
		dev := t.Turns(at) - sinefit.Turns(t.Nu, at-float64(t.Len-1)/2)
		out.At = append(out.At, at)
		out.Dev = append(out.Dev, dev+turned[m])
		out.Slope = append(out.Slope, t.NuAt(at)-t.Nu+slope)
		out.Spread += math.Pow(out.Slope[m], 2) / float64(M)
	}
	out.Spread = math.Sqrt(out.Spread)
	return out
}
