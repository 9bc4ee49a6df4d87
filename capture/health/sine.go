package health

import "math"

// sineFit is a sine fitted to a stretch: peak*cos(omega*i + phase) + offset.
type sineFit struct {
	peak  float64 // > 0, unit of the samples
	omega float64 // rad a sample
	phase float64 // of the cosine at the first sample, rad
	share float64 // of the AC power of the stretch, 0..1
	rest  float64 // RMS of what is left
}

const (
	fitPeriods = 3    // periods a stretch should hold
	fitPoints  = 8192 // samples used in the fit; longer stretches are thinned
)

// fitSine fits the one sine that makes most of x, or reports false. It is
// meant for signals that are nearly one sine: the period comes from crossings
// of the middle, and least squares with all four parameters free refine it
// (the four-parameter fit of IEEE Std 1057, started from the crossings).
// Samples that are not finite are left out.
func fitSine(x []float64) (sineFit, bool) {
	period, ok := crossingPeriod(x)
	if !ok {
		return sineFit{}, false
	}
	// Whole periods: the share of a part of one would depend on which part.
	if whole := int(math.Floor(float64(len(x))/period) * period); whole >= 4 {
		x = x[:whole]
	}
	thin := 1
	for len(x)/thin > fitPoints && period/float64(thin) > 64 {
		thin++
	}
	n := min(len(x)/thin, fitPoints)
	mid := float64(n-1) / 2
	w := 2 * math.Pi / period * float64(thin)

	// Normal equations of cos, sin, 1 and the derivative by frequency, with
	// time counted from the middle in units of half the stretch. The first
	// round has no derivative yet.
	var p [4]float64 // cos, sin, offset, frequency step
	for round := range 8 {
		var a [4][5]float64
		size := 4
		if round == 0 {
			size = 3
		}
		for i := range n {
			v := x[i*thin]
			if v-v != 0 {
				continue
			}
			t := float64(i) - mid
			s, c := math.Sincos(w * t)
			row := [5]float64{c, s, 1, (p[1]*c - p[0]*s) * t / mid, v}
			for j := range size {
				for k := j; k < size; k++ {
					a[j][k] += row[j] * row[k]
				}
				a[j][4] += row[j] * row[4]
			}
		}
		if !solve(&a, &p, size) {
			return sineFit{}, false
		}
		if size == 4 {
			step := p[3] / mid
			w += step
			if !(w > 0 && w < math.Pi*float64(thin)) {
				return sineFit{}, false
			}
			if math.Abs(step) < 1e-9*w {
				break
			}
		}
	}

	var all moments
	left := 0.0
	for i := range n {
		v := x[i*thin]
		if v-v != 0 {
			continue
		}
		s, c := math.Sincos(w * (float64(i) - mid))
		d := v - p[0]*c - p[1]*s - p[2]
		left += d * d
		all.join(moments{n: 1, mean: v})
	}
	if all.n == 0 || all.m2 == 0 {
		return sineFit{}, false
	}
	return sineFit{
		peak:  math.Hypot(p[0], p[1]),
		omega: w / float64(thin),
		phase: math.Atan2(-p[1], p[0]) - w*mid,
		share: 1 - left/all.m2,
		rest:  math.Sqrt(left / float64(all.n)),
	}, true
}

// solve puts the solution of the symmetric system (upper triangle and right
// side in a) into p; false when it is singular.
func solve(a *[4][5]float64, p *[4]float64, size int) bool {
	for j := range size {
		for k := range j {
			a[j][k] = a[k][j]
		}
	}
	for j := range size {
		best := j
		for k := j + 1; k < size; k++ {
			if math.Abs(a[k][j]) > math.Abs(a[best][j]) {
				best = k
			}
		}
		a[j], a[best] = a[best], a[j]
		if !(math.Abs(a[j][j]) > 0) {
			return false
		}
		for k := j + 1; k < size; k++ {
			f := a[k][j] / a[j][j]
			for m := j; m < 5; m++ {
				a[k][m] -= f * a[j][m]
			}
		}
	}
	*p = [4]float64{}
	for j := size - 1; j >= 0; j-- {
		v := a[j][4]
		for k := j + 1; k < size; k++ {
			v -= a[j][k] * p[k]
		}
		p[j] = v / a[j][j]
	}
	return true
}

// crossingPeriod is the mean period in samples between the first and the
// last rise through the middle of the range, with a dead band of a fifth of
// the range to either side; false below two rises.
func crossingPeriod(x []float64) (float64, bool) {
	lo, hi := math.Inf(1), math.Inf(-1)
	for _, v := range x {
		if v-v == 0 {
			lo, hi = min(lo, v), max(hi, v)
		}
	}
	if !(hi > lo) {
		return 0, false
	}
	mid, band := (lo+hi)/2, (hi-lo)/5
	first, last := 0.0, 0.0
	rises := 0
	low := false
	cross := 0 // last sample at or below the middle
	for i, v := range x {
		if v <= mid {
			cross = i
		}
		if v < mid-band {
			low = true
		}
		if low && v > mid+band {
			low = false
			last = float64(cross) + (mid-x[cross])/(x[cross+1]-x[cross])
			if math.IsNaN(last) {
				last = float64(cross)
			}
			if rises == 0 {
				first = last
			}
			rises++
		}
	}
	if rises < 2 {
		return 0, false
	}
	return (last - first) / float64(rises-1), true
}
