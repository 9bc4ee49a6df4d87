package oneshot

import (
	"math"
	"slices"
)

// jump is a transition of a signal between two states.
type jump struct {
	from, at, to  int // samples [from, at) before it and [at, to) after it
	before, after state
	reach         float64 // its size for choosing among several, see near
}

func (j jump) size() float64 { return math.Abs(j.after.v - j.before.v) }
func (j jump) up() bool      { return j.after.v > j.before.v }

// near is the way between the last tenth before and the first tenth after the
// transition: where a level decays all the way, its mode is the end of that,
// and says little about how large the transition was.
func (j jump) near(x []float64) float64 {
	a, _ := middle(x[j.at-max((j.at-j.from)/10, 1) : j.at])
	b, _ := middle(x[j.at : j.at+max((j.to-j.at)/10, 1)])
	return math.Abs(b - a)
}

// findJumps lists the transitions of x in order; q is the converter step (0:
// none known).
//
// The two main levels come from the histogram's lower and upper half. Where
// the signal passes from one to the other (with hysteresis from 40 % to 60 %)
// a transition lies, provided that it rests on both sides: the swings of
// ringing and the slopes of a sine are no states. A stretch between two such
// transitions that holds a smaller step of its own (a staircase) is split.
func findJumps(x []float64, q float64) []jump {
	if len(x) < 4 {
		return nil
	}
	lo, hi := slices.Min(x), slices.Max(x)
	if !(hi > lo) {
		return nil
	}
	var base, top state
	mid := (lo + hi) / 2
	for range 3 {
		base, top = modeOf(x, lo, mid, q), modeOf(x, mid, hi, q)
		mid = (base.v + top.v) / 2
	}
	size := top.v - base.v
	noise := math.Max(base.noise, top.noise)
	if size < leastStep*noise || size < 2*q {
		return nil
	}
	half := quiet(noise, size/150, len(x)/200)
	y := smooth(x, half)
	marks := states(y, passages(y, mid-0.1*size, mid+0.1*size), mid, noise/math.Sqrt(float64(2*half+1)))
	// Smaller steps inside the stretches.
	least := math.Max(0.05*size, 8*noise)
	var all []int
	last := 0
	for _, m := range append(marks, len(x)) {
		all = splits(all, y, last, m, least, 6)
		if m < len(x) {
			all = append(all, m)
		}
		last = m
	}
	if len(marks) == 0 && len(all) == 0 {
		return nil
	}
	jumps := make([]jump, len(all))
	for k, at := range all {
		j := jump{at: at, to: len(x)}
		if k > 0 {
			j.from = all[k-1]
		}
		if k+1 < len(all) {
			j.to = all[k+1]
		}
		j.before, j.after = modeOf(x[j.from:at], lo, hi, q), modeOf(x[at:j.to], lo, hi, q)
		j.reach = math.Max(j.size(), j.near(x))
		jumps[k] = j
	}
	return jumps
}

// leastStep is how far two states must lie apart, in noise RMS a sample.
const leastStep = 8

// quiet is the half width of a running mean that brings noise down to aim, at
// most most.
func quiet(noise, aim float64, most int) int {
	if noise <= aim {
		return 0
	}
	r := noise / aim
	return min(int((r*r-1)/2)+1, max(most, 0))
}

// passage is where a signal goes from one side of a level to the other.
type passage struct {
	at int // first sample on the new side
	up bool
}

// passages lists where y has gone from below lo to above hi or back; each is
// the latest passage of the middle before.
func passages(y []float64, lo, hi float64) []passage {
	var out []passage
	mid := (lo + hi) / 2
	side, middle := 0, 0
	for i, v := range y {
		if i > 0 && (v >= mid) != (y[i-1] >= mid) {
			middle = i
		}
		now := side
		if v > hi {
			now = 1
		} else if v < lo {
			now = -1
		}
		if now != side && side != 0 {
			out = append(out, passage{middle, now > 0})
		}
		side = now
	}
	return out
}

// states keeps the passages between two different states at rest: the first
// one after each.
func states(y []float64, marks []passage, mid, noise float64) []int {
	if len(marks) == 0 {
		return nil
	}
	var out []int
	rested, was, first, from := false, false, 0, 0
	for k := 0; k <= len(marks); k++ {
		to, high := len(y), k > 0 && marks[k-1].up
		if k < len(marks) {
			to, high = marks[k].at, !marks[k].up
		}
		if atRest(y[from:to], mid, noise) {
			if rested && high != was {
				out = append(out, first)
			}
			rested, was = true, high
			if k < len(marks) {
				first = marks[k].at
			}
		}
		from = to
	}
	return out
}

// atRest tells a state, or a staircase of them, from the swings of ringing and
// the slopes of a sine or ramp: from 40 % to 95 % of its length the stretch
// moves in most places by less than a twentieth of its height above (or below)
// the middle (or what noise explains) within an eighth of that time. The arch
// of a sine does so in 3 of 10 places, its tip alone (where ringing just
// reaches beyond the middle) as well, a ramp nowhere.
func atRest(y []float64, mid, noise float64) bool {
	height := 0.0
	for _, v := range y {
		height = math.Max(height, math.Abs(v-mid))
	}
	part := y[len(y)*2/5 : max(len(y)*19/20, len(y)*2/5+1)]
	lag := len(part) / 8
	limit := math.Max(height/20, math.Min(height/8, 2.5*noise))
	still := 0
	for i := range len(part) - lag {
		if math.Abs(part[i+lag]-part[i]) < limit {
			still++
		}
	}
	return 5*still >= 3*(len(part)-lag)
}

// splits appends the smaller steps between samples a and b of y: the best cut
// into two means, when both parts keep within an eighth of their distance for
// most of the time (tails and slopes do not), each over a twentieth of the
// stretch.
func splits(out []int, y []float64, a, b int, least float64, deep int) []int {
	n := b - a
	if n < 40 || deep == 0 {
		return out
	}
	total := 0.0
	for _, v := range y[a:b] {
		total += v
	}
	sum, best, cut := 0.0, 0.0, 0
	for i := a; i < b-n/20; i++ {
		sum += y[i]
		l := float64(i + 1 - a)
		if i < a+n/20 {
			continue
		}
		d := sum/l - (total-sum)/(float64(n)-l)
		if s := d * d * l * (float64(n) - l); s > best {
			best, cut = s, i+1
		}
	}
	if cut == 0 {
		return out
	}
	m1, s1 := middle(y[a:cut])
	m2, s2 := middle(y[cut:b])
	if d := math.Abs(m2 - m1); d < least || s1 > d/8 || s2 > d/8 {
		return out
	}
	out = splits(out, y, a, cut, least, deep-1)
	out = append(out, cut)
	return splits(out, y, cut, b, least, deep-1)
}

// middle is the median and the median distance from it.
func middle(x []float64) (median, spread float64) {
	s := slices.Clone(x)
	slices.Sort(s)
	median = s[len(s)/2]
	for i, v := range s {
		s[i] = math.Abs(v - median)
	}
	slices.Sort(s)
	return median, s[len(s)/2]
}
