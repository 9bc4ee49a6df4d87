package plan

import (
	"fmt"
	"math"

	"benchslip/analyze"
	"benchslip/capture/recording"
)

// The cautions of the trade, each before the step it belongs to. They say what
// to mind and leave the rest to local codes and to people licensed for it.
// None ever suggests taking a protective earth off.
const (
	cautionMains   = "Mains: isolate before touching, let reservoir capacitors discharge, keep one hand away. Work on mains wiring belongs to licensed people; local codes hold."
	cautionEarth   = "Every protective earth stays connected, on the unit and on the instruments. Break a hum loop in the signal path instead: a transformer, a balanced input, a recorder on battery."
	cautionFirst   = "First power-up goes through a current limit (a limited bench supply, a series lamp, safety resistors in the rails): watch current and rails before anything else is connected."
	cautionPhantom = "Phantom power off, wait 30 s, and see with a meter that pins 2 and 3 hold less than 0.5 V against pin 1 before a recorder, a scope, a generator or a transformer goes on."
	cautionClip    = "The clip of a scope probe is earth: it goes on a point that is at earth already. A bridged output has no such terminal: two probes, and their difference."
	cautionWire    = "Never connect a recorder to the mains. The mains reference is insulated wire laid beside a lead; nothing is opened and no conductor is touched."
	cautionShield  = "Open a shield only on a test lead for audio, never where it is a box's earth."
	cautionQuiet   = "Turn the player down before connecting and raise it while watching the level; keep ears, headphones and loudspeakers off the line."
	cautionEars    = "Ears: no loudspeaker in circuit at full level; where there must be one, turn down first and wear protection."
	cautionOffset  = "No loudspeaker before DC at the output is known to be small."
	cautionPad     = "A speaker stage can exceed a recorder's input: put a pad before it, and count the pad into the gear's full scale."
	cautionBurst   = "Full level for 5 to 10 s, then let it cool; a clip test is a stress test."
	cautionSwitch  = "Keep loudspeakers and headphones off the output while switching the unit or its phantom power."
)

// cautions of one take, in the order in which they are needed.
func (p *planner) cautions(t *analyze.Take, at part) []string {
	f := p.facts(t)
	out := []string{}
	add := func(yes bool, text string) {
		if yes {
			out = appendNew(out, text)
		}
	}
	scope := isScope(t)
	played := p.play[t].file != "" || p.play[t].source != ""
	mains := f.channel("mains") != "" || t.Setup != "" || f.measures("pickup", "hum", "hum_ratio")
	if at == partFloor || at == partLoop {
		add(played, cautionQuiet)
		return out
	}
	add(at == partDC || at == partSwitch, cautionFirst)
	add(at == partDC || at == partSwitch || f.measures("ripple"), cautionMains)
	add(mains || scope || at == partDC, cautionEarth)
	add(f.micInput, cautionPhantom)
	add(scope, cautionClip)
	add(f.channel("mains") != "", cautionWire)
	add(t.Setup == "shield-open", cautionShield)
	add(f.speaker && t.Gear != nil && t.Gear.Kind == recording.Audio, cautionPad)
	add(f.speaker && at == partDC, cautionOffset)
	if w := f.power(); w > 0.05 {
		add(true, fmt.Sprintf("The load takes %s: use a resistor for %s or more, on metal and off the bench top; it gets hot, and its value with it.", watts(w), rating(w)))
	}
	add(at == partFull, cautionBurst)
	add(at == partSwitch, cautionSwitch)
	add(played, cautionQuiet)
	add(f.speaker && played, cautionEars)
	return out
}

// first is what comes before all takes.
func (p *planner) first() []string {
	return []string{
		"Dead tests first, unpowered: continuity, shorts, resistance between the rails.",
		cautionFirst,
		cautionMains,
		cautionEarth,
	}
}

// rating is a usual size of resistor for three times the power, W.
func rating(w float64) string {
	for _, size := range []float64{1, 2, 5, 10, 25, 50, 100, 200, 500, 1000} {
		if size >= 3*w {
			return watts(size)
		}
	}
	return watts(math.Ceil(3*w/1000) * 1000)
}

func watts(w float64) string {
	if w >= 100 {
		return fmt.Sprintf("%.0f W", w)
	}
	return fmt.Sprintf("%.3g W", w)
}
