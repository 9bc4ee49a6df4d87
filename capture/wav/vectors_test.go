package wav

import (
	"encoding/json"
	"errors"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"benchslip/capture/recording"
)

// TestVectors reads files that other libraries wrote and compares every
// sample with what other libraries read: scipy 1.10.1 and soundfile 0.12.1
// over libsndfile 1.2.0, see testdata/make_vectors.py.
func TestVectors(t *testing.T) {
	raw, err := os.ReadFile("testdata/vectors.json")
	if err != nil {
		t.Fatal(err)
	}
	var all struct {
		Vectors []struct {
			File, Writer, Reader, Format string
			Rate                         float64 `json:"rate_hz"`
			Channels                     [][]float64
		}
		Refused []struct{ File, Names string }
	}
	if err := json.Unmarshal(raw, &all); err != nil {
		t.Fatal(err)
	}
	files, _ := filepath.Glob("testdata/vectors/*")
	if n := len(all.Vectors) + len(all.Refused); n < 20 || n != len(files) {
		t.Fatalf("vectors.json names %d files, the folder holds %d", n, len(files))
	}
	for _, v := range all.Vectors {
		t.Run(v.File, func(t *testing.T) {
			r, err := Open(filepath.Join("testdata/vectors", v.File))
			if err != nil {
				t.Fatal(err)
			}
			defer r.Close()
			in := r.Info()
			if in.Format != v.Format || in.RateHz != v.Rate || len(in.Channels) != len(v.Channels) || in.Frames != int64(len(v.Channels[0])) {
				t.Fatalf("got %s, %v Hz, %d channels, %d frames", in.Format, in.RateHz, len(in.Channels), in.Frames)
			}
			if len(in.Flags) > 0 {
				t.Errorf("flags on a clean file: %+v", in.Flags)
			}
			x, err := recording.ReadAll(r)
			if err != nil {
				t.Fatal(err)
			}
			for c := range x {
				for i := range x[c] {
					if x[c][i] != v.Channels[c][i] {
						t.Fatalf("channel %d frame %d: got %v, %s reads %v", c+1, i, x[c][i], v.Reader, v.Channels[c][i])
					}
				}
			}
		})
	}
	for _, v := range all.Refused {
		t.Run(v.File, func(t *testing.T) {
			_, err := Open(filepath.Join("testdata/vectors", v.File))
			if !errors.Is(err, recording.ErrUnsupported) || !strings.Contains(err.Error(), v.Names) {
				t.Errorf("got %v, want unsupported naming %q", err, v.Names)
			}
		})
	}
}
