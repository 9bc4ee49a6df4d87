package oneshot

import (
	"fmt"
	"math"

	"benchslip/analyze"
)

// edge is one transition of a signal with its reference instants. Sample
// indexes are of the signal, fractions of one included; levels are in the
// signal's unit; v(i) = (x[i] - before)/(after - before) runs from 0 to 1,
// whether the edge rises or falls.
type edge struct {
	s      *analyze.Signal
	x      []float64
	jump   jump
	others int // transitions beside it

	noise         float64 // RMS a sample, in v
	step          float64 // converter step, in v
	uBefore       float64 // standard uncertainties of the two levels, in v
	uAfter        float64
	remaining     float64 // what the level after it had still to go, in v
	moved         float64 // and by how much it moved over its last tenth
	t10, t50, t90 instant
	first, last   int // samples of the last one up to 10 % and the first one from 90 %
}

// instant is where a level is crossed.
type instant struct {
	at     float64 // sample index
	slope  float64 // of v a sample
	uNoise float64 // standard uncertainties of at from noise, converter steps,
	uStep  float64 // and the course between samples
	uShape float64
}

// direction of the edges that a measure looks at.
type direction int

const (
	either direction = iota
	rising
	falling
)

func (d direction) takes(j jump) bool {
	return d == either || j.up() == (d == rising)
}

// jumpsOf finds the transitions of a signal once.
func jumpsOf(p *analyze.Pass, s *analyze.Signal, x []float64) []jump {
	return p.Stages.Once("oneshot/jumps/"+s.ID(), func() any { return findJumps(x, s.Step) }).([]jump)
}

// edgeOf finds the transition to measure: the first in a direction whose size
// is over half of the largest of them.
func edgeOf(p *analyze.Pass, d direction) (*edge, *analyze.Refusal) {
	s, x, bad := samples(p)
	if bad != nil {
		return nil, bad
	}
	all := jumpsOf(p, s, x)
	largest := 0.0
	for _, j := range all {
		if d.takes(j) {
			largest = math.Max(largest, j.reach)
		}
	}
	for _, j := range all {
		if !d.takes(j) || j.reach <= largest/2 {
			continue
		}
		e := &edge{s: s, x: x, jump: j, others: len(all) - 1}
		if bad := e.find(); bad != nil {
			return nil, bad
		}
		return e, nil
	}
	word := map[direction]string{either: "step", rising: "rising step", falling: "falling step"}[d]
	return nil, &analyze.Refusal{Code: analyze.NoSignal,
		Text:   fmt.Sprintf("take %q, channel %d: no %s stands out: the signal rests on one level, or on none", s.Take.Name, s.Channel(), word),
		Advice: "trigger on the edge, with some of the level before and all of the level after it on the screen"}
}

func (e *edge) v(i int) float64 {
	return (e.x[i] - e.jump.before.v) / (e.jump.after.v - e.jump.before.v)
}

// size of the step in the signal's unit.
func (e *edge) size() float64 { return e.jump.size() }

func (e *edge) level(v float64) float64 {
	return e.jump.before.v + v*(e.jump.after.v-e.jump.before.v)
}

// find fills in everything below the jump.
func (e *edge) find() *analyze.Refusal {
	j, size := e.jump, e.jump.size()
	e.noise = math.Max(j.before.noise, j.after.noise) / size
	e.step = e.s.Step / size
	// A first look at the samples as they stand tells how long the edge is, a
	// second one through a running mean an eighth as long (noise) is used.
	v := make([]float64, j.to-j.from)
	for i := range v {
		v[i] = e.v(j.from + i)
	}
	start := j.at - j.from
	a, b, ok := around(v, start)
	if ok {
		if half := quiet(e.noise, 0.01, (b-a)/16); half > 0 {
			v = smooth(v, half)
			a, b, ok = around(v, start)
		}
	}
	if !ok {
		return &analyze.Refusal{Code: analyze.TooShort,
			Text:   fmt.Sprintf("take %q: the step at %.6g s does not run from 10 %% to 90 %% of its levels inside the record", e.s.Take.Name, timeOf(e.s, float64(j.at))),
			Advice: "record more of the levels before and after the edge"}
	}
	e.first, e.last = j.from+a, j.from+b
	e.t10 = e.instant(v, a, b, 0.1)
	e.t50 = e.instant(v, a, b, 0.5)
	e.t90 = e.instant(v, a, b, 0.9)
	e.levels()
	return nil
}

// levels finds the uncertainties of the two levels: how well the histogram
// gives them, and how far what lies next to the edge (before) or at the end
// (after) departs from them.
func (e *edge) levels() {
	j, size := e.jump, e.jump.size()
	long := e.last - e.first
	before := e.x[j.from:max(e.first-long, j.from+1)]
	after := e.x[min(e.last, j.to-1):j.to]
	if j.to < len(e.x) { // leave the next edge out
		after = after[:max(len(after)-long, len(after)/2, 1)]
	}
	e.uBefore = math.Hypot(j.before.u, apart(before, j.before))
	rest, moved := creep(after, e.s.Step)
	e.remaining, e.moved = rest/size, moved/size
	e.uAfter = math.Hypot(math.Hypot(j.after.u, apart(after, j.after)), rest/math.Sqrt(3))
	e.uBefore = math.Hypot(e.uBefore/size, levelU)
	e.uAfter = math.Hypot(e.uAfter/size, levelU)
}

// levelU is the least standard uncertainty of a level, of the step: what a
// tail that still creeps leaves in a mode (an exponential one that is recorded
// for 12 time constants, in noise that hides its last half: 0.04 %).
const levelU = 3e-4

// apart is how far the last tenth of a stretch lies from its level, as a
// rectangular error; noise and steps are taken off.
func apart(x []float64, s state) float64 {
	n := max(len(x)/10, 1)
	mean := 0.0
	for _, v := range x[len(x)-n:] {
		mean += v / float64(n)
	}
	d := math.Abs(mean-s.v) - 3*s.noise/math.Sqrt(float64(n)) - s.u
	return math.Max(d, 0) / math.Sqrt(3)
}

// around finds the first sample from 90 % on and, before it, the last one up
// to 10 %.
func around(v []float64, start int) (a, b int, ok bool) {
	for b = start; b < len(v) && v[b] < 0.9; b++ {
	}
	if b == len(v) {
		return 0, 0, false
	}
	for a = b - 1; a >= 0 && v[a] > 0.1; a-- {
	}
	return a, b, a >= 0
}

// instant finds where v (index 0 is sample jump.from) crosses a level, between
// its last sample up to 10 % (a) and its first from 90 % (b).
func (e *edge) instant(v []float64, a, b int, level float64) instant {
	const near = 0.07 // of the step to both sides: clear of the corners of a ramp and of a simple pole
	i := b - 1        // last sample below the level
	if level < 0.9 {
		for i > a && v[i] > level {
			i--
		}
	}
	reach := max(int(0.12*float64(b-a)), 1)
	lo, hi := i, i+1
	for lo > 0 && i-lo < reach && v[lo] > level-near {
		lo--
	}
	for hi < len(v)-1 && hi-i < reach && v[hi] < level+near {
		hi++
	}
	f := e.jump.from
	raw := math.Sqrt(math.Max(e.noise*e.noise-e.step*e.step/12, 0)) // noise beside the steps
	if hi-lo+1 >= 6 {
		y := make([]float64, hi-lo+1)
		for k := range y {
			y[k] = e.v(f + lo + k)
		}
		p := fitPoly(y, degreeFor(len(y)))
		if at, ok := p.solve(level, float64(i-lo)); ok {
			if sl := p.slopeAt(at); sl > 0 {
				codes := math.Max(1, math.Abs(p.at(float64(len(y)-1))-p.at(0))/math.Max(e.step, 1e-300))
				return instant{at: float64(f+lo) + at, slope: sl, uNoise: raw * p.spread(at) / sl,
					uStep: e.step / math.Sqrt(12) / math.Sqrt(codes) / sl, uShape: 0.02}
			}
		}
	}
	// The straight line between two samples. Raw ones, if they straddle the
	// level; else those of the running mean.
	y0, y1 := e.v(f+i), e.v(f+i+1)
	if !(y0 <= level && y1 > level) {
		y0, y1 = v[i], v[i+1]
	}
	sl := y1 - y0
	part := 0.5
	if sl > 0 {
		part = math.Min(math.Max((level-y0)/sl, 0), 1)
	}
	sl = math.Max(sl, 1e-9)
	// Between two samples a band-limited edge departs from the straight line
	// by up to about a seventh of their distance.
	return instant{at: float64(f+i) + part, slope: sl, uNoise: raw * math.Hypot(1-part, part) / sl,
		uStep: e.step / math.Sqrt(12) / sl, uShape: 0.15 / math.Sqrt(3)}
}

// degreeFor is the degree of a short polynomial through n samples.
func degreeFor(n int) int {
	if n >= 12 {
		return 3
	}
	return 2
}

// inside is the number of samples between the 10 % and the 90 % crossing.
func (e *edge) inside() int {
	return int(math.Ceil(e.t90.at)) - int(math.Floor(e.t10.at)) - 1
}
