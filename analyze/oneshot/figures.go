package oneshot

import (
	"fmt"
	"math"

	"benchslip/analyze"
)

// columns of data that a figure keeps.
const columns = 1200

// trace is the samples from a to b as a curve, or as the envelope a column
// where they are many.
func trace(s *analyze.Signal, x []float64, a, b int) (analyze.Series, string) {
	a, b = max(a, 0), min(b, len(x))
	if n := b - a; n > 2*columns {
		w := analyze.Series{Name: "waveform", Kind: analyze.Envelope}
		for c := range columns {
			i, k := a+c*n/columns, a+(c+1)*n/columns
			lo, hi := math.Inf(1), math.Inf(-1)
			for _, v := range x[i:k] {
				lo, hi = math.Min(lo, v), math.Max(hi, v)
			}
			w.X = append(w.X, timeOf(s, float64(i+k-1)/2))
			w.Low = append(w.Low, lo)
			w.Y = append(w.Y, hi)
		}
		return w, "; drawn as the smallest to largest sample a column"
	}
	w := analyze.Series{Name: "waveform", Kind: analyze.Line}
	for i := a; i < b; i++ {
		w.X = append(w.X, timeOf(s, float64(i)))
		w.Y = append(w.Y, x[i])
	}
	return w, ""
}

func voltageAxis(s *analyze.Signal) analyze.Axis {
	if s.Unit == "FS" {
		return analyze.Axis{Label: "fraction of full scale", Unit: "FS"}
	}
	return analyze.Axis{Label: "voltage", Unit: s.Unit}
}

// figure shows the edge with its levels and crossings.
func (e *edge) figure() analyze.Figure {
	long := e.last - e.first
	a, b := max(e.jump.from, e.first-max(2*long, 8)), min(e.jump.to, e.last+max(4*long, 16))
	w, how := trace(e.s, e.x, a, b)
	f := analyze.Figure{
		ID:      fmt.Sprintf("edge-%s-ch%d-%d", e.s.Take.Name, e.s.Channel(), e.jump.at),
		Title:   fmt.Sprintf("Edge at %.6g s of take %s, channel %d", timeOf(e.s, e.t50.at), e.s.Take.Name, e.s.Channel()),
		Caption: fmt.Sprintf("the levels are the histogram's modes; one sample every %.4g s%s", 1/e.s.RateHz, how),
		X:       analyze.Axis{Label: "time", Unit: "s"}, Y: voltageAxis(e.s),
		Series: []analyze.Series{w},
		Rules:  []analyze.Rule{{Label: "before", At: e.jump.before.v}, {Label: "after", At: e.jump.after.v}},
	}
	for _, m := range []struct {
		at    instant
		level float64
	}{{e.t10, 0.1}, {e.t50, 0.5}, {e.t90, 0.9}} {
		f.Marks = append(f.Marks, analyze.Mark{Kind: "line", X: timeOf(e.s, m.at.at), Y: e.level(m.level), Label: fmt.Sprintf("%g %%", 100*m.level)})
	}
	return f
}

// figureOver is the figure drawn on to sample b at least.
func (e *edge) figureOver(b int) analyze.Figure {
	f := e.figure()
	long := e.last - e.first
	w, how := trace(e.s, e.x, max(e.jump.from, e.first-max(2*long, 8)), min(max(b, e.last+max(4*long, 16)), e.jump.to))
	f.Series[0] = w
	f.Caption = fmt.Sprintf("the levels are the histogram's modes; one sample every %.4g s%s", 1/e.s.RateHz, how)
	return f
}
