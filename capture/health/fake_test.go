package health

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"benchslip/capture/recording"
)

// fake is a recording in memory.
type fake struct {
	info recording.Info
	x    [][]float64
}

func (f *fake) Info() *recording.Info { return &f.info }
func (f *fake) Close() error          { return nil }
func (f *fake) ReadAt(dst [][]float64, frame int64) (int, error) {
	n := 0
	for c, d := range dst {
		if d == nil {
			continue
		}
		if frame >= f.info.Frames {
			return 0, nil
		}
		n = copy(d, f.x[c][frame:f.info.Frames])
	}
	return n, nil
}

// audio makes an integer recording of the given width from values in FS,
// rounded and limited as a converter does; bits 0: float, as it stands.
func audio(rate float64, bits int, x ...[]float64) *fake {
	f := &fake{x: make([][]float64, len(x))}
	f.info = recording.Info{Kind: recording.Audio, RateHz: rate, Frames: int64(len(x[0]))}
	for c := range x {
		f.x[c] = append([]float64(nil), x[c]...)
		ch := recording.Channel{Unit: "FS", Bits: bits}
		if bits > 0 {
			ch.Step = math.Ldexp(1, 1-bits)
			quantise(f.x[c], bits)
		}
		f.info.Channels = append(f.info.Channels, ch)
	}
	return f
}

// scope makes a recording in volts whose values are multiples of step; 0: as
// they stand.
func scope(rate, step float64, x ...[]float64) *fake {
	f := &fake{x: make([][]float64, len(x))}
	f.info = recording.Info{Kind: recording.Scope, RateHz: rate, StartS: -0.5 * float64(len(x[0])) / rate, Frames: int64(len(x[0]))}
	for c := range x {
		f.x[c] = append([]float64(nil), x[c]...)
		for i, v := range f.x[c] {
			if step > 0 {
				f.x[c][i] = math.Round(v/step) * step
			}
		}
		f.info.Channels = append(f.info.Channels, recording.Channel{Name: fmt.Sprintf("CH%d", c+1), Unit: "V"})
	}
	return f
}

func quantise(x []float64, bits int) {
	full := math.Ldexp(1, bits-1)
	for i, v := range x {
		x[i] = min(max(math.Round(v*full), -full), full-1) / full
	}
}

// clock is seconds after frame 0.
type wave func(t float64) float64

func sample(rate float64, seconds float64, w wave) []float64 {
	x := make([]float64, int(math.Round(rate*seconds)))
	for i := range x {
		x[i] = w(float64(i) / rate)
	}
	return x
}

func sine(peak, hz, phase float64) wave {
	return func(t float64) float64 { return peak * math.Sin(2*math.Pi*hz*t+phase) }
}

// noise is normal with the given RMS, the same for the same seed.
func noise(n int, rms float64, seed uint64) []float64 {
	r := rand.New(rand.NewPCG(seed, 7))
	x := make([]float64, n)
	for i := range x {
		x[i] = rms * r.NormFloat64()
	}
	return x
}

func sum(a ...[]float64) []float64 {
	x := make([]float64, len(a[0]))
	for _, b := range a {
		for i := range x {
			x[i] += b[i]
		}
	}
	return x
}

// limit holds x between lo and hi.
func limit(x []float64, lo, hi float64) []float64 {
	y := make([]float64, len(x))
	for i, v := range x {
		y[i] = min(max(v, lo), hi)
	}
	return y
}

func mustScan(t *testing.T, rec recording.Recording) *Report {
	t.Helper()
	r, err := Scan(rec)
	if err != nil {
		t.Fatal(err)
	}
	return r
}
