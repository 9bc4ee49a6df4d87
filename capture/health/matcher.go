package health

import (
	"math"
	"math/bits"
)

const (
	minLag  = 64         // shortest block whose repetition is looked for, frames
	maxLag  = 4096       // longest
	history = 2 * maxLag // frames kept before the cell at hand

	window     = 32 // frames compared by their hash
	minChanges = 8  // of them that must differ from the one before

	maxFound = 256 // matches kept a channel
)

// match is a stretch of a channel that equals what lay lag frames before it:
// x[i] == x[i-lag] for from <= i < to, and not for the frames around.
type match struct {
	lag      int64
	from, to int64
}

// matcher finds matches on the fly. Every 32nd frame the hash of the last 32
// samples is kept (an anchor); the hash that rolls along with each sample is
// looked up among the anchors of the last 4096 frames. A block of 64 frames
// holds at least one anchor's samples whole, wherever it starts. What agrees
// in the hash is compared sample by sample; then the match is followed to its
// end, and others wait meanwhile: in a periodic signal the shortest lag of at
// least 64 takes all.
//
// Windows where little changes (the base of a pulse, coarse steps) say
// nothing and make no anchors.
type matcher struct {
	hash uint64

	anchors [maxLag/window + 1]anchor
	oldest  int
	pending anchor
	newest  [1 << 14]uint8 // by the top bits of the hash: index in anchors + 1; 0: none

	now   match // the match that goes on; lag 0: none
	found []match
}

type anchor struct {
	hash   uint64
	end    int64 // last frame
	live   bool
	before uint8 // the next older one with the same top bits, as in newest
}

const hashBase = 0x9E3779B97F4A7C15

// hashLeave is hashBase^window: the weight of the sample that leaves.
var hashLeave = func() uint64 {
	p := uint64(1)
	for range window {
		p *= hashBase
	}
	return p
}()

// mix brings the upper bits of a float64 down, from where multiplication
// spreads them: below, samples of few bits have only zeros.
func mix(v float64) uint64 { return bits.RotateLeft64(math.Float64bits(v), 32) }

// newMatcher starts with a history that equals nothing, itself neither: NaN.
func newMatcher() *matcher {
	m := &matcher{}
	for range window {
		m.hash = m.hash*hashBase + mix(math.NaN())
	}
	return m
}

// feed takes w = history frames followed by a cell that starts at frame at.
// Both are multiples of window, but for a last short cell. still: all samples
// of the cell are equal.
func (m *matcher) feed(w []float64, at int64, still bool) {
	if still && m.now.lag == 0 && w[history-1] == w[history] && equal(w[history-window:history-1], w[history-window+1:history]) {
		for i := history; i+window <= len(w); i += window {
			m.keep(anchor{}) // the hash stays what it is
		}
		return
	}
	for i := history; i < len(w); i += window {
		part := w[i:min(i+window, len(w))]
		m.roll(w, i, len(part), at-history)
		if len(part) == window {
			m.keep(anchor{hash: m.hash, end: at + int64(i+window-1-history), live: changes(part) >= minChanges})
		}
	}
}

// changes counts the samples that differ from the one before. In noise of few
// codes that is a coin toss, so there is no branch on it.
func changes(x []float64) int {
	n := uint64(0)
	before := math.Float64bits(x[0])
	for _, v := range x[1:] {
		u := math.Float64bits(v)
		d := u ^ before
		n += (d | -d) >> 63
		before = u
	}
	return int(n)
}

// roll takes n samples from w[i] on; w[0] is frame zero.
func (m *matcher) roll(w []float64, i, n int, zero int64) {
	in, out, hash := w[i:i+n], w[i-window:i-window+n], m.hash
	for k, v := range in {
		hash = hash*hashBase + mix(v) - mix(out[k])*hashLeave
		if m.now.lag > 0 {
			if v != w[i+k-int(m.now.lag)] {
				m.end(zero + int64(i+k))
			}
		} else if m.newest[hash>>50] != 0 {
			m.lookUp(w, i+k, zero, hash)
		}
	}
	m.hash = hash
}

// keep files the anchor before this one, so that lags up to 32 do not turn
// up, and drops the one that has grown too old.
func (m *matcher) keep(a anchor) {
	slot := &m.anchors[m.oldest]
	if top := &m.newest[slot.hash>>50]; slot.live && int(*top) == m.oldest+1 {
		*top = 0
	}
	*slot, m.pending = m.pending, a
	if slot.live {
		top := &m.newest[slot.hash>>50]
		slot.before, *top = *top, uint8(m.oldest+1)
	}
	m.oldest = (m.oldest + 1) % len(m.anchors)
}

// lookUp starts a match when the window that ends at w[i] lay there before,
// at the smallest lag.
func (m *matcher) lookUp(w []float64, i int, zero int64, hash uint64) {
	frame, last := zero+int64(i), int64(math.MaxInt64)
	for k := m.newest[hash>>50]; k != 0; k = m.anchors[k-1].before {
		a := &m.anchors[k-1]
		if !a.live || a.end >= last { // its place went to a newer one
			return
		}
		last = a.end
		lag := frame - a.end
		if a.hash != hash || lag < minLag || lag > maxLag {
			continue
		}
		s, d := i+1, int(lag)
		for s-1-d >= 0 && w[s-1] == w[s-1-d] {
			s--
		}
		if i+1-s >= window {
			m.now = match{lag: lag, from: zero + int64(s)}
			return
		}
	}
}

// end closes the match that goes on, at the first frame that differs.
func (m *matcher) end(frame int64) {
	now := m.now
	m.now = match{}
	now.to = frame
	if now.lag > 0 && now.to-now.from >= minLag && len(m.found) < maxFound {
		m.found = append(m.found, now)
	}
}
