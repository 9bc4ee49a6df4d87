// Package calibrate finds the volts at digital full scale of a recorder (or
// the factor of a scope's probe) from takes of a tone and the readings of a
// meter that lay across the same input.
//
// For one take, with U the meter's RMS reading in V and a the RMS of the tone
// in the file, fitted as a sine, in fractions of full scale:
//
//	full scale = U / a            V peak, since a full-scale sine has RMS 1/sqrt 2 FS
//	probe      = U / a            with a in V as a scope's file has it
//
// Several takes of one channel give a weighted mean. Their factors must agree:
// a gain control, a limiter or a noise suppressor in the way shows itself by a
// factor that changes with level.
//
// Uncertainty, standard and relative, in quadrature:
//
//	the meter: its stated accuracy, common to all takes
//	the reading's last digit: half a digit, rectangular
//	the fit: noise and converter steps
//	what else the meter heard: r/2 rectangular, r the power of all but the
//	  tone (hum, harmonics, noise) over that of the tone
//	drift of the tone between the halves of the take, rectangular
//	half the difference between the takes' factors, rectangular
package calibrate

import (
	"context"
	"fmt"
	"math"
	"slices"
	"strings"

	"benchslip/analyze"
	"benchslip/analyze/intake"
	"benchslip/analyze/internal/budget"
	"benchslip/analyze/stage"
	"benchslip/capture/recording"
	"benchslip/capture/unit"
)

// Point is one take with one reading.
type Point struct {
	File    string // as typed
	Path    string
	Channel int // from 1
	Reading unit.Quantity
}

// Meter is what the readings were taken with.
type Meter struct {
	Name string
	// Expanded is its expanded (k = 2) uncertainty: relative (%, dB) or in V.
	// Limit is its limit of error as a data sheet states it: a part of the
	// reading plus volts, taken as rectangular. At most one of the two.
	Expanded *unit.Quantity
	Limit    *Limit
	// Band is where that holds; nil: not stated.
	Band *analyze.Band
}

// Limit is a limit of error: Part of the reading plus Volts.
type Limit struct{ Part, Volts float64 }

// ParseLimit reads "0.5 %", "2 mV" or both with a plus between.
func ParseLimit(text string) (*Limit, error) {
	l := &Limit{}
	for _, part := range strings.Split(text, "+") {
		q, err := unit.Parse(part)
		switch {
		case err != nil:
			return nil, err
		case q.Unit.Dim == unit.Ratio && !q.Unit.IsLog() && q.Number >= 0:
			l.Part += q.Linear()
		case q.Unit.Symbol == "dB" && q.Number >= 0:
			l.Part += q.Linear() - 1
		case q.Unit.Dim == unit.Volt && !q.Unit.IsLog() && q.Number >= 0:
			l.Volts += q.Linear()
		default:
			return nil, fmt.Errorf("%q: expected a part of the reading and volts, like \"0.5 %% + 2 mV\"", strings.TrimSpace(text))
		}
	}
	return l, nil
}

// share is the meter's standard uncertainty: common to all readings, relative;
// and of this reading alone, relative.
func (m Meter) share(volts float64) (common float64, known bool) {
	switch {
	case m.Expanded != nil:
		return budget.Relative(unit.New(volts, "V"), *m.Expanded), true
	case m.Limit != nil:
		return budget.Rectangular(m.Limit.Part + m.Limit.Volts/volts), true
	}
	return 0, false
}

// Options of a calibration.
type Options struct {
	Gear  string
	Mode  string
	Date  string // "2026-12-01"; "" none
	Meter Meter
}

// Entry is a gear entry found.
type Entry struct {
	Options
	Kind     string  // recording.Audio or recording.Scope
	RateHz   float64 // of the takes
	Channels []Channel
	Notes    []string
}

// Channel is the result for one channel.
type Channel struct {
	Number int
	Factor float64 // V at full scale, or the probe factor
	// U is the expanded (k = 2) relative uncertainty; Known says that it
	// holds the meter's.
	U      float64
	Known  bool
	Points []Reading
}

// Reading is one point evaluated.
type Reading struct {
	Point
	Hz     float64 // of the tone, by the recorder's clock
	RMS    float64 // of the tone, FS or V
	FromS  float64 // what was read of the take
	ToS    float64
	Factor float64
	Own    float64 // relative standard uncertainty of this point, without the meter's accuracy
}

// Faults of a calibration are of type *Fault: bad takes, readings that do not
// fit. The text names the file.
type Fault struct{ Text string }

func (f *Fault) Error() string { return f.Text }

func fault(format string, args ...any) error { return &Fault{fmt.Sprintf(format, args...)} }

// agreeDB is how far the factors of one channel may lie apart (common
// practice, no source).
const agreeDB = 0.05

// Run evaluates the points. The error is a *Fault, or that of ctx.
func Run(ctx context.Context, points []Point, o Options) (*Entry, error) {
	e := &Entry{Options: o}
	takes := map[string]*analyze.Take{}
	defer func() {
		for _, t := range takes {
			if t.Rec != nil {
				t.Rec.Close()
			}
		}
	}()
	stages := analyze.NewStages()
	byChannel := map[int][]Reading{}
	for _, p := range points {
		t := takes[p.Path]
		if t == nil {
			t = &analyze.Take{Name: p.File, File: p.File, Path: p.Path}
			if err := intake.Open(ctx, t); err != nil {
				return nil, err
			}
			takes[p.Path] = t
		}
		if t.Fault != nil {
			return nil, fault("%s", intake.Line(t.Fault))
		}
		if err := e.alike(t); err != nil {
			return nil, err
		}
		r, err := e.read(t, p, stages)
		if err != nil {
			return nil, err
		}
		byChannel[p.Channel] = append(byChannel[p.Channel], r)
	}
	var numbers []int
	for n := range byChannel {
		numbers = append(numbers, n)
	}
	slices.Sort(numbers)
	for _, n := range numbers {
		c, err := e.channel(n, byChannel[n])
		if err != nil {
			return nil, err
		}
		e.Channels = append(e.Channels, c)
	}
	e.remarks()
	return e, nil
}

// alike holds all takes to one kind and one rate.
func (e *Entry) alike(t *analyze.Take) error {
	in := t.Rec.Info()
	if e.Kind == "" {
		e.Kind, e.RateHz = in.Kind, in.RateHz
	}
	switch {
	case in.RateHz <= 0:
		return fault("%s: has no sample rate", t.File)
	case in.Kind != e.Kind:
		return fault("%s: holds %s samples, the takes before it %s: calibrate one gear at a time", t.File, in.Kind, e.Kind)
	case math.Abs(in.RateHz/e.RateHz-1) > 1e-3:
		return fault("%s: runs at %.6g Hz, the takes before it at %.6g Hz: calibrate each rate by itself", t.File, in.RateHz, e.RateHz)
	}
	return nil
}

// Limits of what counts as a tone to calibrate with.
const (
	edgeS    = 0.2  // cut off at both ends of where the tone sounds
	mostRest = 0.01 // of the tone's power: 0.04 dB that a meter may or may not hear
)

// read fits the tone of one take.
func (e *Entry) read(t *analyze.Take, p Point, stages *analyze.Stages) (Reading, error) {
	r := Reading{Point: p}
	if n := len(t.Rec.Info().Channels); p.Channel < 1 || p.Channel > n {
		return r, fault("%s: has no channel %d, only 1 to %d", p.File, p.Channel, n)
	}
	pass := &analyze.Pass{Params: &analyze.Params{Wiring: analyze.Wiring{Out: fmt.Sprint(p.Channel)}},
		Roles: map[string][]*analyze.Take{"take": {t}}, Stages: stages}
	sig, bad := pass.Signal("take", "out")
	if bad != nil {
		return r, fault("%s", intake.Line(bad))
	}
	part := sounding(pass, sig)
	f, text := fitTone(pass, part)
	if text != "" {
		return r, fault("%s: channel %d: %s", p.File, p.Channel, text)
	}
	r.Hz, r.RMS = f.hz, f.rms
	r.FromS, r.ToS = part.StartS, part.StartS+part.DurationS()
	if b := e.Meter.Band; b != nil && (r.Hz < b.Low || r.Hz > b.High) {
		return r, fault("%s: its tone is at %.4g Hz, outside the %.4g .. %.4g Hz in which the meter's accuracy holds: play a tone inside", p.File, r.Hz, b.Low, b.High)
	}
	if f.rest > mostRest {
		return r, fault("%s: channel %d: hum, noise and distortion are %.2g %% of the tone: no clean tone to calibrate with; raise the level, check the wiring", p.File, p.Channel, 100*math.Sqrt(f.rest))
	}
	r.Factor = p.Reading.Linear() / r.RMS
	r.Own = budget.RSS(f.u, budget.Rectangular(f.rest/2), budget.Rectangular(f.drift/2))
	if f.drift > 0.002 {
		e.note("%s: the tone's level moved by %.3f dB within the take: let it settle, or look for a gain control", p.File, 20*math.Log10(1+f.drift))
	}
	if f.onMains > 0 {
		// Hum of that frequency adds to the tone with an unknown phase; it is
		// taken as no stronger than everything else in the take.
		r.Own = budget.RSS(r.Own, budget.ArcSine(math.Sqrt(f.rest)))
		e.note("%s: its tone lies on a multiple of the mains frequency, %g Hz; 220 Hz keeps clear of those of 50 and 60 Hz", p.File, f.onMains)
	}
	for _, g := range t.Flags {
		if g.Channel == 0 || g.Channel == p.Channel {
			e.note("%s: flag %s: %s", p.File, g.Code, g.Message)
		}
	}
	return r, nil
}

// sounding is the longest stretch in which something sounds, less a little at
// both ends; the whole signal where it has no silence.
func sounding(p *analyze.Pass, s *analyze.Signal) *analyze.Signal {
	best := stage.Stretch{To: s.Len()}
	list := stage.Stretches(p, s)
	for i, q := range list {
		if i == 0 || q.To-q.From > best.To-best.From {
			best = q
		}
	}
	if len(list) == 0 || best.From == 0 && best.To == s.Len() {
		return s
	}
	cut := int(edgeS * s.RateHz)
	if best.To-best.From <= 4*cut {
		return s.Part(best.From, best.To)
	}
	return s.Part(best.From+cut, best.To-cut)
}

// digit is half of a reading's last digit over the reading, rectangular.
func digit(q unit.Quantity) float64 {
	step, _ := lastDigit(q.Text)
	lo, hi := q.Unit.ToLinear(q.Number-step/2), q.Unit.ToLinear(q.Number+step/2)
	return budget.Rectangular((hi - lo) / 2 / q.Linear())
}

// lastDigit is the weight of the last digit of a typed number, and how many
// significant digits it has.
func lastDigit(text string) (step float64, digits int) {
	places, point, begun := 0, false, false
	for _, c := range strings.TrimSpace(text) {
		switch {
		case c == '.':
			point = true
		case c >= '0' && c <= '9':
			if point {
				places++
			}
			begun = begun || c != '0'
			if begun {
				digits++
			}
		case c == '+' || c == '-' || c == '\u2212':
		case c == 'e' || c == 'E':
			return 0, 0 // a computed number
		default:
			return math.Pow10(-places), digits
		}
	}
	return math.Pow10(-places), digits
}

func (e *Entry) note(format string, args ...any) {
	if s := fmt.Sprintf(format, args...); !slices.Contains(e.Notes, s) {
		e.Notes = append(e.Notes, s)
	}
}

// channel joins the readings of one channel.
func (e *Entry) channel(n int, list []Reading) (Channel, error) {
	c := Channel{Number: n, Points: list, Known: true}
	for i, r := range list {
		// A lone reading of under three digits is someone's short form, not
		// what a display showed; a note says so. Beside another it counts.
		if _, digits := lastDigit(r.Reading.Text); digits >= 3 || len(list) > 1 {
			list[i].Own = budget.RSS(r.Own, digit(r.Reading))
		}
	}
	// Weights by what is each reading's own; the floor keeps one of two good
	// readings from deciding alone.
	const floor = 1e-4
	var sum, weights float64
	for _, r := range list {
		w := 1 / (r.Own*r.Own + floor*floor)
		sum, weights = sum+w*r.Factor, weights+w
	}
	c.Factor = sum / weights
	lo, hi := list[0], list[0]
	common := 0.0
	for _, r := range list {
		u, known := e.Meter.share(r.Reading.Linear())
		c.Known = c.Known && known
		w := 1 / (r.Own*r.Own + floor*floor)
		common += u * w / weights
		if r.Factor < lo.Factor {
			lo = r
		}
		if r.Factor > hi.Factor {
			hi = r
		}
	}
	spread := hi.Factor/lo.Factor - 1
	if dB := 20 * math.Log10(1+spread); dB > agreeDB {
		if why := e.explained(lo, hi, spread); why != "" {
			e.note("channel %d: the factors differ by %.3f dB; %s", n, dB, why)
			spread = 0 // the readings' own uncertainties hold it
		} else {
			return c, fault("channel %d: %s with %s gives %s, %s with %s gives %s: %.3f dB apart, where %.2f dB is allowed; "+
				"look for a gain control, a limiter or noise suppression in the recorder's path, another range of the meter, or a load that came and went",
				n, lo.File, lo.Reading, e.factorText(lo.Factor), hi.File, hi.Reading, e.factorText(hi.Factor), dB, agreeDB)
		}
	}
	own := 1 / math.Sqrt(weights)
	c.U = 2 * budget.RSS(common, own, budget.Rectangular(spread/2))
	return c, nil
}

// explained says when the meter itself accounts for factors that differ: its
// last digit, or the volts of its limit of error, at the lower level.
func (e *Entry) explained(lo, hi Reading, spread float64) string {
	own := 2 * budget.RSS(lo.Own, hi.Own)
	if l := e.Meter.Limit; l != nil && l.Volts > 0 {
		own += l.Volts * math.Abs(1/lo.Reading.Linear()-1/hi.Reading.Linear())
	}
	if own < spread {
		return ""
	}
	small := lo
	if hi.Reading.Linear() < lo.Reading.Linear() {
		small = hi
	}
	return fmt.Sprintf("the meter's last digit at %s accounts for up to %.2f dB: type every digit it shows, or use a lower range", small.Reading, 20*math.Log10(1+own))
}

func (e *Entry) factorText(f float64) string {
	if e.Kind == recording.Scope {
		return fmt.Sprintf("a factor of %.5g", f)
	}
	return fmt.Sprintf("%.5g V at full scale", f)
}

// remarks says what someone should know who relies on the entry.
func (e *Entry) remarks() {
	for _, c := range e.Channels {
		lo, hi := math.Inf(1), 0.0
		for _, r := range c.Points {
			v := r.Reading.Linear()
			lo, hi = math.Min(lo, v), math.Max(hi, v)
			if _, digits := lastDigit(r.Reading.Text); digits < 3 && len(c.Points) == 1 {
				e.note("%s: the reading %s is typed with %d digits, its rounding is not counted: type every digit the meter shows", r.File, r.Reading, digits)
			}
			if e.Meter.Band == nil && r.Hz > 400 {
				e.note("%s: its tone is at %.4g Hz; hand-held meters read low above some hundred Hz: play 60 to 400 Hz, or state where the meter's accuracy holds", r.File, r.Hz)
			}
		}
		switch apart := 20 * math.Log10(hi/lo); {
		case len(c.Points) == 1:
			e.note("channel %d: one level only; a second one 20 dB lower would show a gain control or a limiter", c.Number)
		case apart < 10:
			e.note("channel %d: the levels lie only %.1f dB apart; 20 dB would show a gain control or a limiter", c.Number, apart)
		}
		if !c.Known {
			e.note("channel %d: the meter's uncertainty is not stated, so that no uncertainty is known", c.Number)
		}
		if f := c.Factor; e.Kind == recording.Scope && (math.Abs(f/10-1) < 0.05 || math.Abs(f*10-1) < 0.05) {
			e.note("channel %d: the file and the meter differ by a factor of ten: the probe's factor is set wrong in the scope", c.Number)
		}
	}
	if len(e.Channels) > 1 && e.Kind == recording.Audio {
		a, b := e.Channels[0], e.Channels[1]
		e.note("channels %d and %d differ by %.3f dB; an entry of its own makes a channel's error independent of the other's. For gain and other ratios one entry with channel_match = \"%.3f dB\" is better",
			a.Number, b.Number, math.Abs(20*math.Log10(a.Factor/b.Factor)), math.Max(0.001, math.Abs(20*math.Log10(a.Factor/b.Factor))))
	}
}
