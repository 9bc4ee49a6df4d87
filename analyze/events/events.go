// Package events finds what happens now and then in long takes: steps of the
// level, dropouts, clicks, bursts of noise, hum that comes and goes.
//
// A take is read in stretches that overlap, so that memory does not grow with
// its length. In each, a linear prediction takes off all that is steady (test
// tone, harmonics, hum, the colour of the noise) and leaves white noise, in
// which whatever is sudden stands out; the tone and the mains lines are
// followed apart for changes that last. Thresholds come from the law of white
// Gaussian noise and an allowance of false alarms an hour.
package events

import (
	"fmt"
	"math"

	"benchslip/analyze"
	"benchslip/analyze/stage"
	"benchslip/capture/recording"
	"benchslip/capture/unit"
)

var count = unit.MustLookup("")

// Measures lists the measures of this package.
func Measures() []*analyze.Measure { return []*analyze.Measure{events} }

var events = &analyze.Measure{
	Name:  "events",
	Title: "intermittents: steps, dropouts, clicks, bursts, hum on and off",
	Doc: "How many times something happens in a take that should be steady (a tone, or silence). Kinds: `step`, a level (of the tone, of the noise where there is no tone, " +
		"of DC) that changes by over 0.1 dB and six standard deviations and stays so for a quarter of a second; `dropout`, signal missing for a while, or samples lost " +
		"(the phase of the tone jumps); `click`; `burst`, noise for over 6 ms; `hum`, mains lines that change by 2 dB and more, on or off. What is nearer than 20 ms is " +
		"one. Details list each with its time and its size: peak of a click, RMS of a burst and of what a dropout lacks, signed change of the RMS for steps and hum.",
	Formula:  "count of events in the span",
	Standard: "common practice; linear prediction by least squares",
	Unit:     "",
	Roles:    []string{"take"},
	Run:      run,
}

const (
	together   = 0.020  // s: what is nearer is one event
	shortest   = 1.5    // s, of a span
	fastest    = 1e6    // Hz
	slowest    = 2000   // Hz
	mostListed = 1000   // events listed
	falseHour  = 2.5e-4 // false alarms an hour that each of the sample, 1 ms and 10 ms detectors may give
)

// Event is one thing that happened.
type event struct {
	kind  string
	at    float64 // s on the take's time axis
	lasts float64 // s, 0: sudden
	size  float64 // in the signal's unit
	dB    float64 // of a step of the tone or of noise; 0: none
	rank  int     // which kind wins where several meet
	noise bool    // a change of the noise that lasts
}

func run(p *analyze.Pass) analyze.Result {
	s, bad := p.Signal("take", "out")
	if bad != nil {
		return analyze.RefuseWith(count, bad)
	}
	switch {
	case s.DurationS() < shortest:
		return analyze.Refuse(count, analyze.TooShort, fmt.Sprintf("take %q holds %.3g s in the span", s.Take.Name, s.DurationS()), "record 10 s or more")
	case s.RateHz > fastest || s.RateHz < slowest:
		return analyze.Refuse(count, analyze.Unsupported,
			fmt.Sprintf("take %q was sampled at %.6g Hz; events are looked for between %g Hz and %g Hz", s.Take.Name, s.RateHz, float64(slowest), fastest), "record it with an audio recorder")
	}
	sc := newScan(p, s)
	found := sc.all()
	if err := s.Err(); err != nil {
		return analyze.Refuse(count, analyze.Unreadable, fmt.Sprintf("take %q: %v", s.Take.Name, err), "copy the file again")
	}
	if sc.silent {
		return analyze.Refuse(count, analyze.NoSignal, fmt.Sprintf("take %q, channel %d: every sample is equal", s.Take.Name, s.Channel()), "check the connection and the channel, and record again")
	}
	found = settle(append(found, sc.flagged()...))
	return sc.result(found)
}

// flagged are the repeated and missing samples that the file's own samples gave
// away when it was opened: in noise alone nothing else shows them.
func (sc *scan) flagged() []event {
	var out []event
	s := sc.s
	for _, f := range s.Take.Flags {
		if f.Code != recording.Gap && f.Code != recording.RepeatedBlock || f.FromS == nil || f.Channel != 0 && f.Channel != s.Channel() && f.Channel != s.Minus() {
			continue
		}
		if *f.FromS >= s.StartS && *f.FromS < s.StartS+s.DurationS() {
			e := event{kind: "dropout", at: *f.FromS, rank: rankDropout}
			if f.ToS != nil {
				e.lasts = *f.ToS - *f.FromS
			}
			out = append(out, e)
		}
	}
	return out
}

func (sc *scan) result(found []event) analyze.Result {
	s := sc.s
	v := float64(len(found))
	r := analyze.Result{Value: &v, Unit: count}
	list := []map[string]any{}
	kinds := []string{"step", "dropout", "click", "burst", "hum"}
	tally := map[string]int{}
	for i, e := range found {
		tally[e.kind]++
		if i >= mostListed {
			continue
		}
		d := map[string]any{"kind": e.kind, "at_s": e.at, "size_v": e.size}
		if e.lasts > 0 {
			d["lasts_s"] = e.lasts
		}
		if e.dB != 0 {
			d["change_db"] = e.dB
		}
		list = append(list, d)
	}
	hours := s.DurationS() / 3600
	r.Details = map[string]any{
		"span_s": []float64{s.StartS, s.StartS + s.DurationS()}, "list": list, "events_per_hour": v / hours,
		"false_alarms_per_hour": sc.falseAlarms(), "sees": sc.sees(),
	}
	for _, k := range kinds {
		r.Details[k+"_count"] = tally[k]
	}
	if sc.toneHz > 0 {
		r.Details["tone_hz"] = sc.toneHz
	} else {
		r.Notes = append(r.Notes, "no steady tone: lost samples leave no trace in noise, and steps are those of the noise itself")
	}
	if len(found) > mostListed {
		r.Notes = append(r.Notes, fmt.Sprintf("the first %d of %d events are listed", mostListed, len(found)))
	}
	r.Notes = append(r.Notes, fmt.Sprintf("in white Gaussian noise about %.1g false alarms an hour; levels are not compared within the first and last %.2g s", sc.falseAlarms(), levelWindow))
	if n := tally["step"] + tally["click"] + tally["burst"] + tally["hum"]; n > 0 {
		r.Opinions = append(r.Opinions, "steps, clicks, bursts and hum that come and go are consistent with a bad joint, crimp, switch, plug or tantalum capacitor; "+
			"to confirm, tap, flex, heat and cool one part at a time with the tone on and read the times of the events")
	}
	if tally["dropout"] > 0 {
		r.Opinions = append(r.Opinions, "dropouts are as often the recorder's (lost buffers) as the unit's: record the stimulus on a second channel; what is missing there too is the recorder's")
	}
	r.Figures = []analyze.Figure{sc.figure(found)}
	return r
}

// figure is the level over time with the events.
func (sc *scan) figure(found []event) analyze.Figure {
	s := sc.s
	f := analyze.Figure{
		ID:      fmt.Sprintf("events-%s-ch%d", s.Take.Name, s.Channel()),
		Title:   fmt.Sprintf("Events in take %s, channel %d", s.Take.Name, s.Channel()),
		Caption: fmt.Sprintf("smallest and largest sample in each of %d columns of %.3g s; marks are events", len(sc.hi), s.DurationS()/float64(len(sc.hi))),
		X:       analyze.Axis{Label: "time", Unit: "s"}, Y: analyze.Axis{Label: "voltage", Unit: s.Unit},
	}
	if s.Unit == "FS" {
		f.Y.Label = "fraction of full scale"
	}
	env := analyze.Series{Name: "waveform", Kind: analyze.Envelope}
	for i := range sc.hi {
		if sc.hi[i] < sc.lo[i] {
			continue
		}
		env.X = append(env.X, s.StartS+(float64(i)+0.5)*s.DurationS()/float64(len(sc.hi)))
		env.Y, env.Low = append(env.Y, sc.hi[i]), append(env.Low, sc.lo[i])
	}
	f.Series = []analyze.Series{env}
	for i, e := range found {
		if i == 60 {
			f.Caption += fmt.Sprintf("; the first 60 of %d are marked", len(found))
			break
		}
		c := min(int((e.at-s.StartS)/s.DurationS()*float64(len(sc.hi))), len(sc.hi)-1)
		f.Marks = append(f.Marks, analyze.Mark{Kind: "event", X: e.at, Y: sc.hi[max(c, 0)], Label: e.kind})
	}
	return f
}

// steadyTone is the frequency of the strongest line that stands well over the
// noise within the 10 ms in which it is followed; 0 for none. Mains lines of
// the first two orders are no tone, those up to the twelfth only where they are
// 20 dB stronger than those two.
func steadyTone(p *analyze.Pass, s *analyze.Signal) float64 {
	v := stage.SurveyOf(p, s)
	near := func(hz float64, most int) bool {
		for _, f := range supplies(p) {
			if gap, k := stage.NearMains(hz, f, most); gap < 1+0.004*float64(k)*f {
				return true
			}
		}
		return false
	}
	hum := 0.0
	for _, q := range v.Peaks {
		if near(q.Hz, 2) {
			hum += q.Power
		}
	}
	for _, q := range v.Peaks {
		if q.Hz < 20 || q.Hz > 0.45*s.RateHz || near(q.Hz, 2) || near(q.Hz, 12) && q.Power < 100*hum {
			continue
		}
		if q.Power < 30*q.Floor*150 {
			return 0
		}
		return q.Hz
	}
	return 0
}

// supplies lists the mains frequencies to look for.
func supplies(p *analyze.Pass) []float64 {
	if p.MainsHz > 0 {
		return []float64{p.MainsHz}
	}
	return []float64{50, 60}
}

// falseAlarms is the number expected an hour in white Gaussian noise.
func (sc *scan) falseAlarms() float64 {
	// Three detectors in the prediction error; changes of levels at six sigma:
	// 2e-9 a side, about 2e5 looks an hour and quantity.
	return 3*falseHour + 4*2e5*2e-9/4
}

// sees is what would have been found: the medians over the take.
func (sc *scan) sees() map[string]any {
	m := map[string]any{}
	if sc.clickV > 0 {
		m["click_v"] = sc.clickV
	}
	if sc.toneHz > 0 && sc.stepLn > 0 {
		m["step_db"] = sc.stepLn * 20 / math.Ln10
	}
	if sc.humV > 0 {
		m["hum_v"] = sc.humV
	}
	return m
}
