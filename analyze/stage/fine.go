package stage

import (
	"math"

	"benchslip/analyze/internal/sinefit"
)

// Phases of mains harmonics wander against each other by a radian within
// seconds. A line that turns by x turns within a block reads sinc(x) of its
// amplitude there: 0.2 turns cost 6 %. Strong lines are therefore read again in
// parts of a block, short enough for the wander and long enough for the noise.

const (
	// mostParts of a block; a power of two.
	mostParts = 16
	// leastPeriods of the mains a part must hold: neighbouring orders are then
	// three resolution widths apart and cost each other under 1 % of variance.
	leastPeriods = 3
	// overShare: a line's power stands at least this far over the noise share
	// of a part, so that shorter parts cost under 1/24 of its variance.
	overShare = 12
	// rounding: what lies 160 dB under the strongest line may be what taking
	// that one off has left.
	rounding = 1e-16
)

// refine replaces the powers of strong mains lines by means over parts of
// blocks.
//
// With n parts a block, M blocks and the noise share s of a block,
//
//	P_n = mean |z|^2/2 - n s,   var P_n = (2 P s + n s^2)/M,
//
// so strong lines lose nothing by short parts. What a steady turning costs
// falls with 1/n^2, hence P = P_n + (P_n - P_(n/2))/3.
func (l *Lines) refine() {
	var lines []*Line
	strong := false
	top := 0.0
	for _, q := range l.all() {
		top = math.Max(top, q.Power)
	}
	for i := range l.Mains {
		q := &l.Mains[i]
		if q.Dropped || q.Power < 2*q.Share || q.Power < rounding*top {
			continue
		}
		lines = append(lines, q)
		strong = strong || q.Power >= 2*overShare*q.Share
	}
	parts := l.mostParts()
	if !l.MainsFound || !strong || parts < 2 {
		return
	}
	if !l.readParts(lines, parts) {
		return
	}
	for _, q := range lines {
		l.partsPower(q, parts)
	}
}

// mostParts is the number of parts that blocks may be divided into.
func (l *Lines) mostParts() int {
	shortest := math.Inf(1)
	for _, b := range l.Blocks {
		shortest = math.Min(shortest, float64(b.To-b.From)/l.Sig.RateHz)
	}
	n := 1
	for 2*n <= mostParts && shortest*l.MainsHz/float64(2*n) >= leastPeriods {
		n *= 2
	}
	return n
}

// readParts fits the mains lines jointly in every part, after everything else
// was taken off, and fills Parts with their peak phasors, turned back by the
// track.
func (l *Lines) readParts(lines []*Line, parts int) bool {
	var others []*Line
	for _, q := range l.all() {
		if !l.isMains(q) {
			others = append(others, q)
		}
	}
	r := l.newRemover(others)
	nu := make([]float64, len(lines))
	S := make([]complex128, len(lines))
	var buf []float64
	var solver *sinefit.Solver
	top := float64(lines[len(lines)-1].Order)
	for _, b := range l.Blocks {
		n := b.To - b.From
		if cap(buf) < n {
			buf = make([]float64, n)
		}
		y := buf[:l.Sig.Read(buf[:n], b.From)]
		if len(y) < n {
			return false
		}
		r.take(y, b.From)
		for j := 0; j < parts; j++ {
			from, to := n*j/parts, n*(j+1)/parts
			part := y[from:to]
			mid := float64(b.From) + float64(from+to-1)/2
			base := l.MainsTrack.NuAt(mid)
			// A frequency off by 1/500 turn over the part costs 1e-5 of power.
			if solver == nil || solver.N != len(part) || math.Abs(base-nu[0]/float64(lines[0].Order))*top*float64(len(part)) > 0.002 {
				for i, q := range lines {
					nu[i] = float64(q.Order) * base
				}
				sv, err := sinefit.NewSolver(append([]float64(nil), nu...), len(part))
				if err != nil {
					return false
				}
				solver = sv
			}
			sinefit.Sums(part, solver.Nu, S, nil)
			sum := 0.0
			for _, v := range part {
				sum += v
			}
			fit := solver.Solve(sum, S)
			for i, q := range lines {
				turn := l.MainsTrack.OrderTurns(float64(q.Order), mid)
				q.Parts = append(q.Parts, fit.Z[i]*sinefit.Phasor(-turn))
			}
		}
	}
	return true
}

// partsPower chooses how many parts a block a line is read in, and reads it.
func (l *Lines) partsPower(q *Line, most int) {
	level := func(n int) float64 { return l.meanPower(q.Parts, most/n) - float64(n)*q.Share }
	one := level(1)
	n := 1
	for 2*n <= most && one >= overShare*float64(2*n)*q.Share {
		n *= 2
	}
	// A weak line that turns: within blocks it scatters by more than noise.
	// Without turning P_m - P_1 scatters by s sqrt((m-1)/M).
	M := float64(len(l.Blocks))
	for m := 2 * n; m <= min(most, 4); m *= 2 {
		if d := level(m) - one; d > 2.5*q.Share*math.Sqrt(float64(m-1)/M) {
			n = m
		}
	}
	if n == 1 {
		return
	}
	p := level(n)
	turning := (p - level(n/2)) / 3
	q.Power = p + turning
	s := q.Share
	q.U = math.Sqrt((2*math.Max(q.Power, 0)*s+float64(n)*s*s)/M + turning*turning/4)
}

// meanPower is the mean over groups of the power of their mean phasor.
func (l *Lines) meanPower(z []complex128, group int) float64 {
	sum, count := 0.0, 0
	for at := 0; at+group <= len(z); at += group {
		mean := complex(0, 0)
		for _, v := range z[at : at+group] {
			mean += v
		}
		sum += abs2(mean) / float64(group*group) / 2
		count++
	}
	return sum / float64(max(count, 1))
}
