package hum

import (
	"fmt"
	"math"

	"benchslip/analyze"
	"benchslip/analyze/stage"
	"benchslip/capture/unit"
)

// added is what a cable run adds to the hum of its receiver, as voltage at the
// recorder. R and B are the phasors of an order in the take of the run and in
// that of the baseline.
//
// With a mains reference in both takes each is turned back by order times the
// phase of the reference's fundamental, block by block, and averaged; they then
// subtract as complex numbers. Without one only |R-B| .. |R|+|B| is known.
type added struct {
	value     float64    // RMS: root of the sum of |R-B|^2, or of max(R, B)^2
	low, high float64    // range without phases; value, value with them
	phases    bool       // the phases are known
	noise     float64    // standard uncertainty of value from noise
	lost      float64    // what phases that wander may hide, RMS to be added
	drift     float64    // relative change of the reference's level between the takes
	base      float64    // RMS of the baseline's counted orders
	run       float64    // RMS of the run's
	seen      bool       // with phases: an order's difference stands out of the noise
	orders    []addOrder // those above threshold in either take
	why       string     // why phases are not known
}

type addOrder struct {
	order          int
	hz             float64
	run, base      float64 // RMS
	add, low, high float64
}

// coherent is the mean peak phasor of an order, turned by its track, and the
// noise share of its power.
func (r *reading) coherent(q stage.Line) (z complex128, share float64) {
	z = q.Z
	if n := len(q.Parts); n > 0 {
		sum := complex(0, 0)
		for _, v := range q.Parts {
			sum += v
		}
		z = sum / complex(float64(n), 0)
	}
	return z, q.Dens / r.Sig.DurationS()
}

// add compares the orders 1 .. top of a run with its baseline.
func add(run, base *reading, top int) added {
	a := added{phases: run.supply != nil && base.supply != nil}
	switch {
	case run.supply == nil:
		a.why = fmt.Sprintf("take %q has no mains reference", run.Sig.Take.Name)
	case base.supply == nil:
		a.why = fmt.Sprintf("take %q has no mains reference", base.Sig.Take.Name)
	}
	if a.phases {
		r, okR := run.supply.order(1)
		b, okB := base.supply.order(1)
		if !okR || !okB || !shows(run.supply, r) || !shows(base.supply, b) {
			a.phases, a.why = false, "the mains reference does not show the fundamental"
		} else {
			a.drift = math.Abs(r.RMS()/b.RMS() - 1)
		}
	}
	var sum, low, high, variance, lost, sumR, sumB float64
	for _, q := range run.Mains {
		if q.Order > top || q.Dropped {
			continue
		}
		b, ok := base.order(q.Order)
		seen := stage.MainsDetected(run.Lines, q, top)
		if !ok || !seen && !stage.MainsDetected(base.Lines, b, top) {
			continue
		}
		o := addOrder{order: q.Order, hz: q.Hz, run: q.RMS(), base: b.RMS()}
		sumR += q.Power
		sumB += b.Power
		if a.phases {
			zr, sr := run.coherent(q)
			zb, sb := base.coherent(b)
			d := abs2(zr-zb)/2 - sr - sb
			sum += d
			s := sr + sb
			variance += 2*math.Max(d, 0)*s + s*s
			a.seen = a.seen || d+s > s*math.Log(float64(2*top)/stage.FalseAlarm)
			lost += math.Max(0, q.Power-abs2(zr)/2+sr-q.U) + math.Max(0, b.Power-abs2(zb)/2+sb-b.U)
			o.add = math.Sqrt(math.Max(d, 0))
			o.low, o.high = o.add, o.add
		} else {
			o.low, o.high = math.Abs(o.run-o.base), o.run+o.base
			o.add = math.Max(o.run, o.base)
			sum += o.add * o.add
			variance += math.Max(q.U, b.U) * math.Max(q.U, b.U)
		}
		low += o.low * o.low
		high += o.high * o.high
		a.orders = append(a.orders, o)
	}
	sum = math.Max(sum, 0)
	a.value, a.low, a.high = math.Sqrt(sum), math.Sqrt(low), math.Sqrt(high)
	a.run, a.base = math.Sqrt(math.Max(sumR, 0)), math.Sqrt(math.Max(sumB, 0))
	if a.phases {
		a.low, a.high = a.value, a.value
		a.lost = math.Sqrt(sum+lost) - a.value
	}
	u := math.Sqrt(variance)
	a.noise = math.Max(a.value-math.Sqrt(math.Max(sum-2*u, 0)), math.Sqrt(sum+2*u)-a.value) / 2
	return a
}

func abs2(z complex128) float64 { return real(z)*real(z) + imag(z)*imag(z) }

// shows: a line stands out of a block's noise.
func shows(r *reading, q stage.Line) bool {
	return stage.MainsDetected(r.Lines, q, 1) && q.Power > 10*q.Share
}

// driftU is the standard uncertainty that the reference's change of level
// brings: the supply, and the receiver's own hum with it, may have changed as
// much (rectangular).
func (a added) driftU() float64 { return a.drift * a.base / math.Sqrt(3) }

// comparable refuses a run and a baseline that were not made alike: same gear,
// same channel, same gain setting.
func comparable(run, base *analyze.Signal) *analyze.Refusal {
	no := func(format string, args ...any) *analyze.Refusal {
		return &analyze.Refusal{Code: analyze.NotApplicable, Text: fmt.Sprintf(format, args...), Advice: "record run and baseline with the same gear, channel and gain"}
	}
	a, b := run.Take, base.Take
	name := func(t *analyze.Take) string {
		if t.Gear == nil {
			return ""
		}
		return t.Gear.Name
	}
	if name(a) != name(b) {
		return no("take %q was recorded with gear %q, take %q with %q", a.Name, name(a), b.Name, name(b))
	}
	if run.Channel() != base.Channel() || run.Minus() != base.Minus() {
		return no("take %q is read on channel %d, take %q on channel %d", a.Name, run.Channel(), b.Name, base.Channel())
	}
	x, okA := a.Condition("gain")
	y, okB := b.Condition("gain")
	switch {
	case okA && okB && !sameValue(x, y):
		return no("take %q was made at gain %s, take %q at %s", a.Name, x, b.Name, y)
	case okA && !okB:
		return no("take %q was made at gain %s, take %q does not state its gain", a.Name, x, b.Name)
	case okB && !okA:
		return no("take %q was made at gain %s, take %q does not state its gain", b.Name, y, a.Name)
	}
	return nil
}

// sameValue compares quantities by value, other texts as they are.
func sameValue(a, b string) bool {
	if a == b {
		return true
	}
	p, errA := unit.Parse(a)
	q, errB := unit.Parse(b)
	return errA == nil && errB == nil && p.Unit.Dim == q.Unit.Dim && math.Abs(p.Linear()-q.Linear()) <= 1e-9*math.Abs(p.Linear())
}

// details lists the comparison, referred by gain g.
func (a added) details(d map[string]any, g float64) {
	var list []map[string]any
	for _, o := range a.orders {
		e := map[string]any{"order": o.order, "frequency_hz": o.hz, "run_v": o.run / g, "baseline_v": o.base / g, "added_v": o.add / g}
		if !a.phases {
			e["low_v"], e["high_v"] = o.low/g, o.high/g
		}
		list = append(list, e)
	}
	d["added"] = list
	d["added_v"], d["run_v"], d["baseline_v"] = a.value/g, a.run/g, a.base/g
	if a.phases {
		d["method"] = "complex difference, phases from the mains reference"
		d["incoherence_v"] = a.lost / g
		d["reference_change_percent"] = 100 * a.drift
	} else {
		d["method"] = "range |R-B| .. R+B, phases not known: " + a.why
		d["added_range_v"] = []float64{a.low / g, a.high / g}
	}
}

// blame answers "cable or receiver?" in one line, with its margin.
func (a added) blame(run, base string) string {
	lowest, highest := a.low, a.high
	if a.phases {
		highest = a.value + a.lost
	}
	spread := 2 * math.Hypot(a.noise, a.driftU())
	lowest, highest = math.Max(lowest-spread, 0), highest+spread
	head := fmt.Sprintf("cable or receiver? take %s adds %s at the recorder, take %s holds %s alone", run, unit.Pretty(a.value, unit.Volt), base, unit.Pretty(a.base, unit.Volt))
	if !a.phases {
		head = fmt.Sprintf("cable or receiver? take %s adds %s .. %s at the recorder, take %s holds %s alone", run, unit.Pretty(a.low, unit.Volt), unit.Pretty(a.high, unit.Volt), base, unit.Pretty(a.base, unit.Volt))
	}
	db := func(x float64) float64 { return 20 * math.Log10(math.Max(x, 1e-30)/math.Max(a.base, 1e-30)) }
	switch {
	case a.base <= 0:
		return head + ": the cable"
	case lowest > a.base:
		return fmt.Sprintf("%s: the cable, by %.1f dB at least", head, db(lowest))
	case highest < a.base:
		return fmt.Sprintf("%s: the receiver, by %.1f dB at least", head, -db(highest))
	}
	return fmt.Sprintf("%s: both alike as far as these takes can tell (%.1f dB)", head, db(a.value))
}

// compareBaseline puts what a run adds to its baseline beside its hum.
func compareBaseline(p *analyze.Pass, run *reading, top int, g stage.Gain, res *analyze.Result) *analyze.Refusal {
	s, bad := p.Signal("baseline", "out")
	if bad != nil {
		return bad
	}
	if bad := comparable(run.Sig, s); bad != nil {
		return bad
	}
	base, bad := read(p, "baseline", s, top)
	if bad != nil {
		return bad
	}
	a := add(run, base, top)
	if len(a.orders) == 0 {
		return &analyze.Refusal{Code: analyze.BelowDetection, Text: "no order stands out of the noise in either take"}
	}
	a.details(res.Details, g.G)
	res.Opinions = append(res.Opinions, a.blame(run.Sig.Take.Name, s.Take.Name))
	return nil
}
