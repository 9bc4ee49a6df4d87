package stage

import (
	"fmt"
	"math"

	"benchslip/analyze"
)

// figurePoints is how many columns of data a figure of a long record keeps.
const figurePoints = 1200

// SpectrumFigure shows a signal's lines as RMS over frequency, tone,
// harmonics, mains and other lines marked. Figures with one ID are the same.
func SpectrumFigure(p *analyze.Pass, l *Lines) analyze.Figure {
	s := l.Sig
	v := SurveyOf(p, s)
	fig := analyze.Figure{
		ID:    fmt.Sprintf("spectrum-%s-ch%d", s.Take.Name, s.Channel()),
		Title: fmt.Sprintf("Spectrum of take %s, channel %d", s.Take.Name, s.Channel()),
		Caption: fmt.Sprintf("RMS a line, Blackman-Harris window, resolution bandwidth %.3g Hz, %d averages; columns show the largest value in them",
			v.RBW(), v.Segments),
		X: analyze.Axis{Label: "frequency", Unit: "Hz", Log: true},
		Y: analyze.Axis{Label: "level", Unit: levelUnit(s)},
	}
	low := math.Max(4*v.StepHz, 1)
	top := s.RateHz / 2
	ratio := math.Pow(top/low, 1.0/figurePoints)
	series := analyze.Series{Name: "spectrum", Kind: analyze.Line}
	peak := math.Inf(-1)
	for f := low; f < top; f *= ratio {
		a, b := int(math.Ceil(f/v.StepHz)), int(math.Ceil(f*ratio/v.StepHz))
		if b <= a {
			continue
		}
		max, at := 0.0, a
		for k := a; k < b && k < len(v.S); k++ {
			if v.S[k] > max {
				max, at = v.S[k], k
			}
		}
		if max <= 0 {
			continue
		}
		db := levelOf(s, math.Sqrt(max*v.RBW()))
		series.X = append(series.X, float64(at)*v.StepHz)
		series.Y = append(series.Y, db)
		peak = math.Max(peak, db)
	}
	fig.Series = []analyze.Series{series}
	mark := func(kind, label string, q Line) {
		if q.Power > 0 && q.Power > 4*q.U && q.Hz >= low {
			fig.Marks = append(fig.Marks, analyze.Mark{Kind: kind, X: q.Hz, Y: levelOf(s, q.RMS()), Label: label})
		}
	}
	for _, q := range l.Harm {
		if q.Order == 1 {
			mark("tone", fmt.Sprintf("%.4g Hz", q.Hz), q)
		} else {
			mark("harmonic", fmt.Sprintf("H%d", q.Order), q)
		}
	}
	for i, q := range l.Mains {
		if i < 10 {
			mark("mains", fmt.Sprintf("%.3g Hz", q.Hz), q)
		}
	}
	for _, q := range l.Others {
		mark("line", fmt.Sprintf("%.4g Hz", q.Hz), q)
	}
	return fig
}

// WaveformFigure shows up to seconds of a signal from its start; columns that
// hold several samples show their envelope.
func WaveformFigure(s *analyze.Signal, seconds float64) analyze.Figure {
	n := min(s.Len(), int(seconds*s.RateHz)+1)
	y := make([]float64, n)
	y = y[:s.Read(y, 0)]
	fig := analyze.Figure{
		ID:      fmt.Sprintf("waveform-%s-ch%d", s.Take.Name, s.Channel()),
		Title:   fmt.Sprintf("Waveform of take %s, channel %d", s.Take.Name, s.Channel()),
		Caption: fmt.Sprintf("the first %.3g s of %.4g s", float64(n)/s.RateHz, s.DurationS()),
		X:       analyze.Axis{Label: "time", Unit: "s"},
		Y:       analyze.Axis{Label: "voltage", Unit: s.Unit},
	}
	if s.Unit == "FS" {
		fig.Y.Label = "fraction of full scale"
	}
	series := analyze.Series{Name: "waveform", Kind: analyze.Line}
	at := func(i int) float64 { return s.StartS + float64(i)/s.RateHz }
	if len(y) <= 2*figurePoints {
		for i, v := range y {
			series.X = append(series.X, at(i))
			series.Y = append(series.Y, v)
		}
	} else {
		series.Kind = analyze.Envelope
		for c := 0; c < figurePoints; c++ {
			a, b := c*len(y)/figurePoints, (c+1)*len(y)/figurePoints
			lo, hi := y[a], y[a]
			for _, v := range y[a:b] {
				lo, hi = math.Min(lo, v), math.Max(hi, v)
			}
			series.X = append(series.X, at(a))
			series.Low = append(series.Low, lo)
			series.Y = append(series.Y, hi)
		}
	}
	fig.Series = []analyze.Series{series}
	return fig
}

// ToneWaveform shows about four periods of a tone.
func ToneWaveform(s *analyze.Signal, hz float64) analyze.Figure {
	f := WaveformFigure(s, 4/hz)
	return f
}

func levelUnit(s *analyze.Signal) string {
	if s.Unit == "FS" {
		return "dBFS"
	}
	return "dBV"
}

// levelOf is an RMS in dBV or dBFS (against a full-scale sine).
func levelOf(s *analyze.Signal, rms float64) float64 {
	if s.Unit == "FS" {
		rms *= math.Sqrt2
	}
	return 20 * math.Log10(math.Max(rms, 1e-30))
}
