package sinefit

import (
	"math"
)

// Estimate is what one block says about a line: frequency and phase at the
// middle of the block and the noise they carry.
type Estimate struct {
	At     float64 // position of the block's middle, samples from the span's start
	N      int     // samples in the block
	Nu     float64 // cycles per sample
	Z      complex128
	Sigma2 float64 // noise variance a sample, V^2
}

// phaseVar is the variance of the phase (rad^2) at the middle: 1/(eta N),
// eta = |z|^2/(2 sigma^2); that of the angular frequency is 12/(N^2 - 1)
// times it (Rife and Boorstyn 1974).
func (e Estimate) phaseVar() float64 {
	a2 := real(e.Z)*real(e.Z) + imag(e.Z)*imag(e.Z)
	if a2 == 0 {
		return math.Inf(1)
	}
	// The floor is the rounding of the sums.
	return math.Max(2*e.Sigma2/(a2*float64(e.N)), 1e-28)
}

// Track is the phase of a line over a span of Len samples.
//
// Rigid: turns(i) = Nu (i - mid), mid = (Len-1)/2. Else a deviation is added
// that passes through the phases of the blocks as a cubic Hermite curve with
// the blocks' frequencies as slopes, continued at both ends with the slope
// and curvature found there.
type Track struct {
	Len    int
	Nu     float64 // mean frequency over the span, cycles per sample
	UNu    float64 // its standard uncertainty from noise
	Rigid  bool
	At     []float64 // knots: positions (samples)
	Dev    []float64 // deviation, turns
	Slope  []float64 // its slope, turns per sample
	Spread float64   // standard deviation of the blocks' frequencies about Nu
}

func (t *Track) mid() float64 { return float64(t.Len-1) / 2 }

// Turns is the phase at sample i in turns, reduced to [-1/2, 1/2] except for
// the deviation.
func (t *Track) Turns(i float64) float64 {
	base := Turns(t.Nu, i-t.mid())
	if t.Rigid {
		return base
	}
	d, _ := t.deviation(i)
	return base + d
}

// MeanNu is the mean frequency over the span: the phase gained from its first
// to its last sample. It is Nu for a rigid track.
func (t *Track) MeanNu() float64 {
	if t.Rigid || t.Len < 2 {
		return t.Nu
	}
	last := float64(t.Len - 1)
	a, _ := t.deviation(0)
	b, _ := t.deviation(last)
	return t.Nu + (b-a)/last
}

// OrderTurns is order times the phase, reduced.
func (t *Track) OrderTurns(order, i float64) float64 {
	base := Turns(order*t.Nu, i-t.mid())
	// order*Nu rounds; put back what was lost.
	lost := math.FMA(order, t.Nu, -(order * t.Nu))
	base += lost * (i - t.mid())
	if t.Rigid {
		return base
	}
	d, _ := t.deviation(i)
	return base + order*d
}

// NuAt is the frequency at sample i.
func (t *Track) NuAt(i float64) float64 {
	if t.Rigid {
		return t.Nu
	}
	_, s := t.deviation(i)
	return t.Nu + s
}

func (t *Track) deviation(i float64) (dev, slope float64) {
	n := len(t.At)
	switch {
	case n == 0:
		return 0, 0
	case n == 1:
		return t.Dev[0] + t.Slope[0]*(i-t.At[0]), t.Slope[0]
	}
	if i <= t.At[0] || i >= t.At[n-1] {
		a, b := 0, 1
		if i >= t.At[n-1] {
			a, b = n-1, n-2
		}
		x := i - t.At[a]
		curve := (t.Slope[b] - t.Slope[a]) / (t.At[b] - t.At[a])
		return t.Dev[a] + t.Slope[a]*x + curve*x*x/2, t.Slope[a] + curve*x
	}
	lo, hi := 0, n-1
	for hi-lo > 1 {
		m := (lo + hi) / 2
		if t.At[m] <= i {
			lo = m
		} else {
			hi = m
		}
	}
	h := t.At[hi] - t.At[lo]
	u := (i - t.At[lo]) / h
	d := t.Dev[hi] - t.Dev[lo]
	m0, m1 := t.Slope[lo]*h, t.Slope[hi]*h
	// p = p0 + m0 u + (3d - 2 m0 - m1) u^2 + (m0 + m1 - 2d) u^3
	c2, c3 := 3*d-2*m0-m1, m0+m1-2*d
	return t.Dev[lo] + u*(m0+u*(c2+u*c3)), (m0 + u*(2*c2+3*u*c3)) / h
}

// Join makes a Track over n samples from estimates in order of time, one set
// for each channel that carries the line (their constant phase differences do
// not matter). Phases are unwrapped from block to block with the blocks' own
// frequencies, then a straight line is fitted by weighted least squares to
// phases and frequencies together, which reaches the Cramer-Rao bound of the
// whole span for a steady line. When the scatter about it is more than noise
// explains (chi-square beyond five standard deviations) the deviation is kept.
func Join(n int, channels ...[]Estimate) *Track {
	t := &Track{Len: n, Rigid: true}
	blocks := len(channels[0])
	// Reference frequency: mean weighted by the inverse variance.
	var wsum, nusum float64
	for _, c := range channels {
		for _, e := range c {
			w := float64(e.N) * float64(e.N) / e.phaseVar()
			wsum += w
			nusum += w * e.Nu
		}
	}
	if wsum == 0 {
		return t
	}
	ref := nusum / wsum
	// Deviations from ref per channel, unwrapped; then one set by weight.
	dev := make([]float64, blocks)  // rad
	freq := make([]float64, blocks) // rad per sample
	pw := make([]float64, blocks)   // 1/phase variance
	for c, est := range channels {
		phase := make([]float64, blocks)
		level, weight := 0.0, 0.0
		for m, e := range est {
			raw := math.Atan2(imag(e.Z), real(e.Z)) - 2*math.Pi*Turns(ref, e.At-t.mid())
			if m > 0 {
				p := est[m-1]
				expect := phase[m-1] + 2*math.Pi*((p.Nu+e.Nu)/2-ref)*(e.At-p.At)
				raw += 2 * math.Pi * math.Round((expect-raw)/(2*math.Pi))
			}
			phase[m] = raw
		}
		// Channels differ by a constant: align to those before.
		if c > 0 {
			for m, e := range est {
				w := 1 / (e.phaseVar() + 1/pw[m])
				level += w * (phase[m] - dev[m])
				weight += w
			}
			level /= weight
		}
		for m, e := range est {
			w := 1 / e.phaseVar()
			p, f := phase[m]-level, 2*math.Pi*(e.Nu-ref)
			dev[m] = (pw[m]*dev[m] + w*p) / (pw[m] + w)
			freq[m] = (pw[m]*freq[m] + w*f) / (pw[m] + w)
			pw[m] += w
		}
	}
	// Straight line a + s x, x from the middle.
	var s0, s1, s2, b0, b1, fw float64
	for m, e := range channels[0] {
		x := e.At - t.mid()
		u := pw[m] * (float64(e.N)*float64(e.N) - 1) / 12 // 1/variance of the angular frequency
		s0 += pw[m]
		s1 += pw[m] * x
		s2 += pw[m]*x*x + u
		b0 += pw[m] * dev[m]
		b1 += pw[m]*dev[m]*x + u*freq[m]
		fw += u
	}
	det := s0*s2 - s1*s1
	slope := (s0*b1 - s1*b0) / det
	a := (b0 - slope*s1) / s0
	t.Nu = ref + slope/(2*math.Pi)
	t.UNu = math.Sqrt(s0/det) / (2 * math.Pi)
	chi, spread := 0.0, 0.0
	for m, e := range channels[0] {
		x := e.At - t.mid()
		r := dev[m] - a - slope*x
		f := freq[m] - slope
		chi += pw[m] * r * r
		chi += pw[m] * (float64(e.N)*float64(e.N) - 1) / 12 * f * f
		spread += f * f
	}
	t.Spread = math.Sqrt(spread/float64(blocks)) / (2 * math.Pi)
	dof := float64(2*blocks - 2)
	if dof <= 0 || chi <= dof+5*math.Sqrt(2*dof)+5 {
		return t
	}
	t.Rigid = false
	for m, e := range channels[0] {
		x := e.At - t.mid()
		t.At = append(t.At, e.At)
		t.Dev = append(t.Dev, (dev[m]-a-slope*x)/(2*math.Pi))
		t.Slope = append(t.Slope, (freq[m]-slope)/(2*math.Pi))
	}
	return t
}

// FromFrequencies makes a Track whose frequency passes through nu at
// positions at (straight between, constant beyond): for combs whose own phase
// is of no use.
func FromFrequencies(n int, at, nu []float64) *Track {
	t := &Track{Len: n}
	mean := 0.0
	for _, v := range nu {
		mean += v / float64(len(nu))
	}
	t.Nu = mean
	dev := 0.0
	for m := range at {
		if m > 0 {
			dev += ((nu[m-1]+nu[m])/2 - mean) * (at[m] - at[m-1])
		}
		t.At = append(t.At, at[m])
		t.Dev = append(t.Dev, dev)
		t.Slope = append(t.Slope, nu[m]-mean)
		t.Spread += (nu[m] - mean) * (nu[m] - mean)
	}
	t.Spread = math.Sqrt(t.Spread / float64(len(at)))
	t.Rigid = t.Spread == 0
	return t
}

// SmoothFrequencies is the Rauch-Tung-Striebel smoother for a frequency that
// walks at random: nu[m] with variance u2[m] each, step variance q a block. q
// is the one of a geometric grid (0 first) with the largest likelihood. It
// returns the smoothed values and their variances.
func SmoothFrequencies(nu, u2 []float64) (smooth, variance []float64) {
	best := math.Inf(-1)
	typical := math.Inf(1)
	for _, v := range u2 {
		typical = math.Min(typical, v)
	}
	for step := -1; step <= 24; step++ {
		q := 0.0
		if step >= 0 {
			q = typical * math.Pow(10, float64(step)/2-6)
		}
		s, v, like := rts(nu, u2, q)
		if like > best+2 || math.IsInf(best, -1) { // a wandering track must earn its place
			best, smooth, variance = like, s, v
		}
	}
	return smooth, variance
}

func rts(nu, u2 []float64, q float64) (smooth, variance []float64, like float64) {
	n := len(nu)
	x, p := make([]float64, n), make([]float64, n)
	x[0], p[0] = nu[0], u2[0]
	for m := 1; m < n; m++ {
		prior := p[m-1] + q
		s := prior + u2[m]
		d := nu[m] - x[m-1]
		like -= (d*d/s + math.Log(s)) / 2
		k := prior / s
		x[m] = x[m-1] + k*d
		p[m] = (1 - k) * prior
	}
	for m := n - 2; m >= 0; m-- {
		c := p[m] / (p[m] + q)
		x[m] += c * (x[m+1] - x[m])
		p[m] += c * c * (p[m+1] - p[m] - q)
	}
	return x, p, like
}

// Sum is the track of the line at a*t + b*u that a nonlinearity makes of two
// lines of one record: its phase is a times that of t and b times that of u.
// Knots are those of t and of u; both come from the same blocks, or one of
// them is rigid.
func Sum(a float64, t *Track, b float64, u *Track) *Track {
	s := &Track{Len: t.Len, Nu: a*t.Nu + b*u.Nu, UNu: math.Hypot(a*t.UNu, b*u.UNu), Rigid: t.Rigid && u.Rigid,
		Spread: math.Hypot(a*t.Spread, b*u.Spread)}
	if s.Rigid {
		return s
	}
	s.At = t.At
	if t.Rigid {
		s.At = u.At
	}
	for _, i := range s.At {
		dev, slope := 0.0, 0.0
		for _, part := range []struct {
			k float64
			t *Track
		}{{a, t}, {b, u}} {
			if !part.t.Rigid {
				d, m := part.t.deviation(i)
				dev += part.k * d
				slope += part.k * m
			}
		}
		s.Dev = append(s.Dev, dev)
		s.Slope = append(s.Slope, slope)
	}
	return s
}
