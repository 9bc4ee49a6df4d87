package figure

import (
	"bytes"
	stdcsv "encoding/csv"
	"encoding/xml"
	"fmt"
	"image/png"
	"io"
	"math"
	"slices"
	"strconv"
	"strings"
	"testing"

	"gonum.org/v1/plot"

	"benchslip/analyze"
	"benchslip/report/internal/sample"
)

func figures(t *testing.T) []analyze.Figure {
	var out []analyze.Figure
	for _, c := range sample.Slip().Checks {
		out = append(out, c.Figures...)
	}
	if len(out) < 8 {
		t.Fatalf("only %d figures in the sample", len(out))
	}
	return out
}

// element is a generic XML element, read by the standard library.
type element struct {
	XMLName  xml.Name
	Attrs    []xml.Attr `xml:",any,attr"`
	Text     string     `xml:",chardata"`
	Children []element  `xml:",any"`
}

func (e *element) walk(visit func(*element)) {
	visit(e)
	for i := range e.Children {
		e.Children[i].walk(visit)
	}
}

func parse(t *testing.T, svg []byte) *element {
	t.Helper()
	var e element
	if err := xml.Unmarshal(svg, &e); err != nil {
		t.Fatalf("not XML: %v\n%.300s", err, svg)
	}
	return &e
}

// texts are the words on a figure.
func texts(e *element) (out []string) {
	e.walk(func(x *element) {
		if x.XMLName.Local == "text" {
			out = append(out, strings.TrimSpace(x.Text))
		}
	})
	return out
}

func TestSVGOfEveryKind(t *testing.T) {
	for i, f := range figures(t) {
		for _, alone := range []bool{true, false} {
			svg, _ := SVG(&f, fmt.Sprintf("f%d", i), alone)
			if len(svg) > MaxBytes {
				t.Errorf("%s: %d bytes", f.ID, len(svg))
			}
			e := parse(t, svg)
			if e.Children[0].XMLName.Local != "title" || e.Children[0].Text != f.Title || e.Children[1].XMLName.Local != "desc" {
				t.Errorf("%s is not named by its title", f.ID)
			}
			words := texts(e)
			for _, a := range []analyze.Axis{f.X, f.Y} {
				if !slices.ContainsFunc(words, func(w string) bool { return strings.HasPrefix(w, a.Label) }) {
					t.Errorf("%s: axis %q is not named in %q", f.ID, a.Label, words)
				}
			}
			for _, m := range f.Marks {
				if !slices.Contains(words, m.Label) {
					t.Errorf("%s: mark %q has no label in %q", f.ID, m.Label, words)
				}
			}
			if alone != strings.HasPrefix(string(svg), "<?xml") {
				t.Errorf("%s: standalone %v begins %.20q", f.ID, alone, svg)
			}
			if strings.Contains(string(svg), "NaN") || strings.Contains(string(svg), "Inf") {
				t.Errorf("%s: a number that is none", f.ID)
			}
		}
	}
}

func TestLongCurvesSaySo(t *testing.T) {
	n := 100_000
	long := analyze.Series{Name: "long", Kind: analyze.Line}
	for i := range n {
		long.X = append(long.X, float64(i))
		long.Y = append(long.Y, math.Sin(float64(i))*float64(i%977))
	}
	f := analyze.Figure{ID: "x", Title: "Long", X: analyze.Axis{Label: "time", Unit: "s"}, Y: analyze.Axis{Label: "level", Unit: "V"}}
	for range 6 {
		f.Series = append(f.Series, long)
	}
	svg, remarks := SVG(&f, "x", true)
	if len(svg) > MaxBytes {
		t.Errorf("six long curves take %d bytes", len(svg))
	}
	if !slices.Contains(remarks, "Drawn as the smallest and largest value of each pixel column.") {
		t.Errorf("the caption does not say so: %q", remarks)
	}
	raw := CSV(&f)
	if !bytes.Contains(raw, []byte("line extremes,long,")) || len(raw) > 200_000 {
		t.Errorf("the data of a long curve: %d bytes, %.100q", len(raw), raw)
	}
	f.Series = f.Series[:1]
	f.Series[0].X, f.Series[0].Y = long.X[:100], long.Y[:100]
	if _, remarks := SVG(&f, "x", true); len(remarks) > 0 {
		t.Errorf("a short curve was not thinned, yet: %q", remarks)
	}
}

// Whatever is thinned away, every column keeps its smallest and largest value,
// in order.
func TestColumnsKeepExtremes(t *testing.T) {
	var x, y []float64
	for i := range 10_000 {
		x = append(x, 1+float64(i))
		y = append(y, math.Sin(float64(i)*0.37)*math.Sin(float64(i)*0.011))
	}
	for _, a := range []axis{{min: 1, max: 10_000}, {min: 1, max: 10_000, log: true}} {
		cols, thinned := columns(x, y, a, 100)
		if !thinned || len(cols) > 101 {
			t.Fatalf("%d columns, thinned %v", len(cols), thinned)
		}
		i := 0
		for _, c := range cols {
			part := y[i : i+c.n]
			if math.Min(c.y1, c.y2) != slices.Min(part) || math.Max(c.y1, c.y2) != slices.Max(part) || c.x1 > c.x2 {
				t.Fatalf("column from point %d lost an extreme", i)
			}
			i += c.n
		}
		if i != len(x) {
			t.Errorf("columns hold %d of %d points", i, len(x))
		}
	}
}

// A measure may hand over what a figure cannot show; drawing copes.
func TestOddData(t *testing.T) {
	nan, inf := math.NaN(), math.Inf(1)
	for name, f := range map[string]analyze.Figure{
		"nothing":      {},
		"no points":    {Series: []analyze.Series{{Name: "a", Kind: analyze.Line}}},
		"one point":    {Series: []analyze.Series{{Kind: analyze.Line, X: []float64{1}, Y: []float64{2}}}},
		"not finite":   {Series: []analyze.Series{{Kind: analyze.Line, X: []float64{1, nan, 3, 4}, Y: []float64{nan, 2, inf, 4}}}},
		"log of zero":  {X: analyze.Axis{Log: true}, Y: analyze.Axis{Log: true}, Series: []analyze.Series{{Kind: analyze.Line, X: []float64{0, -1, 10, 20}, Y: []float64{1, 1, 0, 5}}}},
		"flat":         {Series: []analyze.Series{{Kind: analyze.Line, X: []float64{1, 2, 3}, Y: []float64{5, 5, 5}}}},
		"huge":         {Series: []analyze.Series{{Kind: analyze.Line, X: []float64{1, 2, 3}, Y: []float64{1e300, -1e300, 0}}}},
		"tiny range":   {Series: []analyze.Series{{Kind: analyze.Line, X: []float64{1, 2, 3}, Y: []float64{1, 1 + 1e-15, 1}}}},
		"bars":         {Series: []analyze.Series{{Kind: analyze.Bars, X: []float64{1, 2}, Y: []float64{-1, 3}}}},
		"one bar":      {Series: []analyze.Series{{Kind: analyze.Bars, X: []float64{1}, Y: []float64{3}}}},
		"many bars":    {Series: []analyze.Series{{Kind: analyze.Bars, X: make([]float64, 5000), Y: make([]float64, 5000)}}},
		"short low":    {Series: []analyze.Series{{Kind: analyze.Envelope, X: []float64{1, 2}, Y: []float64{3, 4}, Low: []float64{1}}}},
		"unknown kind": {Series: []analyze.Series{{Kind: "swirl", X: []float64{1, 2}, Y: []float64{3, 4}}}},
		"ragged":       {Series: []analyze.Series{{Kind: analyze.Points, X: []float64{1, 2, 3}, Y: []float64{3}}}},
		"marks only":   {Marks: []analyze.Mark{{Kind: "tone", X: 1, Y: 2, Label: "x"}, {Kind: "odd", X: nan, Y: 1}}},
		"rules only":   {Rules: []analyze.Rule{{Label: "r", At: 1}, {Vertical: true, At: nan}}},
		"set range":    {X: analyze.Axis{Min: 5, Max: 6}, Series: []analyze.Series{{Kind: analyze.Line, X: []float64{1, 2}, Y: []float64{3, 4}}}},
	} {
		svg, _ := SVG(&f, "x", true)
		parse(t, svg)
		if bytes.Contains(svg, []byte("NaN")) {
			t.Errorf("%s: NaN in the drawing", name)
		}
		if Words(&f) == "" && name != "nothing" {
			t.Errorf("%s: no words", name)
		}
		CSV(&f)
	}
}

func TestHostileText(t *testing.T) {
	f := analyze.Figure{ID: sample.Hostile, Title: sample.Hostile, Caption: sample.Hostile,
		X: analyze.Axis{Label: sample.Hostile, Unit: sample.Hostile}, Y: analyze.Axis{Label: "y"},
		Series: []analyze.Series{{Name: sample.Hostile, Kind: analyze.Line, X: []float64{1, 2}, Y: []float64{1, 2}}, {Name: "b", Kind: analyze.Line, X: []float64{1, 2}, Y: []float64{2, 1}}},
		Marks:  []analyze.Mark{{Kind: sample.Hostile, X: 1.5, Y: 1.5, Label: sample.Hostile}}, Rules: []analyze.Rule{{Label: sample.Hostile, At: 1.2}}}
	svg, _ := SVG(&f, `a"b`, true)
	e := parse(t, svg)
	e.walk(func(x *element) {
		if x.XMLName.Local == "script" {
			t.Error("a script came through")
		}
	})
	r := stdcsv.NewReader(bytes.NewReader(CSV(&f)))
	rows, err := r.ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	for _, row := range rows {
		for _, c := range row {
			if _, err := strconv.ParseFloat(c, 64); err != nil && c != "" && strings.ContainsRune("=+-@", rune(c[0])) {
				t.Errorf("a spreadsheet would run %q", c)
			}
		}
	}
}

// The standard library's CSV reader gets back what the figure holds.
func TestCSV(t *testing.T) {
	f := analyze.Figure{X: analyze.Axis{Label: "frequency", Unit: "Hz"}, Y: analyze.Axis{Label: "level", Unit: "dBu"},
		Series: []analyze.Series{{Name: "out, left", Kind: analyze.Line, X: []float64{1.5, 1e-9}, Y: []float64{-3, 123456789}},
			{Name: "e", Kind: analyze.Envelope, X: []float64{2}, Y: []float64{4}, Low: []float64{1}}},
		Marks: []analyze.Mark{{Kind: "tone", X: 5, Y: 6, Label: "T"}}, Rules: []analyze.Rule{{Label: "limit", At: 7}, {Label: "edge", Vertical: true, At: 8}}}
	raw := CSV(&f)
	if bytes.Count(raw, []byte("\n")) != bytes.Count(raw, []byte("\r\n")) {
		t.Error("a line does not end in CR LF")
	}
	got, err := stdcsv.NewReader(bytes.NewReader(raw)).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	want := [][]string{{"part", "name", "frequency [Hz]", "level [dBu]", "low"}, {"line", "out, left", "1.5", "-3", ""},
		{"line", "out, left", "1e-09", "1.234568e+08", ""}, {"envelope", "e", "2", "4", "1"}, {"mark", "tone T", "5", "6", ""},
		{"rule", "limit", "", "7", ""}, {"rule", "edge", "8", "", ""}}
	if fmt.Sprint(got) != fmt.Sprint(want) {
		t.Errorf("got  %v\nwant %v", got, want)
	}
}

func labels(ticks []plot.Tick) string {
	var out []string
	for _, k := range ticks {
		if k.Label != "" {
			out = append(out, k.Label)
		}
	}
	return strings.Join(out, " ")
}

// 1-2-5 ticks on a logarithmic frequency axis: common practice, no source.
func TestTicks(t *testing.T) {
	for _, c := range []struct {
		ticker plot.Ticker
		lo, hi float64
		want   string
	}{
		{logTicks{}, 20, 20000, "20 50 100 200 500 1k 2k 5k 10k 20k"},
		{logTicks{}, 10, 48000, "10 20 50 100 200 500 1k 2k 5k 10k 20k"},
		{logTicks{}, 1, 1e8, "1 10 100 1k 10k 100k 1M 10M 100M"},
		{logTicks{}, 900, 1100, "900 950 1000 1050 1100"},
		{logTicks{}, 0.1, 2, "0.1 0.2 0.5 1 2"},
		{logTicks{}, 0, 10, ""},
		{logTicks{}, -5, 10, ""},
		{linearTicks{}, 0, 1, "0 0.2 0.4 0.6 0.8 1.0"},
		{linearTicks{}, -1.5, 0.6, "-1.5 -1.0 -0.5 0 0.5"},
		{linearTicks{}, 0, 34, "0 5 10 15 20 25 30"},
		{linearTicks{}, -150, 5, "-150 -100 -50 0"},
		{linearTicks{degrees: true}, 0, 360, "0 45 90 135 180 225 270 315 360"},
		{linearTicks{degrees: true}, -180, 180, "-180 -135 -90 -45 0 45 90 135 180"},
		{linearTicks{}, 1, 1, ""},
		{linearTicks{}, math.NaN(), 1, ""},
	} {
		if got := labels(c.ticker.Ticks(c.lo, c.hi)); got != c.want {
			t.Errorf("%T %v .. %v: %q, want %q", c.ticker, c.lo, c.hi, got, c.want)
		}
	}
}

// Linear axes take the prefix that suits their values.
func TestAxisUnits(t *testing.T) {
	f := analyze.Figure{X: analyze.Axis{Label: "time", Unit: "s"}, Y: analyze.Axis{Label: "voltage", Unit: "V"},
		Series: []analyze.Series{{Kind: analyze.Line, X: []float64{0, 0.004}, Y: []float64{0, 3e-6}}}}
	svg, _ := SVG(&f, "x", false)
	words := texts(parse(t, svg))
	for _, want := range []string{"time, ms", "voltage, µV"} {
		if !slices.Contains(words, want) {
			t.Errorf("no %q in %q", want, words)
		}
	}
}

func TestWords(t *testing.T) {
	f := analyze.Figure{Title: "Spectrum of take a", X: analyze.Axis{Label: "frequency", Unit: "Hz", Log: true}, Y: analyze.Axis{Label: "level", Unit: "dBu"},
		Series: []analyze.Series{{Name: "out", Kind: analyze.Line, X: []float64{20, 1000}, Y: []float64{-120, 4}}},
		Marks:  []analyze.Mark{{Kind: "harmonic", X: 2000, Y: -80, Label: "H2"}}, Rules: []analyze.Rule{{Label: "band edge", Vertical: true, At: 20000}}}
	want := "Spectrum of take a. Level in dBu against frequency in Hz (logarithmic). Curve out: 2 points from 20.00 Hz to 1.000 kHz, " +
		"between -120.00 dBu and 4.00 dBu, largest at 1.000 kHz. Marked: harmonic H2 at 2.000 kHz, -80.00 dBu. Line across at 20.00 kHz (band edge)."
	if got := Words(&f); got != want {
		t.Errorf("got  %s\nwant %s", got, want)
	}
}

// A picture is quick even for a curve as long as a take, and says something.
func TestPNG(t *testing.T) {
	for _, f := range figures(t) {
		raw, err := PNG(&f, 96)
		if err != nil {
			t.Fatal(err)
		}
		img, err := png.Decode(bytes.NewReader(raw))
		if err != nil {
			t.Fatal(err)
		}
		dark := 0
		for y := range img.Bounds().Dy() {
			for x := range img.Bounds().Dx() {
				if r, _, _, _ := img.At(x, y).RGBA(); r < 0x8000 {
					dark++
				}
			}
		}
		if n := img.Bounds().Dx() * img.Bounds().Dy(); dark < n/200 || dark > n*2/3 || len(raw) > 300_000 {
			t.Errorf("%s: %d of %d pixels dark, %d bytes", f.ID, dark, n, len(raw))
		}
	}
}

func BenchmarkPNG(b *testing.B) {
	for _, c := range sample.Slip().Checks {
		for _, f := range c.Figures {
			if f.ID == "timeline" {
				for b.Loop() {
					if _, err := PNG(&f, 96); err != nil {
						b.Fatal(err)
					}
				}
			}
		}
	}
}

func BenchmarkSpectrum(b *testing.B) {
	for _, c := range sample.Slip().Checks {
		for _, f := range c.Figures {
			if f.ID == "spectrum" {
				for b.Loop() {
					svg, _ := SVG(&f, "x", true)
					io.Discard.Write(svg)
				}
				return
			}
		}
	}
}
