package stimulus

import (
	"fmt"
	"slices"
)

// Limits of what is made.
const (
	MinRateHz = 44_100
	MaxRateHz = 768_000
	MaxPeakDB = -0.1 // dBFS: room for dither and for converters that overshoot between samples
	minPeakDB = -140 // below the dither of every width
	maxTotalS = 4 * 3600
	maxCount  = 1000
	maxGrid   = 1 << 22 // frames of a multitone's period, held in memory

	toneTop  = 0.49 // of the rate: highest tone, and where a sweep's fade ends
	sweepTop = 0.47 // of the rate: highest end of a sweep; leaves room for that fade
)

// Check reports the first reason why the stimulus cannot be made, with the
// range that can.
func (s Spec) Check() error {
	kind, ok := find(s.Kind)
	if !ok {
		return fmt.Errorf("stimulus: unknown kind %q", clip(s.Kind))
	}
	bad := func(format string, args ...any) error {
		return fmt.Errorf("stimulus: "+format, args...)
	}
	switch {
	case s.RateHz < MinRateHz || s.RateHz > MaxRateHz:
		return bad("a rate of %d Hz, expected %d .. %d Hz", s.RateHz, MinRateHz, MaxRateHz)
	case s.Bits != 16 && s.Bits != 24 && s.Bits != 32:
		return bad("%d bits, expected 16, 24 or 32float", s.Bits)
	case !slices.Contains([]string{SecondSame, SecondInverted, SecondSilent, SecondNone}, s.Second):
		return bad("unknown second channel %q", clip(s.Second))
	}
	rate := float64(s.RateHz)
	top, topWord := toneTop*rate, "0.49"
	if s.Kind == "sweep" {
		top, topWord = sweepTop*rate, "0.47"
	}
	for _, k := range kind.Keys {
		var err error
		switch k.Name {
		case "at":
			for _, f := range s.AtHz {
				if !(f > 0 && f <= top) {
					err = bad("a tone of %s, expected above 0 and up to %s of the rate (%s)", hertzText(f), topWord, hertzText(top))
				}
			}
			if len(s.AtHz) > maxCount {
				err = bad("%d frequencies, expected up to %d", len(s.AtHz), maxCount)
			}
			if !kind.takesList() && len(s.AtHz) != 1 {
				err = bad("%d frequencies, expected one", len(s.AtHz))
			}
		case "length", "each", "period", "width", "every":
			if v := s.secondsOf(k.Name); !(v*rate >= 1 && v <= maxTotalS) {
				err = bad("%s=%s, expected at least one sample and at most %d s", k.Name, secondsText(v), maxTotalS)
			}
		case "before", "after", "fade", "gap":
			if v := s.secondsOf(k.Name); !(v >= 0 && v <= maxTotalS) {
				err = bad("%s=%s, expected 0 .. %d s", k.Name, secondsText(v), maxTotalS)
			}
		case "peak":
			if !(s.PeakDBFS >= minPeakDB && s.PeakDBFS <= MaxPeakDB) {
				err = bad("a peak of %v dBFS, expected %v .. %v dBFS", s.PeakDBFS, minPeakDB, MaxPeakDB)
			}
		}
		if err != nil {
			return err
		}
	}
	if err := s.checkKind(top, topWord); err != nil {
		return err
	}
	if t := s.TotalS(); !(t <= maxTotalS) {
		return bad("%s in all, expected at most %d s", secondsText(t), maxTotalS)
	}
	return nil
}

// checkKind looks at what only some kinds have. top is the highest frequency.
func (s Spec) checkKind(top float64, topWord string) error {
	bad := func(format string, args ...any) error {
		return fmt.Errorf("stimulus: "+format, args...)
	}
	ordered := func(lo, hi float64, loWord, hiWord string) error {
		if !(lo > 0 && lo < hi && hi <= top) {
			return bad("%s=%s %s=%s, expected 0 < %s < %s, up to %s of the rate (%s)", loWord, hertzText(lo), hiWord, hertzText(hi), loWord, hiWord, topWord, hertzText(top))
		}
		return nil
	}
	switch s.Kind {
	case "stepped-tones", "multitone":
		if len(s.AtHz) == 0 {
			if s.Count < 2 || s.Count > maxCount {
				return bad("count=%d, expected 2 .. %d", s.Count, maxCount)
			}
			if err := ordered(s.FromHz, s.ToHz, "from", "to"); err != nil {
				return err
			}
		}
		if s.Kind == "stepped-tones" {
			return nil
		}
		if n := s.gridFrames(); n < 2 || n > maxGrid {
			return bad("period=%s, expected at most %d samples", secondsText(s.PeriodS), maxGrid)
		}
		if s.LengthS < s.PeriodS {
			return bad("length=%s, expected at least one period of %s", secondsText(s.LengthS), secondsText(s.PeriodS))
		}
		if len(s.gridLines()) == 0 {
			return bad("no line of the grid of %s lies at these frequencies; make the period longer", hertzText(1/s.PeriodS))
		}
	case "sweep":
		if err := ordered(s.FromHz, s.ToHz, "from", "to"); err != nil {
			return err
		}
		if s.rounds() < 1 {
			return bad("length=%s is too short for a sweep from %s: make it at least %s", secondsText(s.LengthS), hertzText(s.FromHz), secondsText(s.shortest()))
		}
	case "modulation-pair", "difference-pair":
		return ordered(s.LowHz, s.HighHz, "low", "high")
	case "pink-noise":
		if !(s.FromHz >= 1 && s.FromHz <= top/10) {
			return bad("from=%s, expected 1 Hz .. a tenth of %s of the rate", hertzText(s.FromHz), topWord)
		}
	case "pulse":
		if 5*s.WidthS > s.EveryS {
			return bad("pulses of 5 x %s do not fit into every=%s", secondsText(s.WidthS), secondsText(s.EveryS))
		}
		if s.EveryS > s.LengthS {
			return bad("length=%s, expected at least one pulse of every=%s", secondsText(s.LengthS), secondsText(s.EveryS))
		}
		if s.WidthS*float64(s.RateHz) < 8 {
			return bad("width=%s, expected at least 8 samples", secondsText(s.WidthS))
		}
	case "stepped-levels", "level-ramp":
		if s.Kind == "stepped-levels" && (s.Count < 2 || s.Count > maxCount) {
			return bad("count=%d, expected 2 .. %d", s.Count, maxCount)
		}
		for _, l := range []float64{s.FromDBFS, s.ToDBFS} {
			if !(l >= minPeakDB && l <= MaxPeakDB) {
				return bad("a level of %v dBFS, expected %v .. %v dBFS", l, minPeakDB, MaxPeakDB)
			}
		}
		if s.FromDBFS >= s.ToDBFS {
			return bad("from=%vdBFS to=%vdBFS, expected a rising level: the lowest first", s.FromDBFS, s.ToDBFS)
		}
	}
	return nil
}

// secondsOf is the time behind a key.
func (s Spec) secondsOf(key string) float64 {
	switch key {
	case "length":
		return s.LengthS
	case "each":
		return s.EachS
	case "gap":
		return s.GapS
	case "period":
		return s.PeriodS
	case "width":
		return s.WidthS
	case "every":
		return s.EveryS
	case "before":
		return s.BeforeS
	case "after":
		return s.AfterS
	}
	return s.FadeS
}
