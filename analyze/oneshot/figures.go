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

// envelopeFigure shows the amplitude of an oscillation over time.
func (w *swing) envelopeFigure(s *analyze.Signal) analyze.Figure {
	f := analyze.Figure{
		ID:      fmt.Sprintf("oscillation-%s-ch%d", s.Take.Name, s.Channel()),
		Title:   fmt.Sprintf("Oscillation at %.4g Hz in take %s, channel %d", w.hz, s.Take.Name, s.Channel()),
		Caption: "amplitude (peak) at that frequency over time; it counts while it is over half of its maximum",
		X:       analyze.Axis{Label: "time", Unit: "s"}, Y: voltageAxis(s),
	}
	line := analyze.Series{Name: "envelope", Kind: analyze.Line}
	top := 0.0
	n := len(w.env)
	for c := range min(columns, n) {
		a, b := c*n/min(columns, n), (c+1)*n/min(columns, n)
		most := 0.0
		for _, v := range w.env[a:b] {
			most = math.Max(most, v)
		}
		line.X = append(line.X, timeOf(s, float64(a+b-1)/2))
		line.Y = append(line.Y, most)
		top = math.Max(top, most)
	}
	f.Series = []analyze.Series{line}
	f.Rules = []analyze.Rule{{Label: "half of the maximum", At: top / 2}}
	for i, t := range w.stays {
		if i == 8 {
			break
		}
		f.Marks = append(f.Marks,
			analyze.Mark{Kind: "event", X: timeOf(s, t.from), Y: top / 2, Label: "starts"},
			analyze.Mark{Kind: "event", X: timeOf(s, math.Min(t.to, float64(n))), Y: top / 2, Label: "stops"})
	}
	return f
}

// spectrumFigure shows the mean spectrum in the frames that show an
// oscillation best, and the floor it stands on.
func (w *swing) spectrumFigure(s *analyze.Signal) analyze.Figure {
	l := w.look
	f := analyze.Figure{
		ID:    fmt.Sprintf("hunt-%s-ch%d", s.Take.Name, s.Channel()),
		Title: fmt.Sprintf("Spectrum of take %s, channel %d", s.Take.Name, s.Channel()),
		Caption: fmt.Sprintf("RMS a line, mean of %d frames of %.3g s, Blackman-Harris window, resolution bandwidth %.3g Hz; columns show the largest value in them",
			l.count, float64(l.m)/s.RateHz, 2.0044*l.stepK),
		X: analyze.Axis{Label: "frequency", Unit: "Hz", Log: true},
		Y: analyze.Axis{Label: "level", Unit: "dBV"},
	}
	scale := 1.0
	if s.Unit == "FS" {
		f.Y.Unit, scale = "dBFS", math.Sqrt2
	}
	dB := func(density float64) float64 {
		return 20 * math.Log10(math.Max(scale*math.Sqrt(density*2.0044*l.stepK), 1e-30))
	}
	line, floor := analyze.Series{Name: "spectrum", Kind: analyze.Line}, analyze.Series{Name: "floor", Kind: analyze.Line}
	ratio := math.Pow(float64(l.m)/2/lobe, 1.0/columns)
	for k := float64(lobe); k < float64(l.m/2); k *= ratio {
		a, b := int(math.Ceil(k)), int(math.Ceil(k*ratio))
		best := a
		for i := a; i < b && i < len(l.mean); i++ {
			if l.mean[i] > l.mean[best] {
				best = i
			}
		}
		if b <= a || best >= len(l.mean) || l.mean[best] <= 0 {
			continue
		}
		hz := float64(best) * l.stepK
		line.X, line.Y = append(line.X, hz), append(line.Y, dB(l.mean[best]))
		if l.floor[best] > 0 {
			floor.X, floor.Y = append(floor.X, hz), append(floor.Y, dB(l.floor[best]))
		}
	}
	f.Series = []analyze.Series{line, floor}
	if w.hz > 0 {
		k := min(int(w.hz/l.stepK+0.5), len(l.mean)-1)
		f.Marks = []analyze.Mark{{Kind: "line", X: w.hz, Y: dB(l.mean[k]), Label: fmt.Sprintf("%.4g Hz", w.hz)}}
	}
	if w.band != nil {
		f.Rules = []analyze.Rule{{Label: "band", Vertical: true, At: w.band[0]}, {Label: "band", Vertical: true, At: w.band[1]}}
	}
	return f
}
