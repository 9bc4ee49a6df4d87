package stage

import (
	"fmt"
	"math"

	"benchslip/analyze"
)

// Stretch is samples [From, To) of a signal in which something sounds between
// two silences.
type Stretch struct {
	From, To int
	Peak     float64 // largest |sample less mean|
}

const (
	lookS      = 0.01 // s, window of the envelope
	gapWindows = 2    // windows of silence that part two stretches
	leastS     = 0.05 // s, shortest stretch
	over       = 3.0  // a stretch stands this far over the silence (peaks)
	dark       = 1e-4 // of the largest peak: what counts as silence anyway
)

// Stretches finds what sounds between silences: one stretch, the whole signal,
// where there are none. The envelope is the largest |sample| in windows of 10
// ms, so a tone of 20 Hz keeps its own; the silence is its quietest moment.
func Stretches(p *analyze.Pass, s *analyze.Signal) []Stretch {
	return p.Stages.Once("stretches/"+s.ID(), func() any { return stretches(s) }).([]Stretch)
}

func stretches(s *analyze.Signal) []Stretch {
	n := s.Len()
	w := max(int(lookS*s.RateHz), 1)
	env := make([]float64, 0, n/w+1)
	dc := meanOf(s)
	buf := make([]float64, w)
	top := 0.0
	for at := 0; at < n; at += w {
		k := s.Read(buf, at)
		if k == 0 {
			break
		}
		e := 0.0
		for _, x := range buf[:k] {
			e = math.Max(e, math.Abs(x-dc))
		}
		env = append(env, e)
		top = math.Max(top, e)
	}
	whole := []Stretch{{0, n, top}}
	if len(env) < 3*gapWindows {
		return whole
	}
	quiet := math.Inf(1)
	for i := gapWindows; i <= len(env); i++ {
		m := 0.0
		for _, e := range env[i-gapWindows : i] {
			m = math.Max(m, e)
		}
		quiet = math.Min(quiet, m)
	}
	limit := math.Max(over*quiet, dark*top)
	if top <= 2*limit {
		return whole
	}
	var out []Stretch
	first, last := -1, -1 // sounding windows of the stretch at hand
	close := func() {
		if first < 0 {
			return
		}
		q := Stretch{From: first * w, To: min((last+1)*w, n)}
		for _, e := range env[first : last+1] {
			q.Peak = math.Max(q.Peak, e)
		}
		if float64(q.To-q.From) >= leastS*s.RateHz {
			out = append(out, q)
		}
		first = -1
	}
	for i, e := range env {
		if e <= limit {
			if first >= 0 && i-last > gapWindows {
				close()
			}
			continue
		}
		if first < 0 {
			first = i
		}
		last = i
	}
	close()
	if len(out) == 0 {
		return whole
	}
	return out
}

// Inner is a stretch without its first tenth (at least 20 ms), in which a unit
// settles, and its last 20 ms, in which a stimulus fades.
func (q Stretch) Inner(rate float64) Stretch {
	edge := int(2 * lookS * rate)
	q.From += max((q.To-q.From)/10, edge)
	q.To = max(q.To-edge, q.From+1)
	return q
}

// Step is a stretch that holds one tone, its settling and fades left out.
type Step struct {
	From, To int
	Hz       float64 // of its strongest line, read from a spectrum
	RMS      float64 // of that line
}

// Steps of one take differ by more than this.
const (
	stepOctave  = 1.0 / 24 // octaves
	halfDecibel = 1.06     // ratio of levels
)

// Steps lists the tones of a stepped take: at least two stretches between
// silences, each mostly one line, which differ in frequency or level. nil for
// all other takes.
func Steps(p *analyze.Pass, s *analyze.Signal) []Step {
	return p.Stages.Once("steps/"+s.ID(), func() any { return steps(p, s) }).([]Step)
}

func steps(p *analyze.Pass, s *analyze.Signal) []Step {
	all := Stretches(p, s)
	if len(all) < 2 {
		return nil
	}
	var out []Step
	unlike := false
	for _, q := range all {
		in := q.Inner(s.RateHz)
		v := SurveyOf(p, s.Part(in.From, in.To))
		line, ok := v.StrongestIn(math.Max(LowestTone, 1.8/(float64(in.To-in.From)/s.RateHz)), s.RateHz/2, nil)
		if !ok || line.Power < 0.5*v.Integrate(v.StepHz, s.RateHz/2, nil) {
			continue
		}
		st := Step{in.From, in.To, line.Hz, math.Sqrt(line.Power)}
		if len(out) > 0 {
			a := out[0]
			unlike = unlike || octaves(st.Hz, a.Hz) > stepOctave || st.RMS > a.RMS*halfDecibel || a.RMS > st.RMS*halfDecibel
		}
		out = append(out, st)
	}
	if !unlike {
		return nil
	}
	return out
}

func octaves(a, b float64) float64 { return math.Abs(math.Log2(a / b)) }

// StepFor picks the step of a take that a measure of one tone reads: nearest
// to atHz, within 1/24 octave, and the strongest of those; without atHz the
// strongest of all, if no step of another frequency is within 6 dB of it.
func StepFor(s *analyze.Signal, all []Step, atHz float64) (Step, *analyze.Refusal) {
	best := -1
	for i, q := range all {
		if atHz > 0 && octaves(q.Hz, atHz) > stepOctave {
			continue
		}
		switch {
		case best < 0:
			best = i
		case atHz > 0 && octaves(q.Hz, all[best].Hz) > 1e-3:
			if octaves(q.Hz, atHz) < octaves(all[best].Hz, atHz) {
				best = i
			}
		case q.RMS > all[best].RMS:
			best = i
		}
	}
	if best < 0 {
		list := ""
		for i, q := range all[:min(len(all), 12)] {
			if i > 0 {
				list += ", "
			}
			list += fmt.Sprintf("%.5g", q.Hz)
		}
		if len(all) > 12 {
			list += " ..."
		}
		return Step{}, &analyze.Refusal{Code: analyze.NoTone,
			Text:   fmt.Sprintf("take %q is stepped, and no step lies within 1/24 octave of %.6g Hz; it holds %s Hz", s.Take.Name, atHz, list),
			Advice: "ask at the frequency of a step"}
	}
	if atHz == 0 {
		for _, q := range all {
			if octaves(q.Hz, all[best].Hz) > stepOctave && q.RMS > all[best].RMS/2 {
				return Step{}, &analyze.Refusal{Code: analyze.AmbiguousTone,
					Text:   fmt.Sprintf("take %q is stepped over frequency, from %.5g Hz to %.5g Hz", s.Take.Name, all[0].Hz, all[len(all)-1].Hz),
					Advice: "say which step with `at`"}
			}
		}
	}
	return all[best], nil
}

// HearSteps hears the steps of a stepped take that keep allows, in order of
// time; nil for a take that is not stepped. Steps in which no tone can be
// heard are left out and counted, why says the last one's reason.
func HearSteps(p *analyze.Pass, t *analyze.Take, role string, orders int, keep func(Step) bool) (heard []*Heard, skipped int, why *analyze.Refusal) {
	out, bad := p.SignalOf(t, role, "out")
	if bad != nil {
		return nil, 0, bad
	}
	search, in := out, (*analyze.Signal)(nil)
	if p.Wiring(t).In != "" {
		if in, bad = p.SignalOf(t, role, "in"); bad != nil {
			return nil, 0, bad
		}
		search = in
	}
	all := Steps(p, search)
	for _, q := range all {
		if !keep(q) {
			continue
		}
		var i *analyze.Signal
		if in != nil {
			i = in.Part(q.From, q.To)
		}
		h, bad := Hear(p, out.Part(q.From, q.To), i, q.Hz, orders)
		if bad != nil {
			skipped, why = skipped+1, bad
			continue
		}
		h.Steps = len(all)
		heard = append(heard, h)
	}
	return heard, skipped, why
}
