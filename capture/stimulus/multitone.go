package stimulus

import (
	"math"
	"slices"
)

// multitone is the sum of equal cosines on multiples of one grid frequency,
// rate / n, with phases that keep its peak low.
type multitone struct {
	n     int64     // frames of a period
	lines []int64   // multiples of the grid frequency, rising
	phase []float64 // rad, of each
	peak  float64   // FS, of the sum
	table []float64 // one period, made when first needed
	each  float64   // FS, peak of one cosine, known with the table
}

func newMultitone(s Spec) *multitone {
	m := &multitone{n: s.gridFrames(), lines: s.gridLines(), peak: s.peak()}
	m.phase = lowCrest(m.lines)
	return m
}

// gridFrames is the period in whole samples.
func (s Spec) gridFrames() int64 { return s.frames(s.PeriodS) }

// gridLines are the multiples of the grid frequency that sound: those nearest
// to the listed frequencies, or to Count equally spaced ones. The spaced ones
// take odd multiples: then no distortion product of even order falls on a
// tone, and at a period of 1 s no tone falls on a multiple of 50 or 60 Hz.
func (s Spec) gridLines() []int64 {
	n := s.gridFrames()
	step := float64(s.RateHz) / float64(n)
	top := int64(toneTop * float64(n))
	var lines []int64
	add := func(k int64) {
		if k >= 1 && k <= top && !slices.Contains(lines, k) {
			lines = append(lines, k)
		}
	}
	for _, f := range s.AtHz {
		add(int64(math.Round(f / step)))
	}
	if len(s.AtHz) == 0 {
		for _, f := range spaced(s.FromHz, s.ToHz, s.Count) {
			add(2*int64(math.Round((f/step-1)/2)) + 1)
		}
	}
	slices.Sort(lines)
	return lines
}

// lowCrest gives the phases of equal cosines on the given lines after
// Schroeder (IEEE Trans. Inf. Theory IT-16 (1970) 85), in the form for lines
// at any distance: the group delay, which is when a frequency is loudest,
// moves through the period in step with the power summed up so far,
//
//	phi_k = phi_(k-1) - 2 pi (line_k - line_(k-1)) P_(k-1),  P_j = j / N
//
// which on consecutive lines is his phi_k = -pi k (k-1) / N (crest factor near
// 1.7). Lines far apart gain little: with even spacing in octaves the crest
// factor is about 4, as with random phases, against sqrt(2 N) with equal ones.
func lowCrest(lines []int64) []float64 {
	phi := make([]float64, len(lines))
	for k := 1; k < len(lines); k++ {
		turn := float64(lines[k]-lines[k-1]) * float64(k) / float64(len(lines))
		_, part := math.Modf(phi[k-1]/(2*math.Pi) - turn)
		phi[k] = 2 * math.Pi * part
	}
	return phi
}

// build makes one period and scales it to the stated peak. Phases are exact:
// line k has made k i mod n of n parts of a turn at frame i.
func (m *multitone) build() {
	if m.table != nil {
		return
	}
	m.table = make([]float64, m.n)
	for j, k := range m.lines {
		for i := range m.n {
			m.table[i] += math.Cos(2*math.Pi*float64(k*i%m.n)/float64(m.n) + m.phase[j])
		}
	}
	largest := 0.0
	for _, x := range m.table {
		largest = max(largest, math.Abs(x))
	}
	m.each = m.peak / largest
	for i := range m.table {
		m.table[i] *= m.each
	}
}

func (m *multitone) fill(dst []float64, n int64) {
	m.build()
	at := ((n % m.n) + m.n) % m.n
	for i := range dst {
		dst[i] = m.table[at]
		if at++; at == m.n {
			at = 0
		}
	}
}

func (m *multitone) tones(rate float64) []Tone {
	m.build()
	var out []Tone
	for j, k := range m.lines {
		out = append(out, Tone{float64(k) * rate / float64(m.n), m.each, m.phase[j]})
	}
	return out
}
