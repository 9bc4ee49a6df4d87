package plan

import (
	"fmt"
	"hash/fnv"
	"math"
	"slices"
	"strings"

	"benchslip/analyze"
	"benchslip/capture/stimulus"
	"benchslip/capture/unit"
)

// Folder is where the files to play are written when the job names none,
// below the job's folder.
const Folder = "stimuli"

// stimulusOf is what a take is played.
type stimulusOf struct {
	file   string         // relative to the job's folder; "" nothing is played
	spec   *stimulus.Spec // what is in it; nil: not known
	source string         // what drives the unit instead of a file
	doubts []string
}

func (s stimulusOf) words() string {
	switch {
	case s.spec != nil:
		return s.spec.String()
	case s.file != "":
		return "as the file has it"
	}
	return ""
}

// File is one stimulus file of a job.
type File struct {
	Name  string         // relative to the job's folder, with /
	Spec  *stimulus.Spec // nil: the job names a file whose content nobody described
	Takes []string       // that are played it
}

// Files lists the stimulus files of a job, each once, in the order of its
// takes.
func Files(p *Plan) []File {
	var out []File
	for _, t := range p.Takes {
		if t.Stimulus == "" {
			continue
		}
		i := slices.IndexFunc(out, func(f File) bool { return f.Name == t.Stimulus })
		if i < 0 {
			f := File{Name: t.Stimulus}
			if s, err := stimulus.Parse(t.Signal); err == nil {
				f.Spec = &s
			}
			i, out = len(out), append(out, f)
		}
		out[i].Takes = append(out[i].Takes, t.Name)
	}
	return out
}

// stimuli chooses what every take is played, and names the files.
func (p *planner) stimuli() map[*analyze.Take]stimulusOf {
	out := map[*analyze.Take]stimulusOf{}
	names := map[string]string{} // file by description
	taken := map[string]bool{}
	for _, t := range p.job.Takes {
		taken[t.Stimulus] = true
	}
	first := map[string]*stimulus.Spec{} // of a file that the job names, by its name
	for _, t := range p.job.Takes {
		s := p.signal(t)
		switch {
		case isFile(t.Stimulus):
			s.file = t.Stimulus
			if known := first[s.file]; known != nil {
				s.spec = known // one file has one content
			}
			first[s.file] = s.spec
		case s.spec != nil:
			text := s.spec.String()
			name, known := names[text]
			if !known {
				name = Folder + "/" + fileName(*s.spec)
				for n := 2; taken[name]; n++ {
					name = fmt.Sprintf("%s/%s-%d.wav", Folder, strings.TrimSuffix(fileName(*s.spec), ".wav"), n)
				}
				names[text], taken[name] = name, true
			}
			s.file = name
		}
		out[t] = s
	}
	return out
}

func isFile(s string) bool { return strings.HasSuffix(strings.ToLower(s), ".wav") }

// fileName makes a name of a description: its kind and what is not as usual.
func fileName(s stimulus.Spec) string {
	full := s.String()
	words := strings.Fields(full)
	plain, err := stimulus.Parse(words[0])
	var usual []string
	if err == nil {
		usual = strings.Fields(plain.String())
	}
	name := words[0]
	for _, w := range words[1:] {
		if slices.Contains(usual, w) && !strings.HasPrefix(w, "at=") {
			continue
		}
		key, value, _ := strings.Cut(w, "=")
		name += "-" + key + "-" + strings.ReplaceAll(value, ",", "+")
	}
	name = strings.ReplaceAll(name, "--", "-minus")
	const longest = 60
	if len(name) > longest {
		h := fnv.New32a()
		h.Write([]byte(full))
		name = fmt.Sprintf("%s-%08x", name[:longest], h.Sum32())
	}
	return name + ".wav"
}

// Signals that a check can need, in the order in which one wins over another
// when a take is read by checks with different needs.
const (
	needNothing = iota
	needTone
	needLevels // a sine at rising levels
	needSweep
	needModulation
	needDifference
	needPulse
	needSquare // a generator's square wave: no file
)

// need is the signal that a use asks for.
func need(u use) int {
	switch u.role {
	case "floor", "baseline":
		return needNothing
	case "gain_take", "in_take":
		return needTone
	}
	switch u.check.Measure {
	case "gain", "phase", "tone_frequency", "thd", "harmonic", "thdn", "sinad", "crosstalk", "balance", "cmrr",
		"output_impedance", "input_impedance", "power", "clip_symmetry", "polarity", "events":
		return needTone
	case "delay":
		return needSweep
	case "snr":
		if u.check.Params.RefLevel == nil {
			return needTone
		}
	case "max_output":
		for _, r := range u.check.Roles {
			if r.Name == "take" && len(r.Takes) > 1 {
				return needTone
			}
		}
		return needLevels
	case "response", "flatness", "corner_low", "corner_high":
		return needSweep
	case "modulation_distortion":
		return needModulation
	case "difference_distortion":
		return needDifference
	case "rise_time", "fall_time", "settling_time", "overshoot", "droop", "slew_rate":
		return needSquare
	}
	return needNothing
}

// signal chooses what a take is played: what the job says, else what its
// checks need.
func (p *planner) signal(t *analyze.Take) stimulusOf {
	if t.Stimulus != "" && !isFile(t.Stimulus) {
		s, err := stimulus.Parse(t.Stimulus)
		if err != nil {
			return stimulusOf{doubts: []string{"the stimulus cannot be made: " + err.Error()}}
		}
		return stimulusOf{spec: &s}
	}
	if t.Stimulus != "" && p.opt.Describes != nil {
		if text, ok := p.opt.Describes(p.path(t.Stimulus)); ok {
			if s, err := stimulus.Parse(text); err == nil {
				return stimulusOf{spec: &s}
			}
		}
	}
	return p.derived(t)
}

// derived makes a stimulus of what the checks of a take need.
func (p *planner) derived(t *analyze.Take) stimulusOf {
	var out stimulusOf
	kinds := map[int][]string{} // names of checks by need
	var at []float64
	quiet := false
	silent := false
	for _, u := range p.uses[t] {
		n := need(u)
		kinds[n] = appendNew(kinds[n], u.check.Name)
		quiet = quiet || n == needNothing && quietMeasure(u)
		silent = silent || u.check.Measure == "crosstalk"
		if n == needTone || n == needLevels {
			for _, f := range u.check.Params.At {
				if !slices.ContainsFunc(at, func(g float64) bool { return math.Abs(f-g) < 1e-6*f }) {
					at = append(at, f)
				}
			}
		}
	}
	best := needNothing
	for n := needTone; n <= needSquare; n++ {
		if kinds[n] == nil {
			continue
		}
		if best != needNothing {
			out.doubts = append(out.doubts, fmt.Sprintf("%s and %s need different signals: give them takes of their own",
				joinWords(kinds[best]), joinWords(kinds[n])))
		}
		best = max(best, n)
	}
	if best == needNothing && (t.Wiring.In != "" || t.Wiring.InLevel != nil) && !quiet {
		best = needTone // a level at the output of something that is driven
	}
	if isScope(t) && best != needNothing {
		out.source = scopeSource(best, at)
		return out
	}
	text, top := "", 0.0
	for _, f := range at {
		top = math.Max(top, f)
	}
	switch best {
	case needNothing:
		return out
	case needSquare:
		out.source = scopeSource(best, at)
		return out
	case needTone:
		text = toneText(at, quiet, p.watched(t))
	case needLevels:
		text = "stepped-levels"
		if len(at) > 0 {
			text += " at=" + compact(at[0], unit.Hertz)
		}
	case needSweep:
		lo, hi := p.sweepRange(t)
		top = hi
		text = fmt.Sprintf("sweep from=%s to=%s length=15s", compact(lo, unit.Hertz), compact(math.Min(hi, 0.45*playRate(t, hi)), unit.Hertz))
	case needModulation:
		text = "modulation-pair"
	case needDifference:
		text, top = "difference-pair", 20e3
	}
	if rate := playRate(t, top); rate != 48000 {
		text += " rate=" + compact(rate, unit.Hertz)
	}
	if silent {
		text += " second=silent"
	}
	s, err := stimulus.Parse(text)
	if err != nil {
		out.doubts = append(out.doubts, "no stimulus can be made for its checks: "+strings.TrimPrefix(err.Error(), "stimulus: "))
		return out
	}
	out.spec = &s
	return out
}

// quietMeasure: the check needs a stretch without signal.
func quietMeasure(u use) bool {
	switch u.check.Measure {
	case "noise", "noise_density", "ein", "hum", "hum_ratio", "pickup":
		return true
	}
	return false
}

// watched is how long a take is that looks for rare events, in s.
func (p *planner) watched(t *analyze.Take) float64 {
	for _, u := range p.uses[t] {
		if u.check.Measure == "events" {
			return watchS
		}
	}
	return 0
}

// toneText describes one tone, or several that sound together; with silence
// around it where noise is read from the same take.
func toneText(at []float64, quiet bool, watch float64) string {
	at = slices.Sorted(slices.Values(at))
	var f []string
	for _, x := range at {
		f = append(f, compact(x, unit.Hertz))
	}
	kind := "tone"
	switch {
	case len(at) > 1:
		kind = "multitone"
	case quiet:
		kind = "pilot"
	}
	text := kind
	if len(f) > 0 {
		text += " at=" + strings.Join(f, ",")
	}
	if watch > 0 {
		text += " length=" + compact(watch, unit.Second)
	}
	return text
}

// sweepRange covers the frequencies that the checks of a take ask for, with
// room at both ends.
func (p *planner) sweepRange(t *analyze.Take) (lo, hi float64) {
	lo, hi = 20, 20e3
	for _, u := range p.uses[t] {
		c := u.check
		for _, f := range c.Params.At {
			lo, hi = math.Min(lo, f), math.Max(hi, f)
		}
		if b := c.Params.Band; b != nil {
			lo, hi = math.Min(lo, b.Low), math.Max(hi, b.High)
		}
		for _, row := range c.Rows() {
			for _, q := range []*unit.Quantity{row.Limits.Min, row.Limits.Max} {
				switch {
				case q == nil || q.Unit.Dim != unit.Hertz:
				case c.Measure == "corner_low":
					lo = math.Min(lo, q.Linear()/2)
				case c.Measure == "corner_high":
					hi = math.Max(hi, 2*q.Linear())
				}
			}
		}
	}
	const lowest = 2 // Hz; below, a sweep of this length turns too few times
	return math.Max(lo, lowest), hi
}

// playRate is the sample rate of a file that reaches up to top, in Hz: the
// gear's own, 48 kHz, or 96 kHz where the signal asks for more.
func playRate(t *analyze.Take, top float64) float64 {
	if g := t.Gear; g != nil && g.Rate >= stimulus.MinRateHz && g.Rate == math.Trunc(g.Rate) {
		return g.Rate
	}
	if top > 0.45*48e3 {
		return 96e3
	}
	return 48e3
}

// scopeSource says what drives a unit that is watched on a scope.
func scopeSource(need int, at []float64) string {
	switch need {
	case needTone, needLevels:
		f := 1042.0
		if len(at) > 0 {
			f = at[0]
		}
		return "a sine of " + hertz(f) + " from a generator or player"
	case needSquare:
		return "a square wave from a function generator whose own edges are at least three times faster than the unit's"
	}
	return "a generator or player"
}

// compact prints a quantity in the way of a stimulus' description: "1042Hz".
func compact(x float64, d unit.Dim) string {
	return strings.TrimSpace(fmt.Sprintf("%g%s", x, d.Base().Symbol))
}

func hertz(f float64) string { return unit.Pretty(f, unit.Hertz) }

// seconds prints a time that people count in: "20 s", "10 ms".
func seconds(s float64) string {
	if s >= 1 || s == 0 {
		return fmt.Sprintf("%.4g s", s)
	}
	return unit.Pretty(s, unit.Second)
}
