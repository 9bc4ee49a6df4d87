package coverage

import (
	"testing"

	"benchslip/analyze"
	"benchslip/analyze/internal/trial"
	"benchslip/analyze/judge"
	"benchslip/analyze/measures"
	"benchslip/analyze/slip"
	"benchslip/capture/unit"
)

// TestLimitsAboutAValue: limits placed by a first run's value and uncertainty,
// in the unit in which they are shown, give on a second run of the same take
// the verdict that the four-way rule has for that distance (ILAC-G8:09/2019
// with w = U): 1.5 U inside passes, 0.3 U inside conditionally, 0.3 U outside
// fails conditionally, 1.5 U outside fails.
func TestLimitsAboutAValue(t *testing.T) {
	rule := slip.Rule{Decision: judge.FourWay, Coverage: 2}
	for _, sc := range above {
		m := measures.ByName(sc.measure)
		for seed := range uint64(2) {
			s := sc.draw(newBench(*seedOf+seed, false))
			judged := func(r analyze.Result, lim judge.Limits) slip.Check {
				c := slip.Check{Measure: m.Name, Class: "major"}
				judge.Row(&c, r, lim, rule, 0)
				return c
			}
			first := judged(m.Run(trial.Pass(m, s.params, s.roles)), judge.Limits{})
			second := m.Run(trial.Pass(m, s.params, s.roles))
			run := func(lim judge.Limits) slip.Check { return judged(second, lim) }
			if first.Value == nil || first.Uncertainty == nil {
				t.Errorf("%s: %s", sc.name, first.Reason)
				continue
			}
			for _, c := range []struct {
				by   float64
				want string
			}{{1.5, slip.Pass}, {0.3, slip.ConditionalPass}, {-0.3, slip.ConditionalFail}, {-1.5, slip.Fail}} {
				u := unit.MustLookup(first.Unit)
				top := unit.Quantity{Number: *first.Value + c.by**first.Uncertainty, Unit: u}
				low := unit.Quantity{Number: *first.Value - c.by**first.Uncertainty, Unit: u}
				if got := run(judge.Limits{Max: &top}); got.Verdict != c.want {
					t.Errorf("%s: %.8g +- %.3g, max %.8g %s: %s, want %s", sc.name, *first.Value, *first.Uncertainty, top.Number, u, got.Verdict, c.want)
				}
				if got := run(judge.Limits{Min: &low}); got.Verdict != c.want {
					t.Errorf("%s: %.8g +- %.3g, min %.8g %s: %s, want %s", sc.name, *first.Value, *first.Uncertainty, low.Number, u, got.Verdict, c.want)
				}
			}
		}
	}
}
