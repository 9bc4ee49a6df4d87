package tone

import (
	"fmt"
	"math"
	"slices"

	"benchslip/analyze/stage"
)

// Opinions name what distortion over level or frequency is consistent with,
// with the figures they rest on and what would confirm them. Sizes are chosen
// so that a smooth nonlinearity, whose n-th harmonic grows with the level to
// the power n-1 at all frequencies alike, gives none.
const (
	clearly  = 3.16 // 10 dB: how much more distortion there must be
	farLevel = 3.16 // 10 dB between the levels compared
	farTone  = 4.0  // two octaves between the frequencies compared
)

func dBOf(x float64) string { return fmt.Sprintf("%.0f dB", 20*math.Log10(x)) }

func opinions(all []rung) []string {
	var out []string
	for _, look := range []func([]rung) string{crossover, slewing, lowOnly} {
		if text := look(all); text != "" {
			out = append(out, text)
		}
	}
	return out
}

// alike keeps the rungs that share the key of the one with the most company,
// within a ratio, in order of by.
func alike(all []rung, key, by func(rung) float64, ratio float64) []rung {
	var best []rung
	for _, a := range all {
		var set []rung
		for _, b := range all {
			if x := key(b) / key(a); x < ratio && x > 1/ratio {
				set = append(set, b)
			}
		}
		if len(set) > len(best) {
			best = set
		}
	}
	slices.SortStableFunc(best, func(a, b rung) int {
		switch {
		case by(a) < by(b):
			return -1
		case by(a) > by(b):
			return 1
		}
		return 0
	})
	return best
}

func hz(q rung) float64  { return q.hz }
func rms(q rung) float64 { return q.rms }

// crossover of a push-pull stage: a dead zone of fixed size about zero, so odd
// orders that grow as the level falls, several of them together.
func crossover(all []rung) string {
	set := alike(all, hz, rms, 1.03)
	for i, low := range set {
		if !low.seen[3] || !low.seen[5] || low.odd() < 2*low.even() {
			continue
		}
		for _, high := range set[i+1:] {
			if high.rms > farLevel*low.rms && low.odd() > clearly*high.odd() && low.rel[5] > 2*high.rel[5] {
				return fmt.Sprintf("odd harmonics grow as the level falls, from %s at %.3g V to %s at %.3g V: consistent with crossover of a push-pull stage; "+
					"to confirm, look for steps at the zero crossings and measure the quiescent current", dBOr(high.odd()), high.rms, dBOf(low.odd()), low.rms)
			}
		}
		return "" // only the lowest level that shows them is asked
	}
	return ""
}

func dBOr(x float64) string {
	if x == 0 {
		return "below the noise"
	}
	return dBOf(x)
}

// slewing: the third order grows with frequency at one level.
func slewing(all []rung) string {
	set := alike(all, rms, hz, 1.6) // a stage that slews also loses level
	for i := len(set) - 1; i > 0; i-- {
		top := set[i]
		if !top.seen[3] { // past half the rate, or faint
			continue
		}
		worst := math.Inf(1)
		from := 0.0
		for _, q := range set[:i] {
			if q.hz*farTone <= top.hz && q.hz >= 200 && seen(q, 3) < worst {
				worst, from = seen(q, 3), q.hz
			}
		}
		if math.IsInf(worst, 1) || top.rel[3] < clearly*worst || top.rel[3] < seen(top, 2) || top.rel[3] < 1e-4 {
			return ""
		}
		return fmt.Sprintf("the third harmonic grows with frequency at one level, from %s at %.4g Hz to %s at %.4g Hz: consistent with slewing, or with loop gain that runs out; "+
			"to confirm, halve the level (slewing disappears) and measure slew_rate", dBOr(worst), from, dBOf(top.rel[3]), top.hz)
	}
	return ""
}

// lowOnly: distortion at low frequencies alone.
func lowOnly(all []rung) string {
	set := alike(all, rms, hz, 1.26)
	if len(set) < 3 {
		return ""
	}
	low := set[0]
	if low.hz > 100 || low.thd < 1e-4 {
		return ""
	}
	rest, from := 0.0, 0.0
	for _, q := range set[1:] {
		if q.hz >= farTone*low.hz && q.hz < 5000 && q.thd >= rest {
			rest, from = q.thd, q.hz
		}
	}
	if from == 0 || low.thd < clearly*rest {
		return ""
	}
	order := "third order first"
	if seen(low, 2) > seen(low, 3) {
		order = "second order first"
	}
	return fmt.Sprintf("distortion rises at low frequencies only, %s: %s at %.4g Hz, at most %s from %.4g Hz on: consistent with an electrolytic capacitor or a core too small; "+
		"to confirm, measure the voltage across the capacitor at that frequency, or halve the level", order, dBOf(low.thd), low.hz, dBOr(rest), farTone*low.hz)
}

// clipping says what a strongly distorted wave looks like at its peaks.
func clipping(h *stage.Heard, thd float64) []string {
	if thd < 3e-3 {
		return nil
	}
	f, ok := stage.FlatsOf(h)
	if !ok || !f.Any() {
		return nil
	}
	unit := h.Out.Unit
	if unit == "FS" {
		unit = "of full scale"
	}
	uneven := math.Abs(f.Positive-f.Negative)/(f.Positive+f.Negative) > 0.02
	switch {
	case !uneven && f.Up && f.Down:
		return []string{fmt.Sprintf("both halves of the wave are flat, at %.3g and %.3g %s: consistent with ordinary clipping; to confirm, lower the level by 1 dB, and compare with the rails less 1 to 4 V",
			f.Positive, f.Negative, unit)}
	}
	half := "negative"
	if f.Positive < f.Negative {
		half = "positive"
	}
	return []string{fmt.Sprintf("the %s half of the wave flattens first, at %.3g against %.3g %s: consistent with one rail low, a bias fault or a dead half of the output stage; "+
		"to confirm, measure both rails under load and the DC on each stage", half, math.Min(f.Positive, f.Negative), math.Max(f.Positive, f.Negative), unit)}
}
