package budget

import (
	"fmt"
	"math"

	"benchslip/analyze"
)

// The calibration of gear is one relative error of all its volts, whatever
// the channel; a channel with an entry of its own has an error of its own.
// Between channels that share an error stands channel_match m: each channel
// deviates from the common scale by m/sqrt 2, so that two differ by m. All of
// these are shared by every value read through the same channel, and signs
// make them cancel in quotients and differences.

// leg is one channel of a signal: V for a single one, half of it each for a
// difference, as on a balanced line.
type leg struct {
	channel  int
	gear     *analyze.Gear
	fraction float64
	sign     int // of the channel's own volts in the signal
}

func legs(sig *analyze.Signal) []leg {
	if sig.Minus() == 0 {
		return []leg{{sig.Channel(), sig.Gear, 1, 1}}
	}
	other := sig.Gear
	if sig.Take.Gear != nil {
		other = sig.Take.Gear.For(sig.Minus())
	}
	return []leg{{sig.Channel(), sig.Gear, 0.5, 1}, {sig.Minus(), other, 0.5, -1}}
}

// part is a leg with its place in a result: value is the sensitivity of the
// result to a relative error of the leg's volts.
type part struct {
	words, source, key string // of the scale error
	match              string // source of the channel's deviation from the shared scale
	channel            int
	gear               *analyze.Gear
	value              float64
}

func parts(sig *analyze.Signal, value float64) []part {
	var out []part
	for _, l := range legs(sig) {
		p := part{channel: l.channel, gear: l.gear, value: value * l.fraction}
		name := gearName(sig)
		switch {
		case sig.Take.Gear == nil:
			// Takes without gear come from one unnamed instrument of a kind.
			p.words, p.source, p.key = "calibration", "unnamed "+l.gear.Kind+" scale", "takes."+sig.Take.Name+".gear"
		case l.gear.OwnScale:
			p.words = fmt.Sprintf("calibration of %s, channel %d", name, l.channel)
			p.source = fmt.Sprintf("gear %s channel %d scale", name, l.channel)
			p.key = fmt.Sprintf("gear.%s.channel.%d.uncertainty", name, l.channel)
		default:
			p.words, p.source, p.key = "calibration of "+name, "gear "+name+" scale", "gear."+name+".uncertainty"
		}
		p.match = fmt.Sprintf("gear %s channel %d match", name, l.channel)
		out = append(out, p)
	}
	return out
}

// Scale adds the calibration of the gear to a result in V (or any power of
// it). Signals in fractions of full scale have no calibration. A scale
// uncertainty that nobody stated goes to Lacking under its job key.
func (b *Budget) Scale(sig *analyze.Signal, value float64) {
	if sig.Unit == "V" {
		b.calibrations(parts(sig, value))
	}
}

// Ratio adds what is left of the calibrations in a quotient num/den of value
// value: nothing for one channel read twice, channel_match for two channels of
// one scale, both calibrations where gear or entries differ.
func (b *Budget) Ratio(num, den *analyze.Signal, value float64) {
	b.calibrations(append(parts(num, value), parts(den, -value)...))
}

func (b *Budget) calibrations(all []part) {
	var lines Budget
	net := map[string]float64{}
	for _, p := range all {
		net[p.source] += p.value
	}
	for _, p := range all {
		switch {
		case math.Abs(net[p.source]) < 1e-12*math.Abs(p.value): // cancels
		case p.gear.ScaleU == nil:
			b.Lacking = once(b.Lacking, p.key)
		default:
			lines.Shared(p.words, p.source, *p.gear.ScaleU*p.value)
		}
		for _, q := range all {
			if q.source == p.source && q.channel != p.channel {
				lines.Shared(fmt.Sprintf("match of channel %d", p.channel), p.match, p.gear.ChannelMatch/math.Sqrt2*p.value)
				break
			}
		}
	}
	b.Lines = append(b.Lines, cancelled(lines.Lines)...)
}
