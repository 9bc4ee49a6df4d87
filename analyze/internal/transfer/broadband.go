package transfer

import (
	"fmt"
	"math"
	"math/cmplx"

	"benchslip/analyze"
	"benchslip/analyze/internal/spectrum"
)

// Sizes of what is transformed at once, in samples.
const (
	mostSamples = 1 << 24 // a sweep: 87 s at 192 kHz; 134 MB a spectrum
	noiseBlock  = 1 << 21 // noise is averaged over blocks
)

// gridOctave is the spacing of the points of stimuli that fill the band.
const gridOctave = 24

// mostOrder is the highest harmonic whose response is fitted alongside.
const mostOrder = 5

// spectra of a take's two channels, by block.
type spectra struct {
	X, Y    [][]complex128
	stepHz  float64
	stretch float64
	lowest  float64 // Hz, where a sweep begins (or ends)
	cut     bool    // the signal was there before and goes on after each block
}

// broadband is the curve of a sweep, noise or pulses.
func broadband(out, in *analyze.Signal, sh *Shape) (*Curve, *analyze.Refusal) {
	c := &Curve{Kind: sh.Kind, Out: out, In: in, Dense: true}
	rate := out.RateHz
	sp, bad := transform(out, in, sh)
	if bad != nil {
		return nil, bad
	}
	c.cover(sh, sp, rate)
	if !(c.LowHz < c.HighHz) {
		return nil, &analyze.Refusal{Code: analyze.TooShort,
			Text:   fmt.Sprintf("take %q: the %s is too short to resolve a frequency", out.Take.Name, sh.Kind),
			Advice: "record a longer one"}
	}
	noise := quiet(in, sh, sp)
	first := math.Ceil(gridOctave * math.Log2(c.LowHz/1000))
	last := math.Floor(gridOctave * math.Log2(c.HighHz/1000))
	for k := first; k <= last; k++ {
		c.Points = append(c.Points, sp.point(1000*math.Pow(2, k/gridOctave), sh, noise))
	}
	c.finish()
	return c, nil
}

// cover finds what the stimulus drives: the law's own ends of a sweep, else
// where the input's spectrum stays within 50 dB of its largest.
func (c *Curve) cover(sh *Shape, sp *spectra, rate float64) {
	top := 0.49 * rate
	low := 12 * sp.stepHz * sp.stretch
	if sh.Kind == Sweep {
		a, b := sh.Law.HzAt(sh.Full[0], rate), sh.Law.HzAt(sh.Full[1], rate)
		c.LowHz, c.HighHz = math.Max(math.Min(a, b), low/4), math.Min(math.Max(a, b), 0.49*sp.rate())
		return
	}
	// Mean power a line in sixth-octave stretches.
	peak := 0.0
	type band struct{ lo, hi, power float64 }
	var bands []band
	for f := math.Max(low, 1); f < top; f *= math.Pow(2, 1.0/6) {
		b := band{lo: f, hi: math.Min(f*math.Pow(2, 1.0/6), top)}
		n := 0.0
		for k := int(b.lo / sp.stepHz); k <= int(b.hi/sp.stepHz) && k < len(sp.X[0]); k++ {
			for _, X := range sp.X {
				b.power += abs2(X[k])
				n++
			}
		}
		b.power /= math.Max(n, 1)
		peak = math.Max(peak, b.power)
		bands = append(bands, b)
	}
	for _, b := range bands {
		if b.power > 1e-5*peak {
			if c.LowHz == 0 {
				c.LowHz = b.lo
			}
			c.HighHz = b.hi
		}
	}
}

// transform reads what the stimulus takes up, with its silences, and
// transforms it.
func transform(out, in *analyze.Signal, sh *Shape) (*spectra, *analyze.Refusal) {
	n, rate := out.Len(), out.RateHz
	// Half a second of silence before, and two after, for the unit to settle.
	from := max(0, sh.From-int(0.5*rate))
	to := min(n, sh.To+int(2*rate))
	// Noise between silences is one long event like a sweep; without them, or
	// when it is very long, it is cut.
	if sh.Kind == Noise && (sh.From-from < int(0.02*rate) || to-sh.To < int(0.2*rate) || to-from > noiseBlock) {
		return steadyBlocks(out, in, sh), nil
	}
	if to-from > mostSamples {
		return nil, &analyze.Refusal{Code: analyze.Unsupported,
			Text:   fmt.Sprintf("take %q: a %s of %.3g s is longer than the %.3g s that are transformed at once", out.Take.Name, sh.Kind, float64(to-from)/rate, mostSamples/rate),
			Advice: "play a shorter one, or set a span"}
	}
	by := 1
	if sh.Kind == Sweep {
		by = spare(rate, math.Max(sh.Law.HzAt(sh.From, rate), sh.Law.HzAt(sh.To, rate)))
	}
	n = (to - from) / by
	rate /= float64(by)
	length := spectrum.FastLengthUp(n)
	// Zeros put lines between those of the record, which a short one needs
	// at its lowest frequencies.
	if s := 4 * rate; float64(length) < s {
		length = spectrum.FastLengthUp(int(math.Min(s, 4*float64(n))))
	}
	sp := &spectra{stepHz: rate / float64(length), stretch: float64(length) / float64(n)}
	if sh.Kind == Sweep {
		sp.lowest = math.Min(sh.Law.HzAt(sh.From, out.RateHz), sh.Law.HzAt(sh.To, out.RateHz))
	}
	whole := spectrum.NewWhole(length)
	for i, s := range []*analyze.Signal{in, out} {
		x := make([]float64, to-from, max(to-from, length))
		x = x[:s.Read(x, from)]
		center(x)
		if by > 1 {
			x = thinned(x, by)
		}
		for len(x) < length && len(x) < cap(x) {
			x = append(x, 0)
		}
		F := whole.Forward(x[:min(len(x), length)])
		if i == 0 {
			sp.X = append(sp.X, F)
		} else {
			sp.Y = append(sp.Y, F)
		}
	}
	return sp, nil
}

// spare is by how much the sample rate is higher than a sweep up to top
// needs: a third more than twice its highest frequency.
func spare(rate, top float64) int { return max(1, int(rate/(2.3*top))) }

// thinned keeps every by-th sample behind a low-pass (sinc under a Kaiser
// window, beta 6: 63 dB), flat up to 0.43 of the new rate and down from 0.57
// on. Both channels pass it, so their quotient knows nothing of it but the
// noise that it folds back, 60 dB down.
func thinned(x []float64, by int) []float64 {
	const beta, reach = 6.0, 14 // samples of the new rate to each side
	half := reach * by
	h := make([]float64, 2*half+1)
	for k := range h {
		d := float64(k-half) / float64(by)
		u := d / (reach + 1)
		h[k] = sinc(d) * bessel0(beta*math.Sqrt(1-u*u)) / float64(by)
	}
	out := make([]float64, len(x)/by)
	for i := range out {
		first := i*by - half
		lo, hi := max(0, -first), min(len(h), len(x)-first)
		src, w := x[first+lo:first+hi], h[lo:hi]
		var a, b, c, d float64
		k := 0
		for ; k+4 <= len(src); k += 4 {
			p, q := src[k:k+4:k+4], w[k:k+4:k+4]
			a += p[0] * q[0]
			b += p[1] * q[1]
			c += p[2] * q[2]
			d += p[3] * q[3]
		}
		for ; k < len(src); k++ {
			a += src[k] * w[k]
		}
		out[i] = (a + b) + (c + d)
	}
	return out
}

// steadyBlocks cuts a steady signal into equal blocks.
func steadyBlocks(out, in *analyze.Signal, sh *Shape) *spectra {
	n := sh.To - sh.From
	m := spectrum.FastLength(min(n, noiseBlock))
	sp := &spectra{stepHz: out.RateHz / float64(m), stretch: 1, cut: true}
	whole := spectrum.NewWhole(m)
	buf := make([]float64, m)
	for at := sh.From; at+m <= sh.To && len(sp.X) < 16; at += m {
		for i, s := range []*analyze.Signal{in, out} {
			s.Read(buf, at)
			center(buf)
			F := whole.Forward(buf)
			if i == 0 {
				sp.X = append(sp.X, F)
			} else {
				sp.Y = append(sp.Y, F)
			}
		}
	}
	return sp
}

func center(x []float64) {
	sum := 0.0
	for _, v := range x {
		sum += v
	}
	mean := sum / math.Max(float64(len(x)), 1)
	for i := range x {
		x[i] -= mean
	}
}

// quiet is the noise of the input channel in its silence before or after the
// stimulus, mean |N|^2 of a line at a frequency; nil when there is none.
func quiet(in *analyze.Signal, sh *Shape, sp *spectra) func(hz float64) float64 {
	if sp.cut {
		return nil
	}
	margin := int(0.02 * in.RateHz)
	from, to := 0, sh.From-margin
	if n := in.Len(); n-sh.To > 2*to {
		from, to = sh.To+(n-sh.To)/2, n-margin
	}
	if float64(to-from) < 0.1*in.RateHz {
		return nil
	}
	x := make([]float64, to-from)
	x = x[:in.Read(x, from)]
	m := spectrum.FastLength(min(len(x), int(0.2*in.RateHz)))
	center(x)
	d := spectrum.Welch(slice(x), len(x), in.RateHz, spectrum.Hann(m), m, max(m/2, 1))
	if d.Segments == 0 {
		return nil
	}
	samples := float64(len(sp.X[0])-1) * 2 / sp.stretch
	scale := sp.rate() * samples / 2
	return func(hz float64) float64 { return scale * d.S[min(int(hz/d.StepHz+0.5), len(d.S)-1)] }
}

// point is the transfer function at one frequency.
func (sp *spectra) point(hz float64, sh *Shape, noise func(float64) float64) Point {
	g := &regression{X: sp.X, Y: sp.Y, centre: hz / sp.stepHz, order: 2, stretch: sp.stretch}
	// 1/24 octave to both sides (half of it by the window's weight), ten
	// independent lines at least.
	half := math.Max(hz*(math.Pow(2, 1.0/gridOctave)-1), 8*sp.stepHz*sp.stretch)
	if sh.Kind == Noise {
		half = math.Max(half, 12*sp.stepHz*sp.stretch)
	}
	if sp.cut {
		g.edges = 2
	}
	if sh.Kind == Sweep && sh.Law.L != 0 {
		f1 := sp.lowest
		lead := math.Abs(sh.Law.L) * math.Ln2 // s of the second order
		if hz > 1.8*f1 {
			// Wide enough to hold most of a turn of the second order.
			half = math.Max(half, 0.75/lead)
			if half*lead < 6 {
				for n := 2; n <= mostOrder && float64(n)*f1 < hz*1.1; n++ {
					g.leads = append(g.leads, sh.Law.L*math.Log(float64(n))*sp.stepHz)
				}
			}
		}
	}
	g.half = half / sp.stepHz
	// Over a wide stretch a response bends more than a parabola does; beside
	// the terms of other orders more powers would not be told apart.
	if half > 0.1*hz && len(g.leads) == 0 && 2*g.half/sp.stretch > 16 {
		g.order = 4
	}
	if noise != nil {
		g.noiseX = noise(hz)
	}
	g.delay = g.findDelay(sp.stepHz)
	e := g.solve()
	q := Point{Hz: hz, Why: ""}
	if !e.ok || e.H == 0 {
		q.Why = "too few lines of the spectrum lie about it"
		return q
	}
	q.H, q.Share, q.Dof, q.Coherence = e.H, e.Share, e.Dof, e.Coherence
	q.Slope = e.Slope * complex(hz/sp.stepHz, 0)
	// |H| is moved by the part of the error along it: half of the mean square.
	q.U = math.Sqrt(e.Share/2) / cmplx.Abs(e.H)
	q.ModelU = 0.05 * math.Pow(half/hz, 4)
	if g.order == 4 {
		q.ModelU = 0.01 * math.Pow(half/hz, 6)
	}
	return q
}

func (sp *spectra) rate() float64 { return sp.stepHz * float64(len(sp.X[0])-1) * 2 }

// slowest is the longest delay that neighbouring lines are joined for, s.
const slowest = 0.1

// findDelay is the local delay, in turns a line, by which the output lags the
// input about the centre. The products Y conj(X) are summed over stretches
// short enough for the slowest delay, their mean step of phase is found and
// taken out, and neighbours are joined, until two stretches are left.
func (g *regression) findDelay(stepHz float64) float64 {
	lo := max(int(math.Ceil(g.centre-g.half)), 1)
	hi := min(int(math.Floor(g.centre+g.half)), len(g.X[0])-2)
	each := max(1, int(1/(8*slowest*stepHz)))
	n := (hi - lo + 1) / each
	if n < 4 {
		return 0
	}
	z := make([]complex128, n)
	turn := 0.0 // a line
	for m := range g.X {
		for i := range z {
			for k := lo + i*each; k < lo+(i+1)*each; k++ {
				x := g.X[m][k]
				z[i] += g.Y[m][k] * complex(real(x), -imag(x))
			}
		}
	}
	width := float64(each)
	for {
		var d complex128
		for i := 1; i < len(z); i++ {
			d += z[i] * cmplx.Conj(z[i-1])
		}
		if d == 0 {
			return turn
		}
		step := cmplx.Phase(d) / (2 * math.Pi) / width
		turn -= step
		if len(z) < 4 {
			return turn
		}
		for i := range z {
			z[i] *= turnsOf(-step * width * float64(i))
		}
		half := z[:len(z)/2]
		for i := range half {
			half[i] = z[2*i] + z[2*i+1]
		}
		z = half
		width *= 2
	}
}

func abs2(z complex128) float64 { return real(z)*real(z) + imag(z)*imag(z) }
