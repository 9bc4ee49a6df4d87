package figure

import (
	"image"
	"image/color"
	"math"

	"gonum.org/v1/plot/font"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"

	"benchslip/analyze"
)

// Stroke is one piece of a drawn figure, for a renderer that has no use for
// SVG: an outline that is filled or drawn, or a text. Places are in points
// from the upper left corner, y downwards.
type Stroke struct {
	Lines  [][]Point // polylines; polygons when Fill
	Fill   bool
	Color  [3]uint8
	Width  float64   // of the pen, for drawn ones
	Dashes []float64 // nil: solid

	Text  string // starts at At, on the baseline
	At    Point
	Angle float64 // of the text, degrees, counterclockwise
	Size  float64 // of the font, points
	Bold  bool
}

// Strokes draws a figure w by h points large, without title and caption.
func Strokes(f *analyze.Figure, w, h float64) (strokes []Stroke, remarks []string) {
	c := &recorder{height: h, states: []state{{color: color.Black, width: 1, m: matrix{1, 0, 0, 1, 0, 0}}}}
	remarks = Draw(draw.NewCanvas(c, vg.Length(w), vg.Length(h)), f)
	return c.out, remarks
}

// matrix maps (x, y) to (a x + c y + e, b x + d y + f).
type matrix [6]float64

func (m matrix) at(p vg.Point) Point {
	x, y := float64(p.X), float64(p.Y)
	return Point{m[0]*x + m[2]*y + m[4], m[1]*x + m[3]*y + m[5]}
}

// then applies n first, then m.
func (m matrix) then(n matrix) matrix {
	return matrix{
		m[0]*n[0] + m[2]*n[1], m[1]*n[0] + m[3]*n[1],
		m[0]*n[2] + m[2]*n[3], m[1]*n[2] + m[3]*n[3],
		m[0]*n[4] + m[2]*n[5] + m[4], m[1]*n[4] + m[3]*n[5] + m[5],
	}
}

type state struct {
	color  color.Color
	width  float64
	dashes []float64
	m      matrix
}

// recorder is a vg.Canvas that keeps what is drawn on it.
type recorder struct {
	out    []Stroke
	states []state
	height float64
}

func (r *recorder) top() *state { return &r.states[len(r.states)-1] }

func (r *recorder) place(p vg.Point) Point {
	q := r.top().m.at(p)
	return Point{q.X, r.height - q.Y}
}

func (r *recorder) SetLineWidth(w vg.Length) { r.top().width = float64(w) }

func (r *recorder) SetLineDash(pattern []vg.Length, _ vg.Length) {
	r.top().dashes = nil
	for _, d := range pattern {
		r.top().dashes = append(r.top().dashes, float64(d))
	}
}

func (r *recorder) SetColor(c color.Color) {
	if c == nil {
		c = color.Black
	}
	r.top().color = c
}

func (r *recorder) Rotate(rad float64) {
	sin, cos := math.Sincos(rad)
	r.top().m = r.top().m.then(matrix{cos, sin, -sin, cos, 0, 0})
}

func (r *recorder) Translate(p vg.Point) {
	r.top().m = r.top().m.then(matrix{1, 0, 0, 1, float64(p.X), float64(p.Y)})
}

func (r *recorder) Scale(x, y float64) { r.top().m = r.top().m.then(matrix{x, 0, 0, y, 0, 0}) }

func (r *recorder) Push() { r.states = append(r.states, *r.top()) }

func (r *recorder) Pop() { r.states = r.states[:len(r.states)-1] }

func (r *recorder) Stroke(p vg.Path) {
	if s := r.top(); s.width > 0 {
		r.out = append(r.out, Stroke{Lines: r.lines(p), Color: rgb(s.color), Width: s.width, Dashes: s.dashes})
	}
}

func (r *recorder) Fill(p vg.Path) {
	r.out = append(r.out, Stroke{Lines: r.lines(p), Fill: true, Color: rgb(r.top().color)})
}

func (r *recorder) FillString(f font.Face, p vg.Point, text string) {
	if f.Font.Size == 0 || text == "" {
		return
	}
	s := r.top()
	r.out = append(r.out, Stroke{Text: text, At: r.place(p), Angle: math.Atan2(s.m[1], s.m[0]) * 180 / math.Pi,
		Size: float64(f.Font.Size), Bold: f.Font.Weight > 0, Color: rgb(s.color)})
}

// DrawImage is not used by the figures of this program.
func (r *recorder) DrawImage(vg.Rectangle, image.Image) {}

// lines flattens a path: arcs become polygons of 24 corners a turn, which is
// enough for marks of four points' radius; the figures draw no other curves.
func (r *recorder) lines(path vg.Path) (out [][]Point) {
	var line []Point
	for _, c := range path {
		switch c.Type {
		case vg.MoveComp:
			if len(line) > 1 {
				out = append(out, line)
			}
			line = []Point{r.place(c.Pos)}
		case vg.LineComp, vg.CurveComp:
			line = append(line, r.place(c.Pos))
		case vg.ArcComp:
			n := max(2, int(math.Ceil(math.Abs(c.Angle)/(2*math.Pi)*24)))
			for i := range n + 1 {
				sin, cos := math.Sincos(c.Start + c.Angle*float64(i)/float64(n))
				line = append(line, r.place(vg.Point{X: c.Pos.X + c.Radius*vg.Length(cos), Y: c.Pos.Y + c.Radius*vg.Length(sin)}))
			}
		case vg.CloseComp:
			if len(line) > 0 {
				line = append(line, line[0])
			}
		}
	}
	if len(line) > 1 {
		out = append(out, line)
	}
	return out
}

func rgb(c color.Color) [3]uint8 {
	r, g, b, _ := c.RGBA()
	return [3]uint8{uint8(r >> 8), uint8(g >> 8), uint8(b >> 8)}
}
