package run

import (
	"encoding/binary"
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"context"

	"benchslip/analyze"
	"benchslip/analyze/internal/trial"
	"benchslip/analyze/job"
	"benchslip/analyze/slip"
	"benchslip/capture/wav"
)

// bent is a folder of takes that cannot show what is asked of them, and of
// twins that can.
type bent struct {
	t    *testing.T
	dir  string
	text strings.Builder
	want []wanted
}

// wanted is what a row must say.
type wanted struct {
	row, code string // code "": it must be measured
	says      string // in its reason, flag or figures
	advice    string
	bound     bool
	verdict   string
}

// write writes a take of 24 bits with dither and names it in the job. Full
// scale is 1 V peak.
func (b *bent) write(name, keys string, channels ...*trial.Signal) {
	b.t.Helper()
	for i, c := range channels {
		c.Quantise(24, true, uint64(i)+uint64(len(name)))
		for k, v := range c.X {
			c.X[k] = max(-1, min(1-1.0/(1<<23), v))
		}
	}
	w, err := wav.Create(filepath.Join(b.dir, name+".wav"), wav.Format{RateHz: int(channels[0].Rate), Channels: len(channels), Bits: 24}, nil)
	if err != nil {
		b.t.Fatal(err)
	}
	var data [][]float64
	for _, c := range channels {
		data = append(data, c.X)
	}
	if err := w.WriteBlock(data); err != nil {
		b.t.Fatal(err)
	}
	if err := w.Close(); err != nil {
		b.t.Fatal(err)
	}
	b.take(name, name+".wav", keys)
}

func (b *bent) file(name, file string, data []byte, keys string) {
	b.t.Helper()
	if err := os.WriteFile(filepath.Join(b.dir, file), data, 0o666); err != nil {
		b.t.Fatal(err)
	}
	b.take(name, file, keys)
}

func (b *bent) take(name, file, keys string) {
	if !strings.Contains(keys, "gear") {
		keys += "\ngear = \"box\""
	}
	fmt.Fprintf(&b.text, "[takes.%s]\nfile = %q\n%s\n", name, file, keys)
}

// refused and measured add a row.
func (b *bent) refused(name, measure, keys string, w wanted) {
	fmt.Fprintf(&b.text, "[[checks]]\nname = %q\nmeasure = %q\n%s\n", name, measure, keys)
	w.row = name
	b.want = append(b.want, w)
}

func (b *bent) measured(name, measure, keys string) { b.refused(name, measure, keys, wanted{}) }

const rate = 16000

func played(seconds, hz float64) *trial.Signal {
	return trial.New(rate, seconds).Tone(hz, 0.3, 0.4).Noise(3e-5, uint64(hz*seconds))
}

func dead(seconds float64) *trial.Signal { return trial.New(rate, seconds).Noise(1e-4, 77) }

const narrow = "band = \"20 Hz .. 7 kHz\"\n"

// TestRefusals: each kind of take that cannot show what is asked is refused
// with its code, evidence and a way out, while its twin is measured. The codes
// are those of the program's own contract; the borders (10 periods of mains,
// 10 of a band's lower edge, 1.8 and 5 of a tone, 2/T from a mains line) are
// stated where the measures apply them.
func TestRefusals(t *testing.T) {
	b := &bent{t: t, dir: t.TempDir()}
	b.text.WriteString(`format = 1
[mains]
frequency = "50 Hz"
[gear.box]
kind = "audio"
full_scale_peak = "1 V"
uncertainty = "1 %"
coupling = "dc"
[gear.blocked]
kind = "audio"
full_scale_peak = "1 V"
uncertainty = "1 %"
coupling = "ac"
[gear.bare]
kind = "audio"
[gear.scope]
kind = "scope"
uncertainty = "3 %"
`)
	// Recorder at full scale.
	s := played(4, 1042.3)
	for i := 16000; i < 17000; i++ {
		s.X[i] *= 5 // clipped where it is written
	}
	b.write("clipped", "in_level = \"10 mV\"\nin_uncertainty = \"1 %\"", s)
	b.refused("clipped", "gain", `take = "clipped"`, wanted{code: analyze.Clipped, says: "full scale", advice: "lower the level"})
	b.refused("clipped noise", "noise", narrow+`take = "clipped"`, wanted{code: analyze.Clipped, says: "1.0000", advice: "set a span"})
	b.measured("clipped outside the span", "gain", "take = \"clipped\"\nspan = \"1.5 s ..\"")

	// DC through a capacitor.
	b.write("offset", "", played(2, 1042.3).DC(0.05))
	b.write("offset_ac", "gear = \"blocked\"", played(2, 1042.3))
	b.refused("DC through a capacitor", "dc", `take = "offset_ac"`, wanted{code: analyze.ACCoupled, says: "AC-coupled", advice: "coupling"})
	b.measured("DC", "dc", `take = "offset"`)

	// Too short.
	b.write("near_mains", "in_level = \"10 mV\"\nin_uncertainty = \"1 %\"", trial.New(rate, 1).Tone(51, 0.3, 0).Mains(50, 0, []float64{0.01}, 2).Noise(1e-5, 3))
	b.write("near_mains_long", "in_level = \"10 mV\"\nin_uncertainty = \"1 %\"", trial.New(rate, 6).Tone(51, 0.3, 0).Mains(50, 0, []float64{0.01}, 2).Noise(1e-5, 3))
	b.refused("1 Hz from the mains in 1 s", "gain", "take = \"near_mains\"\nat = \"51 Hz\"", wanted{code: analyze.TooShort, says: "mains order 1", advice: "record"})
	b.measured("1 Hz from the mains in 6 s", "gain", "take = \"near_mains_long\"\nat = \"51 Hz\"")
	b.write("blink", "in_level = \"10 mV\"\nin_uncertainty = \"1 %\"", played(0.1, 1042.3))
	b.refused("hum of 0.1 s", "hum", `take = "blink"`, wanted{code: analyze.TooShort, says: "periods of the mains", advice: "record"})
	b.refused("noise from 20 Hz in 0.1 s", "noise", narrow+`take = "blink"`, wanted{code: analyze.TooShort, says: "0.5 s", advice: "record"})
	b.measured("gain of 0.1 s", "gain", `take = "blink"`)
	b.write("few", "in_level = \"10 mV\"\nin_uncertainty = \"1 %\"", trial.New(rate, 0.03).Tone(101.3, 0.3, 0).Noise(1e-5, 4))
	b.refused("THD of three periods", "thd", `take = "few"`, wanted{code: analyze.TooShort, says: "3.04 periods", advice: "record"})
	b.measured("gain of three periods", "gain", `take = "few"`)
	b.refused("1.5 periods", "gain", "take = \"few\"\nspan = \"0 s .. 0.0148 s\"", wanted{code: analyze.TooShort, advice: "record"})
	b.refused("a span outside the record", "gain", "take = \"blink\"\nspan = \"0 s .. 3 s\"", wanted{code: analyze.TooShort, says: "0.1 s", advice: "inside the record"})
	b.write("hum", "", trial.New(rate, 4).Mains(50.02, 0.01, []float64{1e-3, 3e-4, 5e-4}, 5).Noise(1e-4, 6))
	b.measured("hum of 4 s", "hum", `take = "hum"`)
	b.measured("noise of 4 s", "noise", narrow+`take = "hum"`)

	// No tone, the wrong one, two.
	b.write("tone", "in_level = \"10 mV\"\nin_uncertainty = \"1 %\"", played(4, 1042.3).Tone(2084.6, 1e-3, 1))
	b.write("noise", "in_level = \"10 mV\"\nin_uncertainty = \"1 %\"", dead(4))
	b.refused("no tone", "thd", `take = "noise"`, wanted{code: analyze.NoTone, advice: "tone again"})
	b.refused("the wrong tone", "gain", "take = \"tone\"\nat = \"2 kHz\"", wanted{code: analyze.NoTone, says: "1042", advice: "1042"})
	b.measured("the right tone", "gain", "take = \"tone\"\nat = \"1042 Hz\"")
	b.write("two", "in_level = \"10 mV\"\nin_uncertainty = \"1 %\"", played(4, 1042.3).Tone(1700, 0.28, 1))
	b.refused("two tones", "gain", `take = "two"`, wanted{code: analyze.AmbiguousTone, says: "1700", advice: "`at`"})
	b.measured("one of two tones", "gain", "take = \"two\"\nat = \"1.7 kHz\"")

	// Out of band.
	b.refused("noise to 20 kHz at 16 kHz", "noise", `take = "noise"`, wanted{code: analyze.Bandwidth, says: "20000", advice: "record at"})
	b.write("high", "", played(2, 5000.3))
	b.refused("no harmonic below half the rate", "thd", `take = "high"`, wanted{code: analyze.Bandwidth, says: "harmonic", advice: "lower tone"})
	b.refused("tone outside the band", "thdn", "take = \"high\"\nband = \"20 Hz .. 2 kHz\"", wanted{code: analyze.Bandwidth, says: "outside the band", advice: "band"})
	b.measured("THD+N in its band", "thdn", narrow+`take = "high"`)

	// Below detection, with a bound that judges.
	b.write("clean", "in_level = \"10 mV\"\nin_uncertainty = \"1 %\"", played(4, 1042.3))
	b.refused("far better than its limit", "thd", "take = \"clean\"\nmax = \"0.1 %\"", wanted{code: analyze.BelowDetection, bound: true, verdict: slip.Pass})
	b.refused("bound beyond the limit", "thd", "take = \"clean\"\nmax = \"0.00001 %\"", wanted{code: analyze.BelowDetection, bound: true, verdict: slip.NotMeasurable, advice: "record longer"})
	b.measured("THD", "thd", "take = \"tone\"\nmax = \"1 %\"")
	b.refused("no hum", "hum", `take = "noise"`, wanted{code: analyze.BelowDetection, bound: true, says: "stands out", advice: "record"})
	b.write("common", "in_level = \"0.2 V\"\nin_uncertainty = \"1 %\"", dead(4))
	b.write("common_seen", "in_level = \"0.2 V\"\nin_uncertainty = \"1 %\"", dead(4).Tone(1042.3, 1e-3, 0))
	b.refused("no common-mode line", "cmrr", "differential = \"tone\"\ncommon = \"common\"\nmin = \"60 dB\"", wanted{code: analyze.BelowDetection, bound: true, verdict: slip.Pass})
	b.measured("CMRR", "cmrr", "differential = \"tone\"\ncommon = \"common_seen\"\nmin = \"60 dB\"")

	// Impossible.
	b.write("quiet", "", trial.New(rate, 4).Noise(1e-5, 8))
	ein := narrow + "take = \"quiet\"\nsource = \"150 ohm\"\n"
	b.refused("noise below that of the source", "ein", ein+`gain = "60 dB"`, wanted{code: analyze.Impossible, says: "thermal", advice: "gain"})
	b.measured("EIN", "ein", ein+`gain = "30 dB"`)
	b.refused("an output beyond the rails", "level", narrow+"take = \"tone\"\nrails = \"0.1 V\"", wanted{code: analyze.Impossible, says: "rails", advice: "full_scale_peak"})
	b.measured("an output within the rails", "level", narrow+"take = \"tone\"\nrails = \"15 V\"")

	// Volts without a full scale.
	b.write("no_volts", "gear = \"bare\"\nin_level = \"10 mV\"\nin_uncertainty = \"1 %\"", played(2, 1042.3).Tone(2084.6, 1e-3, 0))
	b.refused("volts without a full scale", "level", narrow+"take = \"no_volts\"\nmax = \"1 V\"", wanted{code: analyze.Uncalibrated, says: "full scale", advice: "full_scale_peak"})
	b.refused("gain against volts without a full scale", "gain", `take = "no_volts"`, wanted{code: analyze.Uncalibrated, advice: "full_scale_peak"})
	b.measured("a ratio without a full scale", "thd", `take = "no_volts"`)
	b.measured("dBFS without a full scale", "level", narrow+"take = \"no_volts\"\nmax = \"0 dBFS\"")

	// Nothing there.
	b.take("absent", "absent.wav", "")
	b.refused("no file", "level", narrow+`take = "absent"`, wanted{code: analyze.MissingTake, says: "absent.wav", advice: "record it"})
	b.file("garbage", "garbage.wav", []byte("RIFF no, this is a letter, not a recording at all"), "")
	b.refused("no recording", "level", narrow+`take = "garbage"`, wanted{code: analyze.Unreadable, says: "garbage.wav"})
	b.file("foreign", "foreign.wav", wavOf(0x0002, make([]byte, 4000)), "")
	b.refused("a coding that is not read", "level", narrow+`take = "foreign"`, wanted{code: analyze.Unsupported, says: "foreign.wav"})
	b.file("holes", "holes.csv", []byte(table(2000, 700)), "gear = \"scope\"")
	b.refused("cells without a value", "level", "band = \"20 Hz .. 4 kHz\"\ntake = \"holes\"", wanted{code: analyze.Unreadable, says: "without a value", advice: "span"})
	b.measured("a span beside them", "level", "band = \"20 Hz .. 4 kHz\"\ntake = \"holes\"\nspan = \"80 ms ..\"")
	b.write("flat", "in = 2", trial.New(rate, 2).DC(0), played(2, 1042.3))
	b.file("still", "still.wav", wavOf(1, make([]byte, 64000)), "")
	b.refused("every sample equal", "thd", `take = "still"`, wanted{code: analyze.NoSignal, says: "equal", advice: "connection"})

	// The instrument's own limits.
	b.write("box_floor", "", trial.New(rate, 4).Noise(9e-5, 9))
	b.write("low_floor", "", trial.New(rate, 4).Noise(1e-5, 10))
	b.refused("noise at the recorder's own", "noise", narrow+"take = \"noise\"\nfloor = \"box_floor\"\nmax = \"1 mV\"", wanted{code: analyze.FloorLimited, bound: true, verdict: slip.Pass, says: "floor"})
	b.measured("noise over the recorder's own", "noise", narrow+"take = \"noise\"\nfloor = \"low_floor\"")
	b.file("coarse", "coarse.wav", eightBits(played(2, 1042.3)), "")
	b.refused("THD on eight bits", "thd", "take = \"coarse\"\nmax = \"1 %\"", wanted{code: analyze.FloorLimited, bound: true, verdict: slip.Pass, says: "steps"})

	// Nothing to decide by.
	b.write("quadrature", "in = 2", trial.New(rate, 2).Tone(1042.3, 0.3, 1.5708).Noise(1e-5, 11), trial.New(rate, 2).Tone(1042.3, 0.3, 0).Noise(1e-5, 12))
	b.write("follows", "in = 2", trial.New(rate, 2).Tone(1042.3, 0.3, 0.2).Noise(1e-5, 11), trial.New(rate, 2).Tone(1042.3, 0.3, 0).Noise(1e-5, 12))
	b.refused("90 degrees", "polarity", `take = "quadrature"`, wanted{code: analyze.NotEnoughPoints, says: "90", advice: "frequency"})
	b.measured("0.2 rad", "polarity", `take = "follows"`)

	// Takes that a flag makes unfit.
	lost := played(4, 1042.3)
	lost.X = append(lost.X[:30000:30000], lost.X[30077:]...)
	b.write("lost", "in_level = \"10 mV\"\nin_uncertainty = \"1 %\"", lost)
	b.refused("lost samples", "thdn", narrow+`take = "lost"`, wanted{code: analyze.UnfitTake, says: "gap", advice: "span"})
	b.refused("gain over lost samples", "gain", `take = "lost"`, wanted{code: analyze.UnfitTake, says: "gap", advice: "span"})
	b.measured("before the loss", "thdn", narrow+"take = \"lost\"\nspan = \"0 s .. 1.8 s\"")
	b.measured("level over lost samples", "level", narrow+`take = "lost"`)
	ridden := played(6, 1042.3)
	for i := range ridden.X {
		ridden.X[i] *= 1 - 0.2*float64(i)/float64(len(ridden.X))
	}
	b.write("ridden", "in_level = \"10 mV\"\nin_uncertainty = \"1 %\"", ridden)
	b.refused("gain that rides", "gain", `take = "ridden"`, wanted{code: analyze.UnfitTake, says: "gain-riding", advice: "driver"})
	b.measured("frequency under riding gain", "tone_frequency", `take = "ridden"`)
	half := trial.New(rate, 2)
	twin := played(2, 1042.3).Quantise(24, true, 1)
	for i, v := range twin.X {
		half.X[i] = v / 2
	}
	b.file("copy", "copy.wav", pcm24(twin, half), "in = 2")
	b.refused("a copy for an input", "gain", `take = "copy"`, wanted{code: analyze.UnfitTake, says: "identical-channels", advice: "channel of its own"})
	b.measured("THD of a copied channel", "thdn", narrow+`take = "copy"`)

	// Conditions that differ.
	b.write("gained", "where = { gain = \"20 dB\" }", played(2, 1042.3))
	b.refused("another gain", "level", narrow+"take = \"gained\"\nwhere = { gain = \"40 dB\" }", wanted{code: analyze.NotApplicable, says: "gain", verdict: slip.NotApplicable})
	b.measured("the same gain", "level", narrow+"take = \"gained\"\nwhere = { gain = \"20 dB\" }")

	path := filepath.Join(b.dir, "job.toml")
	if err := os.WriteFile(path, []byte(b.text.String()), 0o666); err != nil {
		t.Fatal(err)
	}
	j, err := job.Load(path, job.Options{})
	if err != nil {
		t.Fatal(err)
	}
	got, err := Run(context.Background(), j, Options{})
	if err != nil {
		t.Fatal(err)
	}
	b.compare(got)
}

func (b *bent) compare(got *slip.Slip) {
	t := b.t
	kinds := map[string]int{}
	for i, w := range b.want {
		c := &got.Checks[i]
		if w.code == "" {
			if c.Value == nil {
				t.Errorf("%s: not measured: %s", w.row, c.Reason)
			}
			continue
		}
		kinds[w.code]++
		switch {
		case c.Value != nil:
			t.Errorf("%s: %g %s, want %s", w.row, *c.Value, c.Unit, w.code)
		case !strings.HasPrefix(c.Reason, w.code+": "):
			t.Errorf("%s: %q, want %s", w.row, c.Reason, w.code)
		case w.says != "" && !strings.Contains(c.Reason, w.says):
			t.Errorf("%s: %q does not say %q", w.row, c.Reason, w.says)
		case w.verdict != slip.Pass && w.verdict != slip.NotApplicable && c.Advice == "", w.advice != "" && !strings.Contains(c.Advice, w.advice):
			t.Errorf("%s: advice %q, want one with %q", w.row, c.Advice, w.advice)
		case w.bound != (c.Bound != nil):
			t.Errorf("%s: bound %v", w.row, c.Bound)
		}
		want := w.verdict
		if want == "" {
			want = slip.NotMeasurable
		}
		if c.Verdict != want {
			t.Errorf("%s: %s, want %s", w.row, c.Verdict, want)
		}
	}
	if len(kinds) < 15 {
		t.Errorf("only %d kinds of refusals: %v", len(kinds), kinds)
	}
}

// wavOf is a WAV file of one channel, 16 bits, with a format tag of its own.
func wavOf(tag uint16, data []byte) []byte {
	h := make([]byte, 44)
	copy(h, "RIFF")
	binary.LittleEndian.PutUint32(h[4:], uint32(36+len(data)))
	copy(h[8:], "WAVEfmt ")
	binary.LittleEndian.PutUint32(h[16:], 16)
	binary.LittleEndian.PutUint16(h[20:], tag)
	binary.LittleEndian.PutUint16(h[22:], 1)
	binary.LittleEndian.PutUint32(h[24:], rate)
	binary.LittleEndian.PutUint32(h[28:], 2*rate)
	binary.LittleEndian.PutUint16(h[32:], 2)
	binary.LittleEndian.PutUint16(h[34:], 16)
	copy(h[36:], "data")
	binary.LittleEndian.PutUint32(h[40:], uint32(len(data)))
	return append(h, data...)
}

// eightBits is a WAV file of 8 bits, rounded without dither.
func eightBits(s *trial.Signal) []byte {
	s.Quantise(8, false, 0)
	data := make([]byte, len(s.X))
	for i, v := range s.X {
		data[i] = byte(int(v*128) + 128)
	}
	f := wavOf(1, data)
	binary.LittleEndian.PutUint32(f[28:], rate)
	binary.LittleEndian.PutUint16(f[32:], 1)
	binary.LittleEndian.PutUint16(f[34:], 8)
	return f
}

// pcm24 is a WAV file of two channels whose samples stand on 24 bits already,
// or lie half way between two codes.
func pcm24(a, b *trial.Signal) []byte {
	var data []byte
	for i := range a.X {
		for _, v := range []float64{a.X[i], b.X[i]} {
			c := int32(v * (1 << 23))
			data = append(data, byte(c), byte(c>>8), byte(c>>16))
		}
	}
	f := wavOf(1, data)
	binary.LittleEndian.PutUint16(f[22:], 2)
	binary.LittleEndian.PutUint32(f[28:], 6*rate)
	binary.LittleEndian.PutUint16(f[32:], 6)
	binary.LittleEndian.PutUint16(f[34:], 24)
	return f
}

// table is a scope's CSV at 10 kHz of a 500 Hz tone in noise with cells
// without a value from row hole to hole+3.
func table(rows, hole int) string {
	s := trial.New(10000, float64(rows)/10000).Tone(500, 0.5, 0).Noise(0.002, 13)
	var b strings.Builder
	b.WriteString("time (s),CH1 (V)\n")
	for i, v := range s.X {
		if i >= hole && i < hole+3 {
			fmt.Fprintf(&b, "%.4f,9.9E37\n", float64(i)/10000)
			continue
		}
		fmt.Fprintf(&b, "%.4f,%.5f\n", float64(i)/10000, v)
	}
	return b.String()
}
