package scopecsv

import (
	"bytes"
	"math/rand/v2"
	"os"
	"path/filepath"
	"testing"

	"benchslip/capture/recording"
)

// TestSplicedTables joins pieces of different samples, with a few bytes
// changed, and reads them under varied options: no panic, columns of one
// length, and nothing but a one-line error or a whole recording.
func TestSplicedTables(t *testing.T) {
	paths, err := filepath.Glob("testdata/shapes/*.csv")
	if err != nil || len(paths) == 0 {
		t.Fatal(err)
	}
	var files [][]byte
	for _, p := range paths {
		b, err := os.ReadFile(p)
		if err != nil {
			t.Fatal(err)
		}
		files = append(files, b)
	}
	r := rand.New(rand.NewPCG(11, 2))
	const odd = ",;\t\n\r\" .x0\x00#-:/(="
	for range 2000 {
		var text []byte
		for range 1 + r.IntN(3) {
			lines := bytes.SplitAfter(files[r.IntN(len(files))], []byte("\n"))
			from := r.IntN(len(lines))
			to := from + r.IntN(len(lines)-from+1)
			if r.IntN(2) == 0 {
				from = 0
			}
			text = append(text, bytes.Join(lines[from:to], nil)...)
		}
		for range r.IntN(4) {
			if len(text) > 0 {
				text[r.IntN(len(text))] = odd[r.IntN(len(odd))]
			}
		}
		var opt recording.Options
		if r.IntN(4) == 0 {
			opt.RateHz, opt.Resample = 1000, true
		}
		if r.IntN(8) == 0 {
			opt.TimeColumn = "1"
		}
		if r.IntN(8) == 0 {
			opt.Separator, opt.Decimal = ",", "."
		}
		got, err := parse("a.csv", text, int64(len(text)), opt)
		if err != nil {
			if bytes.ContainsAny([]byte(err.Error()), "\n\r") || len(err.Error()) > 900 {
				t.Errorf("message %q", err)
			}
			continue
		}
		for c, v := range got.columns {
			if int64(len(v)) != got.info.Frames {
				t.Errorf("channel %d has %d samples of %d frames:\n%q", c+1, len(v), got.info.Frames, text)
			}
		}
	}
}
