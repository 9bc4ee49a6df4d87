package health

import "math"

// Level holds the levels of one channel over all frames, in the channel's
// own unit (fractions of full scale, or volts). With no sample present all
// values are NaN and Count is 0.
type Level struct {
	Count int64 // samples present; NaN and infinite ones are left out

	Mean  float64 // arithmetic mean
	RMS   float64 // root of the mean square, the mean included
	AC    float64 // root of the mean square about the mean
	Min   float64
	Max   float64
	Peak  float64 // largest |sample|, the mean included
	Crest float64 // largest |sample - Mean| over AC, a ratio; NaN where AC is 0

	Codes    int     // different values seen, at most MaxCodes
	MoreCode bool    // there are more than MaxCodes
	Step     float64 // distance of neighbouring values in use; 0: none to be seen
	Bits     int     // bits in use: valid bits less those that are always 0; 0: not an integer format
}

// moments are count, mean and sum of squares about the mean, with extremes.
type moments struct {
	n        int64
	mean, m2 float64
	min, max float64
}

// momentsOf takes the moments of one cell: two passes, so that a large mean costs no
// digits. Values that are not finite are left out.
func momentsOf(x []float64) moments {
	m := moments{min: math.Inf(1), max: math.Inf(-1)}
	// Four sums in step: the additions do not wait for each other.
	var s0, s1, s2, s3 float64
	lo, hi := m.min, m.max
	i := 0
	for ; i+4 <= len(x); i += 4 {
		a, b, c, d := x[i], x[i+1], x[i+2], x[i+3]
		s0 += a
		s1 += b
		s2 += c
		s3 += d
		// New extremes are rare, so these branches cost next to nothing.
		if a < lo {
			lo = a
		}
		if b < lo {
			lo = b
		}
		if c < lo {
			lo = c
		}
		if d < lo {
			lo = d
		}
		if a > hi {
			hi = a
		}
		if b > hi {
			hi = b
		}
		if c > hi {
			hi = c
		}
		if d > hi {
			hi = d
		}
	}
	for ; i < len(x); i++ {
		s0 += x[i]
		lo, hi = min(lo, x[i]), max(hi, x[i])
	}
	sum := (s0 + s1) + (s2 + s3)
	if sum-sum != 0 {
		return momentsOfGappy(x)
	}
	m.n, m.min, m.max = int64(len(x)), lo, hi
	m.mean = sum / float64(len(x))
	s0, s1, s2, s3 = 0, 0, 0, 0
	i = 0
	for ; i+4 <= len(x); i += 4 {
		a, b, c, d := x[i]-m.mean, x[i+1]-m.mean, x[i+2]-m.mean, x[i+3]-m.mean
		s0 += a * a
		s1 += b * b
		s2 += c * c
		s3 += d * d
	}
	for ; i < len(x); i++ {
		d := x[i] - m.mean
		s0 += d * d
	}
	m.m2 = (s0 + s1) + (s2 + s3)
	return m
}

// momentsOfGappy is the slow way for a cell with samples missing.
func momentsOfGappy(x []float64) moments {
	m := moments{min: math.Inf(1), max: math.Inf(-1)}
	for _, v := range x {
		if v-v != 0 {
			continue
		}
		m.n++
		d := v - m.mean
		m.mean += d / float64(m.n)
		m.m2 += d * (v - m.mean)
		m.min, m.max = min(m.min, v), max(m.max, v)
	}
	return m
}

// join adds the moments of the next cell (T. F. Chan, G. H. Golub, R. J.
// LeVeque, "Updating formulae and a pairwise algorithm for computing sample
// variances", Stanford STAN-CS-79-773, 1979).
func (m *moments) join(c moments) {
	if c.n == 0 {
		return
	}
	if m.n == 0 {
		*m = c
		return
	}
	n := m.n + c.n
	d := c.mean - m.mean
	m.m2 += c.m2 + d*d*float64(m.n)*(float64(c.n)/float64(n))
	m.mean += d * (float64(c.n) / float64(n))
	m.n = n
	m.min, m.max = min(m.min, c.min), max(m.max, c.max)
}

func (m *moments) level() Level {
	if m.n == 0 {
		nan := math.NaN()
		return Level{Mean: nan, RMS: nan, AC: nan, Min: nan, Max: nan, Peak: nan, Crest: nan}
	}
	l := Level{Count: m.n, Mean: m.mean, Min: m.min, Max: m.max}
	if m.min == m.max { // all equal: no rounding of sums
		l.Mean = m.min
		l.RMS, l.Peak, l.Crest = math.Abs(m.min), math.Abs(m.min), math.NaN()
		return l
	}
	ms := m.m2 / float64(m.n)
	l.AC = math.Sqrt(ms)
	l.RMS = math.Sqrt(ms + m.mean*m.mean)
	l.Peak = max(-m.min, m.max)
	l.Crest = max(m.max-m.mean, m.mean-m.min) / l.AC
	return l
}
