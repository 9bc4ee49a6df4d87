package transfer

import (
	"fmt"

	"benchslip/analyze"
	"benchslip/capture/recording"
	"benchslip/capture/recording/memory"
	"benchslip/capture/stimulus"
)

// reference is the stated stimulus as samples.
type reference struct {
	x     []float64
	rate  float64
	words string
}

// signalOf wraps samples as a signal of a take of their own.
func signalOf(name string, x []float64, rate float64) *analyze.Signal {
	t := &analyze.Take{Name: name, Rec: memory.New(recording.Audio, rate, x)}
	return analyze.NewSignal(t, 1, 0, 0, int64(len(x)), 1)
}

// referenceOf makes the samples of the stated stimulus: of its description,
// or of the first channel of its file.
func referenceOf(t *analyze.Take) (reference, *analyze.Refusal) {
	refuse := func(code, text string) (reference, *analyze.Refusal) {
		return reference{}, &analyze.Refusal{Code: code, Text: fmt.Sprintf("take %q: its stimulus %s", t.Name, text), Advice: "correct `stimulus`, or record the stimulus on a second channel and name it with `in`"}
	}
	if t.PlayedFault != nil {
		return reference{}, t.PlayedFault
	}
	if t.PlayedRec != nil {
		in := t.PlayedRec.Info()
		if in.RateHz <= 0 || in.Frames == 0 {
			return refuse(analyze.Unreadable, fmt.Sprintf("%q holds no samples with a rate", t.Stimulus))
		}
		if in.Frames > mostSamples {
			return refuse(analyze.Unsupported, fmt.Sprintf("%q is longer than %d samples", t.Stimulus, mostSamples))
		}
		all, err := recording.ReadAll(t.PlayedRec, 0)
		if err != nil {
			return refuse(analyze.Unreadable, fmt.Sprintf("%q: %v", t.Stimulus, err))
		}
		return reference{all[0], in.RateHz, t.Stimulus}, nil
	}
	s, err := stimulus.Parse(t.Stimulus)
	if err != nil {
		return refuse(analyze.Unreadable, fmt.Sprintf("cannot be made: %v", err))
	}
	if s.Frames() > mostSamples {
		return refuse(analyze.Unsupported, fmt.Sprintf("is longer than %d samples", mostSamples))
	}
	g, err := stimulus.New(s)
	if err != nil {
		return refuse(analyze.Unreadable, fmt.Sprintf("cannot be made: %v", err))
	}
	x := make([]float64, s.Frames())
	g.Next(x)
	return reference{x, float64(s.RateHz), t.Stimulus}, nil
}
