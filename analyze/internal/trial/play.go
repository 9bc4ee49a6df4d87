package trial

import (
	"benchslip/analyze/internal/spectrum"
	"benchslip/capture/stimulus"
)

// Played makes the samples of a stimulus from its description.
func Played(text string) *Signal {
	s, err := stimulus.Parse(text)
	if err != nil {
		panic(err)
	}
	g, err := stimulus.New(s)
	if err != nil {
		panic(err)
	}
	x := make([]float64, s.Frames())
	g.Next(x)
	return &Signal{float64(s.RateHz), x}
}

// Through is s behind a circuit of response h(f), exact at every line of a
// transform that is padded with zeros to twice the length.
func (s *Signal) Through(h func(hz float64) complex128) *Signal {
	n := spectrum.FastLengthUp(2 * len(s.X))
	w := spectrum.NewWhole(n)
	X := w.Forward(s.X)
	for k := range X {
		X[k] *= h(float64(k) * s.Rate / float64(n))
	}
	X[n/2] = complex(real(X[n/2]), 0)
	return &Signal{s.Rate, w.Back(X)[:len(s.X)]}
}

// Copy is s once more.
func (s *Signal) Copy() *Signal { return &Signal{s.Rate, append([]float64(nil), s.X...)} }
