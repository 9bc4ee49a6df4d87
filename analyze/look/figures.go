package look

import (
	"fmt"

	"benchslip/analyze"
	"benchslip/analyze/stage"
)

// Longest stretch that a waveform shows, s, and most channels with figures.
const (
	mostSeconds  = 60
	mostChannels = 8
)

// figures are waveform and spectrum of one channel.
func figures(p *analyze.Pass, s *analyze.Signal, lines bool) []analyze.Figure {
	wave := stage.WaveformFigure(s, min(s.DurationS(), mostSeconds))
	wave.ID = fmt.Sprintf("waveform-%d", s.Channel())
	out := []analyze.Figure{wave}
	if lines {
		tone, _ := stage.FindTone(p, 0, s)
		spectrum := stage.SpectrumFigure(p, stage.Decompose(p, s, stage.Options{Tone: tone}))
		spectrum.ID = fmt.Sprintf("spectrum-%d", s.Channel())
		out = append(out, spectrum)
	}
	return out
}
