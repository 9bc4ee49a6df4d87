package stage

import (
	"fmt"
	"math"

	"benchslip/analyze"
	"benchslip/analyze/internal/sinefit"
	"benchslip/analyze/internal/spectrum"
)

// Tone is the test tone of one or more signals recorded together: one
// frequency, one track.
type Tone struct {
	Track         *sinefit.Track
	Hz            float64 // mean over the span
	UHz           float64 // standard uncertainty from noise
	MainsHz       float64 // coarse mains frequency of the first signal; 0 when unresolved
	MainsResolved bool    // the span holds at least ten periods of the mains
	Periods       float64
	Few           bool // under five periods
	OnMains       int  // mains order nearer than 4/T, 0: none
	MainsGapHz    float64
	Coarse        float64
	id            string
}

// LowestTone and HighestShare bound the search for a tone that the job does
// not name: 10 Hz, and 0.45 of the sample rate.
const (
	LowestTone   = 10.0
	HighestShare = 0.45
)

// FindTone finds the test tone in search and follows it there and in also
// (nil entries are skipped; signals of other length than search are not used
// for the track). atHz > 0: the strongest line within 1 % of it. Else the
// strongest line from 10 Hz to 0.45 of the rate that is no mains line of
// order 1 to 5.
func FindTone(p *analyze.Pass, atHz float64, search *analyze.Signal, also ...*analyze.Signal) (*Tone, *analyze.Refusal) {
	v := SurveyOf(p, search)
	if bad := nothing(search, v); bad != nil {
		return nil, bad
	}
	coarse, bad := coarseTone(p, atHz, search, v)
	if bad != nil {
		return nil, bad
	}
	sigs := []*analyze.Signal{search}
	for _, s := range also {
		if s != nil && s.ID() != search.ID() && s.Len() == search.Len() && s.RateHz == search.RateHz {
			sigs = append(sigs, s)
		}
	}
	key := fmt.Sprintf("tone/%.12g/%g", coarse, mainsNominal(p))
	for _, s := range sigs {
		key += "/" + s.ID()
	}
	type found struct {
		tone *Tone
		bad  *analyze.Refusal
	}
	r := p.Stages.Once(key, func() any {
		t, bad := followTone(p, coarse, sigs)
		if t != nil {
			t.id = key
		}
		return found{t, bad}
	}).(found)
	return r.tone, r.bad
}

// followTone follows the line near coarse in all signals; the first decides.
func followTone(p *analyze.Pass, coarse float64, sigs []*analyze.Signal) (*Tone, *analyze.Refusal) {
	search := sigs[0]
	t := &Tone{Coarse: coarse}
	T := search.DurationS()
	if coarse*T < 1.8 {
		return nil, tooShort(search, coarse, 1.8)
	}
	var sets [][]sinefit.Estimate
	for i, s := range sigs {
		weak := false
		if i > 0 {
			sv := SurveyOf(p, s)
			_, seen := sv.StrongestIn(coarse-2*sv.ToleranceHz(), coarse+2*sv.ToleranceHz(), nil)
			weak = !seen && coarse*T > 12
		}
		f := follow(p, s, coarse, weak)
		if i == 0 {
			t.MainsHz = f.MainsHz
			t.MainsResolved = f.MainsHz > 0
			if !f.Settled || f.Tone == nil {
				return nil, &analyze.Refusal{Code: analyze.NoTone,
					Text:   fmt.Sprintf("take %q: the line near %.6g Hz is no steady tone", search.Take.Name, coarse),
					Advice: "record a steady tone"}
			}
		}
		if f.Tone != nil && f.Settled && (i == 0 || len(f.Tone) == len(sets[0])) {
			sets = append(sets, f.Tone)
		}
	}
	t.Track = sinefit.Join(search.Len(), sets...)
	t.Hz = t.Track.MeanNu() * search.RateHz
	t.UHz = t.Track.UNu * search.RateHz
	t.Periods = t.Hz * T
	t.Few = t.Periods < 5
	if t.Periods < 1.8 {
		return nil, tooShort(search, t.Hz, 1.8)
	}
	if t.MainsResolved {
		gap, order := NearMains(t.Hz, t.MainsHz, 5)
		t.MainsGapHz = gap
		if gap < 2/T {
			return nil, &analyze.Refusal{Code: analyze.TooShort,
				Text: fmt.Sprintf("take %q: the tone at %.6g Hz lies %.3g Hz from mains order %d (%.6g Hz); a span of %.4g s cannot tell them apart",
					search.Take.Name, t.Hz, gap, order, float64(order)*t.MainsHz, T),
				Advice: longer(gap)}
		}
		if gap < 4/T {
			t.OnMains = order
		}
	}
	return t, nil
}

func longer(gapHz float64) string {
	if gapHz < 0.05 {
		return "use a tone at least 3 Hz from the mains lines, such as 1042 Hz"
	}
	return fmt.Sprintf("record %.3g s or more, or use a tone at least 3 Hz from the mains lines, such as 1042 Hz", math.Ceil(2/gapHz))
}

func tooShort(s *analyze.Signal, hz, periods float64) *analyze.Refusal {
	return &analyze.Refusal{Code: analyze.TooShort,
		Text:   fmt.Sprintf("take %q holds %.3g periods of the tone at %.6g Hz, %g are needed", s.Take.Name, hz*s.DurationS(), hz, periods),
		Advice: fmt.Sprintf("record %.3g s or more", math.Max(2*periods, 10)/hz)}
}

// FullPeriods refuses what needs five periods of the tone.
func (t *Tone) FullPeriods(s *analyze.Signal) *analyze.Refusal {
	if t.Few {
		return tooShort(s, t.Hz, 5)
	}
	return nil
}

// nothing refuses a signal whose samples are all equal.
func nothing(s *analyze.Signal, v *Survey) *analyze.Refusal {
	for _, x := range v.S {
		if x > 0 {
			return nil
		}
	}
	return &analyze.Refusal{Code: analyze.NoSignal,
		Text:   fmt.Sprintf("take %q, channel %d: every sample is equal", s.Take.Name, s.Channel()),
		Advice: "check the connection and the channel, and record again"}
}

// coarseTone picks the tone among the peaks of the survey, or, in signals of
// few periods, by trying single sines.
func coarseTone(p *analyze.Pass, atHz float64, s *analyze.Signal, v *Survey) (float64, *analyze.Refusal) {
	T := s.DurationS()
	if atHz > 0 {
		if atHz >= s.RateHz/2 {
			return 0, &analyze.Refusal{Code: analyze.Bandwidth,
				Text:   fmt.Sprintf("%.6g Hz lies above half the sample rate of take %q (%.6g Hz)", atHz, s.Take.Name, s.RateHz/2),
				Advice: "record at a higher rate, or ask for a lower frequency"}
		}
		if atHz*T < 1.8 {
			return 0, tooShort(s, atHz, 1.8)
		}
		if atHz*T < 12 {
			hz, ok := fewPeriods(s, atHz*0.9, atHz*1.1)
			if ok && math.Abs(hz-atHz) <= math.Max(0.011*atHz, 0.05/T) {
				return hz, nil
			}
			return 0, noToneNear(s, v, atHz)
		}
		tol := v.ToleranceHz()
		if q, ok := v.StrongestIn(atHz*0.99-tol, atHz*1.01+tol, nil); ok {
			return q.Hz, nil
		}
		return 0, noToneNear(s, v, atHz)
	}
	lo, hi := LowestTone, HighestShare*s.RateHz
	if s.Take.Rec.Info().Kind != "audio" || T < 1 {
		lo = 0
	}
	tol := v.ToleranceHz()
	ofMains := mainsLines(v, mainsNominal(p), T, lo, hi)
	best, ok := v.StrongestIn(math.Max(lo, 1.2/T), hi, func(q spectrum.Peak) bool { return !ofMains(q.Hz) })
	if (!ok || best.Hz*T < 12) && 20/T > lo {
		if hz, good := fewPeriods(s, 1.5/T, math.Min(20/T, hi)); good && (!ok || math.Abs(hz-best.Hz) < 2.5/T) {
			return hz, nil
		}
	}
	if !ok {
		if _, any := v.StrongestIn(0, s.RateHz/2, nil); !any && T*lo < 1.8 {
			return 0, tooShort(s, math.Max(lo, 1/T), 1.8)
		}
		return 0, noTone(s, v, "no tone was found between 10 Hz and 0.45 of the sample rate")
	}
	// A second strong line that is no harmonic makes the choice a guess.
	if q, two := v.StrongestIn(lo, hi, func(q spectrum.Peak) bool {
		return q.Hz != best.Hz && !isHarmonic(q.Hz, best.Hz, 2*tol) && !isHarmonic(best.Hz, q.Hz, 2*tol) && !ofMains(q.Hz)
	}); two && q.Power > best.Power/4 {
		return 0, &analyze.Refusal{Code: analyze.AmbiguousTone,
			Text:   fmt.Sprintf("take %q holds two strong lines, %.6g Hz and %.6g Hz", s.Take.Name, best.Hz, q.Hz),
			Advice: "say which with `at`"}
	}
	return best.Hz, nil
}

// supplyStray is how far from nominal a supply is taken to run when a single
// line is all that speaks for it: interconnected supplies keep within 0.2 Hz
// of 50 Hz all but minutes of a year (common practice, no source).
const supplyStray = 0.004

// mainsLines tells the lines that lie on mains orders 1 to 5. The strongest
// line of all must not draw the comb to itself, or a tone at 98.5 Hz would
// make a supply of 49.25 Hz and hide behind it: the comb is drawn by the other
// lines. Where there are none but its own multiples, the supply is taken to
// run near its nominal frequency.
func mainsLines(v *Survey, nominal, durationS, lo, hi float64) func(hz float64) bool {
	tol := v.ToleranceHz()
	mains := findComb(v, nominal, durationS, func(float64) bool { return false })
	if nominal == 0 && !mains.credible(1) {
		mains.Hz = 0 // a lone line at a high multiple is no supply
	}
	stray := 0.0004
	near := func(hz float64) bool {
		d, _ := NearMains(hz, mains.Hz, 5)
		return d <= tol+stray*hz
	}
	top, ok := v.StrongestIn(lo, hi, nil)
	if !ok || mains.Hz <= 0 || !near(top.Hz) {
		return near
	}
	others := findComb(v, nominal, durationS, func(hz float64) bool { return isHarmonic(hz, top.Hz, 2*tol) })
	if len(others.Orders) > 0 {
		mains = others
		return near
	}
	if nominal == 0 {
		nominal = nearest(nominals, mains.Hz)
	}
	mains.Hz, stray = nominal, supplyStray
	return near
}

func noToneNear(s *analyze.Signal, v *Survey, atHz float64) *analyze.Refusal {
	return noTone(s, v, fmt.Sprintf("no line within 1 %% of %.6g Hz stands out of the noise", atHz))
}

func noTone(s *analyze.Signal, v *Survey, text string) *analyze.Refusal {
	r := &analyze.Refusal{Code: analyze.NoTone, Text: fmt.Sprintf("take %q, channel %d: %s", s.Take.Name, s.Channel(), text),
		Advice: "check the wiring and the file, and record the tone again"}
	if q, ok := v.StrongestIn(0, s.RateHz/2, nil); ok {
		r.Text += fmt.Sprintf("; the strongest line lies at %.6g Hz", q.Hz)
		r.Advice = fmt.Sprintf("check the file, or ask at %.6g Hz", q.Hz)
	}
	return r
}

// fewPeriods finds the frequency of a tone of which the signal holds few
// periods: the single sine (with DC) that leaves the least residual on a grid
// of a tenth of the resolution. ok: it explains more than half of the AC power.
func fewPeriods(s *analyze.Signal, lo, hi float64) (hz float64, ok bool) {
	n := s.Len()
	step := max(n/20000, 1) // averages of step samples are enough here
	x := make([]float64, 0, n/step)
	buf := make([]float64, step)
	for at := 0; at+step <= n; at += step {
		sum := 0.0
		for _, v := range buf[:s.Read(buf, at)] {
			sum += v
		}
		x = append(x, sum/float64(step))
	}
	rate := s.RateHz / float64(step)
	mean, power := 0.0, 0.0
	for _, v := range x {
		mean += v / float64(len(x))
	}
	for _, v := range x {
		power += (v - mean) * (v - mean)
	}
	best := math.Inf(1)
	T := float64(n) / s.RateHz
	for f := lo; f <= hi*(1+1e-9); f += 0.1 / T {
		if f >= rate/2 {
			break
		}
		sv, err := sinefit.NewSolver([]float64{f / rate}, len(x))
		if err != nil {
			continue
		}
		fit := sv.Block(x)
		left := append([]float64(nil), x...)
		sinefit.Subtract(left, fit.DC, sv.Nu, fit.Z)
		ssr := 0.0
		for _, v := range left {
			ssr += v * v
		}
		if ssr < best {
			best, hz = ssr, f
		}
	}
	return hz, power > 0 && best < power/2
}

// ToneAt is a tone of known frequency that need not be visible: for reading
// what a take holds at the frequency of another.
func ToneAt(s *analyze.Signal, hz float64, like *Tone) *Tone {
	t := *like
	t.Track = &sinefit.Track{Len: s.Len(), Nu: hz / s.RateHz, Rigid: true}
	t.Hz, t.Coarse = hz, hz
	t.Periods = hz * s.DurationS()
	t.Few = t.Periods < 5
	t.id = fmt.Sprintf("at/%.12g/%s", hz, s.ID())
	return &t
}
