package noise

import (
	"fmt"
	"math"
	"slices"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
	"benchslip/analyze/internal/spectrum"
	"benchslip/analyze/stage"
)

// Steady noise keeps its power from second to second, and its mean over a few
// hundredths of a second: two checks on what a take of noise really holds.

// scatter is the relative standard uncertainty of the power in a band from its
// scatter over equal parts of the take, half a second or more each, with its
// degrees of freedom; 0 where the take holds fewer than eight.
func scatter(s *analyze.Signal, b stage.Band, gain func(float64) float64) (u, dof float64) {
	parts := min(int(s.DurationS()/0.5), 32)
	if parts < 8 {
		return 0, 0
	}
	n := s.Len() / parts
	m := spectrum.FastLength(n / 10)
	w := spectrum.BlackmanHarris(m)
	dc, _ := mean(s)
	var power []float64
	for k := range parts {
		part := s.Part(k*n, (k+1)*n)
		src := func(dst []float64, at int) int {
			got := part.Read(dst, at)
			for i := range dst[:got] {
				dst[i] -= dc
			}
			return got
		}
		power = append(power, spectrum.Welch(src, n, s.RateHz, w, m, max(m/4, 1)).Integrate(b.Low, b.High, gain))
	}
	average, uMean, dof := budget.TypeA(power)
	if average <= 0 {
		return 0, 0
	}
	return uMean / average, dof
}

// unsteady replaces the uncertainty of Gaussian noise by the parts' scatter
// where that is larger than chance explains (chi-square, three and a
// half standard deviations); dof is then that of the scatter, else 0.
func (r *reading) unsteady(p *analyze.Pass, s *analyze.Signal, weighting string, gain func(float64) float64) (dof float64) {
	key := fmt.Sprintf("scatter/%s/%v/%s", s.ID(), r.band, weighting)
	got := p.Stages.Once(key, func() any {
		u, dof := scatter(s, r.band, gain)
		return [2]float64{u, dof}
	}).([2]float64)
	u, dof := got[0], got[1]
	expected := r.U / r.P
	// A part's own ends count less, which costs it a tenth of its averages.
	if dof == 0 || !(u*u > 1.1*expected*expected*(1+3.5*math.Sqrt(2/dof))) {
		return 0
	}
	r.U = u * r.P
	return dof
}

// bursts is what a device with burst noise (popcorn noise) does: its output
// jumps between levels and stays there for milliseconds to seconds.
type bursts struct {
	steps   int
	perMin  float64
	largest float64 // V, or fractions of full scale
	limit   float64 // smallest jump that counts
}

const (
	jumpLimit = 6.5  // standard deviations
	jumpCell  = 0.25 // of the averaging time
)

// burstsIn looks for jumps: the mean over one mains period after each instant,
// in which hum cancels, less that before it, against its own spread, which is
// read from its quartiles so that jumps do not widen it.
func burstsIn(p *analyze.Pass, l *stage.Lines) bursts {
	s := l.Sig
	return p.Stages.Once("bursts/"+s.ID(), func() any { return findBursts(s, l.MainsHz) }).(bursts)
}

func findBursts(s *analyze.Signal, mainsHz float64) bursts {
	if mainsHz <= 0 {
		mainsHz = 50
	}
	const cells = 4 // 1/jumpCell
	n := int(math.Round(jumpCell / mainsHz * s.RateHz))
	if n < 1 || s.Len() < 64*n*cells {
		return bursts{}
	}
	means := make([]float64, 0, s.Len()/n)
	buf := make([]float64, n)
	for at := 0; at+n <= s.Len(); at += n {
		if s.Read(buf, at) < n {
			break
		}
		sum := 0.0
		for _, x := range buf {
			sum += x
		}
		means = append(means, sum/float64(n))
	}
	d := make([]float64, 0, len(means))
	for i := cells; i+cells <= len(means); i++ {
		v := 0.0
		for k := range cells {
			v += means[i+k] - means[i-1-k]
		}
		d = append(d, v/cells)
	}
	sorted := slices.Clone(d)
	slices.Sort(sorted)
	// Quartiles of a normal law lie 0.6745 standard deviations from its middle.
	sigma := (sorted[len(d)*3/4] - sorted[len(d)/4]) / 2 / 0.67449
	b := bursts{limit: jumpLimit * sigma}
	for i := 0; i < len(d); i++ {
		if math.Abs(d[i]) <= b.limit {
			continue
		}
		top, end := 0.0, i
		for end < len(d) && (math.Abs(d[end]) > b.limit && d[end]*d[i] > 0) {
			top = math.Max(top, math.Abs(d[end]))
			end++
		}
		b.steps++
		b.largest = math.Max(b.largest, top)
		i = end
	}
	b.perMin = float64(b.steps) / s.DurationS() * 60
	return b
}

// into puts bursts into details, and an opinion where there are several.
func (b bursts) into(r *analyze.Result, unit string) {
	r.Details["bursts"] = map[string]any{"steps": b.steps, "per_minute": b.perMin, "largest_v": b.largest, "smallest_counted_v": b.limit}
	if b.steps >= 3 {
		r.Opinions = append(r.Opinions, fmt.Sprintf("%d jumps of the level by up to %.2g %s (%.3g a minute): consistent with burst (popcorn) noise of a device, leakage or a bad joint; "+
			"to confirm, clean the board, use freeze spray, wiggle and tap, and record again", b.steps, b.largest, unit, b.perMin))
	}
}
