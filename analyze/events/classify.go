package events

import (
	"math"

	"benchslip/analyze/internal/sinefit"
)

// ranks: which kind wins where several signs meet.
const (
	rankStep = iota
	rankDropout
	rankHum
	rankNoise
	rankBurst
	rankClick
)

// burstLasts is from how many milliseconds on noise is a burst; shorter is a
// click.
const burstLasts = 6

// cluster is the signs of one event, in order of time.
type cluster struct {
	signs    []sign
	from, to int
}

// clusters joins signs that are nearer than 20 ms.
func (st *stretch) clusters() []cluster {
	gap := int(together * st.sc.rate)
	var out []cluster
	for _, s := range st.signs {
		if n := len(out); n > 0 && s.at-out[n-1].to < gap {
			c := &out[n-1]
			c.signs = append(c.signs, s)
			c.to = max(c.to, s.to)
			continue
		}
		out = append(out, cluster{[]sign{s}, s.at, s.to})
	}
	return out
}

// of finds the largest sign of a kind.
func (c cluster) of(w what) (best sign, ok bool) {
	for _, s := range c.signs {
		if s.what == w && (!ok || math.Abs(s.size) > math.Abs(best.size)) {
			best, ok = s, true
		}
	}
	return best, ok
}

// turn finds a rise of the noise and a fall behind it in one cluster.
func (c cluster) turn() (up, down int) {
	up = -1
	for _, s := range c.signs {
		if s.what == noiseStep && s.ln > 0 && up < 0 {
			up = s.at
		}
		if s.what == noiseStep && s.ln < 0 && up >= 0 {
			return up, s.at
		}
	}
	return 0, 0
}

// classify names an event and says where it starts.
func (st *stretch) classify(c cluster) (e event, at int) {
	rate := st.sc.rate
	at = st.start(c)
	dB := func(s sign) float64 { return 20 / math.Ln10 * s.ln }
	// Changes are placed to within a period; the largest spike beside them says
	// better.
	placed := func(s sign) int {
		near := int(0.012 * rate)
		best := sign{at: s.at}
		for _, q := range c.signs {
			if q.what == spike && q.at > s.at-near && q.at < s.at+near && q.size > best.size {
				best = q
			}
		}
		return best.at
	}
	if s, ok := c.of(toneStep); ok {
		return event{kind: "step", size: s.size, dB: dB(s), rank: rankStep}, placed(s)
	}
	lost, isLost := c.of(slip)
	missing, isGone := c.of(gone)
	_, isFaint := c.of(faint)
	if isGone && !st.weaker(missing) {
		isGone = false // a loud click disturbs the reading of the tone
	}
	if isLost || isGone || isFaint || st.hollow(c) {
		e = event{kind: "dropout", rank: rankDropout}
		switch {
		case isGone:
			e.size, e.lasts = missing.size, float64(c.to-c.from)/rate
		case isFaint || !isLost:
			e.size, e.lasts = st.lacks(c), float64(c.to-c.from)/rate
		default:
			e.size = lost.size
			at = placed(lost)
		}
		return e, at
	}
	if s, ok := c.of(humStep); ok {
		return event{kind: "hum", size: s.size, rank: rankHum}, placed(s)
	}
	if s, ok := c.of(dcStep); ok {
		return event{kind: "step", size: s.size, rank: rankNoise}, placed(s)
	}
	if s, ok := c.of(noiseStep); ok {
		if up, down := c.turn(); down > up {
			return event{kind: "burst", size: st.excess(c), lasts: float64(down-up) / rate, rank: rankBurst}, up
		}
		return event{kind: "step", size: s.size, dB: dB(s), rank: rankNoise, noise: true}, s.at
	}
	if long := st.lasting(c); long >= burstLasts {
		return event{kind: "burst", size: st.excess(c), lasts: float64(c.to-at) / rate, rank: rankBurst}, at
	}
	return event{kind: "click", size: st.peak(c), rank: rankClick}, at
}

// start of a cluster: its first spike, or where the errors change first.
func (st *stretch) start(c cluster) int {
	first := c.signs[0]
	if first.what == spike {
		return first.at
	}
	n := st.sc.fine.n
	for _, s := range c.signs {
		if s.what == spike && s.at < first.to {
			return s.at
		}
	}
	if first.what != loud && first.what != faint {
		return first.at
	}
	floor := st.floorAt(first.at)
	return st.onset(first.at-12*n, first.to, floor, floor*math.Max(first.size, 1e-6))
}

// lasting is for how many milliseconds the errors stay beyond the noise: the
// participation number of the excess, (sum)^2 / sum of squares.
func (st *stretch) lasting(c cluster) float64 {
	n := st.sc.fine.n
	var one, two float64
	for k := max(c.from/n-2, 0); k <= c.to/n+2 && k < len(st.fine); k++ {
		if x := st.fine[k]/st.floorAt(k*n) - 1; x > 0.7 { // noise alone reaches 0.7 in 1 of 3000
			one += x
			two += x * x
		}
	}
	if two == 0 {
		return 0
	}
	return one * one / two * float64(n) / st.sc.rate * 1000
}

// weaker: the signal itself has less power while the tone is gone.
func (st *stretch) weaker(s sign) bool {
	long := max(s.to-s.at, 1)
	return st.meanSquare(s.at, s.to) < 0.8*st.meanSquare(s.at-8*long, s.at-3*long)
}

// hollow: somewhere in the cluster the signal holds under a tenth of its
// earlier power for two periods of the tone.
func (st *stretch) hollow(c cluster) bool {
	hz := st.sc.toneHz
	if hz <= 0 {
		return false
	}
	w := int(2 * st.sc.rate / hz)
	before := st.meanSquare(c.from-10*w, c.from-2*w)
	for a := c.from; a+w <= c.to; a += max(w/4, 1) {
		if st.meanSquare(a, a+w) < 0.1*before {
			return true
		}
	}
	return false
}

// lacks is the RMS that the signal lacks during a cluster, against before.
func (st *stretch) lacks(c cluster) float64 {
	n := st.sc.fine.n
	in := 2 * n
	if c.to-c.from < 5*n {
		in = 0
	}
	return math.Sqrt(math.Max(st.meanSquare(c.from-60*n, c.from-10*n)-st.meanSquare(c.from+in, c.to-in), 0))
}

// meanSquare of the samples from a to b about the mean of the stretch.
func (st *stretch) meanSquare(a, b int) (v float64) {
	a, b = max(a, 0), min(b, len(st.x))
	for _, y := range st.x[min(a, len(st.x)):max(min(a, len(st.x)), b)] {
		v += (y - st.mean) * (y - st.mean)
	}
	return v / float64(max(b-a, 1))
}

// left is the signal from a to b without its background: the tone with two
// harmonics and the first mains lines of the tenth of a second before, carried
// on; and the noise that they left there, RMS.
func (st *stretch) left(a, b int) (rest []float64, noise float64) {
	rate := st.sc.rate
	long := int(0.1 * rate)
	end := max(a-int(0.002*rate), 0)
	from := max(end-long, 0)
	part := st.x[from:end]
	rest = append([]float64(nil), st.x[a:b]...)
	if len(part) < long {
		for i := range rest {
			rest[i] -= st.mean
		}
		return rest, 0
	}
	var nu []float64
	if hz := st.sc.toneHz; hz > 0 {
		for k := 1.0; k <= 3 && k*hz < 0.45*rate; k++ {
			nu = append(nu, k*hz/rate)
		}
	}
	hz := st.sc.supplies[0]
	for k := 1.0; k <= 10 && k*hz < 0.45*rate; k++ {
		clear := true
		for _, v := range nu {
			clear = clear && math.Abs(v*rate-k*hz) > 20
		}
		if clear {
			nu = append(nu, k*hz/rate)
		}
	}
	solver, err := sinefit.NewSolver(nu, len(part))
	if err != nil {
		return rest, 0
	}
	f := solver.Block(part)
	mid := float64(from) + float64(len(part)-1)/2
	model := func(i int) float64 {
		v := f.DC
		for k, z := range f.Z {
			v += real(z * sinefit.Phasor(sinefit.Turns(nu[k], float64(i)-mid)))
		}
		return v
	}
	for i, v := range part {
		d := v - model(from+i)
		noise += d * d / float64(len(part))
	}
	for i := range rest {
		rest[i] -= model(a + i)
	}
	return rest, math.Sqrt(noise)
}

// peak is the largest departure from the background.
func (st *stretch) peak(c cluster) float64 {
	n := st.sc.fine.n
	rest, _ := st.left(max(c.from-n/2, 0), min(c.to+n, len(st.x)))
	most := 0.0
	for _, v := range rest {
		most = math.Max(most, math.Abs(v))
	}
	return most
}

// excess is the RMS of a burst: what is left of the signal, less the noise.
func (st *stretch) excess(c cluster) float64 {
	b := min(c.to, c.from+int(0.2*st.sc.rate)) // the background is known for so long
	rest, noise := st.left(c.from, max(b, c.from+1))
	sum := 0.0
	for _, v := range rest {
		sum += v * v / float64(len(rest))
	}
	return math.Sqrt(math.Max(sum-noise*noise, 0))
}
