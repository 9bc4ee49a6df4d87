package transfer

import (
	"fmt"

	"benchslip/analyze"
)

// Of is the transfer function of a role's take from its `in`, or the stated
// stimulus, to its `out`, found once a pair of channels.
func Of(p *analyze.Pass, t *analyze.Take, role string) (*Curve, *analyze.Refusal) {
	out, bad := p.SignalOf(t, role, "out")
	if bad != nil {
		return nil, bad
	}
	if p.Wiring(t).In == "" {
		return stated(p, t, out)
	}
	in, bad := p.SignalOf(t, role, "in")
	if bad != nil {
		return nil, bad
	}
	c, bad := Between(p, out, in)
	if bad != nil {
		return nil, bad
	}
	return c, c.empty()
}

// empty refuses a curve without a point that counts.
func (c *Curve) empty() *analyze.Refusal {
	if len(c.Used()) > 0 {
		return nil
	}
	return &analyze.Refusal{Code: analyze.NotEnoughPoints,
		Text:   fmt.Sprintf("take %q: no frequency of the %s stands out of the noise in the output", c.Out.Take.Name, c.Kind),
		Advice: "check the wiring, or raise the level"}
}

// Between is the transfer function from one channel to another of a take;
// none of its points need count.
func Between(p *analyze.Pass, out, in *analyze.Signal) (*Curve, *analyze.Refusal) {
	type found struct {
		c   *Curve
		bad *analyze.Refusal
	}
	f := p.Stages.Once(fmt.Sprintf("transfer/%s/%s/%g", out.ID(), in.ID(), p.MainsHz), func() any {
		c, bad := between(p, out, in)
		return found{c, bad}
	}).(found)
	return f.c, f.bad
}

func between(p *analyze.Pass, out, in *analyze.Signal) (*Curve, *analyze.Refusal) {
	sh := ShapeOf(p, in)
	var c *Curve
	switch sh.Kind {
	case "":
		return nil, &analyze.Refusal{Code: analyze.NoSignal,
			Text:   fmt.Sprintf("take %q, channel %d: the stimulus is silent", in.Take.Name, in.Channel()),
			Advice: "check the connection and the channel, and record again"}
	case Tone:
		return nil, &analyze.Refusal{Code: analyze.NotEnoughPoints,
			Text:   fmt.Sprintf("take %q, channel %d: the stimulus is one tone at %.5g Hz", in.Take.Name, in.Channel(), sh.Steps[0].Hz),
			Advice: "play a sweep, stepped tones, a multitone or steady noise"}
	case Steps:
		c = stepped(p, out, in, sh)
	case Multitone:
		c = multitone(p, out, in, sh)
	default:
		var bad *analyze.Refusal
		if c, bad = broadband(out, in, sh); bad != nil {
			return nil, bad
		}
	}
	for _, s := range []*analyze.Signal{out, in} {
		if err := s.Err(); err != nil {
			return nil, &analyze.Refusal{Code: analyze.Unreadable, Text: fmt.Sprintf("take %q: %v", s.Take.Name, err), Advice: "replace the file"}
		}
	}
	return c, nil
}
