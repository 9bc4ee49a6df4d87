package transfer

import (
	"math"

	"benchslip/analyze"
)

// Law is that of an exponential sweep: f(t) = Hz exp((t - At)/L), t in s from
// the signal's start; L is negative for a falling one.
type Law struct {
	Hz, At, L float64
}

// HzAt is the frequency at sample i of a signal with the given rate.
func (l Law) HzAt(i int, rate float64) float64 { return l.Hz * math.Exp((float64(i)/rate-l.At)/l.L) }

// lawOf tests a stretch for an exponential sweep. The number of periods since
// the start then follows a exp(t/L) + b. Rising zero crossings are counted
// with a hysteresis of a quarter of the local peak, which noise does not
// cross, as long as a period holds eight samples, and the law is fitted to
// them; it holds when they lie within a twentieth of a period of it (RMS) over
// more than an octave. Nothing but a sweep stays that close over hundreds of
// periods.
func lawOf(s *analyze.Signal, e *envelope, from, to int) (Law, bool) {
	t := crossings(s, e, from, to)
	if len(t) < 12 {
		return Law{}, false
	}
	// The longest stretch in which periods hold eight samples or more.
	best, start := [2]int{}, 0
	for i := 1; i <= len(t); i++ {
		if i == len(t) || t[i]-t[i-1] < 8 {
			if i-start > best[1]-best[0] {
				best = [2]int{start, i}
			}
			start = i
		}
	}
	t = t[best[0]:best[1]]
	if len(t) < 12 {
		return Law{}, false
	}
	// First guess from the frequencies at both ends and in the middle.
	m := len(t)
	k := max(2, m/50)
	fA, tA := float64(k)/(t[k]-t[0]), (t[k]+t[0])/2
	fB, tB := float64(k)/(t[m-1]-t[m-1-k]), (t[m-1]+t[m-1-k])/2
	ratio := fB / fA
	if ratio < 1.5 && ratio > 1/1.5 {
		return Law{}, false
	}
	kappa := math.Log(ratio) / (tB - tA) // 1/L, per sample
	origin := (t[0] + t[m-1]) / 2
	// Gauss-Newton on j = a exp(kappa (t - origin)) + b.
	var a, b, rms float64
	for range 40 {
		// a and b by linear least squares, then a step in kappa.
		var s1, se, see, sj, sej float64
		for j, v := range t {
			x := math.Exp(kappa * (v - origin))
			s1++
			se += x
			see += x * x
			sj += float64(j)
			sej += x * float64(j)
		}
		det := s1*see - se*se
		if !(det > 0) {
			return Law{}, false
		}
		a, b = (s1*sej-se*sj)/det, (see*sj-se*sej)/det
		var g [3]float64 // columns 1, e, a t e projected: full three-parameter step
		var n3 [3][3]float64
		ssr := 0.0
		for j, v := range t {
			x := math.Exp(kappa * (v - origin))
			r := float64(j) - a*x - b
			ssr += r * r
			c := [3]float64{1, x, a * x * (v - origin)}
			for p := range c {
				g[p] += c[p] * r
				for q := range c {
					n3[p][q] += c[p] * c[q]
				}
			}
		}
		rms = math.Sqrt(ssr / float64(m))
		d, ok := solve3(n3, g)
		if !ok {
			break
		}
		step := d[2]
		if lim := 0.2 * math.Abs(kappa); math.Abs(step) > lim {
			step = math.Copysign(lim, step)
		}
		kappa += step
		if math.Abs(step) < 1e-13*math.Abs(kappa) {
			break
		}
	}
	if rms > 0.05 || kappa == 0 || math.IsNaN(kappa) || a*kappa <= 0 {
		return Law{}, false
	}
	rate := s.RateHz
	l := Law{Hz: a * kappa * rate, At: origin / rate, L: 1 / kappa / rate}
	lo, hi := l.HzAt(from, rate), l.HzAt(to, rate)
	if r := hi / lo; r < 2 && r > 0.5 {
		return Law{}, false
	}
	return l, true
}

// crossings lists the rising zero crossings of a stretch, in samples.
func crossings(s *analyze.Signal, e *envelope, from, to int) []float64 {
	var out []float64
	buf := make([]float64, 1<<14)
	low := false
	last := math.NaN() // latest crossing since the signal was low
	previous := math.NaN()
	block, h := -1, 0.0
	for at := from; at < to; {
		k := s.Read(buf[:min(len(buf), to-at)], at)
		if k == 0 {
			break
		}
		for i, v := range buf[:k] {
			v -= e.mean
			n := at + i
			if b := n / e.block; b != block {
				block, h = b, 0.25*e.near(min(b, len(e.peak)-1))
			}
			if previous < 0 && v >= 0 {
				last = float64(n-1) + previous/(previous-v)
			}
			switch {
			case v < -h:
				low = true
			case v > h && low:
				low = false
				if !math.IsNaN(last) {
					out = append(out, last)
				}
			}
			previous = v
		}
		at += k
	}
	return out
}

// solve3 solves a small symmetric system by elimination with pivots.
func solve3(a [3][3]float64, b [3]float64) (x [3]float64, ok bool) {
	for i := range 3 { // scale: the columns differ by many powers of ten
		if a[i][i] <= 0 {
			return x, false
		}
	}
	var d [3]float64
	for i := range d {
		d[i] = 1 / math.Sqrt(a[i][i])
	}
	for i := range 3 {
		for j := range 3 {
			a[i][j] *= d[i] * d[j]
		}
		b[i] *= d[i]
	}
	for i := range 3 {
		p := i
		for r := i + 1; r < 3; r++ {
			if math.Abs(a[r][i]) > math.Abs(a[p][i]) {
				p = r
			}
		}
		if math.Abs(a[p][i]) < 1e-14 {
			return x, false
		}
		a[i], a[p] = a[p], a[i]
		b[i], b[p] = b[p], b[i]
		for r := i + 1; r < 3; r++ {
			f := a[r][i] / a[i][i]
			for c := i; c < 3; c++ {
				a[r][c] -= f * a[i][c]
			}
			b[r] -= f * b[i]
		}
	}
	for i := 2; i >= 0; i-- {
		v := b[i]
		for c := i + 1; c < 3; c++ {
			v -= a[i][c] * x[c]
		}
		x[i] = v / a[i][i]
	}
	for i := range x {
		x[i] *= d[i]
	}
	return x, true
}
