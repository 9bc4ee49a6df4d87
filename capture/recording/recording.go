// Package recording is the contract of the capture rooms: what an importer
// hands over, in which units, and how it says that something is wrong.
//
// It stands apart from package capture so that the importers can share it
// with the list that names them; everything else uses the names in package
// capture.
package recording

import (
	"fmt"
	"strings"
)

// Kinds of samples a recording can hold.
const (
	Audio = "audio" // samples are fractions of digital full scale, unit "FS"
	Scope = "scope" // samples are volts at the instrument's input, unit "V"
)

// Recording is an opened file of samples. ReadAt may be called from several
// goroutines at once.
type Recording interface {
	// Info returns what is known about the file. It never changes after the
	// recording was opened, except that a reader may add flags at Close.
	Info() *Info

	// ReadAt fills the planar buffers with the frames that start at frame
	// (0 is the first). dst has one entry per channel of the file; a nil
	// entry leaves that channel out, all others have one length. It returns
	// the number of frames filled, which is short only at the end of the
	// recording or with an error; reading past the end gives 0, nil.
	//
	// Values are fractions of full scale ("FS": integer code c is
	// c / 2^(container bits - 1)) or volts ("V"). A sample without a value
	// (blank, overrange, non-finite) is NaN and listed in Info.Missing.
	ReadAt(dst [][]float64, frame int64) (int, error)

	Close() error
}

// Info describes a recording.
type Info struct {
	Format   string    // in words: "WAV 24-bit PCM", "scope CSV"
	Kind     string    // Audio or Scope
	RateHz   float64   // sample rate; 0 when unknown (flagged rate-doubt)
	StartS   float64   // time of frame 0 in s: 0 for WAV, the time column's first value for CSV
	Channels []Channel // in file order; channel number is index + 1
	Frames   int64     // whole frames present
	Bytes    int64     // size of the file

	// Assumptions says in one sentence each what was taken from where:
	// separator, decimal mark, units, rate.
	Assumptions []string
	Flags       []Flag
	Missing     []Run // places without a value, in order of channel, then frame

	// Text holds descriptive fields of the file by name (WAV LIST/INFO,
	// CSV preamble), as written. Nothing is applied from it.
	Text map[string]string
}

// DurationS is the length in s; 0 when the rate is unknown.
func (in *Info) DurationS() float64 {
	if in.RateHz <= 0 {
		return 0
	}
	return float64(in.Frames) / in.RateHz
}

// Channel describes one channel of a recording.
type Channel struct {
	Name string  // column name without its unit; "" for WAV
	Full string  // the whole header text of the column; "" for WAV
	Unit string  // "FS", "V", or "" when the file does not say (flagged)
	Step float64 // size of one converter step in Unit; 0 when there is none (float) or it is unknown
	Bits int     // valid bits of an integer format; 0 otherwise
}

// Run is a stretch of frames [From, To) of one channel (number from 1; 0: all).
type Run struct {
	Channel  int
	From, To int64
	Why      string // "blank", "overrange", "not a number", ...
}

// Flag is a coded warning that travels with a take or a result.
type Flag struct {
	Code    string   // one of the codes in codes.go
	Take    string   // name of the take; "" until a job names it
	Channel int      // from 1; 0: the whole take
	Message string   // one sentence with evidence and figures
	FromS   *float64 // place in s on the recording's own time axis; nil: no place
	ToS     *float64
}

// Place returns pointers for Flag.FromS and Flag.ToS.
func Place(from, to float64) (*float64, *float64) { return &from, &to }

// Cause classes: what the user can do next differs for each.
var (
	ErrFormat      = fmt.Errorf("not a recording that can be read") // broken, or no known format
	ErrUnsupported = fmt.Errorf("unsupported")                      // valid, but of a kind that is not read
	ErrAmbiguous   = fmt.Errorf("ambiguous")                        // needs a word in the job file
)

// Error is a fault of a recording with its place.
type Error struct {
	Path   string // file as the user named it
	Line   int    // text files: 1-based line; 0: none
	Column int    // text files: 1-based column of the text; 0: none
	Offset int64  // binary files: byte offset; -1: none
	What   string // what is wrong: got and wanted, one sentence
	Fix    string // what to do about it; "" when there is nothing
	Class  error  // ErrFormat, ErrUnsupported, ErrAmbiguous or an I/O error
}

func (e *Error) Error() string {
	var b strings.Builder
	b.WriteString(e.Path)
	switch {
	case e.Line > 0 && e.Column > 0:
		fmt.Fprintf(&b, ":%d:%d", e.Line, e.Column)
	case e.Line > 0:
		fmt.Fprintf(&b, ":%d", e.Line)
	case e.Offset > 0:
		fmt.Fprintf(&b, ": byte %d", e.Offset)
	}
	b.WriteString(": ")
	b.WriteString(e.What)
	if e.Fix != "" {
		b.WriteString("; ")
		b.WriteString(e.Fix)
	}
	return b.String()
}

func (e *Error) Unwrap() error { return e.Class }

// ReadAll reads channels (indexes from 0; nil: all) whole. The caller answers
// for the memory: 8 bytes a sample.
func ReadAll(r Recording, channels ...int) ([][]float64, error) {
	in := r.Info()
	dst := make([][]float64, len(in.Channels))
	if channels == nil {
		for c := range dst {
			channels = append(channels, c)
		}
	}
	for _, c := range channels {
		dst[c] = make([]float64, in.Frames)
	}
	part := make([][]float64, len(dst))
	for at := int64(0); at < in.Frames; {
		for c := range dst {
			if dst[c] != nil {
				part[c] = dst[c][at:]
			}
		}
		n, err := r.ReadAt(part, at)
		if err != nil {
			return nil, err
		}
		if n == 0 {
			return nil, fmt.Errorf("recording: only %d of %d frames could be read", at, in.Frames)
		}
		at += int64(n)
	}
	return dst, nil
}

// Options are what a job file can say about a text recording ([takes.x.csv]);
// zero values mean "find it".
type Options struct {
	Separator  string  // ",", ";", "tab", "blank"
	Decimal    string  // "." or ","
	Skip       int     // rows to skip at the top
	TimeColumn string  // header text or number from 1; "none"
	TimeUnit   string  // s, ms, us, ns
	RateHz     float64 // sample rate to use
	ValueUnit  string  // V, mV, uV
	Resample   bool    // put non-uniform samples on a uniform grid
}
