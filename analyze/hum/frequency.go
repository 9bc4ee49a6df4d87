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
// The track of a comb minds all orders, the high ones most. Where their phases
// wander, it follows them and the fundamental turns against it; the
// fundamental is the supply's own, so its turning from the first block to the
// last corrects the mean.
func frequency(l *stage.Lines) (hz, u float64) {
	hz, u = l.MainsHz, stage.MainsHzU(l)
	M := len(l.Blocks)
	if M < 3 || len(l.Mains) == 0 || l.Mains[0].Dropped || l.Mains[0].Power < 20*l.Mains[0].Share {
		return hz, u
	}
	q := l.Mains[0]
	phase := unwrapped(q.Blocks)
	T := (l.Blocks[M-1].Middle() - l.Blocks[0].Middle()) / l.Sig.RateHz
	turned := phase[M-1] - phase[0]
	// Each phase scatters by sqrt(s/2P) rad.
	noise := math.Sqrt(q.Share / q.Power)
	if math.Abs(turned) < 3*noise {
		return hz, u
	}
	// What the half blocks at both ends may add: as much as the phase's steps
	// depart from its mean step.
	v := 0.0
	for m := 1; m < M; m++ {
		d := phase[m] - phase[m-1] - turned/float64(M-1)
		v += d * d / float64(M-1)
	}
	return hz + turned/(2*math.Pi*T), math.Hypot(noise, math.Sqrt(v)) / (2 * math.Pi * T)
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
