package figure

import (
	"encoding/xml"
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"benchslip/analyze/slip"
	"benchslip/capture/unit"
	"benchslip/report"
	"benchslip/report/internal/sample"
)

func ptr(x float64) *float64 { return &x }

func strip(c *slip.Check, decision string) *Strip {
	rule := slip.Rule{Decision: decision, Coverage: 2}
	r := report.RowOf(c, 1, rule)
	return NewStrip(&r, rule)
}

// Rows are judged in volts or ratios whatever the limit's unit. The strip
// agrees with that: a value stands in a hatched part exactly when the linear
// distance to the limit is below the linear uncertainty.
func TestGuardBandsAgreeWithTheLinearRule(t *testing.T) {
	r := rand.New(rand.NewPCG(3, 4))
	inside := 0
	for range 3000 {
		symbol := []string{"dB", "dBu", "V", "%", "dBm"}[r.IntN(5)]
		u := unit.MustLookup(symbol)
		limit := u.ToLinear(-3 + 6*r.Float64())
		if !u.IsLog() {
			limit = u.ToLinear(1 + 6*r.Float64())
		}
		rel := math.Pow(10, -3+2.5*r.Float64())
		value := limit * (1 + rel*(4*r.Float64()-2))
		w := rel * value
		c := &slip.Check{Unit: symbol, Value: ptr(u.FromLinear(value)), Max: ptr(u.FromLinear(limit)), Verdict: slip.Pass}
		if u.IsLog() {
			c.Uncertainty = ptr(u.FromLinear(1+rel) - u.FromLinear(1))
			*c.Uncertainty = rel * map[string]float64{"dB": 20 / math.Ln10, "dBu": 20 / math.Ln10, "dBm": 10 / math.Ln10}[symbol]
			if rel > 0.1 && rel < 1 {
				c.Interval = &[2]float64{u.FromLinear(value - w), u.FromLinear(value + w)}
			}
		} else {
			c.Uncertainty = ptr(u.FromLinear(w))
		}
		want := math.Abs(value-limit) < w
		s := strip(c, "four-way")
		if s.Off != 0 || math.Abs(math.Abs(value-limit)-w) < 1e-6*limit {
			continue
		}
		got := false
		for _, g := range s.Guards {
			got = got || *s.Value >= g[0] && *s.Value <= g[1]
		}
		if got != want {
			t.Fatalf("%s: value %v limit %v U %v: on the hatched part %v, in doubt %v", symbol, value, limit, w, got, want)
		}
		if want {
			inside++
		}
	}
	if inside < 300 {
		t.Errorf("only %d values in doubt: the test proves little", inside)
	}
}

func TestStripLayout(t *testing.T) {
	max, min := ptr(40.5), ptr(39.5)
	for _, c := range []struct {
		name     string
		check    slip.Check
		decision string
		test     func(*Strip) bool
	}{
		{"no limits, no strip", slip.Check{Value: ptr(1)}, "", func(s *Strip) bool { return s == nil }},
		{"not judged, no strip", slip.Check{Value: ptr(1), Max: max, Verdict: slip.NotJudged}, "", func(s *Strip) bool { return s == nil }},
		{"two posts, band between", slip.Check{Value: ptr(40), Uncertainty: ptr(0.1), Unit: "dB", Min: min, Max: max}, "four-way", func(s *Strip) bool {
			return len(s.Posts) == 2 && s.Posts[0].At < s.Posts[1].At && s.Band[0] == s.Posts[0].At && s.Band[1] == s.Posts[1].At && len(s.Guards) == 2 && s.Off == 0
		}},
		{"simple rule hatches nothing", slip.Check{Value: ptr(40), Uncertainty: ptr(0.1), Unit: "dB", Max: max}, "simple", func(s *Strip) bool { return len(s.Guards) == 0 }},
		{"guarded rule hatches the inside only", slip.Check{Value: ptr(40), Uncertainty: ptr(0.1), Unit: "dB", Max: max}, "guarded", func(s *Strip) bool {
			return len(s.Guards) == 1 && s.Guards[0][1] == s.Posts[0].At
		}},
		{"far beyond stands at the end", slip.Check{Value: ptr(90), Uncertainty: ptr(0.1), Unit: "dB", Min: min, Max: max}, "four-way", func(s *Strip) bool { return s.Off == 1 && *s.Value == 1 }},
		{"one limit always shows the value", slip.Check{Value: ptr(0.0004), Unit: "%", Max: ptr(0.02)}, "four-way", func(s *Strip) bool {
			return s.Off == 0 && *s.Value > 0 && *s.Value < s.Posts[0].At && s.Left == "0"
		}},
		{"a lower limit allows the right", slip.Check{Value: ptr(80), Unit: "dB", Min: ptr(65)}, "four-way", func(s *Strip) bool { return s.Band[1] == 1 && s.Band[0] == s.Posts[0].At && s.Off == 0 }},
		{"a bound is an arrow", slip.Check{Unit: "dB", Max: ptr(-70), Bound: &slip.Bound{Kind: "upper", Value: -68.4}}, "four-way", func(s *Strip) bool {
			return s.Value == nil && *s.Bound > s.Posts[0].At && s.BoundLeft
		}},
		{"equal limits are one post", slip.Check{Value: ptr(0), Min: ptr(0), Max: ptr(0)}, "four-way", func(s *Strip) bool { return len(s.Posts) == 1 && *s.Value == s.Posts[0].At }},
		{"no value, limits all the same", slip.Check{Unit: "mV", Min: ptr(-10), Max: ptr(10), Verdict: slip.NotMeasurable}, "four-way", func(s *Strip) bool { return s.Value == nil && len(s.Posts) == 2 }},
		{"huge uncertainty", slip.Check{Value: ptr(1), Uncertainty: ptr(50), Unit: "dB", Min: ptr(0), Max: ptr(2)}, "four-way", func(s *Strip) bool { return s.Whisker[0] == 0 && s.Whisker[1] == 1 }},
	} {
		s := strip(&c.check, c.decision)
		if !c.test(s) {
			t.Errorf("%s: %+v", c.name, s)
			continue
		}
		if s == nil {
			continue
		}
		if s.Words == "" || !strings.Contains(s.Words, report.RowOf(&c.check, 1, slip.Rule{}).Limits) {
			t.Errorf("%s: words %q", c.name, s.Words)
		}
		for _, sh := range s.Shapes() {
			for _, p := range sh.Points {
				if math.IsNaN(p.X+p.Y) || p.X < -8 || p.X > StripWidth+8 || p.Y < 0 || p.Y > StripHeight {
					t.Errorf("%s: a point at %v, %v", c.name, p.X, p.Y)
				}
			}
		}
	}
}

func TestSignsDiffer(t *testing.T) {
	seen := map[string]string{}
	for _, v := range []string{slip.Pass, slip.ConditionalPass, slip.ConditionalFail, slip.Fail, slip.NotMeasurable, slip.NotApplicable, slip.NotJudged} {
		svg := ShapesSVG(Gate(v))
		if err := xml.Unmarshal([]byte("<svg>"+svg+"</svg>"), new(any)); err != nil && !strings.Contains(err.Error(), "EOF") {
			t.Errorf("%s: %v", v, err)
		}
		if other, ok := seen[svg]; ok {
			t.Errorf("%s and %s have one sign", v, other)
		}
		seen[svg] = v
	}
}

func TestSampleStrips(t *testing.T) {
	s := sample.Slip()
	n := 0
	for _, r := range report.Rows(s) {
		if st := NewStrip(&r, s.Rule); st != nil {
			n++
			if strings.Contains(ShapesSVG(st.Shapes()), "NaN") {
				t.Errorf("row %d: NaN", r.N)
			}
		}
	}
	if n != 14 {
		t.Errorf("%d strips", n)
	}
}
