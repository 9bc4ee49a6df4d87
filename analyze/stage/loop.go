package stage

import (
	"fmt"
	"math"
	"math/cmplx"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
)

// A recorder's own harmonics, read from its output played straight into its
// input, add to the unit's as vectors: no power may be taken off. With phases
// known the vectors are subtracted; without, the unit's lie between the
// difference and the sum of the two sizes: 20 dB apart +0.83 and -0.92 dB,
// 10 dB apart +2.4 and -3.3 dB.

// farEnough is how far the recorder's own harmonics must lie below the reading
// for a full pass, as a ratio (20 dB).
const farEnough = 10

// ownOrder is one harmonic of a take and of its loop, all relative to their
// fundamentals: sizes as ratios, powers as squares of ratios.
type ownOrder struct {
	order int
	hz    float64
	read  float64 // of the take, noise share off
	own   float64 // of the recorder, noise share off
	// Of the difference of the two vectors: power with the shares of both off,
	// its uncertainty, what was read, and both shares.
	diff       Power
	raw, share float64
	// noise is the uncertainty of the recorder's power alone.
	noise float64
}

func (o ownOrder) low() float64  { lo, _ := budget.VectorRange(o.read, o.own); return lo }
func (o ownOrder) high() float64 { _, hi := budget.VectorRange(o.read, o.own); return hi }

// loop is a take held against the recorder's own.
type loop struct {
	orders []ownOrder
	known  bool // both takes have their stimulus beside, so phases can be compared
	lines  *Lines
}

// own is the root of the sum of the recorder's harmonics inside a band.
func (d loop) own(in func(hz float64) bool) float64 {
	sum := 0.0
	for _, o := range d.orders {
		if in == nil || in(o.hz) {
			sum += o.own * o.own
		}
	}
	return math.Sqrt(sum)
}

// loopOrders compares harmonics with those of the take of role "loop". Each is
// turned by its order times the phase of its fundamental at the same input,
// where the recorder bends the wave, and scaled to equal fundamentals.
func loopOrders(p *analyze.Pass, l *Lines, set []Line) (loop, *analyze.Refusal) {
	sig, bad := p.Signal("loop", "out")
	if bad != nil {
		return loop{}, bad
	}
	tn, bad := FindTone(p, l.Tone.Hz, sig)
	if bad != nil {
		return loop{}, bad
	}
	top := 0
	for _, q := range set {
		top = max(top, q.Order)
	}
	own := Decompose(p, sig, Options{Tone: tn, Orders: top})
	if bad := Present(own); bad != nil {
		return loop{}, bad
	}
	d := loop{known: p.Wired("take", "in") && p.Wired("loop", "in"), lines: own}
	for _, q := range set {
		u1 := l.Fundamental().Power
		o := ownOrder{order: q.Order, hz: q.Hz, read: math.Sqrt(math.Max(q.Power, 0) / u1)}
		a := relativeTo(l, q)
		o.share = q.Share / u1
		for _, w := range own.Harm {
			if w.Order != q.Order {
				continue
			}
			w1 := own.Fundamental().Power
			o.own = math.Sqrt(math.Max(w.Power, 0) / w1)
			a -= relativeTo(own, w)
			o.share += w.Share / w1
			o.noise = w.U / w1
		}
		o.raw = abs2(a)
		o.diff.P = o.raw - o.share
		o.diff.U = math.Sqrt(2*math.Max(o.diff.P, 0)*o.share + o.share*o.share)
		d.orders = append(d.orders, o)
	}
	return d, nil
}

// relativeTo is a harmonic's phasor over its fundamental's size, turned back
// by its order times the fundamental's phase.
func relativeTo(l *Lines, q Line) complex128 {
	z := l.Phasor()
	return q.Z * cmplx.Rect(1/cmplx.Abs(z), -float64(q.Order)*cmplx.Phase(z))
}

// near says why a value that the recorder's harmonics reach so near is no full
// pass.
func near(value, own float64) string {
	if own*farEnough <= value {
		return ""
	}
	return fmt.Sprintf("%s: the recorder's own harmonics lie only %.1f dB below the reading, 20 dB are needed", analyze.FloorLimited, 20*math.Log10(value/own))
}

// LoopHarmonics applies `loop` to the root of the sum of harmonics over ref
// (RMS).
func LoopHarmonics(p *analyze.Pass, l *Lines, set []Line, r analyze.Result, ref float64) analyze.Result {
	if !p.Has("loop") {
		return r
	}
	d, bad := loopOrders(p, l, set)
	if bad != nil {
		return analyze.RefuseWith(r.Unit, bad)
	}
	scale := math.Sqrt(l.Fundamental().Power) / ref
	own := d.own(nil) * scale
	list := []map[string]any{}
	for _, o := range d.orders {
		list = append(list, map[string]any{"order": o.order, "relative": o.read, "recorder": o.own, "low": o.low(), "high": o.high()})
	}
	r.Details["loop"] = list
	r.Details["loop_take"] = p.Take("loop").Name
	if r.Refusal != nil && r.Refusal.Code != analyze.BelowDetection || r.Value == nil && !d.known {
		// What may hide behind the recorder's own is as large as that.
		r.Details["loop_method"] = "added to the bound"
		return loosen(r, own)
	}
	if d.known {
		r.Details["loop_method"] = "vector difference, phases known"
		return d.difference(l, r, scale, ref)
	}
	r.Details["loop_method"] = "range, phases unknown"
	var low, high float64
	for _, o := range d.orders {
		low += o.low() * o.low()
		high += o.high() * o.high()
	}
	r.Interval = &[2]float64{math.Sqrt(low) * scale, math.Sqrt(high) * scale}
	r.Conditional = near(*r.Value, own)
	return r
}

// loosen adds to an upper bound.
func loosen(r analyze.Result, by float64) analyze.Result {
	if r.Bound != nil {
		v := r.Bound.Value + by
		r.Bound = &analyze.Bound{Upper: true, Value: v}
		r.Details["upper_bound"] = r.Unit.FromLinear(v)
	}
	return r
}

// difference puts the size of the vector differences into a result, or its
// bound where none stands out of the noise of both takes.
func (d loop) difference(l *Lines, r analyze.Result, scale, ref float64) analyze.Result {
	var sum Power
	read, seen := 0.0, false
	var shares []float64
	for _, o := range d.orders {
		sum = sum.Plus(o.diff)
		read += o.raw
		shares = append(shares, o.share)
		seen = seen || o.raw > o.share*math.Log(float64(len(d.orders))/FalseAlarm)
	}
	steps := math.Hypot(StepU(l), StepU(d.lines)*math.Sqrt(l.Fundamental().Power/d.lines.Fundamental().Power)) / math.Sqrt2 / ref
	r.Value, r.Budget, r.Refusal, r.Bound, r.Interval = nil, nil, nil, nil, nil
	delete(r.Details, "upper_bound")
	if !seen || sum.P <= 0 {
		bound, ok := budget.UpperBoundOf(read, shares, 0.95)
		if !ok {
			bound = budget.SumThreshold(shares, FalseAlarm)
		}
		v := bound*scale + 2*steps
		r.Bound = &analyze.Bound{Upper: true, Value: v}
		r.Details["upper_bound"] = r.Unit.FromLinear(v)
		r.Refusal = &analyze.Refusal{Code: analyze.BelowDetection, Text: "what is left beside the recorder's own harmonics does not stand out of the noise",
			Advice: fmt.Sprintf("record both takes longer: %.3g s halve the bound", 4*l.Sig.DurationS())}
		return r
	}
	v := math.Sqrt(sum.P) * scale
	r.Value = &v
	var b budget.Budget
	b.A("noise at the harmonics of take and loop", sum.U/(2*math.Sqrt(sum.P))*scale, 0)
	b.B("converter steps", steps)
	b.A("noise at the fundamental", v*NoiseU(l), 0)
	r.Budget = b.Lines
	return r
}

// loopResidual applies `loop` to the harmonic part of a THD+N or SINAD.
func loopResidual(p *analyze.Pass, l *Lines, b Band, rest Power, fundamental float64, r analyze.Result, value func(float64) float64) analyze.Result {
	if !p.Has("loop") || r.Value == nil {
		return r
	}
	d, bad := loopOrders(p, l, l.Harm[1:])
	if bad != nil {
		return analyze.RefuseWith(r.Unit, bad)
	}
	r.Details["loop_take"] = p.Take("loop").Name
	least := 1e-9 * rest.P // what the roots below can take
	if d.known {
		r.Details["loop_method"] = "vector difference, phases known"
		left, more := rest.P, 0.0
		for _, o := range d.orders {
			if b.InLine(o.hz) {
				left += fundamental * (o.diff.P - o.read*o.read)
				more = math.Hypot(more, fundamental*math.Hypot(o.noise, math.Sqrt(2*math.Max(o.diff.P, 0)*o.share)))
			}
		}
		left = math.Max(left, math.Max(least, rest.U/2))
		v := value(left)
		grow := 1.0
		if rest.U > 0 {
			grow = v / *r.Value * rest.P / left * math.Hypot(rest.U, more) / rest.U
		}
		for i := range r.Budget {
			r.Budget[i].U *= grow
		}
		r.Value = &v
		return r
	}
	r.Details["loop_method"] = "range, phases unknown"
	low, high := rest.P, rest.P
	for _, o := range d.orders {
		if b.InLine(o.hz) {
			low += fundamental * (o.low()*o.low() - o.read*o.read)
			high += fundamental * (o.high()*o.high() - o.read*o.read)
		}
	}
	x, y := value(math.Max(low, least)), value(high)
	r.Interval = &[2]float64{math.Min(x, y), math.Max(x, y)}
	r.Conditional = near(math.Sqrt(rest.P), d.own(b.InLine)*math.Sqrt(fundamental))
	return r
}
