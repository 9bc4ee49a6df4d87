// Package doubt says what makes a take doubtful once its tone and its noise
// are looked at: gain that rides, a start that has not settled, samples lost
// from a tone, a clock far off, a spectrum with a wall, modes of an
// oscilloscope. It also names usual mix-ups of the bench.
//
// Its flags state evidence with figures; nothing is corrected. A take that was
// made well carries none: every threshold keeps a distance from what healthy
// gear does, and what cannot be told from a healthy signal is not flagged.
package doubt

import (
	"slices"

	"benchslip/analyze"
	"benchslip/analyze/stage"
	"benchslip/capture/recording"
)

// Subject is a take with what the job says about it.
type Subject struct {
	Take     *analyze.Take
	MainsHz  float64   // nominal supply; 0: any
	Nominal  []float64 // Hz of the test tones that the job names
	Channels []int     // that are read, from 1; nil: all
	Stages   *analyze.Stages
}

// Finding is a flag with what only programs need.
type Finding struct {
	recording.Flag
	// WallHz is where the spectrum ends, for resampled-looking; else 0.
	WallHz float64
	// Source is the channel that Channel copies, for identical-channels; else 0.
	Source int
}

// Flags looks through a take that was opened and returns what it found, by
// channel, then in the order of the looks below. A take that has a fault, no
// rate, or hardly any samples gives none; nor does a channel with samples
// missing, which has a flag of its own.
func Flags(s Subject) []Finding {
	t := s.Take
	if t == nil || t.Rec == nil || t.Fault != nil {
		return nil
	}
	in := t.Rec.Info()
	if in.RateHz <= 0 || in.Frames < leastFrames {
		return nil
	}
	channels := slices.Clone(s.Channels)
	if channels == nil {
		for c := range in.Channels {
			channels = append(channels, c+1)
		}
	}
	slices.Sort(channels)
	channels = slices.Compact(channels)
	if s.Stages == nil {
		s.Stages = analyze.NewStages()
	}
	var out []Finding
	var heard []*listening
	for _, c := range channels {
		if c < 1 || c > len(in.Channels) || broken(in, c) || still(t, c) {
			continue
		}
		l := newListening(s, c)
		heard = append(heard, l)
		for _, look := range looks {
			for _, f := range look(l) {
				f.Channel, f.Take = c, t.Name
				out = append(out, f)
			}
		}
	}
	return append(out, copies(heard)...)
}

// leastFrames is the shortest take that is looked through.
const leastFrames = 512

// looks in the order of their flags.
var looks = []func(*listening) []Finding{
	riding, gated, settling, jumps, rate, wall, averaged, peakDetect, jitter, supply,
}

// broken: samples of the channel are missing.
func broken(in *recording.Info, channel int) bool {
	for _, r := range in.Missing {
		if r.Channel == channel || r.Channel == 0 {
			return true
		}
	}
	return false
}

// still: every sample of the channel is equal.
func still(t *analyze.Take, channel int) bool {
	if t.Health == nil || channel > len(t.Health.Levels) {
		return false
	}
	l := t.Health.Levels[channel-1]
	return l.Count < 2 || l.Min == l.Max
}

// listening is one channel of a take under examination.
type listening struct {
	Subject
	sig    *analyze.Signal
	kind   string // recording.Audio or Scope
	survey *stage.Survey
	frames *frames
	floor  *floor
}

func newListening(s Subject, channel int) *listening {
	in := s.Take.Rec.Info()
	l := &listening{Subject: s, kind: in.Kind, sig: analyze.NewSignal(s.Take, channel, 0, 0, in.Frames, 1)}
	pass := &analyze.Pass{Params: &analyze.Params{}, Stages: s.Stages, MainsHz: s.MainsHz}
	l.survey = stage.SurveyOf(pass, l.sig)
	l.frames = framesOf(l.sig, l.tone())
	return l
}

// tone is the frequency of the strongest line, 0 when none stands out.
func (l *listening) tone() float64 {
	if p, ok := l.survey.StrongestIn(lowestTone, 0.47*l.sig.RateHz, nil); ok {
		return p.Hz
	}
	return 0
}

// driven: the job says that something was played into the unit.
func (l *listening) driven() bool {
	w := l.Take.Wiring
	return l.Take.Stimulus != "" || w.In != "" || w.InLevel != nil || len(l.Nominal) > 0
}

// at is the time of sample i on the take's own axis, s.
func (l *listening) at(i int) float64 { return l.sig.StartS + float64(i)/l.sig.RateHz }

// found makes a finding with its place, from sample a to b.
func (l *listening) found(code string, a, b int, message string) Finding {
	f := Finding{Flag: recording.Flag{Code: code, Message: message}}
	f.FromS, f.ToS = recording.Place(l.at(a), l.at(b))
	return f
}
