package wav

import (
	"encoding/binary"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"math"
	"os"
	"sync"

	"benchslip/capture/recording"
)

// Sniff reports whether head, the first bytes of a file (12 are enough),
// belongs to a WAV file of any kind. It is also true for kinds that Open
// refuses, such as the big-endian one, so that they get an answer by name.
// The name of a file plays no part.
func Sniff(head []byte) bool {
	if len(head) < 12 || string(head[8:12]) != "WAVE" {
		return false
	}
	switch string(head[:4]) {
	case "RIFF", "RIFX", "RF64", "BW64":
		return true
	}
	return false
}

// Open opens the WAV file at path. Samples are fractions of full scale:
// integer code c is c / 2^(container bits - 1), unsigned 8-bit code c is
// (c - 128) / 128, float samples stand as they are, also beyond 1.
//
// Errors are *recording.Error with a byte offset and class ErrFormat or
// ErrUnsupported, or the error of the operating system. Folders, pipes and
// devices are refused without being opened.
func Open(path string) (recording.Recording, error) {
	st, err := os.Stat(path)
	if err != nil {
		return nil, pathError(path, err)
	}
	if !st.Mode().IsRegular() {
		return nil, &recording.Error{Path: path, Offset: -1, Class: recording.ErrFormat,
			What: "not a regular file but " + kindOf(st.Mode())}
	}
	f, err := os.Open(path)
	if err != nil {
		return nil, pathError(path, err)
	}
	r, err := newReader(f, st.Size(), path)
	if err != nil {
		f.Close()
		return nil, err
	}
	r.close = f.Close
	return r, nil
}

// reader is an opened WAV file. It holds no position: ReadAt may be called
// from several goroutines at once.
type reader struct {
	src    io.ReaderAt
	close  func() error
	path   string
	info   recording.Info
	enc    encoding
	dataAt int64 // byte offset of frame 0
}

// newReader walks the size bytes of src. path is for messages only.
func newReader(src io.ReaderAt, size int64, path string) (*reader, error) {
	l, err := walk(src, size, path)
	if err != nil {
		return nil, err
	}
	enc, err := parseFormat(l.format, l.formatAt, path)
	if err != nil {
		return nil, err
	}
	r := &reader{src: src, path: path, enc: enc, dataAt: l.dataAt}
	frame := int64(enc.frameBytes())
	r.info = recording.Info{
		Format: l.family() + " " + enc.words(),
		Kind:   recording.Audio,
		RateHz: float64(enc.rate),
		Frames: l.dataLen / frame,
		Bytes:  size,
		Text:   l.text,
	}
	ch := recording.Channel{Unit: "FS"}
	if !enc.float {
		ch.Bits, ch.Step = enc.valid, math.Ldexp(1, 1-enc.valid)
	}
	for range enc.channels {
		r.info.Channels = append(r.info.Channels, ch)
	}
	l.judgeSizes(&r.info, frame)
	if enc.float {
		if err := r.findMissing(); err != nil {
			return nil, err
		}
	}
	return r, nil
}

func (r *reader) Info() *recording.Info { return &r.info }

func (r *reader) Close() error {
	if r.close == nil {
		return nil
	}
	return r.close()
}

// blockBytes is the size of one read: small enough to stay in the cache while
// each channel is picked out of it in turn, large enough that the system call
// does not count.
const blockBytes = 1 << 17

// headroom bytes stand before the file's bytes in a block and tailroom bytes
// after them, so that 24-bit samples can be loaded as words that begin one
// byte before them or end one byte after.
const headroom, tailroom = 1, 1

var blocks = sync.Pool{New: func() any {
	b := make([]byte, headroom+blockBytes+tailroom)
	return &b
}}

// ReadAt fills the planar buffers of dst, one entry a channel (nil: left out),
// with the frames that start at frame; see recording.Recording.
func (r *reader) ReadAt(dst [][]float64, frame int64) (int, error) {
	if len(dst) != r.enc.channels {
		return 0, fmt.Errorf("wav: %s: %d buffers for %d channels", r.path, len(dst), r.enc.channels)
	}
	want := -1
	for _, d := range dst {
		switch {
		case d == nil:
		case want < 0:
			want = len(d)
		case want != len(d):
			return 0, fmt.Errorf("wav: %s: buffers of %d and %d frames", r.path, want, len(d))
		}
	}
	if frame < 0 {
		return 0, fmt.Errorf("wav: %s: frame %d before the start", r.path, frame)
	}
	if want <= 0 || frame >= r.info.Frames {
		return 0, nil
	}
	want = int(min(int64(want), r.info.Frames-frame))

	buf := blocks.Get().(*[]byte)
	defer blocks.Put(buf)
	size, step := r.enc.frameBytes(), r.enc.bytes
	pair := len(dst) == 2 && step == 3
	for done := 0; done < want; {
		n := min(want-done, blockBytes/size)
		raw := (*buf)[:headroom+n*size+tailroom]
		if err := r.read(raw[headroom:headroom+n*size], frame+int64(done)); err != nil {
			return done, err
		}
		if pair && dst[0] != nil && dst[1] != nil {
			int24stereo(dst[0][done:done+n], dst[1][done:done+n], raw)
			done += n
			continue
		}
		for c, d := range dst {
			if d != nil {
				r.enc.convert(d[done:done+n], raw, c*step, size)
			}
		}
		done += n
	}
	return want, nil
}

// read fills b with the bytes that start at frame.
func (r *reader) read(b []byte, frame int64) error {
	at := r.dataAt + frame*int64(r.enc.frameBytes())
	n, err := r.src.ReadAt(b, at)
	if n == len(b) {
		return nil
	}
	if err == nil || errors.Is(err, io.EOF) {
		return &recording.Error{Path: r.path, Offset: at + int64(n), Class: recording.ErrFormat,
			What: "the file became shorter while it was read"}
	}
	return &recording.Error{Path: r.path, Offset: at + int64(n), What: "cannot be read: " + cause(err).Error(), Class: err}
}

// pathError turns an error of the operating system into one line with the
// path said once.
func pathError(path string, err error) error {
	return &recording.Error{Path: path, Offset: -1, What: cause(err).Error(), Class: err}
}

// cause strips the operation and path that fs.PathError adds.
func cause(err error) error {
	var pe *fs.PathError
	if errors.As(err, &pe) {
		return pe.Err
	}
	return err
}

func kindOf(m fs.FileMode) string {
	switch {
	case m.IsDir():
		return "a folder"
	case m&fs.ModeNamedPipe != 0:
		return "a pipe"
	case m&fs.ModeSocket != 0:
		return "a socket"
	case m&fs.ModeDevice != 0:
		return "a device"
	}
	return "something else"
}

var le = binary.LittleEndian
