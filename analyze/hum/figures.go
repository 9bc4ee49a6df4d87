package hum

import (
	"fmt"
	"math"

	"benchslip/analyze"
	"benchslip/analyze/stage"
)

// combFigure shows the orders as bars beside what noise alone may reach.
func combFigure(r *reading, c comb) analyze.Figure {
	s := r.Sig
	fig := analyze.Figure{
		ID:      fmt.Sprintf("comb-%s-ch%d", s.Take.Name, s.Channel()),
		Title:   fmt.Sprintf("Mains harmonics of take %s, channel %d", s.Take.Name, s.Channel()),
		Caption: fmt.Sprintf("RMS of each order of %.4f Hz, noise share removed; the line is the RMS that noise alone may reach", r.hz),
		X:       analyze.Axis{Label: "order", Unit: ""},
		Y:       analyze.Axis{Label: "RMS", Unit: s.Unit, Log: true},
	}
	bars := analyze.Series{Name: "harmonic", Kind: analyze.Bars}
	floor := analyze.Series{Name: "detection threshold", Kind: analyze.Line}
	for _, q := range c.lines {
		if q.Dropped {
			continue
		}
		if t := stage.MainsThreshold(r.Lines, q, len(c.lines)); t > 0 {
			floor.X = append(floor.X, float64(q.Order))
			floor.Y = append(floor.Y, t)
		}
		if stage.MainsDetected(r.Lines, q, len(c.lines)) && q.RMS() > 0 {
			bars.X = append(bars.X, float64(q.Order))
			bars.Y = append(bars.Y, q.RMS())
		}
	}
	fig.Series = []analyze.Series{bars, floor}
	return fig
}

// foldBins is how many points a mains period is drawn with.
const foldBins = 240

// foldedFigure shows the waveform folded on the mains period, tone and other
// lines taken off.
func foldedFigure(r *reading) analyze.Figure {
	s := r.Sig
	f := stage.FoldMains(r.Lines, foldBins)
	fig := analyze.Figure{
		ID:      fmt.Sprintf("folded-%s-ch%d", s.Take.Name, s.Channel()),
		Title:   fmt.Sprintf("Waveform of take %s, channel %d, folded on the mains period", s.Take.Name, s.Channel()),
		Caption: fmt.Sprintf("mean of %d periods about the middle of the take, two periods drawn; DC, test tone and other lines taken off; the first rising zero of the fundamental is 0", f.Periods),
		X:       analyze.Axis{Label: "mains phase", Unit: "deg", Min: 0, Max: 720},
		Y:       analyze.Axis{Label: "voltage", Unit: s.Unit},
	}
	if s.Unit == "FS" {
		fig.Y.Label = "fraction of full scale"
	}
	line := analyze.Series{Name: "mean", Kind: analyze.Line}
	for turn := 0; turn < 2; turn++ {
		for i, v := range f.Mean {
			line.X = append(line.X, 360*(float64(turn)+(float64(i)+0.5)/float64(len(f.Mean))))
			line.Y = append(line.Y, v)
		}
	}
	fig.Series = []analyze.Series{line}
	return fig
}

// frequencyFigure shows the mains frequency over time.
func frequencyFigure(r *reading) analyze.Figure {
	l := r.Lines
	where := ""
	if r.supply != nil {
		l = r.supply.Lines
		where = ", from the mains reference"
	}
	s := l.Sig
	at, hz := overTime(l)
	fig := analyze.Figure{
		ID:      fmt.Sprintf("mains-frequency-%s-ch%d", s.Take.Name, s.Channel()),
		Title:   fmt.Sprintf("Mains frequency during take %s%s", s.Take.Name, where),
		Caption: fmt.Sprintf("one reading each %.2g s; mean %.4f Hz; the recorder's clock is taken as right", s.DurationS()/float64(max(len(at), 1)), r.hz),
		X:       analyze.Axis{Label: "time", Unit: "s"},
		Y:       analyze.Axis{Label: "frequency", Unit: "Hz"},
		Series:  []analyze.Series{{Name: "mains frequency", Kind: analyze.Line, X: at, Y: hz}},
		Rules:   []analyze.Rule{{Label: "mean", At: r.hz}},
	}
	low, high := math.Inf(1), math.Inf(-1)
	for _, v := range hz {
		low, high = math.Min(low, v), math.Max(high, v)
	}
	if high-low < 0.02 { // a steady supply looks steady
		fig.Y.Min, fig.Y.Max = r.hz-0.01, r.hz+0.01
	}
	return fig
}
