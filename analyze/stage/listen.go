package stage

import (
	"fmt"
	"math"
	"math/cmplx"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
)

// Heard is a take whose tone was found.
type Heard struct {
	Out, In *analyze.Signal // In nil without a second channel
	Tone    *Tone
	Lo, Li  *Lines
	Steps   int // of the take, one of which was read; 0: not stepped
}

// Listen finds the tone of a role's take: searched in `in` when the take has
// one, else in `out`, and followed in both.
func Listen(p *analyze.Pass, role string, orders int) (*Heard, *analyze.Refusal) {
	return ListenTo(p, p.Take(role), role, orders)
}

// ListenTo is Listen for one of several takes of a role.
func ListenTo(p *analyze.Pass, t *analyze.Take, role string, orders int) (*Heard, *analyze.Refusal) {
	at := 0.0
	if len(p.Params.At) > 0 {
		at = p.Params.At[0]
	}
	return ListenAt(p, t, role, at, orders)
}

// ListenAt is ListenTo with the frequency asked for (0: found). Of a stepped
// take it hears one step.
func ListenAt(p *analyze.Pass, t *analyze.Take, role string, at float64, orders int) (*Heard, *analyze.Refusal) {
	out, in, steps, bad := Channels(p, t, role, at)
	if bad != nil {
		return nil, bad
	}
	h, bad := Hear(p, out, in, at, orders)
	if h != nil {
		h.Steps = steps
	}
	return h, bad
}

// Channels are the `out` and `in` (nil without one) of a take, of a stepped
// one the step that lies at that frequency; steps is their number, 0 for takes
// that are not stepped.
func Channels(p *analyze.Pass, t *analyze.Take, role string, at float64) (out, in *analyze.Signal, steps int, bad *analyze.Refusal) {
	if out, bad = p.SignalOf(t, role, "out"); bad != nil {
		return nil, nil, 0, bad
	}
	search := out
	if p.Wiring(t).In != "" {
		if in, bad = p.SignalOf(t, role, "in"); bad != nil {
			return nil, nil, 0, bad
		}
		search = in
	}
	all := Steps(p, search)
	if len(all) == 0 {
		return out, in, 0, nil
	}
	q, bad := StepFor(search, all, at)
	if bad != nil {
		return nil, nil, 0, bad
	}
	if in != nil {
		in = in.Part(q.From, q.To)
	}
	return out.Part(q.From, q.To), in, len(all), nil
}

// Hear finds the tone in a pair of signals of one take: in `in` where there is
// one (else nil), else in `out`.
func Hear(p *analyze.Pass, out, in *analyze.Signal, at float64, orders int) (*Heard, *analyze.Refusal) {
	h := &Heard{Out: out, In: in}
	var bad *analyze.Refusal
	search, other := h.Out, h.In
	if h.In != nil {
		search, other = h.In, h.Out
	}
	if h.Tone, bad = FindTone(p, at, search, other); bad != nil {
		return nil, bad
	}
	h.Lo = Decompose(p, h.Out, Options{Tone: h.Tone, Orders: orders})
	if bad := Present(h.Lo); bad != nil {
		return nil, bad
	}
	if h.In != nil {
		h.Li = Decompose(p, h.In, Options{Tone: h.Tone, Reference: true})
		if bad := Present(h.Li); bad != nil {
			return nil, bad
		}
	}
	return h, nil
}

// FalseAlarm is the probability that noise passes for a line.
const FalseAlarm = 1e-3

// Present refuses a fundamental that does not stand out of the noise.
func Present(l *Lines) *analyze.Refusal {
	f := l.Fundamental()
	if f == nil || math.IsInf(l.Cond, 0) {
		return &analyze.Refusal{Code: analyze.TooShort,
			Text:   fmt.Sprintf("take %q: the tone cannot be told from its neighbours in %.4g s", l.Sig.Take.Name, l.Sig.DurationS()),
			Advice: fmt.Sprintf("record %.3g s or more", 4*l.Sig.DurationS())}
	}
	read := f.Whole + f.Share
	if read <= 0 || math.Sqrt(read) < budget.ShareThreshold(f.Dens/l.Sig.DurationS(), FalseAlarm) {
		return &analyze.Refusal{Code: analyze.NoTone,
			Text:   fmt.Sprintf("take %q, channel %d: no tone at %.6g Hz stands out of the noise", l.Sig.Take.Name, l.Sig.Channel(), f.Hz),
			Advice: "check the wiring, or raise the level"}
	}
	return nil
}

// NoiseU is the relative standard uncertainty of a fundamental's amplitude
// (and its phase in rad) from noise.
func NoiseU(l *Lines) float64 { return l.PhasorU(l.Fundamental()) / cmplx.Abs(l.Phasor()) }

// RelativeStepU is the relative standard uncertainty that converter steps bring when
// no dither hides them (noise under 0.45 step RMS; triangular dither gives
// 0.5): errors of lines stay within a quarter of a step, taken as
// rectangular.
func RelativeStepU(l *Lines) float64 { return StepU(l) / cmplx.Abs(l.Phasor()) }

// AddTone adds what the reading of one fundamental contributes to a value
// proportional to it.
func AddTone(b *budget.Budget, l *Lines, what string, value float64) {
	b.A("noise in "+what, NoiseU(l)*value, 0)
	b.B("converter steps in "+what, RelativeStepU(l)*value)
	if s := l.ScatterU(); s > 0 {
		b.A("wander of the level in "+what, s*value, float64(len(l.Blocks)-1))
	}
}

// Stimulus is what drove the unit.
type Stimulus struct {
	Z     complex128 // peak phasor; phase only with the same take
	Lines *Lines
	Level float64 // stated RMS, V, instead
}

// Input finds what drove the unit.
func Input(p *analyze.Pass, h *Heard) (Stimulus, *analyze.Refusal) {
	return input(p, p.Take("take"), h)
}

func input(p *analyze.Pass, t *analyze.Take, h *Heard) (Stimulus, *analyze.Refusal) {
	w := p.Wiring(t)
	switch {
	case p.Has("in_take") && t == p.Take("take"):
		other := p.Take("in_take")
		key := "out"
		if p.Wiring(other).In != "" {
			key = "in"
		}
		sig, bad := p.SignalOf(other, "in_take", key)
		if bad != nil {
			return Stimulus{}, bad
		}
		tn, bad := FindTone(p, h.Tone.Hz, sig)
		if bad != nil {
			return Stimulus{}, bad
		}
		if math.Abs(tn.Hz/h.Tone.Hz-1) > 500e-6 {
			return Stimulus{}, &analyze.Refusal{Code: analyze.NoTone,
				Text:   fmt.Sprintf("take %q holds a tone at %.7g Hz, take %q at %.7g Hz: over 500 ppm apart", t.Name, h.Tone.Hz, other.Name, tn.Hz),
				Advice: "record both takes with the same tone"}
		}
		l := Decompose(p, sig, Options{Tone: tn})
		if bad := Present(l); bad != nil {
			return Stimulus{}, bad
		}
		return Stimulus{Z: l.Phasor(), Lines: l}, nil
	case h.In != nil:
		return Stimulus{Z: h.Li.Phasor(), Lines: h.Li}, nil
	case w.InLevel != nil:
		if h.Out.Unit != "V" {
			return Stimulus{}, &analyze.Refusal{Code: analyze.Uncalibrated,
				Text:   fmt.Sprintf("the input level is stated in volts, take %q has no volts at full scale", t.Name),
				Advice: "state full_scale_peak for its gear, or record the input on a second channel"}
		}
		return Stimulus{Level: w.InLevel.Linear()}, nil
	}
	return Stimulus{}, &analyze.Refusal{Code: analyze.MissingTake,
		Text:   fmt.Sprintf("take %q names no input: neither `in`, `in_take` nor `in_level`", t.Name),
		Advice: "record the stimulus on a second channel and name it with `in`, or state `in_level`"}
}

// InputOf is Input for a take of any role: `in` or `in_level`.
func InputOf(p *analyze.Pass, t *analyze.Take, h *Heard) (Stimulus, *analyze.Refusal) {
	return input(p, t, h)
}

// Apart takes the `out` signal of a role's take apart for a measure that needs
// no tone: with its test tone where it has a clear one, found as the tone
// measures find it so that the work is shared, else without.
func Apart(p *analyze.Pass, role string, s *analyze.Signal, mains int) *Lines {
	search, other := s, (*analyze.Signal)(nil)
	if p.Wiring(s.Take).In != "" {
		if in, bad := p.SignalOf(s.Take, role, "in"); bad == nil && in.Len() == s.Len() {
			search, other = in, s
		}
	}
	tone, bad := FindTone(p, 0, search, other)
	if bad != nil && other != nil {
		tone, _ = FindTone(p, 0, s)
	}
	return Decompose(p, s, Options{Tone: tone, Mains: mains})
}
