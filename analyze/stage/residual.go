package stage

import (
	"math"
	"sort"

	"benchslip/analyze/internal/sinefit"
	"benchslip/analyze/internal/spectrum"
)

// longSpan is the length in s from which on averages are so many that half
// overlap, and a power of two near 2 s, lose nothing worth their cost.
const longSpan = 30

// residual is the density of the signal less DC and the lines that stand out.
// Segments of an eighth of the span, 2 s at most, three quarters overlapped:
// with that overlap every sample but those at the two ends counts alike, which
// costs a tenth of the averages at most. Long spans overlap by half. Of a
// reference channel 32 segments are read, enough for the noise beside its
// tone.
func (l *Lines) residual(v *Survey) *spectrum.Density {
	s := l.Sig
	n := s.Len()
	m := spectrum.FastLength(max(min(int(2*s.RateHz), n/8), min(n, 64)))
	hop := max(m/4, 1)
	if s.DurationS() >= longSpan {
		for m = 1; 2*m <= int(2*s.RateHz); m *= 2 {
		}
		hop = m / 2
	}
	if l.reference && hop < n/32 {
		hop = n / 32
	}
	w := spectrum.BlackmanHarris(m)
	power, count, next := 0.0, 0, 0
	r := l.newRemover(l.standing(v, float64(w.NENBW)*s.RateHz/float64(m)))
	low := l.newSlow(r.lines)
	src := func(dst []float64, at int) int {
		k := s.Read(dst, at)
		r.take(dst[:k], at)
		if low != nil {
			low.push(dst[:k])
		}
		for _, x := range dst[:k] {
			power += x * x
		}
		count += k
		next = at + k
		return k
	}
	d := spectrum.Welch(src, n, s.RateHz, w, m, hop)
	rest := make([]float64, 4096) // the tail that fills no segment
	for next < n && !l.reference {
		if src(rest, next) == 0 {
			break
		}
	}
	if low != nil {
		low.finish()
	}
	if count > 0 {
		l.Residual = power / float64(count)
	}
	return d
}

// standing lists the lines worth taking off before the noise is read: all but
// those mains orders that the noise alone could make, where the resolution
// leaves sides beside every line to fill its place from.
func (l *Lines) standing(v *Survey, rbwHz float64) []*Line {
	if rbwHz >= fineHz && !l.slowPays() {
		return l.all()
	}
	var out []*Line
	M := float64(len(l.Blocks))
	for _, q := range l.all() {
		if q.weak {
			continue
		}
		if l.isMains(q) {
			k := min(int(q.Hz/v.StepHz+0.5), len(v.Floor)-1)
			share := v.Floor[k] * l.Sig.RateHz / float64(l.Blocks[0].To-l.Blocks[0].From)
			if l.meanPower(q.Blocks, 1) < share*(1+2/math.Sqrt(M)) {
				continue
			}
		}
		out = append(out, q)
	}
	return out
}

// remover takes DC and lines off samples read in order.
type remover struct {
	l     *Lines
	lines []*Line
	fixed []bool // one phasor and frequency for the whole span
	osc   []sinefit.Oscillator
	block int
}

func (l *Lines) newRemover(lines []*Line) *remover {
	r := &remover{l: l, lines: lines}
	r.osc = make([]sinefit.Oscillator, len(r.lines))
	for _, q := range r.lines {
		r.fixed = append(r.fixed, q.track.Rigid && !l.isMains(q) && l.constant(q))
	}
	return r
}

// take works on samples that start at index at.
func (r *remover) take(y []float64, at int) {
	for i := range y {
		y[i] -= r.l.DC
	}
	for from := 0; from < len(y); {
		first := at + from
		for first < r.l.Blocks[r.block].From {
			r.block--
		}
		for first >= r.l.Blocks[r.block].To {
			r.block++
		}
		// Stretches within one block, of at most 16 pieces.
		to := min(len(y), from+16*sinefit.Piece, from+r.l.Blocks[r.block].To-first)
		r.stretch(y[from:to], first)
		from = to
	}
}

// stretch takes the lines off samples of one block. Each line's phase is
// exact at both ends and runs at the block's frequency from piece to piece;
// its amplitude is interpolated.
func (r *remover) stretch(y []float64, first int) {
	l := r.l
	middle := l.Blocks[r.block].Middle()
	pieces := (len(y) + sinefit.Piece - 1) / sinefit.Piece
	for i, q := range r.lines {
		order := float64(q.Order)
		nu := order * q.track.Nu
		z, end := q.Z, q.Z
		if !r.fixed[i] {
			nu = order * q.track.NuAt(middle)
			z = l.between(q.Blocks, float64(first))
			end = l.between(q.Blocks, float64(first+len(y)))
		}
		// What the block's frequency misses over the stretch is shared evenly.
		start := q.track.OrderTurns(order, float64(first))
		missed := q.track.OrderTurns(order, float64(first+len(y))) - start - sinefit.Turns(nu, float64(len(y)))
		missed -= math.Round(missed)
		step := complex(1, 0)
		turn := sinefit.Phasor(sinefit.Turns(nu, sinefit.Piece) + missed*sinefit.Piece/float64(len(y)))
		w := sinefit.Phasor(start)
		dz := (end - z) / complex(float64(pieces), 0)
		for from := 0; from < len(y); from += sinefit.Piece {
			r.osc[i].Subtract(y[from:min(from+sinefit.Piece, len(y))], nu, z*w*step)
			step *= turn
			z += dz
		}
	}
}

// constant: the line's phasor scatters no more than noise from block to block.
func (l *Lines) constant(q *Line) bool { return len(l.Blocks) < 3 || !q.wanders(l) }

// wanders compares the blocks' phasors with their mean using the scatter
// between neighbours as the noise: a wandering line moves further over the
// span than from one block to the next.
func (q *Line) wanders(l *Lines) bool {
	step, away := 0.0, 0.0
	for m, z := range q.Blocks {
		away += abs2(z - q.Z)
		if m > 0 {
			step += abs2(z-q.Blocks[m-1]) / 2
		}
	}
	n := float64(len(q.Blocks))
	away /= n - 1
	step /= n - 1
	if away < 1e-22*abs2(q.Z) {
		return false
	}
	// von Neumann ratio: 1 +- 1/sqrt(n) for noise.
	return away > step*(1+5/math.Sqrt(n))
}

// between interpolates phasors given at the blocks' middles.
func (l *Lines) between(z []complex128, i float64) complex128 {
	n := len(l.Blocks)
	if n == 1 {
		return z[0]
	}
	m := sort.Search(n, func(k int) bool { return l.Blocks[k].Middle() > i })
	m = max(1, min(m, n-1))
	a, b := l.Blocks[m-1].Middle(), l.Blocks[m].Middle()
	f := (i - a) / (b - a)
	f = math.Max(0, math.Min(1, f))
	return z[m-1]*complex(1-f, 0) + z[m]*complex(f, 0)
}

// fineHz is the resolution bandwidth that leaves sides between mains lines.
const fineHz = 4

// fill replaces the density at every fitted line, where the fit took noise
// away too, by the mean of its sides; about the fundamental over the gap.
func (l *Lines) fill() {
	d := l.Noise
	T := l.Sig.DurationS()
	n := len(d.S)
	touched := make([]bool, n)
	half := d.Lobe + 1
	touch := func(hz, widthHz float64) {
		lo := int(math.Ceil((hz - widthHz) / d.StepHz))
		hi := int(math.Floor((hz + widthHz) / d.StepHz))
		for k := max(lo, 0); k <= min(hi, n-1); k++ {
			touched[k] = true
		}
	}
	fine := d.RBW() < fineHz
	if fine {
		for _, q := range l.all() {
			touch(q.Hz, half*d.StepHz)
		}
	}
	if f := l.Fundamental(); f != nil {
		l.GapHz = math.Max(2, 4/T)
		if fine || !f.track.Rigid {
			touch(f.Hz, math.Max(l.GapHz, half*d.StepHz))
		} else {
			l.GapHz = 0
		}
	}
	if !fine {
		l.restore()
	}
	// Each touched run takes the mean of as many bins on either side.
	for k := 0; k < n; k++ {
		if !touched[k] {
			continue
		}
		end := k
		for end < n && touched[end] {
			end++
		}
		want := max(end-k, int(4*half))
		sum, count := 0.0, 0
		for i, got := k-1, 0; i >= 1 && got < want && k-i < 6*want; i-- {
			if !touched[i] {
				sum += d.S[i]
				count++
				got++
			}
		}
		for i, got := end, 0; i < n && got < want && i-end < 6*want; i++ {
			if !touched[i] {
				sum += d.S[i]
				count++
				got++
			}
		}
		if count > 0 {
			for i := k; i < end; i++ {
				d.S[i] = sum / float64(count)
			}
		}
		k = end
	}
}

// restore puts back, on average, the noise that fitting took away where lines
// are too dense to read their sides, shared over the resolution bandwidth of
// the density. A line of one phasor over T takes 1/T Hz. One that is followed
// takes 1/T_b Hz less what the interpolation between blocks gives back: of
// noise z_m in each block, x - z interpolated keeps 1 - 2*3/4 + 2/3 = 1/6
// between two middles, and nothing outside the first and the last.
func (l *Lines) restore() {
	d := l.Noise
	b := l.Blocks[0]
	blocks := float64(len(l.Blocks))
	moving := l.Sig.RateHz / float64(b.To-b.From) * (1 - (blocks-1)/(6*blocks))
	lost := make([]float64, len(d.S))
	r := l.newRemover(l.all())
	spread := int(d.Lobe)
	for n, q := range r.lines {
		took := moving
		if r.fixed[n] {
			took = 1 / l.Sig.DurationS()
		}
		k := int(q.Hz/d.StepHz + 0.5)
		width := 2*spread + 1
		for i := k - spread; i <= k+spread; i++ {
			if i >= 0 && i < len(lost) {
				lost[i] += took / (float64(width) * d.StepHz)
			}
		}
	}
	for i, v := range lost {
		if v > 0 && v < 0.9 {
			d.S[i] /= 1 - v
		}
	}
}

// DensityAt is the noise density at hz: the median over bins at its sides,
// bias removed, from the density without lines.
func (l *Lines) DensityAt(hz float64) float64 {
	d := l.Noise
	k := int(hz/d.StepHz + 0.5)
	half := max(int(3*d.Lobe), min(int(25/d.StepHz), 200))
	lo, hi := max(k-half, 1), min(k+half+1, len(d.S))
	if hi-lo < 3 {
		lo, hi = max(0, min(lo, len(d.S)-3)), len(d.S)
	}
	v := append([]float64(nil), d.S[lo:hi]...)
	return spectrum.Median(v) / spectrum.MedianBias(d.Averages)
}
