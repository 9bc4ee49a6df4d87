package doubt

import (
	"fmt"
	"math"
	"math/cmplx"

	"benchslip/capture/recording"
)

// Clocks of players and recorders differ by 10 to 100 ppm (common practice,
// no source); crystals for audio keep within 50 ppm. Ten times that is a wrong
// sample rate, lost samples, or another tone than the job says.
const (
	clockPPM   = 500
	reachShare = 0.01 // of the nominal frequency, within which a line is taken for the tone
	partOfAC   = 0.1  // of the AC power that the tone must make
)

// rate compares the tone with its nominal frequency.
func rate(l *listening) []Finding {
	f := l.frames
	if f.hz == 0 {
		return nil
	}
	for _, nominal := range l.Nominal {
		if math.Abs(f.hz/nominal-1) > reachShare {
			continue
		}
		hz, u, ok := l.refined()
		ppm := (hz/nominal - 1) * 1e6
		if !ok || math.Abs(ppm) < clockPPM+4e6*u/nominal {
			continue
		}
		return []Finding{l.found(recording.RateDoubt, 0, l.sig.Len(),
			fmt.Sprintf("the tone lies at %.7g Hz, %+.0f ppm from the %.6g Hz that the job states; two clocks differ by 100 ppm at most: the sample rate is wrong, samples were lost, or another tone was played", hz, ppm, nominal))}
	}
	return nil
}

// refined is the tone's mean frequency over its longest stretch, from the
// slope of its phase, with the standard uncertainty from the scatter.
func (l *listening) refined() (hz, u float64, ok bool) {
	f := l.frames
	var t stretch
	for _, s := range f.tones() {
		if s.len() > t.len() {
			t = s
		}
	}
	if t.len() < 4 {
		return 0, 0, false
	}
	total, on := 0.0, 0.0
	for i, v := range f.list {
		total += v.rms * v.rms
		if i >= t.from && i < t.to {
			on += abs2(v.z) / 2
		}
	}
	if on < partOfAC*total {
		return 0, 0, false
	}
	n := float64(t.len())
	phase, sx, sxx, sy, sxy := 0.0, 0.0, 0.0, 0.0, 0.0
	var all []float64
	for i := t.from; i < t.to; i++ {
		if i > t.from {
			phase += cmplx.Phase(f.list[i].z * cmplx.Conj(f.list[i-1].z))
		}
		x := float64(i - t.from)
		sx, sxx, sy, sxy = sx+x, sxx+x*x, sy+phase, sxy+x*phase
		all = append(all, phase)
	}
	det := n*sxx - sx*sx
	slope := (n*sxy - sx*sy) / det
	left := 0.0
	for i, y := range all {
		e := y - sy/n - slope*(float64(i)-sx/n)
		left += e * e
	}
	perHz := f.rate / float64(f.n) / (2 * math.Pi)
	return f.hz + slope*perHz, math.Sqrt(left/math.Max(n-2, 1)*n/det) * perHz, true
}

func abs2(z complex128) float64 { return real(z)*real(z) + imag(z)*imag(z) }
