package pdf

import (
	"bytes"
	"fmt"
	"io"
	"math"
	"strings"
	"time"
	"unicode/utf8"

	"codeberg.org/go-fonts/liberation/liberationmonoregular"
	"codeberg.org/go-fonts/liberation/liberationsansbold"
	"codeberg.org/go-fonts/liberation/liberationsansregular"
	"codeberg.org/go-pdf/fpdf"
	"golang.org/x/image/font/sfnt"

	"benchslip/report"
	"benchslip/report/figure"
)

// The page is as wide as A4 and as high as Letter, so that it prints on either
// without scaling (ISO 216: 210 mm x 297 mm; ANSI/ASME Y14.1: 215.9 mm x
// 279.4 mm). Lengths in this package are millimetres unless they say pt.
const (
	pageWidth  = 210.0
	pageHeight = 279.4
	marginX    = 15.0
	marginTop  = 14.0
	marginFoot = 18.0
	textWidth  = pageWidth - 2*marginX
	pt         = 25.4 / 72
)

// page wraps the library: a cursor that runs down pages of text.
type page struct {
	*fpdf.Fpdf
	y     float64
	sheet string
	size  float64 // of the font, pt
	face  string  // "sans", "bold", "mono"
	has   func(rune) bool
}

var (
	black = [3]uint8{0, 0, 0}
	soft  = [3]uint8{0x44, 0x4c, 0x55}
)

func newPage(title, sheet string, date time.Time) *page {
	f := fpdf.NewCustom(&fpdf.InitType{UnitStr: "mm", Size: fpdf.SizeType{Wd: pageWidth, Ht: pageHeight}})
	f.SetCatalogSort(true)
	f.SetCreationDate(date)
	f.SetModificationDate(date)
	f.SetAutoPageBreak(false, 0)
	f.SetMargins(0, 0, 0)
	f.SetCellMargin(0)
	f.SetLang("en")
	f.SetTitle(title, true)
	f.AddUTF8FontFromBytes("sans", "", liberationsansregular.TTF)
	f.AddUTF8FontFromBytes("bold", "", liberationsansbold.TTF)
	f.AddUTF8FontFromBytes("mono", "", liberationmonoregular.TTF)
	p := &page{Fpdf: f, sheet: sheet, has: known()}
	p.next()
	return p
}

// next begins a page. A page's own graphics state is fresh, so what is in
// force must be set again.
func (p *page) next() {
	p.AddPage()
	p.y = marginTop
	p.SetDrawColor(0, 0, 0)
	p.SetLineWidth(0.2)
	p.font("sans", 9.5)
}

// font chooses a face and a size in pt.
func (p *page) font(face string, size float64) {
	p.face, p.size = face, size
	p.SetFont(face, "", size)
}

// room begins a new page unless height is left on this one.
func (p *page) room(height float64) bool {
	if p.y+height <= pageHeight-marginFoot {
		return false
	}
	face, size := p.face, p.size
	p.next()
	p.font(face, size)
	return true
}

func (p *page) lineHeight() float64 { return p.size * 1.28 * pt }

// known returns a test for the characters that the fonts hold; all three hold
// the same. Not safe for use by several goroutines.
func known() func(rune) bool {
	f, err := sfnt.Parse(liberationsansregular.TTF)
	if err != nil {
		return func(r rune) bool { return r < 0x7f }
	}
	var b sfnt.Buffer
	seen := map[rune]bool{}
	return func(r rune) bool {
		ok, there := seen[r]
		if !there {
			i, err := f.GlyphIndex(&b, r)
			ok = err == nil && i != 0
			seen[r] = ok
		}
		return ok
	}
}

// clean makes text fit to be written: one line, and for letters that the
// fonts lack the sign that something stood there.
func (p *page) clean(s string) string {
	return strings.Map(func(r rune) rune {
		if !p.has(r) {
			return utf8.RuneError
		}
		return r
	}, report.Clean(s))
}

// Text writes cleaned text, whoever calls: a letter outside of the basic plane
// would make the library panic.
func (p *page) Text(x, y float64, s string) { p.Fpdf.Text(x, y, p.clean(s)) }

// wrap breaks text at blanks into lines of at most width; a longer word is
// cut. The font must be set.
func (p *page) wrap(s string, width float64) []string {
	var lines []string
	line := ""
	for _, word := range strings.Fields(p.clean(s)) {
		joined := word
		if line != "" {
			joined = line + " " + word
		}
		if p.GetStringWidth(joined) <= width {
			line = joined
			continue
		}
		if line != "" {
			lines = append(lines, line)
		}
		for p.GetStringWidth(word) > width {
			n := p.fitting(word, width)
			lines, word = append(lines, word[:n]), word[n:]
		}
		line = word
	}
	if line != "" || lines == nil {
		lines = append(lines, line)
	}
	return lines
}

// fitting returns how many bytes of a word fit into width, at least a letter.
func (p *page) fitting(word string, width float64) int {
	n := 0
	for i, r := range word {
		end := i + utf8.RuneLen(r)
		if i > 0 && p.GetStringWidth(word[:end]) > width {
			break
		}
		n = end
	}
	return n
}

// say writes wrapped text at x and moves the cursor below it.
func (p *page) say(x, width float64, text string) {
	for _, l := range p.wrap(text, width) {
		p.room(p.lineHeight())
		p.Text(x, p.y+p.size*0.95*pt, l)
		p.y += p.lineHeight()
	}
}

// color sets the colour of text.
func (p *page) color(c [3]uint8) { p.SetTextColor(int(c[0]), int(c[1]), int(c[2])) }

// heading writes a section's title with a rule below it; follow is the height
// that must stay with it.
func (p *page) heading(title string, follow float64) {
	p.font("bold", 11)
	p.y += 4.5
	p.room(7 + follow)
	p.color(black)
	p.Text(marginX, p.y+p.size*0.95*pt, p.clean(title))
	p.Bookmark(p.clean(title), 0, p.y)
	p.y += 5.6
	p.SetLineWidth(0.5)
	p.Line(marginX, p.y, marginX+textWidth, p.y)
	p.SetLineWidth(0.2)
	p.y += 1.6
	p.font("sans", 9.5)
}

// feet writes sheet number and page number on every page, once their number is
// known.
func (p *page) feet() {
	total := p.PageCount()
	for n := 1; n <= total; n++ {
		p.SetPage(n)
		p.font("sans", 5) // another size first: the library leaves out what it thinks is set
		p.font("sans", 8)
		p.color(soft)
		y := pageHeight - 9
		p.Text(marginX, y, "Test record "+p.clean(p.sheet))
		right := fmt.Sprintf("page %d of %d", n, total)
		p.Text(marginX+textWidth-p.GetStringWidth(right), y, right)
	}
}

// output writes the file. Without a date the library would put today's into
// it; undated ones have the entries blanked out, which keeps every offset.
func (p *page) output(w io.Writer, dated bool) error {
	var b bytes.Buffer
	if err := p.Output(&b); err != nil {
		return err
	}
	raw := b.Bytes()
	if !dated {
		for _, key := range []string{"/CreationDate (D:", "/ModDate (D:"} {
			if i := bytes.LastIndex(raw, []byte(key)); i >= 0 {
				end := i + bytes.IndexByte(raw[i:], ')')
				copy(raw[i:end+1], bytes.Repeat([]byte(" "), end+1-i))
			}
		}
	}
	_, err := w.Write(raw)
	return err
}

// strokes draws a figure's strokes with its upper left corner at x, y.
func (p *page) strokes(list []figure.Stroke, x, y float64) {
	at := func(q figure.Point) (float64, float64) { return x + q.X*pt, y + q.Y*pt }
	for _, s := range list {
		if s.Text != "" {
			face := "sans"
			if s.Bold {
				face = "bold"
			}
			p.font(face, s.Size)
			p.color(s.Color)
			tx, ty := at(s.At)
			text := p.clean(s.Text)
			if math.Abs(s.Angle) < 0.1 {
				p.Text(tx, ty, text)
				continue
			}
			p.TransformBegin()
			p.TransformRotate(s.Angle, tx, ty)
			p.Text(tx, ty, text)
			p.TransformEnd()
			continue
		}
		p.pen(s.Color, s.Width*pt, s.Dashes)
		style := "D"
		if s.Fill {
			p.SetFillColor(int(s.Color[0]), int(s.Color[1]), int(s.Color[2]))
			style = "f"
		}
		for _, line := range s.Lines {
			for i, q := range line {
				if px, py := at(q); i == 0 {
					p.MoveTo(px, py)
				} else {
					p.LineTo(px, py)
				}
			}
		}
		if len(s.Lines) > 0 {
			p.DrawPath(style)
		}
	}
	p.pen(black, 0.2, nil)
}

func (p *page) pen(c [3]uint8, width float64, dashes []float64) {
	p.SetDrawColor(int(c[0]), int(c[1]), int(c[2]))
	p.SetLineWidth(width)
	var mm []float64
	for _, d := range dashes {
		mm = append(mm, d*pt)
	}
	p.SetDashPattern(mm, 0)
}

// shapes draws a limit strip or a verdict sign, scaled, in a colour.
func (p *page) shapes(list []figure.Shape, x, y, scale float64, c [3]uint8) {
	k := scale * pt
	at := func(q figure.Point) (float64, float64) { return x + q.X*k, y + q.Y*k }
	for _, s := range list {
		if s.Text != "" {
			p.font("sans", max(5.5, 9*scale))
			p.color(black)
			tx, ty := at(s.Points[0])
			text := p.clean(s.Text)
			tx -= p.GetStringWidth(text) * float64(s.Anchor+1) / 2
			p.Text(tx, ty, text)
			continue
		}
		var dashes []float64
		if s.Dashed {
			dashes = []float64{2 * scale, 2 * scale}
		}
		p.pen(c, math.Max(s.Line, 0.01)*k, dashes)
		style := "D"
		if s.Fill != figure.None {
			fill := map[figure.Tone][3]uint8{figure.Ink: c, figure.Tint: {0xdb, 0xdd, 0xdf}, figure.Paper: {255, 255, 255}}[s.Fill]
			p.SetFillColor(int(fill[0]), int(fill[1]), int(fill[2]))
			style = "f"
			if s.Line > 0 {
				style = "b"
			}
		}
		for i, q := range s.Points {
			if px, py := at(q); i == 0 {
				p.MoveTo(px, py)
			} else {
				p.LineTo(px, py)
			}
		}
		p.DrawPath(style)
	}
	p.pen(black, 0.2, nil)
}
