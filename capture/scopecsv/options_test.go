package scopecsv

import (
	"errors"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"runtime"
	"strings"
	"testing"
	"time"

	"benchslip/capture/recording"
)

func read(t *testing.T, text string, opt recording.Options) *table {
	t.Helper()
	got, err := parse("a.csv", []byte(text), int64(len(text)), opt)
	if err != nil {
		t.Fatal(err)
	}
	return got
}

// TestOptions settles by a job's csv keys what a file leaves open.
func TestOptions(t *testing.T) {
	torn := "0,01\n0,03\n-0,02\n0,05\n"
	for _, c := range []struct {
		name, text string
		opt        recording.Options
		rate       float64
		first      float64 // first value of the first channel
		channels   int
	}{
		{"decimal comma", torn, recording.Options{Decimal: ",", Separator: ";", RateHz: 1000}, 1000, 0.01, 1},
		{"comma parts cells", torn, recording.Options{Separator: ",", Decimal: ".", TimeColumn: "none", RateHz: 10}, 10, 0, 2},
		{"thousands or decimals, decimals", "a;b\n1,500;2,500\n3,500;1,500\n", recording.Options{Decimal: ",", TimeColumn: "none", RateHz: 1}, 1, 1.5, 2},
		{"rows to leave out", "12,7\nTime,CH1\n0,1.5\n1,2.5\n2,3.5\n", recording.Options{Skip: 1}, 1, 1.5, 1},
		{"time column by name", "a,b\n1.5,0\n2.5,1\n1.0,2\n", recording.Options{TimeColumn: "b"}, 1, 1.5, 1},
		{"time column by number", "a,b\n1.5,0\n2.5,1\n1.0,2\n", recording.Options{TimeColumn: "2"}, 1, 1.5, 1},
		{"no time column", "0.1,1.5\n0.2,2.5\n0.3,1.0\n", recording.Options{TimeColumn: "none", RateHz: 50}, 50, 0.1, 2},
		{"time unit", "Time,CH1\n0,1.5\n1,2.5\n2,1.0\n", recording.Options{TimeUnit: "ms"}, 1000, 1.5, 1},
		{"time unit settles a doubt", "Sample rate,1000\nTime (s),CH1\n0,1.5\n1,2.5\n2,1.0\n", recording.Options{TimeUnit: "ms"}, 1000, 1.5, 1},
		{"rate", "CH1\n1.5\n2.5\n1.0\n", recording.Options{RateHz: 48000}, 48000, 1.5, 1},
		{"value unit", "Time,CH1\n0,1500\n1,2500\n2,1000\n", recording.Options{ValueUnit: "mV"}, 1, 1.5, 1},
		{"value unit of counts", "Time,counts\n" + countRows(), recording.Options{ValueUnit: "V"}, 1, 100, 1},
	} {
		t.Run(c.name, func(t *testing.T) {
			got := read(t, c.text, c.opt)
			if math.Abs(got.info.RateHz-c.rate) > 1e-9*c.rate || len(got.columns) != c.channels || got.columns[0][0] != c.first {
				t.Errorf("got %g Hz, %d channels, first %g; want %g, %d, %g", got.info.RateHz, len(got.columns), got.columns[0][0], c.rate, c.channels, c.first)
			}
			if len(got.info.Flags) > 0 {
				t.Errorf("flags %+v", got.info.Flags)
			}
		})
	}
}

func countRows() string {
	var b strings.Builder
	for i := range 20 {
		fmt.Fprintf(&b, "%d,%d\n", i, 100+i%7)
	}
	return b.String()
}

func TestBadOptions(t *testing.T) {
	text := "Time,CH1\n0,1.5\n1,2.5\n2,1.0\n"
	for _, c := range []struct {
		opt  recording.Options
		says string
	}{
		{recording.Options{Separator: "::"}, "separator"},
		{recording.Options{Decimal: "'"}, "decimal"},
		{recording.Options{TimeColumn: "CH7"}, `"CH7"`},
		{recording.Options{TimeColumn: "9"}, `"9"`},
		{recording.Options{TimeUnit: "V"}, "time_unit"},
		{recording.Options{ValueUnit: "s"}, "value_unit"},
		{recording.Options{Skip: 99}, "blank"},
	} {
		if _, err := parse("a.csv", []byte(text), 0, c.opt); err == nil || !strings.Contains(err.Error(), c.says) {
			t.Errorf("%+v: got %v, want an error with %q", c.opt, err, c.says)
		}
	}
}

// TestRateByJobIsChecked flags a stated rate that a clean time column denies.
func TestRateByJobIsChecked(t *testing.T) {
	var b strings.Builder
	b.WriteString("Time,CH1\n")
	for i := range 50 {
		fmt.Fprintf(&b, "%.4f,%d.5\n", float64(i)*1e-3, i%5)
	}
	got := read(t, b.String(), recording.Options{RateHz: 2000})
	if got.info.RateHz != 2000 || len(got.info.Flags) != 1 || got.info.Flags[0].Code != recording.RateDoubt {
		t.Errorf("got %g Hz, %+v", got.info.RateHz, got.info.Flags)
	}
}

// TestResample puts an unevenly sampled straight line on an even grid, where
// straight lines between samples are exact, and leaves gaps without a value.
func TestResample(t *testing.T) {
	var b strings.Builder
	b.WriteString("Time,CH1\n")
	at := 0.0
	for i := range 200 {
		fmt.Fprintf(&b, "%.6f,%.6f\n", at, 2*at-0.25)
		at += 1e-3 * (1 + 0.4*math.Sin(float64(i)))
		if i == 120 {
			at += 0.01
		}
	}
	got := read(t, b.String(), recording.Options{Resample: true, RateHz: 1000})
	if got.info.RateHz != 1000 || int(got.info.Frames) != len(got.columns[0]) {
		t.Fatalf("%+v", got.info)
	}
	holes := 0
	for i, v := range got.columns[0] {
		if v != v {
			holes++
			continue
		}
		if want := 2*float64(i)*1e-3 - 0.25; math.Abs(v-want) > 2e-6 {
			t.Errorf("frame %d: got %g, want %g", i, v, want)
		}
	}
	if holes < 9 || holes > 12 {
		t.Errorf("%d frames without a value across a gap of 10 ms", holes)
	}
	jitter := false
	for _, f := range got.info.Flags {
		jitter = jitter || f.Code == recording.TimeJitter
	}
	if !jitter {
		t.Errorf("no %s flag: %+v", recording.TimeJitter, got.info.Flags)
	}
}

func TestUnreadable(t *testing.T) {
	dir := t.TempDir()
	if _, err := Open(dir, recording.Options{}); err == nil {
		t.Error("a folder was opened")
	}
	if _, err := Open(filepath.Join(dir, "none"), recording.Options{}); !errors.Is(err, os.ErrNotExist) {
		t.Errorf("missing file: %v", err)
	}
}

// TestLimits feeds files made to cost time or memory. Each must be refused or
// read in time that grows with its size alone.
func TestLimits(t *testing.T) {
	sparse := filepath.Join(t.TempDir(), "sparse.csv")
	if err := os.WriteFile(sparse, nil, 0o600); err != nil {
		t.Fatal(err)
	}
	if err := os.Truncate(sparse, maxFile+1); err != nil {
		t.Skip(err)
	}
	if _, err := Open(sparse, recording.Options{}); !errors.Is(err, recording.ErrUnsupported) {
		t.Errorf("file above the limit: %v", err)
	}
	const n = 1 << 20
	for name, text := range map[string]string{
		"one row":            strings.Repeat("1,", n),
		"one cell":           "Time,CH1\n0,1\n1," + strings.Repeat("1", n) + "\n2,3\n",
		"line ends":          strings.Repeat("\r", n) + strings.Repeat("\n", n),
		"separators":         strings.Repeat(",", n) + "\n" + strings.Repeat(",\n", n),
		"open quotes":        "Time,CH1\n" + strings.Repeat("\"\n", n),
		"quotes in samples":  "Time,CH1\n0,1\n1,2\n2,3\n" + strings.Repeat("\"1\n", n),
		"wide then narrow":   strings.Repeat(strings.Repeat("1,", 1000)+"1\n", 300) + strings.Repeat("1\n", n),
		"text between rows":  strings.Repeat("0.5,1.5\nword\n", n/8),
		"blank between rows": strings.Repeat("0.5\n\n", n/4),
		"text column":        "Time,CH1,x\n" + strings.Repeat("1,2,a\n1,2,\n", n/8),
		"marks":              "Time,CH1\n" + strings.Repeat("1,NaN\n1,2\n", n/8),
		"long preamble":      strings.Repeat("key,value\n", n/8) + "Time,CH1\n0,1\n1,2\n2,3\n",
		"NULs":               strings.Repeat("\x00", n) + "Time,CH1\n0,1\n1,2\n2,3\n",
		"dates":              "Time,CH1\n" + strings.Repeat("12/11/2026 10:00:00,2\n", n/16),
	} {
		t.Run(name, func(t *testing.T) {
			var before, after runtime.MemStats
			runtime.ReadMemStats(&before)
			start := time.Now()
			got, err := parse("a.csv", []byte(text), 0, recording.Options{})
			took := time.Since(start)
			runtime.ReadMemStats(&after)
			if took > 10*time.Second {
				t.Errorf("took %v for %d bytes", took, len(text))
			}
			if grown := after.TotalAlloc - before.TotalAlloc; grown > uint64(400*len(text)) {
				t.Errorf("allocated %d bytes for %d", grown, len(text))
			}
			if err != nil && (len(err.Error()) > 900 || strings.ContainsAny(err.Error(), "\n\r")) {
				t.Errorf("message %q", err)
			}
			if err == nil {
				t.Logf("%d frames, %d flags, %v", got.info.Frames, len(got.info.Flags), took)
			} else {
				t.Logf("%v, %v", err, took)
			}
		})
	}
}

// TestLinear compares the time for a table with that for one of four times
// its rows.
func TestLinear(t *testing.T) {
	if testing.Short() {
		t.Skip()
	}
	least := func(n int) time.Duration {
		text := millionRows(n)
		best := time.Hour
		for range 4 {
			start := time.Now()
			if _, err := parse("a.csv", text, 0, recording.Options{}); err != nil {
				t.Fatal(err)
			}
			best = min(best, time.Since(start))
		}
		return best
	}
	small, large := least(20_000), least(80_000)
	if large > 16*small {
		t.Errorf("20 000 rows take %v, 80 000 rows %v", small, large)
	}
}

func TestReadAt(t *testing.T) {
	got := read(t, "Time,CH1,CH2\n0,1,10\n1,2,20\n2,3,30\n", recording.Options{})
	b := make([]float64, 2)
	for _, c := range []struct {
		frame int64
		n     int
		first float64
	}{{0, 2, 10}, {2, 1, 30}, {3, 0, 0}, {99, 0, 0}} {
		n, err := got.ReadAt([][]float64{nil, b}, c.frame)
		if err != nil || n != c.n || n > 0 && b[0] != c.first {
			t.Errorf("frame %d: got %d, %v, %g", c.frame, n, err, b[0])
		}
	}
	if _, err := got.ReadAt([][]float64{b}, 0); err == nil {
		t.Error("one buffer for two channels was taken")
	}
	if _, err := got.ReadAt([][]float64{b, b}, -1); err == nil {
		t.Error("a frame before the start was taken")
	}
}
