package stage

import (
	"fmt"
	"math"
	"slices"

	"benchslip/analyze"
	"benchslip/analyze/internal/sinefit"
	"benchslip/analyze/internal/spectrum"
)

// Product is a line that a nonlinearity makes of two tones: at
// A*low + B*high, A and B whole numbers of either sign.
type Product struct{ A, B int }

// String is the product in words: "f2-2f1", f1 the lower tone.
func (q Product) String() string {
	term := func(k int, f string) string {
		if k == 1 || k == -1 {
			return f
		}
		return fmt.Sprintf("%d%s", max(k, -k), f)
	}
	first, second := term(q.B, "f2"), term(q.A, "f1")
	sign := "+"
	if q.A < 0 {
		sign = "-"
	}
	if q.B < 0 { // 2f1-f2
		first, second, sign = second, first, "-"
	}
	return first + sign + second
}

// Hz of the product for tones at low and high Hz.
func (q Product) Hz(low, high float64) float64 { return float64(q.A)*low + float64(q.B)*high }

// Pair is a signal taken apart into two test tones, their harmonics, products
// of the two, other lines and noise, fitted jointly.
type Pair struct {
	*Lines
	LowHz, HighHz float64
	MainsHz       float64 // 0: not resolvable in the span
	products      map[Product]int
}

// Low and High are the two tones.
func (p *Pair) Low() *Line  { return &p.Harm[0] }
func (p *Pair) High() *Line { return &p.Others[0] }

// Of is the line of a product; nil where it falls on another line, below 0 or
// past half the rate.
func (p *Pair) Of(q Product) *Line {
	if i, ok := p.products[q]; ok {
		return &p.Others[i]
	}
	return nil
}

// TwoTones finds the two strongest lines of a signal, lower one first. With
// atHz, those nearest to it (within 1 %) among them: one frequency for one of
// the tones, two for both.
func TwoTones(p *analyze.Pass, s *analyze.Signal, atHz []float64) (low, high spectrum.Peak, bad *analyze.Refusal) {
	v := SurveyOf(p, s)
	if bad := nothing(s, v); bad != nil {
		return low, high, bad
	}
	lo, hi := 1.8/s.DurationS(), 0.495*s.RateHz
	var got []spectrum.Peak
	for _, hz := range atHz[:min(len(atHz), 2)] {
		q, ok := v.StrongestIn(hz*0.99-v.ToleranceHz(), hz*1.01+v.ToleranceHz(), nil)
		if !ok {
			return low, high, noToneNear(s, v, hz)
		}
		got = append(got, q)
	}
	for len(got) < 2 {
		q, ok := v.StrongestIn(lo, hi, func(q spectrum.Peak) bool {
			return len(got) == 0 || math.Abs(q.Hz-got[0].Hz) > 4*v.ToleranceHz()
		})
		if !ok {
			return low, high, noTone(s, v, "two tones are needed")
		}
		got = append(got, q)
	}
	if got[0].Hz > got[1].Hz {
		got[0], got[1] = got[1], got[0]
	}
	return got[0], got[1], nil
}

// Pairs takes a signal apart into the tones near lowHz and highHz and the
// products asked, once for each set.
func Pairs(p *analyze.Pass, s *analyze.Signal, lowHz, highHz float64, ask []Product) (*Pair, *analyze.Refusal) {
	key := fmt.Sprintf("pair/%s/%.9g/%.9g/%v/%g", s.ID(), lowHz, highHz, ask, mainsNominal(p))
	type found struct {
		pair *Pair
		bad  *analyze.Refusal
	}
	f := p.Stages.Once(key, func() any {
		pair, bad := pairs(p, s, lowHz, highHz, ask)
		return found{pair, bad}
	}).(found)
	return f.pair, f.bad
}

func pairs(p *analyze.Pass, s *analyze.Signal, lowHz, highHz float64, ask []Product) (*Pair, *analyze.Refusal) {
	v := SurveyOf(p, s)
	rate, tol := s.RateHz, v.ToleranceHz()
	ours := func(hz float64) bool { // tones, harmonics and products
		if isHarmonic(hz, lowHz, 2*tol) || isHarmonic(hz, highHz, 2*tol) {
			return true
		}
		return slices.ContainsFunc(ask, func(q Product) bool { return math.Abs(q.Hz(lowHz, highHz)-hz) < 2*tol+1e-4*hz })
	}
	mains := findComb(v, mainsNominal(p), s.DurationS(), ours)
	combs := []sinefit.Comb{{Nu: lowHz / rate, Orders: []float64{1}, Free: true}, {Nu: highHz / rate, Orders: []float64{1}, Free: true}}
	all := []float64{lowHz, highHz}
	for _, q := range ask {
		if hz := q.Hz(lowHz, highHz); hz > 0 && hz < rate/2 {
			all = append(all, hz)
		}
	}
	// Strong lines beside the two count as lines of their own here: products
	// and harmonics too, which the fit below ties to the tones.
	for _, q := range v.Peaks {
		if len(combs) == maxOthers {
			break
		}
		if math.Abs(q.Hz-lowHz) > 2*tol && math.Abs(q.Hz-highHz) > 2*tol && q.Hz > 2/s.DurationS() && q.Hz < 0.495*rate {
			combs = append(combs, sinefit.Comb{Nu: q.Hz / rate, Orders: []float64{1}, Free: true})
			all = append(all, q.Hz)
		}
	}
	l := &Lines{Sig: s, Cond: 1, MainsFound: len(mains.Orders) > 0, Blocks: blocksFor(s.Len(), rate, lowHz, all)}
	tracks := l.trackEach(combs)
	if tracks[0] == nil || tracks[1] == nil {
		return nil, &analyze.Refusal{Code: analyze.NoTone,
			Text:   fmt.Sprintf("take %q: the lines near %.6g Hz and %.6g Hz are no steady tones", s.Take.Name, lowHz, highHz),
			Advice: "record two steady tones"}
	}
	pair := &Pair{Lines: l, LowHz: tracks[0].Nu * rate, HighHz: tracks[1].Nu * rate, MainsHz: mains.Hz, products: map[Product]int{}}
	clear := 0.7 * rate / float64(l.Blocks[0].To-l.Blocks[0].From)
	var used []float64
	free := func(hz float64) bool {
		if hz < clear || hz > rate/2-clear/2 || slices.ContainsFunc(used, func(u float64) bool { return math.Abs(u-hz) < clear }) {
			return false
		}
		used = append(used, hz)
		return true
	}
	free(pair.LowHz)
	free(pair.HighHz)
	l.Harm = []Line{{Order: 1, Hz: pair.LowHz, track: tracks[0]}}
	l.Others = []Line{{Order: 1, Hz: pair.HighHz, track: tracks[1]}}
	for _, q := range ask {
		if hz := q.Hz(pair.LowHz, pair.HighHz); free(hz) {
			pair.products[q] = len(l.Others)
			l.Others = append(l.Others, Line{Order: 1, Hz: hz, track: sinefit.Sum(float64(q.A), tracks[0], float64(q.B), tracks[1])})
		}
	}
	for h := 2; h <= 10; h++ {
		if hz := float64(h) * pair.LowHz; free(hz) {
			l.Harm = append(l.Harm, Line{Order: h, Hz: hz, track: tracks[0]})
		}
		if hz := float64(h) * pair.HighHz; h <= 3 && free(hz) {
			l.Others = append(l.Others, Line{Order: h, Hz: hz, track: tracks[1]})
		}
	}
	for _, t := range tracks[2:] {
		if t != nil && free(t.Nu*rate) {
			l.Others = append(l.Others, Line{Order: 1, Hz: t.Nu * rate, track: t})
		}
	}
	l.fitBlocks()
	l.measure(v)
	return pair, nil
}

// trackEach follows each comb (of one line) from block to block; nil for one
// that does not come to rest.
func (l *Lines) trackEach(combs []sinefit.Comb) []*sinefit.Track {
	sets := make([][]sinefit.Estimate, len(combs))
	lost := make([]bool, len(combs))
	var buf []float64
	for _, b := range l.Blocks {
		n := b.To - b.From
		if cap(buf) < n {
			buf = make([]float64, n)
		}
		y := buf[:l.Sig.Read(buf[:n], b.From)]
		r, err := sinefit.Refine(y, combs, 0.6/float64(n))
		if err != nil {
			return make([]*sinefit.Track, len(combs))
		}
		sigma2 := r.SSR / math.Max(float64(n-3*len(combs)-1), 1)
		for g := range combs {
			lost[g] = lost[g] || !r.Settled[g]
			sets[g] = append(sets[g], sinefit.Estimate{At: b.Middle(), N: n, Nu: r.Nu[g], Z: r.Z[g], Sigma2: sigma2})
		}
	}
	tracks := make([]*sinefit.Track, len(combs))
	for g := range combs {
		if !lost[g] {
			tracks[g] = sinefit.Join(l.Sig.Len(), sets[g])
		}
	}
	return tracks
}
