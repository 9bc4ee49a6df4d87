package health

import (
	"fmt"
	"math"
	"slices"

	"benchslip/capture/recording"
)

// channel gathers what one channel shows.
type channel struct {
	number int // from 1
	fs     bool
	bits   int // valid bits of an integer format; 0: none
	all    moments
	codes  codes
	match  *matcher
	zeros  zeros

	top, bottom rail    // runs at the largest and smallest sample
	one, minus  rail    // float formats: runs at exactly +1 and -1
	full        []*rail // those at full scale; set by close
}

func newChannel(in *recording.Info, c int) *channel {
	ch := &channel{number: c + 1, fs: in.Channels[c].Unit == "FS", top: newRail(1), bottom: newRail(-1),
		one: fixedRail(1, 1), minus: fixedRail(-1, 1)}
	if ch.fs {
		ch.bits = in.Channels[c].Bits
	}
	ch.codes = newCodes(ch.bits)
	ch.match = newMatcher()
	ch.zeros.limit = max(maxLag, int64(maxPause*in.RateHz))
	ch.zeros.step = in.Channels[c].Step
	return ch
}

// feed takes w = history frames followed by a cell that starts at frame at.
func (ch *channel) feed(w []float64, at int64) {
	x := w[history:]
	m := momentsOf(x)
	ch.all.join(m)
	still := m.min == m.max && m.n == int64(len(x))
	ch.top.feed(x, at, m.max, still)
	ch.bottom.feed(x, at, -m.min, still)
	if ch.fs && ch.bits == 0 {
		ch.one.feed(x, at, m.max, still)
		ch.minus.feed(x, at, -m.min, still)
	}
	if still {
		ch.codes.feed(x[:1])
	} else {
		ch.codes.feed(x)
	}
	ch.match.feed(w, at, still)
	if ch.fs {
		ch.zeros.feed(x, at, m.min, m.max)
	}
}

// close ends what is open and settles which runs are at full scale.
//
// Integer formats: full scale is the extreme code of the bits in use,
// -2^(b-1) or 2^(b-1)-1; since no sample lies beyond it, its runs are those
// of the largest or smallest sample. A 16-bit take in a 24-bit file has b =
// 16. Volts have no full scale that the file tells.
func (ch *channel) close(frames int64) {
	ch.match.end(frames)
	for _, r := range []*rail{&ch.top, &ch.bottom, &ch.one, &ch.minus} {
		r.end()
	}
	switch {
	case !ch.fs:
	case ch.bits == 0:
		ch.full = []*rail{&ch.one, &ch.minus}
	default:
		if ch.top.value == 1-math.Ldexp(1, 1-ch.bits) || ch.top.value == 1-math.Ldexp(1, 1-ch.narrow()) {
			ch.full = append(ch.full, &ch.top)
		}
		if ch.bottom.value == 1 {
			ch.full = append(ch.full, &ch.bottom)
		}
	}
	for i := 0; i < len(ch.full); i++ {
		if ch.full[i].places == 0 {
			ch.full = slices.Delete(ch.full, i, i+1)
			i--
		}
	}
}

// atFullScale says whether the runs of r, top or bottom, are clipped ones.
func (ch *channel) atFullScale(r *rail) bool {
	return slices.Contains(ch.full, r) || ch.fs && ch.bits == 0 && r.value == 1
}

// narrow is the width of the converter behind a wider file: the bits in use,
// when they make a usual width and the samples use enough codes that it is
// no accident (a square wave at half scale needs 2 bits and is not clipped).
func (ch *channel) narrow() int {
	used := ch.codes.used()
	if slices.Contains([]int{8, 10, 12, 14, 16, 18, 20, 24}, used) && (ch.codes.full || ch.codes.n >= 16) {
		return used
	}
	return ch.bits
}

func (ch *channel) level() Level {
	l := ch.all.level()
	l.Codes, l.MoreCode, l.Step = ch.codes.n, ch.codes.full, ch.codes.step()
	if ch.bits > 0 {
		l.Bits = min(ch.codes.used(), ch.bits)
	}
	return l
}

// clips are the runs at full scale of both ends, in order.
func (ch *channel) clips() []recording.Run {
	var runs []recording.Run
	gap := int64(0)
	for _, r := range ch.full {
		runs = append(runs, r.runs...)
		gap = max(gap, r.join)
	}
	slices.SortFunc(runs, func(a, b recording.Run) int { return int(a.From - b.From) })
	runs = joined(runs, gap)
	for i := range runs {
		runs[i].Channel, runs[i].Why = ch.number, "clipped"
	}
	return runs
}

// silent: at least 2 samples, all equal.
func (ch *channel) silent() bool { return ch.all.n >= 2 && ch.all.min == ch.all.max }

func clippedFlag(in *recording.Info, c int, ch *channel) *recording.Flag {
	if len(ch.full) == 0 {
		return nil
	}
	var places, samples int64
	longest, first, last := recording.Run{}, int64(math.MaxInt64), int64(0)
	ends := ""
	for _, r := range ch.full {
		places += r.places
		samples += r.samples
		if r.longest.To-r.longest.From > longest.To-longest.From {
			longest = r.longest
		}
		first, last = min(first, r.runs[0].From), max(last, r.runs[len(r.runs)-1].To)
		if r.sign > 0 {
			ends += "positive"
		} else if ends != "" {
			ends += " and negative"
		} else {
			ends += "negative"
		}
	}
	f := &recording.Flag{Code: recording.Clipped, Channel: c + 1}
	f.FromS, f.ToS = place(in, first, last)
	f.Message = fmt.Sprintf("the recorder sits at %s full scale in %s, %d samples, first at %s, longest %d samples at %s; a clean full-scale tone of low frequency looks the same",
		ends, count(places, "place"), samples, where(in, first), longest.To-longest.From, where(in, longest.From))
	return f
}

func silentFlag(in *recording.Info, c int, ch *channel) *recording.Flag {
	if !ch.silent() {
		return nil
	}
	f := &recording.Flag{Code: recording.Silent, Channel: c + 1}
	f.FromS, f.ToS = place(in, 0, in.Frames)
	f.Message = fmt.Sprintf("all %d samples are %g %s", ch.all.n, ch.all.min+0, in.Channels[c].Unit)
	return f
}

func count(n int64, what string) string {
	if n == 1 {
		return "1 " + what
	}
	return fmt.Sprintf("%d %ss", n, what)
}
