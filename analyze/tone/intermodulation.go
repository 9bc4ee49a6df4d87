package tone

import (
	"fmt"
	"math"
	"math/cmplx"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
	"benchslip/analyze/stage"
	"benchslip/capture/recording"
)

// Products of two tones f1 < f2, by the order of the nonlinearity that makes
// them.
var (
	sidebands2 = []stage.Product{{A: -1, B: 1}, {A: 1, B: 1}}  // f2-f1, f2+f1
	sidebands3 = []stage.Product{{A: -2, B: 1}, {A: 2, B: 1}}  // f2-2f1, f2+2f1
	difference = []stage.Product{{A: -1, B: 1}}                // f2-f1
	beside     = []stage.Product{{A: 2, B: -1}, {A: -1, B: 2}} // 2f1-f2, 2f2-f1
)

// lowest is the lowest frequency, Hz, at which a product is read.
const lowest = 10.0

var modulation = &analyze.Measure{
	Name:  "modulation_distortion",
	Title: "modulation of a high tone by a low one",
	Doc: "Two tones, the high one at least four times the low one's frequency and a quarter of its level (60 Hz and 7 kHz at 4:1); both are found from the take, `at` " +
		"names one if need be. Without `order`: root of the sum of the squares of the four sidebands f2-f1, f2+f1, f2-2f1, f2+2f1 over the high tone (as modulation " +
		"depth of its envelope 3.01 dB more). With `order` 2 or 3: the arithmetic sum of that pair over the high tone. Sidebands are fitted jointly with both tones " +
		"and the noise's share is taken off.",
	Formula:  "sqrt(sum U(f2+-f1)^2 + U(f2+-2f1)^2) / U(f2);  d2 = [U(f2-f1)+U(f2+f1)]/U(f2), d3 = [U(f2-2f1)+U(f2+2f1)]/U(f2)",
	Standard: "IEC 60268-3 (modulation distortion, nth order); root of squares: common practice",
	Unit:     "%",
	Roles:    []string{"take"},
	Keys:     []string{"at", "order"},
	Run:      runModulation,
}

var differenceFrequency = &analyze.Measure{
	Name:  "difference_distortion",
	Title: "difference-frequency distortion of two equal tones",
	Doc: "Two tones of equal level (19 and 20 kHz), found from the take or named by `at`. `order` 2: the line f2-f1; `order` 3: the arithmetic sum of 2f2-f1 and " +
		"2f1-f2; both over twice the higher tone, which is the sum of the two.",
	Formula:  "d2 = U(f2-f1)/(2 U(f2)), d3 = [U(2f2-f1)+U(2f1-f2)]/(2 U(f2))",
	Standard: "IEC 60268-3 (difference-frequency distortion)",
	Unit:     "%",
	Roles:    []string{"take"},
	Keys:     []string{"at", "order"},
	Run:      runDifference,
}

// kind is what the two measures do not share.
type kind struct {
	ask   []stage.Product // fitted
	read  []stage.Product // that make the value
	ratio float64         // wanted low over high, dB
	apart float64         // dB between the tones from which on the weaker is none
	least float64         // f2/f1
	total float64         // reference over U(f2)
	rss   bool            // root of the sum of squares, else arithmetic sum
}

func runModulation(p *analyze.Pass) analyze.Result {
	k := kind{ask: append(append([]stage.Product{}, sidebands2...), sidebands3...), ratio: 20 * math.Log10(4), apart: 30, least: 4, total: 1}
	switch p.Params.Order {
	case 0:
		k.read, k.rss = k.ask, true
	case 2:
		k.read = sidebands2
	case 3:
		k.read = sidebands3
	default:
		return noOrder(p)
	}
	return intermodulation(p, k)
}

func runDifference(p *analyze.Pass) analyze.Result {
	k := kind{ask: append(append([]stage.Product{}, difference...), beside...), apart: 20, least: 1, total: 2}
	switch p.Params.Order {
	case 2:
		k.read = difference
	case 3:
		k.read = beside
	default:
		return noOrder(p)
	}
	return intermodulation(p, k)
}

func noOrder(p *analyze.Pass) analyze.Result {
	return analyze.Refuse(percent, analyze.Unsupported, fmt.Sprintf("%s is defined for order 2 and 3, not %d", p.Measure.Name, p.Params.Order), "state order = 2 or order = 3")
}

func intermodulation(p *analyze.Pass, k kind) analyze.Result {
	refuse := func(bad *analyze.Refusal) analyze.Result { return analyze.RefuseWith(percent, bad) }
	s, bad := p.Signal("take", "out")
	if bad != nil {
		return refuse(bad)
	}
	low, high, bad := stage.TwoTones(p, s, p.Params.At)
	if bad != nil {
		return refuse(bad)
	}
	apart := 10 * math.Log10(low.Power/high.Power)
	if math.Abs(apart) > k.apart {
		return analyze.Refuse(percent, analyze.NoTone,
			fmt.Sprintf("take %q: the two strongest lines, %.6g Hz and %.6g Hz, are %.0f dB apart: no pair of test tones", s.Take.Name, low.Hz, high.Hz, math.Abs(apart)),
			"record two tones, or name them with `at`")
	}
	if high.Hz < k.least*low.Hz*(1-1e-3) {
		return analyze.Refuse(percent, analyze.NoTone,
			fmt.Sprintf("take %q: the two strongest lines are %.6g Hz and %.6g Hz; the high tone must be at least four times the low one", s.Take.Name, low.Hz, high.Hz),
			"record a low and a high tone, such as 60 Hz and 7 kHz")
	}
	if bad := resolvable(s, k, low.Hz, high.Hz); bad != nil {
		return refuse(bad)
	}
	pair, bad := stage.Pairs(p, s, low.Hz, high.Hz, k.ask)
	if bad != nil {
		return refuse(bad)
	}
	if bad := clear(s, k, pair); bad != nil {
		return refuse(bad)
	}
	return k.result(p, s, pair)
}

// resolvable: every product that is read lies where it can be, and the span
// holds five periods of the spacing of the lines.
func resolvable(s *analyze.Signal, k kind, f1, f2 float64) *analyze.Refusal {
	for _, q := range k.read {
		if hz := q.Hz(f1, f2); hz < lowest || hz >= s.RateHz/2 {
			return &analyze.Refusal{Code: analyze.Bandwidth,
				Text:   fmt.Sprintf("the product %s lies at %.6g Hz, outside 10 Hz .. %.6g Hz (half the sample rate)", q, hz, s.RateHz/2),
				Advice: "use other tones, or a higher sample rate"}
		}
	}
	spacing := math.Min(f1, f2-f1)
	if T := s.DurationS(); spacing*T < 5 {
		return &analyze.Refusal{Code: analyze.TooShort,
			Text:   fmt.Sprintf("take %q holds %.3g periods of %.6g Hz, the spacing of the lines; 5 are needed", s.Take.Name, spacing*T, spacing),
			Advice: fmt.Sprintf("record %.3g s or more", math.Max(1, 10/spacing))}
	}
	return nil
}

// clear refuses products that cannot be told from a mains line of order 1 to
// 5, from a low harmonic of a tone or from each other.
func clear(s *analyze.Signal, k kind, pair *stage.Pair) *analyze.Refusal {
	T := s.DurationS()
	clash := func(q stage.Product, gap float64, what string) *analyze.Refusal {
		advice := "use other tones"
		if gap > 0.05 {
			advice = fmt.Sprintf("record %.3g s or more, or use other tones", math.Ceil(2/gap))
		}
		return &analyze.Refusal{Code: analyze.TooShort,
			Text:   fmt.Sprintf("take %q: the product %s at %.6g Hz lies %.3g Hz from %s; %.4g s cannot tell them apart", s.Take.Name, q, q.Hz(pair.LowHz, pair.HighHz), gap, what, T),
			Advice: advice}
	}
	for i, q := range k.read {
		hz := q.Hz(pair.LowHz, pair.HighHz)
		if gap, order := stage.NearMains(hz, pair.MainsHz, 5); gap < 2/T {
			return clash(q, gap, fmt.Sprintf("mains order %d", order))
		}
		for h := 2.0; h <= 10; h++ {
			if gap := math.Abs(hz - h*pair.LowHz); gap < 2/T {
				return clash(q, gap, fmt.Sprintf("harmonic %g of the low tone", h))
			}
		}
		for _, o := range k.ask {
			if gap := math.Abs(hz - o.Hz(pair.LowHz, pair.HighHz)); o != q && gap < 2/T {
				return clash(k.read[i], gap, "the product "+o.String())
			}
		}
		if pair.Of(q) == nil {
			return clash(q, 0, "another line")
		}
	}
	return nil
}

func (k kind) result(p *analyze.Pass, s *analyze.Signal, pair *stage.Pair) analyze.Result {
	high := pair.High()
	ref := high.RMS() * k.total
	r := analyze.Result{Unit: percent, FullScaleSine: s.FullScaleSine()}
	if high.Power <= 0 || pair.Low().Power <= 0 {
		return analyze.Refuse(percent, analyze.NoTone, fmt.Sprintf("take %q: the tones do not stand out of the noise", s.Take.Name), "raise the level")
	}
	var lines []stage.Line
	arithmetic, variance := 0.0, 0.0
	for _, q := range k.read {
		l := *pair.Of(q)
		lines = append(lines, l)
		arithmetic += l.RMS()
		variance += rmsU(l) * rmsU(l)
	}
	set := add(lines)
	step := stage.StepU(pair.Lines) / math.Sqrt2
	v, u := arithmetic/ref, math.Sqrt(variance)/ref
	if k.rss {
		v = math.Sqrt(math.Max(set.P, 0)) / ref
		u = 0
		if set.P > 0 {
			u = set.U / (2 * math.Sqrt(set.P)) / ref
		}
	}
	r.Details = k.details(s, pair, v)
	r.Flags = k.flags(s, pair)
	r.Figures = []analyze.Figure{stage.SpectrumFigure(p, pair.Lines)}
	if pair.MainsHz == 0 {
		r.Notes = append(r.Notes, "the span is too short to tell mains lines from the products")
	}
	if !set.seen || v == 0 {
		setBound(&r, (k.bound(lines, set)+step)/ref, analyze.BelowDetection, "no product stands out of the noise", fmt.Sprintf("record longer: %.3g s halve the bound", 4*s.DurationS()))
		return r
	}
	var b budget.Budget
	b.A("noise at the products", u, 0)
	b.B("converter steps", step*math.Sqrt(float64(len(lines)))/ref)
	b.A("noise at the reference", v*pair.PhasorU(high)/cmplx.Abs(high.Z), 0)
	r.Value = &v
	b.Into(&r)
	return r
}

// bound is what the products, none of which is detected, stay below at 95 %.
func (k kind) bound(lines []stage.Line, set sum) float64 {
	if k.rss {
		if b, ok := budget.UpperBoundOf(set.read, set.shares, 0.95); ok {
			return b
		}
		return budget.SumThreshold(set.shares, stage.FalseAlarm)
	}
	b := 0.0
	for _, l := range lines {
		b += lineBound(l)
	}
	return b
}

// lineBound is the RMS that a line stays below at 95 %, its threshold where
// the reading is too small for that.
func lineBound(l stage.Line) float64 {
	if b, ok := budget.UpperBound(l.Power+l.Share, l.Share, 1, 0.95); ok {
		return b
	}
	return budget.ShareThreshold(l.Share, stage.FalseAlarm)
}

func (k kind) details(s *analyze.Signal, pair *stage.Pair, v float64) map[string]any {
	low, high := pair.Low(), pair.High()
	d := map[string]any{
		"fundamental": map[string]any{"frequency_hz": high.Hz, "rms_v": high.RMS()},
		"tones":       []map[string]any{{"frequency_hz": low.Hz, "rms_v": low.RMS()}, {"frequency_hz": high.Hz, "rms_v": high.RMS()}},
		"ratio_db":    10 * math.Log10(low.Power/high.Power),
		"span_s":      []float64{s.StartS, s.StartS + s.DurationS()},
		"reference_v": high.RMS() * k.total,
	}
	switch {
	case k.rss:
		d["method"] = "root of the sum of squares of the four sidebands over the high tone"
		d["modulation_depth_percent"] = 100 * v * math.Sqrt2
	case k.total == 2:
		d["method"] = "over twice the higher tone"
	default:
		d["method"] = "arithmetic sum of the pair over the high tone"
	}
	if pair.MainsHz == 0 {
		d["mains_resolved"] = false
	}
	list := []map[string]any{}
	for _, q := range k.ask {
		e := map[string]any{"product": q.String(), "order": max(q.A, -q.A) + max(q.B, -q.B), "frequency_hz": q.Hz(pair.LowHz, pair.HighHz),
			"rms_v": nil, "relative_db": nil, "detected": false}
		if l := pair.Of(q); l != nil {
			e["rms_v"], e["detected"], e["uncertainty_v"] = l.RMS(), detected(*l, len(k.read)), rmsU(*l)
			if l.Power > 0 {
				e["relative_db"] = 10*math.Log10(l.Power/high.Power) - 20*math.Log10(k.total)
				turn := cmplx.Phase(l.Z) - float64(q.A)*cmplx.Phase(low.Z) - float64(q.B)*cmplx.Phase(high.Z)
				e["phase_deg"] = math.Remainder(turn, 2*math.Pi) * 180 / math.Pi
			}
		}
		list = append(list, e)
	}
	d["products"] = list
	return d
}

func (k kind) flags(s *analyze.Signal, pair *stage.Pair) []recording.Flag {
	var out []recording.Flag
	flag := func(code, text string) {
		out = append(out, recording.Flag{Code: code, Take: s.Take.Name, Channel: s.Channel(), Message: text})
	}
	if ratio := 10 * math.Log10(pair.Low().Power/pair.High().Power); math.Abs(ratio-k.ratio) > 1 {
		want := "4:1 (12.04 dB)"
		if k.ratio == 0 {
			want = "1:1"
		}
		flag(recording.Ratio, fmt.Sprintf("the tones at %.6g Hz and %.6g Hz stand %.2f dB apart, the definition asks for %s", pair.LowHz, pair.HighHz, ratio, want))
	}
	for _, q := range k.read {
		hz := q.Hz(pair.LowHz, pair.HighHz)
		if gap, order := stage.NearMains(hz, pair.MainsHz, stage.MaxOrder); pair.MainsFound && gap < 2/s.DurationS()+2e-4*hz {
			flag(recording.ToneOnMains, fmt.Sprintf("the product %s at %.6g Hz lies on mains order %d: hum there counts as distortion", q, hz, order))
		}
	}
	return out
}
