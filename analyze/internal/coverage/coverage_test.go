package coverage

import (
	"flag"
	"math"
	"runtime"
	"slices"
	"sync"
	"testing"

	"benchslip/analyze"
	"benchslip/analyze/internal/trial"
	"benchslip/analyze/judge"
	"benchslip/analyze/measures"
	"benchslip/analyze/slip"
	"benchslip/capture/unit"
)

var (
	full   = flag.Bool("full", false, "600 takes a measure instead of 16")
	runs   = flag.Int("takes", 0, "takes a measure; 0: 16, or 600 with -full")
	seedOf = flag.Uint64("seed", 1, "where the random numbers start")
)

// shown is a row as the slip prints it, with the truth in its unit.
type shown struct {
	slip.Check
	truth, size float64
	seed        uint64
}

// measured runs one random take through measure and judge.
func measured(m *analyze.Measure, sc scene, seed uint64) shown {
	s := sc.draw(newBench(seed, *full))
	p := trial.Pass(m, s.params, s.roles)
	c := slip.Check{Measure: m.Name}
	judge.Row(&c, m.Run(p), judge.Limits{}, slip.Rule{Decision: judge.FourWay, Coverage: 2}, 0)
	u := unit.MustLookup(c.Unit)
	out := shown{c, u.FromLinear(s.truth), 1, seed}
	switch {
	case u.IsLog():
	case s.size != 0:
		out.size = u.FromLinear(s.size)
	default:
		out.size = out.truth
	}
	return out
}

// all measures many random takes of a scene, on all processors.
func all(t *testing.T, sc scene) []shown {
	m := measures.ByName(sc.measure)
	if m == nil {
		t.Skipf("%s is not there", sc.measure)
	}
	n := *runs
	if n == 0 {
		n = 16
		if *full {
			n = 600
		}
	}
	out := make([]shown, n)
	var wg sync.WaitGroup
	workers := runtime.GOMAXPROCS(0)
	for w := range workers {
		wg.Go(func() {
			for i := w; i < n; i += workers {
				out[i] = measured(m, sc, *seedOf*1_000_003+uint64(i))
			}
		})
	}
	wg.Wait()
	return out
}

// slack is three standard errors of a share found from n takes.
func slack(share float64, n int) float64 { return 3 * math.Sqrt(share*(1-share)/float64(n)) }

// TestAboveDetection: the true value lies within +-U in 92 to 99.5 % of the
// takes, and U is not inflated: 95 % of the errors reach 0.4 U and more.
func TestAboveDetection(t *testing.T) {
	good, total := 0, 0
	for _, sc := range above {
		t.Run(sc.name, func(t *testing.T) {
			rows := all(t, sc)
			inside, refused := 0, 0
			var ratio, errs, us []float64
			for _, c := range rows {
				if c.Value == nil || c.Uncertainty == nil {
					refused++
					t.Logf("seed %d: %s, truth %g %s", c.seed, c.Reason, c.truth, c.Unit)
					continue
				}
				e := math.Abs(*c.Value - c.truth)
				if e <= *c.Uncertainty {
					inside++
				} else if r := e / *c.Uncertainty; r > 2 {
					t.Logf("seed %d: %.6g %s for %.6g, %.1f U", c.seed, *c.Value, c.Unit, c.truth, r)
				}
				ratio = append(ratio, e / *c.Uncertainty)
				errs = append(errs, e/math.Abs(c.size))
				us = append(us, *c.Uncertainty/math.Abs(c.size))
			}
			n := len(ratio)
			good, total = good+inside, total+n
			if refused > max(1, len(rows)/50) {
				t.Errorf("%d of %d takes refused", refused, len(rows))
			}
			if n == 0 {
				return
			}
			share := float64(inside) / float64(n)
			inflated := quantile(us, 0.5) / quantile(errs, 0.95)
			t.Logf("%d takes: %.1f %% within U, median U %.3g (%s), 95 %% of the errors below %.3g, median U over that %.2f, 95 %% of |error|/U below %.2f",
				n, 100*share, quantile(us, 0.5), kindOf(rows[0].Unit), quantile(errs, 0.95), inflated, quantile(ratio, 0.95))
			if lo := 0.92 - slack(0.92, n)*short(); share < lo {
				t.Errorf("only %.1f %% within U, wanted %.1f %%", 100*share, 100*lo)
			}
			if share > 0.995+short()*0.005 {
				t.Errorf("%.1f %% within U: U is inflated", 100*share)
			}
			if inflated > 2.5 || quantile(ratio, 0.95) < 0.4*(1-short()*0.25) {
				t.Errorf("U is inflated")
			}
		})
	}
	if total == 0 {
		return
	}
	share := float64(good) / float64(total)
	t.Logf("all %d takes: %.1f %% within U", total, 100*share)
	if share < 0.92 || share > 0.995 {
		t.Errorf("%.1f %% of all takes within U, wanted 92 to 99.5 %%", 100*share)
	}
}

// short is 1 in a short run, whose shares scatter, and 0 in a full one.
func short() float64 {
	if *full {
		return 0
	}
	return 1
}

// TestAboutDetection: value +-U, or the bound, holds the truth in 93 % of the
// takes and more.
func TestAboutDetection(t *testing.T) {
	for _, sc := range about {
		t.Run(sc.name, func(t *testing.T) {
			rows := all(t, sc)
			holds, values, n := 0, 0, 0
			for _, c := range rows {
				n++
				switch {
				case c.Value != nil:
					values++
					if inside(c) {
						holds++
					} else {
						t.Logf("seed %d: %.6g +- %.3g %s for %.6g", c.seed, *c.Value, *c.Uncertainty, c.Unit, c.truth)
					}
				case c.Bound == nil:
					n--
					t.Errorf("seed %d: neither value nor bound: %s", c.seed, c.Reason)
				case c.Bound.Kind == "upper" && c.truth <= c.Bound.Value, c.Bound.Kind == "lower" && c.truth >= c.Bound.Value:
					holds++
				default:
					t.Logf("seed %d: %s bound %.6g %s for %.6g", c.seed, c.Bound.Kind, c.Bound.Value, c.Unit, c.truth)
				}
			}
			share := float64(holds) / float64(n)
			t.Logf("%d takes, %d with a value: %.1f %% hold the truth", n, values, 100*share)
			if lo := 0.93 - slack(0.93, n)*short(); share < lo {
				t.Errorf("only %.1f %% hold the truth, wanted %.1f %%", 100*share, 100*lo)
			}
		})
	}
}

// inside: the truth lies within value +-U, or within the interval of a wide
// one.
func inside(c shown) bool {
	if c.Interval != nil && c.truth >= c.Interval[0] && c.truth <= c.Interval[1] {
		return true
	}
	return c.Uncertainty != nil && math.Abs(*c.Value-c.truth) <= *c.Uncertainty
}

func kindOf(symbol string) string {
	if unit.MustLookup(symbol).IsLog() {
		return "dB"
	}
	return "relative"
}

func quantile(x []float64, p float64) float64 {
	s := slices.Clone(x)
	slices.Sort(s)
	return s[min(len(s)-1, int(p*float64(len(s))))]
}
