package events

import (
	"math"
	"math/cmplx"

	"benchslip/analyze/internal/sinefit"
	"benchslip/analyze/internal/spectrum"
)

// levelWindow is how long, s, a level must hold on both sides of a step.
const levelWindow = 0.25

// leastStep is 0.1 dB in nepers, leastNoise 1 dB (of noise beside a tone).
var (
	leastStep  = 0.1 * math.Ln10 / 20
	leastNoise = 1 * math.Ln10 / 20
)

// changes looks for what changes and stays so.
func (st *stretch) changes(x []float64) {
	rate := st.sc.rate
	rest := x
	if hz := st.sc.toneHz; hz > 0 {
		hop := int(math.Max(0.005, 3/hz) * rate)
		l := newLiner(hz/rate, hop)
		z := l.line(x)
		if turn := turning(z); math.Abs(turn) > 1e-5 { // what the survey's frequency is off by
			l = newLiner(hz/rate+turn/(2*math.Pi*float64(hop)), hop)
			z = l.line(x)
		}
		st.toneChanges(x, z, l.nu, hop)
		rest = l.less(x, z)
	}
	for _, f := range st.sc.supplies {
		st.mainsChanges(rest, f)
	}
	st.noiseChanges()
}

// contrast is the median of v over w values after each place less that before,
// gap values between; found every stride values. Places without a full window
// give NaN. u is its standard uncertainty by the scatter within both windows
// (of normal values, neighbours of which are not independent: a kernel of three
// pieces).
func contrast(v []float64, w, gap, stride int) (d, u []float64) {
	n := len(v)/stride + 1
	meds, spread := make([]float64, n), make([]float64, n)
	away := make([]float64, w)
	for k := range n {
		if k*stride+w > len(v) {
			meds[k] = math.NaN()
			continue
		}
		copy(away, v[k*stride:])
		meds[k] = spectrum.Median(away)
		for i, y := range away {
			away[i] = math.Abs(y - meds[k])
		}
		spread[k] = spectrum.Median(away) / 0.6745 * 1.25 * math.Sqrt(2/float64(w))
	}
	d, u = make([]float64, n), make([]float64, n)
	before, after := (w+gap+stride-1)/stride, (gap+stride-1)/stride
	for k := range d {
		d[k] = math.NaN()
		if k-before >= 0 && k+after < n {
			d[k] = meds[k+after] - meds[k-before]
			u[k] = math.Hypot(spread[k+after], spread[k-before])
		}
	}
	return d, u
}

// clear6 sets contrasts to 0 that six standard uncertainties or a fixed least
// value explain, by the scatter within their windows and by that of all
// contrasts, and returns the smallest that would be left.
func clear6(d, u []float64, least float64) float64 {
	least = math.Max(least, 6*sigma(d))
	for k, v := range d {
		if !(math.Abs(v) > math.Max(least, 6*u[k])) {
			d[k] = 0
		}
	}
	return least
}

// sigma is the standard deviation of contrasts without those of events, from
// their lower quartile (0.3186 sigma for a normal law); it knows slow drifts.
func sigma(d []float64) float64 {
	var a []float64
	for _, v := range d {
		if v == v {
			a = append(a, math.Abs(v))
		}
	}
	return quantile(a, 0.25) / 0.3186
}

// peaks lists where d tops out, none nearer than w places to a larger one. A
// step makes a plateau as long as half a window: its middle counts, between the
// places where d falls to half.
func peaks(d []float64, w int) []int {
	var out []int
next:
	for k, v := range d {
		if v == 0 || v != v {
			continue
		}
		for i := max(k-w, 0); i <= min(k+w, len(d)-1); i++ {
			if a := math.Abs(d[i]); a > math.Abs(v) || a == math.Abs(v) && i < k {
				continue next
			}
		}
		a, b := k, k
		for a > 0 && b-a < 4*w && d[a-1]/v > 0.5 {
			a--
		}
		for b+1 < len(d) && b-a < 4*w && d[b+1]/v > 0.5 {
			b++
		}
		out = append(out, (a+b)/2)
	}
	return out
}

// turning is what a line turns from piece to piece: the median.
func turning(z []complex128) float64 {
	var turns []float64
	for k := 1; k < len(z); k++ {
		turns = append(turns, cmplx.Phase(z[k]*cmplx.Conj(z[k-1])))
	}
	return median(turns)
}

// toneChanges follows level and phase of the tone.
func (st *stretch) toneChanges(x []float64, z []complex128, nu float64, hop int) {
	level, phase := make([]float64, len(z)), make([]float64, len(z))
	tiny := 1e-9 * usual(z)
	for k, w := range z {
		level[k] = math.Log(math.Max(cmplx.Abs(w), tiny))
		if k > 0 {
			phase[k] = phase[k-1] + cmplx.Phase(w*cmplx.Conj(z[k-1]))
		}
	}
	w := max(int(levelWindow*st.sc.rate)/hop, 5)
	stride := max(w/10, 1)
	const gap = 4
	top := quantile(level, 0.75)

	d, u := contrast(level, w, gap, stride)
	st.sc.stepLn = math.Max(st.sc.stepLn, clear6(d, u, leastStep))
	for _, k := range peaks(d, (w/2+gap)/stride+2) {
		at, before, after := st.place(x, z, nu, hop, k*stride, w, gap)
		size := (cmplx.Abs(after) - cmplx.Abs(before)) / math.Sqrt2
		st.signs = append(st.signs, sign{what: toneStep, at: at, to: at + 1, size: size, ln: d[k]})
	}
	// Lost samples turn the phase by a whole number of sample steps.
	wp := max(w/2, 5)
	d, u = contrast(phase, wp, gap, stride)
	for k := range d { // what a drifting clock turns meanwhile
		d[k] = math.Remainder(d[k]-drift(phase, k*stride, wp+gap, 4*wp), 2*math.Pi)
	}
	clear6(d, u, 0.4*2*math.Pi*nu)
	for _, k := range peaks(d, (wp/2+gap)/stride+2) {
		if i := k * stride; math.Min(level[max(i-wp, 0)], level[min(i+wp, len(level)-1)]) < top-2.3 {
			continue // no tone on one side
		}
		at, before, _ := st.place(x, z, nu, hop, k*stride, wp, gap)
		st.signs = append(st.signs, sign{what: slip, at: at, to: at + 1, size: cmplx.Abs(before) / math.Sqrt2})
	}
	// A tone that is gone for a moment: less than half of what it is on both
	// sides.
	for k := 0; k < len(level); k++ {
		a, b := max(k-8*w, 0), min(k+8*w, len(level))
		if level[k] > top-math.Ln2 {
			continue
		}
		lo := math.Min(median(level[a:k+1]), median(level[k:b]))
		if level[k] < lo-math.Ln2 {
			st.signs = append(st.signs, sign{what: gone, at: k * hop, to: (k + 1) * hop, size: math.Exp(lo) / math.Sqrt2})
		}
	}
}

// drift is what the phase turns in n pieces by its usual slope about place i,
// the median over reach pieces to both sides of what it turns in n.
func drift(phase []float64, i, n, reach int) float64 {
	a, b := max(i-reach, 0), min(i+reach, len(phase)-n)
	var d []float64
	for k := a; k < b; k += 3 {
		if k+n <= i-4 || k >= i+4 { // clear of the place itself
			d = append(d, phase[k+n]-phase[k])
		}
	}
	return median(d)
}

// place finds where the phasor of the tone goes from what it is before piece i
// to what it is after it: the sample that leaves the least squares on both
// sides, after a running mean over one period.
func (st *stretch) place(x []float64, z []complex128, nu float64, hop, i, w, gap int) (at int, before, after complex128) {
	mid := func(a, b int) complex128 {
		var re, im []float64
		for _, v := range z[max(a, 0):max(min(b, len(z)), max(a, 0)+1)] {
			re, im = append(re, real(v)), append(im, imag(v))
		}
		return complex(median(re), median(im))
	}
	short := min(w, 20) // pieces: the frequency's error hardly turns the phase meanwhile
	before, after = mid(i-gap-short, i-gap), mid(i+gap, i+gap+short)
	from, to := max((i-gap-2)*hop, 0), min((i+gap+2)*hop, len(x))
	step := after - before
	size := real(step)*real(step) + imag(step)*imag(step)
	if size == 0 || to <= from {
		return i * hop, before, after
	}
	n := max(int(1/nu+0.5), 1)
	g := make([]float64, to-from)
	var sum complex128
	ring := make([]complex128, n)
	for k := range g {
		v := complex(2*x[from+k], 0) * cmplx.Conj(sinefit.Phasor(sinefit.Turns(nu, float64(from+k))))
		sum += v - ring[k%n]
		ring[k%n] = v
		y := sum / complex(float64(n), 0)
		g[k] = real((y-before)*cmplx.Conj(step)) / size
	}
	// The running mean ends at its sample: half a period late.
	return max(from+cut(g[min(n, len(g)):])+min(n, len(g))-n/2, 0), before, after
}

// cut is the index at which a course that goes from 0 to 1 is best parted:
// least squares about 0 before and about 1 from there on.
func cut(g []float64) int {
	sum, best, at := 0.0, 0.0, 0
	for i, v := range g {
		sum += v*v - (v-1)*(v-1)
		if sum < best {
			best, at = sum, i+1
		}
	}
	return at
}

// noiseChanges looks for lasting changes of the prediction error's level: of the
// noise.
func (st *stretch) noiseChanges() {
	n := 10
	var level []float64
	for k := 0; k+n <= len(st.fine); k += n {
		sum := 0.0
		for _, v := range st.fine[k : k+n] {
			sum += v / float64(n)
		}
		level = append(level, math.Log(math.Max(sum, 1e-300))/2)
	}
	const w, gap, stride = 50, 2, 5
	d, u := contrast(level, w, gap, stride)
	least := leastStep
	if st.sc.toneHz > 0 {
		least = leastNoise
	}
	clear6(d, u, least)
	for _, k := range peaks(d, w/2/stride) {
		i := k * stride
		quiet := math.Exp(median(level[max(i-w, 0):max(i-gap, 1)]))
		other := math.Exp(median(level[min(i+gap, len(level)-1):min(i+w, len(level))]))
		if math.Max(quiet, other) < 2*math.Max(0.3*st.sc.s.Step, 1e-300) {
			continue // converter steps come and go
		}
		at := st.onset((i-w/2-gap)*n*st.sc.fine.n, (i+w/2+gap)*n*st.sc.fine.n, quiet*quiet, other*other)
		st.signs = append(st.signs, sign{what: noiseStep, at: at, to: at + 1, size: other - quiet, ln: d[k]})
	}
}

// onset is the sample in [from, to) at which errors of the mean square v0
// become such of v1: the largest likelihood.
func (st *stretch) onset(from, to int, v0, v1 float64) int {
	from, to = max(from, order), min(to, len(st.e))
	v0, v1 = math.Max(v0, 1e-300), math.Max(v1, 1e-300)
	sum, best, at := 0.0, 0.0, max(from, 0)
	for i := from; i < to; i++ {
		q := st.e[i] * st.e[i]
		sum += q*(1/v0-1/v1) + math.Log(v0/v1)
		if sum < best {
			best, at = sum, i+1
		}
	}
	return at
}
