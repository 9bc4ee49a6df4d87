package pdf

// column of a table.
type column struct {
	title string
	width float64
	right bool
	face  string // of its cells; "" sans
}

// row of a table: one text a column, remarks below it over the full width,
// and what else is drawn into it.
type row struct {
	cells   []string
	remarks []string
	height  float64                            // least height of the cells
	draw    func(p *page, x func(int) float64) // called with the cursor at the row's top
	tone    map[int][3]uint8                   // colour of single cells
	indent  map[int]float64                    // room left free before a cell's text
	small   map[int]string                     // a second, smaller line of a cell
}

const (
	cellGap  = 2.0 // between columns
	cellSize = 9.0 // pt
	tinySize = 7.5 // pt
)

// table writes rows under a heading that is repeated on every page. A row is
// never parted.
func (p *page) table(cols []column, rows []row) {
	x := func(i int) float64 {
		at := marginX
		for _, c := range cols[:i] {
			at += c.width
		}
		return at
	}
	end := x(len(cols))
	head := func() {
		p.font("sans", 8.5)
		p.color(soft)
		for i, c := range cols {
			at := x(i)
			if c.right {
				at += c.width - cellGap - p.GetStringWidth(c.title)
				if i == len(cols)-1 {
					at += cellGap
				}
			}
			p.Text(at, p.y+p.size*0.95*pt, c.title)
		}
		p.y += 4.3
		p.SetLineWidth(0.25)
		p.Line(marginX, p.y, end, p.y)
		p.y += 0.8
	}
	for n, r := range rows {
		lines, tiny, height := p.layout(cols, r)
		remarks := p.remarkLines(r)
		full := height + float64(len(remarks))*cellSize*1.28*pt + 1.6
		if n == 0 {
			p.room(full + 5.2)
			head()
		} else if p.room(full) {
			head()
		}
		p.cells(cols, r, lines, tiny, x)
		if r.draw != nil {
			r.draw(p, x)
		}
		p.y += height
		p.font("sans", cellSize)
		p.color(black)
		for _, l := range remarks {
			p.Text(x(1), p.y+p.size*0.95*pt, l)
			p.y += p.lineHeight()
		}
		p.y += 0.8
		p.SetDrawColor(0x99, 0x99, 0x99)
		p.SetLineWidth(0.12)
		p.Line(marginX, p.y, end, p.y)
		p.SetDrawColor(0, 0, 0)
		p.y += 0.8
	}
	p.font("sans", 9.5)
	p.color(black)
}

// layout wraps the cells of a row and finds its height.
func (p *page) layout(cols []column, r row) (lines, tiny [][]string, height float64) {
	height = r.height
	for i, c := range cols {
		width := c.width - cellGap - r.indent[i]
		p.font(c.faceOr(), cellSize)
		l := p.wrap(r.cells[i], width)
		lines = append(lines, l)
		h := float64(len(l)) * cellSize * 1.28 * pt
		var t []string
		if r.small[i] != "" {
			p.font("sans", tinySize)
			t = p.wrap(r.small[i], width)
			h += float64(len(t)) * tinySize * 1.28 * pt
		}
		tiny = append(tiny, t)
		height = max(height, h)
	}
	return lines, tiny, height
}

func (c column) faceOr() string {
	if c.face == "" {
		return "sans"
	}
	return c.face
}

func (p *page) remarkLines(r row) []string {
	p.font("sans", cellSize)
	var out []string
	for _, m := range r.remarks {
		out = append(out, p.wrap(m, textWidth-8)...)
	}
	return out
}

func (p *page) cells(cols []column, r row, lines, tiny [][]string, x func(int) float64) {
	for i, c := range cols {
		p.font(c.faceOr(), cellSize)
		p.color(black)
		if tone, ok := r.tone[i]; ok {
			p.color(tone)
		}
		y := p.y + p.size*0.95*pt
		for _, l := range lines[i] {
			at := x(i) + r.indent[i]
			if c.right {
				at = x(i) + c.width - p.GetStringWidth(l)
				if i < len(cols)-1 {
					at -= cellGap
				}
			}
			p.Text(at, y, l)
			y += cellSize * 1.28 * pt
		}
		if tiny[i] != nil {
			p.font("sans", tinySize)
			p.color(soft)
			y -= 1.28 * (cellSize - tinySize) * pt
			for _, l := range tiny[i] {
				p.Text(x(i)+r.indent[i], y, l)
				y += tinySize * 1.28 * pt
			}
		}
	}
}
