package stimulus

import (
	"fmt"
	"math"
	"strconv"
	"strings"

	"benchslip/capture/unit"
)

// Spec is a stimulus in numbers. Fields that a kind does not use are zero.
type Spec struct {
	Kind string

	AtHz     []float64 // frequency of a tone; list of frequencies
	FromHz   float64   // lowest and highest frequency
	ToHz     float64
	LowHz    float64 // the two tones of a pair
	HighHz   float64
	FromDBFS float64 // levels of a sine, 20 lg(peak / full scale)
	ToDBFS   float64
	PeakDBFS float64 // largest |sample|
	Count    int     // steps or tones
	Seed     uint64  // of noise

	LengthS float64 // of the signal at full level; of all steps or pulses where each has its own
	EachS   float64 // of one step
	GapS    float64 // silence between steps
	PeriodS float64 // after which a multitone repeats
	WidthS  float64 // of a pulse's positive half
	EveryS  float64 // from pulse to pulse

	BeforeS float64 // silence
	AfterS  float64
	FadeS   float64 // raised cosine, outside the length

	RateHz int
	Bits   int // 16, 24 integer with dither; 32 float
	Second string
}

// What the second channel carries.
const (
	SecondNone     = "none"     // there is none: a file of one channel
	SecondSame     = "same"     // the first channel again: a reference, or both legs driven together
	SecondInverted = "inverted" // the first with its sign turned: both legs driven apart
	SecondSilent   = "silent"
)

// Kind is one kind of stimulus, for help texts.
type Kind struct {
	Name string
	Doc  string
	Keys []Key
}

// Key is one key of a kind.
type Key struct {
	Name    string
	Default string // "" when the key has none
	Doc     string

	set func(*Spec, string) error
	get func(*Spec) string // "" leaves the key out
}

// Kinds lists what can be made, in the order of the help.
func Kinds() []Kind {
	length := func(d string) Key {
		return seconds("length", d, "time at full level", func(s *Spec) *float64 { return &s.LengthS })
	}
	peak := level("peak", "-10dBFS", "largest sample against full scale", func(s *Spec) *float64 { return &s.PeakDBFS })
	at := hertzList("at", "1042Hz", "frequency; 943 and 1042 Hz keep clear of the multiples of 50 and 60 Hz with their first harmonics")
	from := func(d, doc string) Key {
		return hertz("from", d, doc, func(s *Spec) *float64 { return &s.FromHz })
	}
	to := func(doc string) Key {
		return hertz("to", "20kHz", doc, func(s *Spec) *float64 { return &s.ToHz })
	}
	count := func(d, doc string) Key {
		return integer("count", d, doc, func(s *Spec) *int { return &s.Count })
	}
	each := seconds("each", "1s", "time of one step at full level", func(s *Spec) *float64 { return &s.EachS })
	gap := seconds("gap", "200ms", "silence between steps", func(s *Spec) *float64 { return &s.GapS })
	fromLevel := func(d string) Key {
		return level("from", d, "first level", func(s *Spec) *float64 { return &s.FromDBFS })
	}
	toLevel := level("to", "-1dBFS", "last level", func(s *Spec) *float64 { return &s.ToDBFS })
	low := func(d string) Key {
		return hertz("low", d, "lower tone", func(s *Spec) *float64 { return &s.LowHz })
	}
	high := func(d string) Key {
		return hertz("high", d, "upper tone", func(s *Spec) *float64 { return &s.HighHz })
	}
	seed := Key{Name: "seed", Default: "1", Doc: "number that chooses the noise",
		set: func(s *Spec, v string) (err error) {
			if s.Seed, err = strconv.ParseUint(v, 10, 64); err != nil {
				return fmt.Errorf("expected a whole number from 0")
			}
			return nil
		},
		get: func(s *Spec) string { return strconv.FormatUint(s.Seed, 10) }}

	kinds := []Kind{
		{"tone", "one steady sine", []Key{at, length("10s"), peak}},
		{"pilot", "silence, a sine, silence: gain and noise at one knob position", []Key{at, length("8s"), peak}},
		{"stepped-tones", "sines one after the other, equally spaced in octaves or listed by at; spaced ones keep clear of the mains",
			[]Key{hertzList("at", "", "frequencies, with commas, in place of from, to and count"), from("20Hz", "first frequency"), to("last frequency"), count("31", "number of steps"), each, gap, peak}},
		{"stepped-levels", "one sine at levels equally spaced in dB", []Key{at, fromLevel("-20dBFS"), toLevel, count("20", "number of steps"), each, gap}},
		{"sweep", "exponential sine sweep, synchronised: its length is stretched a little so that harmonics keep their phase",
			[]Key{from("20Hz", "first frequency"), to("last frequency"), length("10s"), peak}},
		{"multitone", "many sines at once on a grid of 1/period, phases after Schroeder; spaced ones take odd multiples",
			[]Key{hertzList("at", "", "frequencies, with commas, in place of from, to and count"), from("20Hz", "lowest tone"), to("highest tone"), count("31", "number of tones"),
				seconds("period", "1s", "time after which it repeats", func(s *Spec) *float64 { return &s.PeriodS }), length("10s"), peak}},
		{"modulation-pair", "low and high sine 4:1 for modulation distortion (IEC 60268-3)", []Key{low("60Hz"), high("7kHz"), length("10s"), peak}},
		{"difference-pair", "two equal sines close together for difference-frequency distortion (IEC 60268-3)", []Key{low("19kHz"), high("20kHz"), length("10s"), peak}},
		{"pulse", "pulses with a high positive and a low, longer negative half, for polarity; without DC",
			[]Key{seconds("width", "1ms", "width of the positive half", func(s *Spec) *float64 { return &s.WidthS }),
				seconds("every", "250ms", "from pulse to pulse", func(s *Spec) *float64 { return &s.EveryS }), length("5s"), peak}},
		{"white-noise", "noise of equal density at all frequencies, evenly distributed values", []Key{length("10s"), peak, seed}},
		{"pink-noise", "noise whose density falls 10 dB a decade", []Key{from("20Hz", "frequency from which the density falls"), length("10s"), peak, seed}},
		{"level-ramp", "one sine whose level rises evenly in dB, to see where clipping begins", []Key{at, fromLevel("-40dBFS"), toLevel, length("20s")}},
	}
	for i := range kinds {
		silence, fade := "1s", "10ms"
		switch kinds[i].Name {
		case "pilot":
			silence = "3s"
		case "sweep":
			fade = "100ms"
		}
		for _, k := range common(silence, fade) {
			if k.Name != "fade" || kinds[i].Name != "pulse" { // a pulse ends at 0 by itself
				kinds[i].Keys = append(kinds[i].Keys, k)
			}
		}
	}
	return kinds
}

// common are the keys of every kind.
func common(silence, fade string) []Key {
	return []Key{
		seconds("before", silence, "silence before", func(s *Spec) *float64 { return &s.BeforeS }),
		seconds("after", silence, "silence after", func(s *Spec) *float64 { return &s.AfterS }),
		seconds("fade", fade, "fade in and out, outside the length", func(s *Spec) *float64 { return &s.FadeS }),
		{Name: "rate", Default: "48kHz", Doc: "sample rate", set: setRate, get: func(s *Spec) string { return hertzText(float64(s.RateHz)) }},
		{Name: "bits", Default: "24", Doc: "16, 24 (integer, dithered) or 32float", set: setBits, get: bitsText},
		{Name: "second", Default: SecondSame, Doc: "second channel: same, inverted, silent, none", set: setSecond, get: func(s *Spec) string { return s.Second }},
	}
}

// find returns the kind of that name.
func find(name string) (Kind, bool) {
	for _, k := range Kinds() {
		if k.Name == name {
			return k, true
		}
	}
	return Kind{}, false
}

// String prints the description in full: every key of the kind in the order
// of Kinds, in a form that Parse reads back to an equal Spec.
func (s Spec) String() string {
	k, _ := find(s.Kind)
	words := []string{s.Kind}
	for _, key := range k.Keys {
		if v := key.get(&s); v != "" {
			words = append(words, key.Name+"="+v)
		}
	}
	return strings.Join(words, " ")
}

// peak is the largest |sample| in FS.
func (s Spec) peak() float64 { return fromDB(s.PeakDBFS) }

func fromDB(db float64) float64 { return math.Pow(10, db/20) }

// hertzText and secondsText print shortly what unit.Parse reads back to the
// very same number.
func hertzText(v float64) string   { return scaledText(v, "Hz", v >= 1000, "kHz", 1e-3) }
func secondsText(v float64) string { return scaledText(v, "s", v > 0 && v < 1, "ms", 1e3) }

func scaledText(v float64, symbol string, try bool, prefixed string, factor float64) string {
	if try {
		text := strconv.FormatFloat(v*factor, 'f', -1, 64) + prefixed
		if q, err := unit.Parse(text); err == nil && q.Linear() == v {
			return text
		}
	}
	return strconv.FormatFloat(v, 'f', -1, 64) + symbol
}
