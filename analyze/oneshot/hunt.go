package oneshot

import (
	"math"
	"slices"

	"benchslip/analyze/internal/spectrum"
)

// An oscillation may last the whole take or a hundred samples, stand still or
// wander. It is hunted for in frames of several lengths, each a factor of four
// longer than the one before: a burst stands out the most in frames of its own
// length, a steady line in the longest, a wandering one in those in which it
// hardly moves.

// A Blackman-Harris window keeps what lies five bins away below -92 dB, so
// that DC, hum and the signal itself do not leak up to where oscillations are.
const lobe = 5

// look is the signal in frames of m samples.
type look struct {
	m     int
	stepK float64   // Hz a bin
	mean  []float64 // density over all frames, V^2/Hz
	floor []float64 // density without lines and bursts
	count int       // frames
}

// find is a place in time and frequency that stands out.
type find struct {
	look  *look
	k, at int     // bin; first sample of the frame, -1: the mean over all
	says  float64 // log-likelihood ratio against noise
	ratio float64 // power over floor
}

const (
	firstFrame = 64
	lastFrame  = 1 << 18
	fullest    = 64 // frames whose median over time makes the floor
)

// hunt looks through x at frequencies from above on (below 0.47 of the rate,
// where a tone and its image begin to meet). Finds come best first.
func hunt(x []float64, rate, above float64) (looks []*look, finds []find) {
	var sizes []int
	for m := firstFrame; m <= len(x) && m <= lastFrame; m *= 4 {
		sizes = append(sizes, m)
	}
	// All of a short take in one: the longest frames tell harmonics apart.
	if m := spectrum.FastLength(min(len(x), lastFrame)); len(sizes) > 0 && m > sizes[len(sizes)-1]*3/2 {
		sizes = append(sizes, m)
	}
	// Noise alone makes a cell this strong in one take of a thousand.
	least := math.Log(2 * float64(len(x)*len(sizes)) / falseAlarm)
	for _, m := range sizes {
		l := &look{m: m, stepK: rate / float64(m)}
		low := max(lobe, int(math.Ceil(above/l.stepK)))
		high := int(0.47 * float64(m))
		if low+2 >= high {
			continue
		}
		l.fill(x, rate)
		looks = append(looks, l)
		finds = append(finds, l.cells(x, rate, low, high, least)...)
		finds = append(finds, l.lasting(low, high)...)
	}
	slices.SortStableFunc(finds, func(a, b find) int {
		switch {
		case a.says > b.says:
			return -1
		case a.says < b.says:
			return 1
		}
		return 0
	})
	return looks, finds
}

// fill finds the mean density and the floor: the median over time of up to 64
// frames and then over a stretch of frequencies, which neither bursts nor
// lines move.
func (l *look) fill(x []float64, rate float64) {
	w := spectrum.BlackmanHarris(l.m)
	hop := l.m / 2
	total := (len(x)-l.m)/hop + 1
	each := max(total/fullest, 1)
	l.mean = make([]float64, l.m/2+1)
	var kept [][]float64
	spectrum.Frames(x, rate, w, hop, func(_ int, s []float64) bool {
		for k, v := range s {
			l.mean[k] += v
		}
		if l.count%each == 0 && len(kept) < fullest {
			kept = append(kept, slices.Clone(s))
		}
		l.count++
		return true
	})
	for k := range l.mean {
		l.mean[k] /= float64(l.count)
	}
	middle := slices.Clone(l.mean)
	bias := spectrum.MedianBias(float64(l.count))
	if len(kept) >= 8 {
		col := make([]float64, len(kept))
		for k := range middle {
			for i := range kept {
				col[i] = kept[i][k]
			}
			middle[k] = spectrum.Median(col) / math.Ln2
		}
		bias = 1
	}
	l.floor = make([]float64, len(middle))
	last, lastAt := 0.0, 0
	var buf []float64
	for k := lobe; ; k += max(k/10, 1) {
		k = min(k, len(middle)-1)
		v := around2(middle, k, &buf) / bias
		for i := lastAt; i <= k; i++ {
			f := 1.0
			if k > lastAt && lastAt > 0 {
				f = float64(i-lastAt) / float64(k-lastAt)
			}
			l.floor[i] = (1-f)*last + f*v
		}
		last, lastAt = v, k
		if k == len(middle)-1 {
			break
		}
	}
}

// around2 is the median of s from k/1.7 to 1.7 k.
func around2(s []float64, k int, buf *[]float64) float64 {
	a, b := max(int(float64(k)/1.7), lobe), min(int(float64(k)*1.7)+2, len(s))
	a = min(a, b-1)
	*buf = append((*buf)[:0], s[a:b]...)
	return spectrum.Median(*buf)
}

// cells lists the single frames and bins that noise does not explain. What a
// step or a click spreads over all frequencies of a frame raises the frame's
// own floor with it and does not count.
func (l *look) cells(x []float64, rate float64, low, high int, least float64) []find {
	var out []find
	var buf []float64
	above := make([]float64, len(l.floor)) // what a bin must exceed
	for k, v := range l.floor {
		above[k] = least * v
	}
	var over []int
	spectrum.Frames(x, rate, spectrum.BlackmanHarris(l.m), l.m/2, func(at int, s []float64) bool {
		over = over[:0]
		for k := low; k < high; k++ {
			if s[k] > above[k] && s[k] > s[k-1] && s[k] >= s[k+1] {
				over = append(over, k)
			}
		}
		for n := 0; n < 4 && len(over) > 0; n++ { // the strongest few of a frame
			best := 0
			for i, k := range over {
				if s[k]*l.floor[over[best]] > s[over[best]]*l.floor[k] {
					best = i
				}
			}
			k := over[best]
			ratio := math.Min(s[k]/l.floor[k], s[k]/(around2(s, k, &buf)/math.Ln2))
			if ratio > least {
				out = keep(out, find{look: l, k: k, at: at, says: ratio - 1 - math.Log(ratio), ratio: ratio})
			}
			over = slices.DeleteFunc(over, func(j int) bool { return j >= k-lobe && j <= k+lobe })
		}
		return true
	})
	return out
}

// lasting lists the bins whose mean over all frames stands out, by 6 dB and
// more than noise explains, of the floor and of the mean about it.
func (l *look) lasting(low, high int) []find {
	var out []find
	var buf []float64
	n := math.Max(0.9*float64(l.count), 1)
	least := math.Max(4, 1+7/math.Sqrt(n)+21/n)
	for k := low; k < high; k++ {
		if !(l.mean[k] > least*l.floor[k] && l.mean[k] > l.mean[k-1] && l.mean[k] >= l.mean[k+1]) {
			continue
		}
		if h := math.Min(l.mean[k]/l.floor[k], l.mean[k]/around2(l.mean, k, &buf)); h > least {
			out = keep(out, find{look: l, k: k, at: -1, says: n * (h - 1 - math.Log(h)), ratio: h})
		}
	}
	return out
}

// keep adds a find to the eight best of a look, one a place.
func keep(list []find, f find) []find {
	for i, g := range list {
		if d := f.k - g.k; d >= -lobe && d <= lobe {
			if f.says > g.says {
				list[i] = f
			}
			return list
		}
	}
	if len(list) < 8 {
		return append(list, f)
	}
	worst := 0
	for i := range list {
		if list[i].says < list[worst].says {
			worst = i
		}
	}
	if f.says > list[worst].says {
		list[worst] = f
	}
	return list
}

// ridge follows a find from frame to frame, up to three bins a frame, while it
// stands out of the floor, and returns the lowest and highest bin it visits.
func (f find) ridge(x []float64, rate float64) (lo, hi int) {
	l := f.look
	w := spectrum.BlackmanHarris(l.m)
	hop := l.m / 2
	// A lasting find starts where its bin is strongest.
	start := f.at / hop
	most := 0.0
	peaks := make([][]float32, 0, l.count)
	a, b := max(f.k/2, lobe), min(f.k*3/2+8, len(l.floor)-1)
	spectrum.Frames(x, rate, w, hop, func(at int, s []float64) bool {
		row := make([]float32, b-a)
		for k := a; k < b; k++ {
			row[k-a] = float32(s[k] / l.floor[k])
		}
		if s[f.k] > most && f.at < 0 {
			most, start = s[f.k], at/hop
		}
		peaks = append(peaks, row)
		return len(peaks)*(b-a) < 1<<25
	})
	lo, hi = f.k, f.k
	for _, step := range []int{1, -1} {
		k, misses := f.k, 0
		for j := start; j >= 0 && j < len(peaks) && misses < 3; j += step {
			best := 0
			for i := max(k-3, a); i <= min(k+3, b-1); i++ {
				if best == 0 || peaks[j][i-a] > peaks[j][best-a] {
					best = i
				}
			}
			if float64(peaks[j][best-a]) < math.Max(10, f.ratio/100) {
				misses++
				continue
			}
			misses = 0
			k = best
			lo, hi = min(lo, k), max(hi, k)
		}
	}
	return lo, hi
}
