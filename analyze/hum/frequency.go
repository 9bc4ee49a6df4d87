package hum

import (
	"fmt"
	"math"
	"math/cmplx"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
	"benchslip/analyze/stage"
)

var mainsFrequency = &analyze.Measure{
	Name:  "mains_frequency",
	Title: "frequency of the mains",
	Doc: "Mean of the mains frequency over the span, from all orders that stand out of the noise, followed in blocks of about 1 s; from the fundamental alone " +
		"where the phases of harmonics wander against it.",
	Formula:  "common frequency of the comb, least squares",
	Standard: "EN 50160 (what supplies may do)",
	Unit:     "Hz",
	Roles:    []string{"take"},
	Run:      runMainsFrequency,
}

func runMainsFrequency(p *analyze.Pass) analyze.Result {
	s, bad := p.Signal("take", "out")
	if bad != nil {
		return analyze.RefuseWith(hertz, bad)
	}
	r, bad := read(p, "take", s, 0)
	if bad != nil {
		return analyze.RefuseWith(hertz, bad)
	}
	l := r.Lines
	if r.supply != nil {
		l = r.supply.Lines // a reference shows the frequency best
	}
	if c := r.sum(0, familyOrders, nil, nil); !l.MainsFound || r.supply == nil && !c.seen {
		return analyze.Refuse(hertz, analyze.BelowDetection, fmt.Sprintf("no mains line of take %q stands out of the noise", s.Take.Name),
			"lay an insulated wire beside a mains lead and record that on a second channel, named with `mains`; never connect anything to the mains")
	}
	f, u := frequency(l)
	var b budget.Budget
	b.A("noise and wander of the lines", u, 0)
	b.Clock(s, f)
	res := analyze.Result{Value: &f, Unit: hertz}
	b.Into(&res)
	low, high := f, f
	_, hz := overTime(l)
	for _, v := range hz {
		low, high = math.Min(low, v), math.Max(high, v)
	}
	res.Details = map[string]any{"mains_hz": f, "wander_hz": l.MainsTrack.Spread * s.RateHz, "lowest_hz": low, "highest_hz": high, "span_s": spanOf(s)}
	if other := unlike(p, r); other != nil {
		res.Flags = append(res.Flags, *other)
	}
	res.Figures = []analyze.Figure{frequencyFigure(r), stage.SpectrumFigure(p, l)}
	return res
}

// frequency is the mean mains frequency over the span and its standard
// uncertainty, the time base's left out.
//
// The track of a comb holds the frequencies of its blocks; phases tell the mean
// better. What an order h with phasors turned back by the track still turns
// from the first block to the last, psi, corrects the mean by psi/(2 pi h T),
// with a variance of s/P over (2 pi h T)^2 (s the noise share of a block).
// Orders that keep step are averaged by their weights. Where they do not, the
// phases of harmonics wander; the fundamental is then the supply's own.
func frequency(l *stage.Lines) (hz, u float64) {
	if l.MainsTrack == nil {
		return l.MainsHz, 0
	}
	hz, u = l.MainsTrack.MeanNu()*l.Sig.RateHz, stage.MainsHzU(l)
	M := len(l.Blocks)
	if M < 3 || !l.MainsFound {
		return hz, u
	}
	T := (l.Blocks[M-1].Middle() - l.Blocks[0].Middle()) / l.Sig.RateHz
	var orders []turning
	for _, q := range l.Mains {
		if q.Dropped || q.Power < 20*q.Share {
			continue
		}
		per := 2 * math.Pi * float64(q.Order) * T
		o := turning{order: q.Order, u: math.Sqrt(q.Share/q.Power) / per, path: unwrapped(q.Blocks)}
		for m := range o.path {
			o.path[m] /= per
		}
		orders = append(orders, o)
	}
	if len(orders) == 0 {
		return hz, u
	}
	mean, chi := average(orders)
	dof := float64(len(orders) - 1)
	if chi > dof+4*math.Sqrt(2*dof)+4 {
		if orders[0].order == 1 {
			mean = orders[0]
		} else {
			mean.u *= math.Sqrt(chi / dof)
		}
	}
	// Both ends go on for half a block with the turning of the blocks there,
	// which scatters by sqrt(2.5) of the ends themselves, and by what bends.
	step := func(m int) float64 { return mean.path[m] - mean.path[m-1] }
	turned := mean.path[M-1] - mean.path[0] + (step(1)+step(M-1))/2
	bend := 0.0
	for m := 2; m < M; m++ {
		d := step(m) - step(m-1)
		bend += d * d / float64(M-2)
	}
	// The track's own ends rest on the frequencies of single blocks.
	ends := 2 * u / math.Sqrt(float64(M))
	span := l.Sig.DurationS()
	return hz + turned*T/span, math.Hypot(ends, math.Hypot(1.6*mean.u, math.Sqrt(bend))*T/span)
}

// turning is what an order says of the mean frequency: its phase over order
// and 2 pi T at each block, Hz, and the uncertainty of last less first.
type turning struct {
	order int
	u     float64
	path  []float64
}

// average is the weighted mean of turnings and the chi-square of their ends
// about it.
func average(list []turning) (mean turning, chi float64) {
	mean.path = make([]float64, len(list[0].path))
	weight := 0.0
	for _, o := range list {
		w := 1 / (o.u * o.u)
		weight += w
		for m, x := range o.path {
			mean.path[m] += w * (x - o.path[0])
		}
	}
	for m := range mean.path {
		mean.path[m] /= weight
	}
	mean.u = 1 / math.Sqrt(weight)
	last := len(mean.path) - 1
	for _, o := range list {
		d := (o.path[last] - o.path[0] - mean.path[last]) / o.u
		chi += d * d
	}
	return mean, chi
}

// unwrapped are the phases of successive phasors in rad, without jumps.
func unwrapped(z []complex128) []float64 {
	out := make([]float64, len(z))
	for i, v := range z {
		out[i] = cmplx.Phase(v)
		if i > 0 {
			out[i] = out[i-1] + math.Remainder(out[i]-out[i-1], 2*math.Pi)
		}
	}
	return out
}

// overTime is the mains frequency at the blocks' middles, s on the take's own
// time axis and Hz, the fundamental's turning against the track included where
// it stands well out of the noise.
func overTime(l *stage.Lines) (at, hz []float64) {
	M := len(l.Blocks)
	var turn []float64
	if len(l.Mains) > 0 && !l.Mains[0].Dropped && l.Mains[0].Power > 1000*l.Mains[0].Share && M >= 3 {
		turn = unwrapped(l.Mains[0].Blocks)
	}
	for m, b := range l.Blocks {
		f := l.MainsTrack.NuAt(b.Middle()) * l.Sig.RateHz
		if turn != nil {
			from, to := max(m-1, 0), min(m+1, M-1)
			f += (turn[to] - turn[from]) / (2 * math.Pi) / (l.Blocks[to].Middle() - l.Blocks[from].Middle()) * l.Sig.RateHz
		}
		at = append(at, l.Sig.StartS+b.Middle()/l.Sig.RateHz)
		hz = append(hz, f)
	}
	return at, hz
}
