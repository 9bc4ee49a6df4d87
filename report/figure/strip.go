package figure

import (
	"fmt"
	"math"
	"strings"

	"benchslip/analyze/slip"
	"benchslip/capture/unit"
	"benchslip/report"
)

// Strip is a row's limits as a short number line: the allowed part as a band
// between two posts, the guard bands hatched, the value as a diamond with its
// uncertainty as a whisker, an arrow for a bound. Everything it shows is also
// in the row's text. Places are fractions of the strip's length, 0 left.
type Strip struct {
	Band       [2]float64   // the allowed part
	Posts      []Post       // the limits
	Guards     [][2]float64 // stretches where a value is not beyond doubt
	Value      *float64
	Whisker    *[2]float64
	Off        int      // -1, +1: the value lies beyond that end; Value stands at it
	Bound      *float64 // start of the arrow
	BoundLeft  bool     // the quantity lies to the left of Bound
	Words      string   // for those who cannot see it
	Left, Rght string   // numbers at the ends of the line where no post stands; "" none
}

// Post is a limit on a strip.
type Post struct {
	At    float64
	Label string // the limit's number without unit
}

// NewStrip lays out the strip of a row; nil when the row has no limits.
func NewStrip(r *report.Row, rule slip.Rule) *Strip {
	c := r.Check
	if c.Min == nil && c.Max == nil || c.Verdict == slip.NotJudged {
		return nil
	}
	lo, hi := domain(c)
	at := func(x float64) float64 { return math.Min(1, math.Max(0, (x-lo)/(hi-lo))) }
	s := &Strip{Band: [2]float64{0, 1}}
	if c.Min != nil {
		s.Band[0] = at(*c.Min)
		s.Posts = append(s.Posts, Post{at(*c.Min), r.Scale.Exact(*c.Min)})
	}
	if c.Max != nil && (c.Min == nil || *c.Min != *c.Max) {
		s.Posts = append(s.Posts, Post{at(*c.Max), r.Scale.Exact(*c.Max)})
	}
	if c.Max != nil {
		s.Band[1] = at(*c.Max)
	}
	if c.Value != nil {
		v := at(*c.Value)
		s.Value = &v
		switch {
		case *c.Value < lo:
			s.Off = -1
		case *c.Value > hi:
			s.Off = 1
		}
		if a, b, ok := reach(c); ok {
			s.Whisker = &[2]float64{at(a), at(b)}
			for _, l := range limitsOf(c) {
				below, above := guard(c, l.value)
				switch {
				case rule.Decision == "simple":
					continue
				case rule.Decision == "guarded" && l.upper:
					above = l.value
				case rule.Decision == "guarded":
					below = l.value
				}
				if g := [2]float64{at(below), at(above)}; g[1] > g[0] {
					s.Guards = append(s.Guards, g)
				}
			}
		}
	} else if c.Bound != nil {
		b := at(c.Bound.Value)
		s.Bound, s.BoundLeft = &b, c.Bound.Kind == "upper"
	}
	if c.Min == nil || c.Max == nil {
		if c.Min == nil {
			s.Left = r.Scale.Exact(lo)
		} else {
			s.Rght = r.Scale.Exact(hi)
		}
	}
	s.Words = stripWords(r, s)
	return s
}

type limit struct {
	value float64
	upper bool
}

func limitsOf(c *slip.Check) (out []limit) {
	if c.Min != nil {
		out = append(out, limit{*c.Min, false})
	}
	if c.Max != nil {
		out = append(out, limit{*c.Max, true})
	}
	return out
}

// domain chooses the stretch of the number line. Two limits: their window and
// part of it on both sides. One limit: a round stretch that holds the value,
// from 0 where the quantity begins there.
func domain(c *slip.Check) (lo, hi float64) {
	if c.Min != nil && c.Max != nil {
		w := *c.Max - *c.Min
		if w <= 0 {
			w = math.Max(1, math.Abs(*c.Max))
			return *c.Min - w, *c.Max + w
		}
		return *c.Min - 0.4*w, *c.Max + 0.4*w
	}
	l := limitsOf(c)[0]
	need := 0.0
	for _, x := range []float64{valueOr(c.Value, l.value), boundOr(c.Bound, l.value)} {
		need = math.Max(need, math.Abs(x-l.value))
	}
	if c.Uncertainty != nil {
		need += 1.2 * *c.Uncertainty
	}
	if need == 0 {
		need = math.Max(1, 0.2*math.Abs(l.value))
	}
	need = roundStep(need * 1.1)
	outside := 0.45 * need // room on the failing side
	if bad := badSide(c, l); bad > 0 {
		outside = need
	}
	u, err := unit.Lookup(c.Unit)
	natural := err == nil && !u.IsLog() && l.value > 0 && valueOr(c.Value, 0) >= 0 && valueOr(c.Uncertainty, 0) < l.value
	if l.upper {
		lo, hi = l.value-need, l.value+outside
		if natural && lo < 0.5*l.value {
			lo, hi = 0, math.Max(hi, 1.4*l.value)
		}
		return lo, hi
	}
	lo, hi = l.value-outside, l.value+need
	if natural && lo < 0 {
		lo = 0
	}
	return lo, hi
}

// badSide is how far the value or bound lies on the failing side.
func badSide(c *slip.Check, l limit) float64 {
	x := valueOr(c.Value, boundOr(c.Bound, l.value))
	if l.upper {
		return x - l.value
	}
	return l.value - x
}

func valueOr(p *float64, other float64) float64 {
	if p == nil {
		return other
	}
	return *p
}

func boundOr(b *slip.Bound, other float64) float64 {
	if b == nil {
		return other
	}
	return b.Value
}

// reach is the stretch that a value's uncertainty covers.
func reach(c *slip.Check) (lo, hi float64, ok bool) {
	switch {
	case c.Interval != nil:
		return c.Interval[0], c.Interval[1], true
	case c.Uncertainty != nil && *c.Uncertainty > 0:
		return *c.Value - *c.Uncertainty, *c.Value + *c.Uncertainty, true
	}
	return 0, 0, false
}

// guard is the guard band on both sides of a limit. Rows are judged in the
// linear quantity, so in decibel units the band is not symmetrical: its ends
// are the limit plus and minus the value's uncertainty, both taken as volts or
// ratios, turned back into decibels.
func guard(c *slip.Check, limit float64) (below, above float64) {
	u, err := unit.Lookup(c.Unit)
	if c.Uncertainty == nil {
		return limit, limit
	}
	if err != nil || !u.IsLog() {
		return limit - *c.Uncertainty, limit + *c.Uncertainty
	}
	w := *c.Uncertainty / perNeper * u.ToLinear(*c.Value)
	if u.Symbol == "dBm" {
		w *= 2 // 10 lg
	}
	if c.Interval != nil {
		w = u.ToLinear(c.Interval[1]) - u.ToLinear(*c.Value)
	}
	l := u.ToLinear(limit)
	below, above = math.Inf(-1), u.FromLinear(l+w)
	if l > w {
		below = u.FromLinear(l - w)
	}
	return below, above
}

// perNeper is 20/ln 10, the decibels of a relative change of 1 of an
// amplitude.
const perNeper = 8.685889638065037

func stripWords(r *report.Row, s *Strip) string {
	parts := []string{"Limit strip: " + r.Limits}
	switch {
	case s.Value != nil && s.Off != 0:
		parts = append(parts, "measured "+r.Value+", off the strip")
	case s.Value != nil:
		parts = append(parts, "measured "+r.Value)
	case s.Bound != nil:
		parts = append(parts, r.Value)
	default:
		parts = append(parts, "no value")
	}
	if len(s.Guards) > 0 {
		parts = append(parts, "guard bands of one U at the limits")
	}
	if r.Margin != "" {
		parts = append(parts, "margin "+r.Margin)
	}
	return strings.Join(parts, "; ")
}

// Shape is a piece of a strip or of a verdict sign in points, y downwards,
// for a renderer to draw in its own way.
type Shape struct {
	Points []Point // a polygon when Fill is set, else a line
	Fill   Tone
	Line   float64 // width; 0 none
	Dashed bool
	Text   string // drawn centred on Points[0] when not ""
	Anchor int    // of the text: -1 starts at, 0 centred on, +1 ends at the point
}

// Point is a place in points.
type Point struct{ X, Y float64 }

// Tone is the fill of a shape.
type Tone int

// Tones: none, full ink, a light tint of it, the paper's.
const (
	None Tone = iota
	Ink
	Tint
	Paper
)

// StripWidth and StripHeight are the size that Shapes draws for, in points.
const (
	StripWidth  = 200.0
	StripHeight = 34.0
)

// Shapes draws the strip.
func (s *Strip) Shapes() []Shape {
	const left, right, mid, half = 6.0, StripWidth - 6, 11.0, 5.0
	x := func(f float64) float64 { return left + f*(right-left) }
	var out []Shape
	// the allowed part; where it has no limit it runs to the end of the line
	a, b := x(s.Band[0]), x(s.Band[1])
	if b-a < 1 {
		a, b = a-1.5, b+1.5
	}
	out = append(out, Shape{Points: rect(a, mid-half, b, mid+half), Fill: Tint})
	for _, g := range s.Guards {
		out = append(out, hatch(x(g[0]), mid-half, x(g[1]), mid+half)...)
	}
	out = append(out, Shape{Points: []Point{{left, mid + half}, {right, mid + half}}, Line: 0.8})
	used := []float64{}
	for _, p := range s.Posts {
		out = append(out, Shape{Points: []Point{{x(p.At), mid - half - 3}, {x(p.At), mid + half + 4}}, Line: 2})
		out = append(out, numberAt(x(p.At), p.Label))
		used = append(used, x(p.At))
	}
	clear := func(at float64) bool {
		for _, u := range used {
			if math.Abs(u-at) < 50 {
				return false
			}
		}
		return true
	}
	if s.Left != "" && clear(left) {
		out = append(out, Shape{Points: []Point{{left, mid + half}, {left, mid + half + 3}}, Line: 0.8}, numberAt(left, s.Left))
	}
	if s.Rght != "" && clear(right) {
		out = append(out, Shape{Points: []Point{{right, mid + half}, {right, mid + half + 3}}, Line: 0.8}, numberAt(right, s.Rght))
	}
	if s.Whisker != nil {
		w0, w1 := x(s.Whisker[0]), x(s.Whisker[1])
		out = append(out, Shape{Points: []Point{{w0, mid}, {w1, mid}}, Line: 1.4},
			Shape{Points: []Point{{w0, mid - 3}, {w0, mid + 3}}, Line: 1.4}, Shape{Points: []Point{{w1, mid - 3}, {w1, mid + 3}}, Line: 1.4})
	}
	switch {
	case s.Value != nil && s.Off != 0:
		d := float64(s.Off)
		p := x(*s.Value)
		for _, shift := range []float64{0, 5} {
			out = append(out, Shape{Points: []Point{{p - d*(6+shift), mid - 4.5}, {p - d*shift, mid}, {p - d*(6+shift), mid + 4.5}}, Line: 2})
		}
	case s.Value != nil:
		p := x(*s.Value)
		out = append(out, Shape{Points: []Point{{p - 4.6, mid}, {p, mid - 5.6}, {p + 4.6, mid}, {p, mid + 5.6}}, Fill: Ink, Line: 1})
	case s.Bound != nil:
		p, d := x(*s.Bound), 1.0
		if s.BoundLeft {
			d = -1
		}
		tip := math.Min(right, math.Max(left, p+d*34))
		if math.Abs(tip-p) < 12 {
			tip = p + d*12
		}
		out = append(out, Shape{Points: []Point{{p, mid - 4.5}, {p, mid + 4.5}}, Line: 2},
			Shape{Points: []Point{{p, mid}, {tip - d*4, mid}}, Line: 1.6},
			Shape{Points: []Point{{tip, mid}, {tip - d*7, mid - 4}, {tip - d*7, mid + 4}}, Fill: Ink})
	}
	return out
}

func rect(x0, y0, x1, y1 float64) []Point { return []Point{{x0, y0}, {x1, y0}, {x1, y1}, {x0, y1}} }

// numberAt writes a number under the line, kept inside the strip.
func numberAt(x float64, s string) Shape {
	sh := Shape{Points: []Point{{x, StripHeight - 3}}, Text: s}
	half := 2.6 * float64(len(s))
	switch {
	case x-half < 0:
		sh.Points[0].X, sh.Anchor = 0, -1
	case x+half > StripWidth:
		sh.Points[0].X, sh.Anchor = StripWidth, 1
	}
	return sh
}

// hatch fills a rectangle with slanted strokes, cut at its edges, on paper, so
// that a guard band is told from the band without any colour.
func hatch(x0, y0, x1, y1 float64) []Shape {
	out := []Shape{{Points: rect(x0, y0, x1, y1), Fill: Paper}}
	h := y1 - y0
	for x := math.Ceil((x0-h)/3.2) * 3.2; x < x1; x += 3.2 {
		// from (x, y1) up to (x+h, y0)
		a, b := Point{x, y1}, Point{x + h, y0}
		if a.X < x0 {
			a = Point{x0, y1 - (x0 - x)}
		}
		if b.X > x1 {
			b = Point{x1, y0 + (x + h - x1)}
		}
		if b.X-a.X > 0.3 {
			out = append(out, Shape{Points: []Point{a, b}, Line: 0.7})
		}
	}
	return out
}

// GateWidth and GateHeight are the size of a verdict sign.
const (
	GateWidth  = 26.0
	GateHeight = 14.0
)

// Gate draws the sign of a verdict: two posts, the limits, and where the value
// went. Between them it passes, beyond them it fails, on a post it is in
// doubt; dashed posts with a gap say that nothing came through, crossed out
// that the gate was not set up, and a value without posts that none was asked.
func Gate(verdict string) []Shape {
	post := func(x float64, dashed bool) Shape {
		return Shape{Points: []Point{{x, 1}, {x, GateHeight - 1}}, Line: 2, Dashed: dashed}
	}
	dot := func(x float64, fill Tone) Shape {
		return Shape{Points: []Point{{x - 4, 7}, {x, 2.2}, {x + 4, 7}, {x, 11.8}}, Fill: fill, Line: 1.4}
	}
	switch verdict {
	case slip.Pass:
		return []Shape{post(5, false), post(21, false), dot(13, Ink)}
	case slip.Fail:
		return []Shape{post(2, false), post(13, false), dot(21, Ink)}
	case slip.ConditionalPass, slip.Inconclusive:
		return []Shape{post(5, false), dot(18, Paper), post(21, false)}
	case slip.ConditionalFail:
		return []Shape{post(2, false), dot(19, Paper), post(16, false)}
	case slip.NotMeasurable:
		return []Shape{post(5, true), post(21, true), {Points: []Point{{10, 7}, {16, 7}}, Line: 1.4}}
	case slip.NotApplicable:
		return []Shape{post(5, true), post(21, true), {Points: []Point{{3, 12.5}, {23, 1.5}}, Line: 1.4}}
	}
	return []Shape{dot(13, Paper)}
}

// ShapesSVG writes shapes as the inside of an SVG: ink is currentColor, tint a
// see-through part of it, paper the CSS variable --paper. Numbers have one
// decimal.
func ShapesSVG(shapes []Shape) string {
	var b strings.Builder
	for _, s := range shapes {
		if s.Text != "" {
			anchor := [...]string{"start", "middle", "end"}[s.Anchor+1]
			fmt.Fprintf(&b, `<text x="%.1f" y="%.1f" text-anchor="%s">%s</text>`, s.Points[0].X, s.Points[0].Y, anchor, escape(s.Text))
			continue
		}
		d := ""
		for i, p := range s.Points {
			d += fmt.Sprintf("%c%.1f %.1f", "ML"[min(i, 1)], p.X, p.Y)
		}
		if s.Fill != None {
			d += "Z"
		}
		fmt.Fprintf(&b, `<path d="%s"`, d)
		switch s.Fill {
		case None:
			b.WriteString(` fill="none"`)
		case Tint:
			b.WriteString(` class="tint"`)
		case Paper:
			b.WriteString(` class="paper"`)
		default:
			b.WriteString(` fill="currentColor"`)
		}
		if s.Line > 0 {
			fmt.Fprintf(&b, ` stroke="currentColor" stroke-width="%.1f"`, s.Line)
		}
		if s.Dashed {
			b.WriteString(` stroke-dasharray="2 2"`)
		}
		b.WriteString("/>")
	}
	return b.String()
}
