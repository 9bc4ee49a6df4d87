package oneshot

import (
	"math"

	"benchslip/analyze/internal/spectrum"
)

// hump is the spectrum of what is no line.
type hump struct {
	hz    float64    // mean frequency, weighted by power
	band  [2]float64 // Hz; holds 90 % of the power
	at, p []float64  // bins with their frequencies, Hz, and powers
}

// hump looks at the spectrum while the oscillation lasts; nil for a line.
func (w *swing) hump(y []float64, rate float64, f find) *hump {
	m := w.main()
	part := y[max(int(m.from), 0):min(int(m.to)+1, len(y))]
	size := spectrum.FastLength(min(len(part)/8, lastFrame))
	if size < firstFrame/2 { // too short to tell
		return nil
	}
	mean := make([]float64, size/2+1)
	count := 0.0
	spectrum.Frames(part, rate, spectrum.BlackmanHarris(size), size/2, func(_ int, s []float64) bool {
		for k, v := range s {
			mean[k] += v
		}
		count++
		return true
	})
	step := rate / float64(size)
	centre := int(w.hz/step + 0.5)
	a, b := max(centre*3/4, lobe), min(centre*5/4+2, len(mean)-1)
	peak := 0.0
	for k := a; k < b; k++ {
		mean[k] /= count
		peak = math.Max(peak, mean[k])
	}
	// Bins that stand out of the floor and are no specks beside the peak.
	h := &hump{}
	sum := 0.0
	for k := a; k < b; k++ {
		floor := f.look.floor[min(int(float64(k)*step/f.look.stepK+0.5), len(f.look.floor)-1)]
		if mean[k] > 4*floor && mean[k] > peak/30 {
			h.at, h.p = append(h.at, float64(k)*step), append(h.p, mean[k]-floor)
			sum += mean[k] - floor
		}
	}
	run := 0.0
	for i, hz := range h.at {
		if run < 0.05*sum {
			h.band[0] = hz - step/2
		}
		if run < 0.95*sum {
			h.band[1] = hz + step/2
		}
		run += h.p[i]
		h.hz += hz * h.p[i] / sum
	}
	// A line holds 90 % of its power within 3 bins.
	if h.band[1]-h.band[0] < 6.5*step {
		return nil
	}
	return h
}

// kept is the share of the amplitude that the demodulator at the middle of the
// hump lets through: three running means of 2*half+1 samples.
func (h *hump) kept(rate float64, half int) float64 {
	n := float64(2*half + 1)
	all, through := 0.0, 0.0
	for i, hz := range h.at {
		x := math.Pi * (hz - h.hz) / rate
		g := 1.0
		if math.Abs(n*x) > 1e-9 {
			g = math.Pow(math.Sin(n*x)/(n*math.Sin(x)), 3)
		}
		all += h.p[i]
		through += h.p[i] * g * g
	}
	return math.Sqrt(through / all)
}
