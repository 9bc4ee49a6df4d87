package health

import (
	"fmt"
	"math"

	"benchslip/capture/recording"
)

const (
	minGap = 32 // frames of zeros from which they count
	maxGap = 0.1
	// maxGap is in seconds: zeros that last longer (and longer than maxLag
	// frames) are a silence that someone made.

	maxGaps = 512 // runs of zeros kept a channel
)

// zeros follows the runs of samples that are exactly 0.
type zeros struct {
	limit int64 // longest run kept, frames
	step  float64
	n     int64
	prev  float64 // the sample before the run
	last  float64 // the sample before this one
	runs  []recording.Run
}

func (z *zeros) feed(x []float64, at int64, lo, hi float64) {
	if len(x) == 0 {
		return
	}
	if lo > 0 || hi < 0 { // no zero among them
		z.end(at, x[0])
		z.last = x[len(x)-1]
		return
	}
	last := z.last
	for i, v := range x {
		if v == 0 {
			if z.n == 0 {
				z.prev = last
			}
			z.n++
		} else if z.n > 0 {
			z.end(at+int64(i), v)
		}
		last = v
	}
	z.last = last
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
//     was faded;
//   - a signal without noise is on its way to another value than 0 at both
//     cuts: a tone that was made to stop or start at its zero crossing is
//     not, and passes as a pause. Three or more runs of zeros of one length at
//     one distance, and no others, are a gated tone.
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
		for a, b := 0, len(right)-1; a < b; a, b = a+1, b-1 { // both now run towards the cut
			right[a], right[b] = right[b], right[a]
		}
		e := event{recording.Gap, ch.number, z.From, z.To, fmt.Sprintf("%d samples are exactly 0 while the signal goes on around them", z.To-z.From)}
		l, okL := sideOf(left, step)
		r, okR := sideOf(right, step)
		if !okL || !okR || l.rms > 4*r.rms || r.rms > 4*l.rms {
			continue
		}
		switch {
		case l.noisy && r.noisy && l.even && r.even:
			out = append(out, e)
		case !l.noisy && !r.noisy && l.cut && r.cut:
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
	near := x[max(0, len(x)-1024):]
	p, ok := fitPredictor(near)
	if !ok {
		return s, false
	}
	s.noisy = p.noisy(step)
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
