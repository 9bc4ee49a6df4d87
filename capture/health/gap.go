package health

import (
	"fmt"
	"math"
	"slices"

	"benchslip/capture/recording"
)

const (
	minGap  = 32  // frames of zeros from which they count
	maxGaps = 512 // runs of zeros kept a channel

	// Zeros that last longer than maxLag frames are missing samples only when
	// a tone goes on in phase behind them; those that last longer than
	// maxPause seconds are a silence that someone made.
	maxPause = 0.25
)

// zeros finds the runs of samples that are exactly 0.
type zeros struct {
	limit int64 // longest run kept, frames
	step  float64
	n     int64   // zeros up to the end of the cell before
	prev  float64 // the sample before them
	last  float64 // the last sample of the cell before
	runs  []recording.Run
}

// feed takes a cell that starts at frame at, with samples from lo to hi. It
// looks at every 16th sample only until one is 0: no run of minGap hides
// between them.
func (z *zeros) feed(x []float64, at int64, lo, hi float64) {
	const stride = minGap / 2
	i := 0
	if z.n > 0 {
		for i < len(x) && x[i] == 0 {
			i++
		}
		z.n += int64(i)
		if i == len(x) {
			return
		}
		z.end(at+int64(i), x[i])
	}
	if lo <= 0 && hi >= 0 {
		for p := i + stride - 1; p < len(x); p += stride {
			if x[p] != 0 {
				continue
			}
			from, to := p, p+1
			for from > i && x[from-1] == 0 {
				from--
			}
			for to < len(x) && x[to] == 0 {
				to++
			}
			if to == len(x) {
				break // goes on in the next cell
			}
			z.open(x, from, to)
			z.end(at+int64(to), x[to])
			p = to
		}
		from := len(x)
		for from > i && x[from-1] == 0 {
			from--
		}
		z.open(x, from, len(x))
	}
	z.last = x[len(x)-1]
}

// open takes x[from:to] as the run at hand; it may be empty.
func (z *zeros) open(x []float64, from, to int) {
	z.n, z.prev = int64(to-from), z.last
	if from > 0 {
		z.prev = x[from-1]
	}
}

// end closes a run whose first frame after is frame, with value v there.
// Runs between samples of one or two steps are a quiet signal on its way
// through zero.
func (z *zeros) end(frame int64, v float64) {
	n := z.n
	z.n = 0
	if n < minGap || n > z.limit || frame == n || len(z.runs) >= maxGaps {
		return
	}
	if max(math.Abs(z.prev), math.Abs(v)) > 2*z.step {
		z.runs = append(z.runs, recording.Run{From: frame - n, To: frame})
	}
}

// gaps judges the zeros of a channel. Zeros are missing samples when the
// signal has the same level on both sides (within 12 dB), moves all the time,
// and is cut off in full swing on both sides:
//
//   - a signal with noise of its own (beyond rounding) keeps that noise to
//     the last sample before the zeros and from the first one after: nothing
//     was faded; where the zeros are long, one tone makes most of both sides
//     and its phase runs on across them (0.1 rad; by chance 3 in 100);
//   - a signal without noise is on its way to another value than 0 at both
//     cuts, at most maxLag zeros apart: a tone that was made to stop or start
//     at its zero crossing is not, and passes as a pause. Three or more runs
//     of zeros of one length at one distance, and no others, are a gated tone.
func gaps(g again, ch *channel) ([]event, error) {
	var out, clean []event
	step := ch.step(g.in)
	for i, z := range ch.zeros.runs {
		const context = 4096
		from, to := z.From-context, z.To+context
		if i > 0 {
			from = max(from, ch.zeros.runs[i-1].To)
		}
		if i+1 < len(ch.zeros.runs) {
			to = min(to, ch.zeros.runs[i+1].From)
		}
		left, _, err := g.stretch(ch.number-1, from, z.From)
		if err != nil {
			return nil, err
		}
		right, _, err := g.stretch(ch.number-1, z.To, to)
		if err != nil {
			return nil, err
		}
		slices.Reverse(right) // both now run towards the cut
		e := event{recording.Gap, ch.number, z.From, z.To, fmt.Sprintf("%d samples are exactly 0 while the signal goes on around them", z.To-z.From)}
		l, okL := sideOf(left, step)
		r, okR := sideOf(right, step)
		if !okL || !okR || l.rms > 4*r.rms || r.rms > 4*l.rms {
			continue
		}
		short := e.to-e.from <= maxLag
		switch {
		case l.noisy && r.noisy && l.even && r.even && (short || runsOn(left, right, e.to-e.from)):
			out = append(out, e)
		case !l.noisy && !r.noisy && l.cut && r.cut && short:
			clean = append(clean, e)
		}
	}
	if !regular(ch.zeros.runs) {
		out = append(out, clean...)
	}
	return out, nil
}

// side describes the signal on one side of a run of zeros.
type side struct {
	rms   float64
	noisy bool // it holds noise beyond rounding
	even  bool // which is as strong at the cut as elsewhere
	cut   bool // it was on its way to another value than 0
}

// sideOf looks at a stretch whose last sample is next to the zeros; false
// when it is too short or no live signal.
func sideOf(x []float64, step float64) (side, bool) {
	var s side
	if len(x) < 128 {
		return s, false
	}
	moves := 0
	for i, v := range x {
		s.rms += v * v
		if i > 0 && v != x[i-1] {
			moves++
		}
	}
	s.rms = math.Sqrt(s.rms / float64(len(x)))
	if 2*moves < len(x) || s.rms < 8*step {
		return s, false
	}
	// It must be live up to the cut: a pulse has a quiet base behind it.
	last := 0.0
	for _, v := range x[len(x)-16:] {
		last += v * v / 16
	}
	if last < 9*step*step {
		return s, false
	}
	near := x[max(0, len(x)-1024):]
	p, ok := fitPredictor(near)
	if !ok {
		return s, false
	}
	s.noisy = noisy(p.errs, near, step)
	s.even = p.tail(64) > 0.4
	move, peak := 0.0, 0.0
	for i, v := range near {
		peak = max(peak, math.Abs(v))
		if i > 0 {
			move = max(move, math.Abs(v-near[i-1]))
		}
	}
	// What the first zero should have been. A made tone stops within a
	// sample or so of its crossing.
	v := math.Abs(p.next(near))
	s.cut = v > min(1.5*move, 0.3*peak) && v > 4*p.max && v > 4*step
	return s, true
}

// runsOn says whether one tone makes most of both sides and keeps its size
// (5 %) and phase across the zeros. Both sides run towards the cut.
func runsOn(left, right []float64, zeros int64) bool {
	l, okL := fitSine(left)
	r, okR := fitSine(right)
	if !okL || !okR || l.share < sineShare || r.share < sineShare || math.Abs(l.peak-r.peak) > 0.05*max(l.peak, r.peak) {
		return false
	}
	// The phase at the first zero, seen from both sides. Mirrored in time the
	// phase runs backwards; the zeros lie on top of the last sample's step.
	omega, n := (l.omega+r.omega)/2, float64(zeros)
	if math.Abs(l.omega-r.omega)*n > 0.5 {
		return false
	}
	fromLeft := l.phase + l.omega*float64(len(left))
	fromRight := -(r.phase + r.omega*float64(len(right))) - omega*(n-1)
	return math.Abs(math.Remainder(fromLeft-fromRight, 2*math.Pi)) < 0.1
}

// regular: at least three runs of one length at one distance, to a frame.
func regular(runs []recording.Run) bool {
	if len(runs) < 3 {
		return false
	}
	length, apart := runs[0].To-runs[0].From, runs[1].From-runs[0].From
	for i, r := range runs {
		if d := r.To - r.From - length; d < -1 || d > 1 {
			return false
		}
		if i == 0 {
			continue
		}
		if d := r.From - runs[i-1].From - apart; d < -1 || d > 1 {
			return false
		}
	}
	return true
}
