package noise

import (
	"math"

	"benchslip/analyze/stage"
)

// shape is noise as a flat part and one that falls as 1/f:
// S(f) = white (1 + corner/f), both in density squared.
type shape struct {
	white, whiteU   float64 // V^2/Hz
	corner, cornerU float64 // Hz, standard uncertainty; 0: no 1/f part stands out
	low, high       float64 // Hz, where it was fitted
}

const (
	bandsPerOctave = 6
	lowestShape    = 20.0    // Hz: below it the coupling of a recorder may fall already
	highestShape   = 10000.0 // Hz: above it a stage may fall
	leastAverages  = 4.0     // a band
	misfit         = 0.12    // RMS relative departure from the model beyond the statistics
)

// shapeOf fits the density of a take, lines left out, by weighted least
// squares over bands of a sixth of an octave: each band's mean scatters by
// 1/sqrt(T width) of the model's own mean there, w + k ln(f2/f1)/(f2-f1). ok is
// false where the density has another shape, or too little of it is there.
func shapeOf(l *stage.Lines) (shape, bool) {
	d := l.Noise
	T := l.Sig.DurationS()
	q := shape{low: math.Max(lowestShape, 4*d.RBW()), high: math.Min(highestShape, 0.4*l.Sig.RateHz)}
	type band struct{ y, x, n float64 } // mean density, mean of 1/f, averages
	var bands []band
	step := math.Pow(2, 1.0/bandsPerOctave)
	for f := q.low; f*step <= q.high*(1+1e-9); f *= step {
		width := f*step - f
		b := band{d.Integrate(f, f*step, nil) / width, math.Log(step) / width, T * width}
		if b.n >= leastAverages && b.y > 0 {
			bands = append(bands, b)
		}
	}
	if len(bands) < 2*bandsPerOctave {
		return q, false
	}
	// Weights from the model itself, which starts at the readings.
	w, k := 0.0, 0.0
	var vw, vk, cov float64
	for round := range 8 {
		var a, b, c, r, s float64
		for _, p := range bands {
			m := w + k*p.x
			if round == 0 || m <= 0 {
				m = p.y
			}
			g := p.n / (m * m)
			a += g
			b += g * p.x
			c += g * p.x * p.x
			r += g * p.y
			s += g * p.x * p.y
		}
		det := a*c - b*b
		if det <= 0 {
			return q, false
		}
		w, k = (c*r-b*s)/det, (a*s-b*r)/det
		vw, vk, cov = c/det, a/det, -b/det
		if k < 0 {
			w, k, vw, vk, cov = r/a, 0, 1/a, 0, 0
		}
	}
	if w <= 0 {
		return q, false
	}
	excess := 0.0
	for _, p := range bands {
		e := p.y/(w+k*p.x) - 1
		excess += (e*e - 1/p.n) / float64(len(bands))
	}
	if excess > misfit*misfit {
		return q, false
	}
	q.white, q.whiteU = w, math.Sqrt(vw)
	if k > 4*math.Sqrt(vk) {
		q.corner = k / w
		q.cornerU = q.corner * math.Sqrt(math.Max(0, vw/(w*w)+vk/(k*k)-2*cov/(w*k)))
	}
	return q, true
}

// into puts the shape into details, densities over gain.
func (q shape) into(details map[string]any, gain float64) {
	e := map[string]any{"white_v_rthz": math.Sqrt(q.white) / gain, "corner_hz": nil, "fitted_hz": []float64{q.low, q.high}}
	if q.corner > 0 {
		e["corner_hz"], e["corner_uncertainty_hz"] = q.corner, 2*q.cornerU
	}
	details["density"] = e
}
