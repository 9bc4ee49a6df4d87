package figure

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"gonum.org/v1/plot"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"

	"benchslip/analyze"
	"benchslip/capture/unit"
	"benchslip/report"
)

// frame is a figure made ready for drawing: axes with their ranges and shown
// units, curves with only points that can be drawn, in shown units.
type frame struct {
	fig     *analyze.Figure
	x, y    axis
	curves  []curve
	marks   []analyze.Mark
	rules   []analyze.Rule
	columns int // pixel columns that curves are thinned to
	empty   bool

	thinned  bool // a curve was reduced to its envelope
	offBelow bool // values run off the foot of the figure
	unlabel  int  // marks whose label found no room
	undrawn  int  // marks beyond the largest number drawn
}

// axis in shown units: shown = data * factor.
type axis struct {
	label    string
	log      bool
	degrees  bool // of phase
	factor   float64
	min, max float64
}

// curve is a series with finite points in shown units; low only for
// envelopes. cols are its points by pixel column.
type curve struct {
	name, kind string
	x, y, low  []float64
	cols       []column
	thinned    bool // cols hold the extremes only
}

// maxMarks is the largest number of marks that a figure can hold and still be
// read.
const maxMarks = 60

func newFrame(f *analyze.Figure, width float64) *frame {
	fr := &frame{fig: f, columns: int(width) - 70}
	fr.x = newAxis(f.X, fr.extent(f.X, xs))
	fr.y = newAxis(f.Y, fr.extent(f.Y, ys))
	points := 0
	for _, s := range f.Series {
		c := fr.curve(s)
		points += len(c.x)
		fr.curves = append(fr.curves, c)
	}
	for _, m := range f.Marks {
		if len(fr.marks) == maxMarks {
			fr.undrawn++
			continue
		}
		if fr.x.shows(m.X) && fr.y.fits(m.Y) {
			fr.marks = append(fr.marks, analyze.Mark{Kind: m.Kind, X: m.X * fr.x.factor, Y: m.Y * fr.y.factor, Label: report.Clean(m.Label)})
		}
	}
	for _, r := range f.Rules {
		a := fr.y
		if r.Vertical {
			a = fr.x
		}
		if a.fits(r.At) {
			fr.rules = append(fr.rules, analyze.Rule{Label: report.Clean(r.Label), Vertical: r.Vertical, At: r.At * a.factor})
		}
	}
	fr.empty = points == 0 && len(fr.marks) == 0
	if n := len(f.Series); n > 2 {
		fr.columns = max(100, fr.columns*2/n) // keep the file small
	}
	if !fr.empty {
		fr.range_()
	}
	for i := range fr.curves {
		c := &fr.curves[i]
		c.cols, c.thinned = columns(c.x, c.y, fr.x, fr.columns)
	}
	return fr
}

func xs(s analyze.Series) [][]float64 { return [][]float64{s.X} }
func ys(s analyze.Series) [][]float64 { return [][]float64{s.Y, s.Low} }

// extent is the largest magnitude on an axis; it chooses the prefix.
func (fr *frame) extent(a analyze.Axis, of func(analyze.Series) [][]float64) float64 {
	big := math.Max(math.Abs(a.Min), math.Abs(a.Max))
	if a.Min != a.Max {
		return big
	}
	for _, s := range fr.fig.Series {
		for _, list := range of(s) {
			for _, v := range list {
				if finite(v) {
					big = math.Max(big, math.Abs(v))
				}
			}
		}
	}
	return big
}

// newAxis chooses the shown unit. A linear axis in a plain unit takes the
// prefix that suits its values; a log axis keeps its unit.
func newAxis(a analyze.Axis, extent float64) axis {
	out := axis{log: a.Log, factor: 1}
	if out.fits(a.Min) && out.fits(a.Max) && a.Min < a.Max {
		out.min, out.max = a.Min, a.Max // a range that cannot be is left open
	}
	symbol := report.Clean(a.Unit)
	if u, err := unit.Lookup(a.Unit); err == nil {
		shown := u
		if !a.Log && extent > 0 {
			_, _, s := unit.Split(extent, u, 0)
			shown = unit.MustLookup(s)
		}
		if shown != u {
			out.factor = shown.FromLinear(u.ToLinear(1))
		}
		symbol = shown.Proper()
		out.degrees = u.Dim == unit.Degree
	}
	out.label = report.Clean(a.Label)
	if symbol != "" {
		out.label = strings.TrimPrefix(out.label+", "+symbol, ", ")
	}
	out.min *= out.factor
	out.max *= out.factor
	return out
}

func finite(v float64) bool { return !math.IsNaN(v) && !math.IsInf(v, 0) }

// fits reports whether a value of the data can stand on the axis at all: it
// is finite, above zero on a logarithmic one, and far from where differences
// overflow.
func (a axis) fits(v float64) bool {
	return math.Abs(v) <= 1e100 && (!a.log || v >= 1e-100)
}

// shows reports whether a value lies inside a range that the figure sets.
func (a axis) shows(v float64) bool {
	return a.fits(v) && (a.min == a.max || v*a.factor >= a.min && v*a.factor <= a.max)
}

func (fr *frame) curve(s analyze.Series) curve {
	c := curve{name: report.Clean(s.Name), kind: s.Kind}
	n := min(len(s.X), len(s.Y))
	envelope := s.Kind == analyze.Envelope && len(s.Low) >= n
	for i := range n {
		if !fr.x.shows(s.X[i]) || !fr.y.fits(s.Y[i]) || envelope && !fr.y.fits(s.Low[i]) {
			continue
		}
		c.x = append(c.x, s.X[i]*fr.x.factor)
		c.y = append(c.y, s.Y[i]*fr.y.factor)
		if envelope {
			c.low = append(c.low, s.Low[i]*fr.y.factor)
		}
	}
	return c
}

// range_ finds the ranges that the figure leaves open.
func (fr *frame) range_() {
	var vx, vy []float64
	bars := false
	step := math.Inf(1)
	for _, c := range fr.curves {
		vx, vy = append(vx, c.x...), append(append(vy, c.y...), c.low...)
		if c.kind == analyze.Bars {
			bars = true
			for i := 1; i < len(c.x); i++ {
				step = math.Min(step, math.Abs(c.x[i]-c.x[i-1]))
			}
		}
	}
	for _, m := range fr.marks {
		vx, vy = append(vx, m.X), append(vy, m.Y)
	}
	if a := &fr.x; a.min == a.max {
		a.min, a.max = slices.Min(vx), slices.Max(vx)
		if bars && !a.log && finite(step) {
			a.min, a.max = a.min-0.7*step, a.max+0.7*step
		}
		a.widen(0)
	}
	a := &fr.y
	if a.min != a.max {
		return
	}
	lo, hi := slices.Min(vy), slices.Max(vy)
	// A few bins of a spectrum may be as deep as rounding allows. They are let
	// run off the foot rather than squeeze the rest.
	if strings.HasPrefix(fr.fig.Y.Unit, "dB") {
		// One in a hundred lies below deep; a few thousand values tell it.
		some := vy
		if step := len(vy) / 4000; step > 1 {
			some = nil
			for i := 0; i < len(vy); i += step {
				some = append(some, vy[i])
			}
		}
		slices.Sort(some)
		if deep := some[len(some)/100]; deep-lo > 0.3*(hi-deep) && hi > deep {
			lo = deep - 0.08*(hi-deep)
			fr.offBelow = true
		}
	}
	for _, r := range fr.rules {
		if !r.Vertical {
			lo, hi = math.Min(lo, r.At), math.Max(hi, r.At)
		}
	}
	a.min, a.max = lo, hi
	if bars && !a.log && !strings.HasPrefix(fr.fig.Y.Unit, "dB") {
		a.min, a.max = math.Min(0, lo), math.Max(0, hi)
		a.widen(0)
		if lo >= 0 {
			a.max += 0.08 * (a.max - a.min)
			return
		}
	}
	a.widen(0.05)
	if len(fr.marks) > 0 && !a.log {
		a.max += 0.06 * (a.max - a.min) // room for labels above the highest mark
	}
}

// widen opens a range that has no width and adds part of it at both ends.
func (a *axis) widen(part float64) {
	if a.log {
		if a.min == a.max {
			a.min, a.max = a.min/1.5, a.max*1.5
		}
		k := math.Pow(a.max/a.min, part)
		a.min, a.max = a.min/k, a.max*k
		return
	}
	if a.min == a.max {
		d := math.Max(0.5, math.Abs(a.min)*0.1)
		a.min, a.max = a.min-d, a.max+d
	}
	d := part * (a.max - a.min)
	a.min, a.max = a.min-d, a.max+d
}

// onto sets up a plot's axis.
func (a axis) onto(p *plot.Axis) {
	p.Min, p.Max = a.min, a.max
	p.Padding = 0
	p.Label.Text = a.label
	p.Label.TextStyle.Font = sans(10, ink, false).Font
	p.Label.TextStyle.Color = ink
	p.Label.Padding = 4
	p.LineStyle = draw.LineStyle{Color: ink, Width: 0.8}
	p.Tick.LineStyle = draw.LineStyle{Color: ink, Width: 0.6}
	p.Tick.Length = vg.Points(4)
	p.Tick.Label.Font = sans(9.5, ink, false).Font
	p.Tick.Label.Color = ink
	if a.log {
		p.Scale = plot.LogScale{}
		p.Tick.Marker = logTicks{}
	} else {
		p.Scale = plot.LinearScale{}
		p.Tick.Marker = linearTicks{a.degrees}
	}
}

func (fr *frame) remarks() []string {
	var out []string
	if fr.thinned {
		out = append(out, "Drawn as the smallest and largest value of each pixel column.")
	}
	if fr.offBelow {
		out = append(out, "The lowest values run off the foot.")
	}
	if fr.undrawn > 0 {
		out = append(out, fmt.Sprintf("%d more marks are in the data only.", fr.undrawn))
	}
	if fr.unlabel > 0 {
		out = append(out, fmt.Sprintf("%d marks have no room for a label.", fr.unlabel))
	}
	return out
}
