package stimulus

import "math"

// signal makes the samples of one stretch at its full level. Frame 0 is the
// first at full level; fades ask for frames before it and after the end.
type signal interface {
	// fill writes the samples of frames n, n+1, ... to dst, in FS. A stretch
	// is filled once, in order, in blocks of any size.
	fill(dst []float64, n int64)
}

// turns is the fraction of a turn, 0 .. 1, that a frequency has made at frame
// n: the remainder of hz n / rate, to the last bit of a float64. The plain
// product would lose one bit of phase for every doubling of the time.
func turns(hz, rate float64, n int64) float64 {
	k := float64(n)
	hi := hz * k
	lo := math.FMA(hz, k, -hi) // hz n = hi + lo exactly
	q := math.Floor(hi / rate)
	return (math.FMA(-q, rate, hi) + lo) / rate // hi - q rate is exact
}

// sine is peak sin(2 pi hz t), growing by exp(grow t) from t = 0 until t =
// until where grow is not 0.
type sine struct {
	hz, rate, peak float64
	grow, until    float64
}

func (s *sine) fill(dst []float64, n int64) {
	for i := range dst {
		k := n + int64(i)
		a := s.peak
		if s.grow != 0 {
			t := min(max(float64(k)/s.rate, 0), s.until)
			a *= math.Exp(s.grow * t)
		}
		dst[i] = a * math.Sin(2*math.Pi*turns(s.hz, s.rate, k))
	}
}

// pair is the sum of two sines.
type pair struct{ low, high sine }

func (p *pair) fill(dst []float64, n int64) {
	p.low.fill(dst, n)
	for i := range dst {
		dst[i] += p.high.peak * math.Sin(2*math.Pi*turns(p.high.hz, p.high.rate, n+int64(i)))
	}
}

// sweep is the exponential sweep; see Sweep for its law.
type sweep struct {
	Sweep
	rate float64
}

func (w *sweep) fill(dst []float64, n int64) {
	for i := range dst {
		t := float64(n+int64(i)) / w.rate
		_, part := math.Modf(w.F1 * w.L * math.Exp(t/w.L))
		dst[i] = w.Peak * math.Sin(2*math.Pi*part)
	}
}

// pulse is a raised cosine of width frames and height peak, then one turned
// over of four times the width and a quarter of the height: the sum is 0, so
// a coupling capacitor does not shift it, and its sign is plain to see.
type pulse struct{ width, peak float64 }

func (p *pulse) fill(dst []float64, n int64) {
	for i := range dst {
		k := float64(n + int64(i))
		switch {
		case k < 0 || k >= 5*p.width:
			dst[i] = 0
		case k < p.width:
			dst[i] = p.peak * raised(k/p.width)
		default:
			dst[i] = -p.peak / 4 * raised((k-p.width)/(4*p.width))
		}
	}
}

// raised is one period of a raised cosine: 0 at x = 0 and 1, 1 at x = 1/2.
func raised(x float64) float64 { return (1 - math.Cos(2*math.Pi*x)) / 2 }
