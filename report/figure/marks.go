package figure

import (
	"math"

	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"

	"benchslip/analyze"
)

// kind gives a kind of mark its shape and its word in the legend.
type kind struct {
	kind, word string
	shape      draw.GlyphDrawer
}

var kinds = []kind{
	{"tone", "tone", disc{}},
	{"harmonic", "harmonic", triangle{}},
	{"mains", "mains line", box{}},
	{"line", "other line or point", diamond{}},
	{"event", "event", pointer{}},
}

// kindOf finds a kind of mark; an unknown one is drawn as some line or point.
func kindOf(name string) kind {
	for _, k := range kinds {
		if k.kind == name {
			return k
		}
	}
	return kinds[3]
}

// The shapes have a white rim, so that they stand out on a black curve.
type (
	disc     struct{}
	triangle struct{}
	box      struct{}
	diamond  struct{}
	pointer  struct{}
)

func rim(c *draw.Canvas, st draw.GlyphStyle, path vg.Path) {
	c.SetLineStyle(draw.LineStyle{Color: white, Width: 2})
	c.Stroke(path)
	c.SetColor(st.Color)
	c.Fill(path)
}

func polygon(pts ...vg.Point) vg.Path {
	var p vg.Path
	p.Move(pts[0])
	for _, q := range pts[1:] {
		p.Line(q)
	}
	p.Close()
	return p
}

func (disc) DrawGlyph(c *draw.Canvas, st draw.GlyphStyle, p vg.Point) {
	var path vg.Path
	path.Move(vg.Point{X: p.X + st.Radius, Y: p.Y})
	path.Arc(p, st.Radius, 0, 6.283185307179586)
	path.Close()
	rim(c, st, path)
}

func (triangle) DrawGlyph(c *draw.Canvas, st draw.GlyphStyle, p vg.Point) {
	r := st.Radius * 1.15
	rim(c, st, polygon(vg.Point{X: p.X - r, Y: p.Y - 0.8*r}, vg.Point{X: p.X + r, Y: p.Y - 0.8*r}, vg.Point{X: p.X, Y: p.Y + r}))
}

func (box) DrawGlyph(c *draw.Canvas, st draw.GlyphStyle, p vg.Point) {
	r := st.Radius * 0.9
	rim(c, st, polygon(vg.Point{X: p.X - r, Y: p.Y - r}, vg.Point{X: p.X + r, Y: p.Y - r}, vg.Point{X: p.X + r, Y: p.Y + r}, vg.Point{X: p.X - r, Y: p.Y + r}))
}

func (diamond) DrawGlyph(c *draw.Canvas, st draw.GlyphStyle, p vg.Point) {
	r := st.Radius * 1.25
	rim(c, st, polygon(vg.Point{X: p.X - r, Y: p.Y}, vg.Point{X: p.X, Y: p.Y - r}, vg.Point{X: p.X + r, Y: p.Y}, vg.Point{X: p.X, Y: p.Y + r}))
}

func (pointer) DrawGlyph(c *draw.Canvas, st draw.GlyphStyle, p vg.Point) {
	r := st.Radius * 1.15
	rim(c, st, polygon(vg.Point{X: p.X, Y: p.Y}, vg.Point{X: p.X + 0.8*r, Y: p.Y + 2*r}, vg.Point{X: p.X - 0.8*r, Y: p.Y + 2*r}))
}

const markRadius = 3.6

// drawMarks draws all shapes, then labels where there is room.
func (fr *frame) drawMarks(c draw.Canvas, tx, ty func(float64) vg.Length, taken *room) {
	type placed struct {
		at   vg.Point
		text string
	}
	var labels []placed
	for _, m := range fr.marks {
		at := vg.Point{X: tx(m.X), Y: ty(m.Y)}
		at.Y = max(c.Min.Y+markRadius, min(c.Max.Y-markRadius, at.Y))
		c.DrawGlyphNoClip(draw.GlyphStyle{Color: ink, Radius: markRadius, Shape: kindOf(m.Kind).shape}, at)
		taken.take(vg.Rectangle{Min: vg.Point{X: at.X - 4, Y: at.Y - 4}, Max: vg.Point{X: at.X + 4, Y: at.Y + 4}})
		labels = append(labels, placed{at, m.Label})
	}
	st := sans(9.5, ink, true)
	for _, l := range labels {
		if l.text == "" {
			continue
		}
		if !taken.put(c, st, l.text, l.at, markRadius+2) {
			fr.unlabel++
		}
	}
}

// ruleLabel is a rule's text with the places where it may stand.
type ruleLabel struct {
	text   string
	places []vg.Point
}

// drawRules draws limits, band edges and floors as dashed lines; their labels
// come later, over the curves.
func (fr *frame) drawRules(c draw.Canvas, tx, ty func(float64) vg.Length) (labels []ruleLabel) {
	style := draw.LineStyle{Color: soft, Width: 1, Dashes: []vg.Length{4, 2.5}}
	for _, r := range fr.rules {
		w := ruleStyle.Width(r.Label)
		l := ruleLabel{text: r.Label}
		if r.Vertical {
			x := tx(r.At)
			if x < c.Min.X || x > c.Max.X {
				continue
			}
			c.StrokeLine2(style, x, c.Min.Y, x, c.Max.Y)
			right, left := vg.Point{X: x + 3, Y: c.Max.Y - 11}, vg.Point{X: x - 3 - w, Y: c.Max.Y - 11}
			l.places = []vg.Point{right, left}
			if right.X+w > c.Max.X {
				l.places = []vg.Point{left}
			}
		} else {
			y := ty(r.At)
			if y < c.Min.Y || y > c.Max.Y {
				continue
			}
			c.StrokeLine2(style, c.Min.X, y, c.Max.X, y)
			up := y + 3
			if up+10 > c.Max.Y {
				up = y - 11
			}
			l.places = []vg.Point{{X: c.Max.X - w - 4, Y: up}, {X: c.Min.X + 5, Y: up}, {X: c.Center().X - w/2, Y: up}}
		}
		labels = append(labels, l)
	}
	return labels
}

var ruleStyle = sans(9, soft, false)

// paint puts the label at the first place where it hides no curve, or at the
// first place.
func (l ruleLabel) paint(c draw.Canvas, fr *frame, tx, ty func(float64) vg.Length, taken *room) {
	if l.text == "" {
		return
	}
	best := l.places[0]
	for _, p := range l.places {
		if b := textBox(ruleStyle, l.text, p); taken.free(b) && !fr.crosses(b, tx, ty) {
			best = p
			break
		}
	}
	taken.paint(c, ruleStyle, l.text, best)
}

// crosses reports whether a curve has a point in the box.
func (fr *frame) crosses(b vg.Rectangle, tx, ty func(float64) vg.Length) bool {
	for _, cv := range fr.curves {
		for _, k := range cv.cols {
			if x := tx(k.x1); x < b.Min.X || x > b.Max.X {
				continue
			}
			lo, hi := ty(math.Min(k.y1, k.y2)), ty(math.Max(k.y1, k.y2))
			if hi >= b.Min.Y-2 && lo <= b.Max.Y+2 {
				return true
			}
		}
	}
	return false
}

// room keeps labels apart.
type room struct {
	area  vg.Rectangle
	boxes []vg.Rectangle
}

func (r *room) take(b vg.Rectangle) { r.boxes = append(r.boxes, b) }

func (r *room) free(b vg.Rectangle) bool {
	if b.Min.X < r.area.Min.X || b.Max.X > r.area.Max.X || b.Min.Y < r.area.Min.Y || b.Max.Y > r.area.Max.Y+4 {
		return false
	}
	for _, o := range r.boxes {
		if b.Min.X < o.Max.X && o.Min.X < b.Max.X && b.Min.Y < o.Max.Y && o.Min.Y < b.Max.Y {
			return false
		}
	}
	return true
}

func textBox(st draw.TextStyle, s string, at vg.Point) vg.Rectangle {
	return vg.Rectangle{Min: at, Max: vg.Point{X: at.X + st.Width(s), Y: at.Y + st.Font.Size}}
}

// paint writes text with its lower left corner at at, on a white ground.
func (r *room) paint(c draw.Canvas, st draw.TextStyle, s string, at vg.Point) {
	b := textBox(st, s, at)
	r.take(b)
	c.SetColor(white)
	c.Fill(polygon(vg.Point{X: b.Min.X - 1, Y: b.Min.Y - 1}, vg.Point{X: b.Max.X + 1, Y: b.Min.Y - 1},
		vg.Point{X: b.Max.X + 1, Y: b.Max.Y}, vg.Point{X: b.Min.X - 1, Y: b.Max.Y}))
	c.FillText(st, at, s)
}

// put writes a label beside a point: above, right, left or below, wherever
// there is room first. It reports whether there was any.
func (r *room) put(c draw.Canvas, st draw.TextStyle, s string, p vg.Point, away vg.Length) bool {
	w, h := st.Width(s), st.Font.Size
	for _, at := range []vg.Point{
		{X: p.X - w/2, Y: p.Y + away}, {X: p.X + away, Y: p.Y - h/2}, {X: p.X - away - w, Y: p.Y - h/2},
		{X: p.X + away/2, Y: p.Y + away}, {X: p.X - away/2 - w, Y: p.Y + away},
		{X: p.X - w/2, Y: p.Y + away + h}, {X: p.X - w/2, Y: p.Y - away - h},
		{X: p.X - w/2, Y: p.Y + away + 2*h},
	} {
		if r.free(textBox(st, s, at)) {
			r.paint(c, st, s, at)
			return true
		}
	}
	return false
}

// legend draws one line above the plot: curves when there are several, and
// the kinds of marks. It returns the canvas that is left.
func legend(c draw.Canvas, fr *frame) draw.Canvas {
	type entry struct {
		word string
		draw func(c draw.Canvas, at vg.Point)
	}
	var entries []entry
	if len(fr.curves) > 1 {
		for i, cv := range fr.curves {
			entries = append(entries, entry{cv.name, func(c draw.Canvas, at vg.Point) { fr.swatch(c, cv, i, at) }})
		}
	}
	for _, k := range kinds {
		for _, m := range fr.marks {
			if kindOf(m.Kind).kind == k.kind {
				entries = append(entries, entry{k.word, func(c draw.Canvas, at vg.Point) {
					p := vg.Point{X: at.X + 12, Y: at.Y + 4}
					if k.kind == "event" {
						p.Y -= markRadius // it points at its place from above
					}
					c.DrawGlyphNoClip(draw.GlyphStyle{Color: ink, Radius: markRadius, Shape: k.shape}, p)
				}})
				break
			}
		}
	}
	if len(entries) == 0 {
		return draw.Crop(c, 0, 0, 0, -4)
	}
	st := sans(9.5, ink, false)
	x, y := c.Min.X+46, c.Max.Y-11
	for _, e := range entries {
		word := cut(st, e.word, 200)
		w := st.Width(word) + 28
		if x+w > c.Max.X && x > c.Min.X+46 {
			x, y = c.Min.X+46, y-14
		}
		e.draw(c, vg.Point{X: x, Y: y})
		c.FillText(st, vg.Point{X: x + 24, Y: y}, word)
		x += w + 14
	}
	return draw.Crop(c, 0, 0, 0, y-6-c.Max.Y)
}

// swatch shows how a curve is drawn, 20 points wide.
func (fr *frame) swatch(c draw.Canvas, cv curve, i int, at vg.Point) {
	area := polygon(vg.Point{X: at.X, Y: at.Y}, vg.Point{X: at.X + 20, Y: at.Y}, vg.Point{X: at.X + 20, Y: at.Y + 8}, vg.Point{X: at.X, Y: at.Y + 8})
	switch cv.kind {
	case analyze.Envelope, analyze.Bars:
		c.SetColor(shade)
		if cv.kind == analyze.Bars && i%2 == 0 {
			c.SetColor(strokes[i%len(strokes)].color)
		}
		c.Fill(area)
	case analyze.Points:
		fr.points(c, curve{x: []float64{0}, y: []float64{0}}, func(float64) vg.Length { return at.X + 12 }, func(float64) vg.Length { return at.Y + 4 }, i)
	default:
		style := stroke(i)
		if cv.thinned {
			style.Dashes = nil
			style.Width = 2
		}
		c.StrokeLine2(style, at.X, at.Y+4, at.X+20, at.Y+4)
	}
}
