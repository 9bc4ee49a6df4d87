package doubt

import (
	"fmt"
	"math"

	"benchslip/capture/recording"
)

// Modes of an oscilloscope that change what its samples are.

const (
	longestMean = 16 // samples of a running mean that is looked for
	leastSweep  = 2000
)

// zerosRepeat: the density dips at the further multiples of 1/m too, as a
// running mean makes it and the gaps between a signal's own lines need not.
func zerosRepeat(at func(nu, half float64) float64, m int) bool {
	first := 1 / float64(m)
	for k := 2.0; (k+0.5)*first < 0.48; k++ {
		if at(k*first, 0.03*first) > at((k+0.43)*first, 0.06*first)/4 {
			return false
		}
	}
	return true
}

// averaged looks for the mark of a running mean over m samples in the noise:
// its density follows (sin(pi m f)/(m sin(pi f)))^2, f in cycles a sample, with
// zeros at every 1/m and a lobe of -13.3 dB between the first two.
func averaged(l *listening) []Finding {
	if l.kind != recording.Scope || l.sig.Len() < leastSweep {
		return nil
	}
	// A tone of few samples a period, and its lines folded back, make lobes and
	// gaps of their own.
	if l.tone() > 0.05*l.sig.RateHz {
		return nil
	}
	f := l.quietest()
	at := func(nu, half float64) float64 {
		return f.medianOf((nu-half)*l.sig.RateHz, (nu+half)*l.sig.RateHz)
	}
	for m := longestMean; m >= 3; m-- {
		shape := func(nu float64) float64 {
			d := float64(m) * math.Sin(math.Pi*nu)
			s := math.Sin(math.Pi*nu*float64(m)) / d
			return s * s
		}
		first := 1 / float64(m)
		half := 0.03 * first
		lobe, zero := at(1.43*first, 2*half), at(first, half)
		base := at(0.25*first, 2*half) / shape(0.25*first)
		if base <= 0 || zero <= 0 {
			continue
		}
		low := at(0.5*first, 2*half) / shape(0.5*first)
		if off(lobe/base, shape(1.43*first)) < 3 && off(low/base, 1) < 2 && zero < lobe/10 && zerosRepeat(at, m) {
			return []Finding{l.found(recording.Averaged, 0, l.sig.Len(),
				fmt.Sprintf("the noise has zeros at multiples of 1/%d of the sample rate, %.0f dB deep, with lobes between them: a running mean over %d samples; switch smoothing or averaging off",
					m, 10*math.Log10(lobe/zero), m))}
		}
	}
	return nil
}

// off is how many dB two powers are apart.
func off(a, b float64) float64 { return math.Abs(10 * math.Log10(a/b)) }

const (
	oneWay   = 0.98 // of the pairs go the same way
	zigzag   = 0.9  // of the steps from pair to pair go the other way
	uneven   = 0.15 // relative scatter of the pairs' steps, which a tone at half the rate lacks
	pairsMin = 500
)

// peakDetect looks for samples that are in turn the smallest and the largest
// of an interval: the steps within pairs all go one way, those between pairs
// the other.
func peakDetect(l *listening) []Finding {
	if l.kind != recording.Scope {
		return nil
	}
	n := min(l.sig.Len(), 1<<17)
	if n < 2*pairsMin {
		return nil
	}
	x := make([]float64, n)
	x = x[:l.sig.Read(x, 0)]
	for shift := range 2 {
		up, down, back, all := 0, 0, 0, 0
		sum, square := 0.0, 0.0
		for i := shift; i+2 < len(x); i += 2 {
			d, e := x[i+1]-x[i], x[i+2]-x[i+1]
			all++
			switch {
			case d > 0:
				up++
			case d < 0:
				down++
			}
			if d*e < 0 {
				back++
			}
			sum, square = sum+math.Abs(d), square+d*d
		}
		if all < pairsMin {
			continue
		}
		k := float64(all)
		mean := sum / k
		spread := math.Sqrt(math.Max(square/k-mean*mean, 0))
		if float64(max(up, down)) < oneWay*k || float64(back) < zigzag*k || spread < uneven*mean {
			continue
		}
		return []Finding{l.found(recording.PeakDetect, 0, l.sig.Len(),
			fmt.Sprintf("of %d pairs of samples %.1f %% go the same way, by %.3g %s on average, and the steps between the pairs go back: smallest and largest values in turn, not samples; record in plain sampling mode",
				all, 100*float64(max(up, down))/k, mean, l.sig.Unit))}
	}
	return nil
}
