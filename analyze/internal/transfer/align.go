package transfer

import (
	"fmt"
	"math"

	"benchslip/analyze"
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
	al.start = coarse(out, ref, sh)
	c, bad := al.settle(p, out, ref, sh.Kind)
	if bad != nil {
		return nil, bad
	}
	c.Stated = true
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
