package stage

import (
	"fmt"
	"math"
	"slices"

	"benchslip/analyze"
	"benchslip/analyze/internal/sinefit"
	"benchslip/analyze/internal/spectrum"
)

// Line is one sinusoid of a signal, followed over the span.
//
// Power is mean-square (V^2), with the share of the noise that the fit lets
// through already taken off, so it can be negative for a line that is not
// there. Z is the coherent mean of the blocks' peak phasors, each turned back
// by the line's own phase track: its phase is that at the middle of the span.
type Line struct {
	Order int     // multiple of the tone or the mains; 1 for others
	Hz    float64 // mean over the span
	Power float64 // V^2, noise share removed
	Z     complex128
	Share float64 // noise share removed, V^2
	U     float64 // standard uncertainty of Power from noise, V^2
	Dens  float64 // noise density at its sides, V^2/Hz
	// Whole is the power of the coherent mean over the whole span with its
	// (smaller) noise share taken off; for detection.
	Whole float64
	// Blocks holds the peak phasors at the middles of Lines.Blocks, turned
	// back by the track.
	Blocks []complex128
	// Parts holds, for strong mains lines, the peak phasors of the blocks'
	// parts, equally many a block, turned back by the track; nil for others.
	Parts []complex128
	// weak: the order does not show in the survey; a slower copy of the signal
	// serves to read it (see slow.go).
	weak  bool
	found []complex128 // phasors read on that copy, by block
	// Dropped: the line coincides with one of the tone and was not fitted.
	Dropped bool
	track   *sinefit.Track
}

// RMS is the root of the power, 0 for negative powers.
func (l Line) RMS() float64 { return math.Sqrt(math.Max(l.Power, 0)) }

// Lines is a signal taken apart: x(t) = DC + tone and its harmonics + mains
// comb + other lines + noise, fitted jointly in each block.
type Lines struct {
	Sig        *analyze.Signal
	Blocks     []Block
	DC         float64
	Tone       *Tone   // nil: no tone
	Harm       []Line  // orders 1.. of the tone, Harm[0] the fundamental
	Mains      []Line  // orders 1.. of the mains; empty when not resolvable
	MainsHz    float64 // mean; 0 when not resolvable
	MainsTrack *sinefit.Track
	MainsFound bool    // an order stands out of the noise in the survey
	Rival      float64 // a second supply frequency within 6 dB; 0: none
	Others     []Line
	// Noise is the density of what is left, with the places of the lines
	// filled from their sides.
	Noise *spectrum.Density
	// GapHz is the half width about the fundamental that was filled.
	GapHz     float64
	Cond      float64 // variance cost of the neighbourhood, 1: none
	reference bool    // see Options
	// Residual is the mean square of what is left over the whole band.
	Residual float64
}

// Options of Decompose.
type Options struct {
	Tone   *Tone // nil: none
	Orders int   // harmonics of the tone to fit, at least 10
	Mains  int   // orders of the mains to fit, at least MaxOrder
	// Reference: the channel only says what drove the unit. Mains orders that do
	// not stand out are not fitted and the noise is read in samples of it.
	Reference bool
	// Supply is another channel of the same take that shows the mains well: its
	// frequency is used instead of one's own; nil: none.
	Supply *Lines
}

// Decompose takes a signal apart, once for each set of options.
func Decompose(p *analyze.Pass, s *analyze.Signal, o Options) *Lines {
	o.Orders = max(o.Orders, 10)
	o.Mains = max(o.Mains, MaxOrder)
	id := ""
	if o.Tone != nil {
		id = o.Tone.id
	}
	key := fmt.Sprintf("lines/%s/%s/%d/%d/%v/%g", s.ID(), id, o.Orders, o.Mains, o.Reference, mainsNominal(p))
	if o.Supply != nil {
		key += "/" + o.Supply.Sig.ID()
	}
	return p.Stages.Once(key, func() any { return decompose(p, s, o) }).(*Lines)
}

func decompose(p *analyze.Pass, s *analyze.Signal, o Options) *Lines {
	l := &Lines{Sig: s, Tone: o.Tone, Cond: 1, reference: o.Reference}
	coarse := 0.0
	var toneTrack *sinefit.Track
	if o.Tone != nil {
		coarse = o.Tone.Coarse
		toneTrack = fit(o.Tone.Track, s.Len(), o.Tone.Hz/s.RateHz)
	}
	v := SurveyOf(p, s)
	weak := false
	if o.Tone != nil {
		_, seen := v.StrongestIn(coarse-2*v.ToleranceHz(), coarse+2*v.ToleranceHz(), nil)
		weak = !seen && coarse*s.DurationS() > 12
	}
	f := follow(p, s, coarse, weak)
	l.Blocks = f.Blocks
	if weak { // the block length must still resolve the tone
		l.Blocks = blocksFor(s.Len(), s.RateHz, coarse, nil)
	}
	l.layout(f, toneTrack, o)
	l.fitBlocks()
	l.measure(v)
	l.refine()
	return l
}

// fit adapts a track to a signal of another length (common-mode takes read at
// the differential take's frequency): rigid at its mean.
func fit(t *sinefit.Track, n int, nu float64) *sinefit.Track {
	if t.Len == n {
		return t
	}
	return &sinefit.Track{Len: n, Nu: nu, UNu: t.UNu, Rigid: true}
}

// layout lists the lines to fit.
func (l *Lines) layout(f *followed, tone *sinefit.Track, o Options) {
	s := l.Sig
	rate := s.RateHz
	shortest := math.Inf(1) // block length in s
	for _, b := range l.Blocks {
		shortest = math.Min(shortest, float64(b.To-b.From)/rate)
	}
	clear := 0.7 / shortest // Hz between lines that a block can tell apart
	var used []float64
	near := func(hz float64) bool {
		for _, u := range used {
			if math.Abs(u-hz) < clear {
				return true
			}
		}
		return hz < clear || hz > rate/2-clear/2
	}
	if tone != nil {
		top := max(o.Orders, f.Orders)
		if l.Tone.Periods < 5 { // few periods: ten harmonics at most
			top = min(top, 10)
		}
		for h := 1; h <= top; h++ {
			hz := float64(h) * tone.Nu * rate
			if hz >= rate/2 {
				break
			}
			if h > 1 && near(hz) {
				continue
			}
			used = append(used, hz)
			l.Harm = append(l.Harm, Line{Order: h, Hz: hz, track: tone})
		}
	}
	if f.MainsHz > 0 {
		l.MainsTrack = f.Mains
		if t := o.Supply.supplyTrack(); t != nil && t.Len == s.Len() {
			l.MainsTrack = t
		}
		if l.MainsTrack == nil {
			l.MainsTrack = &sinefit.Track{Len: s.Len(), Nu: f.MainsHz / rate, Rigid: true}
		} else {
			l.MainsFound = true
		}
		l.MainsHz = l.MainsTrack.Nu * rate
		if f.Comb.Rival != nil {
			l.Rival = f.Comb.Rival.Hz
		}
		for k := 1; k <= o.Mains; k++ {
			hz := float64(k) * l.MainsHz
			if hz >= rate/2 {
				break
			}
			if o.Reference && !slices.Contains(f.Comb.Orders, k) {
				continue
			}
			m := Line{Order: k, Hz: hz, track: l.MainsTrack}
			m.Dropped = near(hz)
			if !m.Dropped {
				used = append(used, hz)
			}
			l.Mains = append(l.Mains, m)
		}
	}
	if l.slowPays() {
		for i := range l.Mains {
			q := &l.Mains[i]
			q.weak = !slices.Contains(f.Comb.Orders, q.Order) && !slices.Contains(f.Comb.Faint, q.Order)
		}
	}
	for _, t := range f.Others {
		hz := t.Nu * rate
		if near(hz) {
			continue
		}
		used = append(used, hz)
		l.Others = append(l.Others, Line{Order: 1, Hz: hz, track: t})
	}
}

// all lists pointers to every fitted line in one fixed order.
func (l *Lines) all() []*Line {
	var out []*Line
	for _, set := range [][]Line{l.Harm, l.Mains, l.Others} {
		for i := range set {
			if !set[i].Dropped {
				out = append(out, &set[i])
			}
		}
	}
	return out
}

// fitBlocks solves every block and turns the phasors back by their tracks;
// weak lines are left for later.
func (l *Lines) fitBlocks() {
	var lines []*Line
	for _, q := range l.all() {
		if q.weak {
			q.Blocks = make([]complex128, len(l.Blocks))
			continue
		}
		lines = append(lines, q)
	}
	nu := make([]float64, len(lines))
	var buf []float64
	dc, samples := 0.0, 0.0
	var solver *sinefit.Solver
	for _, b := range l.Blocks {
		n := b.To - b.From
		if cap(buf) < n {
			buf = make([]float64, n)
		}
		y := buf[:l.Sig.Read(buf[:n], b.From)]
		changed := solver == nil || solver.N != n
		for i, q := range lines {
			v := float64(q.Order) * q.track.NuAt(b.Middle())
			changed = changed || v != nu[i]
			nu[i] = v
		}
		if changed {
			sv, err := sinefit.NewSolver(append([]float64(nil), nu...), n)
			if err != nil {
				for _, q := range lines {
					q.Blocks = append(q.Blocks, 0)
				}
				l.Cond = math.Inf(1)
				continue
			}
			solver = sv
		}
		fit := solver.Block(y)
		l.Cond = math.Max(l.Cond, fit.Cond)
		dc += fit.DC * float64(n)
		samples += float64(n)
		for i, q := range lines {
			turn := q.track.OrderTurns(float64(q.Order), b.Middle())
			q.Blocks = append(q.Blocks, fit.Z[i]*sinefit.Phasor(-turn))
		}
	}
	if samples > 0 {
		l.DC = dc / samples
	}
	for _, q := range lines {
		l.mean(q)
	}
}

// mean sets a line's mean phasor from those of the blocks.
func (l *Lines) mean(q *Line) {
	sum, weight := complex(0, 0), 0.0
	for m, b := range l.Blocks {
		n := float64(b.To - b.From)
		sum += q.Blocks[m] * complex(n, 0)
		weight += n
	}
	q.Z = sum / complex(weight, 0)
}

// measure reads the noise that is left and takes its share off the lines'
// powers.
func (l *Lines) measure(v *Survey) {
	l.Noise = l.residual(v)
	l.fill()
	T := l.Sig.DurationS()
	for _, q := range l.all() {
		l.power(q, T)
	}
	if l.Cond > 1.02 && !math.IsInf(l.Cond, 0) { // what closely neighbouring lines cost
		for i := range l.Harm {
			l.Harm[i].U *= math.Sqrt(l.Cond)
		}
	}
}

// power fills the power of a line and its noise share. A tone, its harmonics
// and other lines are coherent: their phase follows their track, so the mean
// phasor holds their power, with the noise of the whole span. The phases of
// mains harmonics wander against the fundamental: their powers are averaged
// over the blocks, with the noise share of a block.
func (l *Lines) power(q *Line, T float64) {
	q.Dens = l.DensityAt(q.Hz)
	whole := q.Dens / T
	q.Whole = abs2(q.Z)/2 - whole
	if !l.isMains(q) {
		q.Share = whole
		q.Power = q.Whole
		q.U = math.Sqrt(2*math.Max(q.Power, 0)*whole + whole*whole)
		if drift := l.drifting(q); drift > 0 { // amplitude or phase wanders: mean of block powers
			q.Power = drift
		}
		return
	}
	sum, share, weight := 0.0, 0.0, 0.0
	variance := 0.0
	for m, b := range l.Blocks {
		n := float64(b.To - b.From)
		s := q.Dens * l.Sig.RateHz / n
		sum += n * abs2(q.Blocks[m]) / 2
		share += n * s
		weight += n
		variance += n * n * (s*s + 2*s*math.Max(abs2(q.Blocks[m])/2-s, 0))
	}
	q.Share = share / weight
	q.Power = sum/weight - q.Share
	q.U = math.Sqrt(variance) / weight
}

// drifting is the mean of the block powers (noise shares off) when a line that
// should be coherent scatters by more than noise explains, else 0.
func (l *Lines) drifting(q *Line) float64 {
	if len(l.Blocks) < 3 {
		return 0
	}
	chi, sum, weight := 0.0, 0.0, 0.0
	for m, b := range l.Blocks {
		n := float64(b.To - b.From)
		s := q.Dens * l.Sig.RateHz / n // E |noise phasor|^2 / 2
		d := q.Blocks[m] - q.Z
		if s > 0 {
			chi += abs2(d) / 2 / s
		} else if abs2(d) > 1e-20*abs2(q.Z) {
			chi = math.Inf(1)
		}
		sum += n * (abs2(q.Blocks[m])/2 - s)
		weight += n
	}
	m := float64(len(l.Blocks) - 1)
	if chi > m+6*math.Sqrt(m)+8 {
		return sum / weight
	}
	return 0
}

func (l *Lines) isMains(q *Line) bool { return q.track == l.MainsTrack }

// Fundamental is the tone itself; nil without one.
func (l *Lines) Fundamental() *Line {
	if len(l.Harm) == 0 {
		return nil
	}
	return &l.Harm[0]
}

// Phasor is the coherent mean of the fundamental, at the middle of the span.
func (l *Lines) Phasor() complex128 {
	if f := l.Fundamental(); f != nil {
		return f.Z
	}
	return 0
}

// PhasorU is the standard uncertainty of each of its two parts from noise:
// the Cramer-Rao bound sqrt(S/T), S the density at the line's sides.
func (l *Lines) PhasorU(q *Line) float64 {
	return math.Sqrt(q.Dens/l.Sig.DurationS()) * math.Sqrt(math.Max(1, math.Min(l.Cond, 1e6)))
}
