package events

import (
	"math"
	"slices"
)

// what a sign of an event is.
type what int

const (
	spike     what = iota // one prediction error beyond the noise
	loud                  // 1 ms or 10 ms of errors beyond the noise
	faint                 // 1 ms or 10 ms of errors below it
	gone                  // the tone falls to less than half and comes back
	slip                  // the phase of the tone jumps
	toneStep              // the tone's level changes and stays so
	humStep               // mains lines change and stay so
	dcStep                // the mean changes and stays so
	noiseStep             // the noise changes and stays so
)

// sign of an event, samples [at, to) of a stretch.
type sign struct {
	what   what
	at, to int
	size   float64 // errors: size; changes: after less before
	ln     float64 // levels: logarithm of after over before
}

// stretch is a part of the signal with what was found out about it.
type stretch struct {
	sc    *scan
	x     []float64
	mean  float64
	e     []float64 // prediction error
	fine  []float64 // its mean square in pieces of sc.fine.n samples
	floor []float64 // its usual mean square, for every tenth of a second: the larger and
	low   []float64 // the smaller of what it is before and after
	grid  int       // samples of a tenth of a second
	least float64   // below which errors are those of rounding
	signs []sign
}

func newStretch(sc *scan, x []float64) *stretch {
	st := &stretch{sc: sc, x: x}
	least, most := x[0], x[0]
	for _, v := range x {
		st.mean += v
		least, most = math.Min(least, v), math.Max(most, v)
	}
	st.mean /= float64(len(x))
	if least == most {
		return nil
	}
	centred := make([]float64, len(x))
	for i, v := range x {
		centred[i] = v - st.mean
	}
	p, ok := train(centred)
	if !ok {
		return nil
	}
	st.e = make([]float64, len(x))
	p.errors(st.e, centred)
	st.powers(most - least)
	st.sudden()
	st.changes(centred)
	st.outages()
	slices.SortStableFunc(st.signs, func(a, b sign) int { return a.at - b.at })
	return st
}

// powers finds the mean squares of the error and its floors, from the medians
// over the second before and the second after: the larger one is what loud
// moments must exceed, the smaller one what faint ones must fall below, so that
// a lasting change is no event of every moment beside it. Converter steps and
// the rounding of floats bound both from below.
func (st *stretch) powers(swing float64) {
	n := st.sc.fine.n
	st.fine = make([]float64, len(st.e)/n)
	for k := range st.fine {
		sum := 0.0
		for _, v := range st.e[k*n : (k+1)*n] {
			sum += v * v
		}
		st.fine[k] = sum / float64(n)
	}
	st.grid = 100 * n
	pieces := make([]float64, len(st.fine)/10)
	for k := range pieces {
		for _, v := range st.fine[10*k : 10*k+10] {
			pieces[k] += v / 10
		}
	}
	least := math.Max(0.3*st.sc.s.Step, 1e-7*swing)
	st.least = least
	const second = 100 // pieces of 10 ms
	var meds []float64 // over a second from every tenth on
	for k := 0; k < len(pieces); k += 10 {
		meds = append(meds, median(pieces[k:min(k+second, len(pieces))]))
	}
	at := func(k int) float64 { return meds[max(min(k, len(meds)-1), 0)] }
	for k := range len(st.e)/st.grid + 1 {
		before, after := at(k-10), at(min(k, max(len(meds)-10, 0)))
		st.floor = append(st.floor, math.Max(math.Max(before, after), least*least))
		st.low = append(st.low, math.Min(before, after))
	}
	st.sc.clickV = math.Max(st.sc.clickV, math.Sqrt(st.sc.sample.above*median(st.floor)))
}

func (st *stretch) floorAt(i int) float64 { return st.floor[min(i/st.grid, len(st.floor)-1)] }

// sudden looks for single errors, and means over 1 ms and 10 ms, beyond what
// noise does.
func (st *stretch) sudden() {
	sc := st.sc
	for k := 0; k*st.grid < len(st.e); k++ {
		f := st.floor[min(k, len(st.floor)-1)]
		limit := math.Sqrt(f * sc.sample.above)
		for i := k * st.grid; i < min((k+1)*st.grid, len(st.e)); i++ {
			if v := st.e[i]; v > limit || v < -limit {
				st.signs = append(st.signs, sign{what: spike, at: i, to: i + 1, size: math.Abs(v)})
			}
		}
	}
	first := order/sc.fine.n + 1 // the predictor has nothing to go by before
	for k := first; k < len(st.fine); k++ {
		st.mark(st.fine[k], sc.fine, k*sc.fine.n)
	}
	for k := first; k+10 <= len(st.fine); k += 5 {
		mean := 0.0
		for _, v := range st.fine[k : k+10] {
			mean += v / 10
		}
		st.mark(mean, sc.coarse, k*sc.fine.n)
	}
}

func (st *stretch) mark(power float64, t thresholds, at int) {
	low := st.low[min(at/st.grid, len(st.low)-1)]
	switch high := st.floorAt(at); {
	case power > t.above*high:
		st.signs = append(st.signs, sign{what: loud, at: at, to: at + t.n, size: power / high})
	case power < t.below*low && low > 4*st.least*st.least: // else rounding comes and goes
		st.signs = append(st.signs, sign{what: faint, at: at, to: at + t.n, size: power / low})
	}
}

// outages drops signs of lasting changes beside moments in which the signal is
// missing: they are the ends of those, seen through windows of half a second.
func (st *stretch) outages() {
	beside := int(0.6 * st.sc.rate)
	var holes []sign
	for _, s := range st.signs {
		if s.what == gone && st.weaker(s) || s.what == faint {
			holes = append(holes, s)
		}
	}
	st.signs = slices.DeleteFunc(st.signs, func(s sign) bool {
		if s.what < slip {
			return false
		}
		for _, h := range holes {
			if s.at > h.at-beside && s.at < h.to+beside {
				return true
			}
		}
		return false
	})
}
