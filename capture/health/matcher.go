package health

import "math"

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
// holds at least one anchor's samples whole, wherever it starts. Matches of
// the hash are compared sample by sample; then the match is followed to its
// end, and others wait meanwhile: in a periodic signal the shortest lag of at
// least 64 takes all.
//
// Windows where little changes (the base of a pulse, coarse steps) say
// nothing and are not looked up.
type matcher struct {
	hash    uint64
	changes int

	anchors [maxLag/window + 1]anchor
	next    int // oldest anchor
	pending anchor
	seen    [1 << 14]uint8 // anchors by the top bits of their hash

	now   match // the match that goes on; lag 0: none
	found []match
}

type anchor struct {
	hash uint64
	end  int64 // last frame
	live bool
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

// mix brings the upper bits of a float64 down: samples of few bits have only
// zeros below.
func mix(v float64) uint64 {
	u := math.Float64bits(v)
	return u ^ u>>27
}

// newMatcher starts with a history that equals nothing, itself neither: NaN.
func newMatcher() *matcher {
	m := &matcher{changes: window}
	for range window {
		m.hash = m.hash*hashBase + mix(math.NaN())
	}
	return m
}

// feed takes w = history frames followed by a cell that starts at frame at.
func (m *matcher) feed(w []float64, at int64) {
	hash, changes := m.hash, m.changes
	for i := history; i < len(w); i++ {
		v, old := w[i], w[i-window]
		hash = hash*hashBase + mix(v) - mix(old)*hashLeave
		if v != w[i-1] {
			changes++
		}
		if old != w[i-window-1] {
			changes--
		}
		if m.now.lag > 0 {
			if v != w[i-int(m.now.lag)] {
				m.end(at + int64(i-history))
			}
		} else if m.seen[hash>>50] != 0 && changes >= minChanges {
			m.lookUp(w, i, at, hash)
		}
		if i%window == window-1 { // history and cells are multiples of window
			m.keep(anchor{hash, at + int64(i-history), changes >= minChanges})
		}
	}
	m.hash, m.changes = hash, changes
}

// keep files the anchor before this one, so that lags up to 32 do not turn
// up, and drops the one that has grown too old.
func (m *matcher) keep(a anchor) {
	old := &m.anchors[m.next]
	if old.live {
		m.seen[old.hash>>50]--
	}
	*old = m.pending
	if old.live {
		m.seen[old.hash>>50]++
	}
	m.next = (m.next + 1) % len(m.anchors)
	m.pending = a
}

// lookUp starts a match when the window that ends at w[i] lay there before,
// at the smallest lag.
func (m *matcher) lookUp(w []float64, i int, at int64, hash uint64) {
	frame := at + int64(i-history)
	for k := range m.anchors {
		a := &m.anchors[(m.next+len(m.anchors)-1-k)%len(m.anchors)]
		lag := frame - a.end
		if !a.live || a.hash != hash || lag < minLag || lag > maxLag {
			continue
		}
		s, d := i+1, int(lag)
		for s-1-d >= 0 && w[s-1] == w[s-1-d] {
			s--
		}
		if i+1-s >= window {
			m.now = match{lag: lag, from: frame - int64(i-s)}
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
