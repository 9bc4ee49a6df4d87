package scopecsv

import (
	"bytes"
	"math/rand/v2"
	"os"
	"path/filepath"
	"slices"
	"sort"
	"testing"

	"benchslip/capture/recording"
)

// damages are ways in which a file goes wrong that leave the digits of every
// number whole: a damaged table that reads without error and flag must hold
// the samples and the rate of the healthy one.
var damages = []struct {
	name string
	do   func(lines [][]byte, r *rand.Rand) [][]byte // lines keep their ends
}{
	{"letter in a number", func(l [][]byte, r *rand.Rand) [][]byte {
		return edit(l, r, func(b []byte) []byte {
			return splice(b, digitAt(b, r), 0, "x")
		})
	}},
	{"separator lost", func(l [][]byte, r *rand.Rand) [][]byte {
		return edit(l, r, func(b []byte) []byte { return splice(b, bytes.IndexAny(b, ",;\t|"), 1, "") })
	}},
	{"separator twice", func(l [][]byte, r *rand.Rand) [][]byte {
		return edit(l, r, func(b []byte) []byte {
			if i := bytes.IndexAny(b, ",;\t|"); i >= 0 {
				return splice(b, i, 0, string(b[i]))
			}
			return b
		})
	}},
	{"line end lost", func(l [][]byte, r *rand.Rand) [][]byte {
		return edit(l, r, func(b []byte) []byte { return bytes.TrimRight(b, "\r\n") })
	}},
	{"text row", func(l [][]byte, r *rand.Rand) [][]byte { return insert(l, r, "cable moved here\n") }},
	{"setting row", func(l [][]byte, r *rand.Rand) [][]byte { return insert(l, r, "Sample Rate,12345\n") }},
	{"row of other numbers", func(l [][]byte, r *rand.Rand) [][]byte { return insert(l, r, "7\n") }},
	{"rows swapped", func(l [][]byte, r *rand.Rand) [][]byte {
		i := len(l)/2 + r.IntN(5)
		l[i], l[i+3] = l[i+3], l[i]
		return l
	}},
	{"row lost", func(l [][]byte, r *rand.Rand) [][]byte {
		i := len(l)/2 + r.IntN(5)
		return slices.Delete(l, i, i+1)
	}},
	{"row twice", func(l [][]byte, r *rand.Rand) [][]byte {
		i := len(l)/2 + r.IntN(5)
		return slices.Insert(l, i, l[i])
	}},
	{"other separators from some row on", func(l [][]byte, r *rand.Rand) [][]byte {
		for i := 1 + r.IntN(len(l)-1); i < len(l); i++ {
			l[i] = bytes.Map(func(c rune) rune {
				switch c {
				case ',', '\t', '|':
					return ';'
				case ';':
					return '\t'
				}
				return c
			}, l[i])
		}
		return l
	}},
	{"cell emptied", func(l [][]byte, r *rand.Rand) [][]byte {
		return edit(l, r, func(b []byte) []byte {
			t := bytes.TrimRight(b, "\r\n ,;\t|")
			i := bytes.LastIndexAny(t, ";\t| ")
			if i < 0 {
				i = bytes.LastIndexByte(t, ',')
			}
			return append(slices.Clone(t[:i+1]), b[len(t):]...)
		})
	}},
	{"end cut off", func(l [][]byte, r *rand.Rand) [][]byte {
		last := bytes.TrimRight(l[len(l)-1], "\r\n ,;\t|")
		if i := bytes.LastIndexAny(last, ",;\t|"); i > 0 {
			l[len(l)-1] = last[:i]
		}
		return l
	}},
}

func splice(b []byte, i, n int, s string) []byte {
	if i < 0 {
		return b
	}
	return slices.Concat(b[:i], []byte(s), b[i+n:])
}

func digitAt(b []byte, r *rand.Rand) int {
	var at []int
	for i, c := range b {
		if c >= '0' && c <= '9' {
			at = append(at, i)
		}
	}
	if len(at) == 0 {
		return -1
	}
	return at[r.IntN(len(at))]
}

// edit changes one line, not the last.
func edit(l [][]byte, r *rand.Rand, do func([]byte) []byte) [][]byte {
	i := r.IntN(len(l) - 2)
	l[i] = do(l[i])
	return l
}

func insert(l [][]byte, r *rand.Rand, s string) [][]byte {
	return slices.Insert(l, r.IntN(len(l)-2), []byte(s))
}

// harmless lists damages that leave nothing to see: no time column shows a
// lost, doubled or moved row of bare values.
func harmless(shape *table, damage string) bool {
	timed := false
	for _, a := range shape.info.Assumptions {
		timed = timed || bytes.Contains([]byte(a), []byte("time from column")) || bytes.Contains([]byte(a), []byte("counts the rows"))
	}
	switch damage {
	case "rows swapped", "row lost", "row twice", "row of other numbers", "cell emptied":
		return !timed
	}
	return false
}

func TestDamageIsNeverSilent(t *testing.T) {
	truths := shapeTruths(t)
	var names []string
	for n, w := range truths {
		if w.Error == nil && len(w.Flags) == 0 && w.Frames > 40 {
			names = append(names, n)
		}
	}
	sort.Strings(names)
	tried := 0
	for _, n := range names {
		raw, err := os.ReadFile(filepath.Join("testdata", "shapes", n+".csv"))
		if err != nil {
			t.Fatal(err)
		}
		if wide, _, _ := utf16Order(raw); wide || !bytes.Contains(raw, []byte("\n")) {
			continue
		}
		healthy, err := parse(n, raw, 0, recording.Options{})
		if err != nil {
			t.Fatal(err)
		}
		for _, d := range damages {
			for seed := range uint64(2) {
				r := rand.New(rand.NewPCG(seed, 1))
				lines := bytes.SplitAfter(slices.Clone(raw), []byte("\n"))
				if len(lines[len(lines)-1]) == 0 {
					lines = lines[:len(lines)-1]
				}
				bad := bytes.Join(d.do(lines, r), nil)
				if bytes.Equal(bad, raw) || harmless(healthy, d.name) {
					continue
				}
				tried++
				got, err := parse(n, bad, 0, recording.Options{})
				if err == nil && len(got.info.Flags) == 0 && !sameTable(got, healthy) {
					t.Errorf("%s, %s (seed %d): read without error or flag as %d frames at %g Hz, healthy %d at %g", n, d.name, seed, got.info.Frames, got.info.RateHz, healthy.info.Frames, healthy.info.RateHz)
				}
			}
		}
	}
	if tried < 1000 {
		t.Errorf("only %d damaged files tried", tried)
	}
}

func sameTable(a, b *table) bool {
	if a.info.RateHz != b.info.RateHz || a.info.Frames != b.info.Frames || len(a.columns) != len(b.columns) {
		return false
	}
	for c := range a.columns {
		for i, v := range a.columns[c] {
			if w := b.columns[c][i]; v != w && (v == v || w == w) {
				return false
			}
		}
	}
	return true
}
