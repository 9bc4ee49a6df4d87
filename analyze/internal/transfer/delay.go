package transfer

import (
	"math"
	"math/cmplx"
)

// believed is the smallest phase error, rad, that weights tell apart: below
// it, gear and settling count more than noise.
const believed = 1e-4

// delay fits phi(f) = phi_0 - 2 pi f tau to the unwrapped phases of the
// points that count, weighted by 1/u^2 of the phase, that is by the power
// signal-to-noise ratio. Its uncertainty is that of the slope from noise, or
// from the scatter of the phases about the line where that is larger.
func (c *Curve) delay() {
	u := c.Used()
	if len(u) < 2 {
		return
	}
	phase := c.unwrap(u)
	var s0, s1, s2, b0, b1, noise float64
	for i, q := range u {
		w := weight(q)
		s0 += w
		s1 += w * q.Hz
		s2 += w * q.Hz * q.Hz
		b0 += w * phase[i]
		b1 += w * phase[i] * q.Hz
	}
	det := s0*s2 - s1*s1
	if !(det > 1e-12*s0*s2) {
		return
	}
	slope := (s0*b1 - s1*b0) / det
	c.Phase0 = (b0 - slope*s1) / s0
	c.DelayS = -slope / (2 * math.Pi)
	chi := 0.0
	for i, q := range u {
		r := phase[i] - c.Phase0 - slope*q.Hz
		c.Scatter += r * r / float64(len(u))
		chi += weight(q) * r * r / math.Max(float64(len(u)-2), 1)
		k := weight(q) * (s0*q.Hz - s1) / det
		noise += k * k * (q.U*q.U + q.StepU*q.StepU)
	}
	c.Scatter = math.Sqrt(c.Scatter)
	v := math.Max(noise, s0/det*chi)
	if c.Dense { // neighbouring points share most of their lines
		v *= 3
	}
	c.DelayU = math.Sqrt(v) / (2 * math.Pi)
	c.Phase0 = math.Remainder(c.Phase0, 2*math.Pi)
	c.Impulse = c.impulse(u)
}

func weight(q Point) float64 { return 1 / (q.U*q.U + q.StepU*q.StepU + believed*believed) }

// unwrap makes the phases of neighbouring points one curve: of stimuli that
// fill the band by the slopes at the points, of tones by the one delay that
// brings them closest together.
func (c *Curve) unwrap(u []Point) []float64 {
	phase := make([]float64, len(u))
	if !c.Dense {
		tau := c.commonDelay(u)
		mean := complex128(0)
		for _, q := range u {
			mean += complex(weight(q), 0) * unit(q.H) * turnsOf(q.Hz*tau)
		}
		for i, q := range u {
			phase[i] = cmplx.Phase(mean) + cmplx.Phase(unit(q.H)*turnsOf(q.Hz*tau)*cmplx.Conj(unit(mean))) - 2*math.Pi*q.Hz*tau
		}
		return phase
	}
	for i, q := range u {
		phase[i] = cmplx.Phase(q.H)
		if i == 0 {
			continue
		}
		before := u[i-1]
		expect := phase[i-1] + imag(q.Slope/q.H+before.Slope/before.H)/2*math.Log(q.Hz/before.Hz)
		phase[i] += 2 * math.Pi * math.Round((expect-phase[i])/(2*math.Pi))
	}
	return phase
}

func unit(z complex128) complex128 {
	a := cmplx.Abs(z)
	if a == 0 {
		return 1
	}
	return complex(real(z)/a, imag(z)/a)
}

// longest is how far the common delay of tones is looked for, s.
const longest = 0.1

// commonDelay is the delay that makes the phasors of tones, turned back by
// it, add up to the most: on a grid of an eighth of the shortest period, then
// closer. Of nearly equal ones the shortest counts.
func (c *Curve) commonDelay(u []Point) float64 {
	z := make([]complex128, len(u))
	total := 0.0
	for i, q := range u {
		w := math.Min(weight(q), 1e6) // tones of better than 1e-3 count alike
		z[i] = unit(q.H) * complex(w, 0)
		total += w
	}
	away := func(tau float64) float64 { return 1e-3 * math.Abs(tau) / longest * total }
	sum := func(tau float64) float64 {
		var s complex128
		for i, q := range u {
			s += z[i] * turnsOf(q.Hz*tau)
		}
		return cmplx.Abs(s)
	}
	step := 1 / (8 * u[len(u)-1].Hz)
	best, at := sum(0), 0.0
	up, down, turn := append([]complex128(nil), z...), append([]complex128(nil), z...), make([]complex128, len(u))
	for i, q := range u {
		turn[i] = turnsOf(q.Hz * step)
	}
	for k := 1.0; k*step <= longest; k++ {
		var later, earlier complex128
		for i, r := range turn {
			up[i] *= r
			down[i] *= complex(real(r), -imag(r))
			later += up[i]
			earlier += down[i]
		}
		if v := cmplx.Abs(later) - away(k*step); v > best {
			best, at = v, k*step
		}
		if v := cmplx.Abs(earlier) - away(k*step); v > best {
			best, at = v, -k*step
		}
	}
	for range 30 {
		step /= 2
		for _, tau := range []float64{at - step, at + step} {
			if v := sum(tau) - away(tau); v > best {
				best, at = v, tau
			}
		}
	}
	return at
}

// impulseS is how far about the common delay the impulse response is looked
// at, s.
const impulseS = 1e-3

// impulse looks at the band-limited impulse response about the common delay:
//
//	h(t) = sum_k Re(H_k exp(j 2 pi f_k t)) w_k
//
// with w_k = 1 for tones, f_k for points that stand for a share of the band.
func (c *Curve) impulse(u []Point) Impulse {
	h := make([]complex128, len(u))
	for i, q := range u {
		h[i] = q.H
		if c.Dense {
			h[i] *= complex(q.Hz, 0)
		}
		h[i] *= turnsOf(q.Hz * c.DelayS)
	}
	sum := func(t float64) float64 {
		v := 0.0
		for i, q := range u {
			v += real(h[i] * turnsOf(q.Hz*t))
		}
		return v
	}
	step := math.Max(1/(16*u[len(u)-1].Hz), impulseS/1000)
	best, at, low, high := 0.0, 0.0, 0.0, 0.0
	for i := -int(impulseS / step); float64(i)*step <= impulseS; i++ {
		v := sum(float64(i) * step)
		low, high = math.Min(low, v), math.Max(high, v)
		if math.Abs(v) > math.Abs(best) {
			best, at = v, float64(i)*step
		}
	}
	if best == 0 {
		return Impulse{}
	}
	other := -low
	if best < 0 {
		other = high
	}
	return Impulse{Sign: math.Copysign(1, best), AtS: c.DelayS + at, Next: other / math.Abs(best)}
}

// PhaseDeg is the phase of a point after removing the common delay, in
// (-180, 180].
func (c *Curve) PhaseDeg(q Point) float64 {
	return cmplx.Phase(q.H*turnsOf(q.Hz*c.DelayS)) * 180 / math.Pi
}

// GroupDelays gives -d arg H/d w at each point, the common delay included; of
// tones between the neighbours that count.
func (c *Curve) GroupDelays() []float64 {
	out := make([]float64, len(c.Points))
	if c.Dense {
		for i, q := range c.Points {
			if q.H != 0 {
				out[i] = -imag(q.Slope/q.H) / (2 * math.Pi * q.Hz)
			}
		}
		return out
	}
	u := c.Used()
	if len(u) < 2 {
		return out
	}
	phase := c.unwrap(u)
	k := 0
	for i, q := range c.Points {
		for k < len(u)-1 && u[k].Hz < q.Hz {
			k++
		}
		a, b := max(0, k-1), min(len(u)-1, k+1)
		out[i] = -(phase[b] - phase[a]) / (2 * math.Pi * (u[b].Hz - u[a].Hz))
	}
	return out
}
