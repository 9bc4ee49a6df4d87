package health

import (
	"fmt"
	"math"

	"benchslip/capture/recording"
)

// twins finds channels with the same samples. leader[c] is the first channel
// that has equalled c in every cell so far, c itself when there is none.
type twins struct {
	leader []int
	alone  bool // all channels differ: nothing left to compare
}

func newTwins(channels int) *twins {
	return &twins{leader: make([]int, channels)}
}

// feed compares one cell of all channels. A channel that leaves its group
// may still have company: those that left the same leader in the same cell
// are compared with each other, so that groups only ever split.
func (t *twins) feed(x [][]float64) {
	if t.alone {
		return
	}
	t.alone = true
	old := append([]int(nil), t.leader...)
	for c := range x {
		t.leader[c] = c
		for d := old[c]; d < c; d++ {
			if old[d] == old[c] && t.leader[d] == d && equal(x[c], x[d]) {
				t.leader[c] = d
				t.alone = false
				break
			}
		}
	}
}

// equal compares bit by bit, so that two missing samples are equal.
func equal(a, b []float64) bool {
	for i, v := range a {
		if v != b[i] && math.Float64bits(v) != math.Float64bits(b[i]) {
			return false
		}
	}
	return true
}

// twinFlag: two channels with the same samples from end to end that are not
// silent. A copy is no second witness.
func twinFlag(in *recording.Info, c int, ch *channel, t *twins) *recording.Flag {
	lead := t.leader[c]
	if lead == c || ch.all.n < 2 || ch.silent() {
		return nil
	}
	f := &recording.Flag{Code: recording.IdenticalChannels, Channel: c + 1}
	f.FromS, f.ToS = place(in, 0, in.Frames)
	f.Message = fmt.Sprintf("channels %d and %d hold the same samples in all %d frames: one is a copy of the other", lead+1, c+1, in.Frames)
	return f
}
