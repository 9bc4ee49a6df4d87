package events

import (
	"math"
	"slices"

	"gonum.org/v1/gonum/mathext"

	"benchslip/analyze"
	"benchslip/analyze/internal/spectrum"
)

const (
	coreSeconds  = 32.0 // of a stretch that answers for its own events
	aroundSecond = 4.0  // read beside it on both sides
	mostCore     = 1 << 22
	columns      = 800 // of the figure
)

// scan goes through one signal.
type scan struct {
	s        *analyze.Signal
	rate     float64
	toneHz   float64
	supplies []float64
	silent   bool

	sample, fine, coarse thresholds // of the prediction error

	lo, hi []float64 // of the figure's columns

	clickV, stepLn, humV float64 // what would be seen: the largest over all stretches
}

// thresholds of the mean of n squared errors over their expectation.
type thresholds struct {
	n            int
	above, below float64
}

// thresholdsFor n samples, such that white Gaussian noise goes beyond either of
// them falseHour times an hour: chi-square law with n degrees of freedom. The
// floor itself is known to a few per cent, which the last factor allows for.
func thresholdsFor(n int, rate float64) thresholds {
	p := falseHour / 2 / (3600 * rate / float64(n))
	half := float64(n) / 2
	t := thresholds{n: n, above: mathext.GammaIncRegCompInv(half, p) / half * 1.05}
	if n > 8 {
		t.below = mathext.GammaIncRegInv(half, p) / half / 1.05
	}
	return t
}

func newScan(p *analyze.Pass, s *analyze.Signal) *scan {
	sc := &scan{s: s, rate: s.RateHz, toneHz: steadyTone(p, s), supplies: supplies(p), silent: true}
	sc.sample = thresholdsFor(1, s.RateHz)
	sc.fine = thresholdsFor(max(int(s.RateHz/1000), 16), s.RateHz)
	sc.coarse = thresholdsFor(10*sc.fine.n, s.RateHz)
	n := min(columns, s.Len())
	sc.lo, sc.hi = make([]float64, n), make([]float64, n)
	for i := range n {
		sc.lo[i], sc.hi[i] = math.Inf(1), math.Inf(-1)
	}
	return sc
}

// all goes through the signal stretch by stretch.
func (sc *scan) all() []event {
	core := int(math.Min(coreSeconds*sc.rate, mostCore))
	core = max(core, int(8*sc.rate))
	side := int(aroundSecond * sc.rate)
	n := sc.s.Len()
	var out []event
	buf := make([]float64, min(n, core+2*side))
	have, got := 0, 0 // buf[:got] holds the samples from have on
	for a := 0; a < n; a += core {
		b := min(a+core, n)
		if n-b < core/4 { // a short rest belongs to the last stretch
			b = n
		}
		from, to := max(a-side, 0), min(b+side, n)
		// What the stretch before has read already stays.
		kept := 0
		if from < have+got && from >= have {
			kept = copy(buf, buf[from-have:got])
		}
		if to-from > len(buf) {
			buf = append(buf[:kept], make([]float64, to-from-kept)...)
		}
		got = kept + sc.s.Read(buf[kept:to-from], from+kept)
		have = from
		if got < to-from {
			return out // an error, kept by the signal
		}
		sc.draw(buf[a-from:b-from], a)
		out = append(out, sc.stretch(buf[:got], from, a-from, b-from)...)
		if b == n {
			break
		}
	}
	return out
}

// draw takes samples into the figure's columns.
func (sc *scan) draw(x []float64, at int) {
	n, c := sc.s.Len(), len(sc.lo)
	for i := 0; i < len(x); {
		k := int(int64(at+i) * int64(c) / int64(n))
		end := min(len(x), int((int64(k+1)*int64(n)+int64(c)-1)/int64(c))-at)
		end = max(end, i+1)
		lo, hi := sc.lo[k], sc.hi[k]
		for _, v := range x[i:end] {
			if v < lo {
				lo = v
			}
			if v > hi {
				hi = v
			}
		}
		sc.lo[k], sc.hi[k] = lo, hi
		if hi > lo {
			sc.silent = false
		}
		i = end
	}
}

// stretch finds the events of which the time lies within samples [a, b) of x
// (and a little beyond, so that none falls between two stretches); x starts at
// sample from of the signal.
func (sc *scan) stretch(x []float64, from, a, b int) []event {
	st := newStretch(sc, x)
	if st == nil {
		return nil
	}
	var out []event
	edge := int(together * sc.rate)
	for _, c := range st.clusters() {
		e, at := st.classify(c)
		if at < a-edge || at >= b+edge {
			continue
		}
		e.at = sc.s.StartS + float64(from+at)/sc.rate
		out = append(out, e)
	}
	return out
}

// humTogether, s: where the supply is not stated, one change of hum shows in
// the readings at 50 and at 60 Hz, which are placed this far apart.
const humTogether = 0.1

// settle puts events in order and makes one of those nearer than 20 ms; a
// change of the noise that is taken back within half a minute is a burst.
func settle(list []event) []event {
	slices.SortStableFunc(list, func(a, b event) int {
		switch {
		case a.at < b.at:
			return -1
		case a.at > b.at:
			return 1
		}
		return 0
	})
	var out []event
	for _, e := range list {
		if n := len(out); n > 0 && (e.at-out[n-1].at < together || e.kind == "hum" && out[n-1].kind == "hum" && e.at-out[n-1].at < humTogether) {
			last := &out[n-1]
			at := last.at
			if e.rank < last.rank {
				*last = e
				last.at = at
			}
			continue
		}
		out = append(out, e)
	}
	var paired []event
	for i := 0; i < len(out); i++ {
		e := out[i]
		if e.noise && e.dB > 0 {
			for k := i + 1; k < len(out) && out[k].at-e.at < 30; k++ {
				if out[k].noise && out[k].dB < 0 && math.Abs(out[k].dB+e.dB) < math.Max(1, 0.2*e.dB) {
					e.kind, e.lasts, e.dB, e.noise = "burst", out[k].at-e.at, 0, false
					out = slices.Delete(out, k, k+1)
					break
				}
			}
		}
		paired = append(paired, e)
	}
	return paired
}

// median of x, which stays as it is; 0 for none.
func median(x []float64) float64 {
	if len(x) == 0 {
		return 0
	}
	return spectrum.Median(slices.Clone(x))
}

func quantile(x []float64, q float64) float64 {
	if len(x) == 0 {
		return 0
	}
	s := slices.Clone(x)
	slices.Sort(s)
	return s[min(int(q*float64(len(s))), len(s)-1)]
}
