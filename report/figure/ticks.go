package figure

import (
	"math"
	"strconv"

	"gonum.org/v1/plot"
)

// linearTicks puts about seven labelled ticks at round steps of 1, 2 or 5
// times a power of ten, all with the same decimals, and unlabelled ones
// between.
type linearTicks struct {
	degrees bool // steps that divide a circle
}

func (l linearTicks) Ticks(lo, hi float64) []plot.Tick {
	if !(hi > lo) || !finite(lo) || !finite(hi) {
		return nil
	}
	step := roundStep((hi - lo) / 7)
	minor := step / 5
	if lead := step / math.Pow(10, math.Floor(math.Log10(step)*(1+1e-12))); lead > 1.5 && lead < 3 {
		minor = step / 4
	}
	if l.degrees && step >= 10 {
		for _, s := range []float64{10, 15, 30, 45, 90, 180, 360} {
			if s >= (hi-lo)/8 {
				step, minor = s, s/3
				break
			}
		}
	}
	var ticks []plot.Tick
	per := int(math.Round(step / minor))
	first := int(math.Ceil(lo/minor - 1e-9))
	last := int(math.Floor(hi/minor + 1e-9))
	if last-first > 200 {
		return nil // lo and hi nearly equal against their size: nothing to tell apart
	}
	for i := first; i <= last; i++ {
		t := plot.Tick{Value: float64(i) * minor}
		if i%per == 0 {
			t.Value = float64(i/per) * step
			t.Label = label(t.Value, step)
		}
		ticks = append(ticks, t)
	}
	return ticks
}

// roundStep is the smallest of 1, 2, 5 times a power of ten that is not below x.
func roundStep(x float64) float64 {
	p := math.Pow(10, math.Floor(math.Log10(x)))
	for _, m := range []float64{1, 2, 5, 10} {
		if m*p >= x*(1-1e-9) {
			return m * p
		}
	}
	return 10 * p
}

func label(v, step float64) string {
	places := max(0, int(math.Ceil(-math.Log10(step)-1e-9)))
	if places > 6 || math.Abs(v) >= 1e7 {
		return strconv.FormatFloat(v, 'g', 4, 64)
	}
	s := strconv.FormatFloat(v, 'f', places, 64)
	if v == 0 || math.Abs(v) < step/2 {
		s = "0"
	}
	return s
}

// logTicks puts ticks at 1, 2 and 5 in every decade and labels them all, or
// the decades alone where there are more than five; the other whole digits
// are unlabelled. A range too short for three labels is ticked like a linear
// one.
type logTicks struct{}

func (logTicks) Ticks(lo, hi float64) []plot.Tick {
	if !(lo > 0) || !(hi > lo) || math.IsInf(hi, 0) {
		return nil
	}
	all := math.Log10(hi/lo) <= 5
	var ticks []plot.Tick
	labels := 0
	for e := int(math.Floor(math.Log10(lo))) - 1; e <= int(math.Ceil(math.Log10(hi)))+1; e++ {
		for d := 1; d <= 9; d++ {
			v, _ := strconv.ParseFloat(strconv.Itoa(d)+"e"+strconv.Itoa(e), 64)
			if v < lo*(1-1e-12) || v > hi*(1+1e-12) {
				continue
			}
			t := plot.Tick{Value: math.Min(math.Max(v, lo), hi)}
			if d == 1 || all && (d == 2 || d == 5) {
				t.Label = short(v)
				labels++
			}
			ticks = append(ticks, t)
		}
	}
	if labels < 3 && hi/lo < 1e3 {
		return positive(linearTicks{}.Ticks(lo, hi))
	}
	return ticks
}

func positive(ticks []plot.Tick) []plot.Tick {
	for len(ticks) > 0 && ticks[0].Value <= 0 {
		ticks = ticks[1:]
	}
	return ticks
}

// short writes round numbers as people say them: "20", "1k", "2M".
func short(v float64) string {
	for _, p := range []struct {
		size float64
		name string
	}{{1e9, "G"}, {1e6, "M"}, {1e3, "k"}} {
		if v >= p.size {
			return strconv.FormatFloat(v/p.size, 'f', -1, 64) + p.name
		}
	}
	return strconv.FormatFloat(v, 'g', 6, 64)
}
