package wav

import (
	"bytes"
	"errors"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"benchslip/capture/recording"
)

// Bodies shared by the tables: 16-bit stereo, three frames.
var (
	stereo16 = pcmFormat(1, 2, 1000, 16)
	three    = samples[int16](8192, -8192, 16384, -16384, 32767, -32768)
	left     = []float64{0.25, 0.5, 32767.0 / 32768}
	comment  = chunk("LIST", append([]byte("INFO"), chunk("ICMT", []byte("made by hand\x00"))...))
)

// ds64 is the chunk of 64-bit sizes with an optional table entry.
func ds64(outer, data uint64, table ...any) []byte {
	b := append(samples(outer, data, 0), samples(uint32(len(table)/2))...)
	for i := 0; i < len(table); i += 2 {
		b = append(b, table[i].(string)...)
		b = append(b, samples(table[i+1].(uint64))...)
	}
	return chunk("ds64", b)
}

// with overwrites bytes of a copy of b.
func with(b []byte, at int, v ...byte) []byte {
	b = bytes.Clone(b)
	copy(b[at:], v)
	return b
}

func join(parts ...[]byte) []byte { return bytes.Join(parts, nil) }

// TestSizes: what is read when size fields lie, and the healthy near-twin of
// each case, which must carry no flag. The samples of channel 1 must equal
// left, cut to the number of frames.
func TestSizes(t *testing.T) {
	fm := chunk("fmt ", stereo16)
	data := chunk("data", three)
	good := riff(fm, data)
	odd := pack24(1<<21, 1<<22, 32767<<8) // 24-bit mono: 9 bytes and a pad byte
	mono24 := chunk("fmt ", pcmFormat(1, 1, 1000, 24))
	dataAt := len(good) - 12 - 4 // size field of the data chunk

	for _, c := range []struct {
		name   string
		file   []byte
		frames int64
		flags  string // codes, in order
	}{
		{"healthy", good, 3, ""},
		{"data size 0, samples to the end", with(good, dataAt, 0, 0, 0, 0), 3, "size-mended"},
		{"data size 0, zero samples to the end", riff(fm, sizedChunk("data", 0, make([]byte, 12))), 3, "size-mended"},
		{"data size all ones", with(good, dataAt, 255, 255, 255, 255), 3, "size-mended"},
		{"data size all ones, comment appended", riff(fm, sizedChunk("data", unknownSize, three), comment), 3, "size-mended"},
		{"data size 0, a comment in place of samples", riff(fm, chunk("data", nil), comment), 0, "silent"},
		{"data size 0, nothing after", riff(fm, chunk("data", nil)), 0, "silent"},
		{"data size 0, samples and then a comment", riff(fm, sizedChunk("data", 0, three), comment), 3, "size-mended"},
		{"comment after the samples, sizes right", riff(fm, data, comment), 3, ""},
		{"data size too long", with(good, dataAt, 16), 3, "truncated"},
		{"data size far too long", with(good, dataAt, 0, 255, 255, 255), 3, "truncated"},
		{"cut between frames", good[:len(good)-4], 2, "truncated"},
		{"cut inside a frame", good[:len(good)-3], 2, "truncated"},
		{"cut before the first sample", good[:len(good)-12], 0, "truncated"},
		{"size 0 and cut inside a frame", with(good, dataAt, 0, 0, 0, 0)[:len(good)-3], 2, "truncated size-mended"},
		{"sizes agree, the last frame is half", riff(fm, chunk("data", three[:10])), 2, "truncated"},
		{"odd data, pad byte", riff(mono24, chunk("data", odd)), 3, ""},
		{"odd data, pad byte, comment", riff(mono24, chunk("data", odd), comment), 3, ""},
		{"odd data, pad byte counted as data", riff(mono24, sizedChunk("data", 10, odd)), 3, ""},
		{"odd data, no pad byte", riff(mono24, chunk("data", odd)[:8+9]), 3, ""},
		{"odd data, no pad byte, comment", riff(mono24, chunk("data", odd)[:8+9], comment), 3, ""},
		{"odd data of size 0, pad byte", riff(mono24, sizedChunk("data", 0, odd)), 3, "size-mended"},
		{"even data, stray bytes at the end", append(bytes.Clone(good), 0, 0, 0), 3, ""},
		{"outer size 0", with(good, 4, 0, 0, 0, 0), 3, "size-mended"},
		{"outer size all ones", with(good, 4, 255, 255, 255, 255), 3, "size-mended"},
		{"outer size too long", with(good, 4, 255, 0, 0, 0), 3, "size-mended"},
		{"outer size ends inside the samples", with(good, 4, 40, 0, 0, 0), 3, "size-mended"},
		{"outer size one short of the pad byte", with(riff(mono24, chunk("data", odd)), 4, 45), 3, ""},
		{"outer size counts a pad byte that is not there", with(riff(mono24, chunk("data", odd)[:8+9]), 4, 46), 3, ""},
		{"a comment cut short after the samples", join(good, comment[:14]), 3, ""},

		{"RF64", container("RF64", ds64(0, 12), fm, sizedChunk("data", unknownSize, three)), 3, ""},
		{"RF64, 32-bit size given as well", container("RF64", ds64(0, 12), fm, data), 3, ""},
		{"BW64 with a large chunk in the table", container("BW64", ds64(0, 12, "axml", uint64(3)), sizedChunk("axml", unknownSize, []byte("abc")), fm, sizedChunk("data", unknownSize, three)), 3, ""},
		{"RF64, comment after the samples", container("RF64", ds64(0, 12), fm, sizedChunk("data", unknownSize, three), comment), 3, ""},
		{"RF64 cut", container("RF64", ds64(0, 1<<40), fm, sizedChunk("data", unknownSize, three)), 3, "truncated"},
		{"RF64, 64-bit size beyond every file", container("RF64", ds64(0, 1<<63+5), fm, sizedChunk("data", unknownSize, three)), 3, "truncated"},
		{"RF64 without ds64", container("RF64", fm, sizedChunk("data", unknownSize, three)), 3, "size-mended"},
		{"RF64 with ds64 left empty", container("RF64", ds64(0, 0), fm, sizedChunk("data", unknownSize, three)), 3, "size-mended"},
		{"RF64, 32-bit size 0", container("RF64", ds64(0, 12), fm, sizedChunk("data", 0, three), comment), 3, "size-mended"},

		{"JUNK before fmt", riff(chunk("JUNK", make([]byte, 28)), fm, data), 3, ""},
		{"odd chunk with pad byte before fmt", riff(chunk("JUNK", make([]byte, 27)), fm, data), 3, ""},
		{"odd chunk without pad byte before fmt", riff(chunk("JUNK", make([]byte, 27))[:8+27], fm, data), 3, ""},
		{"LIST, bext and unknown chunks between", riff(comment, fm, chunk("bext", make([]byte, 602)), chunk("abcd", []byte{1}), data), 3, ""},
		{"fmt after data", riff(data, fm), 3, ""},
		{"fmt of 18 bytes", riff(chunk("fmt ", append(bytes.Clone(stereo16), 0, 0)), data), 3, ""},
		{"fmt of 50 bytes", riff(chunk("fmt ", append(bytes.Clone(stereo16), make([]byte, 34)...)), data), 3, ""},
		{"the same fmt twice", riff(fm, fm, data), 3, ""},
		{"extensible with a longer tail", riff(chunk("fmt ", append(extensible(2, 1000, 16, 16, 1), 1, 2, 3, 4)), data), 3, ""},
		{"bytes a second wrong", riff(chunk("fmt ", with(stereo16, 8, 1, 2, 3, 4)), data), 3, ""},
		{"highest rate a header can hold", riff(chunk("fmt ", with(stereo16, 4, 255, 255, 255, 255)), data), 3, ""},
	} {
		t.Run(c.name, func(t *testing.T) {
			if c.file[0] != 'R' && c.file[0] != 'B' {
				t.Fatal("no header")
			}
			if string(c.file[:4]) != "RIFF" { // outer size lives in ds64
				if i := bytes.Index(c.file, []byte("ds64")); i > 0 {
					copy(c.file[4:], "\xff\xff\xff\xff")
					le.PutUint64(c.file[i+8:], uint64(len(c.file)-8))
				}
			}
			in, x := readAll(t, c.file)
			var codes []string
			for _, f := range in.Flags {
				codes = append(codes, f.Code)
				if f.Message == "" || f.FromS == nil {
					t.Errorf("flag without message or place: %+v", f)
				}
			}
			if got := strings.Join(codes, " "); got != c.flags {
				t.Errorf("flags %q, want %q: %+v", got, c.flags, in.Flags)
			}
			if in.Frames != c.frames {
				t.Fatalf("%d frames, want %d", in.Frames, c.frames)
			}
			for i, v := range x[0] {
				want := left[i]
				if strings.Contains(c.name, "zero samples") {
					want = 0
				}
				if v != want {
					t.Errorf("frame %d: got %v, want %v", i, v, want)
				}
			}
		})
	}
}

// TestRefused: what is no recording that can be read ends in one line with
// the place; what is valid but not read is named.
func TestRefused(t *testing.T) {
	fm, data := chunk("fmt ", stereo16), chunk("data", three)
	format := func(b []byte) []byte { return riff(chunk("fmt ", b), data) }
	const broken, unsupported = "broken", "unsupported"
	for _, c := range []struct {
		name  string
		file  []byte
		class string
		words string
	}{
		{"empty file", nil, broken, "not a WAV file"},
		{"text", []byte("time,volts\n0,1\n1,2\n"), broken, "not a WAV file"},
		{"RIFF that is no WAVE", []byte("RIFF\x04\x00\x00\x00AVI "), broken, "not a WAV file"},
		{"outer header only", riff(), broken, "byte 12: the file ends here, and it holds no fmt and no data"},
		{"no fmt", riff(data), broken, "no fmt chunk"},
		{"no data", riff(fm), broken, "no data chunk"},
		{"fmt cut", riff(fm)[:24], broken, `byte 12: chunk "fmt " claims 16 bytes, only 4 are left`},
		{"fmt too short", format(stereo16[:14]), broken, "14 bytes"},
		{"extensible too short", format(extensible(2, 1000, 16, 16, 1)[:38]), broken, "38 bytes"},
		{"rubbish after the outer header", append(riff(), bytes.Repeat([]byte{1, 2, 3, 4}, 10)...), broken, "byte 12: no chunk begins here"},
		{"chunk of 4 GB before the samples", riff(sizedChunk("JUNK", 0xFFFFFFF0, nil), fm, data), broken, "byte 12"},
		{"two fmt chunks that differ", riff(fm, chunk("fmt ", pcmFormat(1, 1, 1000, 16)), data), broken, "second fmt"},
		{"rate 0", format(pcmFormat(1, 2, 0, 16)), broken, "0 Hz"},
		{"0 channels", format(pcmFormat(1, 0, 1000, 16)), broken, "0 channels"},
		{"0 bits", format(pcmFormat(1, 2, 1000, 0)), broken, "0 bits"},
		{"frame of 0 bytes", format(with(stereo16, 12, 0, 0)), broken, "0 bytes a frame"},
		{"frame too small", format(with(stereo16, 12, 2, 0)), broken, "2 bytes a frame"},
		{"frame that channels do not divide", format(with(stereo16, 12, 5, 0)), broken, "5 bytes a frame"},
		{"valid bits beyond the container", format(extensible(2, 1000, 16, 20, 1)), broken, "20 valid bits"},
		{"extensible container of 20 bits", format(extensible(2, 1000, 20, 20, 1)), broken, "20 bits"},
		{"over 16384 empty chunks", append(riff(), bytes.Repeat([]byte("JUNK\x00\x00\x00\x00"), 100_000)...), broken, "over 16384 chunks"},

		{"65 channels", format(pcmFormat(1, 65, 1000, 16)), unsupported, "65 channels, up to 64"},
		{"65535 channels", format(with(pcmFormat(1, 65535, 1000, 8), 12, 255, 255)), unsupported, "65535 channels"},
		{"24 bits in 4 bytes, plain", format(with(pcmFormat(1, 1, 1000, 24), 12, 4)), unsupported, "24-bit samples in 4 bytes"},
		{"16-bit float", format(pcmFormat(3, 2, 1000, 16)), unsupported, "16-bit float"},
		{"24-bit float", format(pcmFormat(3, 2, 1000, 24)), unsupported, "24-bit float"},
		{"64-bit PCM", format(pcmFormat(1, 2, 1000, 64)), unsupported, "64-bit PCM"},
		{"1-bit PCM", format(pcmFormat(1, 2, 1000, 1)), unsupported, "1-bit PCM"},
		{"A-law", format(pcmFormat(6, 2, 1000, 8)), unsupported, "A-law (tag 6)"},
		{"mu-law", format(pcmFormat(7, 2, 1000, 8)), unsupported, "mu-law (tag 7)"},
		{"ADPCM", format(pcmFormat(2, 2, 1000, 4)), unsupported, "ADPCM (tag 2)"},
		{"IMA ADPCM", format(pcmFormat(17, 2, 1000, 4)), unsupported, "IMA ADPCM (tag 17)"},
		{"tag 0", format(pcmFormat(0, 2, 1000, 16)), unsupported, "unknown codec (tag 0)"},
		{"extensible A-law", format(extensible(2, 1000, 8, 8, 6)), unsupported, "A-law (tag 6)"},
		{"extensible inside extensible", format(extensible(2, 1000, 16, 16, tagExtensible)), unsupported, "unknown codec"},
		{"unknown sub-format", format(with(extensible(2, 1000, 16, 16, 1), 39, 0)), unsupported, "unknown sub-format"},
		{"sound field", format(join(extensible(4, 1000, 16, 16, 1)[:26], []byte(soundFieldTail))), unsupported, "sound-field"},
		{"big-endian", container("RIFX", fm, data), unsupported, "big-endian WAV (RIFX)"},
		{"two data chunks", riff(fm, data, data), unsupported, "two data chunks"},
		{"samples in pieces", riff(fm, chunk("LIST", append([]byte("wavl"), data...))), unsupported, "LIST wavl"},
	} {
		t.Run(c.name, func(t *testing.T) {
			path := store(t, c.file)
			start := time.Now()
			_, err := Open(path)
			if d := time.Since(start); d > time.Second {
				t.Errorf("took %v", d)
			}
			class := recording.ErrFormat
			if c.class == unsupported {
				class = recording.ErrUnsupported
			}
			var e *recording.Error
			if !errors.As(err, &e) || !errors.Is(err, class) {
				t.Fatalf("got %v, want class %q", err, class)
			}
			msg := err.Error()
			if !strings.Contains(msg, c.words) || !strings.HasPrefix(msg, path+": ") || strings.Contains(msg, "\n") || strings.HasSuffix(msg, ".") {
				t.Errorf("message %q, want %q in it", msg, c.words)
			}
		})
	}
}

// What is no file is refused without being opened: opening a pipe would wait
// for a writer for ever.
func TestOnlyFiles(t *testing.T) {
	dir := t.TempDir()
	if _, err := Open(dir); !errors.Is(err, recording.ErrFormat) || !strings.Contains(err.Error(), "folder") {
		t.Errorf("folder: %v", err)
	}
	if _, err := Open(filepath.Join(dir, "none")); !errors.Is(err, fs.ErrNotExist) {
		t.Errorf("missing: %v", err)
	}
	if st, err := os.Stat(os.DevNull); err == nil && st.Mode()&fs.ModeDevice != 0 {
		if _, err := Open(os.DevNull); !errors.Is(err, recording.ErrFormat) || !strings.Contains(err.Error(), "device") {
			t.Errorf("device: %v", err)
		}
	}
}

func TestSniff(t *testing.T) {
	for head, want := range map[string]bool{
		"RIFF\x00\x00\x00\x00WAVEfmt ": true, "RIFX\x00\x00\x00\x00WAVE": true,
		"RF64\xff\xff\xff\xffWAVE": true, "BW64\xff\xff\xff\xffWAVE": true,
		"RIFF\x00\x00\x00\x00AVI ": false, "RIFF": false, "": false, "time,volts\n0,1": false, "wave\x00\x00\x00\x00WAVE": false,
	} {
		if Sniff([]byte(head)) != want {
			t.Errorf("Sniff(%q) = %v", head, !want)
		}
	}
}

// TestText: descriptive fields come out as written.
func TestText(t *testing.T) {
	bext := make([]byte, 602)
	copy(bext, "first floor, 85 m")
	copy(bext[256:], "recorder")
	copy(bext[320:], "2026-12-01")
	copy(bext[330:], "10:00:00")
	le.PutUint64(bext[338:], 48000)
	bext = append(bext, "A=PCM,F=48000\r\n"...)
	list := []byte("INFO")
	for _, f := range []string{"INAM", "odd\x00", "ICMT", "caf\xe9 au lait\x00", "IART", "caf\u00e9\x00", "ICMT", "second\x00\x00", "ISFT", "\x00"} {
		if len(f) == 4 && f[0] == 'I' {
			list = append(list, f...)
			continue
		}
		list = append(list, samples(uint32(len(f)))...)
		list = append(list, f...)
		if len(f)%2 == 1 {
			list = append(list, 0)
		}
	}
	in, _ := readAll(t, riff(chunk("fmt ", stereo16), chunk("bext", bext), chunk("data", three), chunk("LIST", list)))
	want := map[string]string{
		"INAM": "odd", "ICMT": "café au lait", "IART": "café", "ICMT 2": "second",
		"bext description": "first floor, 85 m", "bext originator": "recorder", "bext origination date": "2026-12-01",
		"bext origination time": "10:00:00", "bext time reference": "48000", "bext coding history": "A=PCM,F=48000",
	}
	for k, v := range want {
		if in.Text[k] != v {
			t.Errorf("%s: got %q, want %q", k, in.Text[k], v)
		}
	}
	if len(in.Text) != len(want) {
		t.Errorf("fields %q", in.Text)
	}
}
