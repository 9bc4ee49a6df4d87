// Package look says what a recording holds, before any gear or job: its
// format, the levels of each channel, what is wrong with it, its strongest
// lines, and one plain sentence a channel.
package look

import (
	"context"
	"math"

	"benchslip/analyze"
	"benchslip/analyze/intake"
	"benchslip/analyze/slip"
	"benchslip/analyze/stage"
	"benchslip/capture"
)

// File is what was found in one recording: the keys of a take in slip.json,
// and what each channel holds.
type File struct {
	slip.Take
	Levels []Level `json:"levels"`

	Figures []analyze.Figure `json:"-"` // waveform and spectrum a channel, when asked for
}

// Level holds one channel's levels over all frames, in the file's own unit:
// "FS" (fractions of digital full scale), "V", or "" when the file does not
// say. A level is null where the channel holds no value at all.
type Level struct {
	Channel int      `json:"channel"` // from 1
	Name    string   `json:"name"`    // CSV column, "" for WAV
	Unit    string   `json:"unit"`
	Mean    *float64 `json:"mean"`
	RMS     *float64 `json:"rms"` // the mean included
	Min     *float64 `json:"min"`
	Max     *float64 `json:"max"`
	Peak    *float64 `json:"peak"`  // largest |sample|
	Crest   *float64 `json:"crest"` // largest |sample - mean| over the RMS about the mean, a ratio
	Lines   []Line   `json:"lines"` // the strongest first
	Text    string   `json:"text"`  // one sentence
}

// Line is a sinusoid that stands out of the noise.
type Line struct {
	FrequencyHz float64 `json:"frequency_hz"`
	RMS         float64 `json:"rms"` // in the channel's unit
}

// mostLines is how many lines a channel lists.
const mostLines = 8

// Open looks at the recording at path, calling it name, and makes figures of
// its first channels when asked to. A fault of the file is a *analyze.Refusal;
// the error is that of ctx.
func Open(ctx context.Context, name, path string, csv capture.Options, draw bool) (*File, *analyze.Refusal, error) {
	t := &analyze.Take{Name: name, File: name, Path: path, CSV: csv}
	if err := intake.Open(ctx, t); err != nil || t.Fault != nil {
		return nil, t.Fault, err
	}
	defer t.Rec.Close()
	f := &File{Take: intake.Entry(t)}
	in := t.Rec.Info()
	pass := &analyze.Pass{Stages: analyze.NewStages()}
	for i, l := range t.Health.Levels {
		if err := ctx.Err(); err != nil {
			return nil, nil, err
		}
		c := in.Channels[i]
		level := Level{
			Channel: i + 1, Name: c.Name, Unit: c.Unit,
			Mean: finite(l.Mean), RMS: finite(l.RMS), Min: finite(l.Min), Max: finite(l.Max),
			Peak: finite(l.Peak), Crest: finite(l.Crest), Lines: []Line{},
		}
		whole := in.RateHz > 0 && in.Frames > 0 && l.Count == in.Frames // no sample is missing
		lines := whole && in.Frames >= leastFrames && l.AC > 0
		var seen *stage.Survey
		if lines {
			seen = stage.SurveyOf(pass, analyze.NewSignal(t, i+1, 0, 0, in.Frames, 1))
			for _, p := range seen.Peaks {
				// What stands at the foot of DC is no line.
				if p.Hz > seen.Lobe*seen.StepHz && len(level.Lines) < mostLines {
					level.Lines = append(level.Lines, Line{p.Hz, math.Sqrt(p.Power)})
				}
			}
		}
		if draw && whole && i < mostChannels {
			f.Figures = append(f.Figures, figures(pass, analyze.NewSignal(t, i+1, 0, 0, in.Frames, 1), lines)...)
		}
		level.Text = sentence(t, i, seen)
		f.Levels = append(f.Levels, level)
	}
	return f, nil, nil
}

// leastFrames is the shortest recording in which lines are looked for.
const leastFrames = 64

func finite(x float64) *float64 {
	if math.IsNaN(x) || math.IsInf(x, 0) {
		return nil
	}
	return &x
}
