package spectrum

import (
	"math"

	"gonum.org/v1/gonum/dsp/fourier"
)

// Density is an averaged one-sided power density on a uniform frequency grid.
type Density struct {
	S        []float64 // V^2/Hz at k * StepHz, k = 0 .. L/2
	StepHz   float64   // rate / L
	RateHz   float64
	Segments int     // averaged segments
	Averages float64 // equivalent number of independent averages
	Used     float64 // share of the samples that counts: the ends lie under slopes of windows alone
	NENBW    float64 // of the window, bins
	Lobe     float64 // half width of the main lobe, bins
}

// RBW is the resolution bandwidth in Hz.
func (d *Density) RBW() float64 { return d.NENBW * d.StepHz }

// Source fills dst from sample index at on and returns how many it filled.
type Source func(dst []float64, at int) int

// Welch averages periodograms of n samples from src (Welch 1967): segments of
// the window's length (at most n), hop samples apart, each padded with zeros
// to L points (even, 2^a 3^b 5^c, at least the window's length). Memory is
// bounded by L. The mean is not removed.
//
// Averages follows from the overlap correlation of the window: K_eff =
// K / (1 + 2 sum_j (1 - j/K) rho_j^2), rho_j = sum w[n] w[n + j hop] / sum w^2.
func Welch(src Source, n int, rate float64, w Window, L, hop int) *Density {
	M := len(w.W)
	pad := float64(L) / float64(M)
	d := &Density{S: make([]float64, L/2+1), StepHz: rate / float64(L), RateHz: rate, NENBW: w.NENBW * pad, Lobe: w.Lobe * pad}
	plan := fourier.NewFFT(L)
	buf := make([]float64, M)
	seg := make([]float64, L)
	coef := make([]complex128, L/2+1)
	have := 0 // valid samples at the head of buf
	for at := 0; at+M <= n; at += hop {
		if have < M {
			have += src(buf[have:], at+have)
			if have < M {
				break
			}
		}
		for i, v := range buf {
			seg[i] = v * w.W[i]
		}
		plan.Coefficients(coef, seg)
		for k, c := range coef {
			d.S[k] += real(c)*real(c) + imag(c)*imag(c)
		}
		d.Segments++
		if hop < M {
			copy(buf, buf[hop:])
			have = M - hop
		} else {
			have = 0
		}
	}
	if d.Segments == 0 {
		return d
	}
	scale := 2 / (rate * w.SumSq * float64(d.Segments))
	for k := range d.S {
		d.S[k] *= scale
	}
	d.S[0] /= 2
	d.S[L/2] /= 2
	d.Averages = effective(w, hop, d.Segments)
	d.Used = used(w, hop, d.Segments, n)
	return d
}

// used is (sum W)^2 / (n sum W^2) with W the sum of the squared windows over
// each of the n samples: a power summed over a wide band scatters as if only
// that share of the samples had been there, all counting alike.
func used(w Window, hop, segments, n int) float64 {
	m := len(w.W)
	var one, two float64
	at := func(i int) { // W at sample i
		x := 0.0
		for j := max(0, (i-m)/hop); j < segments && j*hop <= i; j++ {
			if k := i - j*hop; k < m {
				x += w.W[k] * w.W[k]
			}
		}
		one += x
		two += x * x
	}
	end := (segments-1)*hop + m
	if end <= 4*m {
		for i := range end {
			at(i)
		}
	} else { // between the ends W repeats with every hop
		for i := range m {
			at(i)
			at(end - 1 - i)
		}
		edge1, edge2 := one, two
		one, two = 0, 0
		for i := m; i < m+hop; i++ {
			at(i)
		}
		times := float64(end-2*m) / float64(hop)
		one, two = edge1+one*times, edge2+two*times
	}
	if two == 0 {
		return 1
	}
	return one * one / (float64(n) * two)
}

// effective is K_eff of Welch's averages.
func effective(w Window, hop, segments int) float64 {
	k := float64(segments)
	sum := 0.0
	for j := 1; j < segments && j*hop < len(w.W); j++ {
		rho := 0.0
		for i := j * hop; i < len(w.W); i++ {
			rho += w.W[i] * w.W[i-j*hop]
		}
		rho /= w.SumSq
		sum += (1 - float64(j)/k) * rho * rho
	}
	return k / (1 + 2*sum)
}

// Integrate is the power between f1 and f2 (V^2), straight edges: bin k
// stands for [k-1/2, k+1/2] steps, its density constant there; 0 Hz counts
// only where f1 is 0. gain, when not nil, multiplies the density at each
// frequency (weighting curves, power ratio).
func (d *Density) Integrate(f1, f2 float64, gain func(hz float64) float64) float64 {
	sum := 0.0
	d.Each(f1, f2, func(k int, widthHz float64) {
		g := 1.0
		if gain != nil {
			g = gain(float64(k) * d.StepHz)
		}
		sum += d.S[k] * g * widthHz
	})
	return sum
}

// Each calls fn for every bin that overlaps [f1, f2] with the overlap in Hz.
func (d *Density) Each(f1, f2 float64, fn func(k int, widthHz float64)) {
	if top := d.RateHz / 2; f2 > top {
		f2 = top
	}
	first := int(math.Floor(f1/d.StepHz + 0.5))
	for k := max(first, 0); k < len(d.S); k++ {
		lo := math.Max((float64(k)-0.5)*d.StepHz, f1)
		hi := math.Min((float64(k)+0.5)*d.StepHz, f2)
		if lo < 0 {
			lo = 0
		}
		if hi <= lo {
			if float64(k)*d.StepHz > f2 {
				break
			}
			continue
		}
		fn(k, hi-lo)
	}
}

// BandwidthOf is the statistical bandwidth (Hz) of the density between f1 and
// f2 under gain: (int S)^2 / int S^2; the power there, measured over T
// seconds, scatters by 1/sqrt(B T) relative (Bendat and Piersol).
func (d *Density) BandwidthOf(f1, f2 float64, gain func(hz float64) float64) float64 {
	var one, two float64
	d.Each(f1, f2, func(k int, width float64) {
		s := d.S[k]
		if gain != nil {
			s *= gain(float64(k) * d.StepHz)
		}
		one += s * width
		two += s * s * width
	})
	if two == 0 {
		return 0
	}
	return one * one / two
}
