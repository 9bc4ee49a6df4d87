// Package memory is a Recording held in memory: for tests and for takes that
// were computed rather than read.
package memory

import "benchslip/capture/recording"

// Recording holds planar samples.
type Recording struct {
	In   recording.Info
	Data [][]float64
}

// New makes a recording of planar data of one length: kind recording.Audio
// (fractions of full scale) or recording.Scope (volts).
func New(kind string, rateHz float64, data ...[]float64) *Recording {
	r := &Recording{Data: data}
	unit := "V"
	if kind == recording.Audio {
		unit = "FS"
	}
	r.In = recording.Info{Format: "memory", Kind: kind, RateHz: rateHz, Frames: int64(len(data[0]))}
	for range data {
		r.In.Channels = append(r.In.Channels, recording.Channel{Unit: unit})
	}
	return r
}

// Info implements recording.Recording.
func (r *Recording) Info() *recording.Info { return &r.In }

// ReadAt implements recording.Recording.
func (r *Recording) ReadAt(dst [][]float64, frame int64) (int, error) {
	n := 0
	for c, d := range dst {
		if d != nil && frame < r.In.Frames {
			n = copy(d, r.Data[c][frame:])
		}
	}
	return n, nil
}

// Close implements recording.Recording.
func (r *Recording) Close() error { return nil }
