package stimulus

import (
	"math"
	"math/big"
	"path/filepath"
	"reflect"
	"strings"
	"testing"

	"benchslip/capture/recording"
	"benchslip/capture/wav"
)

// parse is Parse for descriptions that must be right.
func parse(t testing.TB, text string) Spec {
	t.Helper()
	s, err := Parse(text)
	if err != nil {
		t.Fatal(err)
	}
	return s
}

// samplesOf makes the whole first channel in blocks of an odd size.
func samplesOf(t testing.TB, s Spec) []float64 {
	t.Helper()
	g, err := New(s)
	if err != nil {
		t.Fatal(err)
	}
	x := make([]float64, s.Frames())
	for at := 0; at < len(x); {
		n := g.Next(x[at:min(at+1009, len(x))])
		if n == 0 {
			t.Fatalf("ends after %d of %d frames", at, len(x))
		}
		at += n
	}
	if n := g.Next(make([]float64, 1)); n != 0 {
		t.Fatal("goes on after its end")
	}
	return x
}

// short are descriptions of every kind, short enough for tests.
var short = []string{
	"tone length=200ms", "pilot before=100ms after=100ms length=300ms",
	"stepped-tones count=5 each=100ms", "stepped-tones at=47Hz,137Hz,1kHz,10.5kHz each=100ms gap=0s",
	"stepped-levels count=4 each=100ms", "sweep length=500ms", "multitone period=200ms length=400ms from=50Hz",
	"multitone at=100Hz,200Hz,300Hz period=100ms length=100ms", "modulation-pair length=300ms", "difference-pair length=300ms",
	"pulse length=500ms", "white-noise length=300ms", "pink-noise length=300ms seed=7", "level-ramp length=300ms",
}

// TestEveryKind makes, writes, reads and recognises each kind, and checks
// what holds for all of them.
func TestEveryKind(t *testing.T) {
	seen := map[string]bool{}
	for _, text := range short {
		t.Run(text, func(t *testing.T) {
			s := parse(t, text)
			seen[s.Kind] = true
			again := parse(t, s.String())
			if !reflect.DeepEqual(s, again) || again.String() != s.String() {
				t.Fatalf("%q reads back as %q", s, again)
			}

			x := samplesOf(t, s)
			peak := s.peak()
			if s.Kind == "stepped-levels" || s.Kind == "level-ramp" {
				peak = fromDB(s.ToDBFS)
			}
			largest := 0.0
			for _, v := range x {
				largest = max(largest, math.Abs(v))
			}
			// Samples may miss the crests of the sum of two high tones by 4 %.
			if largest > peak*(1+1e-12) || largest < 0.95*peak {
				t.Errorf("largest sample %v, want %v", largest, peak)
			}
			start, length := s.Span()
			first := int(math.Round((start - s.FadeS) * float64(s.RateHz)))
			last := int(math.Round((start + length + s.FadeS) * float64(s.RateHz)))
			for i, v := range x {
				if v != 0 && (i < first || i >= last) {
					t.Fatalf("sample %d is %v, in the silence outside %d .. %d", i, v, first, last)
				}
			}
			if got := s.TotalS(); math.Abs(got-float64(len(x))/float64(s.RateHz)) > 1e-12 {
				t.Errorf("TotalS %v for %d frames", got, len(x))
			}

			path := filepath.Join(t.TempDir(), "s.wav")
			if err := Write(path, s); err != nil {
				t.Fatal(err)
			}
			r, err := wav.Open(path)
			if err != nil {
				t.Fatal(err)
			}
			defer r.Close()
			found, ok := FromInfo(r.Info().Text)
			if !ok || !reflect.DeepEqual(found, s) {
				t.Fatalf("recognised %v as %q", ok, found)
			}
			y, err := recording.ReadAll(r)
			if err != nil {
				t.Fatal(err)
			}
			// Dither and rounding move a 24-bit sample by at most 1.5 steps.
			for i := range x {
				if math.Abs(y[0][i]-x[i]) > 1.5/(1<<23) || math.Abs(y[1][i]-x[i]) > 1.5/(1<<23) {
					t.Fatalf("frame %d: file %v %v, made %v", i, y[0][i], y[1][i], x[i])
				}
			}
		})
	}
	for _, k := range Kinds() {
		if !seen[k.Name] {
			t.Errorf("kind %s is not tested", k.Name)
		}
		s, err := Parse(k.Name)
		if err != nil {
			t.Errorf("the defaults of %s cannot be made: %v", k.Name, err)
		}
		for _, rate := range []string{"44100Hz", "192kHz"} {
			if _, err := Parse(k.Name + " rate=" + rate); err != nil {
				t.Errorf("the defaults of %s cannot be made at %s: %v", k.Name, rate, err)
			}
		}
		if again, err := Parse(s.String()); err != nil || !reflect.DeepEqual(again, s) {
			t.Errorf("%q reads back as %q, %v", s, again, err)
		}
	}
}

func TestParse(t *testing.T) {
	s := parse(t, "sweep from=20Hz to=20kHz length=10s peak=-10dBFS")
	want := Spec{Kind: "sweep", FromHz: 20, ToHz: 20000, LengthS: 10, PeakDBFS: -10, BeforeS: 1, AfterS: 1, FadeS: 0.1,
		RateHz: 48000, Bits: 24, Second: SecondSame}
	if !reflect.DeepEqual(s, want) {
		t.Errorf("got  %+v\nwant %+v", s, want)
	}
	if got, want := s.String(), "sweep from=20Hz to=20kHz length=10s peak=-10dBFS before=1s after=1s fade=100ms rate=48kHz bits=24 second=same"; got != want {
		t.Errorf("got %q", got)
	}
	same := parse(t, "  sweep  to=20000 Hz length=10000ms\tpeak=-10 dBFS from=0.02kHz ")
	if !reflect.DeepEqual(s, same) {
		t.Errorf("another spelling reads as %+v", same)
	}
	// Values that decimal prefixes could spoil.
	odd := parse(t, "tone at=1234.5678Hz length=0.1s fade=0.0003s peak=-0.1dBFS rate=44.1kHz bits=32float second=none")
	if again := parse(t, odd.String()); !reflect.DeepEqual(odd, again) {
		t.Errorf("%q reads back as %q", odd, again)
	}
}

func TestParseRefuses(t *testing.T) {
	for _, c := range []struct{ text, want string }{
		{"", "empty stimulus"},
		{"swep from=20Hz", `unknown kind "swep"; did you mean "sweep"?`},
		{"zzz", "expected one of tone, pilot"},
		{"sweep form=20Hz", `sweep takes no key "form"; did you mean "from"?`},
		{"tone 1042Hz", `"1042Hz": expected key=value`},
		{"tone at=1042", "at=1042: expected a frequency, like 1042Hz"},
		{"tone at=10V", "expected a frequency"},
		{"tone at=100Hz,200Hz", "2 frequencies, expected one"},
		{"tone at=1042Hz at=943Hz", "at stands twice"},
		{"tone peak=-10dBu", "expected a level in dBFS"},
		{"tone peak=0dBFS", "a peak of 0 dBFS, expected -140 .. -0.1 dBFS"},
		{"tone at=24kHz", "a tone of 24kHz, expected above 0 and up to 0.49 of the rate (23.52kHz)"},
		{"tone at=-5Hz", "a tone of -5Hz"},
		{"tone length=0s", "length=0s"},
		{"tone fade=-1s", "fade=-1s"},
		{"tone length=100h", "length="},
		{"tone rate=8kHz", "a rate of 8000 Hz, expected 44100 .. 768000 Hz"},
		{"tone rate=44100.5Hz", "expected whole Hz"},
		{"tone bits=20", "expected 16, 24 or 32float"},
		{"tone second=left", "expected one of same, inverted"},
		{"sweep from=20kHz to=20Hz", "from=20kHz to=20Hz, expected 0 < from < to"},
		{"sweep to=23kHz", "0.47 of the rate (22.56kHz)"},
		{"sweep length=100ms", "too short for a sweep from 20Hz: make it at least 173ms"},
		{"stepped-tones count=1", "count=1, expected 2 .. 1000"},
		{"stepped-tones count=many", "expected a whole number"},
		{"stepped-tones at=1kHz,2kHz count=5", "count cannot stand beside at"},
		{"stepped-levels from=-1dBFS to=-20dBFS", "expected a rising level"},
		{"multitone period=100ms length=50ms", "at least one period"},
		{"multitone period=1000s length=1000s", "period=1000s"},
		{"multitone at=1Hz period=100ms", "no line of the grid"},
		{"difference-pair low=20kHz high=19kHz", "expected 0 < low < high"},
		{"pulse width=100ms", "do not fit into every=250ms"},
		{"pulse width=100us", "at least 8 samples"},
		{"pink-noise from=10kHz", "from=10kHz"},
		{"white-noise seed=-1", "whole number from 0"},
		{"stepped-tones each=3600s", "in all, expected at most 14400 s"},
	} {
		_, err := Parse(c.text)
		if err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%q: got %v, want %q", c.text, err, c.want)
		}
	}
}

// Somebody's own comment is no description, and a description from a later
// version with unknown keys is none that can be used.
func TestFromInfo(t *testing.T) {
	for _, text := range []map[string]string{nil, {}, {"ICMT": "tone"}, {"ICMT": "sweep of the lamp room"}, {"INAM": mark + "tone"}, {"ICMT": mark + "tone colour=red"}, {"ICMT": mark}} {
		if s, ok := FromInfo(text); ok {
			t.Errorf("%q taken for %q", text, s)
		}
	}
	if _, ok := FromInfo(map[string]string{"ICMT": mark + "tone"}); !ok {
		t.Error("the healthy twin is not recognised")
	}
}

func FuzzParse(f *testing.F) {
	for _, s := range short {
		f.Add(s)
	}
	f.Add("sweep from=20 Hz to=20kHz length=1e1s")
	f.Add("tone at=1e-300Hz")
	f.Add("stepped-tones from=1e-9Hz each=1e-9s")
	f.Fuzz(func(t *testing.T, text string) {
		s, err := Parse(text)
		if err != nil {
			if len(err.Error()) > 1000 {
				t.Fatalf("message of %d bytes", len(err.Error()))
			}
			return
		}
		again, err := Parse(s.String())
		if err != nil || !reflect.DeepEqual(s, again) {
			t.Fatalf("%q prints as %q, which reads as %q, %v", text, s, again, err)
		}
		if s.TotalS() > maxTotalS || s.Frames() < 1 {
			t.Fatalf("%q lasts %v s", text, s.TotalS())
		}
		g, err := New(s)
		if err != nil || s.Kind == "pink-noise" || s.Kind == "multitone" { // slow to begin
			return
		}
		x := make([]float64, 64)
		for range 4 {
			for _, v := range x[:g.Next(x)] {
				if !(math.Abs(v) < 1) {
					t.Fatalf("%q: sample %v", text, v)
				}
			}
		}
	})
}

// TestTurns compares the phase after long times with exact rational numbers.
func TestTurns(t *testing.T) {
	for _, c := range []struct {
		hz, rate float64
		n        int64
	}{{1042, 48000, 48000*3600 + 17}, {19999.9, 44100, 1 << 40}, {0.1, 192000, 12345678901}, {997.3, 96000, -777777}, {21000, 44100, 3}} {
		exact := new(big.Rat).Mul(new(big.Rat).SetFloat64(c.hz), new(big.Rat).SetInt64(c.n))
		exact.Quo(exact, new(big.Rat).SetFloat64(c.rate))
		floor := new(big.Int).Div(exact.Num(), exact.Denom()) // Euclidean: rounds down
		want, _ := exact.Sub(exact, new(big.Rat).SetInt(floor)).Float64()
		if got := turns(c.hz, c.rate, c.n); math.Abs(got-want) > 4e-16 {
			t.Errorf("%v Hz at frame %d: got %.17g turns, want %.17g", c.hz, c.n, got, want)
		}
	}
}
