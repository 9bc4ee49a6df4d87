package transfer

import (
	"fmt"
	"math"
	"math/cmplx"

	"benchslip/analyze"
	"benchslip/analyze/internal/sinefit"
)

// Steps are trimmed: the unit settles in their first fifth, and fades and the
// blocks of the envelope blur their ends.
const (
	settleShare = 0.2
	guardS      = 0.02
)

// mostHarmonics is the highest harmonic of a step that is fitted with it.
const mostHarmonics = 5

// fewest is how many periods a step must hold.
const fewest = 1.8

// stepped is the curve of tones that follow one another.
func stepped(p *analyze.Pass, out, in *analyze.Signal, sh *Shape) *Curve {
	c := &Curve{Kind: Steps, Out: out, In: in}
	for _, st := range sh.Steps {
		c.Points = append(c.Points, step(p, out, in, st))
	}
	c.LowHz, c.HighHz = math.Inf(1), 0
	for _, q := range c.Points {
		c.LowHz, c.HighHz = math.Min(c.LowHz, q.Hz), math.Max(c.HighHz, q.Hz)
	}
	c.finish()
	return c
}

// trimmed is the stretch of a step that is used.
func (st Step) trimmed(rate float64) (from, to int) {
	n := st.To - st.From
	guard := min(int(guardS*rate), n/10)
	return st.From + max(int(settleShare*float64(n)), guard), st.To - guard
}

func step(p *analyze.Pass, out, in *analyze.Signal, st Step) Point {
	rate := out.RateHz
	from, to := st.trimmed(rate)
	n := to - from
	q := Point{Hz: st.Hz, FromS: out.StartS + float64(from)/rate, ToS: out.StartS + float64(to)/rate}
	if st.Hz*float64(n)/rate < fewest {
		q.Why = fmt.Sprintf("only %.2g periods", st.Hz*float64(n)/rate)
		return q
	}
	x := make([]float64, n)
	y := make([]float64, n)
	if in.Read(x, from) < n || out.Read(y, from) < n {
		q.Why = "cut off by the end of the take"
		return q
	}
	// The frequency from the input, first in a part of it, then the output with
	// that frequency, its own harmonics and the mains beside it.
	nu := st.Hz / rate
	short := min(n, max(n/8, int(8/nu)))
	for _, m := range []int{short, n} {
		r, err := sinefit.Refine(x[(n-m)/2:(n-m)/2+m], []sinefit.Comb{{Nu: nu, Orders: []float64{1}, Free: true}}, 0.6/float64(m))
		if err != nil {
			q.Why = "its frequency cannot be fitted"
			return q
		}
		nu = r.Nu[0]
	}
	q.Hz = nu * rate
	periods := nu * float64(n)
	later := 0 // samples at the start that a second look leaves out
	if periods < watched {
		later = min(n*3/8, int(float64(n)-fewest/nu))
	}
	lateX, lateY := append([]float64(nil), x[later:]...), append([]float64(nil), y[later:]...)
	nus := multiples(nu, mostHarmonics)
	fit := func(x, y []float64, q *Point) {
		X := fitLines(x, multiples(nu, 3), nil, 1, in.Step)
		Y := fitLines(y, nus, mainsBeside(p, nus, rate, len(y)), 1, out.Step)
		q.set(Y[0], X[0])
	}
	fit(x, y, &q)
	if later > 0 && q.Why == "" {
		var late Point
		if fit(lateX, lateY, &late); late.Why == "" {
			// Beyond what the noise of the shorter part explains.
			d := cmplx.Abs(late.H/q.H - 1)
			q.ModelU = math.Sqrt(math.Max(d*d-2*late.U*late.U, 0))
		}
	}
	return q
}

// watched is how many periods a step must hold before what settles (coupling
// capacitors) is of no more account.
const watched = 40

// multiples lists the harmonics of nu, cycles a sample, below half the rate.
func multiples(nu float64, most int) []float64 {
	out := []float64{nu}
	for h := 2; h <= most && float64(h)*nu < 0.49; h++ {
		out = append(out, float64(h)*nu)
	}
	return out
}

// mainsBeside lists mains lines, cycles a sample, that a stretch of n samples
// can tell from the lines nus.
func mainsBeside(p *analyze.Pass, nus []float64, rate float64, n int) []float64 {
	if p.MainsHz <= 0 || float64(n)/rate*p.MainsHz < 4 {
		return nil
	}
	var out []float64
	for k := 1; k <= 10; k++ {
		nu := float64(k) * p.MainsHz / rate
		ok := nu < 0.45
		for _, v := range nus {
			ok = ok && math.Abs(v-nu)*float64(n) > 1.2
		}
		if ok {
			out = append(out, nu)
		}
	}
	return out
}

// line is one phasor with what is known of its error.
type line struct {
	z     complex128 // peak, at the middle
	share float64    // mean square of its error
	dof   float64
	stepU float64 // what converter steps add to |z|
	ok    bool
}

// fitLines fits lines nus, of which the first wanted ones are read, and mains
// lines beside them to y, which is spent. step is the converter's.
func fitLines(y, nus, mains []float64, wanted int, step float64) []line {
	out := make([]line, wanted)
	all := append(append([]float64(nil), nus...), mains...)
	sv, err := sinefit.NewSolver(all, len(y))
	if err != nil && len(mains) > 0 {
		all = nus
		sv, err = sinefit.NewSolver(all, len(y))
	}
	if err != nil {
		return out
	}
	fit := sv.Block(y)
	sinefit.Subtract(y, fit.DC, all, fit.Z)
	power := 0.0
	for _, v := range y {
		power += v * v
	}
	n := float64(len(y))
	stepU := 0.0
	if step > 0 && math.Sqrt(power/n) < 0.45*step {
		stepU = step / 4 / math.Sqrt(3) // as package stage has it
	}
	for i := range out {
		out[i] = line{z: fit.Z[i], stepU: stepU, ok: true}
		out[i].share, out[i].dof = beside(y, nus[i], all)
		out[i].share *= math.Max(1, fit.Gain[i]*n/2)
	}
	return out
}

// parts is how many parts of a stretch are joined to look beside a line.
const parts = 32

// beside reads the noise of a line from what the fit left: the mean of the
// squared phasors 2 to 6 resolution steps to both sides, clear of other
// fitted lines; those of the noise at the line itself have the same mean. The
// phasors at the line over 32 parts, transformed once more, give all of them,
// lowered by the sinc of a part's length.
func beside(left []float64, nu float64, fitted []float64) (share, dof float64) {
	n := float64(len(left))
	var z [parts]complex128
	var at [parts]float64 // middle of a part from that of the whole, samples
	one := []float64{nu}
	for b := range z {
		lo, hi := len(left)*b/parts, len(left)*(b+1)/parts
		if hi <= lo {
			return 0, 0
		}
		at[b] = float64(lo+hi-1)/2 - (n-1)/2
		sinefit.Sums(left[lo:hi], one, z[b:b+1], nil)
		z[b] *= sinefit.Phasor(-sinefit.Turns(nu, at[b]))
	}
	sum, count := 0.0, 0.0
	for k := -6.0; k <= 6; k++ {
		v := nu + k/n
		clear := math.Abs(k) >= 2 && v > 0.5/n && v < 0.5-0.5/n
		for _, f := range fitted {
			clear = clear && math.Abs(f-v) > 0.9/n
		}
		if !clear {
			continue
		}
		var s complex128
		for b := range z {
			s += z[b] * turnsOf(-k*at[b]/n)
		}
		x := math.Pi * k / parts
		droop := math.Sin(x) / x
		sum += abs2(s) * 4 / (n * n) / (droop * droop)
		count++
	}
	if count > 0 {
		return sum / count, 2 * count
	}
	power := 0.0
	for _, v := range left {
		power += v * v
	}
	return 4 * power / (n * n), 2 * n
}

// set puts the quotient of two lines into a point.
func (q *Point) set(Y, X line) {
	if !Y.ok || !X.ok || X.z == 0 || Y.z == 0 {
		q.Why = "cannot be told from other lines"
		return
	}
	q.H = Y.z / X.z
	ry, rx := Y.share/2/abs2(Y.z), X.share/2/abs2(X.z)
	q.U = math.Sqrt(ry + rx)
	// Welch and Satterthwaite.
	if v := ry*ry/math.Max(Y.dof, 1) + rx*rx/math.Max(X.dof, 1); v > 0 {
		q.Dof = (ry + rx) * (ry + rx) / v
	}
	q.StepU = math.Hypot(Y.stepU/cmplx.Abs(Y.z), X.stepU/cmplx.Abs(X.z))
	q.Share = Y.share / abs2(X.z)
	q.Coherence = 1 / (1 + ry + rx)
}

// multitone is the curve of lines that sound together. Their frequencies are
// refined in one block of the input, then the blocks' phasors give H_k =
// sum Y conj(X)/sum |X|^2, which a slow drift of the two clocks leaves alone.
func multitone(p *analyze.Pass, out, in *analyze.Signal, sh *Shape) *Curve {
	c := &Curve{Kind: Multitone, Out: out, In: in}
	rate := out.RateHz
	from, to := sh.From, sh.To
	if from > 0 { // it begins in the take: let the unit settle
		from += int(math.Min(0.5*rate, 0.1*float64(to-from))) + int(guardS*rate)
	}
	if to < out.Len() {
		to -= int(guardS * rate)
	}
	gap := math.Inf(1)
	for i := 1; i < len(sh.Lines); i++ {
		gap = math.Min(gap, sh.Lines[i]-sh.Lines[i-1])
	}
	block := min(to-from, int(math.Max(2, 4/gap)*rate))
	count := max(1, (to-from)/block)
	block = (to - from) / count
	x, y := make([]float64, block), make([]float64, block)
	in.Read(x, from+(count/2)*block)
	var combs []sinefit.Comb
	for _, hz := range sh.Lines {
		combs = append(combs, sinefit.Comb{Nu: hz / rate, Orders: []float64{1}, Free: true})
	}
	nus := make([]float64, len(combs))
	r, err := sinefit.Refine(x, combs, 0.6/float64(block))
	for i := range nus {
		nus[i] = sh.Lines[i] / rate
		if err == nil {
			nus[i] = r.Nu[i]
		}
	}
	mains := mainsBeside(p, nus, rate, block)
	type sums struct {
		yx   complex128
		xx   float64
		Y, X line
		ok   bool
	}
	all := make([]sums, len(nus))
	for m := 0; m < count; m++ {
		at := from + m*block
		in.Read(x, at)
		out.Read(y, at)
		X := fitLines(x, nus, nil, len(nus), in.Step)
		Y := fitLines(y, nus, mains, len(nus), out.Step)
		for i := range all {
			s := &all[i]
			s.yx += Y[i].z * cmplx.Conj(X[i].z)
			s.xx += abs2(X[i].z)
			s.X.share, s.Y.share = s.X.share+X[i].share, s.Y.share+Y[i].share
			s.X.dof, s.Y.dof = s.X.dof+X[i].dof, s.Y.dof+Y[i].dof
			s.X.stepU, s.Y.stepU = math.Max(s.X.stepU, X[i].stepU), math.Max(s.Y.stepU, Y[i].stepU)
			s.ok = (m == 0 || s.ok) && X[i].ok && Y[i].ok
		}
	}
	M := float64(count)
	for i, s := range all {
		q := Point{Hz: nus[i] * rate, FromS: out.StartS + float64(from)/rate, ToS: out.StartS + float64(to)/rate}
		size := math.Sqrt(s.xx / M)
		s.X.z = complex(size, 0)
		s.Y.z = s.yx / complex(M*size, 0)
		s.X.share, s.Y.share = s.X.share/M/M, s.Y.share/M/M
		s.X.ok, s.Y.ok = s.ok, s.ok
		q.set(s.Y, s.X)
		c.Points = append(c.Points, q)
	}
	c.LowHz, c.HighHz = nus[0]*rate, nus[len(nus)-1]*rate
	c.finish()
	return c
}
