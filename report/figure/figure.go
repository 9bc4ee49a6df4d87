// Package figure draws the figures of a slip, which come as data, and the
// limit strips of its rows. It owns gonum plot: other rooms hand over data and
// take back an SVG text, or give a canvas to draw on.
//
// A figure keeps a white ground, names its axes with their units, tells curves
// apart by line pattern and marks by shape and text, and never by colour
// alone. Long curves are drawn as the smallest and largest value of every
// pixel column, and the caption says so.
package figure

import (
	"bytes"
	"fmt"
	"html"
	"image/color"
	"math"
	"strconv"
	"strings"
	"unicode"
	"unicode/utf8"

	xfont "golang.org/x/image/font"
	"gonum.org/v1/plot"
	"gonum.org/v1/plot/font"
	"gonum.org/v1/plot/text"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"
	"gonum.org/v1/plot/vg/vgimg"
	"gonum.org/v1/plot/vg/vgsvg"

	"benchslip/analyze"
	"benchslip/report"
)

// Size of a figure in points; an SVG scales to the width it is given.
const (
	Width  = 640
	Height = 300
)

// MaxBytes is the largest SVG that SVG writes.
const MaxBytes = 100_000

var (
	ink   = color.NRGBA{0x16, 0x22, 0x2e, 0xff}
	soft  = color.NRGBA{0x5a, 0x66, 0x72, 0xff}
	grid  = color.NRGBA{0xdc, 0xe1, 0xe6, 0xff}
	shade = color.NRGBA{0xc4, 0xd0, 0xdb, 0xff}
	white = color.NRGBA{0xff, 0xff, 0xff, 0xff}
)

// strokes tell curves apart: pattern first, colour second.
var strokes = []struct {
	color  color.NRGBA
	dashes []vg.Length
}{
	{ink, nil},
	{color.NRGBA{0xa0, 0x3e, 0x12, 0xff}, []vg.Length{6, 3}},
	{color.NRGBA{0x1f, 0x68, 0x52, 0xff}, []vg.Length{1.5, 2}},
	{color.NRGBA{0x5b, 0x3f, 0x96, 0xff}, []vg.Length{8, 2.5, 1.5, 2.5}},
	{color.NRGBA{0x7a, 0x5c, 0x00, 0xff}, []vg.Length{3, 3}},
	{soft, []vg.Length{12, 3}},
}

func stroke(i int) draw.LineStyle {
	s := strokes[i%len(strokes)]
	return draw.LineStyle{Color: s.color, Width: 1.2, Dashes: s.dashes}
}

// sans is a text style of the figure: Liberation Sans has the widths of the
// fallbacks that the SVG names.
func sans(size vg.Length, c color.Color, bold bool) text.Style {
	f := font.Font{Typeface: "Liberation", Variant: "Sans", Size: size}
	if bold {
		f.Weight = xfont.WeightBold
	}
	return text.Style{Color: c, Font: f, XAlign: draw.XLeft, YAlign: draw.YBottom, Handler: plot.DefaultTextHandler}
}

// Draw draws the figure into the rectangle of c, without title and caption.
// It returns remarks for the caption: what was thinned or left out.
func Draw(c draw.Canvas, f *analyze.Figure) (remarks []string) {
	fr := newFrame(f, float64(c.Max.X-c.Min.X))
	c.SetColor(white)
	c.Fill(c.Rectangle.Path())
	c = draw.Crop(c, 2, -14, 2, -2)
	c = legend(c, fr)
	if fr.empty {
		st := sans(11, soft, false)
		st.XAlign = draw.XCenter
		c.FillText(st, c.Center(), "no data")
		return nil
	}
	p := plot.New()
	p.BackgroundColor = nil
	fr.x.onto(&p.X)
	fr.y.onto(&p.Y)
	p.X.Label.Position, p.Y.Label.Position = draw.PosCenter, draw.PosCenter
	p.Add(painter{fr})
	p.Draw(c)
	return fr.remarks()
}

// SVG draws a figure as an SVG document. id names its title for screen
// readers and must be unique in the page; a whole document (standalone) has a
// heading and its caption on it and the XML declaration before it, the other
// kind goes into an HTML page. Remarks belong behind the caption.
func SVG(f *analyze.Figure, id string, standalone bool) (svg []byte, remarks []string) {
	height := vg.Length(Height)
	if standalone {
		height += headRoom + footRoom
	}
	canvas := vgsvg.New(Width, height)
	c := draw.New(canvas)
	caption := ""
	if standalone {
		caption, remarks = whole(c, f)
	} else {
		remarks = Draw(c, f)
		caption = Caption(f, remarks)
	}
	var raw bytes.Buffer
	canvas.WriteTo(&raw) // a bytes.Buffer does not fail
	return dress(raw.String(), f, id, caption, height, standalone), remarks
}

// PNG draws a whole figure with heading and caption as a picture; dpi 96 gives
// about 850 pixels of width.
func PNG(f *analyze.Figure, dpi int) ([]byte, error) {
	canvas := vgimg.NewWith(vgimg.UseWH(Width, Height+headRoom+footRoom), vgimg.UseDPI(dpi), vgimg.UseBackgroundColor(white))
	whole(draw.New(canvas), f)
	var b bytes.Buffer
	if _, err := (vgimg.PngCanvas{Canvas: canvas}).WriteTo(&b); err != nil {
		return nil, fmt.Errorf("figure: %w", err)
	}
	return b.Bytes(), nil
}

// headRoom and footRoom are what heading and caption take, in points.
const headRoom, footRoom = 24, 34

// whole draws a figure with its title above and its caption below.
func whole(c draw.Canvas, f *analyze.Figure) (caption string, remarks []string) {
	c.SetColor(white)
	c.Fill(c.Rectangle.Path())
	remarks = Draw(draw.Crop(c, 0, 0, footRoom, -headRoom), f)
	caption = Caption(f, remarks)
	title := sans(12, ink, true)
	title.YAlign = draw.YTop
	c.FillText(title, vg.Point{X: 10, Y: c.Max.Y - 7}, cut(title, report.Clean(f.Title), Width-20))
	for i, l := range report.Wrap(caption, 118) {
		if i == 2 {
			break
		}
		c.FillText(sans(9.5, soft, false), vg.Point{X: 10, Y: vg.Length(footRoom - 14 - 12*i)}, l)
	}
	return caption, remarks
}

// dress replaces the library's prelude by one with a title, a description and
// font fallbacks.
func dress(raw string, f *analyze.Figure, id, caption string, height vg.Length, standalone bool) []byte {
	raw = raw[strings.Index(raw, "<g "):]
	for _, r := range [][2]string{
		{"font-family:Liberation Sans;font-variant:none;", "font-family:'Liberation Sans',Arial,Helvetica,sans-serif;"},
		{"font-family:Liberation Sans;font-variant:normal;", "font-family:'Liberation Sans',Arial,Helvetica,sans-serif;"},
		{";font-weight:normal;font-style:normal", ""},
		{"font-weight:normal;font-style:normal;", ""},
		{"\n\tstyle=", " style="},
	} {
		raw = strings.ReplaceAll(raw, r[0], r[1])
	}
	var b bytes.Buffer
	ns := ""
	if standalone {
		b.WriteString("<?xml version=\"1.0\" encoding=\"UTF-8\"?>\n")
		ns = ` xmlns="http://www.w3.org/2000/svg"`
	}
	id = html.EscapeString(id)
	fmt.Fprintf(&b, `<svg%s viewBox="0 0 %d %d" width="%d" height="%d" role="img" aria-labelledby="%s-t" aria-describedby="%s-d">`, ns, Width, int(height), Width, int(height), id, id)
	fmt.Fprintf(&b, "\n<title id=\"%s-t\">%s</title>\n<desc id=\"%s-d\">%s</desc>\n", id, escape(f.Title), id, escape(Words(f)+" "+caption))
	tenths(&b, raw)
	return b.Bytes()
}

// tenths copies an SVG text and cuts the numbers of path data to one decimal:
// a tenth of a point is finer than any screen here.
func tenths(b *bytes.Buffer, svg string) {
	for {
		i := strings.Index(svg, ` d="`)
		if i < 0 {
			b.WriteString(svg)
			return
		}
		i += len(` d="`)
		end := i + strings.IndexByte(svg[i:], '"')
		b.WriteString(svg[:i])
		for i < end {
			j := i
			for j < end && (svg[j] == '.' || svg[j] == '-' || svg[j] == 'e' || svg[j] >= '0' && svg[j] <= '9') {
				j++
			}
			if j == i {
				b.WriteByte(svg[i])
				i++
				continue
			}
			if x, err := strconv.ParseFloat(svg[i:j], 64); err == nil {
				b.WriteString(strconv.FormatFloat(math.Round(x*10)/10, 'f', -1, 64))
			} else {
				b.WriteString(svg[i:j])
			}
			i = j
		}
		svg = svg[end:]
	}
}

func escape(s string) string { return html.EscapeString(report.Clean(s)) }

// Caption joins a figure's own caption and the remarks of drawing it, each a
// sentence.
func Caption(f *analyze.Figure, remarks []string) string {
	parts := append([]string{sentence(strings.TrimSpace(report.Clean(f.Caption)))}, remarks...)
	return strings.TrimSpace(strings.Join(parts, " "))
}

// sentence begins s with a capital and ends it with a full stop.
func sentence(s string) string {
	if s == "" {
		return s
	}
	first, size := utf8.DecodeRuneInString(s)
	s = string(unicode.ToUpper(first)) + s[size:]
	if !strings.HasSuffix(s, ".") {
		s += "."
	}
	return s
}

// cut shortens s with an ellipsis so that it is no wider than width.
func cut(st text.Style, s string, width vg.Length) string {
	if st.Width(s) <= width {
		return s
	}
	r := []rune(s)
	for len(r) > 1 && st.Width(string(r)+"…") > width {
		r = r[:len(r)-1]
	}
	return string(r) + "…"
}
