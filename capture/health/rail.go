package health

import (
	"math"

	"benchslip/capture/recording"
)

const (
	// minRun is the number of equal samples in a row from which they count
	// as a run: 3 at the extreme code are clipping.
	minRun = 3

	// maxRuns is how many runs a channel keeps; beyond, near ones are joined.
	maxRuns = 1024
)

// rail follows the runs of equal samples at one end of the range: at a given
// value, or at the largest so far. Samples are multiplied by sign, so that
// the lower end is the upper end of the mirrored signal.
type rail struct {
	sign  float64
	fixed bool    // value stands; else it is the largest seen
	value float64 // sign * sample
	first int64   // frame where value was first met

	open    int64 // first frame of the run that goes on
	n       int64 // its samples so far
	runs    []recording.Run
	join    int64 // gap in frames across which runs are joined
	places  int64 // runs of at least minRun
	samples int64 // samples in them
	longest recording.Run
}

func newRail(sign float64) rail { return rail{sign: sign, value: math.Inf(-1), first: -1} }

func fixedRail(sign, value float64) rail {
	return rail{sign: sign, fixed: true, value: value, first: -1}
}

// feed takes a cell that starts at frame at and whose largest sign * sample
// is top; still: all samples are present and equal.
func (r *rail) feed(x []float64, at int64, top float64, still bool) {
	if top > r.value && !r.fixed {
		*r = rail{sign: r.sign, value: top, first: -1}
	}
	if top < r.value || still && top != r.value || math.IsInf(top, -1) {
		r.end()
		return
	}
	want := r.sign * r.value
	if still {
		if r.n == 0 {
			r.open = at
			if r.first < 0 {
				r.first = at
			}
		}
		r.n += int64(len(x))
		return
	}
	for i, v := range x {
		if v != want {
			if r.n > 0 {
				r.end()
			}
			continue
		}
		if r.n == 0 {
			r.open = at + int64(i)
			if r.first < 0 {
				r.first = r.open
			}
		}
		r.n++
	}
}

// end closes the run that goes on, if there is one.
func (r *rail) end() {
	n := r.n
	r.n = 0
	if n < minRun {
		return
	}
	r.places++
	r.samples += n
	run := recording.Run{From: r.open, To: r.open + n}
	if n > r.longest.To-r.longest.From {
		r.longest = run
	}
	r.runs = append(r.runs, run)
	for len(r.runs) > maxRuns {
		r.join = max(64, 2*r.join)
		r.runs = joined(r.runs, r.join)
	}
	if k := len(r.runs); r.join > 0 && k > 1 && r.runs[k-1].From-r.runs[k-2].To <= r.join {
		r.runs[k-2].To = r.runs[k-1].To
		r.runs = r.runs[:k-1]
	}
}

// joined makes one run of neighbours at most gap frames apart; runs lie in
// order of From.
func joined(runs []recording.Run, gap int64) []recording.Run {
	out := runs[:0]
	for _, run := range runs {
		if k := len(out); k > 0 && run.From-out[k-1].To <= gap {
			out[k-1].To = max(out[k-1].To, run.To)
			continue
		}
		out = append(out, run)
	}
	return out
}
