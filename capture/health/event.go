package health

import (
	"cmp"
	"fmt"
	"slices"

	"benchslip/capture/recording"
)

// maxEvents is how many repeats and gaps of a take are flagged one by one;
// the rest shares one flag.
const maxEvents = 8

// event is a place where samples repeat or are missing.
type event struct {
	code     string
	channel  int // from 1; 0: all
	from, to int64
	what     string
}

// eventFlags makes flags of the events of all channels, in order of time. An
// event that all channels share is one of the take.
func eventFlags(in *recording.Info, events []event) []recording.Flag {
	slices.SortStableFunc(events, func(a, b event) int {
		return cmp.Or(cmp.Compare(a.from, b.from), cmp.Compare(a.code, b.code), cmp.Compare(a.channel, b.channel))
	})
	if n := len(in.Channels); n > 1 {
		events = shared(events, n)
	}
	var flags []recording.Flag
	for i, e := range events {
		f := recording.Flag{Code: e.code, Channel: e.channel}
		f.FromS, f.ToS = place(in, e.from, e.to)
		f.Message = fmt.Sprintf("at %s: %s", where(in, e.from), e.what)
		if i == maxEvents && len(events) > maxEvents+1 {
			last := int64(0)
			f.Channel = 0
			for _, r := range events[i:] {
				last = max(last, r.to)
			}
			f.FromS, f.ToS = place(in, e.from, last)
			f.Message = fmt.Sprintf("%d more places with repeated or missing samples from %s to %s", len(events)-maxEvents, where(in, e.from), where(in, last))
			return append(flags, f)
		}
		flags = append(flags, f)
	}
	return flags
}

// shared makes one event of neighbours in the list that lie at the same
// place (to 64 frames) in all n channels.
func shared(events []event, n int) []event {
	var out []event
	done := make([]bool, len(events))
	for i, e := range events {
		if done[i] {
			continue
		}
		same := []int{i}
		for k := i + 1; k < len(events) && events[k].from-e.from <= 64; k++ {
			f := events[k]
			if f.code == e.code && !done[k] && f.channel != e.channel && max(f.to-e.to, e.to-f.to) <= 64 {
				same = append(same, k)
			}
		}
		if len(same) == n {
			for _, k := range same {
				done[k] = true
			}
			e.channel = 0
		}
		done[i] = true
		out = append(out, e)
	}
	return out
}

// step is the step on which the samples of a channel lie, 0 when none shows.
func (ch *channel) step(in *recording.Info) float64 {
	if s := ch.codes.step(); s > 0 {
		return s
	}
	return in.Channels[ch.number-1].Step
}
