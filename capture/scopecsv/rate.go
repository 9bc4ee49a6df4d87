package scopecsv

import (
	"fmt"
	"math"
	"strconv"
)

// timing is what the time column says about the sampling.
type timing struct {
	step      float64 // s a sample, least-squares slope of time on row over the whole record, breaks left out
	bound     float64 // bound of its error from the rounding of the stamps, s
	median    float64 // median step, s
	noise     float64 // float64's own rounding of the largest stamp, s
	q         float64 // worth of the last digit of the coarsest stamp, s
	breaks    []int   // rows that follow a gap or restart
	repeats   int     // steps of zero
	repeatAt  int
	worst     float64 // largest distance of a stamp from the line, s
	rms       float64
	worstAt   int
	pairs     bool // every stamp stands exactly twice
	even      bool // all stamps lie on the line within their rounding
	single    bool // stamps are 32-bit floats printed with more digits
	scattered bool // over a twentieth of the steps are breaks: no stretches to speak of
	usable    bool // near enough to the line that the slope is a sample rate
}

func pow10(e int) float64 {
	if e < -300 {
		return 0
	}
	return math.Pow10(min(e, 300))
}

// rounding returns the worth of the last digit of each stamp's printed form:
// a number of up to `digits` significant digits, none finer than 10^last.
func rounding(last, digits int) func(t float64) float64 {
	finest := pow10(last)
	lo, hi, worth := 0.0, 0.0, finest // the decade last met, [lo, hi)
	return func(t float64) float64 {
		a := math.Abs(t)
		if a >= lo && a < hi {
			return worth
		}
		if a == 0 {
			return finest
		}
		e := int(math.Floor(math.Log10(a)))
		lo, hi = pow10(e), pow10(e+1)
		if worth = pow10(e - digits + 1); worth <= finest {
			lo, worth = 0, finest
		}
		return worth
	}
}

// measureTime fits the stamps t (ascending where they can be; NaN where a
// stamp is missing). unit is the rounding of a stamp.
func measureTime(t []float64, unit func(float64) float64) timing {
	var m timing
	if len(t) < 2 {
		return m
	}
	lo, hi := math.Inf(1), math.Inf(-1)
	for _, v := range t {
		lo, hi = math.Min(lo, v), math.Max(hi, v)
	}
	far := math.Max(math.Abs(lo), math.Abs(hi))
	m.q = math.Max(unit(lo), unit(hi))
	if m.single = isSingle(t, m.q); m.single {
		m.q = math.Max(m.q, 1.2e-7*far)
	}
	m.noise = 4.5e-16 * far
	m.q = math.Max(m.q, m.noise)

	steps := make([]float64, 0, len(t)-1)
	zeros, least := 0, math.Inf(1)
	for i := 1; i < len(t); i++ {
		if d := t[i] - t[i-1]; d == d {
			steps = append(steps, d)
			switch {
			case d == 0:
				zeros++
			case d > 0:
				least = math.Min(least, d)
			}
		}
	}
	if len(steps) == 0 {
		return m
	}
	m.median = median(append([]float64(nil), steps...))
	switch {
	case pairs(t, zeros) && least > 4*m.q:
		// Two values a stamp: no rate, whatever the rest.
		m.pairs, m.even, m.repeats, m.repeatAt = true, true, zeros, 1
		if t[1] != t[0] {
			m.repeatAt = 2
		}
		m.step = (hi - lo) / float64(len(t)-1)
		return m
	case zeros*4 >= len(steps) && zeros < len(steps):
		m.q = math.Max(m.q, least*(1-1e-9)) // stamps are coarser than their digits
	}
	low, high := m.normal(steps)
	for i := 1; i < len(t); i++ {
		switch d := t[i] - t[i-1]; {
		case d == 0:
			if m.repeats++; m.repeatAt == 0 {
				m.repeatAt = i
			}
			if low > 0 {
				m.breaks = append(m.breaks, i)
			}
		case d > high, d < low:
			m.breaks = append(m.breaks, i)
		}
	}
	if m.step = m.fit(t); !(m.step > 0) {
		m.step = 0
		return m
	}
	m.residuals(t, unit)
	return m
}

// median reorders v and returns its median, in linear time (Hoare's selection,
// "Algorithm 65: FIND", Comm. ACM 4, 1961, with the middle of three as pivot).
func median(v []float64) float64 {
	k := len(v) / 2
	for lo, hi := 0, len(v)-1; lo < hi; {
		p := v[lo+(hi-lo)/2]
		if a, b := v[lo], v[hi]; (p < a) != (a < b) && p != a {
			if (a < b) == (b < p) || a == b {
				p = b
			} else {
				p = a
			}
		}
		i, j := lo, hi
		for i <= j {
			for v[i] < p {
				i++
			}
			for v[j] > p {
				j--
			}
			if i <= j {
				v[i], v[j] = v[j], v[i]
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
			lo, hi = k, k
		}
	}
	if len(v)&1 == 1 {
		return v[k]
	}
	below := v[0]
	for _, x := range v[:k] {
		below = math.Max(below, x)
	}
	return (below + v[k]) / 2
}

// pairs says whether every stamp stands exactly twice.
func pairs(t []float64, zeros int) bool {
	if d := 2*zeros - len(t); d < -2 || d > 2 {
		return false
	}
	first := 0
	if len(t) > 2 && t[1] != t[0] {
		first = 1
	}
	for i := first; i+1 < len(t); i += 2 {
		if t[i] != t[i+1] {
			return false
		}
	}
	return true
}

// normal returns the range of steps that are no break. A step over 1.5
// medians is a gap, one of zero a repeat, one below zero a restart. Where the
// stamps are so coarse that rounding makes steps of k and k+1 of their last
// digit, both are normal: when each is frequent, or when the rare ones stand
// evenly spaced as the rounding of an even time base places them (a Sturmian
// sequence: the distances between them are two neighbouring whole numbers).
// Any longer step is a gap then, since no rounding makes it.
func (m *timing) normal(steps []float64) (low, high float64) {
	q := m.q
	if q < 0.2*m.median {
		return 0.5 * q, 1.5*m.median + q
	}
	count := map[int]int{}
	tick := func(d float64) int { return int(math.Round(math.Max(-1e6, math.Min(1e6, d/q)))) }
	for _, d := range steps {
		count[tick(d)]++
	}
	usual := 0
	for k, n := range count {
		if n > count[usual] || n == count[usual] && k < usual {
			usual = k
		}
	}
	lowest, highest := usual, usual
	for _, k := range []int{usual - 1, usual + 1} {
		if n := count[k]; k >= 0 && n > 0 && (n*20 >= len(steps) && (k > usual || count[usual+1] < n) || n >= 3 && evenlySpaced(steps, k, tick)) {
			lowest, highest = min(lowest, k), max(highest, k)
		}
	}
	high = (float64(highest) + 0.5) * q
	if lowest == 0 {
		return -0.5 * q, high
	}
	return 0.5 * q, high
}

// evenlySpaced says whether the steps of k ticks stand at distances that
// differ by at most one, or by what exact ties may shift them.
func evenlySpaced(steps []float64, k int, tick func(float64) int) bool {
	last, least, most := -1, len(steps), 0
	for i, d := range steps {
		if tick(d) != k {
			continue
		}
		if last >= 0 {
			least, most = min(least, i-last), max(most, i-last)
		}
		last = i
	}
	return most-least <= 2+least/50
}

// fit is the common slope of time on row of all stretches between breaks, by
// least squares, each stretch with its own start.
func (m *timing) fit(t []float64) float64 {
	var sxx, sxy float64
	longest := 1
	from := 0
	for b := 0; b <= len(m.breaks); b++ {
		to := len(t)
		if b < len(m.breaks) {
			to = m.breaks[b]
		}
		var cx, cy, k float64
		for i := from; i < to; i++ {
			if d := t[i] - t[from]; d == d {
				k++
				cx += float64(i - from)
				cy += d
			}
		}
		if k > 1 {
			cx, cy = cx/k, cy/k
			for i := from; i < to; i++ {
				if d := t[i] - t[from]; d == d {
					x := float64(i-from) - cx
					sxx += x * x
					sxy += x * (d - cy)
				}
			}
		}
		longest = max(longest, to-from)
		from = to
	}
	m.bound = m.q / float64(max(1, longest-1))
	if sxx == 0 {
		return 0
	}
	return sxy / sxx
}

// residuals compares each stamp with its stretch's line. A stamp is even when
// it lies within a unit of its last digit: half for rounding or cutting digits,
// the rest for a line bent by ties that round one way before and another way
// behind zero. Added are 1e-4 of a step and what the coarsest stamps leave the
// line itself uncertain by.
func (m *timing) residuals(t []float64, unit func(float64) float64) {
	m.even, m.usable = true, true
	line := m.q * math.Max(0.2, 1/math.Sqrt(float64(len(t))))
	coarse := m.repeats > 0 && m.q > 0.2*m.step
	sum, count := 0.0, 0
	from := 0
	for b := 0; b <= len(m.breaks); b++ {
		to := len(t)
		if b < len(m.breaks) {
			to = m.breaks[b]
		}
		var mean, k float64
		for i := from; i < to; i++ {
			if r := t[i] - t[from] - float64(i-from)*m.step; r == r {
				mean += r
				k++
			}
		}
		if k > 0 {
			mean /= k
		}
		for i := from; i < to; i++ {
			r := math.Abs(t[i] - t[from] - float64(i-from)*m.step - mean)
			if r != r {
				continue
			}
			sum += r * r
			count++
			if r > m.worst {
				m.worst, m.worstAt = r, i
			}
			q := unit(t[i])
			if m.single {
				q = math.Max(q, 1.2e-7*math.Abs(t[i]))
			}
			if coarse {
				q = math.Max(q, m.q)
			}
			if r > q+line+1e-4*m.step+4.5e-16*math.Abs(t[i]) {
				m.even = false
			}
			if r > 0.5*m.step+q {
				m.usable = false
			}
		}
		from = to
	}
	m.rms = math.Sqrt(sum / float64(max(1, count)))
	if len(m.breaks) > max(2, len(t)/20) {
		m.usable, m.even, m.scattered = false, false, true
	}
}

// isSingle says whether stamps printed with more than seven digits are the
// values of a 32-bit float: each agrees with its own rounding to one.
func isSingle(t []float64, q float64) bool {
	fine := false
	for _, v := range t {
		if v != v {
			continue
		}
		d := math.Abs(float64(float32(v)) - v)
		if d > 0.51*q && d > 1e-12*math.Abs(v) {
			return false
		}
		fine = fine || q < 2e-8*math.Abs(v)
	}
	return fine
}

// rounded returns the shortest decimal within slack of v, in relative terms.
func rounded(v, slack float64) float64 {
	for d := 1; d <= 15; d++ {
		r, _ := strconv.ParseFloat(strconv.FormatFloat(v, 'e', d-1, 64), 64)
		if math.Abs(r-v) <= slack*math.Abs(v) {
			return r
		}
	}
	return v
}

// roundRate returns the rate for a step known within slack (relative): as the
// rounder of rate and step.
func roundRate(step, slack float64) float64 {
	slack = math.Max(slack, 2e-10) // rounding errors of the sums over a million rows
	rate := rounded(1/step, slack)
	s := rounded(step, slack)
	if len(strconv.FormatFloat(s, 'e', -1, 64)) < len(strconv.FormatFloat(rate, 'e', -1, 64)) {
		return 1 / s
	}
	return rate
}

func seconds3(v float64) string { return fmt.Sprintf("%.6g s", v) }
