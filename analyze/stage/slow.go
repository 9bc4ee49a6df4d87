package stage

import (
	"math"

	"benchslip/analyze/internal/sinefit"
)

// Most mains orders of a long take do not stand out of the noise, yet each
// must be read. They lie low: they are fitted on a slower copy of what is
// left of the signal when tone, other lines and strong orders are gone, which
// costs a tenth of fitting them at the full rate. Strong orders take part
// again, for what the first fit has left of them.

const (
	// slowSeconds is the length from which on the slower copy pays.
	slowSeconds = 4
	// slowRatio is the least decimation that pays.
	slowRatio = 4
	// slowStop is how far the decimation filter holds aliases down, dB.
	slowStop = 120
)

// slow decimates a signal and fits the mains orders block by block as their
// samples come in; memory is bounded by a block.
type slow struct {
	l      *Lines
	lines  []*Line
	h      []float64 // linear-phase low-pass, 2 half + 1 taps, sum 1
	half   int
	ratio  int
	buf    []float64 // input from sample at on
	at     int
	out    []float64 // outputs from index first on
	first  int
	next   int // next output index; output j stands at sample j*ratio
	block  int
	solver *sinefit.Solver
	// base holds, of lines that were taken off, the mean of what was over each
	// block: what is found adds to it.
	base map[*Line][]complex128
}

// newSlow returns nil where the slower copy does not pay. removed lists the
// lines that will have been taken off.
func (l *Lines) newSlow(removed []*Line) *slow {
	var lines []*Line
	weak := 0
	top := 0.0
	for i := range l.Mains {
		q := &l.Mains[i]
		if q.Dropped {
			continue
		}
		lines = append(lines, q)
		top = q.Hz * 1.03
		if q.weak {
			weak++
		}
	}
	if weak == 0 {
		return nil
	}
	s := &slow{l: l, lines: lines, base: map[*Line][]complex128{}, ratio: int(l.Sig.RateHz / (3 * top))}
	for _, q := range removed {
		if !l.isMains(q) {
			continue
		}
		for _, b := range l.Blocks {
			// Straight from middle to middle.
			mean := l.between(q.Blocks, float64(b.From)) + 2*l.between(q.Blocks, b.Middle()) + l.between(q.Blocks, float64(b.To))
			s.base[q] = append(s.base[q], mean/4)
		}
	}
	// Kaiser 1974: transition from top to rate/ratio - top, slowStop deep.
	nu := top / l.Sig.RateHz
	wide := 1/float64(s.ratio) - 2*nu
	s.half = int(math.Ceil((slowStop - 7.95) / (14.36 * wide) / 2))
	beta := 0.1102 * (slowStop - 8.7)
	s.h = make([]float64, 2*s.half+1)
	sum := 0.0
	for i := range s.h {
		x := float64(i - s.half)
		r := x / float64(s.half+1)
		v := bessel0(beta*math.Sqrt(1-r*r)) / float64(s.ratio)
		if x != 0 {
			v *= math.Sin(math.Pi*x/float64(s.ratio)) / (math.Pi * x / float64(s.ratio))
		}
		s.h[i] = v
		sum += v
	}
	for i := range s.h {
		s.h[i] /= sum
	}
	s.next = (s.half + s.ratio - 1) / s.ratio // the first with all its input
	s.first = s.next
	return s
}

// slowPays reports whether weak orders may be left to the slower copy.
func (l *Lines) slowPays() bool {
	if l.reference || len(l.Mains) == 0 || l.Sig.DurationS() < slowSeconds {
		return false
	}
	top := l.Mains[len(l.Mains)-1].Hz * 1.03
	return int(l.Sig.RateHz/(3*top)) >= slowRatio
}

// bessel0 is the modified Bessel function of order 0, by its power series.
func bessel0(x float64) float64 {
	sum, term := 1.0, 1.0
	for k := 1.0; term > 1e-18*sum; k++ {
		term *= x * x / (4 * k * k)
		sum += term
	}
	return sum
}

// gain of the filter at nu cycles per input sample; real, since it is
// symmetrical.
func (s *slow) gain(nu float64) float64 {
	g := s.h[s.half]
	for i := 1; i <= s.half; i++ {
		g += 2 * s.h[s.half+i] * math.Cos(2*math.Pi*sinefit.Turns(nu, float64(i)))
	}
	return g
}

// push takes samples in order, those of each call following the last.
func (s *slow) push(x []float64) {
	s.buf = append(s.buf, x...)
	end := s.at + len(s.buf)
	for s.next*s.ratio+s.half < end {
		in := s.buf[s.next*s.ratio-s.half-s.at:]
		s.out = append(s.out, dotProduct(s.h, in[:len(s.h)]))
		s.next++
	}
	if drop := s.next*s.ratio - s.half - s.at; drop > 1<<15 {
		s.buf = append(s.buf[:0], s.buf[drop:]...)
		s.at += drop
	}
	for s.block < len(s.l.Blocks)-1 && s.next*s.ratio >= s.l.Blocks[s.block].To {
		s.fit()
	}
}

// finish fits the last block.
func (s *slow) finish() {
	for s.block < len(s.l.Blocks) {
		s.fit()
	}
	for _, q := range s.lines {
		q.Blocks, q.found = q.found, nil
		s.l.mean(q)
	}
}

// keep leaves the block as the first fit has read it.
func (s *slow) keep() {
	for _, q := range s.lines {
		q.found = append(q.found, q.Blocks[len(q.found)])
	}
}

// fit fits the mains orders in one block and adds what is found to their
// phasors there.
func (s *slow) fit() {
	b := s.l.Blocks[s.block]
	from := max((b.From+s.ratio-1)/s.ratio, s.first)
	to := min((b.To-1)/s.ratio+1, s.next)
	n := to - from
	m := s.block
	s.block++
	if n > 2*len(s.lines)+1 {
		y := s.out[from-s.first : to-s.first]
		place := float64(from+to-1) / 2 * float64(s.ratio)
		nu := make([]float64, len(s.lines))
		changed := s.solver == nil || s.solver.N != n
		for i, q := range s.lines {
			nu[i] = float64(q.Order) * q.track.NuAt(place) * float64(s.ratio)
			changed = changed || nu[i] != s.solver.Nu[i]
		}
		if changed {
			sv, err := sinefit.NewSolver(nu, n)
			if err != nil {
				s.keep()
				return
			}
			s.solver = sv
		}
		f := s.solver.Block(y)
		for i, q := range s.lines {
			turn := q.track.OrderTurns(float64(q.Order), place)
			q.found = append(q.found, f.Z[i]*sinefit.Phasor(-turn)/complex(s.gain(nu[i]/float64(s.ratio)), 0))
			if b := s.base[q]; b != nil {
				q.found[m] += b[m]
			}
		}
	}
	if n <= 2*len(s.lines)+1 {
		s.keep()
	}
	// Keep what the next block needs.
	if keep := min(to, s.next) - 1; keep > s.first {
		s.out = append(s.out[:0], s.out[keep-s.first:]...)
		s.first = keep
	}
}

func dotProduct(a, b []float64) float64 {
	var s0, s1, s2, s3 float64
	n := len(a) &^ 3
	for i := 0; i < n; i += 4 {
		x, y := a[i:i+4:i+4], b[i:i+4:i+4]
		s0 += x[0] * y[0]
		s1 += x[1] * y[1]
		s2 += x[2] * y[2]
		s3 += x[3] * y[3]
	}
	for i := n; i < len(a); i++ {
		s0 += a[i] * b[i]
	}
	return (s0 + s1) + (s2 + s3)
}
