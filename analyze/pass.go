package analyze

import (
	"fmt"
	"math"
	"strconv"
	"strings"
	"sync"

	"benchslip/capture/recording"
)

// Pass is everything a measure may see.
type Pass struct {
	Measure *Measure
	Params  *Params
	Roles   map[string][]*Take // by role; "take" may hold several
	MainsHz float64            // nominal mains; 0: find it
	Stages  *Stages
}

// Take returns the take of a role, nil when the check names none.
func (p *Pass) Take(role string) *Take {
	if ts := p.Roles[role]; len(ts) > 0 {
		return ts[0]
	}
	return nil
}

// Has reports whether the check names a take for role.
func (p *Pass) Has(role string) bool { return p.Take(role) != nil }

// Wiring of a role's take: the take's own under the check's.
func (p *Pass) Wiring(t *Take) Wiring { return t.Wiring.Over(p.Params.Wiring) }

// Wired reports whether the key ("in", "out2" ...) is stated for a role.
func (p *Pass) Wired(role, key string) bool {
	t := p.Take(role)
	return t != nil && channelText(p.Wiring(t), key) != ""
}

// Signal returns the samples that key ("out", "in", "out2", "driven",
// "mains") of a role's take names, over the span, or why it cannot: take
// missing or unreadable, span outside the record, clipped or missing samples
// in it. "out" defaults to channel 1; in_factor applies to "in".
func (p *Pass) Signal(role, key string) (*Signal, *Refusal) {
	return p.SignalOf(p.Take(role), role, key)
}

// SignalOf is Signal for one of several takes of a role.
func (p *Pass) SignalOf(t *Take, role, key string) (*Signal, *Refusal) {
	if t == nil {
		return nil, &Refusal{MissingTake, fmt.Sprintf("no take is named for %q", role), "name one in the job"}
	}
	if t.Fault != nil {
		return nil, t.Fault
	}
	w := p.Wiring(t)
	text := channelText(w, key)
	if text == "" {
		if key != "out" {
			return nil, &Refusal{MissingTake, fmt.Sprintf("take %q says no channel for `%s`", t.Name, key), fmt.Sprintf("state `%s` for the take", key)}
		}
		text = "1"
	}
	in := t.Rec.Info()
	plus, minus, err := ResolveChannel(text, in)
	if err != nil {
		return nil, &Refusal{MissingTake, fmt.Sprintf("take %q: %v", t.Name, err), "correct the channel in the job"}
	}
	if in.RateHz <= 0 {
		return nil, &Refusal{Unreadable, fmt.Sprintf("take %q has no sample rate", t.Name), "state csv.rate for the take"}
	}
	from, to, bad := Frames(t, w.Span)
	if bad != nil {
		return nil, bad
	}
	if bad := unfit(t, from, to, plus, minus); bad != nil {
		return nil, bad
	}
	factor := 1.0
	if key == "in" && w.InFactor != 0 {
		factor = w.InFactor
	}
	return NewSignal(t, plus, minus, from, to, factor), nil
}

func channelText(w Wiring, key string) string {
	switch key {
	case "out":
		return w.Out
	case "in":
		return w.In
	case "out2":
		return w.Out2
	case "driven":
		return w.Driven
	case "mains":
		return w.Mains
	}
	panic("analyze: no channel key " + key)
}

// Frames turns a span into frames [from, to); nil is the whole take. A span
// holds the samples with From <= t < To.
func Frames(t *Take, span *Span) (from, to int64, bad *Refusal) {
	in := t.Rec.Info()
	to = in.Frames
	if span != nil {
		// 1e-9 of a sample: times typed in decimal that fall on a sample.
		index := func(s float64) int64 { return int64(math.Ceil((s-in.StartS)*in.RateHz - 1e-6)) }
		end := in.StartS + in.DurationS()
		if span.HasFrom {
			from = index(span.From)
		}
		if span.HasTo {
			to = index(span.To)
		}
		if from < 0 || to > in.Frames || from >= in.Frames {
			return 0, 0, &Refusal{TooShort,
				fmt.Sprintf("the span %s reaches outside take %q, which runs from %.6g s to %.6g s", span.Text, t.Name, in.StartS, end),
				"set a span inside the record"}
		}
	}
	if to <= from {
		return 0, 0, &Refusal{TooShort, fmt.Sprintf("take %q holds no samples in the span", t.Name), "record it again"}
	}
	return from, to, nil
}

// unfit refuses a span that holds clipped samples or samples without a value
// in a channel that is read.
func unfit(t *Take, from, to int64, channels ...int) *Refusal {
	in := t.Rec.Info()
	at := func(frame int64) float64 { return in.StartS + float64(frame)/in.RateHz }
	for _, c := range channels {
		if c == 0 {
			continue
		}
		if t.Health != nil {
			if r, ok := t.Health.Clipped(c, from, to); ok {
				return &Refusal{Clipped,
					fmt.Sprintf("take %q, channel %d: the recorder is at full scale from %.6g s to %.6g s", t.Name, c, at(r.From), at(r.To)),
					"lower the level by 6 dB and record again, or set a span without it"}
			}
		}
		for _, r := range in.Missing {
			if (r.Channel == c || r.Channel == 0) && r.From < to && r.To > from {
				return &Refusal{Unreadable,
					fmt.Sprintf("take %q, channel %d: samples without a value (%s) from %.6g s to %.6g s", t.Name, c, r.Why, at(r.From), at(r.To)),
					"set a span without them, or record again"}
			}
		}
	}
	return nil
}

// ResolveChannel finds the channel that text names: a number from 1, a CSV
// column's name without its unit, its whole header text (which wins), or a
// difference "1-2". minus is 0 for a single channel.
func ResolveChannel(text string, in *recording.Info) (plus, minus int, err error) {
	if n, ok, err := oneChannel(text, in); ok || err != nil {
		return n, 0, err
	}
	for i := 1; i < len(text)-1; i++ {
		if text[i] != '-' {
			continue
		}
		a, okA, errA := oneChannel(strings.TrimSpace(text[:i]), in)
		b, okB, errB := oneChannel(strings.TrimSpace(text[i+1:]), in)
		if errA == nil && errB == nil && okA && okB {
			return a, b, nil
		}
	}
	return 0, 0, fmt.Errorf("no channel %q; the file has %s", text, channelNames(in))
}

func oneChannel(text string, in *recording.Info) (n int, ok bool, err error) {
	full, short := 0, 0
	for i, c := range in.Channels {
		if c.Full != "" && c.Full == text && full == 0 {
			full = i + 1
		}
		if c.Name != "" && c.Name == text {
			if short != 0 {
				err = fmt.Errorf("%q names two columns", text)
			}
			short = i + 1
		}
	}
	switch {
	case full != 0:
		return full, true, nil
	case short != 0:
		return short, err == nil, err
	}
	if n, e := strconv.Atoi(text); e == nil {
		if n >= 1 && n <= len(in.Channels) {
			return n, true, nil
		}
		return 0, false, fmt.Errorf("channel %d is not there; the file has %s", n, channelNames(in))
	}
	return 0, false, nil
}

func channelNames(in *recording.Info) string {
	var names []string
	for i, c := range in.Channels {
		if c.Name != "" {
			names = append(names, fmt.Sprintf("%d (%s)", i+1, c.Name))
		} else {
			names = append(names, strconv.Itoa(i+1))
		}
	}
	return "channels " + strings.Join(names, ", ")
}

// Stages keeps shared results of a run, each computed once. Safe for
// concurrent use.
type Stages struct {
	mu   sync.Mutex
	done map[string]*stage
}

type stage struct {
	once  sync.Once
	value any
}

// NewStages returns an empty store.
func NewStages() *Stages { return &Stages{done: map[string]*stage{}} }

// Once returns the value kept under key, computing it the first time. Typed
// accessors of the stage packages wrap it.
func (s *Stages) Once(key string, compute func() any) any {
	s.mu.Lock()
	st := s.done[key]
	if st == nil {
		st = &stage{}
		s.done[key] = st
	}
	s.mu.Unlock()
	st.once.Do(func() { st.value = compute() })
	return st.value
}
