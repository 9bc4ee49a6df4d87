package stage

import (
	"math"
	"slices"
)

// Flats is where the two halves of a wave flatten, in the signal's unit, both
// measured from the centre of the sine that the wave follows between them.
// What an AC-coupled path does to the mean of a lopsided wave moves that
// centre with it.
type Flats struct {
	Positive, Negative   float64 // of the flat, or the sine's own peak where there is none
	PositiveU, NegativeU float64 // standard uncertainty of each
	Centre, CentreU      float64
	Peak                 float64 // of the sine
	Up, Down             bool    // this half is flat
}

// Any reports whether a half is flat.
func (f Flats) Any() bool { return f.Up || f.Down }

const (
	foldSamples = 1 << 21 // samples used at most
	foldBins    = 1024    // phases at most
	knee        = 0.03    // of the sine's peak: samples nearer to a flat are left out of the fit
	leastExcess = 0.003   // of the sine's peak: less is no flat
	mostRound   = 0.35    // curvature left in a flat, of the sine's own
)

// folded is one period of the wave: phases in turns of the tone, from all
// periods of a signal.
type folded struct {
	turn, y, n []float64 // mean phase, mean value and number of samples of each bin that has any
	phase, x   []float64 // of every sample
}

func fold(h *Heard) folded {
	s := h.Out
	n := min(s.Len(), foldSamples)
	f := folded{phase: make([]float64, n), x: make([]float64, n)}
	f.x = f.x[:s.Read(f.x, 0)]
	f.phase = f.phase[:len(f.x)]
	bins := max(min(foldBins, len(f.x)/8), 32)
	sumT, sumY, count := make([]float64, bins), make([]float64, bins), make([]float64, bins)
	for i, x := range f.x {
		t := h.Tone.Track.Turns(float64(i))
		t -= math.Floor(t)
		f.phase[i] = t
		k := min(int(t*float64(bins)), bins-1)
		sumT[k] += t
		sumY[k] += x
		count[k]++
	}
	for k, c := range count {
		if c > 0 {
			f.turn, f.y, f.n = append(f.turn, sumT[k]/c), append(f.y, sumY[k]/c), append(f.n, c)
		}
	}
	return f
}

// sine is centre + a cos + b sin with the inverse of its normal matrix.
type sine struct {
	c, a, b float64
	inv     [3]float64 // variances of c, a, b per unit of noise variance a sample
	sigma   float64    // RMS a sample of what the fit leaves of the means
}

func (s sine) at(turn float64) float64 {
	q, c := math.Sincos(2 * math.Pi * turn)
	return s.c + s.a*c + s.b*q
}

func (s sine) peak() float64 { return math.Hypot(s.a, s.b) }

// fitSine fits the bins that use allows, each with the weight of its samples.
func (f folded) fitSine(use func(i int) bool) (sine, bool) {
	var m [3][4]float64
	bins := 0
	for i, t := range f.turn {
		if !use(i) {
			continue
		}
		bins++
		q, c := math.Sincos(2 * math.Pi * t)
		row := [3]float64{1, c, q}
		for r := range 3 {
			for k := range 3 {
				m[r][k] += f.n[i] * row[r] * row[k]
			}
			m[r][3] += f.n[i] * row[r] * f.y[i]
		}
	}
	if bins < 8 {
		return sine{}, false
	}
	x, inv, ok := solve(m)
	s := sine{c: x[0], a: x[1], b: x[2], inv: inv}
	sum := 0.0
	for i, t := range f.turn {
		if use(i) {
			d := f.y[i] - s.at(t)
			sum += f.n[i] * d * d
		}
	}
	s.sigma = math.Sqrt(sum / float64(bins-3))
	return s, ok
}

// solve is Gauss-Jordan elimination of a 3 x 3 system that is symmetric and
// positive; inv is the diagonal of the inverse.
func solve(m [3][4]float64) (x, inv [3]float64, ok bool) {
	var id [3][3]float64
	for i := range 3 {
		id[i][i] = 1
	}
	scale := m[0][0]
	for c := range 3 {
		if !(m[c][c] > 1e-9*scale) {
			return x, inv, false
		}
		for r := range 3 {
			if r == c {
				continue
			}
			k := m[r][c] / m[c][c]
			for j := range 4 {
				m[r][j] -= k * m[c][j]
			}
			for j := range 3 {
				id[r][j] -= k * id[c][j]
			}
		}
	}
	for i := range 3 {
		x[i], inv[i] = m[i][3]/m[i][i], id[i][i]/m[i][i]
	}
	return x, inv, true
}

// FlatsOf finds the flats of a heard tone. ok is false where no sine can be
// fitted beside them.
func FlatsOf(h *Heard) (Flats, bool) {
	f := fold(h)
	lo, hi := slices.Min(f.y), slices.Max(f.y)
	mid, half := (lo+hi)/2, (hi-lo)/2
	s, ok := f.fitSine(func(i int) bool { return math.Abs(f.y[i]-mid) < 0.5*half })
	if !ok || s.peak() == 0 {
		return Flats{}, false
	}
	for range 12 {
		m := knee * s.peak()
		next, ok := f.fitSine(func(i int) bool {
			v := s.at(f.turn[i])
			return (v < hi-m || s.c+s.peak() <= hi) && (v > lo+m || s.c-s.peak() >= lo)
		})
		if !ok {
			break
		}
		s = next
		hi, lo = f.level(s, hi, +1), f.level(s, lo, -1)
	}
	out := Flats{Centre: s.c, Peak: s.peak(), CentreU: s.sigma * math.Sqrt(s.inv[0])}
	peakU := s.sigma * math.Sqrt(math.Max(s.inv[1], s.inv[2]))
	step := h.Out.Step
	out.Positive, out.PositiveU, out.Up = f.flat(s, hi, +1, step)
	out.Negative, out.NegativeU, out.Down = f.flat(s, lo, -1, step)
	if !out.Up {
		out.Positive, out.PositiveU = out.Peak, peakU
	}
	if !out.Down {
		out.Negative, out.NegativeU = out.Peak, peakU
	}
	return out, true
}

// level is the median of the means where the sine lies beyond the level found
// before; the sine's own peak where it nowhere does.
func (f folded) level(s sine, before, sign float64) float64 {
	var v []float64
	for i, t := range f.turn {
		if sign*(s.at(t)-before) > 0 {
			v = append(v, f.y[i])
		}
	}
	if len(v) < 3 {
		return s.c + sign*s.peak()
	}
	return median(v)
}

// flat measures one half: the median of all samples under which the sine lies
// beyond it, from the centre. It is flat when the sine rises far enough over
// it and the samples do not follow the sine's curve.
func (f folded) flat(s sine, level, sign, step float64) (v, u float64, ok bool) {
	excess := sign*(s.c-level) + s.peak() // how far the sine passes the level
	if excess < leastExcess*s.peak() || excess < step {
		return 0, 0, false
	}
	angle := math.Acos(1-math.Min(excess/s.peak(), 1)) / (2 * math.Pi) // half width, turns
	top := math.Atan2(s.b, s.a) / (2 * math.Pi)
	if sign < 0 {
		top += 0.5
	}
	away := func(turn float64) float64 { d := turn - top; return math.Abs(d - math.Round(d)) }
	// How much lower the outer half of the flat lies than the inner one,
	// against the sine there.
	var inner, outer, innerSine, outerSine, nIn, nOut float64
	for i, t := range f.turn {
		switch d := away(t); {
		case d < 0.45*angle:
			inner += f.n[i] * f.y[i]
			innerSine += f.n[i] * s.at(t)
			nIn += f.n[i]
		case d < 0.9*angle:
			outer += f.n[i] * f.y[i]
			outerSine += f.n[i] * s.at(t)
			nOut += f.n[i]
		}
	}
	if nIn < 3 || nOut < 3 {
		return 0, 0, false
	}
	if round := (inner/nIn - outer/nOut) / (innerSine/nIn - outerSine/nOut); round > mostRound {
		return 0, 0, false
	}
	var all, core []float64
	sum := 0.0
	for i, t := range f.phase {
		d := away(t)
		if d >= angle {
			continue
		}
		all = append(all, f.x[i])
		sum += f.x[i]
		if d < angle/2 {
			core = append(core, f.x[i])
		}
	}
	if len(core) < 3 {
		return 0, 0, false
	}
	m := median(all)
	mean, spread := sum/float64(len(all)), 0.0
	for _, x := range all {
		spread += (x - mean) * (x - mean) / float64(len(all))
	}
	spread = math.Sqrt(spread)
	// A median scatters 1.2533 times as much as a mean; steps of a converter
	// that no noise covers leave it anywhere within one; a round flat has no
	// one level.
	u = 1.2533 * spread / math.Sqrt(float64(len(all)))
	if spread < 0.45*step {
		u = math.Hypot(u, step/math.Sqrt(12))
	}
	u = math.Hypot(u, math.Abs(m-median(core))/math.Sqrt(3))
	if excess < 4*u {
		return 0, 0, false
	}
	return sign * (m - s.c), u, true
}

func median(x []float64) float64 {
	slices.Sort(x)
	n := len(x)
	return (x[(n-1)/2] + x[n/2]) / 2
}
