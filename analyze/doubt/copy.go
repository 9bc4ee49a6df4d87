package doubt

import (
	"fmt"
	"math"

	"benchslip/analyze"
	"benchslip/capture/recording"
)

// A channel that is another one times a digital gain g differs from it by
// rounding alone: never by more than half a step. Two converters never do
// that, even without noise of their own, since each rounds by itself: half a
// step and g/2 more. The limit lies between the two. Made signals without any
// noise are left alone (with a gain of 1/2, 1/3 ... they round alike), and so
// is noise that was played into a unit: there it is the signal.
const (
	between   = 0.25 // of g beyond half a step
	leastGain = 0.05
	leastSpan = 64 // steps RMS in both channels
	copyBlock = 1 << 14
)

// copies compares each pair of channels.
func copies(channels []*listening) []Finding {
	var out []Finding
	for i, c := range channels {
		for _, d := range channels[:i] {
			for _, p := range [][2]*listening{{d, c}, {c, d}} {
				if f, ok := copied(p[0], p[1]); ok {
					out = append(out, f)
					break
				}
			}
		}
	}
	return out
}

// copied: channel b is channel a times a gain of less than 1, rounded.
func copied(a, b *listening) (Finding, bool) {
	if b.kind != recording.Audio || b.sig.Step <= 0 || !b.noisy() || b.driven() && !b.toneMakesMost() {
		return Finding{}, false
	}
	// The first loud block makes a quick no of all others.
	g, loud := 0.0, false
	c := pair{a: a.sig, b: b.sig}
	c.each(func(x, y []float64) bool {
		xx, xy, yy := products(x, y)
		loud = yy > leastSpan*leastSpan*b.sig.Step*b.sig.Step*float64(len(y))
		if loud {
			g = xy / xx
		}
		return !loud
	})
	if !loud || !c.fits(g, copyBlock) {
		return Finding{}, false
	}
	var all, cross float64
	c.each(func(x, y []float64) bool {
		xx, xy, _ := products(x, y)
		all, cross = all+xx, cross+xy
		return true
	})
	g = cross / all
	raw := math.Abs(g) * a.sig.Scale() / b.sig.Scale() // between the files' own numbers
	if raw > 1-1e-6 || raw < leastGain || !c.fits(g, a.sig.Len()) {
		return Finding{}, false
	}
	f := b.found(recording.IdenticalChannels, 0, b.sig.Len(),
		fmt.Sprintf("channel %d is channel %d times %.6g (%.2f dB), to half a converter step in all %d samples: a copy made after the converter, no second witness",
			b.sig.Channel(), a.sig.Channel(), g, 20*math.Log10(math.Abs(g)), b.sig.Len()))
	f.Take, f.Channel, f.Source = b.Take.Name, b.sig.Channel(), a.sig.Channel()
	return f, true
}

// pair reads two channels side by side.
type pair struct{ a, b *analyze.Signal }

// each gives block after block to fn until it says no.
func (p pair) each(fn func(x, y []float64) bool) {
	x, y := make([]float64, copyBlock), make([]float64, copyBlock)
	for at := 0; at < p.a.Len(); {
		k := min(p.a.Read(x, at), p.b.Read(y, at))
		if k == 0 || !fn(x[:k], y[:k]) {
			return
		}
		at += k
	}
}

// fits: b is g times a to its rounding, over the first n samples.
func (p pair) fits(g float64, n int) bool {
	limit := (0.5 + between*math.Abs(g)*p.a.Scale()/p.b.Scale()) * p.b.Step
	ok, seen := true, 0
	p.each(func(x, y []float64) bool {
		for i, v := range x {
			ok = ok && math.Abs(y[i]-g*v) <= limit
		}
		seen += len(x)
		return ok && seen < n
	})
	return ok
}

func products(x, y []float64) (xx, xy, yy float64) {
	for i, v := range x {
		xx, xy, yy = xx+v*v, xy+v*y[i], yy+y[i]*y[i]
	}
	return xx, xy, yy
}
