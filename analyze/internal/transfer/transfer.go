// Package transfer finds the transfer function of a unit from one take: what
// the stimulus was, and output over input at every frequency that it drove.
//
// The stimulus is recognised by the structure of the channel that recorded it
// (exponential sweep, stepped tones, multitone, steady noise, pulse). Without
// such a channel the stimulus that the job states stands in for it, brought
// to the recorder's clock and to the arrival in the take (align.go).
//
// Two estimators cover all kinds. Steps and multitones are lines: a joint
// least-squares fit gives the phasors (package sinefit), their quotient H.
// Sweeps, noise and pulses fill the band: the spectrum of the output is
// regressed on that of the input over neighbouring lines, with H a polynomial
// of the frequency there (local.go); without the polynomial this is the
// cross-spectrum estimator H1 = S_yx/S_xx averaged over frequency, and it
// gives coherence and uncertainty with it. The harmonic responses that a
// sweep's distortion leaves at earlier times are fitted alongside.
//
// The uncertainties here are those of noise alone: both channels are taken as
// equal, and what the gear adds belongs to the measure.
package transfer

import (
	"fmt"
	"math"
	"math/cmplx"
	"sort"

	"benchslip/analyze"
)

// Kinds of stimulus.
const (
	Sweep     = "sweep"
	Steps     = "stepped-tones"
	Multitone = "multitone"
	Noise     = "noise"
	Pulse     = "pulse"
	Tone      = "tone" // one frequency: no response
)

// Point is the transfer function at one frequency.
type Point struct {
	Hz float64
	H  complex128 // out/in, delay left in; e^{+jwt}: a lag has negative phase
	// Slope is dH/d ln f; curves that fill the band have it.
	Slope complex128
	// U is the standard uncertainty of |H| over |H| from noise, and that of
	// the phase in rad; Dof its degrees of freedom, 0: infinite.
	U, Dof float64
	// StepU is what converter steps add to U where no dither hides them.
	StepU float64
	// ModelU is what the estimator itself may add, relative. Of curves that
	// fill the band: a corner of first order, bent over the +-B of lines that
	// are joined, moves the value by 0.05 (B/f)^4, or 0.01 (B/f)^6 where four
	// powers are fitted. Of low steps: how far their
	// later part departs from the whole, since the unit may still be settling.
	ModelU float64
	// Share is the mean square that noise adds to |H|^2.
	Share     float64
	Coherence float64 // 0..1
	Used      bool
	Why       string  // why it is not used
	FromS     float64 // stretch of the take that a step took, s; both 0: not a step
	ToS       float64
}

// Curve is a unit's transfer function.
type Curve struct {
	Kind   string
	Out    *analyze.Signal
	In     *analyze.Signal // what it was found against
	Points []Point         // in order of frequency
	Dense  bool            // the stimulus filled the band: points can be interpolated
	// LowHz and HighHz bound what the stimulus drove.
	LowHz, HighHz float64
	// Stated: In is the stated stimulus, brought to the recorder's clock; the
	// gain then has no absolute meaning. ClockPPM is how much faster the
	// player ran than the recorder, DelayS when the stimulus began in the take.
	Stated           bool
	ClockPPM, ClockU float64
	StartS           float64

	DelayS, DelayU float64 // common delay of the points, s: see delay
	Phase0         float64 // phase that the delay's straight line has at 0 Hz, rad
	Scatter        float64 // RMS of the phases about that line, rad
	Impulse        Impulse
}

// Impulse is what the band-limited impulse response shows at its largest.
type Impulse struct {
	Sign float64 // +1 or -1; 0: not found
	AtS  float64 // when, s after the input
	Next float64 // largest of the other sign over the largest
}

// detectable is the largest relative uncertainty of a point that counts: a
// standard uncertainty of 10 % is 0.9 dB.
const detectable = 0.1

// finish puts the points in order, marks those without support, and finds
// the common delay.
func (c *Curve) finish() {
	sort.SliceStable(c.Points, func(a, b int) bool { return c.Points[a].Hz < c.Points[b].Hz })
	for i := range c.Points {
		q := &c.Points[i]
		size := cmplx.Abs(q.H)
		switch {
		case q.Why != "":
			q.Used = false
		case math.IsNaN(size) || math.IsInf(size, 0) || size == 0 || math.IsNaN(q.U):
			q.H, q.U, q.Used, q.Why = 0, 0, false, "nothing was read there"
		case q.U > detectable:
			q.Used, q.Why = false, fmt.Sprintf("noise: standard uncertainty of %.2g %%", 100*q.U)
		default:
			q.Used = true
		}
	}
	c.delay()
}

// Used lists the points that count.
func (c *Curve) Used() []Point {
	var out []Point
	for _, q := range c.Points {
		if q.Used {
			out = append(out, q)
		}
	}
	return out
}

// Half an octave and 1/24 of one as ratios.
var (
	halfOctave = math.Sqrt2
	near       = math.Pow(2, 1.0/24)
)

// At is the point for a frequency that someone asked for: of steps and tones
// the nearest within 1/24 octave, else interpolated in lg f.
func (c *Curve) At(hz float64) (Point, *analyze.Refusal) {
	if !c.Dense {
		return c.nearest(hz, near, analyze.NoTone, "1/24 octave")
	}
	if bad := c.covers(hz); bad != nil {
		return Point{}, bad
	}
	return c.between(hz), nil
}

// Ref is the point that others are related to: of steps and tones the nearest
// within half an octave.
func (c *Curve) Ref(hz float64) (Point, *analyze.Refusal) {
	if !c.Dense {
		q, bad := c.nearest(hz, halfOctave, analyze.NotEnoughPoints, "half an octave")
		if bad == nil && !q.Used {
			bad = &analyze.Refusal{Code: analyze.NotEnoughPoints,
				Text:   fmt.Sprintf("take %q: the reference at %.6g Hz does not stand out of the noise", c.Out.Take.Name, q.Hz),
				Advice: "raise the level, or state another `ref`"}
		}
		return q, bad
	}
	if bad := c.covers(hz); bad != nil {
		bad.Code = analyze.NotEnoughPoints
		return Point{}, bad
	}
	q := c.between(hz)
	if !q.Used {
		return q, &analyze.Refusal{Code: analyze.NotEnoughPoints,
			Text:   fmt.Sprintf("take %q: the reference at %.6g Hz does not stand out of the noise", c.Out.Take.Name, hz),
			Advice: "raise the level, or state another `ref`"}
	}
	return q, nil
}

func (c *Curve) nearest(hz, ratio float64, code, words string) (Point, *analyze.Refusal) {
	best, at := math.Inf(1), -1
	for i, q := range c.Points {
		if d := math.Abs(math.Log(q.Hz / hz)); d < best {
			best, at = d, i
		}
	}
	if at < 0 || best > math.Log(ratio) {
		r := &analyze.Refusal{Code: code, Text: fmt.Sprintf("take %q holds no tone within %s of %.6g Hz", c.Out.Take.Name, words, hz),
			Advice: "record a tone there"}
		if at >= 0 {
			r.Text += fmt.Sprintf("; the nearest lies at %.6g Hz", c.Points[at].Hz)
		}
		return Point{}, r
	}
	return c.Points[at], nil
}

// covers: hz lies in what the stimulus drove, within 5 %.
func (c *Curve) covers(hz float64) *analyze.Refusal {
	if len(c.Points) > 0 && hz >= c.LowHz/1.05 && hz <= c.HighHz*1.05 {
		return nil
	}
	return &analyze.Refusal{Code: analyze.Bandwidth,
		Text:   fmt.Sprintf("take %q: the stimulus covers %.5g Hz to %.5g Hz, not %.6g Hz", c.Out.Take.Name, c.LowHz, c.HighHz, hz),
		Advice: "play a stimulus that covers it"}
}

// between is the cubic through two neighbouring points and their slopes, of
// ln H over ln f; beyond the ends the slope goes on.
func (c *Curve) between(hz float64) Point {
	p := c.Points
	if len(p) == 1 {
		return p[0]
	}
	i := sort.Search(len(p), func(k int) bool { return p[k].Hz >= hz })
	if i < len(p) && p[i].Hz == hz {
		return p[i]
	}
	i = max(1, min(i, len(p)-1))
	a, b := p[i-1], p[i]
	x := math.Log(hz / a.Hz)
	h := math.Log(b.Hz / a.Hz)
	q := a
	if x > h/2 {
		q = b
	}
	q.Hz = hz
	q.U, q.StepU, q.ModelU = math.Max(a.U, b.U), math.Max(a.StepU, b.StepU), math.Max(a.ModelU, b.ModelU)
	if !a.Used || !b.Used || a.H == 0 || b.H == 0 {
		return q
	}
	sa, sb := a.Slope/a.H, b.Slope/b.H
	switch {
	case x < 0:
		q.H = a.H * cmplx.Exp(sa*complex(x, 0))
	case x > h:
		q.H = b.H * cmplx.Exp(sb*complex(x-h, 0))
	default:
		// ln(b/a) on the branch that the slopes' mean expects.
		d := cmplx.Log(b.H / a.H)
		expect := imag(sa+sb) / 2 * h
		d += complex(0, 2*math.Pi*math.Round((expect-imag(d))/(2*math.Pi)))
		u := complex(x/h, 0)
		ma, mb := sa*complex(h, 0), sb*complex(h, 0)
		l := u * (ma + u*((3*d-2*ma-mb)+u*(ma+mb-2*d)))
		q.H = a.H * cmplx.Exp(l)
		q.Slope = q.H * (ma + 2*u*(3*d-2*ma-mb) + 3*u*u*(ma+mb-2*d)) / complex(h, 0)
	}
	return q
}

// LogSlope is d ln|H| / d ln f at a point: of a curve without slopes from the
// neighbours that count.
func (c *Curve) LogSlope(hz float64) float64 {
	if c.Dense {
		q := c.between(hz)
		if q.H == 0 {
			return 0
		}
		return real(q.Slope / q.H)
	}
	u := c.Used()
	i := sort.Search(len(u), func(k int) bool { return u[k].Hz >= hz })
	a, b := max(0, i-1), min(len(u)-1, i+1)
	if b <= a {
		return 0
	}
	return math.Log(cmplx.Abs(u[b].H)/cmplx.Abs(u[a].H)) / math.Log(u[b].Hz/u[a].Hz)
}
