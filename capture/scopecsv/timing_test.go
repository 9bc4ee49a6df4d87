package scopecsv

import (
	"fmt"
	"math"
	"math/rand/v2"
	"strconv"
	"strings"
	"testing"

	"benchslip/capture/recording"
)

// TestEvenTimeIsClean prints even time bases in many ways: fixed decimals and
// significant digits fine and coarse, values of 32-bit floats, cut instead of
// rounded, each with at least ten stamps to a unit of the last digit... or
// fewer. No flag may be raised, and the rate must lie within one unit of the
// last digit over the span.
func TestEvenTimeIsClean(t *testing.T) {
	for seed := range uint64(200) {
		r := rand.New(rand.NewPCG(seed, 4))
		n := 50 + r.IntN(3000)
		step := math.Pow(10, -1-6*r.Float64())
		if r.IntN(2) == 0 {
			step, _ = strconv.ParseFloat(strconv.FormatFloat(step, 'e', r.IntN(3), 64), 64)
		}
		start := -step * float64(r.IntN(n))
		span := step * float64(n)
		far := math.Max(math.Abs(start), math.Abs(start+span))
		need := int(math.Ceil(-math.Log10(step))) // decimals that tell steps apart
		var print func(float64) string
		var q float64
		kind := r.IntN(4)
		switch kind {
		case 0:
			d := need + r.IntN(5)
			q = math.Pow10(-d)
			print = func(v float64) string { return strconv.FormatFloat(v, 'f', d, 64) }
		case 1:
			d := int(math.Ceil(math.Log10(far/step))) + 1 + r.IntN(8)
			q = math.Pow10(int(math.Floor(math.Log10(far))) - d + 1)
			print = func(v float64) string { return strconv.FormatFloat(v, 'e', d-1, 64) }
		case 2:
			if far/step > 1e6 {
				continue
			}
			q = far * 1.2e-7
			print = func(v float64) string { return strconv.FormatFloat(float64(float32(v)), 'g', 12, 64) }
		case 3:
			d := int(math.Ceil(math.Log10(far/step))) + 2 + r.IntN(8)
			q = math.Pow10(int(math.Floor(math.Log10(far))) - d + 1)
			print = func(v float64) string { return strconv.FormatFloat(v, 'g', d, 64) }
		}
		var b strings.Builder
		b.WriteString("Time (s),CH1 (V)\n")
		for i := range n {
			fmt.Fprintf(&b, "%s,%.4f\n", print(start+float64(i)*step), r.NormFloat64())
		}
		got := read(t, b.String(), recording.Options{})
		if len(got.info.Flags) > 0 {
			t.Errorf("seed %d: step %g, q %g (%.3g steps), %d rows, kind %d: %+v", seed, step, q, q/step, n, kind, got.info.Flags)
			continue
		}
		if e := math.Abs(got.info.RateHz*step - 1); e > 1.01*q/span+1e-9 {
			t.Errorf("seed %d: step %g, q %g, %d rows, kind %d: rate off by %g, bound %g", seed, step, q, n, kind, e, q/span)
		}
	}
}

// TestOddTimeIsFlagged damages even time bases: rows lost or doubled, jitter
// beyond the rounding, a slow drift. Each must raise its flag.
func TestOddTimeIsFlagged(t *testing.T) {
	for seed := range uint64(150) {
		r := rand.New(rand.NewPCG(seed, 5))
		n := 60 + r.IntN(2000)
		step := []float64{1e-3, 4e-6, 2.5e-5, 0.1, 0.63e-6}[r.IntN(5)]
		d := int(math.Ceil(-math.Log10(step))) + 1 + r.IntN(3)
		q := math.Pow10(-d)
		var ts []float64
		want := ""
		switch r.IntN(4) {
		case 0:
			want = recording.Gap
			lost := 5 + r.IntN(n-10)
			for i := range n {
				if i != lost {
					ts = append(ts, float64(i)*step)
				}
			}
		case 1:
			want = recording.DuplicateTime
			twice := 5 + r.IntN(n-10)
			for i := range n {
				ts = append(ts, float64(i)*step)
				if i == twice {
					ts = append(ts, float64(i)*step)
				}
			}
		case 2:
			want = recording.TimeJitter
			amount := math.Max(4*q, 0.05*step)
			for i := range n {
				ts = append(ts, float64(i)*step+amount*(2*r.Float64()-1))
			}
		case 3:
			want = recording.TimeJitter
			for i := range n {
				x := float64(i) / float64(n)
				ts = append(ts, float64(i)*step+math.Max(8*q, 0.4*step)*4*x*(1-x))
			}
		}
		var b strings.Builder
		b.WriteString("Time (s),CH1 (V)\n")
		for _, x := range ts {
			fmt.Fprintf(&b, "%.*f,%.4f\n", d, x, r.NormFloat64())
		}
		got := read(t, b.String(), recording.Options{})
		found := false
		for _, f := range got.info.Flags {
			found = found || f.Code == want
		}
		if !found {
			t.Errorf("seed %d: step %g, q %g, %d rows: no %s: %+v", seed, step, q, n, want, got.info.Flags)
		}
		if e := math.Abs(got.info.RateHz*step - 1); got.info.RateHz > 0 && want != recording.TimeJitter && e > 2*q/(step*float64(n))+1e-9 {
			t.Errorf("seed %d: step %g, q %g, %d rows, %s: rate off by %g", seed, step, q, n, want, e)
		}
	}
}
