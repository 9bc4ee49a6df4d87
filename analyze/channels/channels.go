// Package channels compares channels of one unit: how much of one arrives in
// another (crosstalk), and how far their gains differ (balance).
package channels

import (
	"fmt"
	"math"
	"math/cmplx"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
	"benchslip/analyze/internal/transfer"
	"benchslip/analyze/stage"
	"benchslip/capture/recording"
	"benchslip/capture/unit"
)

var dB = unit.MustLookup("dB")

// Measures lists the measures of this package.
func Measures() []*analyze.Measure { return []*analyze.Measure{crosstalk, balance} }

// copied refuses two channels that hold the same samples: a recorder or a
// program in mono has copied one of them, and a copy says nothing of the
// other channel.
func copied(t *analyze.Take, what string, a, b *analyze.Signal) *analyze.Refusal {
	if !equal(a, b) {
		return nil
	}
	return &analyze.Refusal{Code: analyze.UnfitTake,
		Text:   fmt.Sprintf("%s: take %q, channels %d and %d hold the same samples, so their %s says nothing of the unit", recording.IdenticalChannels, t.Name, a.Channel(), b.Channel(), what),
		Advice: "switch the recorder and the program to stereo, without copying a channel, and record again"}
}

// equal compares two signals sample by sample, up to their scales.
func equal(a, b *analyze.Signal) bool {
	if a.Len() != b.Len() {
		return false
	}
	x, y := make([]float64, 1<<14), make([]float64, 1<<14)
	sa, sb := a.Scale(), b.Scale()
	for at := 0; at < a.Len(); {
		n := a.Read(x, at)
		m := b.Read(y, at)
		if n == 0 || n != m {
			return false
		}
		for i := range x[:n] {
			if math.Abs(x[i]/sa-y[i]/sb) > 1e-12*math.Abs(x[i]/sa) {
				return false
			}
		}
		at += n
	}
	return true
}

// curveAt is the quotient num/den at the frequency asked for, when den holds a
// stimulus of many frequencies: a sweep, steps, a multitone, noise. ok is
// false for a single tone, and where no frequency is asked for.
func curveAt(p *analyze.Pass, num, den *analyze.Signal) (c *transfer.Curve, q transfer.Point, ok bool, bad *analyze.Refusal) {
	if len(p.Params.At) == 0 {
		return nil, q, false, nil
	}
	switch transfer.ShapeOf(p, den).Kind {
	case transfer.Steps, transfer.Sweep, transfer.Multitone:
	default:
		return nil, q, false, nil
	}
	if c, bad = transfer.Between(p, num, den); bad != nil {
		return nil, q, true, bad
	}
	q, bad = c.At(p.Params.At[0])
	return c, q, true, bad
}

// curveResult starts the result of a point of a curve.
func curveResult(p *analyze.Pass, c *transfer.Curve, q transfer.Point, key, title string) analyze.Result {
	r := analyze.Result{Unit: dB, Details: map[string]any{"stimulus": c.Kind, "at_hz": q.Hz}}
	list := []map[string]any{}
	s := analyze.Series{Name: title, Kind: analyze.Line}
	if !c.Dense {
		s.Kind = analyze.Points
	}
	for _, k := range c.Points {
		e := map[string]any{"frequency_hz": k.Hz, key: nil, "used": k.Used}
		if k.H != 0 {
			e[key] = dB.FromLinear(cmplx.Abs(k.H))
		}
		if k.Used {
			e["uncertainty_db"] = 2 * budget.DecibelsPer(unit.Ratio) * math.Hypot(k.U, k.StepU)
			s.X, s.Y = append(s.X, k.Hz), append(s.Y, dB.FromLinear(cmplx.Abs(k.H)))
		} else {
			e["why"] = k.Why
		}
		list = append(list, e)
	}
	r.Details["points"] = list
	if len(s.X) > 0 {
		r.Figures = append(r.Figures, analyze.Figure{
			ID:      fmt.Sprintf("%s-%s-ch%d-ch%d", title, c.Out.Take.Name, c.Out.Channel(), c.In.Channel()),
			Title:   fmt.Sprintf("Take %s: %s of channels %d and %d", c.Out.Take.Name, title, c.Out.Channel(), c.In.Channel()),
			Caption: fmt.Sprintf("from a %s; frequencies hidden by noise are left out", c.Kind),
			X:       analyze.Axis{Label: "frequency", Unit: "Hz", Log: true}, Y: analyze.Axis{Label: title, Unit: "dB"},
			Series: []analyze.Series{s},
		})
	}
	return r
}

// both finds one tone in two channels of the main take, searched in first.
type both struct {
	first, second  *analyze.Signal
	tone           *stage.Tone
	lines1, lines2 *stage.Lines
}

func hear(p *analyze.Pass, first, second *analyze.Signal, search *analyze.Signal) (*both, *analyze.Refusal) {
	at := 0.0
	if len(p.Params.At) > 0 {
		at = p.Params.At[0]
	}
	b := &both{first: first, second: second}
	var bad *analyze.Refusal
	if b.tone, bad = stage.FindTone(p, at, search, first, second); bad != nil {
		return nil, bad
	}
	b.lines1 = stage.Decompose(p, first, stage.Options{Tone: b.tone})
	b.lines2 = stage.Decompose(p, second, stage.Options{Tone: b.tone})
	return b, nil
}

// separation is the recorder's own crosstalk as a ratio; 0: not stated.
func separation(s *analyze.Signal) float64 {
	if s.Gear.Separation == 0 {
		return 0
	}
	return math.Pow(10, -s.Gear.Separation/20)
}

// details that both measures give.
func (b *both) details() map[string]any {
	d := map[string]any{
		"fundamental": map[string]any{"frequency_hz": b.tone.Hz, "rms_v": b.lines1.Fundamental().RMS()},
		"span_s":      []float64{b.first.StartS, b.first.StartS + b.first.DurationS()},
	}
	if !b.tone.MainsResolved {
		d["mains_resolved"] = false
	}
	return d
}

// volts refuses two channels of which only one is in volts.
func volts(a, b *analyze.Signal) *analyze.Refusal {
	if (a.Unit == "V") == (b.Unit == "V") {
		return nil
	}
	return &analyze.Refusal{Code: analyze.Uncalibrated, Text: "one of the two channels has no volts at full scale", Advice: "state full_scale_peak for both"}
}

// addPair is what two tones of one take add to their quotient.
func addPair(b *budget.Budget, num, den *stage.Lines, numName, denName string, value float64) {
	stage.AddTone(b, num, numName, value)
	stage.AddTone(b, den, denName, value)
	b.Ratio(num.Sig, den.Sig, value)
}
