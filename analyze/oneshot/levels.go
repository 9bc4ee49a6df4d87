package oneshot

import "math"

// state is a level at which a signal rests.
type state struct {
	v     float64 // mode of the histogram
	noise float64 // RMS a sample about it, converter steps included
	u     float64 // standard uncertainty of v: noise, steps, drift
	n     int     // samples that stand for it
}

// modeOf finds the mode of the samples of x (in order of time) that lie in
// [lo, hi]: IEEE Std 181 takes the levels of a step from a histogram. The bins
// are narrowed about the fullest until they are as wide as the noise or a
// converter step (q, 0: none); the mean of the samples within 2.5 sigma of it
// is the level, so that its scatter is that of a mean and not that of a bin.
// A tail that still creeps towards the level has its mode at its end.
func modeOf(x []float64, lo, hi, q float64) state {
	const bins = 64
	count := make([]int, bins)
	last := make([]int, bins) // index of the latest sample in a bin
	var s state
	lowest, highest := lo, hi // half bins outside the range of values stay empty
	for {
		width := (hi - lo) / bins
		if !(width > 1e-14*(highest-lowest)) {
			break
		}
		clear(count)
		for i, v := range x {
			if v < lo || v > hi || v < lowest || v > highest {
				continue
			}
			k := min(int((v-lo)/width), bins-1)
			count[k]++
			last[k] = i
		}
		best := 0
		for k, c := range count { // of equals the one that was seen last
			if c > count[best] || c == count[best] && c > 0 && last[k] > last[best] {
				best = k
			}
		}
		lo, hi = lo+(float64(best)-1.5)*width, lo+(float64(best)+2.5)*width
		s.v = (lo + hi) / 2
		s.noise = successive(x, lo, hi)
		// Too few samples a bin, or bins as narrow as the noise.
		if (hi-lo)/bins < math.Max(q/4, s.noise/2) || count[best] < 64 {
			break
		}
	}
	s.noise = math.Max(s.noise, q/math.Sqrt(12))
	reach := math.Max(math.Max(q*0.51, 2.5*s.noise), (hi-lo)/8)
	// The second half of the stretch, where it rests there: what an earlier
	// edge left behind has died down the most.
	if half := x[len(x)/2:]; within(half, s.v, reach) >= within(x, s.v, reach)/3 {
		x = half
	}
	for range 8 {
		sum, n := 0.0, 0
		for _, v := range x {
			if math.Abs(v-s.v) <= reach && v >= lowest && v <= highest {
				sum += v - s.v
				n++
			}
		}
		if n == 0 {
			break
		}
		s.n = n
		s.v += sum / float64(n)
		if math.Abs(sum/float64(n)) < s.noise*1e-6 {
			break
		}
	}
	scatter := 0.0
	for _, v := range x {
		if d := v - s.v; math.Abs(d) <= reach {
			scatter += d * d
		}
	}
	if s.n > 1 {
		s.noise = math.Max(math.Sqrt(scatter/float64(s.n)), q/math.Sqrt(12))
		s.u = s.noise / math.Sqrt(float64(s.n))
		// Without noise to dither them, steps do not average out.
		if q > 0 && s.noise < 0.45*q {
			s.u = q / math.Sqrt(12)
		}
	}
	return s
}

// within counts the samples at most reach from a level.
func within(x []float64, level, reach float64) int {
	n := 0
	for _, v := range x {
		if math.Abs(v-level) <= reach {
			n++
		}
	}
	return n
}

// successive is the noise a sample, from the differences of neighbours that
// both lie in [lo, hi]: a slope or tail hardly counts.
func successive(x []float64, lo, hi float64) float64 {
	sum, n := 0.0, 0
	for i := 1; i < len(x); i++ {
		if a, b := x[i-1], x[i]; a >= lo && a <= hi && b >= lo && b <= hi {
			sum += (b - a) * (b - a)
			n++
		}
	}
	if n == 0 {
		return 0
	}
	return math.Sqrt(sum / float64(2*n))
}

// creep is how far a stretch may still be from where it is heading, and how
// much it moved over its last tenth: from the means of its last three tenths,
// continued as a geometric series (an exponential tail is one).
func creep(x []float64, q float64) (remaining, moved float64) {
	n := len(x) / 10
	if n < 1 {
		return 0, 0
	}
	noise := successive(x[len(x)-3*n:], math.Inf(-1), math.Inf(1))
	var m [3]float64
	for k := range m {
		part := x[len(x)-(3-k)*n:][:n]
		for _, v := range part {
			m[k] += v / float64(n)
		}
	}
	// What noise and steps explain is no movement.
	limit := 4*noise*math.Sqrt(2/float64(n)) + q/4
	d1, d2 := m[1]-m[0], m[2]-m[1]
	moved = math.Abs(d2)
	if moved < limit || d1 == 0 {
		return 0, 0
	}
	ratio := d2 / d1
	if ratio >= 0.95 || ratio <= 0 {
		return 0, moved // a straight slope (droop), or ringing: no end to aim at
	}
	// From the middle of the last tenth on.
	return math.Abs(d2) * ratio / (1 - ratio), moved
}

// smooth is the running mean over 2*half+1 samples, shorter at the ends: a
// positive kernel, which makes no overshoot of its own.
func smooth(x []float64, half int) []float64 {
	if half < 1 {
		return x
	}
	y := make([]float64, len(x))
	sum := 0.0
	a, b := 0, 0 // samples [a, b) are in the sum
	for i := range x {
		for ; b < len(x) && b <= i+half; b++ {
			sum += x[b]
		}
		for ; a < i-half; a++ {
			sum -= x[a]
		}
		y[i] = sum / float64(b-a)
	}
	return y
}
