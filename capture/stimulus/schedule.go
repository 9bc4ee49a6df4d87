package stimulus

import "math"

// Step is a stretch of one sine at its full level; fades lie outside it.
type Step struct {
	StartS, LengthS float64 // on the stimulus' time axis, 0 at its first sample
	Hz              float64
	Peak            float64 // FS, at StartS
	EndPeak         float64 // FS, at the end; differs in a level-ramp only
}

// Steps lists the sines that follow one another: one for tone, pilot and
// level-ramp, all for stepped-tones and stepped-levels, none for other kinds.
// The sine begins with phase 0, rising, at StartS.
func (s Spec) Steps() []Step {
	var steps []Step
	for _, st := range s.stretches() {
		if sig, ok := st.sig.(*sine); ok {
			steps = append(steps, Step{s.at(st.start), s.at(st.steady), sig.hz, sig.peak, sig.peak * math.Exp(sig.grow*s.at(st.steady))})
		}
	}
	return steps
}

// Sweep is the law of an exponential sweep in its synchronised form (Novak,
// Lotton, Simon, JAES 63 (2015) 786): with t from StartS,
//
//	x(t) = Peak sin(2 pi F1 L exp(t/L)),  f(t) = F1 exp(t/L),  0 <= t <= LengthS
//
// F1 L is a whole number, so that the n-th harmonic of x equals x(t + L ln n)
// with its phase: order n of the response arrives L ln n before the linear
// one and needs no phase correction. The sine goes on before t = 0 and after
// the end while it fades.
type Sweep struct {
	StartS, LengthS float64
	L               float64 // s
	F1, F2          float64 // Hz
	Peak            float64 // FS
}

// Lead is how much earlier than the linear response that of order n arrives,
// in s.
func (w Sweep) Lead(n int) float64 { return w.L * math.Log(float64(n)) }

// Sweep returns the law of a sweep, and false for other kinds.
func (s Spec) Sweep() (Sweep, bool) {
	if s.Kind != "sweep" {
		return Sweep{}, false
	}
	l := s.rounds() / s.FromHz
	return Sweep{
		StartS:  s.at(s.frames(s.BeforeS) + s.frames(s.FadeS)),
		LengthS: l * math.Log(s.ToHz/s.FromHz),
		L:       l, F1: s.FromHz, F2: s.ToHz, Peak: s.peak(),
	}, true
}

// rounds is F1 L, the whole number of turns of phase before t = 0 that makes
// the sweep about LengthS long.
func (s Spec) rounds() float64 {
	return math.Round(s.FromHz * s.LengthS / math.Log(s.ToHz/s.FromHz))
}

// shortest is the least length for which rounds is 1.
func (s Spec) shortest() float64 {
	return math.Ceil(500*math.Log(s.ToHz/s.FromHz)/s.FromHz) / 1000
}

// Tone is one of several sines that sound together.
type Tone struct {
	Hz       float64
	Peak     float64 // FS
	PhaseRad float64 // of a cosine at the start of the full level, see Span
}

// Tones lists the sines that sound together: those of a multitone or of a
// pair, in order of frequency; nil for other kinds. A multitone repeats every
// PeriodS, rounded to whole samples, of which each frequency is a multiple.
func (s Spec) Tones() []Tone {
	for _, st := range s.stretches() {
		switch sig := st.sig.(type) {
		case *multitone:
			return sig.tones(float64(s.RateHz))
		case *pair:
			return []Tone{
				{sig.low.hz, sig.low.peak, -math.Pi / 2},
				{sig.high.hz, sig.high.peak, -math.Pi / 2},
			}
		}
	}
	return nil
}

// Pulses lists when each pulse begins, in s; nil for other kinds. The top of
// its positive half is WidthS/2 later.
func (s Spec) Pulses() []float64 {
	var starts []float64
	for _, st := range s.stretches() {
		if _, ok := st.sig.(*pulse); ok {
			starts = append(starts, s.at(st.start))
		}
	}
	return starts
}

// Span is where the signal, first to last, stands at its full level, in s.
func (s Spec) Span() (startS, lengthS float64) {
	all := s.stretches()
	last := all[len(all)-1]
	return s.at(all[0].start), s.at(last.start + last.steady - all[0].start)
}

// Frames is the length of the whole stimulus with its silences.
func (s Spec) Frames() int64 {
	all := s.stretches()
	return all[len(all)-1].end() + s.frames(s.AfterS)
}

// TotalS is Frames in s.
func (s Spec) TotalS() float64 { return s.at(s.Frames()) }

// Channels is 2, or 1 without a second channel.
func (s Spec) Channels() int {
	if s.Second == SecondNone {
		return 1
	}
	return 2
}

// frames rounds a time to whole samples.
func (s Spec) frames(t float64) int64 { return int64(math.Round(t * float64(s.RateHz))) }

// at is the time of a frame.
func (s Spec) at(frame int64) float64 { return float64(frame) / float64(s.RateHz) }

// stretch is a piece of signal between two silences: fade in, full level from
// frame start for steady frames, fade out.
type stretch struct {
	start, steady   int64
	fadeIn, fadeOut int64
	sig             signal
}

func (st stretch) begin() int64 { return st.start - st.fadeIn }
func (st stretch) end() int64   { return st.start + st.steady + st.fadeOut }

// stretches lays the stimulus out in time. It makes no samples.
func (s Spec) stretches() []stretch {
	rate, fade := float64(s.RateHz), s.frames(s.FadeS)
	first := s.frames(s.BeforeS) + fade
	one := func(sig signal) []stretch {
		return []stretch{{first, s.frames(s.LengthS), fade, fade, sig}}
	}
	switch s.Kind {
	case "tone", "pilot":
		return one(&sine{hz: s.AtHz[0], rate: rate, peak: s.peak()})
	case "level-ramp":
		from, to := fromDB(s.FromDBFS), fromDB(s.ToDBFS)
		length := s.frames(s.LengthS)
		return one(&sine{hz: s.AtHz[0], rate: rate, peak: from, grow: math.Log(to/from) / s.at(length), until: s.at(length)})
	case "stepped-tones", "stepped-levels":
		var out []stretch
		add := func(hz, peak float64) {
			st := stretch{first, s.frames(s.EachS), fade, fade, &sine{hz: hz, rate: rate, peak: peak}}
			out = append(out, st)
			first = st.end() + s.frames(s.GapS) + fade
		}
		if s.Kind == "stepped-tones" {
			for _, f := range s.stepHz() {
				add(f, s.peak())
			}
			return out
		}
		for k := range s.Count {
			add(s.AtHz[0], fromDB(s.FromDBFS+(s.ToDBFS-s.FromDBFS)*float64(k)/float64(s.Count-1)))
		}
		return out
	case "sweep":
		w, _ := s.Sweep()
		// The fade out ends before the frequency comes near half the rate.
		out := min(fade, int64(w.L*math.Log(toneTop*rate/w.F2)*rate))
		return []stretch{{first, int64(math.Ceil(w.LengthS * rate)), fade, out, &sweep{w, rate}}}
	case "multitone":
		sig := newMultitone(s)
		st := one(sig)
		st[0].steady = max(1, s.frames(s.LengthS)/sig.n) * sig.n
		return st
	case "modulation-pair", "difference-pair":
		// Peaks add up to the stated one: 4:1 (IEC 60268-3, modulation
		// distortion) or 1:1 (difference-frequency distortion).
		low := 0.8
		if s.Kind == "difference-pair" {
			low = 0.5
		}
		return one(&pair{sine{hz: s.LowHz, rate: rate, peak: low * s.peak()}, sine{hz: s.HighHz, rate: rate, peak: (1 - low) * s.peak()}})
	case "pulse":
		var out []stretch
		width := s.frames(s.WidthS)
		for k := range int(s.LengthS/s.EveryS + 1e-9) {
			start := s.frames(s.BeforeS + float64(k)*s.EveryS)
			out = append(out, stretch{start: start, steady: 5 * width, sig: &pulse{float64(width), s.peak()}})
		}
		return out
	case "white-noise":
		return one(&whiteNoise{newUniform(s.Seed), s.peak()})
	}
	return one(&pinkNoise{spec: s}) // the only kind left
}

// stepHz are the frequencies of stepped-tones: the listed ones, or Count of
// them equally spaced in octaves, each moved clear of the mains.
func (s Spec) stepHz() []float64 {
	if len(s.AtHz) > 0 {
		return s.AtHz
	}
	var out []float64
	for _, f := range spaced(s.FromHz, s.ToHz, s.Count) {
		f = clearOfMains(f, 4/s.EachS)
		if n := len(out); n == 0 || f > out[n-1] {
			out = append(out, f)
		}
	}
	return out
}

// spaced gives count frequencies from lo to hi with one ratio between
// neighbours.
func spaced(lo, hi float64, count int) []float64 {
	out := make([]float64, count)
	for k := range out {
		out[k] = lo * math.Pow(hi/lo, float64(k)/float64(count-1))
	}
	out[count-1] = hi
	return out
}

// clearOfMains moves f to the nearest frequency at least d away from the
// first five multiples of 50 and of 60 Hz: a step of T seconds tells two lines
// apart that lie 4/T or more from each other, and hum that strong is common.
// It leaves f where it is when only half of it or less, or twice it or more,
// would be clear.
func clearOfMains(f, d float64) float64 {
	blocked := func(x float64) bool {
		for h := 1.0; h <= 5; h++ {
			// a hair of room, so that an edge itself counts as clear
			if math.Abs(x-50*h) < d*(1-1e-9) || math.Abs(x-60*h) < d*(1-1e-9) {
				return true
			}
		}
		return false
	}
	if !blocked(f) {
		return f
	}
	best := math.Inf(1)
	for h := 1.0; h <= 5; h++ {
		for _, edge := range []float64{50*h - d, 50*h + d, 60*h - d, 60*h + d} {
			if edge > 0 && !blocked(edge) && math.Abs(edge-f) < math.Abs(best-f) {
				best = edge
			}
		}
	}
	if best <= f/2 || best >= 2*f {
		return f
	}
	return best
}
