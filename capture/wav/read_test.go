package wav

import (
	"encoding/binary"
	"math"
	"os"
	"path/filepath"
	"testing"

	"benchslip/capture/recording"
)

// chunk is one chunk of a file under construction, with pad byte.
func chunk(id string, body []byte) []byte {
	return sizedChunk(id, uint32(len(body)), body)
}

// sizedChunk is a chunk whose size field holds size, whatever body is.
func sizedChunk(id string, size uint32, body []byte) []byte {
	b := append([]byte(id), 0, 0, 0, 0)
	le.PutUint32(b[4:], size)
	b = append(b, body...)
	if len(body)%2 == 1 {
		b = append(b, 0)
	}
	return b
}

// riff joins chunks into a file with a correct outer size.
func riff(chunks ...[]byte) []byte { return container("RIFF", chunks...) }

func container(form string, chunks ...[]byte) []byte {
	b := []byte(form + "\x00\x00\x00\x00WAVE")
	for _, c := range chunks {
		b = append(b, c...)
	}
	le.PutUint32(b[4:], uint32(len(b)-8))
	return b
}

// pcmFormat is a plain 16-byte fmt body.
func pcmFormat(tag, channels, rate, bits int) []byte {
	b := make([]byte, 16)
	le.PutUint16(b, uint16(tag))
	le.PutUint16(b[2:], uint16(channels))
	le.PutUint32(b[4:], uint32(rate))
	frame := channels * ((bits + 7) / 8)
	le.PutUint32(b[8:], uint32(rate*frame))
	le.PutUint16(b[12:], uint16(frame))
	le.PutUint16(b[14:], uint16(bits))
	return b
}

// extensible is a 40-byte fmt body: bits of the container, valid bits, the
// codec number of the sub-format.
func extensible(channels, rate, bits, valid, sub int) []byte {
	b := append(pcmFormat(tagExtensible, channels, rate, bits), make([]byte, 24)...)
	le.PutUint16(b[16:], 22)
	le.PutUint16(b[18:], uint16(valid))
	le.PutUint16(b[24:], uint16(sub))
	copy(b[26:], subFormatTail)
	return b
}

// store writes b as a file of the test and returns its path. The name has no
// suffix: content decides.
func store(t testing.TB, b []byte) string {
	t.Helper()
	path := filepath.Join(t.TempDir(), "recording")
	if err := os.WriteFile(path, b, 0o644); err != nil {
		t.Fatal(err)
	}
	return path
}

// readAll opens the file b and reads it whole.
func readAll(t testing.TB, b []byte) (*recording.Info, [][]float64) {
	t.Helper()
	r, err := Open(store(t, b))
	if err != nil {
		t.Fatal(err)
	}
	defer r.Close()
	x, err := recording.ReadAll(r)
	if err != nil {
		t.Fatal(err)
	}
	return r.Info(), x
}

// samples packs values little-endian at the width of their type.
func samples[T any](v ...T) []byte {
	b, err := binary.Append(nil, le, v)
	if err != nil {
		panic(err)
	}
	return b
}

func pack24(v ...int32) []byte {
	var b []byte
	for _, x := range v {
		b = append(b, byte(x), byte(x>>8), byte(x>>16))
	}
	return b
}

// TestCodes pins the value of known codes, written out by hand from the
// definition c / 2^(container bits - 1); the layouts are those of the
// Multimedia Programming Interface 1.0 and of WAVEFORMATEXTENSIBLE.
func TestCodes(t *testing.T) {
	const (
		s16 = 1.0 / 32768
		s24 = 1.0 / 8388608
		s32 = 1.0 / 2147483648
	)
	for _, c := range []struct {
		name, words string
		format      []byte
		data        []byte
		want        []float64
		step        float64
		bits        int
	}{
		{"8-bit is unsigned", "WAV 8-bit PCM", pcmFormat(1, 1, 8000, 8),
			[]byte{0, 127, 128, 129, 255}, []float64{-1, -1.0 / 128, 0, 1.0 / 128, 127.0 / 128}, 1.0 / 128, 8},
		{"16-bit", "WAV 16-bit PCM", pcmFormat(1, 1, 44100, 16),
			samples[int16](-32768, -1, 0, 1, 32767), []float64{-1, -s16, 0, s16, 32767 * s16}, s16, 16},
		{"24-bit", "WAV 24-bit PCM", pcmFormat(1, 1, 48000, 24),
			pack24(-8388608, -1, 0, 1, 8388607), []float64{-1, -s24, 0, s24, 8388607 * s24}, s24, 24},
		{"32-bit", "WAV 32-bit PCM", pcmFormat(1, 1, 96000, 32),
			samples[int32](-2147483648, -1, 0, 1, 2147483647), []float64{-1, -s32, 0, s32, 2147483647 * s32}, s32, 32},
		{"12 bits at the top of 16", "WAV 12-bit PCM in 16 bits", pcmFormat(1, 1, 48000, 12),
			samples[int16](-32768, 16, 0x7FF0), []float64{-1, 1.0 / 2048, 2047.0 / 2048}, 1.0 / 2048, 12},
		{"20 bits at the top of 24", "WAV 20-bit PCM in 24 bits", extensible(1, 48000, 24, 20, 1),
			pack24(-8388608, 16), []float64{-1, 1.0 / 524288}, 1.0 / 524288, 20},
		{"24 bits at the top of 32", "WAV 24-bit PCM in 32 bits", extensible(1, 48000, 32, 24, 1),
			samples[int32](-2147483648, 256), []float64{-1, s24}, s24, 24},
		{"extensible 16-bit, valid bits left empty", "WAV 16-bit PCM", extensible(1, 48000, 16, 0, 1),
			samples[int16](16384), []float64{0.5}, s16, 16},
		{"32-bit float, beyond full scale", "WAV 32-bit float", pcmFormat(3, 1, 48000, 32),
			samples[float32](-1.5, 0, 0.25, 3), []float64{-1.5, 0, 0.25, 3}, 0, 0},
		{"64-bit float", "WAV 64-bit float", pcmFormat(3, 1, 48000, 64),
			samples(-1.5, 0.1, math.Pi), []float64{-1.5, 0.1, math.Pi}, 0, 0},
		{"extensible 32-bit float", "WAV 32-bit float", extensible(1, 48000, 32, 32, 3),
			samples[float32](0.75), []float64{0.75}, 0, 0},
	} {
		t.Run(c.name, func(t *testing.T) {
			in, x := readAll(t, riff(chunk("fmt ", c.format), chunk("data", c.data)))
			if in.Format != c.words || in.Channels[0].Step != c.step || in.Channels[0].Bits != c.bits || in.Channels[0].Unit != "FS" {
				t.Errorf("got %q, channel %+v", in.Format, in.Channels[0])
			}
			if len(in.Flags) > 0 {
				t.Errorf("flags on a clean file: %+v", in.Flags)
			}
			if len(x[0]) != len(c.want) {
				t.Fatalf("got %d frames, want %d", len(x[0]), len(c.want))
			}
			for i := range c.want {
				if x[0][i] != c.want[i] {
					t.Errorf("sample %d: got %v, want %v", i, x[0][i], c.want[i])
				}
			}
		})
	}
}
