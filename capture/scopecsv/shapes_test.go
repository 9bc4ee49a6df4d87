package scopecsv

import (
	"encoding/json"
	"errors"
	"math"
	"os"
	"path/filepath"
	"slices"
	"sort"
	"strings"
	"testing"

	"benchslip/capture/recording"
)

// shapeTruth is what testdata/make_shapes.py knows of a sample file, computed
// from the printed text by Python's number parser.
type shapeTruth struct {
	Rate     *float64
	Start    float64
	Frames   int64
	Flags    []string
	Loose    bool // flags may be more or fewer, at least one
	Tol      float64
	Missing  []int64 // frames of the first channel without a value
	Joints   []int64 // frames that do not follow the one before
	Channels []struct {
		Name, Unit          string
		Count               int
		Min, Max, Mean, RMS float64
	}
	Error *struct {
		Line        int
		Says, Class string
	}
}

func shapeTruths(t testing.TB) map[string]shapeTruth {
	b, err := os.ReadFile("testdata/shapes.json")
	if err != nil {
		t.Fatal(err)
	}
	var m map[string]shapeTruth
	if err := json.Unmarshal(b, &m); err != nil {
		t.Fatal(err)
	}
	return m
}

func TestShapes(t *testing.T) {
	truths := shapeTruths(t)
	var names []string
	for n := range truths {
		names = append(names, n)
	}
	sort.Strings(names)
	if len(names) < 100 {
		t.Errorf("only %d shapes", len(names))
	}
	for _, n := range names {
		t.Run(n, func(t *testing.T) { checkShape(t, n, truths[n]) })
	}
}

func checkShape(t *testing.T, name string, want shapeTruth) {
	path := filepath.Join("testdata", "shapes", name+".csv")
	if b, err := os.ReadFile(path); err != nil || !Sniff(b[:min(len(b), 4096)]) {
		t.Errorf("not sniffed (%v)", err)
	}
	rec, err := Open(path, recording.Options{})
	if want.Error != nil {
		var e *recording.Error
		class := map[string]error{"ambiguous": recording.ErrAmbiguous, "format": recording.ErrFormat, "unsupported": recording.ErrUnsupported}[want.Error.Class]
		switch {
		case err == nil:
			t.Errorf("read without an error, want %q at line %d; %+v", want.Error.Says, want.Error.Line, rec.Info())
		case !errors.As(err, &e) || e.Line != want.Error.Line || !strings.Contains(err.Error(), want.Error.Says) || !errors.Is(err, class):
			t.Errorf("got %v (%v), want %q at line %d, %v", err, errors.Unwrap(err), want.Error.Says, want.Error.Line, class)
		case strings.ContainsAny(err.Error(), "\n\r") || len(err.Error()) > 500:
			t.Errorf("not one line: %q", err)
		}
		return
	}
	if err != nil {
		t.Fatal(err)
	}
	in := rec.Info()
	var flags []string
	for _, f := range in.Flags {
		if !slices.Contains(flags, f.Code) {
			flags = append(flags, f.Code)
		}
	}
	sort.Strings(flags)
	if want.Loose {
		if len(flags) == 0 {
			t.Errorf("no flag")
		}
	} else if !slices.Equal(flags, want.Flags) {
		t.Errorf("flags: got %v %+v, want %v", flags, in.Flags, want.Flags)
	}
	tol := math.Max(want.Tol, 1e-9)
	switch {
	case want.Rate == nil && in.RateHz != 0, want.Rate != nil && math.Abs(in.RateHz-*want.Rate) > tol**want.Rate:
		t.Errorf("rate: got %.12g, want %v", in.RateHz, want.Rate)
	}
	if !want.Loose && math.Abs(in.StartS-want.Start) > 1e-12 {
		t.Errorf("start: got %g, want %g", in.StartS, want.Start)
	}
	if in.Frames != want.Frames || len(in.Channels) != len(want.Channels) {
		t.Fatalf("got %d frames, %d channels %+v, want %d, %d", in.Frames, len(in.Channels), in.Channels, want.Frames, len(want.Channels))
	}
	got, err := recording.ReadAll(rec)
	if err != nil {
		t.Fatal(err)
	}
	for c, w := range want.Channels {
		l := levelsOf(got[c])
		if in.Channels[c].Name != w.Name || in.Channels[c].Unit != w.Unit {
			t.Errorf("channel %d: got %q in %q, want %q in %q", c+1, in.Channels[c].Name, in.Channels[c].Unit, w.Name, w.Unit)
		}
		near := func(x, y float64) bool { return math.Abs(x-y) <= 1e-12*math.Max(math.Abs(y), w.RMS) }
		if l.n != w.Count || l.min != w.Min || l.max != w.Max || !near(l.mean, w.Mean) || !near(l.rms, w.RMS) {
			t.Errorf("channel %d: got %+v, want %+v", c+1, l, w)
		}
		missing := 0
		for _, r := range in.Missing {
			if r.Channel == c+1 {
				missing += int(r.To - r.From)
			}
		}
		if missing != int(in.Frames)-w.Count {
			t.Errorf("channel %d: %d samples listed missing, %d are", c+1, missing, int(in.Frames)-w.Count)
		}
	}
	var missing, joints []int64
	for _, r := range in.Missing {
		for f := r.From; f < r.To && r.Channel == 1; f++ {
			missing = append(missing, f)
			if v := got[0][f]; v == v {
				t.Errorf("frame %d is listed missing and holds %g", f, v)
			}
		}
		if r.From == r.To {
			joints = append(joints, r.From)
		}
	}
	if want.Missing != nil && !slices.Equal(missing, want.Missing) {
		t.Errorf("missing: got %v, want %v", missing, want.Missing)
	}
	if want.Joints != nil && !slices.Equal(joints, want.Joints) {
		t.Errorf("joints: got %v, want %v", joints, want.Joints)
	}
}

type levels struct {
	n                   int
	min, max, mean, rms float64
}

func levelsOf(v []float64) levels {
	l := levels{min: math.Inf(1), max: math.Inf(-1)}
	for _, x := range v {
		if x == x {
			l.n++
			l.min, l.max = math.Min(l.min, x), math.Max(l.max, x)
			l.mean += x
			l.rms += x * x
		}
	}
	l.mean /= float64(l.n)
	l.rms = math.Sqrt(l.rms / float64(l.n))
	return l
}
