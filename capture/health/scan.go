package health

import (
	"fmt"
	"math"

	"benchslip/capture/recording"
)

const (
	cell      = 4096     // frames summed as one
	cellBlock = 4 * cell // frames read at a time
)

// Report is what the samples of one recording say.
type Report struct {
	Levels []Level          // one a channel, in file order
	Flags  []recording.Flag // by kind, then channel, then place; Take is empty

	clips [][]recording.Run // by channel index; in order, apart from each other
}

// Clipped says whether channel (from 1; 0: any) holds clipped samples among
// the frames [from, to), and where the first of them lie.
//
// Where a channel clips in more places than are kept (see maxRuns), close
// neighbours are kept as one run, the clean samples between them included.
func (r *Report) Clipped(channel int, from, to int64) (recording.Run, bool) {
	var first recording.Run
	found := false
	for c, runs := range r.clips {
		if channel != 0 && channel != c+1 {
			continue
		}
		for _, run := range runs {
			if run.From >= to {
				break
			}
			if run.To > from {
				if !found || run.From < first.From {
					first, found = run, true
				}
				break
			}
		}
	}
	return first, found
}

// Scan reads all frames of rec once. Besides what reading itself can raise,
// it fails when the recording ends before Info().Frames.
func Scan(rec recording.Recording) (*Report, error) {
	return scan(rec, cellBlock)
}

// scan reads block frames at a time, a multiple of cell.
func scan(rec recording.Recording, block int) (*Report, error) {
	in := rec.Info()
	chans := make([]*channel, len(in.Channels))
	buf := make([][]float64, len(chans))
	for c := range chans {
		chans[c] = newChannel(in, c)
		buf[c] = make([]float64, history+block)
		for i := range history {
			buf[c][i] = math.NaN()
		}
	}
	same := newTwins(len(chans))

	part := make([][]float64, len(chans))
	for at := int64(0); at < in.Frames; {
		n, err := fill(rec, buf, part, at, min(int64(block), in.Frames-at))
		if err != nil {
			return nil, err
		}
		for k := 0; k < n; k += cell {
			for c := range part {
				w := buf[c][k:min(k+history+cell, history+n)]
				part[c] = w[history:]
				chans[c].feed(w, at+int64(k))
			}
			same.feed(part)
		}
		for c := range buf {
			copy(buf[c], buf[c][n:n+history])
		}
		at += int64(n)
	}

	for _, ch := range chans {
		ch.close(in.Frames)
	}
	return report(again{rec, in}, chans, same)
}

// report draws up the levels and flags when all frames are through.
func report(g again, chans []*channel, same *twins) (*Report, error) {
	r := &Report{}
	var events []event
	for _, ch := range chans {
		r.Levels = append(r.Levels, ch.level())
		r.clips = append(r.clips, ch.clips())
		for _, look := range []func(again, *channel) ([]event, error){repeats, gaps} {
			e, err := look(g, ch)
			if err != nil {
				return nil, err
			}
			events = append(events, e...)
		}
	}
	for c, ch := range chans {
		r.add(clippedFlag(g.in, c, ch))
	}
	for _, look := range []func(again, int, *channel) (*recording.Flag, error){flatTopFlag, fewCodesFlag} {
		for c, ch := range chans {
			f, err := look(g, c, ch)
			if err != nil {
				return nil, err
			}
			r.add(f)
		}
	}
	r.Flags = append(r.Flags, eventFlags(g.in, events)...)
	for c, ch := range chans {
		r.add(silentFlag(g.in, c, ch))
	}
	for c, ch := range chans {
		r.add(twinFlag(g.in, c, ch, same))
	}
	return r, nil
}

func (r *Report) add(f *recording.Flag) {
	if f != nil {
		r.Flags = append(r.Flags, *f)
	}
}

// fill reads want frames from frame at into buf, after the history; part is
// scratch.
func fill(rec recording.Recording, buf, part [][]float64, at, want int64) (int, error) {
	got := int64(0)
	for got < want {
		for c := range buf {
			part[c] = buf[c][history+got : history+want]
		}
		n, err := rec.ReadAt(part, at+got)
		if err != nil {
			return 0, err
		}
		if n == 0 {
			return 0, fmt.Errorf("health: only %d of %d frames could be read", at+got, rec.Info().Frames)
		}
		got += int64(n)
	}
	return int(got), nil
}

// place gives frames [from, to) on the recording's own time axis: nil, nil
// when the rate is unknown.
func place(in *recording.Info, from, to int64) (*float64, *float64) {
	if in.RateHz <= 0 {
		return nil, nil
	}
	return recording.Place(in.StartS+float64(from)/in.RateHz, in.StartS+float64(to)/in.RateHz)
}

// where names frame n in words: by time, or by number when the rate is
// unknown.
func where(in *recording.Info, n int64) string {
	if in.RateHz <= 0 {
		return fmt.Sprintf("frame %d", n)
	}
	return fmt.Sprintf("%.6g s", in.StartS+float64(n)/in.RateHz)
}
