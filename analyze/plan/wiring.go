package plan

import (
	"fmt"
	"math"
	"slices"

	"benchslip/analyze"
	"benchslip/capture/unit"
)

// wiring draws in text what is connected to what for a take: one line a
// connection, signal from left to right, parts in square brackets, remarks in
// round ones.
func (p *planner) wiring(t *analyze.Take, at part) []string {
	f := p.facts(t)
	d := drawing{t: t, uses: p.uses[t], f: f, rec: "recorder"}
	if isScope(t) {
		d.rec = "scope"
	}
	if t.Gear != nil {
		d.rec = t.Gear.Name
	}
	switch {
	case at == partFloor:
		d.line("[plug, 150 ohm]", d.input("out"), "every other input likewise, nothing else connected")
		return d.lines
	case at == partLoop:
		d.line("player, output 1", d.input("out"), "the same leads as for the unit")
		if f.channel("in") != "" {
			d.line("player, output 2", d.input("in"), "")
		}
		return d.lines
	}
	d.drive(p.play[t])
	d.output()
	if m := f.channel("mains"); m != "" {
		d.line("wire laid beside a mains lead --[10 kohm to 0 V]", d.input("mains"), "insulated, a metre or a few turns; nothing touches the mains")
	}
	return d.lines
}

// drawing gathers the lines of one take.
type drawing struct {
	t     *analyze.Take
	uses  []use
	f     facts
	rec   string
	lines []string
}

// line adds "FROM --> TO   (remark)".
func (d *drawing) line(from, to, remark string) {
	s := from + " --> " + to
	if remark != "" {
		s += "   (" + remark + ")"
	}
	d.lines = append(d.lines, s)
}

// input names the recorder's input for a channel key; a difference of two
// channels takes both.
func (d *drawing) input(key string) string {
	c := d.f.channel(key)
	if c == "" {
		c = "1"
	}
	return fmt.Sprintf("%s, channel %s", d.rec, c)
}

// drive draws what comes to the unit's input.
func (d *drawing) drive(s stimulusOf) {
	f := d.f
	player := "player"
	if s.source != "" {
		player = "generator"
	}
	in := f.channel("in")
	pad := "[pad to " + orWords(f.source, "150 ohm") + "]"
	switch {
	case s.file == "" && s.source == "":
		d.quiet()
	case f.role("common"):
		d.line(player+", hot --[75 ohm]", "unit, pin 2", "the two resistors matched within 0.1 %")
		d.line(player+", hot --[75 ohm]", "unit, pin 3", "")
		d.line(player+", return", "unit, pin 1", "")
		if in != "" {
			d.line(player+", hot", d.input("in"), "what drives both pins")
		}
	case f.role("differential"):
		d.line(player+" --"+pad, "unit, pins 2 and 3", "balanced: half the source resistance in each leg")
		d.tap(in)
	case f.role("series_take"):
		d.line(player+" --[series resistor]", "unit, input", "the player at the same level as in the take without the resistor")
		d.tap(in)
	case f.measures("crosstalk"):
		d.line(player, "unit, input of the driven channel", "")
		d.line("[plug, "+orWords(f.source, "150 ohm")+"]", "unit, input of the other channel", "driven by nothing")
	case f.micInput:
		d.line(player+" --"+pad, "unit, pins 2 and 3", "")
		d.tap(in)
	default:
		d.line(player, "unit, input", "")
		d.tap(in)
	}
	if l := d.t.Wiring.InLevel; l != nil {
		d.line("meter, AC", "across the unit's input terminals", "reads "+l.String()+" RMS")
	}
}

// tap draws the second channel at the unit's input.
func (d *drawing) tap(in string) {
	if in == "" {
		return
	}
	what := "unit, input terminals"
	if d.f.micInput {
		what = "unit, pins 2 and 3"
	}
	d.line(what, d.input("in"), "the signal as it enters")
}

// quiet draws an input that nothing drives.
func (d *drawing) quiet() {
	f := d.f
	plug := "[plug, " + orWords(f.source, "150 ohm") + "]"
	switch d.t.Setup {
	case "baseline":
		d.line("[plug, 150 ohm]", "receiver, its own socket", "no cable connected")
	case "end-150":
		d.line("[plug, 150 ohm across pins 2 and 3, pin 1 open]", "far end of the run", "in a shielded plug")
	case "end-short":
		d.line("[plug, pins 2 and 3 joined, pin 1 open]", "far end of the run", "in a shielded plug")
	case "pin1-joined":
		d.line("[plug, 150 ohm across pins 2 and 3, pin 1 to the earth there]", "far end of the run", "as installed")
	case "shield-open":
		d.line("[plug, 150 ohm across pins 2 and 3]", "far end of the run", "")
		d.line("far end of the run --[test lead, shield open at the receiver's end]", "receiver", "audio shield only; no box loses its earth")
	case "loads-on":
		d.line("[plug, 150 ohm across pins 2 and 3]", "far end of the run", "lights, dimmers, motors running")
	default:
		switch {
		case f.role("baseline"):
			d.line("[plug, 150 ohm]", "receiver, its own socket", "no cable connected")
			return
		case f.run:
			d.line("[plug, 150 ohm across pins 2 and 3]", "far end of the run", "in a shielded plug")
			d.line("near end of the run", "receiver, input", "")
			return
		case f.measures("dc", "ripple", "oscillation", "thump") && !f.measures("noise", "ein", "hum"):
			d.line(plug, "unit, input", "input closed, nothing driven")
			return
		}
		d.line(plug, "unit, input", "in a shielded plug, nothing driven")
		return
	}
	if d.t.Setup != "baseline" {
		d.line("near end of the run", "receiver, input", "")
	}
}

// output draws what comes from the unit.
func (d *drawing) output() {
	f := d.f
	scope := isScope(d.t)
	from := "unit, output"
	if d.t.Setup != "" || f.run || f.role("baseline") {
		from = "receiver, output"
	}
	load := f.loadOhm
	if f.role("open") {
		load = 0
	}
	switch {
	case f.role("open"):
		d.line(from, "no load", "nothing but the recorder")
	case load > 0:
		d.line(fmt.Sprintf("%s --[load, %s%s]", from, unit.Pretty(load, unit.Ohm), d.watts()), "unit, output return", "a resistor, no loudspeaker")
	}
	remark := ""
	switch {
	case scope:
		remark = "clip on the unit's 0 V, which is at earth already"
	case f.fullV > 0 && math.Sqrt2*f.askedV > f.fullV:
		from += " --[pad]"
		remark = "the level asked for is above the recorder's full scale"
	case f.speaker && f.fullV == 0:
		from += " --[pad]"
		remark = "a speaker stage can exceed a recorder's input"
	}
	if outs := d.outs(); len(outs) > 1 {
		for _, o := range outs {
			d.line("unit, the point of "+joinWords(o.checks), fmt.Sprintf("%s, channel %s", d.rec, o.channel), remark)
		}
	} else {
		d.line(from, d.input("out"), remark)
	}
	if f.channel("out2") != "" {
		d.line("second "+from, d.input("out2"), "")
	}
	if f.channel("driven") != "" {
		d.line("unit, output of the driven channel", d.input("driven"), "")
	}
}

// point is a channel that some checks read as `out`.
type point struct {
	channel string
	checks  []string
}

// outs lists the channels that are read as `out`, with the checks that do.
func (d *drawing) outs() []point {
	var out []point
	for _, u := range d.uses {
		c := d.t.Wiring.Over(u.check.Params.Wiring).Out
		i := slices.IndexFunc(out, func(q point) bool { return q.channel == c })
		if i < 0 {
			i, out = len(out), append(out, point{channel: c})
		}
		out[i].checks = appendNew(out[i].checks, fmt.Sprintf("%q", u.check.Name))
	}
	return out
}

// watts says what the load resistor must stand: several times what it takes.
func (d *drawing) watts() string {
	if w := d.f.power(); w > 0.05 {
		return fmt.Sprintf(", %s or more", rating(w))
	}
	return ""
}

func orWords(s, def string) string {
	if s == "" {
		return def
	}
	return s
}
