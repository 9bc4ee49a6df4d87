package scopecsv

import (
	"bytes"
	"encoding/csv"
	"fmt"
	"math/rand/v2"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"testing"
	"unicode/utf16"

	"benchslip/capture/recording"
)

// take is what a file is written from: printed values, so that every way of
// writing them means the same numbers.
type take struct {
	values [][]string // by channel, then row; plain decimals in volts
	step   int        // in units of 1e-7 s
	start  int        // first stamp in steps
}

func randomTake(r *rand.Rand) take {
	t := take{step: 1 + r.IntN(5000), start: r.IntN(200) - 100}
	rows := 8 + r.IntN(60)
	for range 1 + r.IntN(3) {
		var v []string
		for range rows {
			v = append(v, strconv.FormatFloat(r.NormFloat64(), 'f', 5, 64))
		}
		t.values = append(t.values, v)
	}
	return t
}

// stamp prints row i's time in units of 10^-digits of 1e-7 s: s (7), ms (4), us (1).
func (t take) stamp(i, decimals int) string {
	n := (t.start + i) * t.step
	sign := ""
	if n < 0 {
		sign, n = "-", -n
	}
	s := fmt.Sprintf("%0*d", decimals+1, n)
	return sign + s[:len(s)-decimals] + "." + s[len(s)-decimals:]
}

// write writes a take in one of many ways.
func (t take) write(r *rand.Rand) []byte {
	var b strings.Builder
	rows := len(t.values[0])
	sep := []string{",", ";", "\t", " ", " ; "}[r.IntN(5)]
	comma := strings.Contains(";\t ", strings.TrimSpace(sep)+"") && sep != "," && r.IntN(2) == 0
	end := []string{"\n", "\r\n", "\r", "\r\r\n"}[r.IntN(4)]
	unit := r.IntN(3) // s, ms, us
	timed := r.IntN(4) > 0
	quoted := sep != " " && r.IntN(5) == 0
	millis := r.IntN(3) == 0 // values in mV
	num := func(s string) string {
		if comma {
			s = strings.Replace(s, ".", ",", 1)
		}
		if quoted {
			s = `"` + s + `"`
		}
		return s
	}
	line := func(cells ...string) { b.WriteString(strings.Join(cells, sep) + end) }
	if !timed && len(t.values) == 1 {
		comma = false // one column of decimal commas may be two of whole numbers: refused
	}
	keySep := sep
	if sep == " " {
		keySep = ": "
	}
	pair := func(k, v string) { b.WriteString(k + keySep + v + end) }
	stepS := strconv.FormatFloat(float64(t.step)*1e-7, 'g', -1, 64)
	if !timed || r.IntN(3) == 0 {
		for range r.IntN(4) {
			pair("Operator", "bench "+string(rune('A'+r.IntN(20))))
		}
		pair("Sample Interval", num(stepS))
		if !timed {
			pair("X0", num(strconv.FormatFloat(float64(t.start*t.step)*1e-7, 'g', -1, 64)))
		}
	}
	volt, sec := "V", []string{"s", "ms", "us"}[unit]
	if millis {
		volt = "mV"
	}
	var heads, units []string
	if timed {
		heads, units = append(heads, "Time"), append(units, sec)
	}
	for c := range t.values {
		heads, units = append(heads, "CH"+strconv.Itoa(c+1)), append(units, volt)
	}
	switch style := r.IntN(4); {
	case style == 0 && sep != " ":
		line(heads...)
		line(units...)
	case style == 1 && sep != " ":
		line(heads...)
		for i := range units {
			units[i] = "(" + units[i] + ")"
		}
		line(units...)
		b.WriteString(end)
	default:
		for i := range heads {
			heads[i] += "(" + units[i] + ")"
		}
		if style == 2 && sep != " " {
			heads = append(heads, "Note")
		}
		line(heads...)
	}
	for i := range rows {
		var cells []string
		if timed {
			cells = append(cells, num(t.stamp(i, []int{7, 4, 1}[unit])))
		}
		for _, v := range t.values {
			s := v[i]
			if millis {
				s += "e3"
			}
			cells = append(cells, num(s))
		}
		line(cells...)
	}
	out := b.String()
	if r.IntN(6) == 0 {
		out = strings.TrimRight(out, "\r\n")
	}
	switch r.IntN(6) {
	case 0:
		return append([]byte("\xef\xbb\xbf"), out...)
	case 1:
		w := []byte{0xff, 0xfe}
		for _, u := range utf16.Encode([]rune(out)) {
			w = append(w, byte(u), byte(u>>8))
		}
		return w
	}
	return []byte(out)
}

// TestTwoWays writes the same samples in two ways: they must read equal, to
// the last bit where no unit is applied and to one rounding where one is.
func TestTwoWays(t *testing.T) {
	for seed := range uint64(400) {
		r := rand.New(rand.NewPCG(seed, 9))
		checkTwoWays(t, randomTake(r), r)
	}
}

func checkTwoWays(t *testing.T, tk take, r *rand.Rand) {
	a, b := tk.write(r), tk.write(r)
	x, errX := parse("a", a, 0, recording.Options{})
	y, errY := parse("b", b, 0, recording.Options{})
	if errX != nil || errY != nil {
		t.Fatalf("%v, %v\n%s\n----\n%s", errX, errY, a, b)
	}
	fail := func(what string) {
		t.Fatalf("%s differ: %+v\n%+v\n%s\n----\n%s", what, x.info, y.info, a, b)
	}
	near := func(p, q float64) bool { d := p - q; return d <= 1e-15*abs(p) && d >= -1e-15*abs(p) }
	if len(x.info.Flags)+len(y.info.Flags) > 0 {
		fail("flags")
	}
	if d := x.info.RateHz/y.info.RateHz - 1; abs(d) > 1e-9 {
		fail("rates")
	}
	if abs(x.info.StartS-y.info.StartS) > 1e-15 {
		fail("starts")
	}
	if len(x.columns) != len(tk.values) || len(y.columns) != len(tk.values) {
		fail("channels")
	}
	for c := range tk.values {
		for i, s := range tk.values[c] {
			v, _ := strconv.ParseFloat(s, 64)
			if len(x.columns[c]) != len(tk.values[c]) || !near(x.columns[c][i], v) || !near(y.columns[c][i], v) {
				fail("values")
			}
		}
	}
}

func abs(x float64) float64 {
	if x < 0 {
		return -x
	}
	return x
}

func FuzzTwoWays(f *testing.F) {
	f.Add(uint64(1), uint64(2))
	f.Fuzz(func(t *testing.T, s1, s2 uint64) {
		r := rand.New(rand.NewPCG(s1, s2))
		checkTwoWays(t, randomTake(r), r)
	})
}

// TestAgainstEncodingCSV writes tables with the standard library's writer,
// quotes where it wants them, and reads them back.
func TestAgainstEncodingCSV(t *testing.T) {
	r := rand.New(rand.NewPCG(3, 3))
	for range 50 {
		var buf bytes.Buffer
		w := csv.NewWriter(&buf)
		w.UseCRLF = r.IntN(2) == 0
		_ = w.Write([]string{"Time, relative (s)", `CH "A" (V)`, "remark"})
		var want []float64
		for i := range 20 + r.IntN(100) {
			v := r.NormFloat64()
			want = append(want, v)
			_ = w.Write([]string{strconv.FormatFloat(float64(i)*0.25, 'g', -1, 64), strconv.FormatFloat(v, 'g', -1, 64), []string{"", "a, b", "two\nlines", `"q"`}[r.IntN(4)]})
		}
		w.Flush()
		got, err := parse("a", buf.Bytes(), 0, recording.Options{})
		if err != nil {
			t.Fatalf("%v\n%s", err, buf.Bytes())
		}
		if got.info.RateHz != 4 || len(got.columns) != 1 || len(got.columns[0]) != len(want) || len(got.info.Flags) > 0 {
			t.Fatalf("%+v\n%s", got.info, buf.Bytes())
		}
		for i, v := range want {
			if got.columns[0][i] != v {
				t.Fatalf("row %d: got %v, want %v", i, got.columns[0][i], v)
			}
		}
	}
}

// FuzzOpen feeds any bytes: no panic, a bounded result, and every sample that
// is not a number listed as missing.
func FuzzOpen(f *testing.F) {
	paths, err := filepath.Glob("testdata/shapes/*.csv")
	if err != nil || len(paths) < 100 {
		f.Fatalf("%d seeds, %v", len(paths), err)
	}
	for _, p := range paths {
		b, err := os.ReadFile(p)
		if err != nil {
			f.Fatal(err)
		}
		f.Add(b)
	}
	f.Fuzz(func(t *testing.T, b []byte) {
		tb, err := parse("fuzz", b, int64(len(b)), recording.Options{})
		if err != nil {
			if s := err.Error(); strings.ContainsAny(s, "\n\r") || len(s) > 900 {
				t.Fatalf("message: %q", s)
			}
			return
		}
		cells := 0
		for c, v := range tb.columns {
			cells += len(v)
			if int64(len(v)) != tb.info.Frames {
				t.Fatalf("channel %d has %d samples of %d frames", c+1, len(v), tb.info.Frames)
			}
			for i, x := range v {
				if x == x && x-x == 0 {
					continue
				}
				listed := false
				for _, m := range tb.info.Missing {
					listed = listed || m.Channel == c+1 && int64(i) >= m.From && int64(i) < m.To
				}
				if !listed {
					t.Fatalf("channel %d, frame %d is %v and not listed as missing", c+1, i, x)
				}
			}
		}
		if cells > len(b)+64 {
			t.Fatalf("%d samples from %d bytes", cells, len(b))
		}
		if !(tb.info.RateHz >= 0) || tb.info.RateHz > 1e20 || tb.info.StartS != tb.info.StartS {
			t.Fatalf("rate %g, start %g", tb.info.RateHz, tb.info.StartS)
		}
	})
}
