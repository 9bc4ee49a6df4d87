package stage

import (
	"fmt"
	"math"
	"slices"
	"sort"

	"benchslip/analyze"
	"benchslip/analyze/internal/sinefit"
	"benchslip/analyze/internal/spectrum"
)

// topHarmonic is the highest harmonic of the tone that is followed with it.
const topHarmonic = 20

// maxOthers is how many lines beside tone and mains are followed.
const maxOthers = 24

// Block is samples [From, To) of a signal.
type Block struct{ From, To int }

// Middle of a block, in samples from the signal's start.
func (b Block) Middle() float64 { return float64(b.From+b.To-1) / 2 }

// followed is what the strong lines of a signal do from block to block.
type followed struct {
	Blocks  []Block
	Tone    []sinefit.Estimate // nil without a tone peak
	Orders  int                // highest order of the tone seen in the survey
	MainsHz float64            // coarse; 0: not resolvable
	Comb    comb
	Mains   *sinefit.Track   // nil when no order stands out or none is resolvable
	Others  []*sinefit.Track // other strong lines, strongest first
	Cond    float64
	Settled bool
}

// follow refines the frequencies of all strong lines jointly in each block.
// toneHz is the coarse frequency of the test tone, 0 for none; weak says that
// the tone is too weak here to be followed.
func follow(p *analyze.Pass, s *analyze.Signal, toneHz float64, weak bool) *followed {
	key := fmt.Sprintf("follow/%s/%.9g/%v/%g", s.ID(), toneHz, weak, mainsNominal(p))
	return p.Stages.Once(key, func() any { return newFollowed(p, s, toneHz, weak) }).(*followed)
}

func newFollowed(p *analyze.Pass, s *analyze.Signal, toneHz float64, weak bool) *followed {
	v := SurveyOf(p, s)
	rate := s.RateHz
	f := &followed{}
	harmonic := func(hz float64) bool { return isHarmonic(hz, toneHz, v.ToleranceHz()) }
	f.Comb = findComb(v, mainsNominal(p), s.DurationS(), harmonic)
	f.MainsHz = f.Comb.Hz
	var combs []sinefit.Comb
	var all []float64 // Hz of every strong line
	toneAt, mainsAt := -1, -1
	if toneHz > 0 && !weak {
		c := sinefit.Comb{Nu: toneHz / rate, Orders: []float64{1}, Free: true}
		few := toneHz*s.DurationS() < 10
		for h := 2; h <= topHarmonic && float64(h)*toneHz < 0.49*rate; h++ {
			hz := float64(h) * toneHz
			_, seen := v.StrongestIn(hz-v.ToleranceHz()*2, hz+v.ToleranceHz()*2, nil)
			if seen || (few && h <= 10) {
				c.Orders = append(c.Orders, float64(h))
				all = append(all, hz)
				f.Orders = h
			}
		}
		toneAt = len(combs)
		combs = append(combs, c)
		all = append(all, toneHz)
	}
	if orders := append(slices.Clone(f.Comb.Orders), f.Comb.Faint...); len(orders) > 0 {
		c := sinefit.Comb{Nu: f.MainsHz / rate, Free: true}
		slices.Sort(orders)
		for _, o := range orders {
			c.Orders = append(c.Orders, float64(o))
			all = append(all, float64(o)*f.MainsHz)
		}
		mainsAt = len(combs)
		combs = append(combs, c)
	}
	firstOther := len(combs)
	for _, q := range v.Peaks {
		if len(combs)-firstOther >= maxOthers {
			break
		}
		if q.Hz < 2/s.DurationS() || q.Hz > 0.495*rate || taken(q, toneHz, f, v) {
			continue
		}
		combs = append(combs, sinefit.Comb{Nu: q.Hz / rate, Orders: []float64{1}, Free: true})
		all = append(all, q.Hz)
	}
	f.Blocks = blocksFor(s.Len(), rate, toneHz, all)
	f.Settled, f.Cond = true, 1
	if len(combs) == 0 {
		return f
	}
	start := append([]sinefit.Comb(nil), combs...)
	estimates := make([][]sinefit.Estimate, len(combs))
	var mains *walk
	if mainsAt >= 0 {
		mains = newWalk(combs[mainsAt].Orders, f.MainsHz, v)
	}
	var buf []float64
	for _, b := range f.Blocks {
		n := b.To - b.From
		if cap(buf) < n {
			buf = make([]float64, n)
		}
		y := buf[:s.Read(buf[:n], b.From)]
		expected := 0.0
		if mainsAt >= 0 {
			expected = start[mainsAt].Nu
		}
		// Start where the block before ended, unless that led astray.
		r, err := sinefit.Refine(y, start, 0.6/float64(n))
		if err == nil && toneAt >= 0 && !r.Settled[toneAt] {
			r, err = sinefit.Refine(y, combs, 0.6/float64(n))
		}
		if err != nil {
			f.Settled = false
			break
		}
		for g := range start {
			if r.Settled[g] && math.Abs(r.Nu[g]-combs[g].Nu)*float64(n) < 2 {
				start[g].Nu = r.Nu[g]
			}
		}
		f.Settled = f.Settled && (toneAt < 0 || r.Settled[toneAt])
		f.Cond = math.Max(f.Cond, r.Cond)
		free := float64(n - 2*len(r.Z) - 1 - len(combs))
		sigma2 := r.SSR / math.Max(free, 1)
		first := 0
		for g, c := range combs {
			if g == mainsAt {
				if !mains.add(b, r.Nu[g], expected, r.Z[first:first+len(c.Orders)]) {
					start[g].Nu = expected
				}
			} else {
				estimates[g] = append(estimates[g], sinefit.Estimate{At: b.Middle(), N: n, Nu: r.Nu[g], Z: r.Z[first], Sigma2: sigma2})
			}
			first += len(c.Orders)
		}
	}
	if toneAt >= 0 {
		f.Tone = estimates[toneAt]
	}
	if mains != nil && len(mains.nu) > 0 {
		f.Mains = mains.track(s.Len())
	}
	for g := firstOther; g < len(combs); g++ {
		if len(estimates[g]) > 0 {
			f.Others = append(f.Others, sinefit.Join(s.Len(), estimates[g]))
		}
	}
	return f
}

// taken: the peak belongs to the tone, its harmonics or the mains comb.
func taken(q spectrum.Peak, toneHz float64, f *followed, v *Survey) bool {
	if isHarmonic(q.Hz, toneHz, 2*v.ToleranceHz()) {
		return true
	}
	if len(f.Comb.Orders) == 0 {
		return false
	}
	d, _ := NearMains(q.Hz, f.MainsHz, MaxOrder)
	return d < v.ToleranceHz()+0.0004*q.Hz
}

func isHarmonic(hz, toneHz, tol float64) bool {
	if toneHz <= 0 {
		return false
	}
	h := math.Round(hz / toneHz)
	return h >= 1 && h <= topHarmonic && math.Abs(hz-h*toneHz) < tol+1e-4*hz
}

// blocksFor divides n samples into equal blocks of at least 1 s, ten periods
// of the tone and three beats of the closest pair of strong lines, or takes
// them whole when they hold less than two.
func blocksFor(n int, rate, toneHz float64, lines []float64) []Block {
	seconds := 1.0
	if toneHz > 0 {
		seconds = math.Max(seconds, 10/toneHz)
	}
	sort.Float64s(lines)
	for i := 1; i < len(lines); i++ {
		if gap := lines[i] - lines[i-1]; gap > 0 {
			seconds = math.Max(seconds, math.Min(3/gap, float64(n)/rate))
		}
	}
	count := int(float64(n) / (seconds * rate) * (1 + 1e-9))
	if count < 1 {
		count = 1
	}
	blocks := make([]Block, count)
	for m := range blocks {
		blocks[m] = Block{From: int(int64(n) * int64(m) / int64(count)), To: int(int64(n) * int64(m+1) / int64(count))}
	}
	return blocks
}

func abs2(z complex128) float64 { return real(z)*real(z) + imag(z)*imag(z) }
