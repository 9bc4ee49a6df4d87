package limits

import "math"

// A sine of peak 1 cut off at +-c (0 < c <= 1), theta = asin c, closed forms:
// mean square (theta - c sqrt(1-c^2) + 2 c^2 (pi/2 - theta)) / pi, fundamental
// (2/pi)(theta + c sqrt(1-c^2)).

// clippedRMS is its RMS and the amplitude of its fundamental.
func clipped(c float64) (rms, fundamental float64) {
	theta, k := math.Asin(c), c*math.Sqrt(1-c*c)
	return math.Sqrt((theta - k + 2*c*c*(math.Pi/2-theta)) / math.Pi), 2 / math.Pi * (theta + k)
}

// residualOf is all but the fundamental of a clipped sine over the total.
func residualOf(c float64) float64 {
	rms, b := clipped(c)
	return math.Sqrt(math.Max(0, 1-b*b/2/(rms*rms)))
}

// clipFor is the c at which the residual is that fraction of the total:
// it falls from 0.435 (square wave) to 0 as c goes from 0 to 1.
func clipFor(fraction float64) float64 {
	lo, hi := 1e-6, 1.0
	for range 60 {
		c := (lo + hi) / 2
		if residualOf(c) > fraction {
			lo = c
		} else {
			hi = c
		}
	}
	return (lo + hi) / 2
}

// hardClip is the output (RMS) at which THD+N would be the limit if the unit
// clipped at one voltage, the one that explains point q.
func hardClip(q point, limit float64) float64 {
	at, _ := clipped(clipFor(q.thdn))
	want, _ := clipped(clipFor(limit))
	// Both waves are cut at the same voltage v: RMS = v clipped(c)/c.
	return q.rms * (want / clipFor(limit)) / (at / clipFor(q.thdn))
}
