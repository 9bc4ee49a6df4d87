package transfer

import "math"

// Resampling reads a sampled signal between its samples: a sinc under a
// Kaiser window (beta 10: 100 dB), 64 zero crossings to each side, from a
// table of a thousand positions with straight lines between (error under
// 1e-6). Up to 0.475 of the lower of the two rates it is flat.
const (
	zeros     = 64
	positions = 1024
	kaiser    = 10.0
)

// resample gives n samples x[i] = r(at + i*step), at and step in samples of r;
// what lies outside r is 0.
func resample(r []float64, n int, at, step float64) []float64 {
	cut := math.Min(1, 1/step) // low-pass where the new rate is the lower one
	half := int(math.Ceil(zeros / cut))
	// table[p][k]: weight of the sample k - half + 1 from the one below.
	width := 2 * half
	table := make([]float64, (positions+1)*width)
	for p := 0; p <= positions; p++ {
		frac := float64(p) / positions
		row := table[p*width : (p+1)*width]
		sum := 0.0
		for k := range row {
			d := float64(k-half+1) - frac
			row[k] = cut * sinc(cut*d) * window(d/float64(half))
			sum += row[k]
		}
		for k := range row {
			row[k] /= sum
		}
	}
	x := make([]float64, n)
	for i := range x {
		pos := at + float64(i)*step
		base := math.Floor(pos)
		frac := (pos - base) * positions
		p := int(frac)
		u := frac - float64(p)
		first := int(base) - half + 1
		if first+width <= 0 || first >= len(r) {
			continue
		}
		a, b := table[p*width:(p+1)*width], table[min(p+1, positions)*width:][:width]
		lo, hi := max(0, -first), min(width, len(r)-first)
		src := r[first+lo : first+hi]
		a, b = a[lo:hi], b[lo:hi]
		var sa, sb float64
		for k, v := range src {
			sa += v * a[k]
			sb += v * b[k]
		}
		x[i] = sa + u*(sb-sa)
	}
	return x
}

func sinc(x float64) float64 {
	if x == 0 {
		return 1
	}
	return math.Sin(math.Pi*x) / (math.Pi * x)
}

// window is Kaiser's, 1 at 0 and cut at +-1.
func window(u float64) float64 {
	v := 1 - u*u
	if v <= 0 {
		return 0
	}
	return bessel0(kaiser*math.Sqrt(v)) / bessel0(kaiser)
}

// bessel0 is the modified Bessel function I_0 by its power series.
func bessel0(x float64) float64 {
	sum, term := 1.0, 1.0
	for k := 1.0; term > 1e-17*sum; k++ {
		term *= x / 2 / k * (x / 2 / k)
		sum += term
	}
	return sum
}
