package health

import (
	"math"
	"slices"
)

// order is the number of samples before that a prediction uses: enough for
// a handful of sines, few enough for a short block.
const order = 12

// predictor says each sample from the order before it, with coefficients
// fitted by least squares: tones are predicted down to their rounding, noise
// is not.
type predictor struct {
	coef   [order]float64 // of x[i-1], x[i-2], ...
	rms    float64        // RMS of the samples
	errs   []float64      // |error| of x[order:], in order
	median float64        // of errs
	max    float64
}

// fitPredictor needs at least 4*order samples, all finite.
func fitPredictor(x []float64) (predictor, bool) {
	p := predictor{}
	if len(x) < 4*order {
		return p, false
	}
	for _, v := range x {
		if v-v != 0 {
			return p, false
		}
		p.rms += v * v
	}
	p.rms = math.Sqrt(p.rms / float64(len(x)))
	if p.rms == 0 {
		return p, false
	}
	p.errs = make([]float64, len(x)-order)
	p.fit(x, math.Inf(1))
	// Again without what stands out: edges, clicks.
	for range 4 {
		if p.max <= 6*p.median || p.median < 1e-9*p.rms {
			break
		}
		p.fit(x, 6*p.median)
	}
	return p, true
}

// fit leaves out samples whose error so far is beyond limit, and those
// predicted from them. The equations
// are taken up one by one into a triangle by Givens rotations, on top of a
// small multiple of the unit matrix: a noise-free tone has fewer than order
// degrees of freedom.
func (p *predictor) fit(x []float64, limit float64) {
	var r [order][order + 1]float64
	for j := range order {
		r[j][j] = 1e-10 * p.rms * math.Sqrt(float64(len(x)))
	}
	from := order
	for i := order; i < len(x); i++ {
		if p.errs[i-order] > limit {
			from = i + order + 1
		}
		if i < from {
			continue
		}
		var row [order + 1]float64
		for j := range order {
			row[j] = x[i-1-j]
		}
		row[order] = x[i]
		for j := range order {
			if row[j] == 0 {
				continue
			}
			h := math.Sqrt(r[j][j]*r[j][j] + row[j]*row[j])
			c, s := r[j][j]/h, row[j]/h
			for k := j; k <= order; k++ {
				r[j][k], row[k] = c*r[j][k]+s*row[k], c*row[k]-s*r[j][k]
			}
		}
	}
	for j := order - 1; j >= 0; j-- {
		v := r[j][order]
		for k := j + 1; k < order; k++ {
			v -= r[j][k] * p.coef[k]
		}
		p.coef[j] = v / r[j][j]
	}
	p.max = 0
	for i := order; i < len(x); i++ {
		e := math.Abs(x[i] - p.next(x[:i]))
		p.errs[i-order] = e
		p.max = max(p.max, e)
	}
	p.median = median(p.errs)
}

// next predicts the sample after x.
func (p *predictor) next(x []float64) float64 {
	v := 0.0
	for j, c := range p.coef {
		v += c * x[len(x)-1-j]
	}
	return v
}

// noisy says whether x, predicted with errors errs, holds more noise than
// rounding to step leaves (0: none known; then more than a float32 leaves):
// such samples never repeat by themselves.
//
// Rounding alone leaves a median error of about step/4, white noise of
// 0.75 steps RMS one of step/2. Less noise than that still counts when
// prediction gains less than 6 dB: on any tone it gains more.
func noisy(errs, x []float64, step float64) bool {
	if len(errs) == 0 {
		return false
	}
	m := momentsOf(x)
	power := 0.0
	for _, e := range errs {
		power += e * e
	}
	mid := median(errs)
	return mid > step/2 && mid > 1e-6*max(-m.min, m.max) || power/float64(len(errs)) > m.m2/float64(m.n)/4
}

// median is the upper one of an even number.
func median(x []float64) float64 {
	s := slices.Clone(x)
	slices.Sort(s)
	return s[len(s)/2]
}

// tail is the median of the last n errors over that of all.
func (p *predictor) tail(n int) float64 { return median(p.errs[len(p.errs)-n:]) / p.median }
