package health

import (
	"fmt"
	"math"
	"slices"

	"benchslip/capture/recording"
)

// minStale is the length in frames from which a block counts that came before
// but does not follow itself.
const minStale = 256

// repeats judges the matches of a channel. A periodic signal repeats by
// itself, and a nearly periodic one in coarse steps does so here and there.
// A match is flagged when it begins and ends abruptly - around it, at the
// same lag, most samples differ - and one of these holds:
//
//   - the prediction that is good inside the block breaks where the copy
//     starts: the signal jumps there as it does nowhere else;
//   - the block holds noise beyond rounding, which never repeats.
//
// Not flagged: blocks with an inner period that divides the lag, and what is a
// periodic stimulus rather: matches between silences or the ends of the
// recording, and long ones that come out of silence.
func repeats(g again, ch *channel) ([]event, error) {
	var out []event
	step := ch.step(g.in)
	for _, m := range ch.match.found {
		bad, err := badRepeat(g, ch.number-1, m, step)
		if err != nil {
			return nil, err
		}
		if bad {
			out = append(out, event{recording.RepeatedBlock, ch.number, m.from, m.to,
				fmt.Sprintf("%d samples repeat those %d samples before", m.to-m.from, m.lag)})
		}
	}
	return out, nil
}

func badRepeat(g again, c int, m match, step float64) (bool, error) {
	const context = 1024
	lag, long := int(m.lag), m.to-m.from
	if long < m.lag && long < minStale {
		return false, nil
	}
	x, start, err := g.stretch(c, m.from-m.lag-context, m.from+4)
	if err != nil {
		return false, err
	}
	after, _, err := g.stretch(c, m.to-m.lag, m.to+2*window)
	if err != nil {
		return false, err
	}
	a := int(m.from - start) // where the copy starts in x
	if a < lag || a > len(x) || len(after) < lag {
		return false, nil
	}
	if step == 0 { // decimal digits have one, float samples next to none
		step = leastStep(x)
	}
	if !differs(x[max(lag, a-2*window)-lag:a], lag, step) || !differs(after, lag, step) {
		return false, nil
	}
	before := x[max(0, a-lag-window) : a-lag]
	if still(before) && (still(after[lag:]) || long >= 2*m.lag) {
		return false, nil
	}
	if p := innerPeriod(x[a-lag : a]); p > 0 && lag%p == 0 {
		return false, nil
	}

	if long >= m.lag {
		// The block follows itself: is there a break between the two?
		p, ok := fitPredictor(x[max(0, a-max(lag+2*order, context)):a])
		if ok {
			jump := 0.0
			for i := a; i < len(x); i++ {
				jump = max(jump, math.Abs(x[i]-p.next(x[:i])))
			}
			if jump > 4*p.max && jump > 4*step {
				return true, nil
			}
		}
	}
	// Is what came twice noise? A short block is modelled with what lies
	// before it.
	n := int(min(long, m.lag))
	end := a - lag + n
	p, ok := fitPredictor(x[max(0, end-max(n, 256)):end])
	if !ok {
		if p, ok = fitPredictor(x[end-n : end]); !ok {
			return false, nil
		}
	}
	original := x[end-n : end]
	return variety(original, 4) && noisy(p.errs[max(0, len(p.errs)-n):], original, step), nil
}

// variety says whether x holds at least n different values.
func variety(x []float64, n int) bool {
	var seen []float64
	for _, v := range x {
		if !slices.Contains(seen, v) {
			if seen = append(seen, v); len(seen) >= n {
				return true
			}
		}
	}
	return false
}

// differs says whether the samples from x[lag] on are others than those lag
// before: at least half differ by more than half a step (or what a float32
// rounds), and not by one step to one side only, as a signal does that just
// fails to repeat. True also where there are too few samples to say.
func differs(x []float64, lag int, step float64) bool {
	all := len(x) - lag
	if all < window {
		return true
	}
	up, down, far := 0, 0, 0
	for i := lag; i < len(x); i++ {
		d := x[i] - x[i-lag]
		tiny := max(step/2, 1e-6*math.Abs(x[i]))
		if d > tiny {
			up++
		} else if d < -tiny {
			down++
		}
		if math.Abs(d) > 3*tiny {
			far++
		}
	}
	return 2*far >= all || 2*(up+down) >= all && 8*min(up, down) >= all
}

// still says that samples end there or stand still.
func still(x []float64) bool {
	if len(x) < window {
		return true
	}
	for _, v := range x[1 : len(x)-1] { // the ones at the ends may be chance
		if v != x[1] {
			return false
		}
	}
	return true
}

// innerPeriod is the smallest p <= len(x)/2 with x[i] == x[i-p] throughout;
// 0: none.
func innerPeriod(x []float64) int {
	for p := 1; p <= len(x)/2; p++ {
		i := p
		for i < len(x) && x[i] == x[i-p] {
			i++
		}
		if i == len(x) {
			return p
		}
	}
	return 0
}
