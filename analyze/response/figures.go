package response

import (
	"fmt"

	"benchslip/analyze"
	"benchslip/analyze/internal/transfer"
)

func frame(c *transfer.Curve, what string) analyze.Figure {
	return analyze.Figure{
		ID:    fmt.Sprintf("%s-%s-ch%d", what, c.Out.Take.Name, c.Out.Channel()),
		Title: fmt.Sprintf("Response of take %s, channel %d: %s", c.Out.Take.Name, c.Out.Channel(), what),
		X:     analyze.Axis{Label: "frequency", Unit: "Hz", Log: true},
	}
}

// series of what the points that count say: a line where the stimulus filled
// the band, marks joined by a line for tones.
func series(c *transfer.Curve, name string, y func(transfer.Point) float64) []analyze.Series {
	s := analyze.Series{Name: name, Kind: analyze.Line}
	for _, q := range c.Used() {
		s.X = append(s.X, q.Hz)
		s.Y = append(s.Y, y(q))
	}
	if c.Dense {
		return []analyze.Series{s}
	}
	marks := s
	marks.Kind, marks.Name = analyze.Points, name+", tones"
	return []analyze.Series{s, marks}
}

func source(c *transfer.Curve) string {
	if c.Dense {
		return fmt.Sprintf("from a %s, %d points an octave", c.Kind, 24)
	}
	return fmt.Sprintf("from a take of %s", c.Kind)
}

func gainFigure(c *transfer.Curve, ref transfer.Point) analyze.Figure {
	f := frame(c, "gain")
	f.Caption = fmt.Sprintf("gain relative to %.5g Hz, %s", ref.Hz, source(c))
	f.Y = analyze.Axis{Label: "gain", Unit: "dB"}
	f.Series = series(c, "gain", func(q transfer.Point) float64 { return level(q.H) - level(ref.H) })
	return f
}

func phaseFigure(c *transfer.Curve) analyze.Figure {
	f := frame(c, "phase")
	f.Caption = fmt.Sprintf("phase of output against input after a common delay of %.6g us was removed, %s", c.DelayS*1e6, source(c))
	f.Y = analyze.Axis{Label: "phase", Unit: "deg"}
	f.Series = series(c, "phase", c.PhaseDeg)
	return f
}
