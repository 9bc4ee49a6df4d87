package wav

import (
	"bytes"
	"errors"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"testing"

	gowav "github.com/go-audio/wav"

	"benchslip/capture/recording"
)

// write makes a file of blocks of the given length and returns its path.
func write(t testing.TB, f Format, x [][]float64, block int, info map[string]string) string {
	t.Helper()
	path := filepath.Join(t.TempDir(), "made.wav")
	w, err := Create(path, f, info)
	if err != nil {
		t.Fatal(err)
	}
	defer w.Discard()
	part := make([][]float64, len(x))
	for at := 0; at < len(x[0]); at += block {
		for c := range x {
			part[c] = x[c][at:min(at+block, len(x[c]))]
		}
		if err := w.WriteBlock(part); err != nil {
			t.Fatal(err)
		}
	}
	if err := w.Close(); err != nil {
		t.Fatal(err)
	}
	return path
}

// wave is a deterministic signal: codes of the given width, full range.
func wave(channels, frames, bits int) [][]float64 {
	x := make([][]float64, channels)
	s := uint32(7)
	for c := range x {
		x[c] = make([]float64, frames)
		for i := range x[c] {
			s = 1664525*s + 1013904223
			x[c][i] = float64(int32(s)>>(32-bits)) / math.Ldexp(1, bits-1)
		}
	}
	return x
}

// TestRoundTrip writes every format and reads it back with our reader and
// with the independent library go-audio/wav v1.1.0. That library takes the
// pad byte after odd data for a sample and knows no float, so it is asked only
// where the data is even and integer.
func TestRoundTrip(t *testing.T) {
	info := map[string]string{"ICMT": "tone frequency=1042Hz", "INAM": "odd"}
	for _, f := range []Format{
		{Bits: 8}, {Bits: 16}, {Bits: 24}, {Bits: 32}, {Bits: 32, Float: true}, {Bits: 64, Float: true},
	} {
		for _, channels := range []int{1, 2, 3, 64} {
			for _, frames := range []int{0, 1, 7, 1000} {
				f.Channels, f.RateHz = channels, 96000
				t.Run(fmt.Sprintf("%d-bit float %v, %d channels, %d frames", f.Bits, f.Float, channels, frames), func(t *testing.T) {
					x := wave(channels, frames, min(f.Bits, 24))
					path := write(t, f, x, 300, info)
					r, err := Open(path)
					if err != nil {
						t.Fatal(err)
					}
					defer r.Close()
					in := r.Info()
					if in.RateHz != 96000 || len(in.Channels) != channels || in.Frames != int64(frames) ||
						in.Text["ICMT"] != info["ICMT"] || in.Text["INAM"] != "odd" {
						t.Errorf("got %+v", in)
					}
					if frames > 0 && len(in.Flags) > 0 {
						t.Errorf("flags %+v", in.Flags)
					}
					if in.Bytes%2 != 0 {
						t.Error("odd file size")
					}
					got, err := recording.ReadAll(r)
					if err != nil {
						t.Fatal(err)
					}
					for c := range x {
						for i := range x[c] {
							if got[c][i] != x[c][i] {
								t.Fatalf("channel %d frame %d: got %v, wrote %v", c, i, got[c][i], x[c][i])
							}
						}
					}
					if f.Float || frames == 0 || frames*channels*f.Bits/8%2 == 1 {
						return
					}
					file, err := os.Open(path)
					if err != nil {
						t.Fatal(err)
					}
					defer file.Close()
					d := gowav.NewDecoder(file)
					b, err := d.FullPCMBuffer()
					if err != nil {
						t.Fatal(err)
					}
					if d.SampleRate != 96000 || int(d.NumChans) != channels || int(d.BitDepth) != f.Bits || len(b.Data) != frames*channels {
						t.Fatalf("library: %d Hz, %d channels, %d bits, %d samples", d.SampleRate, d.NumChans, d.BitDepth, len(b.Data))
					}
					for i, code := range b.Data {
						if f.Bits == 8 {
							code -= 128
						}
						if want := x[i%channels][i/channels] * math.Ldexp(1, f.Bits-1); float64(code) != want {
							t.Fatalf("library: sample %d is %d, wrote %v", i, code, want)
						}
					}
					d.ReadMetadata()
					if d.Metadata == nil || d.Metadata.Comments != info["ICMT"] || d.Metadata.Title != "odd" {
						t.Errorf("library: metadata %+v", d.Metadata)
					}
				})
			}
		}
	}
}

// TestLayout pins one small file byte by byte against the layout in the
// Multimedia Programming Interface 1.0, written out by hand.
func TestLayout(t *testing.T) {
	path := write(t, Format{RateHz: 48000, Channels: 1, Bits: 24}, [][]float64{{0.5, -1, 0}}, 10, map[string]string{"ICMT": "ab"})
	got, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	want := []byte("RIFF\x46\x00\x00\x00WAVE" +
		"fmt \x10\x00\x00\x00\x01\x00\x01\x00\x80\xbb\x00\x00\x80\x32\x02\x00\x03\x00\x18\x00" +
		"LIST\x10\x00\x00\x00INFOICMT\x03\x00\x00\x00ab\x00\x00" +
		"data\x09\x00\x00\x00\x00\x00\x40\x00\x00\x80\x00\x00\x00\x00")
	if !bytes.Equal(got, want) {
		t.Errorf("got  %q\nwant %q", got, want)
	}
}

// TestDither checks the noise against theory for two-step triangular dither:
// whatever the level between two codes, the error has mean 0 and an RMS of
// sqrt(1/12 + 2/12) = 0.5 step; without dither a busy signal's error has
// 1/sqrt(12) = 0.288675 step (computed; Lipshitz, Wannamaker, Vanderkooy 1992
// from memory).
func TestDither(t *testing.T) {
	const n = 200_000
	const step = 1.0 / (1 << 23)
	// The RMS over n samples scatters by about 0.2 %, the mean by 0.5/sqrt(n)
	// = 0.0011 step: five times that is allowed.
	for _, level := range []float64{0, 0.1, 0.25, 0.5, 0.77} {
		x := make([]float64, n)
		for i := range x {
			x[i] = level * step
		}
		y := readBack(t, write(t, Format{RateHz: 48000, Channels: 1, Bits: 24, Dither: true, Seed: 3}, [][]float64{x}, 999, nil))
		mean, rms := errorOf(y[0], x, step)
		if math.Abs(mean) > 0.0056 || math.Abs(rms-0.5) > 0.005 {
			t.Errorf("level %v step: mean error %.5f, RMS %.5f step; want 0, 0.5", level, mean, rms)
		}
	}
	x := make([]float64, n)
	for i := range x {
		x[i] = 0.9 * math.Sin(0.1234567*float64(i))
	}
	y := readBack(t, write(t, Format{RateHz: 48000, Channels: 1, Bits: 24}, [][]float64{x}, 999, nil))
	if mean, rms := errorOf(y[0], x, step); math.Abs(mean) > 0.0033 || math.Abs(rms-1/math.Sqrt(12)) > 0.003 {
		t.Errorf("undithered: mean error %.5f, RMS %.5f step; want 0, 0.288675", mean, rms)
	}
}

// Dither depends on seed and channel, not on the blocks or the clock.
func TestDitherSeed(t *testing.T) {
	x := [][]float64{make([]float64, 5000), make([]float64, 5000)}
	f := Format{RateHz: 48000, Channels: 2, Bits: 16, Dither: true, Seed: 1}
	file := func(f Format, block int) []byte {
		b, err := os.ReadFile(write(t, f, x, block, nil))
		if err != nil {
			t.Fatal(err)
		}
		return b
	}
	a := file(f, 17)
	if !bytes.Equal(a, file(f, 5000)) {
		t.Error("blocks change the file")
	}
	f.Seed = 2
	if bytes.Equal(a, file(f, 17)) {
		t.Error("the seed changes nothing")
	}
	y := readBack(t, write(t, f, x, 17, nil))
	same := 0
	for i := range y[0] {
		if y[0][i] == y[1][i] {
			same++
		}
	}
	// Rounded triangular dither about 0 gives -1, 0, 1 with probability 1/8,
	// 3/4, 1/8: independent channels agree in 38/64 of 5000 = 2969 +- 35.
	if same > 3200 {
		t.Errorf("channels share their dither: %d of 5000 samples agree", same)
	}
}

func readBack(t testing.TB, path string) [][]float64 {
	t.Helper()
	r, err := Open(path)
	if err != nil {
		t.Fatal(err)
	}
	defer r.Close()
	y, err := recording.ReadAll(r)
	if err != nil {
		t.Fatal(err)
	}
	return y
}

// errorOf is mean and RMS of y - x in steps.
func errorOf(y, x []float64, step float64) (mean, rms float64) {
	for i := range x {
		e := (y[i] - x[i]) / step
		mean += e
		rms += e * e
	}
	n := float64(len(x))
	return mean / n, math.Sqrt(rms / n)
}

// TestClip: a sample that does not fit is an error with its place and leaves
// no file.
func TestClip(t *testing.T) {
	top16 := 32767.0 / 32768
	for _, c := range []struct {
		name string
		f    Format
		bad  float64
		ok   float64
	}{
		{"positive full scale", Format{Bits: 16}, 1, top16},
		{"half a step above the top code", Format{Bits: 16}, top16 + 0.5/32768, top16 + 0.49/32768},
		{"below negative full scale", Format{Bits: 24}, -1 - 1e-6, -1},
		{"not a number", Format{Bits: 24}, math.NaN(), 0},
		{"infinite in float", Format{Bits: 64, Float: true}, math.Inf(1), 3},
		{"beyond 32-bit float", Format{Bits: 32, Float: true}, 1e39, 3},
	} {
		t.Run(c.name, func(t *testing.T) {
			dir := t.TempDir()
			path := filepath.Join(dir, "made.wav")
			c.f.RateHz, c.f.Channels = 48000, 2
			w, err := Create(path, c.f, nil)
			if err != nil {
				t.Fatal(err)
			}
			if err := w.WriteBlock([][]float64{{0, c.ok}, {0, c.ok}}); err != nil {
				t.Fatalf("the near-twin: %v", err)
			}
			err = w.WriteBlock([][]float64{{0, 0}, {0, c.bad}})
			var clip *ClipError
			if !errors.As(err, &clip) || clip.Channel != 2 || clip.Frame != 3 {
				t.Errorf("got %v", err)
			}
			if w.Close() == nil || w.WriteBlock([][]float64{{0}, {0}}) == nil {
				t.Error("the error did not stick")
			}
			if left, _ := os.ReadDir(dir); len(left) > 0 {
				t.Errorf("left behind: %v", left)
			}
		})
	}
}

func TestCreateRefuses(t *testing.T) {
	dir := t.TempDir()
	ok := Format{RateHz: 48000, Channels: 1, Bits: 16}
	for name, c := range map[string]struct {
		change func(*Format)
		info   map[string]string
	}{
		"no rate":            {func(f *Format) { f.RateHz = 0 }, nil},
		"no channel":         {func(f *Format) { f.Channels = 0 }, nil},
		"65 channels":        {func(f *Format) { f.Channels = 65 }, nil},
		"20 bits":            {func(f *Format) { f.Bits = 20 }, nil},
		"16-bit float":       {func(f *Format) { f.Float = true }, nil},
		"dithered float":     {func(f *Format) { f.Float, f.Bits, f.Dither = true, 32, true }, nil},
		"INFO name too long": {func(*Format) {}, map[string]string{"ICMTS": "x"}},
		"INFO name in small": {func(*Format) {}, map[string]string{"icmt": "x"}},
		"zero byte in text":  {func(*Format) {}, map[string]string{"ICMT": "a\x00b"}},
	} {
		f := ok
		c.change(&f)
		if _, err := Create(filepath.Join(dir, "x.wav"), f, c.info); err == nil {
			t.Errorf("%s: no error", name)
		}
	}
	if _, err := Create(filepath.Join(dir, "none", "x.wav"), ok, nil); err == nil {
		t.Error("missing folder: no error")
	}
	w, err := Create(filepath.Join(dir, "x.wav"), ok, nil)
	if err != nil {
		t.Fatal(err)
	}
	w.Discard()
	if left, _ := os.ReadDir(dir); len(left) > 0 {
		t.Errorf("left behind: %v", left)
	}
}
