package wav

import (
	"bytes"
	"errors"
	"math"
	"os"
	"path/filepath"
	"testing"

	"benchslip/capture/recording"
)

// FuzzOpen: whatever the bytes, an answer without panic; what is read lies
// within the file, is the same in any blocks, and has no value that is not
// finite without being listed as missing.
func FuzzOpen(f *testing.F) {
	files, err := filepath.Glob("testdata/vectors/*.wav")
	if err != nil || len(files) == 0 {
		f.Fatal("no seeds", err)
	}
	for _, name := range files {
		b, err := os.ReadFile(name)
		if err != nil {
			f.Fatal(err)
		}
		f.Add(b)
		f.Add(b[:len(b)-3])
	}
	fm := chunk("fmt ", stereo16)
	f.Add(riff(fm, sizedChunk("data", 0, three), comment))
	f.Add(riff(fm, sizedChunk("data", unknownSize, three), comment))
	f.Add(riff(chunk("data", three), fm))
	f.Add(riff(chunk("JUNK", make([]byte, 27))[:8+27], fm, chunk("data", three)))
	f.Add(container("BW64", ds64(0, 12, "axml", uint64(3)), sizedChunk("axml", unknownSize, []byte("abc")), fm, sizedChunk("data", unknownSize, three)))
	f.Add(riff(chunk("fmt ", extensible(1, 1000, 32, 24, 1)), chunk("data", three)))
	f.Add(riff(chunk("fmt ", pcmFormat(3, 1, 1000, 32)), chunk("data", samples(float32(math.NaN()), float32(math.Inf(-1)), 1))))
	f.Fuzz(func(t *testing.T, b []byte) {
		if len(b) > 1<<16 {
			t.Skip()
		}
		r, err := newReader(bytes.NewReader(b), int64(len(b)), "f")
		if err != nil {
			var e *recording.Error
			if !errors.As(err, &e) || e.Class == nil || e.What == "" {
				t.Fatalf("bare error %v", err)
			}
			return
		}
		in := r.Info()
		if end := r.dataAt + in.Frames*int64(r.enc.frameBytes()); end > int64(len(b)) || in.Frames < 0 {
			t.Fatalf("%d frames from byte %d reach beyond %d bytes", in.Frames, r.dataAt, len(b))
		}
		if in.RateHz <= 0 || len(in.Channels) < 1 || len(in.Channels) > MaxChannels {
			t.Fatalf("rate %v, %d channels", in.RateHz, len(in.Channels))
		}
		whole, err := recording.ReadAll(r)
		if err != nil {
			t.Fatal(err)
		}
		missing := 0
		for _, m := range in.Missing {
			missing += int(m.To - m.From)
		}
		for c, x := range whole {
			one := make([][]float64, len(whole))
			one[c] = make([]float64, 7)
			for at := 0; at < len(x); at += 7 {
				n, err := r.ReadAt(one, int64(at))
				if err != nil || n != min(7, len(x)-at) {
					t.Fatal(n, err)
				}
				for i := range n {
					if math.Float64bits(one[c][i]) != math.Float64bits(x[at+i]) {
						t.Fatalf("channel %d frame %d: %v in a block, %v in the whole", c, at+i, one[c][i], x[at+i])
					}
				}
			}
			for _, v := range x {
				if math.IsInf(v, 0) {
					t.Fatal("infinite value")
				}
				if v != v {
					missing--
				}
			}
		}
		if missing < 0 || len(in.Missing) < maxRuns && missing != 0 {
			t.Fatalf("list of missing samples is off by %d", missing)
		}
	})
}
