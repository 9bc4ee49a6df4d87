package health

import (
	"fmt"
	"math"
	"slices"

	"benchslip/capture/recording"
)

// repeats judges the matches of a channel. A periodic signal repeats by
// itself; what is flagged is one of these:
//
//   - the prediction that holds inside the block breaks where the copy
//     starts: the signal jumps there as it does nowhere else;
//   - the block holds noise beyond rounding, which never repeats. When the
//     match is longer than the lag (a block stuck, or a periodic stimulus
//     that was never analogue), equality must also start abruptly.
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
	x, start, err := g.stretch(c, m.from-m.lag-context, m.from+4)
	if err != nil {
		return false, err
	}
	a := int(m.from - start) // where the copy starts in x
	if a < int(m.lag) || a > len(x) {
		return false, nil
	}
	after, _, err := g.stretch(c, m.to, m.to+window)
	if err != nil {
		return false, err
	}
	block := x[a-int(m.lag) : a]
	if p := innerPeriod(block); p > 0 && len(block)%p == 0 {
		return false, nil
	}
	before := x[max(0, a-int(m.lag)-window) : a-int(m.lag)]
	if still(before) && (still(after) || m.to-m.from >= 2*m.lag) {
		return false, nil
	}

	fitFrom := max(0, a-max(int(m.lag)+2*order, context))
	p, ok := fitPredictor(x[fitFrom:a])
	if !ok {
		p, ok = fitPredictor(block)
		if !ok {
			return false, nil
		}
	}
	full := m.to-m.from >= m.lag // as long as the lag: the block follows itself
	jump := 0.0
	for i := a; i < len(x); i++ {
		jump = max(jump, math.Abs(x[i]-p.next(x[:i])))
	}
	if full && jump > 4*p.max && jump > 4*step {
		return true, nil
	}
	if !p.noisy(step) {
		return false, nil
	}
	if m.to-m.from < 2*m.lag {
		return true, nil
	}
	// A long match: was the signal a different one before it?
	var d []float64
	for i := max(a-64, int(m.lag)); i < a; i++ {
		d = append(d, math.Abs(x[i]-x[i-int(m.lag)]))
	}
	if len(d) < window {
		return false, nil
	}
	slices.Sort(d)
	mid := d[len(d)/2]
	return mid > 4*step && mid > 1e-6*p.rms, nil
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
