package intake

import (
	"context"
	"crypto/sha256"
	"encoding/hex"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"benchslip/analyze"
)

const bench = "../../testdata/bench"

func take(path string) *analyze.Take {
	return &analyze.Take{Name: "t", File: "takes/t", Path: path, Where: []analyze.Condition{{Key: "gain", Value: "20 dB"}}}
}

func TestOpen(t *testing.T) {
	path := filepath.Join(bench, "hum.wav")
	x := take(path)
	if err := Open(context.Background(), x); err != nil || x.Fault != nil {
		t.Fatal(err, x.Fault)
	}
	defer x.Rec.Close()
	data, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	sum := sha256.Sum256(data)
	if want := hex.EncodeToString(sum[:]); x.SHA256 != want {
		t.Errorf("hash %s, wanted %s", x.SHA256, want)
	}
	e := Entry(x)
	if e.File != "takes/t" || *e.Bytes != int64(len(data)) || *e.Frames != 80000 || *e.RateHz != 16000 || *e.DurationS != 5 || *e.Channels != 1 ||
		e.Fault != "" || e.Where["gain"] != "20 dB" || len(e.Flags) != 0 {
		t.Errorf("entry %+v", e)
	}
}

// A take that cannot be read keeps its entry, with nulls; the fault names the
// file as the job does and never where it lies.
func TestFaults(t *testing.T) {
	dir := t.TempDir()
	odd := filepath.Join(dir, "odd.wav")
	if err := os.WriteFile(odd, []byte("RIFF\x24\x00\x00\x00WAVEfmt \x10\x00\x00\x00\x06\x00\x01\x00\x40\x1f\x00\x00\x40\x1f\x00\x00\x01\x00\x08\x00data\x00\x00\x00\x00"), 0o666); err != nil {
		t.Fatal(err)
	}
	for _, c := range []struct{ path, code string }{
		{filepath.Join(dir, "none.wav"), analyze.MissingTake},
		{dir, analyze.Unreadable},
		{filepath.Join(bench, "README.md"), analyze.Unreadable},
		{odd, analyze.Unsupported}, // A-law
	} {
		x := take(c.path)
		if err := Open(context.Background(), x); err != nil || x.Fault == nil || x.Rec != nil {
			t.Errorf("%s: %v, fault %v", c.path, err, x.Fault)
			continue
		}
		f := x.Fault
		if f.Code != c.code || !strings.HasPrefix(f.Text, "takes/t") || strings.Contains(f.Text+f.Advice, dir) || f.Advice == "" {
			t.Errorf("%s: %+v", c.path, f)
		}
		if e := Entry(x); e.SHA256 != nil || e.Frames != nil || e.RateHz != nil || !strings.HasPrefix(e.Fault, c.code) || e.Flags == nil {
			t.Errorf("%s: entry %+v", c.path, e)
		}
	}
}

func TestCancelled(t *testing.T) {
	ctx, stop := context.WithCancel(context.Background())
	stop()
	x := take(filepath.Join(bench, "hum.wav"))
	if err := Open(ctx, x); err != context.Canceled || x.Rec != nil {
		t.Errorf("%v, %v", err, x.Rec)
	}
}
