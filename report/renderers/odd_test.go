package renderers

import (
	stdjson "encoding/json"
	"math"
	"math/rand/v2"
	"testing"

	"benchslip/analyze"
	"benchslip/analyze/slip"
	"benchslip/report/internal/sample"
)

// odd makes slips that no judge would write: limits the wrong way round,
// values at the ends of float64, units nobody knows, keys at random missing.
// Whatever a slip holds, every renderer copes and slip.json stays JSON.
type odd struct{ *rand.Rand }

func (o odd) float() float64 {
	special := []float64{0, math.Copysign(0, -1), 1, -1, math.NaN(), math.Inf(1), math.Inf(-1), 1e308, -1e308, 5e-324, 1e-12, 999.9999, 1e15}
	if o.IntN(3) == 0 {
		return special[o.IntN(len(special))]
	}
	return o.NormFloat64() * math.Pow(10, float64(o.IntN(20)-10))
}

func (o odd) maybe() *float64 {
	if o.IntN(3) == 0 {
		return nil
	}
	x := o.float()
	return &x
}

func (o odd) text() string {
	list := []string{"", "plain", sample.Hostile, "\u202eא", "clipped: because", "=1", "漢字 \U0001f527", "a\nb"}
	return list[o.IntN(len(list))]
}

func (o odd) slip() *slip.Slip {
	s := &slip.Slip{Title: o.text(), Sheet: o.text(), Verdict: o.text(), Rule: slip.Rule{Decision: []string{"four-way", "guarded", "simple", ""}[o.IntN(4)], Coverage: o.float()},
		Unit: map[string]string{o.text(): o.text()}, UnitKeys: []string{o.text()}, Cautions: []string{o.text()}}
	s.Takes = []slip.Take{{Name: o.text(), File: o.text(), RateHz: o.maybe(), DurationS: o.maybe(), Fault: o.text(), Flags: []slip.Flag{{Code: o.text(), FromS: o.maybe(), ToS: o.maybe()}}}}
	units := []string{"dB", "dBu", "dBm", "V", "%", "", "x", "mV", "V/rtHz", "degC", "s", "Hz", "nonsense", "\x00"}
	verdicts := []string{slip.Pass, slip.Fail, slip.ConditionalPass, slip.ConditionalFail, slip.NotMeasurable, slip.NotApplicable, slip.NotJudged, "", "odd"}
	for range o.IntN(6) {
		c := slip.Check{Name: o.text(), Measure: o.text(), Class: o.text(), Unit: units[o.IntN(len(units))], Value: o.maybe(), Uncertainty: o.maybe(),
			Coverage: o.maybe(), Min: o.maybe(), Max: o.maybe(), Typical: o.maybe(), Margin: o.maybe(), Probability: o.maybe(),
			Verdict: verdicts[o.IntN(len(verdicts))], Reason: o.text(), Advice: o.text(), Opinions: []string{o.text()}}
		if o.IntN(3) == 0 {
			c.Interval = &[2]float64{o.float(), o.float()}
		}
		if o.IntN(2) == 0 {
			c.Bound = &slip.Bound{Kind: []string{"upper", "lower", ""}[o.IntN(3)], Value: o.float(), Unit: c.Unit, Confidence: o.float()}
		}
		for range o.IntN(3) {
			c.Contributors = append(c.Contributors, slip.Contributor{Name: o.text(), StandardUncertainty: o.float(), Unit: units[o.IntN(len(units))], Dof: o.maybe()})
		}
		c.Details = map[string]any{"x_hz": o.float(), "list": []float64{o.float(), o.float()}, o.text(): o.text(), "none": nil,
			"points": []map[string]any{{"order": 1, "v": o.float()}, nil, {"w_db": o.maybe()}}}
		kinds := []string{analyze.Line, analyze.Points, analyze.Bars, analyze.Envelope, ""}
		f := analyze.Figure{ID: o.text(), Title: o.text(), X: analyze.Axis{Unit: units[o.IntN(len(units))], Log: o.IntN(2) == 0}, Y: analyze.Axis{Unit: units[o.IntN(len(units))], Log: o.IntN(4) == 0, Min: o.float(), Max: o.float()}}
		var x, y []float64
		for range o.IntN(20) {
			x, y = append(x, o.float()), append(y, o.float())
		}
		f.Series = []analyze.Series{{Name: o.text(), Kind: kinds[o.IntN(len(kinds))], X: x, Y: y, Low: y}}
		f.Marks = []analyze.Mark{{Kind: o.text(), X: o.float(), Y: o.float(), Label: o.text()}}
		f.Rules = []analyze.Rule{{Vertical: o.IntN(2) == 0, At: o.float(), Label: o.text()}}
		c.Figures = []analyze.Figure{f}
		s.Checks = append(s.Checks, c)
	}
	return s
}

func TestOddSlips(t *testing.T) {
	n := 40
	if testing.Short() {
		n = 10
	}
	for seed := range n {
		o := odd{rand.New(rand.NewPCG(uint64(seed), 5))}
		files, err := Build(o.slip())
		if err != nil {
			t.Fatalf("seed %d: %v", seed, err)
		}
		if last := files[len(files)-1]; !stdjson.Valid(last.Data) {
			t.Fatalf("seed %d: slip.json is no JSON", seed)
		}
	}
}
