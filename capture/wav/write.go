package wav

import (
	"bufio"
	"fmt"
	"maps"
	"math"
	"math/rand/v2"
	"os"
	"path/filepath"
	"slices"
)

// Format says how a file is to be written.
type Format struct {
	RateHz   int // frames a second, 1 .. 2^32-1
	Channels int // 1 .. MaxChannels
	Bits     int // integers 8 (unsigned), 16, 24, 32; float 32, 64
	Float    bool

	// Dither adds noise of triangular density, two steps wide peak to peak,
	// before an integer sample is rounded: the error's mean and variance then
	// no longer depend on the signal (Lipshitz, Wannamaker, Vanderkooy 1992),
	// and its RMS is sqrt(1/12 + 2/12) = 0.5 step. Seed chooses the noise; the
	// same seed gives the same file.
	Dither bool
	Seed   uint64
}

func (f Format) check() error {
	switch {
	case f.RateHz < 1 || int64(f.RateHz) > math.MaxUint32:
		return fmt.Errorf("wav: a sample rate of %d Hz, wanted 1 .. %d", f.RateHz, uint32(math.MaxUint32))
	case f.Channels < 1 || f.Channels > MaxChannels:
		return fmt.Errorf("wav: %d channels, wanted 1 .. %d", f.Channels, MaxChannels)
	case f.Float && f.Bits != 32 && f.Bits != 64:
		return fmt.Errorf("wav: %d-bit float, wanted 32 or 64", f.Bits)
	case !f.Float && (f.Bits%8 != 0 || f.Bits < 8 || f.Bits > 32):
		return fmt.Errorf("wav: %d-bit integers, wanted 8, 16, 24 or 32", f.Bits)
	case f.Float && f.Dither:
		return fmt.Errorf("wav: dither is for integer samples")
	}
	return nil
}

// ClipError says that a sample does not fit the format. Nothing is clipped
// silently: the file is not written.
type ClipError struct {
	Path    string
	Channel int   // from 1
	Frame   int64 // from 0
	Value   float64
}

func (e *ClipError) Error() string {
	return fmt.Sprintf("%s: channel %d, frame %d: the sample %.6g does not fit the format; lower the level", e.Path, e.Channel, e.Frame, e.Value)
}

// maxDataBytes leaves room for the headers below the 32-bit outer size.
const maxDataBytes = math.MaxUint32 - 1<<20

// Writer writes one WAV file block by block. The file appears at its path when
// Close succeeds; until then it lies beside it under a name with a leading dot.
// A Writer is for one goroutine. After an error every call returns that error.
type Writer struct {
	path, part string
	f          *os.File
	buf        *bufio.Writer
	format     Format
	noise      []*rand.PCG // one a channel, so that blocks of any size give one file
	frames     int64
	dataAt     int64 // byte offset of frame 0
	raw        []byte
	err        error
}

// Create begins a file. info holds descriptive text by four-letter INFO name
// (ICMT, INAM ...); it is stored before the samples, in order of name.
func Create(path string, format Format, info map[string]string) (*Writer, error) {
	if err := format.check(); err != nil {
		return nil, err
	}
	list, err := infoList(info)
	if err != nil {
		return nil, err
	}
	w := &Writer{path: path, format: format, part: filepath.Join(filepath.Dir(path), "."+filepath.Base(path)+".part")}
	for c := range format.Channels {
		w.noise = append(w.noise, rand.NewPCG(format.Seed, uint64(c)))
	}
	if w.f, err = os.Create(w.part); err != nil {
		return nil, pathError(path, err)
	}
	w.buf = bufio.NewWriterSize(w.f, 1<<16)
	head := append(format.header(), list...)
	head = append(head, "data\x00\x00\x00\x00"...)
	w.dataAt = int64(len(head))
	if _, err := w.buf.Write(head); err != nil {
		w.abandon(err)
		return nil, w.err
	}
	return w, nil
}

// header is everything up to the fmt and fact chunks; sizes are filled in by
// Close. More than two channels or more than 24 integer bits take the
// extensible form, as its documentation asks; the rest the oldest form that
// every program reads.
func (f Format) header() []byte {
	tag := tagPCM
	if f.Float {
		tag = tagFloat
	}
	wide := f.Channels > 2 || !f.Float && f.Bits > 24
	size := 16
	switch {
	case wide:
		size = 40
	case f.Float:
		size = 18 // other than PCM: with an empty extension
	}
	fm := make([]byte, size)
	frame := f.Channels * f.Bits / 8
	le.PutUint16(fm, uint16(tag))
	le.PutUint16(fm[2:], uint16(f.Channels))
	le.PutUint32(fm[4:], uint32(f.RateHz))
	le.PutUint32(fm[8:], uint32(f.RateHz*frame))
	le.PutUint16(fm[12:], uint16(frame))
	le.PutUint16(fm[14:], uint16(f.Bits))
	if wide {
		le.PutUint16(fm, tagExtensible)
		le.PutUint16(fm[16:], 22)
		le.PutUint16(fm[18:], uint16(f.Bits))
		// speaker mask 0: channels stand for inputs, not for loudspeakers
		le.PutUint16(fm[24:], uint16(tag))
		copy(fm[26:], subFormatTail)
	}
	b := appendChunk([]byte("RIFF\x00\x00\x00\x00WAVE"), "fmt ", fm)
	if f.Float {
		b = appendChunk(b, "fact", make([]byte, 4)) // number of frames
	}
	return b
}

// appendChunk appends a chunk with its pad byte.
func appendChunk(b []byte, id string, body []byte) []byte {
	b = le.AppendUint32(append(b, id...), uint32(len(body)))
	b = append(b, body...)
	if len(body)%2 == 1 {
		b = append(b, 0)
	}
	return b
}

func infoList(info map[string]string) ([]byte, error) {
	if len(info) == 0 {
		return nil, nil
	}
	body := []byte("INFO")
	for _, id := range slices.Sorted(maps.Keys(info)) {
		for _, c := range id {
			if (c < 'A' || c > 'Z') && (c < '0' || c > '9') {
				return nil, fmt.Errorf("wav: INFO name %q, wanted 4 capital letters or digits", id)
			}
		}
		if len(id) != 4 {
			return nil, fmt.Errorf("wav: INFO name %q, wanted 4 capital letters or digits", id)
		}
		text := info[id]
		if i := slices.Index([]byte(text), 0); i >= 0 || len(text) > maxTextBytes/2 {
			return nil, fmt.Errorf("wav: INFO text %s is too long or holds a zero byte", id)
		}
		body = appendChunk(body, id, append([]byte(text), 0))
	}
	return appendChunk(nil, "LIST", body), nil
}

// WriteBlock appends frames: one slice a channel, all of one length, in
// fractions of full scale. An integer sample that rounds outside the codes, a
// float sample that is not finite in its width: *ClipError, and the file is
// given up. The largest positive code is one step below 1.
func (w *Writer) WriteBlock(block [][]float64) error {
	if w.err != nil {
		return w.err
	}
	if len(block) != w.format.Channels {
		return w.abandon(fmt.Errorf("wav: %s: %d channels in a block, wanted %d", w.path, len(block), w.format.Channels))
	}
	n := len(block[0])
	for _, x := range block {
		if len(x) != n {
			return w.abandon(fmt.Errorf("wav: %s: channels of %d and %d frames in one block", w.path, n, len(x)))
		}
	}
	step := w.format.Bits / 8
	frame := step * w.format.Channels
	if (w.frames+int64(n))*int64(frame) > maxDataBytes {
		return w.abandon(fmt.Errorf("wav: %s: over 4 GB of samples; write a shorter file", w.path))
	}
	for done := 0; done < n; {
		k := min(n-done, max(1, 1<<16/frame))
		w.raw = slices.Grow(w.raw[:0], k*frame)[:k*frame]
		for c, x := range block {
			if i, ok := w.encode(w.raw[c*step:], x[done:done+k], frame, w.noise[c]); !ok {
				return w.abandon(&ClipError{Path: w.path, Channel: c + 1, Frame: w.frames + int64(i), Value: x[done+i]})
			}
		}
		if _, err := w.buf.Write(w.raw); err != nil {
			return w.abandon(err)
		}
		w.frames += int64(k)
		done += k
	}
	return nil
}

// encode writes one channel's samples to dst, stride bytes apart. It returns
// the index of the first sample that does not fit and false.
func (w *Writer) encode(dst []byte, x []float64, stride int, noise *rand.PCG) (int, bool) {
	bits := w.format.Bits
	if w.format.Float {
		for i, v := range x {
			d := dst[i*stride:]
			if bits == 64 {
				le.PutUint64(d, math.Float64bits(v))
			} else {
				u := math.Float32bits(float32(v))
				le.PutUint32(d, u)
				v = float64(math.Float32frombits(u))
			}
			if math.IsNaN(v) || math.IsInf(v, 0) {
				return i, false
			}
		}
		return 0, true
	}
	scale := math.Ldexp(1, bits-1)
	for i, v := range x {
		v *= scale
		if w.format.Dither {
			// The difference of two uniform numbers of 32 bits each is
			// triangular over (-1, 1) steps.
			u := noise.Uint64()
			v += (float64(u>>32) - float64(u&0xFFFFFFFF)) * 0x1p-32
		}
		v = math.RoundToEven(v)
		if !(v >= -scale && v < scale) { // NaN too
			return i, false
		}
		code := int32(v)
		d := dst[i*stride:]
		switch bits {
		case 8:
			d[0] = byte(code + 128)
		case 16:
			le.PutUint16(d, uint16(code))
		case 24:
			d[0], d[1], d[2] = byte(code), byte(code>>8), byte(code>>16)
		case 32:
			le.PutUint32(d, uint32(code))
		}
	}
	return 0, true
}

// Close fills in the sizes and moves the file to its path, replacing one that
// is there.
func (w *Writer) Close() error {
	if w.f == nil {
		return w.err
	}
	size := w.frames * int64(w.format.Channels*w.format.Bits/8)
	if size%2 == 1 {
		w.buf.WriteByte(0)
	}
	if err := w.buf.Flush(); err != nil {
		return w.abandon(err)
	}
	patch := func(at, v int64) {
		b := le.AppendUint32(nil, uint32(v))
		if _, err := w.f.WriteAt(b, at); err != nil && w.err == nil {
			w.abandon(err)
		}
	}
	patch(4, w.dataAt+size+size%2-8)
	patch(w.dataAt-4, size)
	if w.format.Float {
		// fact is the second chunk: its value follows 12 bytes, fmt and 8 more
		fm := int64(18)
		if w.format.Channels > 2 {
			fm = 40
		}
		patch(12+8+fm+8, w.frames)
	}
	if w.err != nil {
		return w.err
	}
	err := w.f.Close()
	w.f = nil
	if err == nil {
		err = os.Rename(w.part, w.path)
	}
	if err != nil {
		os.Remove(w.part)
		w.err = pathError(w.path, err)
	}
	return w.err
}

// Discard gives the file up: nothing appears at its path. It is harmless
// after Close, so it may be deferred.
func (w *Writer) Discard() {
	if w.f != nil {
		w.abandon(fmt.Errorf("wav: %s: given up", w.path))
	}
}

// abandon keeps the first error and removes what was written.
func (w *Writer) abandon(err error) error {
	if w.err == nil {
		if w.err = err; cause(err) != err {
			w.err = pathError(w.path, err)
		}
	}
	if w.f != nil {
		w.f.Close()
		w.f = nil
		os.Remove(w.part)
	}
	return w.err
}
