package doubt

import (
	"fmt"
	"math"
	"math/cmplx"

	"benchslip/capture/recording"
)

// Something that changes the gain during a take (automatic gain, a limiter, a
// noise suppressor of a driver) gives itself away in three ways.
const (
	// ridingDB: a steady tone drifts by this much within one stretch. Warm-up
	// and sagging supplies stay under 0.2 dB (common practice, no source).
	ridingDB = 0.4
	ridingS  = 1.0  // shortest stretch of tone that is judged
	edgeS    = 0.15 // at its ends, for fades
	groupS   = 0.2  // over which levels are taken as medians

	// floorDB: the noise of two silences about one tone differs by this much.
	floorDB  = 3.0
	silenceS = 0.9 // shortest silence that is judged, its edge included
	tailS    = 0.3 // beside the tone, for what rings

	// gateS: zeros of this length within a take that has noise.
	gateS = 0.1
)

// riding looks at the level of the tone and at the noise around it.
func riding(l *listening) []Finding {
	f := l.frames
	var out []Finding
	for _, t := range f.tones() {
		if d, ok := l.drifts(t); ok {
			out = append(out, d)
			break // one is enough
		}
	}
	quiet := f.silences(silenceS)
	for i := 1; i < len(quiet); i++ {
		before, after := quiet[i-1], quiet[i]
		a, b := l.noiseOf(before), l.noiseOf(after)
		if a == 0 || b == 0 || math.Abs(20*math.Log10(b/a)) < floorDB {
			continue
		}
		out = append(out, l.found(recording.GainRiding, before.from*f.n, after.to*f.n,
			fmt.Sprintf("the noise before the tone, at %.4g s, and after it, at %.4g s, differs by %.1f dB: something changes the gain or suppresses noise; switch processing off in the driver",
				l.at(before.from*f.n), l.at(after.from*f.n), 20*math.Log10(b/a))))
		break
	}
	if len(out) == 0 && len(quiet) > 0 {
		out = append(out, l.recovers(quiet)...)
	}
	return out
}

// drifts judges one stretch of tone: its level must move smoothly, since a
// step is an event of the unit's, and its phase must run steadily, since a
// sweep passes through.
func (l *listening) drifts(t stretch) (Finding, bool) {
	f := l.frames
	edge := f.per(edgeS)
	t.from += edge
	t.to -= edge
	if f.seconds(t.len()) < ridingS || l.beats() {
		return Finding{}, false
	}
	group := f.per(groupS)
	var levels, speeds []float64
	for i := t.from; i+group <= t.to; i += group {
		var a []float64
		for _, v := range f.list[i : i+group] {
			a = append(a, cmplx.Abs(v.z))
		}
		levels = append(levels, median(a))
	}
	for i := t.from + 1; i < t.to; i++ {
		speeds = append(speeds, cmplx.Phase(f.list[i].z*cmplx.Conj(f.list[i-1].z)))
	}
	lo, hi, jump := levels[0], levels[0], 0.0
	for i, a := range levels {
		lo, hi = math.Min(lo, a), math.Max(hi, a)
		if i > 0 {
			jump = math.Max(jump, math.Abs(a-levels[i-1]))
		}
	}
	slow, fast := speeds[0], speeds[0]
	for _, v := range speeds {
		slow, fast = math.Min(slow, v), math.Max(fast, v)
	}
	if lo <= 0 || 20*math.Log10(hi/lo) < ridingDB || jump > 0.6*(hi-lo) || fast-slow > 0.5 {
		return Finding{}, false
	}
	// A line so near that no spectrum parts it beats with the tone, and moves
	// its phase (in rad) as much as its level. Gain leaves the phase alone.
	if f.turning(t) > 0.3*relative(levels) {
		return Finding{}, false
	}
	return l.found(recording.GainRiding, t.from*f.n, t.to*f.n,
		fmt.Sprintf("the tone at %.6g Hz drifts by %.2f dB between %.4g s and %.4g s: something changes the gain, or the source is not steady; switch processing off in the driver",
			f.hz, 20*math.Log10(hi/lo), l.at(t.from*f.n), l.at(t.to*f.n))), true
}

// turning is the RMS in rad of the tone's phase over a stretch about a
// parabola, which a frequency off the true one and a slow drift of it draw.
func (f *frames) turning(t stretch) float64 {
	n := t.len()
	phase := make([]float64, n)
	for i := 1; i < n; i++ {
		phase[i] = phase[i-1] + cmplx.Phase(f.list[t.from+i].z*cmplx.Conj(f.list[t.from+i-1].z))
	}
	// Orthogonal polynomials of order 0, 1, 2 over evenly spaced places.
	for order := range 3 {
		var over, under float64
		p := func(i int) float64 {
			x := float64(2*i-n+1) / float64(n)
			switch order {
			case 0:
				return 1
			case 1:
				return x
			}
			return x*x - (1-1/float64(n*n))/3
		}
		for i, v := range phase {
			over += v * p(i)
			under += p(i) * p(i)
		}
		for i := range phase {
			phase[i] -= over / under * p(i)
		}
	}
	sum := 0.0
	for _, v := range phase {
		sum += v * v / float64(n)
	}
	return math.Sqrt(sum)
}

// relative is the scatter of x about its mean, over the mean.
func relative(x []float64) float64 {
	mean, square := 0.0, 0.0
	for _, v := range x {
		mean += v / float64(len(x))
	}
	for _, v := range x {
		square += (v - mean) * (v - mean) / float64(len(x))
	}
	return math.Sqrt(square) / mean
}

// beats: another line stands so near the tone, and so strong, that their
// beat moves the level.
func (l *listening) beats() bool {
	own := l.frames.loudest()
	for _, p := range l.survey.Peaks {
		d := math.Abs(p.Hz - l.frames.hz)
		if d > l.survey.ToleranceHz() && d < math.Max(30, 4*l.frames.rate/float64(l.frames.n)) && p.Power > 1e-4*own*own {
			return true
		}
	}
	return false
}

// noiseOf is the fine noise of a silence, its parts beside the tone left out;
// 0 where it does not stand out of the converter's steps.
func (l *listening) noiseOf(q stretch) float64 {
	f := l.frames
	tail := f.per(tailS)
	if q.from > 0 {
		q.from += tail
	}
	if q.to < len(f.list) {
		q.to -= tail
	}
	return l.fine(q)
}

func (l *listening) fine(q stretch) float64 {
	var a []float64
	for _, v := range l.frames.list[q.from:q.to] {
		a = append(a, v.fine)
	}
	m := median(a)
	// Rounding alone, sqrt(1/12) step, has sqrt 6 of it in the second
	// difference; triangular dither makes it sqrt(1/4).
	if m <= 0.6*math.Sqrt(6)*l.sig.Step {
		return 0
	}
	return m
}

// recovers: after the tone the noise rises step by step to where it was.
func (l *listening) recovers(quiet []stretch) []Finding {
	f := l.frames
	last := quiet[len(quiet)-1]
	if last.from == 0 || f.seconds(last.len()) < 2*silenceS {
		return nil
	}
	last.from += f.per(tailS)
	var part [4]float64
	for i := range part {
		a, b := last.from+last.len()*i/4, last.from+last.len()*(i+1)/4
		part[i] = l.fine(stretch{a, b})
		if part[i] == 0 || i > 0 && part[i] < part[i-1] {
			return nil
		}
	}
	d := 20 * math.Log10(part[3]/part[0])
	if d < floorDB {
		return nil
	}
	return []Finding{l.found(recording.GainRiding, last.from*f.n, last.to*f.n,
		fmt.Sprintf("after the tone, from %.4g s on, the noise rises by %.1f dB: something turns the gain up again; switch processing off in the driver", l.at(last.from*f.n), d))}
}

// gated looks for stretches of exact zeros within a recording that has noise
// elsewhere: no input is that quiet. Zeros at its start and end are not
// counted: recorders begin with some.
func gated(l *listening) []Finding {
	f := l.frames
	if l.kind != recording.Audio || !l.noisy() {
		return nil
	}
	first, last := 0, len(f.list)
	for first < last && f.list[first].zero {
		first++
	}
	for last > first && f.list[last-1].zero {
		last--
	}
	count, from := 0, -1
	var longest stretch
	for i := first; i < last; i++ {
		if !f.list[i].zero {
			from = -1
			continue
		}
		if from < 0 {
			from = i
		}
		if f.seconds(i+1-from) < gateS {
			continue
		}
		if i-from+1 > longest.len() {
			longest = stretch{from, i + 1}
		}
		if f.seconds(i-from) < gateS { // the frame that made it long enough
			count++
		}
	}
	if count == 0 {
		return nil
	}
	return []Finding{l.found(recording.GainRiding, longest.from*f.n, longest.to*f.n,
		fmt.Sprintf("all samples are exactly 0 for %.3g s from %.4g s on, in a recording that has noise elsewhere (%d such places): a gate closes; switch processing off in the driver",
			f.seconds(longest.len()), l.at(longest.from*f.n), count))}
}

// noisy: the noise of the recording is more than its converter's rounding.
func (l *listening) noisy() bool {
	n := math.Sqrt(median(l.survey.Floor) * l.sig.RateHz / 2)
	return n > math.Max(2*l.sig.Step, 1e-9*l.sig.Scale())
}
