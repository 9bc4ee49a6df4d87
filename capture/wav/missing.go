package wav

import (
	"fmt"

	"benchslip/capture/recording"
)

// maxRuns bounds the list of missing places a channel. A file with more has
// its last run stretched to the last bad sample, so that nothing bad is left
// outside the list.
const maxRuns = 1000

// findMissing reads a float recording once and lists the samples that are not
// finite. It costs one pass over the bytes, at about the speed of reading.
func (r *reader) findMissing() error {
	type tally struct {
		runs  []recording.Run
		count int64
	}
	size := r.enc.frameBytes()
	channels := make([]tally, r.enc.channels)
	buf := blocks.Get().(*[]byte)
	defer blocks.Put(buf)
	part := make([]float64, blockBytes/size)
	for at := int64(0); at < r.info.Frames; {
		n := int(min(int64(blockBytes/size), r.info.Frames-at))
		raw := (*buf)[:headroom+n*size]
		if err := r.read(raw[headroom:], at); err != nil {
			return err
		}
		if !allFinite(raw[headroom:], r.enc.bytes) {
			for c := range channels {
				t := &channels[c]
				r.enc.convert(part[:n], raw, c*r.enc.bytes, size)
				for i, x := range part[:n] {
					if x == x {
						continue
					}
					t.count++
					frame := at + int64(i)
					last := len(t.runs) - 1
					if last >= 0 && (t.runs[last].To == frame || len(t.runs) == maxRuns) {
						t.runs[last].To = frame + 1
						continue
					}
					t.runs = append(t.runs, recording.Run{Channel: c + 1, From: frame, To: frame + 1, Why: "not a number"})
				}
			}
		}
		at += int64(n)
	}
	for c, t := range channels {
		if t.count == 0 {
			continue
		}
		r.info.Missing = append(r.info.Missing, t.runs...)
		f := recording.Flag{Code: recording.Overrange, Channel: c + 1}
		from := float64(t.runs[0].From) / r.info.RateHz
		to := float64(t.runs[len(t.runs)-1].To) / r.info.RateHz
		f.FromS, f.ToS = recording.Place(from, to)
		f.Message = fmt.Sprintf("%d samples are no finite numbers, between %.6g s and %.6g s", t.count, from, to)
		if t.count == 1 {
			f.Message = fmt.Sprintf("the sample at %.6g s is no finite number", from)
		}
		r.info.Flags = append(r.info.Flags, f)
	}
	return nil
}

// allFinite looks at the exponents alone: raw holds floats of width bytes.
func allFinite(raw []byte, width int) bool {
	if width == 4 {
		for ; len(raw) >= 4; raw = raw[4:] {
			if le.Uint32(raw)&exponent32 == exponent32 {
				return false
			}
		}
		return true
	}
	for ; len(raw) >= 8; raw = raw[8:] {
		if le.Uint64(raw)&exponent64 == exponent64 {
			return false
		}
	}
	return true
}
