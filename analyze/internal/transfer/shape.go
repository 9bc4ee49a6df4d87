package transfer

import (
	"math"
	"sort"

	"benchslip/analyze"
	"benchslip/analyze/internal/spectrum"
)

// Shape is the structure of a stimulus.
type Shape struct {
	Kind     string
	From, To int       // samples in which it sounds
	Full     [2]int    // of a sweep: where it is half as large as near its ends, or more
	Steps    []Step    // of stepped tones, in order of time
	Law      Law       // of a sweep
	Lines    []float64 // Hz, of a multitone
	Pulses   int
}

// Step is one tone among silences: its stretch in samples, fades included.
type Step struct {
	From, To int
	Hz       float64 // to a few percent
}

// blockS is the length of the blocks whose largest sample makes the
// envelope, s. A block and its two neighbours hold a good part of a half
// period of 5 Hz, so that zero crossings are no silence.
const blockS = 0.005

// envelope is the largest distance from the mean in each block.
type envelope struct {
	block int // samples
	peak  []float64
	mean  float64
	top   float64
}

func envelopeOf(s *analyze.Signal) envelope {
	e := envelope{block: max(8, int(blockS*s.RateHz+0.5))}
	n := s.Len()
	lo := make([]float64, 0, n/e.block+1)
	hi := make([]float64, 0, n/e.block+1)
	buf := make([]float64, 64*e.block)
	sum := 0.0
	for at := 0; at < n; {
		k := s.Read(buf, at)
		if k == 0 {
			break
		}
		for from := 0; from < k; from += e.block {
			part := buf[from:min(from+e.block, k)]
			a, b, t := part[0], part[0], 0.0
			for _, v := range part {
				a, b = math.Min(a, v), math.Max(b, v)
				t += v
			}
			sum += t
			lo, hi = append(lo, a), append(hi, b)
		}
		at += k
	}
	e.mean = sum / math.Max(float64(n), 1)
	e.peak = make([]float64, len(lo))
	for i := range e.peak {
		e.peak[i] = math.Max(hi[i]-e.mean, e.mean-lo[i])
		e.top = math.Max(e.top, e.peak[i])
	}
	return e
}

// near is the envelope over a block and its neighbours.
func (e *envelope) near(i int) float64 {
	v := e.peak[i]
	if i > 0 {
		v = math.Max(v, e.peak[i-1])
	}
	if i+1 < len(e.peak) {
		v = math.Max(v, e.peak[i+1])
	}
	return v
}

// sounding lists the stretches [from, to), in samples, in which the signal
// stands out of the quiet parts: above the geometric mean of floor and peak,
// kept between 2 % and 10 % of the peak, so that hum and noise in the pauses
// do not join steps. threshold is that level.
func (e *envelope) sounding(n int) (runs [][2]int, threshold float64) {
	if e.top <= 1e-9*math.Abs(e.mean) { // constant, up to rounding
		return nil, 0
	}
	sorted := append([]float64(nil), e.peak...)
	sort.Float64s(sorted)
	floor := sorted[len(sorted)/20]
	threshold = math.Max(0.02*e.top, math.Min(0.1*e.top, math.Sqrt(floor*e.top)))
	for i := 0; i < len(e.peak); i++ {
		if e.near(i) < threshold {
			continue
		}
		j := i
		for j < len(e.peak) && e.near(j) >= threshold {
			j++
		}
		// A neighbour made the outermost blocks count.
		from, to := i, j
		if e.peak[from] < threshold && from+1 < to {
			from++
		}
		if e.peak[to-1] < threshold && to-1 > from {
			to--
		}
		runs = append(runs, [2]int{from * e.block, min(to*e.block, n)})
		i = j
	}
	return runs, threshold
}

// full is the part of a run between the first and last block that is half as
// large as the largest near that end (a sweep's level may differ at its ends).
func (e *envelope) full(r [2]int) [2]int {
	a, b := r[0]/e.block, min(r[1]/e.block, len(e.peak))
	w := max(1, (b-a)/20)
	head, tail := 0.0, 0.0
	for i := a; i < min(a+w, b); i++ {
		head = math.Max(head, e.peak[i])
	}
	for i := b - 1; i >= max(b-w, a); i-- {
		tail = math.Max(tail, e.peak[i])
	}
	for a < b-1 && e.near(a) < head/2 {
		a++
	}
	for b-1 > a && e.near(b-1) < tail/2 {
		b--
	}
	return [2]int{a * e.block, min(b*e.block, r[1])}
}

// shortest is the least length of a step and the largest of a pulse, s.
const shortest = 0.025

// ShapeOf recognises a stimulus by its structure, "" when nothing fits.
func ShapeOf(p *analyze.Pass, s *analyze.Signal) *Shape {
	return p.Stages.Once("shape/"+s.ID(), func() any { return shapeOf(s) }).(*Shape)
}

func shapeOf(s *analyze.Signal) *Shape {
	sh := &Shape{}
	n := s.Len()
	e := envelopeOf(s)
	runs, _ := e.sounding(n)
	if len(runs) == 0 {
		return sh
	}
	sh.From, sh.To = runs[0][0], runs[len(runs)-1][1]
	long, longest, active := 0, 0, 0
	for i, r := range runs {
		if float64(r[1]-r[0]) >= shortest*s.RateHz {
			long++
		}
		if r[1]-r[0] > runs[longest][1]-runs[longest][0] {
			longest = i
		}
		active += r[1] - r[0]
	}
	if long == 0 && float64(active) < 0.5*float64(n) {
		sh.Kind, sh.Pulses = Pulse, len(runs)
		return sh
	}
	// One tone after the other?
	tonal := 0
	for _, r := range runs {
		if float64(r[1]-r[0]) < shortest*s.RateHz {
			continue
		}
		if hz, ok := steady(s, r[0], r[1], e.mean); ok {
			tonal += r[1] - r[0]
			sh.Steps = append(sh.Steps, Step{r[0], r[1], hz})
		}
	}
	if float64(tonal) > 0.7*float64(active) {
		sh.Kind = Tone
		for _, q := range sh.Steps {
			if math.Abs(q.Hz/sh.Steps[0].Hz-1) > 0.03 {
				sh.Kind = Steps
			}
		}
		return sh
	}
	sh.Steps = nil
	r := runs[longest]
	if law, ok := lawOf(s, &e, r[0], r[1]); ok {
		sh.Kind, sh.Law, sh.From, sh.To = Sweep, law, r[0], r[1]
		sh.Full = e.full(r)
		return sh
	}
	if lines, share := linesOf(s, r[0], r[1], e.mean); share > 0.8 && len(lines) >= 2 {
		sh.Kind, sh.Lines, sh.From, sh.To = Multitone, lines, r[0], r[1]
		return sh
	}
	sh.Kind = Noise
	return sh
}

// tonalShare of the power in one line makes a tone; the low tone of a 4:1
// pair holds 94 %.
const tonalShare = 0.96

// steady finds the one tone that holds nearly all of the power of a stretch
// at its start, middle and end alike.
func steady(s *analyze.Signal, from, to int, mean float64) (hz float64, ok bool) {
	n := to - from
	mid, ok := pitch(s, from+n/5, to-n/10, mean)
	if !ok {
		return 0, false
	}
	if float64(n)/s.RateHz*mid < 8 {
		return mid, true
	}
	a, okA := pitch(s, from+n/10, from+n*2/5, mean)
	b, okB := pitch(s, from+n*6/10, to-n/10, mean)
	return mid, okA && okB && math.Abs(a/b-1) < 0.05
}

// pitch is the frequency of the strongest line in the first part of a
// stretch; ok: it is a tone. Low tones are looked at through averages of
// samples.
func pitch(s *analyze.Signal, from, to int, mean float64) (hz float64, ok bool) {
	const size = 4096
	for by := 1; ; by *= 8 {
		n := min(size, (to-from)/by)
		if n < 32 {
			return 0, false
		}
		last := n < size || by > 64
		n = spectrum.FastLength(n)
		x := make([]float64, n*by)
		x = x[:s.Read(x, from)]
		n = min(n, len(x)/by)
		if n < 32 || n%2 != 0 {
			return 0, false
		}
		y := x[:n]
		all, kept := 0.0, 0.0 // power before and after averaging
		for i := range y {
			sum := 0.0
			for _, v := range x[i*by : i*by+by] {
				sum += v
				all += (v - mean) * (v - mean)
			}
			y[i] = sum/float64(by) - mean
			kept += y[i] * y[i] * float64(by)
		}
		rate := s.RateHz / float64(by)
		d := spectrum.Welch(slice(y), n, rate, spectrum.BlackmanHarris(n), n, n)
		best := 1
		total := 0.0
		for k := 1; k < len(d.S); k++ {
			total += d.S[k]
			if d.S[k] > d.S[best] {
				best = k
			}
		}
		if best < 24 && !last {
			continue
		}
		line, at := 0.0, 0.0
		for k := max(best-4, 0); k <= min(best+4, len(d.S)-1); k++ {
			line += d.S[k]
			at += d.S[k] * float64(k)
		}
		return at / line * d.StepHz, line*kept > tonalShare*(total+d.S[0])*all
	}
}

// slice is samples as a source.
func slice(x []float64) spectrum.Source {
	return func(dst []float64, at int) int { return copy(dst, x[min(at, len(x)):]) }
}

// linesOf lists the lines of a stretch within 40 dB of its strongest and the
// share of its power that they hold.
func linesOf(s *analyze.Signal, from, to int, mean float64) (hz []float64, share float64) {
	n := to - from
	m := spectrum.FastLength(min(n, int(10*s.RateHz)))
	if m < 64 {
		return nil, 0
	}
	src := func(dst []float64, at int) int {
		k := s.Read(dst[:min(len(dst), n-at)], from+at)
		for i := range dst[:k] {
			dst[i] -= mean
		}
		return k
	}
	d := spectrum.Welch(src, n, s.RateHz, spectrum.BlackmanHarris(m), m, max(m/2, 1))
	floor := d.Floor(max(int(25/d.StepHz), int(3*d.Lobe)))
	peaks := d.Peaks(floor, 1+30/math.Sqrt(math.Max(d.Averages, 1)))
	total, sum := d.Integrate(0, s.RateHz/2, nil), 0.0
	for _, q := range peaks {
		if q.Power < 1e-4*peaks[0].Power {
			break
		}
		sum += q.Power
		hz = append(hz, q.Hz)
	}
	sort.Float64s(hz)
	if total == 0 {
		return nil, 0
	}
	return hz, sum / total
}
