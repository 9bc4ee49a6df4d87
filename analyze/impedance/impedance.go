// Package impedance finds impedances from level steps: how far the output
// falls when a load is put on it, or when a resistor is put in series with the
// input. A step is the quotient of two readings, and what is left of it after
// 1 is taken off carries all of their noise: small steps make large
// uncertainties, and a step that noise hides gives a bound.
package impedance

import (
	"fmt"
	"math"
	"math/cmplx"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
	"benchslip/analyze/stage"
	"benchslip/capture/unit"
)

var ohm = unit.MustLookup("ohm")

// Measures lists the measures of this package.
func Measures() []*analyze.Measure { return []*analyze.Measure{outputImpedance, inputImpedance} }

// step is U_first/U_second - 1 at one frequency of two takes.
type step struct {
	hz      float64
	r       complex128 // the quotient; real without phases
	phases  bool
	sigma   float64               // standard uncertainty of each part of r from noise
	lines   []analyze.Contributor // budget of |r|
	lacking []string
	first   *stage.Heard
	second  *stage.Heard
	notes   []string
}

// d is r - 1.
func (s *step) d() complex128 { return s.r - 1 }

// size is |d| with the noise's share taken off, and how it compares with what
// noise alone reaches once in a thousand takes. Without phases only the real
// part is known, whose noise has one dimension.
func (s *step) size() (d float64, seen bool) {
	if !s.phases {
		d = real(s.d())
		return d, d > threshold*s.sigma
	}
	share := 2 * s.sigma * s.sigma
	p := abs2(s.d())
	return math.Sqrt(math.Max(p-share, 0)), p > share*math.Log(1/stage.FalseAlarm)
}

// threshold of one real reading for a false alarm of 1e-3 (normal law).
const threshold = 3.09

// upper is the |d| below which it lies with 95 %.
func (s *step) upper() float64 {
	u, _ := budget.Combine(s.lines)
	if !s.phases {
		return math.Max(real(s.d()), 0) + 1.645*u
	}
	share := 2 * s.sigma * s.sigma
	v, ok := budget.UpperBound(abs2(s.d()), share, 1, 0.95)
	if !ok {
		v = budget.ShareThreshold(share, stage.FalseAlarm)
	}
	// What is not noise adds on top.
	rest := math.Sqrt(math.Max(u*u-s.sigma*s.sigma, 0))
	return v + 1.645*rest
}

func abs2(z complex128) float64 { return real(z)*real(z) + imag(z)*imag(z) }

// hearStep reads the tone in two takes. With a shared `in` in both the gains
// are complex and the generator's level cancels; with `in_level` in both it is
// taken out; else it has to be the same in both.
func hearStep(p *analyze.Pass, first, second string) (*step, *analyze.Refusal) {
	a, b := p.Take(first), p.Take(second)
	if a == nil || b == nil {
		return nil, &analyze.Refusal{Code: analyze.MissingTake, Text: fmt.Sprintf("both `%s` and `%s` must name a take", first, second), Advice: "name both in the job"}
	}
	if bad := stage.SameGain(a, b); bad != nil {
		return nil, bad
	}
	at := 0.0
	if len(p.Params.At) > 0 {
		at = p.Params.At[0]
	}
	s := &step{}
	var bad *analyze.Refusal
	if s.first, bad = stage.ListenAt(p, a, first, at, 0); bad != nil {
		return nil, bad
	}
	s.hz = s.first.Tone.Hz
	if s.second, bad = stage.ListenAt(p, b, second, s.hz, 0); bad != nil {
		return nil, bad
	}
	if math.Abs(s.second.Tone.Hz/s.hz-1) > 500e-6 {
		return nil, &analyze.Refusal{Code: analyze.NoTone,
			Text: fmt.Sprintf("takes %q and %q hold tones at %.7g and %.7g Hz: over 500 ppm apart", a.Name, b.Name, s.hz, s.second.Tone.Hz), Advice: "record both with the same tone"}
	}
	if (s.first.Out.Unit == "V") != (s.second.Out.Unit == "V") {
		return nil, &analyze.Refusal{Code: analyze.Uncalibrated, Text: "one of the two takes has no volts at full scale", Advice: "state full_scale_peak for both, or record both with one gear"}
	}
	g, bad := s.reading(p, a, s.first)
	if bad != nil {
		return nil, bad
	}
	h, bad := s.reading(p, b, s.second)
	if bad != nil {
		return nil, bad
	}
	switch {
	case g.phases && h.phases:
		s.phases = true
		s.r = g.z / h.z
	case g.phases != h.phases || g.stated != h.stated:
		return nil, &analyze.Refusal{Code: analyze.MissingTake,
			Text:   fmt.Sprintf("takes %q and %q know their input in different ways", a.Name, b.Name),
			Advice: "give both an `in` channel, both an `in_level`, or neither"}
	default:
		s.r = complex(cmplx.Abs(g.z)/cmplx.Abs(h.z), 0)
		s.notes = append(s.notes, "without a recorded input phases are not known: a reactive part is not seen")
		if !g.stated {
			s.notes = append(s.notes, "assumes the same generator level in both takes")
		}
	}
	size := cmplx.Abs(s.r)
	s.sigma = size * math.Hypot(g.noise, h.noise)
	s.lines = budget.Difference(g.budget.Lines, h.budget.Lines, size/cmplx.Abs(g.z), size/cmplx.Abs(h.z))
	s.lacking = stage.Lacking(g.budget.Lacking, stage.Gain{Budget: h.budget, Cancels: true})
	return s, nil
}

// reading is one take's output, over its input where that is known.
type reading struct {
	z              complex128
	noise          float64 // relative
	phases, stated bool
	budget         budget.Budget
}

func (s *step) reading(p *analyze.Pass, t *analyze.Take, h *stage.Heard) (reading, *analyze.Refusal) {
	var g reading
	g.noise = stage.NoiseU(h.Lo)
	if h.In == nil && p.Wiring(t).InLevel == nil {
		g.z = h.Lo.Phasor()
		v := cmplx.Abs(g.z)
		stage.AddTone(&g.budget, h.Lo, "out", v)
		g.budget.Scale(h.Out, v)
		return g, nil
	}
	in, bad := stage.InputOf(p, t, h)
	if bad != nil {
		return g, bad
	}
	q, bad := stage.GainOfHeard(p, t, h, in)
	if bad != nil {
		return g, bad
	}
	g.budget = q.Budget
	if h.In != nil {
		g.phases, g.z = true, q.Phasor
		g.noise = math.Hypot(g.noise, stage.NoiseU(h.Li))
		return g, nil
	}
	g.stated, g.z = true, complex(q.G, 0)
	return g, nil
}

// describe starts a result with what both measures tell.
func (s *step) describe(p *analyze.Pass) analyze.Result {
	r := analyze.Result{Unit: ohm, Notes: s.notes, Lacking: s.lacking}
	db := unit.MustLookup("dB")
	r.Details = map[string]any{
		"fundamental":  map[string]any{"frequency_hz": s.hz, "rms_v": s.first.Lo.Fundamental().RMS()},
		"level_step":   cmplx.Abs(s.r),
		"step_db":      db.FromLinear(cmplx.Abs(s.r)),
		"phases_known": s.phases,
	}
	if s.phases {
		r.Details["step_deg"] = cmplx.Phase(s.r) * 180 / math.Pi
	}
	r.Figures = append(r.Figures, stage.SpectrumFigure(p, s.first.Lo), stage.SpectrumFigure(p, s.second.Lo))
	return r
}

// parts adds resistance and reactance, and what they amount to in series or
// in parallel.
func parts(r *analyze.Result, z complex128, hz float64) {
	d := r.Details
	w := 2 * math.Pi * hz
	d["resistance_ohm"], d["reactance_ohm"] = real(z), imag(z)
	if imag(z) > 0 {
		d["series_inductance_h"] = imag(z) / w
	} else if imag(z) < 0 {
		d["series_capacitance_f"] = -1 / (w * imag(z))
	}
	if y := 1 / z; z != 0 && real(y) > 0 {
		d["parallel_resistance_ohm"] = 1 / real(y)
		if imag(y) > 0 {
			d["parallel_capacitance_f"] = imag(y) / w
		}
	}
}

// small warns of a step that carries more doubt than it should.
func small(r *analyze.Result, s *step, advice string) {
	u, _ := budget.Combine(r.Budget)
	if r.Value != nil && 2*u > 0.1*math.Abs(*r.Value) {
		r.Notes = append(r.Notes, fmt.Sprintf("the level changes by only %.3g dB, so small errors of either reading weigh much: %s", math.Abs(20*math.Log10(cmplx.Abs(s.r))), advice))
	}
}
