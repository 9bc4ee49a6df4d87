package transfer

import (
	"fmt"
	"math"
	"math/cmplx"
	"sort"

	"benchslip/analyze"
	"benchslip/analyze/internal/sinefit"
	"benchslip/analyze/internal/spectrum"
	"benchslip/capture/recording"
	"benchslip/capture/recording/memory"
	"benchslip/capture/stimulus"
)

// A take without an `in` channel is compared with the stimulus that the job
// states. Player and recorder have clocks of their own and nobody knows when
// play began: what was played sounds in the take as
//
//	r((t - start) (1 + clock))
//
// clock and start are found, r is resampled accordingly, and stands in for
// the missing channel.
type alignment struct {
	clock, clockU float64
	start         float64 // s after the first sample of out
}

// reference is the stated stimulus as samples.
type reference struct {
	x     []float64
	rate  float64
	words string
}

// stated is the transfer function against the stated stimulus.
func stated(p *analyze.Pass, t *analyze.Take, out *analyze.Signal) (*Curve, *analyze.Refusal) {
	if t.Stimulus == "" {
		return nil, &analyze.Refusal{Code: analyze.MissingTake,
			Text:   fmt.Sprintf("take %q names neither `in` nor `stimulus`", t.Name),
			Advice: "record the stimulus on a second channel and name it with `in`, or state `stimulus`"}
	}
	type found struct {
		c   *Curve
		bad *analyze.Refusal
	}
	f := p.Stages.Once(fmt.Sprintf("transfer/%s/stated/%s/%g", out.ID(), t.Stimulus, p.MainsHz), func() any {
		c, bad := against(p, t, out)
		return found{c, bad}
	}).(found)
	return f.c, f.bad
}

func against(p *analyze.Pass, t *analyze.Take, out *analyze.Signal) (*Curve, *analyze.Refusal) {
	ref, bad := referenceOf(t)
	if bad != nil {
		return nil, bad
	}
	r := signalOf(t.Name+" stimulus", ref.x, ref.rate)
	sh := ShapeOf(p, r)
	switch sh.Kind {
	case "", Tone:
		return nil, &analyze.Refusal{Code: analyze.NotEnoughPoints,
			Text:   fmt.Sprintf("take %q: the stated stimulus (%s) holds no more than one frequency", t.Name, ref.words),
			Advice: "play a sweep, stepped tones, a multitone or steady noise"}
	}
	al := alignment{}
	if al.start, bad = coarse(out, ref, sh); bad != nil {
		return nil, bad
	}
	c, bad := al.settle(p, out, ref, sh.Kind)
	if bad != nil {
		return nil, bad
	}
	c.Stated, c.Description = true, ref.words
	c.ClockPPM, c.ClockU = al.clock*1e6, al.clockU*1e6
	c.StartS = out.StartS + al.start
	return c, c.empty()
}

// settledS is how well the stimulus has to lie in the take before the last
// round, s over its length: a fiftieth of a degree at 20 kHz.
const settledS = 3e-9

// settle finds clock and start in rounds, and the curve against the stimulus
// so placed.
func (al *alignment) settle(p *analyze.Pass, out *analyze.Signal, ref reference, kind string) (*Curve, *analyze.Refusal) {
	for round := 0; ; round++ {
		in := al.played(ref, out, round)
		before := *al
		var c *Curve
		switch kind {
		case Steps:
			al.fromSteps(p, out, in)
		case Multitone:
			al.fromLines(p, out, in)
		case Sweep:
			var bad *analyze.Refusal
			if c, bad = Between(p, out, in); bad != nil {
				return nil, bad
			}
			al.fromSweep(c, ShapeOf(p, in).Law)
		default:
			al.fromStretches(out, in)
		}
		moved := math.Abs(al.clock-before.clock) * out.DurationS()
		switch {
		case c != nil && (moved < settledS || round >= 4): // placed well already
			al.clock, al.start = before.clock, before.start
			return c, nil
		case kind == Steps || kind == Multitone || c == nil && (moved < settledS || round >= 4):
			// Frequencies tell the clock at once.
			return Between(p, out, al.played(ref, out, round+1))
		}
	}
}

// played is the stimulus as the recorder would have heard it.
func (al alignment) played(ref reference, out *analyze.Signal, round int) *analyze.Signal {
	step := (1 + al.clock) * ref.rate / out.RateHz
	x := resample(ref.x, out.Len(), -al.start*(1+al.clock)*ref.rate, step)
	return signalOf(fmt.Sprintf("%s stimulus %d", out.Take.Name, round), x, out.RateHz)
}

// signalOf wraps samples as a signal of a take of their own.
func signalOf(name string, x []float64, rate float64) *analyze.Signal {
	t := &analyze.Take{Name: name, Rec: memory.New(recording.Audio, rate, x)}
	return analyze.NewSignal(t, 1, 0, 0, int64(len(x)), 1)
}

// referenceOf makes the samples of the stated stimulus: of its description,
// or of the first channel of its file.
func referenceOf(t *analyze.Take) (reference, *analyze.Refusal) {
	refuse := func(code, text string) (reference, *analyze.Refusal) {
		return reference{}, &analyze.Refusal{Code: code, Text: fmt.Sprintf("take %q: its stimulus %s", t.Name, text), Advice: "correct `stimulus`, or record the stimulus on a second channel and name it with `in`"}
	}
	if t.PlayedFault != nil {
		return reference{}, t.PlayedFault
	}
	if t.PlayedRec != nil {
		in := t.PlayedRec.Info()
		if in.RateHz <= 0 || in.Frames == 0 {
			return refuse(analyze.Unreadable, fmt.Sprintf("%q holds no samples with a rate", t.Stimulus))
		}
		if in.Frames > mostSamples {
			return refuse(analyze.Unsupported, fmt.Sprintf("%q is longer than %d samples", t.Stimulus, mostSamples))
		}
		all, err := recording.ReadAll(t.PlayedRec, 0)
		if err != nil {
			return refuse(analyze.Unreadable, fmt.Sprintf("%q: %v", t.Stimulus, err))
		}
		return reference{all[0], in.RateHz, t.Stimulus}, nil
	}
	s, err := stimulus.Parse(t.Stimulus)
	if err != nil {
		return refuse(analyze.Unreadable, fmt.Sprintf("cannot be made: %v", err))
	}
	if s.Frames() > mostSamples {
		return refuse(analyze.Unsupported, fmt.Sprintf("is longer than %d samples", mostSamples))
	}
	g, err := stimulus.New(s)
	if err != nil {
		return refuse(analyze.Unreadable, fmt.Sprintf("cannot be made: %v", err))
	}
	x := make([]float64, s.Frames())
	g.Next(x)
	return reference{x, float64(s.RateHz), t.Stimulus}, nil
}

// coarse finds when the stimulus began, to a millisecond or a few.
func coarse(out *analyze.Signal, ref reference, sh *Shape) (float64, *analyze.Refusal) {
	if sh.Kind == Steps || sh.Kind == Multitone {
		return byEnvelope(out, ref), nil
	}
	return byCorrelation(out, ref), nil
}

// byEnvelope slides the envelope of the stimulus along that of the output.
// The envelopes are told in steps, sounding or not, so that the unit's
// response does not weigh.
func byEnvelope(out *analyze.Signal, ref reference) float64 {
	a := onOff(out)
	b := onOff(signalOf("stimulus", ref.x, ref.rate))
	if len(a) == 0 || len(b) == 0 {
		return 0
	}
	blockA := float64(max(8, int(blockS*out.RateHz+0.5))) / out.RateHz
	blockB := float64(max(8, int(blockS*ref.rate+0.5))) / ref.rate
	best, at := math.Inf(-1), 0
	for lag := -len(b) + 1; lag < len(a); lag++ {
		sum := 0.0
		for i := max(0, lag); i < len(a); i++ {
			j := int((float64(i-lag) + 0.5) * blockA / blockB)
			if j >= len(b) {
				break
			}
			sum += a[i] * b[j]
		}
		if sum > best {
			best, at = sum, lag
		}
	}
	return float64(at) * blockA
}

// onOff is +1 where a signal sounds, -1 where it is silent, its mean taken
// off.
func onOff(s *analyze.Signal) []float64 {
	e := envelopeOf(s)
	runs, _ := e.sounding(s.Len())
	v := make([]float64, len(e.peak))
	for i := range v {
		v[i] = -1
	}
	for _, r := range runs {
		for i := r[0] / e.block; i < min((r[1]+e.block-1)/e.block, len(v)); i++ {
			v[i] = 1
		}
	}
	center(v)
	return v
}

// coarseRate is about the rate that the correlation works at, Hz.
const coarseRate = 16000

// byCorrelation takes the largest of the impulse response that output and
// stimulus give at a low rate.
func byCorrelation(out *analyze.Signal, ref reference) float64 {
	by := max(1, int(out.RateHz/coarseRate))
	rate := out.RateHz / float64(by)
	y := make([]float64, out.Len()/by)
	buf := make([]float64, by)
	for i := range y {
		for _, v := range buf[:out.Read(buf, i*by)] {
			y[i] += v
		}
	}
	// The means of by samples delay both alike: the stimulus is read at their
	// middles.
	step := ref.rate / rate
	x := resample(ref.x, int(float64(len(ref.x))/step), float64(by-1)/2*ref.rate/out.RateHz, step)
	center(x)
	center(y)
	n := spectrum.FastLengthUp(len(x) + len(y))
	w := spectrum.NewWhole(n)
	X, Y := w.Forward(x), w.Forward(y)
	top := 0.0
	for _, v := range X {
		top = math.Max(top, abs2(v))
	}
	for k := range Y {
		Y[k] *= cmplx.Conj(X[k]) / complex(abs2(X[k])+1e-4*top, 0)
	}
	h := w.Back(Y)
	at := 0
	for i, v := range h {
		if math.Abs(v) > math.Abs(h[at]) {
			at = i
		}
	}
	if at > len(y) {
		at -= n
	}
	return float64(at) / rate
}

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

// leastSquares solves a weighted fit of six columns by Householder's QR; var
// is the diagonal of the covariance, scaled by the scatter.
func leastSquares(rows [][6]float64, rhs, w []float64) (x, variance [6]float64, ok bool) {
	const n = 6
	m := len(rows)
	a := make([][n + 1]float64, m)
	var scale [n]float64
	for i := range a {
		s := math.Sqrt(w[i])
		for j := 0; j < n; j++ {
			a[i][j] = rows[i][j] * s
			scale[j] += a[i][j] * a[i][j]
		}
		a[i][n] = rhs[i] * s
	}
	for j := range scale {
		scale[j] = math.Sqrt(scale[j])
		if scale[j] == 0 {
			return x, variance, false
		}
		for i := range a {
			a[i][j] /= scale[j]
		}
	}
	for j := 0; j < n; j++ {
		norm := 0.0
		for i := j; i < m; i++ {
			norm += a[i][j] * a[i][j]
		}
		norm = math.Copysign(math.Sqrt(norm), -a[j][j])
		if math.Abs(norm) < 1e-12 {
			return x, variance, false
		}
		v := make([]float64, m-j)
		for i := range v {
			v[i] = a[i+j][j]
		}
		v[0] -= norm
		vv := 0.0
		for _, e := range v {
			vv += e * e
		}
		for k := j; k <= n; k++ {
			dot := 0.0
			for i, e := range v {
				dot += e * a[i+j][k]
			}
			dot *= 2 / vv
			for i, e := range v {
				a[i+j][k] -= dot * e
			}
		}
	}
	ssr := 0.0
	for i := n; i < m; i++ {
		ssr += a[i][n] * a[i][n]
	}
	var inv [n][n]float64
	for c := 0; c < n; c++ {
		for i := n - 1; i >= 0; i-- {
			v := 0.0
			if i == c {
				v = 1
			}
			for k := i + 1; k < n; k++ {
				v -= a[i][k] * inv[k][c]
			}
			inv[i][c] = v / a[i][i]
		}
	}
	sigma2 := ssr / float64(max(m-n, 1))
	for i := 0; i < n; i++ {
		for k := 0; k < n; k++ {
			x[i] += inv[i][k] * a[k][n]
			variance[i] += inv[i][k] * inv[i][k]
		}
		x[i] /= scale[i]
		variance[i] *= sigma2 / (scale[i] * scale[i])
	}
	return x, variance, true
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
