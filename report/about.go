package report

import (
	"math"
	"slices"
	"sort"
	"strconv"
	"strings"

	"benchslip/analyze/slip"
)

// Pair is a key someone typed with its value.
type Pair struct{ Key, Value string }

// Pairs lists a table of free keys in the order typed, then any others by
// name, cleaned. Empty values are left out.
func Pairs(m map[string]string, order []string) []Pair {
	out := RawPairs(m, order)
	for i := range out {
		out[i] = Pair{Clean(out[i].Key), Clean(out[i].Value)}
	}
	return out
}

// PairsLine joins pairs: "gain 40 dB, source 150 ohm".
func PairsLine(pairs []Pair) string {
	var out []string
	for _, p := range pairs {
		out = append(out, p.Key+" "+p.Value)
	}
	return strings.Join(out, ", ")
}

// GearLine describes one gear entry: "box: audio, full scale 4.92 V peak,
// AC-coupled, uncertainty 0.5 %, calibrated 2026-11-12".
func GearLine(g slip.Gear) string {
	out := []string{Clean(g.Kind)}
	if g.FullScale != "" {
		out = append(out, "full scale "+Clean(g.FullScale))
	}
	if g.Coupling != "" {
		out = append(out, strings.ToUpper(Clean(g.Coupling))+"-coupled")
	}
	if g.Stated != "" {
		out = append(out, "uncertainty "+Clean(g.Stated))
	} else {
		out = append(out, "uncertainty not stated")
	}
	if g.Calibrated != "" {
		out = append(out, "calibrated "+Clean(g.Calibrated))
	}
	if g.Notes != "" {
		out = append(out, Clean(g.Notes))
	}
	return Clean(g.Name) + ": " + strings.Join(out, ", ")
}

// TakeLine describes a recording: "takes/tone.wav, WAV 24-bit PCM, 2 channels,
// 96 kHz, 8 s, 4.61 MB". A missing one says why.
func TakeLine(t *slip.Take) string {
	out := []string{Clean(t.File)}
	if t.Fault != "" {
		return Clean(t.File) + ": " + Clean(t.Fault)
	}
	return strings.Join(append(out, TakeFacts(t)...), ", ")
}

// TakeFacts lists what is known of a recording: format, channels, rate,
// length, size.
func TakeFacts(t *slip.Take) []string {
	var out []string
	if t.Format != nil && *t.Format != "" {
		out = append(out, Clean(*t.Format))
	}
	if t.Channels != nil {
		out = append(out, count(*t.Channels, "channel", "channels"))
	}
	if t.RateHz != nil {
		out = append(out, Rate(*t.RateHz))
	}
	if t.DurationS != nil {
		out = append(out, Duration(*t.DurationS))
	}
	if t.Bytes != nil {
		out = append(out, Bytes(*t.Bytes))
	}
	return out
}

// Rate prints a sample rate exactly: "44.1 kHz".
func Rate(hz float64) string { return scaled(hz, "Hz", 9) }

// Duration prints a time in seconds to four digits: "8 s", "2.048 ms".
func Duration(s float64) string { return scaled(s, "s", 4) }

// scaled prints x with a prefix; digits significant ones at most.
func scaled(x float64, unit string, digits int) string {
	for _, p := range []struct {
		min  float64
		name string
	}{{1e9, "G"}, {1e6, "M"}, {1e3, "k"}, {1, ""}, {1e-3, "m"}, {1e-6, "µ"}, {0, "n"}} {
		if unit == "s" && p.min > 1 {
			continue
		}
		if math.Abs(x) >= p.min {
			f := p.min
			if f == 0 {
				f = 1e-9
			}
			y, _ := strconv.ParseFloat(strconv.FormatFloat(x/f, 'e', digits-1, 64), 64)
			return plain(y) + " " + p.name + unit
		}
	}
	return plain(x) + " " + unit
}

// Bytes prints a file size with decimal prefixes.
func Bytes(n int64) string {
	switch {
	case n < 1000:
		return count(int(n), "byte", "bytes")
	case n < 1e6:
		return Digits(float64(n)/1e3, 3) + " kB"
	}
	return Digits(float64(n)/1e6, 3) + " MB"
}

// ToolLine names the program: "benchslip 0.1.0".
func ToolLine(s *slip.Slip) string {
	return strings.TrimSpace(Clean(s.Tool.Name) + " " + Clean(s.Tool.Version))
}

// RawPairs is Pairs with keys and values as typed, for a renderer that makes
// them safe in its own way.
func RawPairs(m map[string]string, order []string) []Pair {
	var rest []string
	for k := range m {
		if !slices.Contains(order, k) {
			rest = append(rest, k)
		}
	}
	sort.Strings(rest)
	var out []Pair
	for _, k := range append(slices.Clone(order), rest...) {
		if v, ok := m[k]; ok && strings.TrimSpace(v) != "" {
			out = append(out, Pair{k, v})
		}
	}
	return out
}
