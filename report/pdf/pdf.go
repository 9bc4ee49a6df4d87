// Package pdf writes a slip as slip.pdf: the sheet for those who want paper or
// an archive. Text can be selected and searched, figures are vectors, fonts
// are embedded as far as they are used. The page fits A4 and Letter; sheet
// number and page number stand on every page. The only date in the file is
// the job's. Letters that the fonts lack are shown by a replacement sign.
package pdf

import (
	"fmt"
	"io"
	"slices"
	"strings"
	"time"

	"benchslip/analyze/slip"
	"benchslip/report"
	"benchslip/report/figure"
)

// tones of the verdicts; words and signs say the same without them.
func tone(verdict string) [3]uint8 {
	switch verdict {
	case slip.Pass:
		return [3]uint8{0x0c, 0x5a, 0x48}
	case slip.Fail:
		return [3]uint8{0x98, 0x20, 0x1b}
	case slip.ConditionalPass, slip.ConditionalFail, slip.Inconclusive:
		return [3]uint8{0x7b, 0x4b, 0x00}
	case slip.NotMeasurable, slip.NotApplicable:
		return [3]uint8{0x3a, 0x49, 0x80}
	}
	return black
}

// Render writes the file.
func Render(w io.Writer, s *slip.Slip) error {
	rows := report.Rows(s)
	h := report.HeadOf(s, rows)
	date, err := time.Parse(time.DateOnly, strings.TrimSpace(s.Record["date"]))
	dated := err == nil
	if !dated {
		date = time.Date(2000, 1, 1, 0, 0, 0, 0, time.UTC) // blanked out in the end
	}
	p := newPage(report.Clean(h.Verdict+": "+h.Title), s.Sheet, date)
	d := &document{page: p, slip: s, rows: rows, figures: report.Figures(s)}
	d.head(h)
	d.results(h)
	d.remarks()
	d.signature()
	d.rowByRow()
	d.takes()
	d.origin()
	p.feet()
	if err := p.Error(); err != nil {
		return fmt.Errorf("pdf: %w", err)
	}
	return p.output(w, dated)
}

type document struct {
	*page
	slip    *slip.Slip
	rows    []report.Row
	figures []*report.Figure
}

func (d *document) head(h report.Head) {
	d.font("bold", 15)
	d.say(marginX, textWidth-48, h.Title)
	d.font("sans", 9)
	d.color(soft)
	right := "Test record " + d.clean(h.Sheet)
	d.Text(marginX+textWidth-d.GetStringWidth(right), marginTop+5, right)
	d.y += 2

	// The verdict in a frame with a heavy left edge.
	top := d.y
	c := tone(d.slip.Verdict)
	d.y += 2.5
	const left = marginX + 58
	d.color(black)
	d.font("bold", 10.5)
	d.say(left, textWidth-61, h.Lead)
	d.font("sans", 9.5)
	d.say(left, textWidth-61, strings.Join(h.Counts, "; ")+".")
	if h.Closest != "" {
		d.say(left, textWidth-61, "Closest call: "+h.Closest+".")
	}
	if h.Flags != "" {
		d.say(left, textWidth-61, "Flags: "+h.Flags+".")
	}
	d.y = max(d.y, top+15) + 2
	height := d.y - top
	d.SetFillColor(int(c[0]), int(c[1]), int(c[2]))
	d.Rect(marginX, top, 3, height, "F")
	d.SetDrawColor(int(c[0]), int(c[1]), int(c[2]))
	d.SetLineWidth(0.4)
	d.Rect(marginX, top, textWidth, height, "D")
	d.shapes(figure.Gate(d.slip.Verdict), marginX+6, top+height/2-7*1.5*pt, 1.5, c)
	size := 19.0
	d.font("bold", size)
	for ; d.GetStringWidth(h.Verdict) > 34 && size > 9; size-- {
		d.font("bold", size-1)
	}
	d.color(c)
	d.Text(marginX+22.5, top+height/2+d.size*0.35*pt, h.Verdict)
	d.color(black)
	d.y += 2.5
	d.pairs(append(report.Pairs(d.slip.Unit, d.slip.UnitKeys), report.Pairs(d.slip.Record, d.slip.RecordKeys)...))
}

// pairs writes keys and values in two columns, row by row.
func (d *document) pairs(pairs []report.Pair) {
	d.font("sans", 9)
	const half = textWidth/2 - 3
	for i := 0; i < len(pairs); i += 2 {
		var cols [2][]string
		var keys [2]string
		n := 1
		for k := range 2 {
			if i+k < len(pairs) {
				q := pairs[i+k]
				keys[k] = d.wrap(q.Key, 30)[0]
				cols[k] = d.wrap(q.Value, half-d.GetStringWidth(keys[k])-2)
				n = max(n, len(cols[k]))
			}
		}
		d.room(float64(n) * d.lineHeight())
		for k := range 2 {
			x := marginX + float64(k)*(half+6)
			y := d.y + d.size*0.95*pt
			d.color(soft)
			d.Text(x, y, keys[k])
			d.color(black)
			for _, l := range cols[k] {
				d.Text(x+d.GetStringWidth(keys[k])+2, y, l)
				y += d.lineHeight()
			}
		}
		d.y += float64(n) * d.lineHeight()
	}
}

const stripScale = 0.46

func (d *document) results(h report.Head) {
	d.heading("Results", 20)
	cols := []column{{title: "Row", width: 8}, {title: "Verdict", width: 28, face: "bold"}, {title: "Check", width: 34, face: "bold"},
		{title: "Value ± U", width: 34}, {title: "Limits", width: 26}, {title: "Limit strip", width: 33}, {title: "Margin", width: 17, right: true}}
	var rows []row
	for i := range d.rows {
		r := &d.rows[i]
		verdict := r.Check.Verdict
		margin := r.Margin
		if margin == "" {
			margin = "–"
		}
		out := row{cells: []string{fmt.Sprint(r.N), r.Verdict, r.Name, r.Value, r.Limits, "", margin}, height: 4.6,
			tone: map[int][3]uint8{1: tone(verdict)}, indent: map[int]float64{1: 6.6}, small: map[int]string{2: r.By}}
		if r.Wide != "" {
			out.small[3] = "from " + r.Wide
		}
		strip := figure.NewStrip(r, d.slip.Rule)
		if strip != nil {
			out.height = figure.StripHeight * stripScale * pt
		}
		out.draw = func(p *page, x func(int) float64) {
			p.shapes(figure.Gate(verdict), x(1), p.y+0.5, 0.62, tone(verdict))
			if strip != nil {
				p.shapes(strip.Shapes(), x(5)-1, p.y, stripScale, black)
			}
		}
		if r.Say != "" {
			out.remarks = append(out.remarks, r.Why())
		}
		if r.Advice != "" {
			out.remarks = append(out.remarks, "To settle it: "+r.Advice)
		}
		if r.Waiver != "" {
			out.remarks = append(out.remarks, r.Waiver)
		}
		rows = append(rows, out)
	}
	d.table(cols, rows)
	d.y += 1
	d.say(marginX, textWidth, h.Rule+" "+h.Leaves)
	d.font("sans", 8.5)
	d.color(soft)
	d.say(marginX, textWidth, "On a strip: the band between the posts is allowed, the hatched parts lie within one U of a limit, the diamond is the value with its U, an arrow is a bound.")
	d.color(black)
}

func (d *document) remarks() {
	if flags := report.Flags(d.slip); len(flags) > 0 {
		d.heading("Flags", 12)
		var rows []row
		for _, f := range flags {
			place := f.Place
			if place == "" {
				place = "whole take"
			}
			rows = append(rows, row{cells: []string{f.Code, f.Take, place, f.Message, strings.TrimPrefix(strings.TrimPrefix(f.RowsText(), "rows "), "row ")}})
		}
		d.table([]column{{title: "Flag", width: 42, face: "mono"}, {title: "Take", width: 22}, {title: "Place", width: 40}, {title: "What was seen", width: 62}, {title: "Rows", width: 14}}, rows)
	}
	titled := false
	for i := range d.rows {
		for _, o := range d.rows[i].Check.Opinions {
			if !titled {
				d.heading("Opinion", 12)
				d.say(marginX, textWidth, "Conclusions drawn from the results, not measured.")
				titled = true
			}
			d.say(marginX+3, textWidth-3, fmt.Sprintf("Row %d, %s: %s", i+1, d.rows[i].Name, o))
		}
	}
}

func (d *document) signature() {
	d.room(46)
	d.heading("Signature", 34)
	d.say(marginX, textWidth, "This record applies only to the item tested. It is to be passed on only as a whole.")
	d.y += 14
	operator := d.slip.Record["operator"]
	if operator == "" {
		operator = d.slip.Record["measured"]
	}
	for i, label := range []string{"Measured by: " + operator, "Approved by: " + d.slip.Record["approved"], "Date"} {
		x := marginX + float64(i)*(textWidth+6)/3
		d.Line(x, d.y, x+(textWidth-12)/3, d.y)
		d.Text(x, d.y+4, d.wrap(strings.TrimSuffix(label, ": "), (textWidth-12)/3)[0])
	}
	d.y += 6
}

func (d *document) rowByRow() {
	if len(d.rows) == 0 {
		return
	}
	d.heading("Row by row", 30)
	for i := range d.rows {
		r := &d.rows[i]
		d.font("bold", 10)
		d.y += 2.5
		d.room(22)
		d.color(black)
		d.say(marginX, textWidth, fmt.Sprintf("%d  %s", r.N, r.Name))
		d.font("sans", 9)
		line := r.Verdict + ": " + r.Value
		if r.Wide != "" {
			line += " (from " + r.Wide + ")"
		}
		line += "; limits: " + r.Limits
		if r.Margin != "" {
			line += "; margin " + r.Margin
		}
		if r.Cover != "" {
			line += "; " + r.Cover
		}
		d.say(marginX, textWidth, line)
		d.color(soft)
		d.say(marginX, textWidth, strings.Join(r.Facts(), "; ")+".")
		d.color(black)
		d.budget(r)
		d.details(r)
		d.drawings(r)
	}
}

func (d *document) budget(r *report.Row) {
	var rows []row
	for _, b := range r.Budget() {
		rows = append(rows, row{cells: []string{b.Name, b.U, b.Percent, b.Kind, b.Dof}})
	}
	if rows != nil {
		d.y += 0.8
		d.table([]column{{title: "Where its uncertainty comes from", width: 62}, {title: "standard", width: 24, right: true},
			{title: "of variance", width: 20, right: true}, {title: "kind", width: 12}, {title: "degrees of freedom", width: 30}}, rows)
	}
}

func (d *document) details(r *report.Row) {
	pairs, tables := report.Details(r.Check)
	if pairs != nil {
		d.y += 0.8
		d.pairs(pairs)
	}
	for _, t := range tables {
		n := min(len(t.Columns), 8)
		cols := make([]column, n)
		for i := range cols {
			cols[i] = column{title: d.clean(t.Columns[i]), width: min(textWidth/float64(n), 30)}
		}
		var rows []row
		for _, c := range t.Rows {
			rows = append(rows, row{cells: c[:n]})
		}
		d.y += 0.8
		d.font("sans", 9)
		d.color(soft)
		title := t.Name
		if t.Left > 0 {
			title += fmt.Sprintf(" (every so many: %d more are in slip.json)", t.Left)
		}
		d.room(14)
		d.say(marginX, textWidth, title)
		d.color(black)
		d.table(cols, rows)
	}
}

// figureWidth and figureHeight are in pt.
const (
	figureWidth  = 470.0
	figureHeight = 205.0
)

func (d *document) drawings(r *report.Row) {
	for _, f := range d.figures {
		switch {
		case f.Rows[0] == r.N:
			d.y += 1.5
			d.room(figureHeight*pt + 10)
			strokes, remarks := figure.Strokes(f.Figure, figureWidth, figureHeight)
			d.strokes(strokes, marginX, d.y)
			d.y += figureHeight*pt + 1
			d.font("sans", 8.5)
			d.color(black)
			d.say(marginX, figureWidth*pt, strings.TrimSpace(fmt.Sprintf("Figure %d. %s. %s", f.N, report.Clean(f.Title), figure.Caption(f.Figure, remarks))))
		case slices.Contains(f.Rows, r.N):
			d.font("sans", 9)
			d.say(marginX, textWidth, fmt.Sprintf("Figure %d at row %d shows this too: %s.", f.N, f.Rows[0], report.Clean(f.Title)))
		}
	}
}

func (d *document) takes() {
	s := d.slip
	if len(s.Takes) > 0 {
		d.heading("Takes and gear", 20)
		var rows []row
		for i := range s.Takes {
			t := &s.Takes[i]
			where := report.PairsLine(report.Pairs(t.Where, t.WhereKeys))
			if t.Setup != "" {
				where = strings.TrimPrefix(where+", setup "+report.Clean(t.Setup), ", ")
			}
			r := row{cells: []string{t.Name, report.TakeLine(t), where, t.Gear}, small: map[int]string{}}
			for _, a := range t.Assumptions {
				r.small[1] += "taken as read: " + report.Clean(a) + ". "
			}
			if t.SHA256 != nil {
				r.small[1] += report.Clean(*t.SHA256)
			}
			rows = append(rows, r)
		}
		d.table([]column{{title: "Take", width: 22, face: "bold"}, {title: "Recording and its SHA-256", width: 102}, {title: "Conditions", width: 38}, {title: "Gear", width: 18}}, rows)
	}
	d.y += 1
	for _, g := range s.Gear {
		d.say(marginX, textWidth, report.GearLine(g))
	}
	if len(s.Cautions) > 0 {
		d.heading("Cautions", 8)
		for _, c := range s.Cautions {
			d.say(marginX, textWidth, c)
		}
	}
}

func (d *document) origin() {
	d.heading("Where this record comes from", 24)
	s := d.slip
	job := report.Clean(s.Job.File)
	for _, i := range s.Job.Includes {
		job += ", with " + report.Clean(i)
	}
	d.say(marginX, textWidth, "Program: "+report.ToolLine(s))
	d.say(marginX, textWidth, "Job: "+job)
	d.font("mono", 7.5)
	d.say(marginX+4, textWidth-4, s.Job.SHA256)
	d.font("sans", 9.5)
	d.say(marginX, textWidth, "Limits of all rows:")
	d.font("mono", 7.5)
	d.say(marginX+4, textWidth-4, s.LimitsSHA256)
	d.font("sans", 9.5)
	d.say(marginX, textWidth, "The same job and the same recordings give the same record, number for number. slip.json beside this sheet holds every value unrounded.")
	d.y += 3
	d.color(soft)
	end := "End of test record " + d.clean(s.Sheet)
	d.room(6)
	d.Text(marginX+(textWidth-d.GetStringWidth(end))/2, d.y+4, end)
}
