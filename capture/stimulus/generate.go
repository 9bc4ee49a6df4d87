package stimulus

import (
	"fmt"

	"benchslip/capture/wav"
)

// Generator makes the samples of the first channel block by block, without
// dither, in FS. It is for one goroutine.
type Generator struct {
	stretches  []stretch
	at, frames int64
}

// New prepares the samples of a stimulus.
func New(s Spec) (*Generator, error) {
	if err := s.Check(); err != nil {
		return nil, err
	}
	return &Generator{stretches: s.stretches(), frames: s.Frames()}, nil
}

// Next fills dst with the next samples and returns how many; fewer than
// len(dst) only at the end, then 0. The samples do not depend on the sizes of
// the blocks.
func (g *Generator) Next(dst []float64) int {
	n := min(int64(len(dst)), g.frames-g.at)
	dst = dst[:n]
	clear(dst)
	for _, st := range g.stretches {
		lo, hi := max(st.begin(), g.at), min(st.end(), g.at+n)
		if lo >= hi {
			continue
		}
		part := dst[lo-g.at : hi-g.at]
		st.sig.fill(part, lo-st.start)
		st.fade(part, lo-st.start)
	}
	g.at += n
	return int(n)
}

// fade weighs the samples of frames n, n+1, ... (0: first at full level) with
// half a raised cosine on either side of the full level.
func (st stretch) fade(x []float64, n int64) {
	for i := range x {
		switch k := n + int64(i); {
		case k < 0:
			x[i] *= raised((float64(k+st.fadeIn) + 0.5) / float64(2*st.fadeIn))
		case k >= st.steady:
			x[i] *= raised((float64(st.steady+st.fadeOut-k) - 0.5) / float64(2*st.fadeOut))
		}
	}
}

// blockFrames is the size of the blocks that Write makes.
const blockFrames = 1 << 14

// Write makes the stimulus as a WAV file at path, replacing one that is
// there. Integer samples are dithered (see wav.Format), seeded by the
// description, so the same description gives the same bytes. The complete
// description stands in the comment field.
func Write(path string, s Spec) error {
	g, err := New(s)
	if err != nil {
		return err
	}
	format := wav.Format{RateHz: s.RateHz, Channels: s.Channels(), Bits: s.Bits, Float: s.Bits == 32, Dither: s.Bits != 32, Seed: s.Seed}
	w, err := wav.Create(path, format, map[string]string{"ICMT": mark + s.String()})
	if err != nil {
		return err
	}
	defer w.Discard()
	block := make([][]float64, format.Channels)
	for c := range block {
		block[c] = make([]float64, blockFrames)
	}
	part := make([][]float64, format.Channels)
	for {
		n := g.Next(block[0])
		if n == 0 {
			return w.Close()
		}
		if len(block) > 1 {
			second(s.Second, block[1][:n], block[0])
		}
		for c := range block {
			part[c] = block[c][:n]
		}
		if err := w.WriteBlock(part); err != nil {
			return fmt.Errorf("stimulus: %w", err)
		}
	}
}

// second fills the second channel from the first.
func second(what string, dst, first []float64) {
	for i := range dst {
		switch what {
		case SecondSame:
			dst[i] = first[i]
		case SecondInverted:
			dst[i] = -first[i]
		}
	}
}
