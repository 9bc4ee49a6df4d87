package events

import (
	"math"
	"math/cmplx"
)

const (
	slowRate   = 2000 // Hz, about: enough for the mains lines that are followed
	orders     = 6    // mains lines followed
	humRatio   = 1.26 // least change of the hum: 2 dB
	humWindow  = 0.3  // s on both sides
	humAgainst = 3    // times what the gaps between the lines change
)

// mainsChanges follows the first mains lines and DC. Pieces of a whole period
// have their zeros on all other lines; three of them, weighted 1 2 1, have one
// half way between the lines too, where a second reading says what noise does.
func (st *stretch) mainsChanges(x []float64, hz float64) {
	n := max(int(st.sc.rate/slowRate), 1)
	y := decimate(x, n)
	rate := st.sc.rate / float64(n)
	period := int(rate/hz + 0.5)
	if period < 4 || len(y) < 40*period {
		return
	}
	lines, gaps := make([]float64, len(y)/period), make([]float64, len(y)/period)
	for k := 1; k <= orders; k++ {
		f := float64(k) * hz
		if f > 0.4*rate || st.sc.toneHz > 0 && math.Abs(f-st.sc.toneHz) < 1.5*hz {
			continue
		}
		for i, z := range newLiner(f/rate, period).line(y) {
			lines[i] += meanSquareOf(z)
		}
		for i, z := range newLiner((f+hz/2)/rate, period).line(y) {
			gaps[i] += meanSquareOf(z)
		}
	}
	for i := range lines {
		lines[i], gaps[i] = math.Sqrt(lines[i]), math.Sqrt(gaps[i])
	}
	w := int(humWindow * hz)
	const gap = 2
	d, u := contrast(lines, w, gap, 1)
	other, _ := contrast(gaps, w, gap, 1)
	st.sc.humV = math.Max(st.sc.humV, clear6(d, u, 0))
	for _, k := range peaks(d, w/2+gap+2) {
		before, after := median(lines[k-w-gap:k-gap]), median(lines[k+gap:min(k+gap+w, len(lines))])
		most, least := math.Max(before, after), math.Min(before, after)
		if most < humRatio*least || math.Abs(d[k]) < humAgainst*math.Abs(other[k]) {
			continue
		}
		at := st.humPlace(y, rate, hz, k*period, before, after) * n
		st.signs = append(st.signs, sign{what: humStep, at: at, to: at + 1, size: after - before})
	}
	mean := decimate(y, period)
	d, u = contrast(mean, w, gap, 1)
	clear6(d, u, 0.3*st.sc.s.Step)
	for _, k := range peaks(d, w/2+gap+2) {
		from, to := max(k-gap-1, 0)*period, min(k+gap+2, len(mean))*period
		g := make([]float64, to-from)
		before := median(mean[k-w-gap : k-gap])
		for i := range g {
			g[i] = (y[from+i] - before) / d[k]
		}
		at := (from + cut(g)) * n
		st.signs = append(st.signs, sign{what: dcStep, at: at, to: at + 1, size: d[k]})
	}
}

// humPlace finds where the mains lines change near sample i of y: the lines of a
// fit over 0.2 s before and after, least squares on both sides.
func (st *stretch) humPlace(y []float64, rate, hz float64, i int, before, after float64) int {
	period := rate / hz
	reach := int(3 * period)
	long := int(10 * period)
	a, b := max(i-reach, 0), min(i+reach, len(y))
	left, right := comb(y, rate, hz, a-long, a), comb(y, rate, hz, b, b+long)
	sum, best, at := 0.0, 0.0, a
	for k := a; k < b; k++ {
		l, r := y[k]-left.at(k), y[k]-right.at(k)
		sum += l*l - r*r
		if sum < best {
			best, at = sum, k+1
		}
	}
	return at
}

// combFit is DC and mains lines fitted to a part of a slow signal.
type combFit struct {
	mid  float64
	nu   []float64
	z    []complex128
	mean float64
}

// comb reads the lines over a whole number of periods within [a, b), with the
// frequency's departure from hz taken from the strongest line's phase.
func comb(y []float64, rate, hz float64, a, b int) combFit {
	a, b = max(a, 0), min(b, len(y))
	period := rate / hz
	n := int(math.Floor(float64(b-a)/period) * period)
	if n < int(2*period) {
		return combFit{}
	}
	part := y[a : a+n]
	read := func(x []float64, nu float64) complex128 {
		var sum complex128
		mid := float64(len(x)-1) / 2
		for i, v := range x {
			sum += complex(v, 0) * cmplx.Rect(1, -2*math.Pi*nu*(float64(i)-mid))
		}
		return sum * complex(2/float64(len(x)), 0)
	}
	c := combFit{mid: float64(a) + float64(n-1)/2}
	for _, v := range part {
		c.mean += v / float64(n)
	}
	centred := make([]float64, n)
	for i, v := range part {
		centred[i] = v - c.mean
	}
	// The base frequency from how far the strongest line turns between halves.
	best, off := 0.0, 0.0
	half := int(math.Floor(float64(n)/2/period) * period)
	for k := 1; k <= orders; k++ {
		nu := float64(k) * hz / rate
		if nu > 0.4 {
			break
		}
		p, q := read(centred[:half], nu), read(centred[n-half:], nu)
		if m := cmplx.Abs(p) + cmplx.Abs(q); m > best {
			turn := cmplx.Phase(q*cmplx.Conj(p)) - 2*math.Pi*nu*float64(n-half)
			best, off = m, math.Remainder(turn, 2*math.Pi)/(2*math.Pi)/float64(n-half)/float64(k)
		}
	}
	base := hz / rate
	if math.Abs(off) < 0.02*base {
		base += off
	}
	for k := 1; k <= orders; k++ {
		nu := float64(k) * base
		if nu > 0.4 {
			break
		}
		c.nu, c.z = append(c.nu, nu), append(c.z, read(centred, nu))
	}
	return c
}

// at is the fit at sample i of the slow signal, carried on beyond its part.
func (c combFit) at(i int) float64 {
	v := c.mean
	for k, nu := range c.nu {
		v += real(c.z[k] * cmplx.Rect(1, 2*math.Pi*nu*(float64(i)-c.mid)))
	}
	return v
}
