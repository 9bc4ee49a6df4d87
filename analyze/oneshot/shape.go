package oneshot

import (
	"fmt"
	"math"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
)

var overshoot = &analyze.Measure{
	Name:  "overshoot",
	Title: "overshoot of a step",
	Doc: "How far the signal swings past its new level after the edge, in % of the step, on the first step whose size is over half of the largest. The peak is " +
		"that of a polynomial through the samples of the swing, so that noise does not count; where no swing stands out of noise and converter steps the value is " +
		"0 with the least one that would have stood out as its uncertainty.",
	Formula:  "100 (peak - top) / (top - base) %",
	Standard: "IEEE Std 181 (overshoot)",
	Unit:     "%",
	Roles:    []string{"take"},
	Keys:     []string{"tolerance"},
	Run:      runOvershoot,
}

// after is the stretch after the edge, in v, from the first sample at 90 %
// on; start is the index of its first sample. The next edge is left out.
func (e *edge) after() (v []float64, start int) {
	end := e.jump.to
	if end < len(e.x) {
		end = max(end-(e.last-e.first), e.last+(end-e.last)/2, e.last+1)
	}
	v = make([]float64, end-e.last)
	for i := range v {
		v[i] = e.v(e.last + i)
	}
	return v, e.last
}

// falseAlarm is the probability that noise passes for something.
const falseAlarm = 1e-3

// largestOf is how far the largest of n independent normal errors of the
// standard deviation sigma goes, with a probability of falseAlarm to go
// further.
func largestOf(n, sigma float64) float64 {
	return sigma * math.Sqrt(2*math.Log(math.Max(n, 1)/falseAlarm/2))
}

// raw is the noise beside the converter steps, in v, and what the steps add to
// a reading without noise to dither them.
func (e *edge) raw() (noise, steps float64) {
	noise = math.Sqrt(math.Max(e.noise*e.noise-e.step*e.step/12, 0))
	if noise < 0.45*e.step {
		steps = e.step / 2
	}
	return noise, steps
}

// peak is the largest swing past the new level, in v.
type peak struct {
	v, u float64
	at   float64 // sample index; 0 where nothing stands out
}

func (e *edge) peak() peak {
	v, start := e.after()
	noise, steps := e.raw()
	half := 0
	if noise > 0 {
		half = (e.last - e.first) / 4
	}
	s := smooth(v, half)
	n := float64(2*half + 1)
	least := largestOf(float64(len(v))/n, noise/math.Sqrt(n)) + steps
	best := 0
	for i := range s {
		if s[i] > s[best] {
			best = i
		}
	}
	none := peak{v: 0, u: math.Hypot(least/2, e.uAfter)}
	top := s[best] - 1
	if top <= least || top <= 0 {
		return none
	}
	// The swing: neighbours over 60 % of its height.
	a, b := best, best
	for a > 0 && s[a-1]-1 > 0.6*top {
		a--
	}
	for b < len(s)-1 && s[b+1]-1 > 0.6*top {
		b++
	}
	p := peak{}
	if m := b - a + 1; m >= 7 {
		f := fitPoly(v[a:b+1], 4)
		for k := range 16 * m {
			i := float64(k) / 16
			if i <= float64(m-1) && f.at(i)-1 > p.v {
				p.v, p.at = f.at(i)-1, float64(start+a)+i
			}
		}
		codes := math.Max(1, 0.4*top/math.Max(e.step, 1e-300))
		p.u = math.Hypot(math.Max(noise, f.rms)*f.spread(p.at-float64(start+a)), e.step/math.Sqrt(12)/math.Sqrt(codes))
		if p.v < 3*p.u {
			return none
		}
	} else {
		// Few samples: the parabola through the largest and its neighbours.
		i := best
		for k := a; k <= b; k++ {
			if v[k] > v[i] {
				i = k
			}
		}
		p.v, p.at = v[i]-1, float64(start+i)
		if i > 0 && i < len(v)-1 {
			l, c, r := v[i-1], v[i], v[i+1]
			if d := l - 2*c + r; d < 0 {
				x := math.Max(-0.5, math.Min(0.5, (l-r)/(2*d)))
				p.v, p.at = c-(l-r)*x/4-1, p.at+x
			}
		}
		p.u = budget.RSS(noise, e.step/math.Sqrt(12), (p.v-(v[i]-1))/math.Sqrt(3))
		if m < 3 { // hardly sampled
			p.u = math.Hypot(p.u, 0.1*p.v)
		}
	}
	p.u = math.Hypot(p.u, (1+p.v)*e.uAfter)
	p.u = math.Hypot(p.u, p.v*e.uBefore)
	return p
}

func runOvershoot(p *analyze.Pass) analyze.Result {
	e, bad := edgeOf(p, either)
	if bad != nil {
		return analyze.RefuseWith(percent, bad)
	}
	k := e.peak()
	r := analyze.Result{Value: &k.v, Unit: percent}
	var b budget.Budget
	b.A("noise, steps and levels", k.u, 0)
	b.Into(&r)
	e.finish(p, &r)
	if k.at == 0 {
		r.Notes = append(r.Notes, fmt.Sprintf("no swing past the new level stands out; one of %.2g %% would have", 200*k.u))
		return r
	}
	r.Details["peak_s"] = timeOf(e.s, k.at)
	r.Details["peak_v"] = e.level(1 + k.v)
	if k.v < 1 { // of a second-order system
		l := math.Log(k.v)
		r.Details["damping"] = -l / math.Sqrt(math.Pi*math.Pi+l*l)
	}
	r.Figures[0] = e.figureOver(int(k.at + 3*(k.at-e.t50.at)))
	r.Figures[0].Marks = append(r.Figures[0].Marks, analyze.Mark{Kind: "line", X: timeOf(e.s, k.at), Y: e.level(1 + k.v), Label: "peak"})
	return r
}

var settlingTime = &analyze.Measure{
	Name:  "settling_time",
	Title: "settling time of a step",
	Doc: "Time from the 50 % crossing of the edge to the last entry into the band about the new level, `tolerance` of the step to both sides (2 % unless " +
		"stated), on the first step whose size is over half of the largest. Noise is averaged over a part of the edge's own length; where it still fills the band " +
		"nothing can be said.",
	Formula:  "t = t(last entry into top +- tolerance) - t(50 %)",
	Standard: "IEEE Std 181 (settling duration)",
	Unit:     "s",
	Roles:    []string{"take"},
	Keys:     []string{"tolerance"},
	Run:      runSettling,
}

// tolerance is the stated one or 2 %.
func tolerance(p *analyze.Pass) float64 {
	if t := p.Params.Tolerance; t != nil {
		return *t
	}
	return 0.02
}

// entry is where the signal stays inside a band for good: the sample index,
// fractions included, and its standard deviation for noise of 1 a sample.
type entry struct{ at, spread float64 }

// settled finds the entry into 1 +- tol. v starts at sample start; s is v, or
// its running mean where noise matters.
func (e *edge) settled(v, s []float64, start int, tol float64) entry {
	last := -1
	for i := len(s) - 1; i >= 0; i-- {
		if math.Abs(s[i]-1) > tol {
			last = i
			break
		}
	}
	switch last {
	case -1: // in the band from the first sample on: the edge itself enters
		return e.crossing(1 - tol)
	case len(s) - 1: // never
		return entry{float64(start + last), 0}
	}
	side := math.Copysign(1, s[last]-1)
	d := func(i int) float64 { return side * (s[i] - 1) }
	// The samples about the entry, from 1.7 to 0.5 of the band and not beyond
	// the crest of a swing, as a polynomial.
	a, b := last, last+1
	for crest := d(a); a > 0 && d(a) < 1.7*tol && d(a) > crest-0.15*tol; a-- {
		crest = math.Max(crest, d(a))
	}
	for b < len(s)-1 && d(b) > 0.5*tol {
		b++
	}
	if m := b - a + 1; m >= 6 {
		f := fitPoly(v[a:b+1], degreeFor(m))
		if i, ok := f.solve(1+side*tol, float64(last-a)); ok {
			if sl := math.Abs(f.slopeAt(i)); sl > 0 {
				return entry{float64(start+a) + i, f.spread(i) / sl}
			}
		}
	}
	x, y := side*(v[last]-1), side*(v[last+1]-1)
	if !(x >= tol && y < tol) {
		x, y = d(last), d(last+1)
	}
	return entry{float64(start+last) + math.Min(math.Max((x-tol)/(x-y), 0), 1), 1 / (x - y)}
}

// crossing is where the edge itself reaches a level from 0.9 on: between the
// last sample below it and the next one.
func (e *edge) crossing(level float64) entry {
	i := e.last
	for i > e.first && e.v(i) > level {
		i--
	}
	x, y := e.v(i), e.v(i+1)
	if y <= x {
		return entry{float64(i), 1}
	}
	return entry{float64(i) + math.Min(math.Max((level-x)/(y-x), 0), 1), 1 / (y - x)}
}

func runSettling(p *analyze.Pass) analyze.Result {
	e, bad := edgeOf(p, either)
	if bad != nil {
		return analyze.RefuseWith(second, bad)
	}
	r := analyze.Result{Unit: second}
	tol := tolerance(p)
	v, start := e.after()
	noise, steps := e.raw()
	half := 0
	if largestOf(float64(len(v)), noise)+steps > tol/10 {
		half = (e.last - e.first) / 4
	}
	n := float64(2*half + 1)
	rest := largestOf(float64(len(v))/n, noise/math.Sqrt(n)) + steps
	e.finish(p, &r)
	r.Details["tolerance_percent"] = 100 * tol
	if rest > 0.7*tol {
		r.Refusal = &analyze.Refusal{Code: analyze.FloorLimited,
			Text:   fmt.Sprintf("noise and converter steps of %.2g %% of the step fill the band of +-%.3g %%", 100*rest, 100*tol),
			Advice: "use more of the screen's height, average several edges, or state a wider tolerance"}
		return r
	}
	s := smooth(v, half)
	in := e.settled(v, s, start, tol)
	at := in.at
	end := float64(start + len(v))
	if at > end-math.Max(0.05*(end-e.t50.at), 1) || e.remaining > tol/3 || e.moved > tol/2 {
		text := fmt.Sprintf("the signal is outside +-%.3g %% up to %.6g s, the record (or the level) ends at %.6g s", 100*tol, timeOf(e.s, at), timeOf(e.s, end))
		if e.remaining > tol/3 || e.moved > tol/2 {
			text = fmt.Sprintf("the level after the edge still moves by %.2g %% of the step over its last tenth", 100*e.moved)
		}
		r.Refusal = &analyze.Refusal{Code: analyze.TooShort, Text: text, Advice: fmt.Sprintf("record %.2g s or more after the edge", 3*(end-e.t50.at)/e.s.RateHz)}
		return r
	}
	// What an error of the level does, swings that just reach the band
	// included: the reading with the band wider and narrower by it.
	u := budget.RSS(e.uAfter, tol*e.uBefore, e.step/math.Sqrt(12)/math.Sqrt(math.Max(1, tol/math.Max(e.step, 1e-300))))
	early, late := e.settled(v, s, start, tol+u).at, e.settled(v, s, start, math.Max(tol-u, tol/10)).at
	dt := 1 / e.s.RateHz
	value := (at - e.t50.at) * dt
	r.Value = &value
	var b budget.Budget
	b.A("noise at the entry", noise*in.spread*dt, 0)
	b.B("steps, and the level settled to", math.Abs(late-early)/2*dt)
	b.A("noise at the 50 % crossing", e.t50.uNoise*dt, 0)
	b.B("converter steps at the 50 % crossing", e.t50.uStep*dt)
	b.B("course between samples", math.Hypot(e.t50.uShape, 0.1)*dt)
	b.Clock(e.s, -value)
	b.Into(&r)
	r.Details["settled_s"] = timeOf(e.s, at)
	f := e.figureOver(int(at + 0.5*(at-e.t50.at)))
	f.Rules = append(f.Rules, analyze.Rule{Label: fmt.Sprintf("+%.3g %%", 100*tol), At: e.level(1 + tol)}, analyze.Rule{Label: fmt.Sprintf("-%.3g %%", 100*tol), At: e.level(1 - tol)})
	near := at
	f.Marks = append(f.Marks, analyze.Mark{Kind: "line", X: timeOf(e.s, near), Y: e.x[min(int(near+0.5), len(e.x)-1)], Label: "settled"})
	r.Figures[0] = f
	return r
}
