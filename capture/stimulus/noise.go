package stimulus

import (
	"math"
	"math/rand/v2"
)

// uniform gives numbers spread evenly over (-1, 1), the same for a seed on
// every machine.
type uniform struct{ src *rand.PCG }

func newUniform(seed uint64) uniform { return uniform{rand.NewPCG(seed, 0x6e6f697365)} }

// next is an odd multiple of 2^-53.
func (u uniform) next() float64 { return float64(int64(u.src.Uint64()>>11)*2+1-1<<53) * 0x1p-53 }

// whiteNoise has independent values, evenly distributed: the flattest spectrum
// and, at 4.77 dB, the lowest crest factor that random values can have.
type whiteNoise struct {
	u    uniform
	peak float64
}

func (w *whiteNoise) fill(dst []float64, _ int64) {
	for i := range dst {
		dst[i] = w.peak * w.u.next()
	}
}

// pinkNoise is white noise through a ladder of poles and zeros and a short
// trim; its values are nearly Gaussian. Its scale is found by making the
// whole stretch once before it is played, so that its largest sample is peak.
type pinkNoise struct {
	spec  Spec
	u     uniform
	f     *pinkFilter
	scale float64
}

func (p *pinkNoise) fill(dst []float64, _ int64) {
	if p.f == nil {
		p.restart()
		fade, length := p.spec.frames(p.spec.FadeS), p.spec.frames(p.spec.LengthS)
		largest := 0.0
		for n := range length + 2*fade {
			// Fades only lower the samples: the full level counts.
			if y := math.Abs(p.f.next(p.u.next())); n >= fade && n < fade+length {
				largest = max(largest, y)
			}
		}
		p.scale = p.spec.peak() / largest
		p.restart()
	}
	for i := range dst {
		dst[i] = p.scale * p.f.next(p.u.next())
	}
}

func (p *pinkNoise) restart() {
	p.u, p.f = newUniform(p.spec.Seed), newPinkFilter(p.spec.FromHz, float64(p.spec.RateHz))
}

// pinkFilter has an amplitude that falls as 1/sqrt(f) within 0.1 dB, from its
// lowest frequency to 0.45 of the rate.
//
// One pole an octave, each followed by a zero half an octave above, falls by
// 3.01 dB an octave on average, with a ripple of under 0.01 dB; the ladder
// begins three octaves below the lowest frequency, where its own bend is gone.
// Poles and zeros at frequency p are set at exp(-2 pi p / rate) (matched z
// transform), which makes the response rise towards half the rate. A trim of
// five taps, symmetric and so without phase but a delay of two samples, takes
// that back; its taps are solved for from the ladder's own response.
type pinkFilter struct {
	pole, zero []float64
	x, y       []float64 // last input and output of each rung
	trim       [3]float64
	last       [5]float64 // ladder outputs, newest first
}

func newPinkFilter(from, rate float64) *pinkFilter {
	f := &pinkFilter{}
	for p := from / 8; p < rate/2; p *= 2 {
		f.pole = append(f.pole, math.Exp(-2*math.Pi*p/rate))
		f.zero = append(f.zero, math.Exp(-2*math.Pi*p*math.Sqrt2/rate))
	}
	f.x, f.y = make([]float64, len(f.pole)), make([]float64, len(f.pole))

	// The trim's amplitude is t0 + 2 t1 cos w + 2 t2 cos 2w. It must be the
	// wanted amplitude over the ladder's at three angles w, chosen so that
	// what is left between and beyond them is smallest.
	var m [3][4]float64
	for i, w := range []float64{math.Pi / 16, 0.55 * math.Pi, 0.86 * math.Pi} {
		m[i] = [4]float64{1, 2 * math.Cos(w), 2 * math.Cos(2*w), 1 / (math.Sqrt(w) * f.ladder(w))}
	}
	f.trim = solve3(m)
	return f
}

// ladder is the amplitude of poles and zeros alone at angle w.
func (f *pinkFilter) ladder(w float64) float64 {
	square := func(a float64) float64 { return 1 - 2*a*math.Cos(w) + a*a } // |1 - a exp(-jw)|^2
	h := 1.0
	for i := range f.pole {
		h *= square(f.zero[i]) / square(f.pole[i])
	}
	return math.Sqrt(h)
}

// response is the whole filter's amplitude at angle w.
func (f *pinkFilter) response(w float64) float64 {
	return f.ladder(w) * math.Abs(f.trim[0]+2*f.trim[1]*math.Cos(w)+2*f.trim[2]*math.Cos(2*w))
}

func (f *pinkFilter) next(v float64) float64 {
	for i := range f.pole {
		y := v - f.zero[i]*f.x[i] + f.pole[i]*f.y[i]
		f.x[i], f.y[i] = v, y
		v = y
	}
	copy(f.last[1:], f.last[:4])
	f.last[0] = v
	return f.trim[0]*f.last[2] + f.trim[1]*(f.last[1]+f.last[3]) + f.trim[2]*(f.last[0]+f.last[4])
}

// solve3 solves three equations, each a row of coefficients and its right
// side, by Cramer's rule. The rows here are far from dependent.
func solve3(m [3][4]float64) [3]float64 {
	det := func(a, b, c int) float64 {
		return m[0][a]*(m[1][b]*m[2][c]-m[2][b]*m[1][c]) -
			m[1][a]*(m[0][b]*m[2][c]-m[2][b]*m[0][c]) +
			m[2][a]*(m[0][b]*m[1][c]-m[1][b]*m[0][c])
	}
	d := det(0, 1, 2)
	return [3]float64{det(3, 1, 2) / d, det(0, 3, 2) / d, det(0, 1, 3) / d}
}
