package plan

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"benchslip/analyze"
	"benchslip/analyze/job"
	"benchslip/capture/unit"
)

// facts are what the wiring and the cautions of a take depend on.
type facts struct {
	role     func(name string) bool // some check reads the take in this role
	measures func(names ...string) bool
	channel  func(key string) string // as the take or a check names it; "" none
	loadOhm  float64                 // of the checks; 0 none
	askedV   float64                 // largest RMS that the limits ask for, V
	run      bool                    // a cable run before the unit
	speaker  bool                    // a stage that drives a low load
	micInput bool                    // the unit's input may carry phantom power
	source   string                  // what closes or drives the input: "150 ohm"
	fullV    float64                 // peak at the recorder's full scale, V; 0 unknown
}

// speakerOhm is the highest load that is taken for a loudspeaker's.
const speakerOhm = 64

func (p *planner) facts(t *analyze.Take) facts {
	uses := p.uses[t]
	f := facts{
		role: func(name string) bool {
			return slices.ContainsFunc(uses, func(u use) bool { return u.role == name })
		},
		measures: func(names ...string) bool {
			return slices.ContainsFunc(uses, func(u use) bool { return slices.Contains(names, u.check.Measure) })
		},
	}
	list := channels(t, uses)
	f.channel = func(key string) string {
		for _, c := range list {
			if c.Key == key {
				return c.Channel
			}
		}
		return ""
	}
	if s, ok := t.Condition("source"); ok {
		f.source = s
	}
	for _, u := range uses {
		pr := u.check.Params
		if pr.Load != nil && (u.role == "take" || u.role == "loaded") {
			f.loadOhm = pr.Load.Value.Linear()
		}
		if f.source == "" && pr.Source != nil {
			f.source = pr.Source.Value.String()
		}
		f.askedV = math.Max(f.askedV, asked(u))
		f.run = f.run || u.role == "take" && (u.check.Measure == "pickup" ||
			slices.ContainsFunc(u.check.Roles, func(r job.Role) bool { return r.Name == "baseline" }))
	}
	if s, ok := t.Condition("load"); ok && f.loadOhm == 0 {
		if q, err := unit.Parse(s); err == nil && q.Unit.Dim == unit.Ohm {
			f.loadOhm = q.Linear()
		}
	}
	f.speaker = p.speaker()
	f.micInput = p.microphone()
	if g := gearOf(t, f.channel("out")); g != nil {
		f.fullV = g.FullScalePeak
	}
	return f
}

// microphone reports whether the job is about an input that may carry phantom
// power: of a preamp, or of the receiver at the end of a run.
func (p *planner) microphone() bool {
	for _, c := range p.job.Checks {
		if c.Params.Source != nil && !p.speaker() || slices.Contains([]string{"ein", "cmrr", "pickup"}, c.Measure) {
			return true
		}
	}
	return p.mentions("phantom")
}

// speaker reports whether the job is about a stage that drives loudspeakers.
func (p *planner) speaker() bool {
	for _, c := range p.job.Checks {
		if c.Measure == "power" || c.Params.Load != nil && c.Params.Load.Value.Linear() <= speakerOhm {
			return true
		}
	}
	return false
}

// mentions looks for a word among the conditions of all takes and what the
// job says about the unit.
func (p *planner) mentions(word string) bool {
	has := func(s string) bool { return strings.Contains(strings.ToLower(s), word) }
	for _, t := range p.job.Takes {
		for _, c := range t.Where {
			if has(c.Key) || has(c.Value) {
				return true
			}
		}
	}
	for _, e := range p.job.Unit {
		if has(e.Value) {
			return true
		}
	}
	return false
}

// power is what the load takes at the level that the limits ask for, W.
func (f facts) power() float64 {
	if f.loadOhm <= 0 {
		return 0
	}
	return f.askedV * f.askedV / f.loadOhm
}

// headroomDB is how far below full scale of the recorder a tone is set, so
// that neither drift nor a surprise clips it (common practice, no source).
const headroomDB = 10

// level says what to set before recording.
func (p *planner) level(t *analyze.Take, at part) string {
	f := p.facts(t)
	s := p.play[t]
	switch {
	case s.source != "" || isScope(t):
		if f.measures("thump") {
			return "volts per division so that the rails would still fit; DC-coupled, single trigger"
		}
		return "volts per division so that the trace fills most of the screen and leaves it nowhere"
	case s.file == "":
		return "nothing is played; recorder and unit keep their knobs where the calibration and the other takes have them"
	case at == partLoop:
		return "the player as loud as in the takes that name this one, no part of the unit in between"
	}
	if w := t.Wiring; w.InLevel != nil {
		return fmt.Sprintf("the player so that a meter across the unit's input terminals reads %s RMS", w.InLevel)
	}
	if f.role("common") {
		return fmt.Sprintf("the player so that %s lies on the joined pins", voltText(p.limited(t, 0.5)))
	}
	if f.measures("clip_symmetry") && f.role("take") {
		return "the player so that the output clips by a few dB, for seconds only; check that the recorder itself does not clip"
	}
	if f.measures("max_output") && f.role("take") {
		return "the player so that the last level drives the output a few dB into clipping, for seconds only; check that the recorder itself does not clip"
	}
	out, why := p.outLevel(t, f)
	if out == 0 {
		return fmt.Sprintf("the player so that the recorder shows peaks about %d dB below its full scale", headroomDB)
	}
	text := fmt.Sprintf("the player so that the output stands at %s, %s", voltText(out), why)
	if g, ok := t.Condition("gain"); ok {
		if q, err := unit.Parse(g); err == nil && q.Unit.Dim == unit.Ratio && q.Linear() > 0 {
			text += fmt.Sprintf("; with a gain of %s the input then holds about %s", g, voltText(out/q.Linear()))
		}
	}
	return text
}

// limited is v, or less where the recorder's full scale asks for it.
func (p *planner) limited(t *analyze.Take, v float64) float64 {
	if g := gearOf(t, t.Wiring.In); g != nil && g.FullScalePeak > 0 {
		v = math.Min(v, below(g.FullScalePeak))
	}
	return v
}

// below is the RMS of a sine headroomDB below a full scale.
func below(peak float64) float64 { return peak / math.Sqrt2 * math.Pow(10, -headroomDB/20.) }

// outLevel is the RMS in V at which a tone is measured: what a check of the
// same take names, else as loud as the recorder allows.
func (p *planner) outLevel(t *analyze.Take, f facts) (float64, string) {
	for _, u := range p.uses[t] {
		for _, row := range u.check.Rows() {
			l := row.Limits
			if u.role != "take" || u.check.Measure != "level" && u.check.Measure != "power" {
				continue
			}
			q := l.Nominal
			if q == nil && l.Min != nil && l.Max != nil {
				mid := unit.Quantity{Number: (l.Min.Number + l.Max.Number) / 2, Unit: l.Min.Unit}
				q = &mid
			}
			if q == nil {
				q = l.Min
			}
			switch {
			case q == nil:
			case q.Unit.Dim == unit.Volt:
				return q.Linear(), fmt.Sprintf("as the check %q names it", u.check.Name)
			case q.Unit.Dim == unit.Watt && f.loadOhm > 0:
				return math.Sqrt(q.Linear() * f.loadOhm), fmt.Sprintf("which is %s into %s", q, unit.Pretty(f.loadOhm, unit.Ohm))
			}
		}
	}
	if f.fullV > 0 {
		return below(f.fullV), fmt.Sprintf("%d dB below the recorder's full scale, unless that drives the unit into clipping", headroomDB)
	}
	return 0, ""
}

// voltText prints a level in volts and in dBu.
func voltText(v float64) string {
	return fmt.Sprintf("%s RMS (%.1f dBu)", unit.Pretty(v, unit.Volt), unit.MustLookup("dBu").FromLinear(v))
}
