package figure

import (
	"image/color"
	"math"
	"slices"

	"gonum.org/v1/plot"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"

	"benchslip/analyze"
)

// painter draws everything inside the axes: grid, curves, rules, marks.
type painter struct{ fr *frame }

// Plot implements plot.Plotter.
func (pt painter) Plot(c draw.Canvas, p *plot.Plot) {
	fr := pt.fr
	tx, ty := p.Transforms(&c)
	gridLines(c, p, tx, ty)
	for i, cv := range fr.curves {
		if cv.kind == analyze.Envelope && cv.low != nil {
			fr.envelope(c, cv, tx, ty, i)
		}
	}
	taken := &room{area: c.Rectangle}
	labels := fr.drawRules(c, tx, ty)
	for i, cv := range fr.curves {
		switch {
		case cv.kind == analyze.Envelope && cv.low != nil:
		case cv.kind == analyze.Bars && len(cv.x) <= fr.columns:
			fr.bars(c, cv, tx, ty, i)
		case cv.kind == analyze.Points:
			fr.points(c, cv, tx, ty, i)
		default:
			fr.line(c, cv, tx, ty, i)
		}
	}
	// the axes again, over what touches them
	c.StrokeLine2(draw.LineStyle{Color: ink, Width: 0.8}, c.Min.X, c.Min.Y, c.Max.X, c.Min.Y)
	c.StrokeLine2(draw.LineStyle{Color: ink, Width: 0.8}, c.Min.X, c.Min.Y, c.Min.X, c.Max.Y)
	for _, l := range labels {
		l.paint(c, fr, tx, ty, taken)
	}
	fr.drawMarks(c, tx, ty, taken)
}

func gridLines(c draw.Canvas, p *plot.Plot, tx, ty func(float64) vg.Length) {
	style := draw.LineStyle{Color: grid, Width: 0.6}
	for _, t := range p.X.Tick.Marker.Ticks(p.X.Min, p.X.Max) {
		if t.Label != "" {
			c.StrokeLine2(style, tx(t.Value), c.Min.Y, tx(t.Value), c.Max.Y)
		}
	}
	for _, t := range p.Y.Tick.Marker.Ticks(p.Y.Min, p.Y.Max) {
		if t.Label != "" {
			c.StrokeLine2(style, c.Min.X, ty(t.Value), c.Max.X, ty(t.Value))
		}
	}
}

// piece is the longest stretch that is stroked at once: the rasteriser below
// PNG takes a time that grows with the square of it.
const piece = 64

func strokeLine(c draw.Canvas, style draw.LineStyle, pts []vg.Point) {
	for a := 0; a < len(pts)-1; a += piece {
		c.StrokeLines(style, c.ClipLinesXY(pts[a:min(a+piece+1, len(pts))])...)
	}
}

// line strokes a curve. Where a pixel column holds many points, the area
// between its smallest and largest is filled instead.
func (fr *frame) line(c draw.Canvas, cv curve, tx, ty func(float64) vg.Length, i int) {
	style := stroke(i)
	cols, thinned := cv.cols, cv.thinned
	if thinned {
		fr.thinned = true
		// A dashed envelope cannot be read: the legend names it by its tone.
		style.Width, style.Dashes = 0.7, nil
	}
	if len(cols) == 0 {
		return
	}
	at := func(x, y float64) vg.Point { return vg.Point{X: tx(x), Y: ty(y)} }
	if len(cols) == 1 && cols[0].n == 1 {
		c.DrawGlyph(draw.GlyphStyle{Color: style.Color, Radius: 2, Shape: draw.CircleGlyph{}}, at(cols[0].x1, cols[0].y1))
		return
	}
	for from := 0; from < len(cols); {
		dense := thinned && cols[from].n >= denseColumn
		to := from + 1
		for to < len(cols) && (thinned && cols[to].n >= denseColumn) == dense {
			to++
		}
		if dense && to-from > 1 {
			var upper, lower []vg.Point
			for _, k := range cols[from:to] {
				upper = append(upper, at(k.x1, math.Max(k.y1, k.y2)))
				lower = append(lower, at(k.x1, math.Min(k.y1, k.y2)))
			}
			slices.Reverse(lower)
			outline := c.ClipPolygonXY(append(upper, lower...))
			c.FillPolygon(paler(style.Color), outline)
			strokeLine(c, draw.LineStyle{Color: style.Color, Width: 0.5}, append(outline, outline[:min(1, len(outline))]...))
		} else {
			var pts []vg.Point
			if from > 0 {
				pts = append(pts, at(cols[from-1].x2, cols[from-1].y2))
			}
			for _, k := range cols[from:min(to+1, len(cols))] {
				pts = append(pts, at(k.x1, k.y1))
				if k.n > 1 {
					pts = append(pts, at(k.x2, k.y2))
				}
			}
			strokeLine(c, style, pts)
		}
		from = to
	}
}

// paler is a colour three parts of ten on the way to white.
func paler(c color.Color) color.Color {
	r, g, b, _ := c.RGBA()
	up := func(v uint32) uint8 { return uint8((7*(v>>8) + 3*255) / 10) }
	return color.NRGBA{up(r), up(g), up(b), 0xff}
}

// denseColumn is how many points a pixel column must hold to be filled.
const denseColumn = 6

// column is what is left of the points of one pixel column: the smallest and
// the largest, in the order in which they came; one point where n is 1.
type column struct {
	x1, y1, x2, y2 float64
	n              int
}

// columns reduces a curve to its pixel columns, so that the drawing looks as if
// every point were there. A curve with few enough points keeps them all.
func columns(x, y []float64, a axis, count int) (cols []column, thinned bool) {
	if len(x) <= 2*count || count < 1 {
		for i := range x {
			cols = append(cols, column{x[i], y[i], x[i], y[i], 1})
		}
		return cols, false
	}
	number := func(v float64) int {
		f := (v - a.min) / (a.max - a.min)
		if a.log {
			f = math.Log(v/a.min) / math.Log(a.max/a.min)
		}
		return int(math.Floor(f * float64(count)))
	}
	for from := 0; from < len(x); {
		col, lo, hi, to := number(x[from]), from, from, from+1
		for ; to < len(x) && number(x[to]) == col; to++ {
			if y[to] < y[lo] {
				lo = to
			}
			if y[to] > y[hi] {
				hi = to
			}
		}
		first, second := min(lo, hi), max(lo, hi)
		cols = append(cols, column{x[first], y[first], x[second], y[second], to - from})
		from = to
	}
	return cols, true
}

func (fr *frame) envelope(c draw.Canvas, cv curve, tx, ty func(float64) vg.Length, i int) {
	hi, t1 := columns(cv.x, cv.y, fr.x, fr.columns/2)
	lo, t2 := columns(cv.x, cv.low, fr.x, fr.columns/2)
	fr.thinned = fr.thinned || t1 || t2
	var upper, lower []vg.Point
	for _, k := range hi {
		upper = append(upper, vg.Point{X: tx(k.x1), Y: ty(math.Max(k.y1, k.y2))})
	}
	for _, k := range lo {
		lower = append(lower, vg.Point{X: tx(k.x1), Y: ty(math.Min(k.y1, k.y2))})
	}
	poly := slices.Clone(upper)
	for k := len(lower) - 1; k >= 0; k-- {
		poly = append(poly, lower[k])
	}
	c.FillPolygon(shade, c.ClipPolygonXY(poly))
	edge := draw.LineStyle{Color: strokes[i%len(strokes)].color, Width: 0.5}
	strokeLine(c, edge, upper)
	strokeLine(c, edge, lower)
}

func (fr *frame) points(c draw.Canvas, cv curve, tx, ty func(float64) vg.Length, i int) {
	shapes := []draw.GlyphDrawer{draw.CircleGlyph{}, draw.BoxGlyph{}, draw.TriangleGlyph{}, draw.CrossGlyph{}}
	g := draw.GlyphStyle{Color: strokes[i%len(strokes)].color, Radius: 2.2, Shape: shapes[i%len(shapes)]}
	type cell struct{ x, y int }
	seen := map[cell]bool{}
	for k := range cv.x {
		p := vg.Point{X: tx(cv.x[k]), Y: ty(cv.y[k])}
		at := cell{int(p.X / 2), int(p.Y / 2)}
		if seen[at] || !c.Contains(p) {
			continue
		}
		seen[at] = true
		if len(seen) > 600 {
			fr.thinned = true
			return
		}
		c.DrawGlyph(g, p)
	}
}

func (fr *frame) bars(c draw.Canvas, cv curve, tx, ty func(float64) vg.Length, i int) {
	width := vg.Length(14)
	for k := 1; k < len(cv.x); k++ {
		gap := tx(cv.x[k]) - tx(cv.x[k-1])
		width = min(width, max(0.8, vg.Length(math.Abs(float64(gap)))*0.66))
	}
	foot := c.Min.Y
	if !fr.y.log && fr.y.min < 0 && fr.y.max > 0 {
		foot = ty(0)
	}
	for k := range cv.x {
		x, y := tx(cv.x[k]), ty(cv.y[k])
		r := []vg.Point{{X: x - width/2, Y: foot}, {X: x - width/2, Y: y}, {X: x + width/2, Y: y}, {X: x + width/2, Y: foot}}
		r = c.ClipPolygonXY(r)
		if len(r) == 0 {
			continue
		}
		fill := strokes[i%len(strokes)].color
		if i%2 == 1 {
			fill = shade
		}
		c.FillPolygon(fill, r)
	}
}
