package run

import (
	"fmt"
	"strings"

	"benchslip/analyze"
	"benchslip/analyze/job"
	"benchslip/capture/unit"
)

// conditions says in short phrases what a row's number holds for: what was
// asked of the measure, what was taken from where, and under which conditions
// its take was made.
func conditions(row job.Row, details map[string]any) []string {
	c := row.Check
	p := &c.Params
	var out []string
	say := func(format string, args ...any) { out = append(out, fmt.Sprintf(format, args...)) }
	stated := func(name string, s *analyze.Stated) {
		if s == nil {
			return
		}
		text := name + " " + s.Value.String()
		if s.Uncertainty != nil {
			text += " (uncertainty " + s.Uncertainty.String() + ")"
		}
		out = append(out, text)
	}
	quantity := func(format string, x *float64, d unit.Dim) {
		if x != nil {
			say(format, unit.Pretty(*x, d))
		}
	}
	switch {
	case len(c.Repeat) > 0:
		say("mean of %d takes: %s", len(c.Repeat), names(c.Repeat))
	case len(row.Main) > 1:
		say("from %d takes: %s", len(row.Main), names(row.Main))
	}
	if c.Against != nil {
		say("relative to take %s", c.Against.Name)
	}
	if len(p.At) > 0 {
		var at []string
		for _, f := range p.At {
			at = append(at, unit.Pretty(f, unit.Hertz))
		}
		say("at %s", strings.Join(at, ", "))
	}
	if lo, hi, ok := pair(details["band_hz"]); ok {
		say("%s .. %s", unit.Pretty(lo, unit.Hertz), unit.Pretty(hi, unit.Hertz))
	}
	if w, ok := details["weighting"].(string); ok && w != "none" && w != "" {
		say("%s-weighted", w)
	}
	if p.Order > 0 {
		say("order %d", p.Order)
	}
	if p.Harmonics > 0 {
		say("harmonics up to order %d", p.Harmonics)
	}
	if p.Reference != "" {
		say("relative to the %s", p.Reference)
	}
	stated("gain", p.Gain)
	stated("source", p.Source)
	quantity("temperature %s", p.Temperature, unit.Kelvin)
	quantity("input resistance %s", p.InputR, unit.Ohm)
	if p.Plane != "" {
		say("gain taken at the %s", map[string]string{"emf": "source's EMF", "terminals": "input terminals"}[p.Plane])
	}
	stated("load", p.Load)
	stated("series resistor", p.Series)
	stated("length", p.Length)
	stated("rails", p.Rails)
	quantity("reference %s", p.Ref, unit.Hertz)
	if p.RefLevel != nil {
		say("reference level %s", p.RefLevel)
	}
	if p.THDN != nil {
		say("at THD+N of %.4g %%", 100**p.THDN)
	}
	if p.Tolerance != nil {
		say("within %.4g %%", 100**p.Tolerance)
	}
	quantity("above %s", p.Above, unit.Hertz)
	for _, role := range c.Roles {
		if words, ok := roleWords[role.Name]; ok {
			say(words, names(role.Takes))
		}
	}
	if t := first(row); t != nil {
		out = append(out, wiringWords(t.Wiring.Over(p.Wiring))...)
		for _, w := range t.Where {
			say("%s = %s", w.Key, w.Value)
		}
	}
	return out
}

// roleWords says what the other takes of a row are for.
var roleWords = map[string]string{
	"floor":        "instrument floor from take %s",
	"loop":         "instrument's own distortion from take %s",
	"gain_take":    "gain from take %s",
	"in_take":      "stimulus from take %s",
	"baseline":     "baseline from take %s",
	"differential": "differential drive in take %s",
	"common":       "common drive in take %s",
	"open":         "without load in take %s",
	"loaded":       "with load in take %s",
	"direct":       "without series resistor in take %s",
	"series_take":  "with series resistor in take %s",
}

func wiringWords(w analyze.Wiring) []string {
	var out []string
	add := func(name, channel string) {
		if channel != "" {
			out = append(out, name+" on channel "+channel)
		}
	}
	add("out", w.Out)
	add("in", w.In)
	add("second out", w.Out2)
	add("driven", w.Driven)
	add("mains reference", w.Mains)
	if w.InLevel != nil {
		out = append(out, "input level "+w.InLevel.String())
	}
	if w.InFactor != 0 && w.InFactor != 1 {
		out = append(out, fmt.Sprintf("input taken %g times", w.InFactor))
	}
	if w.Span != nil {
		out = append(out, "span "+w.Span.Text)
	}
	return out
}

func names(takes []*analyze.Take) string {
	var list []string
	for _, t := range takes {
		list = append(list, t.Name)
	}
	return strings.Join(list, ", ")
}

// pair reads [low, high] out of a detail.
func pair(v any) (lo, hi float64, ok bool) {
	switch x := v.(type) {
	case [2]float64:
		return x[0], x[1], true
	case []float64:
		if len(x) == 2 {
			return x[0], x[1], true
		}
	case *[2]float64:
		if x != nil {
			return x[0], x[1], true
		}
	}
	return 0, 0, false
}
