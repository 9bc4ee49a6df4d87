package wav

import (
	"errors"
	"fmt"
	"io"

	"benchslip/capture/recording"
)

const (
	// maxChunks bounds the walk. Real files hold a dozen chunks; a file made
	// of empty ones would otherwise be walked 8 bytes at a time.
	maxChunks = 1 << 14

	// unknownSize in a 32-bit size field says "see ds64", or that the writer
	// never came back to fill it in.
	unknownSize = 0xFFFFFFFF

	maxFormatBytes = 64 // of a fmt chunk that are looked at
)

// layout is what the walk over the chunks found.
type layout struct {
	form     string // RIFF, RF64 or BW64
	size     int64  // of the file
	format   []byte // first bytes of the fmt chunk's body
	formatAt int64  // its byte offset, 0 while none was found
	dataAt   int64  // byte offset of the first sample, 0 while none was found
	dataLen  int64  // bytes of sample data present
	promised uint64 // bytes of sample data that the file claims
	mended   string // how the data size lied; "" when it did not
	text     map[string]string

	outer  uint64 // size of everything after the first 8 bytes, as claimed
	ds64   bool
	data64 uint64            // data size from ds64
	table  map[string]uint64 // sizes of other large chunks from ds64
}

// family is the first word of Info.Format.
func (l *layout) family() string {
	if l.form == "RIFF" {
		return "WAV"
	}
	return l.form
}

// walker reads chunk headers. The first I/O error sticks.
type walker struct {
	src  io.ReaderAt
	size int64
	path string
	err  error
}

// bytes returns up to n bytes at offset at, fewer at the end of the file. n is
// always small or bounded by the file, never by a claim.
func (w *walker) bytes(at, n int64) []byte {
	n = min(n, w.size-at)
	if n <= 0 || w.err != nil {
		return nil
	}
	b := make([]byte, n)
	got, err := w.src.ReadAt(b, at)
	if err != nil && !errors.Is(err, io.EOF) {
		w.err = &recording.Error{Path: w.path, Offset: at, What: "cannot be read: " + cause(err).Error(), Class: err}
	}
	return b[:got]
}

func (w *walker) fail(at int64, class error, fix, format string, args ...any) error {
	if w.err != nil {
		return w.err
	}
	return &recording.Error{Path: w.path, Offset: at, Class: class, What: fmt.Sprintf(format, args...), Fix: fix}
}

// walk visits every chunk once, in whatever order they stand, and settles
// where the samples are.
func walk(src io.ReaderAt, size int64, path string) (*layout, error) {
	w := &walker{src: src, size: size, path: path}
	head := w.bytes(0, 12)
	if !Sniff(head) {
		return nil, w.fail(0, recording.ErrFormat, "", "not a WAV file: no RIFF, RF64 or BW64 header with WAVE")
	}
	l := &layout{form: string(head[:4]), size: size, outer: uint64(le.Uint32(head[4:])), text: map[string]string{}}
	if l.form == "RIFX" {
		return nil, w.fail(0, recording.ErrUnsupported, "save it as little-endian WAV", "big-endian WAV (RIFX)")
	}
	at := int64(12)
	for count := 0; ; count++ {
		head := w.bytes(at, 8)
		if len(head) < 8 {
			break // the end; up to 7 stray bytes mean nothing
		}
		id, claim := string(head[:4]), le.Uint32(head[4:])
		body, found := at+8, l.dataAt > 0
		if !printable(head) || count == maxChunks {
			if found && l.formatAt > 0 {
				break // what follows the samples is not needed
			}
			if count == maxChunks {
				return nil, w.fail(at, recording.ErrFormat, "", "over %d chunks and no samples yet", maxChunks)
			}
			return nil, w.fail(at, recording.ErrFormat, "", "no chunk begins here (got %q), and %s", head[:4], l.lacks())
		}
		length := uint64(claim)
		if v, ok := l.table[id]; ok && claim == unknownSize {
			length = v
		}
		switch {
		case id == "data" && found:
			return nil, w.fail(at, recording.ErrUnsupported, "split it into one file each", "two data chunks (the first at byte %d)", l.dataAt-8)
		case id == "data":
			l.settleData(w, body, claim)
			length = uint64(l.dataLen)
		case length > uint64(size-body):
			if found && l.formatAt > 0 {
				return l, w.err // a description cut short after the samples
			}
			return nil, w.fail(at, recording.ErrFormat, "", "chunk %q claims %d bytes, only %d are left, and %s", id, length, size-body, l.lacks())
		case id == "fmt ":
			b := w.bytes(body, min(int64(length), maxFormatBytes))
			if l.formatAt > 0 && string(b) != string(l.format) {
				return nil, w.fail(at, recording.ErrFormat, "", "a second fmt chunk that differs from the one at byte %d", l.formatAt-8)
			}
			l.format, l.formatAt = b, body
		case id == "ds64":
			l.readDS64(w.bytes(body, min(int64(length), 28+12*64)))
		case id == "LIST":
			b := w.bytes(body, min(int64(length), maxTextBytes))
			if len(b) >= 4 && string(b[:4]) == "wavl" {
				return nil, w.fail(at, recording.ErrUnsupported, "save it as one data chunk", "samples in pieces (LIST wavl)")
			}
			readInfoList(l.text, b)
		case id == "bext":
			readBroadcast(l.text, w.bytes(body, min(int64(length), maxTextBytes)))
		}
		at = w.next(body + int64(length))
	}
	if w.err != nil {
		return nil, w.err
	}
	if l.formatAt == 0 || l.dataAt == 0 {
		return nil, w.fail(size, recording.ErrFormat, "", "the file ends here, and %s", l.lacks())
	}
	return l, nil
}

// lacks says what a file that cannot be walked further has not shown.
func (l *layout) lacks() string {
	switch {
	case l.formatAt == 0 && l.dataAt == 0:
		return "it holds no fmt and no data chunk"
	case l.formatAt == 0:
		return "it holds no fmt chunk"
	}
	return "it holds no data chunk"
}

// next returns where the header after a chunk that ends at end stands: on the
// next even byte, or on end itself when the writer left out the pad byte and
// only that place holds a header that fits.
func (w *walker) next(end int64) int64 {
	if end%2 == 0 {
		return end
	}
	if w.fits(end+1) || !w.fits(end) {
		return end + 1
	}
	return end
}

// fits reports whether a chunk header stands at byte at whose chunk ends
// within the file.
func (w *walker) fits(at int64) bool {
	b := w.bytes(at, 8)
	return len(b) == 8 && printable(b) && int64(le.Uint32(b[4:])) <= w.size-at-8
}

// printable reports whether b begins with a possible chunk name.
func printable(b []byte) bool {
	for _, c := range b[:4] {
		if c < ' ' || c > '~' {
			return false
		}
	}
	return true
}

// readDS64 takes the 64-bit sizes (EBU Tech 3306): outer 8 bytes, data 8,
// frames 8 (not used), then a counted table of chunk name 4 and size 8.
func (l *layout) readDS64(b []byte) {
	if len(b) < 24 {
		return
	}
	l.ds64, l.data64 = true, le.Uint64(b[8:])
	if l.outer == unknownSize {
		l.outer = le.Uint64(b)
	}
	if len(b) < 28 {
		return
	}
	l.table = map[string]uint64{}
	for b = b[28:]; len(b) >= 12; b = b[12:] {
		if _, twice := l.table[string(b[:4])]; !twice {
			l.table[string(b[:4])] = le.Uint64(b[4:])
		}
	}
}

// settleData decides how many bytes of samples follow byte at, for a data
// chunk whose 32-bit size field holds claim.
func (l *layout) settleData(w *walker, at int64, claim uint32) {
	left := w.size - at
	l.dataAt, l.promised = at, uint64(claim)
	switch {
	case claim == unknownSize && l.ds64 && l.data64 != 0:
		l.promised = l.data64
	case claim == 0 && l.ds64 && l.data64 != 0:
		l.promised = l.data64
		l.mended = "the data size is 0, ds64 gives it"
	case claim == unknownSize, claim == 0 && left > 0 && !w.chain(at):
		// The writer never filled the size in: a recorder that lost power,
		// a stream. Samples reach to the end, or to descriptions that a
		// later program appended.
		l.dataLen = left - w.trailer(at)
		l.promised = uint64(l.dataLen)
		l.mended = fmt.Sprintf("the data size field holds %d", claim)
		return
	}
	l.dataLen = left
	if l.promised < uint64(left) {
		l.dataLen = int64(l.promised)
	}
}

// chain reports whether chunks follow each other from byte at exactly to the
// end of the file (give or take a pad byte).
func (w *walker) chain(at int64) bool {
	for range maxChunks {
		if !w.fits(at) {
			return false
		}
		at += 8 + int64(le.Uint32(w.bytes(at+4, 4)))
		if at == w.size || at+1 == w.size {
			return true
		}
		at += at % 2
	}
	return false
}

// described are chunks that programs append after the samples.
var described = map[string]bool{"LIST": true, "bext": true, "iXML": true, "axml": true, "id3 ": true, "ID3 ": true,
	"JUNK": true, "cue ": true, "fact": true, "PEAK": true, "smpl": true, "inst": true, "chna": true, "cart": true}

// trailer returns the length of the chunks at the very end of the file, none
// of which begins before byte from; 0 when there are none. It knows them by
// name and by sizes that lead exactly to the end, and looks back 64 KiB.
func (w *walker) trailer(from int64) int64 {
	start := max(from, w.size-1<<16)
	start += start % 2
	b := w.bytes(start, w.size-start)
	n := int64(len(b))
	if n < 8 {
		return 0
	}
	// reaches[i]: a chain of chunks from byte 2i of b ends at the end of b.
	reaches := make([]bool, n/2+2)
	first := n
	for i := n &^ 1; i >= 0; i -= 2 {
		if i+8 > n || !printable(b[i:]) {
			continue
		}
		end := i + 8 + int64(le.Uint32(b[i+4:]))
		pad := end + end%2
		if reaches[i/2] = end == n || pad == n || pad < n && reaches[pad/2]; reaches[i/2] && described[string(b[i:i+4])] {
			first = i
		}
	}
	return n - first
}

// judgeSizes turns what the size fields got wrong into flags. frame is the
// length of a frame in bytes; in.Frames are the whole frames present.
func (l *layout) judgeSizes(in *recording.Info, frame int64) {
	flag := func(code, format string, args ...any) {
		f := recording.Flag{Code: code, Message: fmt.Sprintf(format, args...)}
		f.FromS, f.ToS = recording.Place(in.DurationS(), in.DurationS())
		in.Flags = append(in.Flags, f)
	}
	rest := l.dataLen % frame
	// A writer may count the pad byte after data of odd length as data.
	padCounted := rest == 1 && l.dataLen%2 == 0
	short := l.promised > uint64(l.dataLen)
	switch {
	case short:
		flag(recording.Truncated, "the file holds %d of the %.0f frames it promises: it was cut%s",
			in.Frames, float64(l.promised)/float64(frame), insideFrame(rest))
	case rest > 0 && !padCounted:
		flag(recording.Truncated, "the samples end inside a frame: the last %d of %d bytes were left out", rest, frame)
	}
	end := uint64(l.dataAt + l.dataLen)
	reach := l.outer + 8
	switch {
	case l.mended != "":
		flag(recording.SizeMended, "%s: %d frames were found by the length of the file", l.mended, in.Frames)
	case short: // the outer size of a cut file is too long as well
	case reach < l.outer || reach < end || reach > uint64(l.size)+1:
		flag(recording.SizeMended, "the outer size field holds %d, the file goes on for %d bytes; it was not used", l.outer, l.size-8)
	}
	if in.Frames == 0 && len(in.Flags) == 0 {
		flag(recording.Silent, "the file holds no samples")
	}
}

func insideFrame(rest int64) string {
	if rest == 0 {
		return ""
	}
	return " inside a frame"
}
