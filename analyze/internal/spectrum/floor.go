package spectrum

import (
	"math"
	"sort"
)

// MedianBias is the ratio of median to mean of an average of k independent
// periodograms (chi-square, 2k degrees of freedom; Wilson and Hilferty 1931):
// 0.70 for k = 1 (exactly ln 2 = 0.693), towards 1.
func MedianBias(k float64) float64 {
	if k <= 1 {
		return math.Ln2
	}
	r := 1 - 1/(9*k)
	return r * r * r
}

// Floor is the density without its lines: the running median over half bins
// to both sides, its bias removed, found every half of half and joined by
// straight lines in the logarithm. Lines must fill less than half of any
// stretch. Zeros stay zero.
func (d *Density) Floor(half int) []float64 {
	n := len(d.S)
	out := make([]float64, n)
	bias := MedianBias(d.Averages)
	step := max(half/2, 1)
	buf := make([]float64, 0, 2*half+1)
	median := func(k int) float64 {
		lo, hi := max(k-half, 1), min(k+half+1, n)
		buf = append(buf[:0], d.S[min(lo, hi-1):hi]...)
		return Median(buf) / bias
	}
	last, lastAt := median(0), 0
	out[0] = last
	for k := step; ; k += step {
		k = min(k, n-1)
		v := median(k)
		for i := lastAt + 1; i <= k; i++ {
			f := float64(i-lastAt) / float64(k-lastAt)
			if last > 0 && v > 0 {
				out[i] = math.Exp((1-f)*math.Log(last) + f*math.Log(v))
			} else {
				out[i] = (1-f)*last + f*v
			}
		}
		last, lastAt = v, k
		if k == n-1 {
			return out
		}
	}
}

// Median is the upper median of x, which it reorders (Hoare's selection).
func Median(x []float64) float64 {
	lo, hi, k := 0, len(x)-1, len(x)/2
	for lo < hi {
		pivot := x[(lo+hi)/2]
		i, j := lo, hi
		for i <= j {
			for x[i] < pivot {
				i++
			}
			for pivot < x[j] {
				j--
			}
			if i <= j {
				x[i], x[j] = x[j], x[i]
				i++
				j--
			}
		}
		switch {
		case k <= j:
			hi = j
		case k >= i:
			lo = i
		default:
			return x[k]
		}
	}
	return x[k]
}

// Peak is a local maximum that stands out of the floor.
type Peak struct {
	Hz    float64 // interpolated over the logarithm of three bins
	Power float64 // RMS squared of the line, V^2
	Floor float64 // density beneath, V^2/Hz
}

// Peaks lists lines that rise over the floor by more than factor (power
// density), strongest first. One line gives one peak: maxima within a main
// lobe of a stronger one are left out, and so are those that the sidelobes of
// a stronger one could explain: 6 dB over -92 dB, beyond ten bins falling by
// 6 dB an octave (Blackman-Harris, 4 terms).
func (d *Density) Peaks(floor []float64, factor float64) []Peak {
	var peaks []Peak
	n := len(d.S)
	for k := 1; k < n-1; k++ {
		if d.S[k] > d.S[k-1] && d.S[k] >= d.S[k+1] && d.S[k] > factor*floor[k] {
			hz, at := d.vertex(k)
			peaks = append(peaks, Peak{hz, math.Max(at-floor[k], 0) * d.RBW(), floor[k]})
		}
	}
	sort.SliceStable(peaks, func(a, b int) bool { return peaks[a].Power > peaks[b].Power })
	var out []Peak
	lobe := d.Lobe * d.StepHz
next:
	for _, p := range peaks {
		for i, q := range out {
			gap := math.Abs(p.Hz - q.Hz)
			if gap < lobe {
				continue next
			}
			if i >= 40 || p.Power > q.Power*2.5e-9 {
				continue
			}
			far := math.Min(gap, math.Min(p.Hz+q.Hz, 2*(d.RateHz/2)-p.Hz-q.Hz)) / (lobe / 4)
			if p.Power < q.Power*2.5e-9*math.Min(1, 100/(far*far)) {
				continue next
			}
		}
		if len(out) >= 1000 {
			break
		}
		out = append(out, p)
	}
	return out
}

// vertex is the parabola through the logarithms of three bins.
func (d *Density) vertex(k int) (hz, s float64) {
	a, b, c := d.S[k-1], d.S[k], d.S[k+1]
	if a <= 0 || c <= 0 {
		return float64(k) * d.StepHz, b
	}
	la, lb, lc := math.Log(a), math.Log(b), math.Log(c)
	den := la - 2*lb + lc
	if den >= 0 {
		return float64(k) * d.StepHz, b
	}
	x := (la - lc) / (2 * den)
	return (float64(k) + x) * d.StepHz, math.Exp(lb - (la-lc)*x/4)
}
