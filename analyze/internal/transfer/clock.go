package transfer

import (
	"math"
	"math/cmplx"
	"sort"

	"benchslip/analyze"
	"benchslip/analyze/internal/sinefit"
	"benchslip/analyze/internal/spectrum"
)

// tonesForClock is how many tones, the highest, tell the clock: a frequency's
// weight goes with its square.
const tonesForClock = 8

// fromSteps finds the clock from the frequencies of the tones in the output.
func (al *alignment) fromSteps(p *analyze.Pass, out, in *analyze.Signal) {
	rate := out.RateHz
	var f []ratio
	steps := append([]Step(nil), ShapeOf(p, in).Steps...)
	sort.SliceStable(steps, func(a, b int) bool { return steps[a].Hz > steps[b].Hz })
	for _, st := range steps {
		if len(f) >= tonesForClock {
			break
		}
		from, to := st.trimmed(rate)
		n := to - from
		if n < 64 || st.Hz*float64(n)/rate < 4 {
			continue
		}
		x, y := make([]float64, n), make([]float64, n)
		in.Read(x, from)
		out.Read(y, from)
		want, ok := refined(x, st.Hz/rate)
		if !ok {
			continue
		}
		if r := ratioOf(y, want); r.weight > 0 {
			f = append(f, r)
		}
	}
	al.turn(f)
}

// fromLines is fromSteps for tones that sound together.
func (al *alignment) fromLines(p *analyze.Pass, out, in *analyze.Signal) {
	sh := ShapeOf(p, in)
	from, to := max(sh.From, 0), min(sh.To, out.Len())
	n := to - from
	if n < 64 {
		return
	}
	y := make([]float64, n)
	out.Read(y, from)
	// The stimulus has no noise: two seconds tell its frequencies.
	x := make([]float64, min(n, int(2*out.RateHz)))
	in.Read(x, from+(n-len(x))/2)
	var combs []sinefit.Comb
	for _, hz := range sh.Lines {
		combs = append(combs, sinefit.Comb{Nu: hz / out.RateHz, Orders: []float64{1}, Free: true})
	}
	X, err := sinefit.Refine(x, combs, 0.6/float64(len(x)))
	if err != nil {
		return
	}
	var f []ratio
	for i := len(X.Nu) - 1; i >= 0 && len(f) < tonesForClock; i-- {
		if r := ratioOf(y, X.Nu[i]); r.weight > 0 {
			f = append(f, r)
		}
	}
	al.turn(f)
}

// ratio is the relative excess of a frequency in the output and its weight.
type ratio struct{ excess, weight float64 }

// refined is the frequency of a strong line near nu.
func refined(x []float64, nu float64) (float64, bool) {
	n := len(x)
	short := min(n, max(n/8, int(8/nu)))
	for _, m := range []int{short, n} {
		r, err := sinefit.Refine(x[(n-m)/2:(n-m)/2+m], []sinefit.Comb{{Nu: nu, Orders: []float64{1}, Free: true}}, 0.6/float64(m))
		if err != nil {
			return nu, false
		}
		nu = r.Nu[0]
	}
	return nu, true
}

// ratioOf compares the line in y near nu with nu; its weight is the inverse
// variance by the Cramer-Rao bound, 0 when there is no line.
func ratioOf(y []float64, nu float64) ratio {
	got, ok := refined(y, nu)
	l := fitLines(append([]float64(nil), y...), []float64{got}, nil, 1, 0)[0]
	if !ok || !l.ok || abs2(l.z) < 20*l.share {
		return ratio{}
	}
	n := float64(len(y))
	// var(omega) = 12/(n^2) var(phase); share/2 / |z|^2 is var(phase).
	v := 12 / (n * n) * l.share / 2 / abs2(l.z) / (4 * math.Pi * math.Pi * nu * nu)
	return ratio{got/nu - 1, 1 / (v + 1e-22)}
}

// turn adds the weighted median of the ratios to the clock: one tone on top
// of another line does not move it. Its uncertainty is that of the weighted
// mean.
func (al *alignment) turn(f []ratio) {
	sort.SliceStable(f, func(a, b int) bool { return f[a].excess < f[b].excess })
	total := 0.0
	for _, r := range f {
		total += r.weight
	}
	if total == 0 {
		return
	}
	sum := 0.0
	for _, r := range f {
		sum += r.weight
		if sum >= total/2 {
			al.clock = (1+al.clock)*(1+r.excess) - 1
			al.clockU = 1.25 / math.Sqrt(total) // a median's price over the mean
			return
		}
	}
}

// fromSweep finds the clock from the phases against a stimulus at the present
// clock. A clock off by d makes the response at f arrive later by
// -d (t(f)), t = At + L ln(f/Hz), which leaves a phase of 2 pi d L f ln f. In
// the pass band the unit itself adds a constant, a delay, and the tails of
// its corners, which go with 1/f, 1/f^3 and f^3:
//
//	phi = a + b f + c f ln f + d/f + e f^3 + g/f^3
//
// is fitted to the points nearest to the middle level, within 0.1 dB of it if
// they span a decade, weighted by 1/u^2.
func (al *alignment) fromSweep(c *Curve, law Law) {
	u := c.Used()
	if len(u) < 12 || law.L == 0 {
		return
	}
	levels := make([]float64, len(u))
	for i, q := range u {
		levels[i] = cmplx.Abs(q.H)
	}
	sorted := append([]float64(nil), levels...)
	sort.Float64s(sorted)
	mid := sorted[len(sorted)/2]
	phase := c.unwrap(u)
	const terms = 6
	var rows [][terms]float64
	var rhs, w []float64
	f0 := math.Sqrt(u[0].Hz * u[len(u)-1].Hz)
	for _, dB := range []float64{0.1, 0.3, 1, 3} {
		rows, rhs, w = nil, nil, nil
		low, high := math.Inf(1), 0.0
		for i, q := range u {
			if math.Abs(20*math.Log10(levels[i]/mid)) > dB {
				continue
			}
			low, high = math.Min(low, q.Hz), math.Max(high, q.Hz)
			f := q.Hz / f0
			rows = append(rows, [terms]float64{1, f, f * math.Log(f), 1 / f, f * f * f, 1 / (f * f * f)})
			rhs = append(rhs, phase[i])
			w = append(w, weight(q))
		}
		if len(rows) >= 4*terms && high > 10*low {
			break
		}
	}
	if len(rows) < 2*terms {
		return
	}
	x, cov, ok := leastSquares(rows, rhs, w)
	if !ok {
		return
	}
	al.clock += x[2] / (2 * math.Pi * law.L * f0)
	al.clockU = math.Sqrt(cov[2]) / (2 * math.Pi * math.Abs(law.L) * f0)
}

// stretchesOf is how many stretches the clock of noise and pulses is found
// from.
const stretchesOf = 8

// fromStretches finds clock and start from the delays of successive stretches
// of noise or pulses.
func (al *alignment) fromStretches(out, in *analyze.Signal) {
	e := envelopeOf(in)
	runs, _ := e.sounding(in.Len())
	if len(runs) == 0 {
		return
	}
	from, to := runs[0][0], runs[len(runs)-1][1]
	rate := out.RateHz
	m := spectrum.FastLength(min((to-from)/stretchesOf, 1<<18))
	if float64(m) < 0.02*rate {
		return // one short pulse: its clock does not matter
	}
	whole := spectrum.NewWhole(m)
	x, y := make([]float64, m), make([]float64, m)
	var at, lag, w []float64
	for k := 0; k < stretchesOf; k++ {
		first := from + (to-from-m)*k/(stretchesOf-1)
		in.Read(x, first)
		out.Read(y, first)
		center(x)
		center(y)
		X, Y := whole.Forward(x), whole.Forward(y)
		d, weight := delayOf(X, Y, rate/float64(m))
		if weight == 0 {
			continue
		}
		at = append(at, (float64(first)+float64(m)/2)/rate)
		lag = append(lag, d*float64(m)/rate)
		w = append(w, weight)
	}
	var s0, s1, s2, b0, b1 float64
	for i := range at {
		s0 += w[i]
		s1 += w[i] * at[i]
		s2 += w[i] * at[i] * at[i]
		b0 += w[i] * lag[i]
		b1 += w[i] * at[i] * lag[i]
	}
	det := s0*s2 - s1*s1
	if len(at) < 3 || !(det > 1e-12*s0*s2) {
		return
	}
	slope := (s0*b1 - s1*b0) / det
	a := (b0 - slope*s1) / s0
	// Y(t) = X(t - a - slope t): what the stimulus shows at t shows later.
	// Its own time is (t - start)(1 + clock).
	t0 := al.start
	al.clock = (1+al.clock)*(1-slope) - 1
	al.start = (t0 + a) / (1 - slope)
	ssr := 0.0
	for i := range at {
		r := lag[i] - a - slope*at[i]
		ssr += w[i] * r * r
	}
	al.clockU = math.Sqrt(ssr / math.Max(float64(len(at)-2), 1) * s0 / det)
}

// delayOf is the delay of Y against X in turns a line, from the whole band,
// and a weight.
func delayOf(X, Y []complex128, stepHz float64) (delay, weight float64) {
	n := len(X) - 1
	g := &regression{X: [][]complex128{X}, Y: [][]complex128{Y}, centre: float64(n) / 2, half: float64(n) / 2}
	d := g.findDelay(stepHz)
	var s complex128
	xx, yy := 0.0, 0.0
	for k := 1; k < n; k++ {
		s += Y[k] * cmplx.Conj(X[k]) * turnsOf(d*(float64(k)-g.centre))
		xx += abs2(X[k])
		yy += abs2(Y[k])
	}
	if xx == 0 || yy == 0 {
		return 0, 0
	}
	c := abs2(s) / (xx * yy)
	return d, c
}
