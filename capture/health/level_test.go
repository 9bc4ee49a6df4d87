package health

import (
	"math"
	"reflect"
	"testing"

	"benchslip/capture/recording"
)

// Closed forms: over whole periods a sine of peak A has RMS A/sqrt(2) and
// crest sqrt(2); a square wave has crest 1; a triangle wave A/sqrt(3).
func TestLevelsClosedForm(t *testing.T) {
	const rate = 48000
	tri := func(p float64) wave {
		return func(t float64) float64 { u := t*100 - math.Floor(t*100); return p * (1 - 4*math.Abs(u-0.5)) }
	}
	for _, c := range []struct {
		name                     string
		w                        wave
		mean, rms, ac, lo, hi, k float64
	}{
		{"sine 1 kHz", sine(0.5, 1000, 0), 0, 0.5 / math.Sqrt2, 0.5 / math.Sqrt2, -0.5, 0.5, math.Sqrt2},
		{"sine on DC", func(t float64) float64 { return 3 + sine(0.5, 1000, 0)(t) }, 3, math.Sqrt(9 + 0.125), 0.5 / math.Sqrt2, 2.5, 3.5, math.Sqrt2},
		{"square", func(t float64) float64 { return math.Copysign(0.25, sine(1, 100, 1e-4)(t)) }, 0, 0.25, 0.25, -0.25, 0.25, 1},
		// sampled triangle, 2m = 480 points a period, peaks hit: mean square (1 + 2/m^2)/3
		{"triangle", tri(0.9), 0, 0.9 * math.Sqrt((1+2/240.0/240)/3), 0.9 * math.Sqrt((1+2/240.0/240)/3), -0.9, 0.9, 1 / math.Sqrt((1+2/240.0/240)/3)},
	} {
		t.Run(c.name, func(t *testing.T) {
			l := mustScan(t, audio(rate, 0, sample(rate, 1, c.w))).Levels[0]
			near(t, "mean", l.Mean, c.mean, 1e-13)
			near(t, "rms", l.RMS, c.rms, 1e-13)
			near(t, "ac", l.AC, c.ac, 1e-13)
			near(t, "min", l.Min, c.lo, 1e-13)
			near(t, "max", l.Max, c.hi, 1e-13)
			near(t, "crest", l.Crest, c.k, 1e-12)
			if l.Count != rate {
				t.Errorf("count %d, want %d", l.Count, rate)
			}
		})
	}
}

// A microvolt of ripple on 10 V: sums of squares about 0 would lose it.
func TestLevelsSmallOnLarge(t *testing.T) {
	x := sample(48000, 1, func(t float64) float64 { return 10 + sine(1e-6, 100, 0)(t) })
	l := mustScan(t, scope(48000, 0, x)).Levels[0]
	near(t, "ac", l.AC, 1e-6/math.Sqrt2, 1e-13)
}

func TestLevelsMissing(t *testing.T) {
	x := []float64{1, math.NaN(), 3, math.NaN(), 5}
	l := mustScan(t, scope(10, 0, x)).Levels[0]
	want := Level{Count: 3, Mean: 3, RMS: math.Sqrt(35.0 / 3), AC: math.Sqrt(8.0 / 3), Min: 1, Max: 5, Peak: 5, Crest: 2 / math.Sqrt(8.0/3), Codes: 3, Step: 2}
	near(t, "rms", l.RMS, want.RMS, 1e-15)
	near(t, "ac", l.AC, want.AC, 1e-15)
	near(t, "crest", l.Crest, want.Crest, 1e-15)
	l.RMS, l.AC, l.Crest = want.RMS, want.AC, want.Crest
	if l != want {
		t.Errorf("got %+v, want %+v", l, want)
	}
	l = mustScan(t, scope(10, 0, []float64{math.NaN(), math.NaN()})).Levels[0]
	if l.Count != 0 || !math.IsNaN(l.Mean) || !math.IsNaN(l.Peak) {
		t.Errorf("all missing: %+v", l)
	}
}

func TestNoFrames(t *testing.T) {
	r := mustScan(t, audio(48000, 16, nil, nil))
	if len(r.Levels) != 2 || len(r.Flags) != 0 || r.Levels[1].Count != 0 {
		t.Errorf("%+v", r)
	}
}

func TestShortRecordingIsAnError(t *testing.T) {
	f := audio(48000, 16, make([]float64, 10))
	f.info.Frames = 10
	rec := &lying{f}
	if _, err := Scan(rec); err == nil {
		t.Error("no error for a recording that ends early")
	}
}

// lying delivers half of what it promises.
type lying struct{ *fake }

func (l *lying) ReadAt(dst [][]float64, frame int64) (int, error) {
	if frame >= 5 {
		return 0, nil
	}
	for c := range dst {
		dst[c] = dst[c][:5-frame]
	}
	return l.fake.ReadAt(dst, frame)
}

func TestBitsInUse(t *testing.T) {
	x := sum(sample(48000, 0.2, sine(0.4, 997, 0)), noise(9600, 1e-3, 1))
	y := append([]float64(nil), x...)
	quantise(y, 16)
	for _, c := range []struct {
		name string
		rec  *fake
		bits int
		step float64
	}{
		{"16 in 16", audio(48000, 16, x), 16, math.Ldexp(1, -15)},
		{"24 in 24", audio(48000, 24, x), 24, math.Ldexp(1, -23)},
		{"16 in 24", audio(48000, 24, y), 16, math.Ldexp(1, -15)},
		{"float", audio(48000, 0, x), 0, 0},
	} {
		l := mustScan(t, c.rec).Levels[0]
		if l.Bits != c.bits || l.Step != c.step {
			t.Errorf("%s: bits %d, step %g; want %d, %g", c.name, l.Bits, l.Step, c.bits, c.step)
		}
	}
}

// The same recording in blocks of other sizes gives the same report, bit for
// bit.
func TestBlockSize(t *testing.T) {
	x := sum(sample(48000, 2, sine(1.2, 80, 0)), noise(96000, 0.01, 3))
	y := sum(sample(48000, 2, sine(0.2, 480, 0)), noise(96000, 0.01, 4))
	z := put(insert(y, 30000, y[29000:30000]...), 60000, make([]float64, 500)...)
	rec := audio(48000, 16, x, y, x, z)
	want, err := scan(rec, cell)
	if err != nil {
		t.Fatal(err)
	}
	if got := codesOf(want); got != "clipped 1, clipped 3, repeated-block 4, gap 4, identical-channels 3" {
		t.Errorf("flags %q", got)
	}
	for _, block := range []int{2 * cell, 3 * cell, 64 * cell} {
		got, err := scan(rec, block)
		if err != nil {
			t.Fatal(err)
		}
		if !reflect.DeepEqual(got, want) {
			t.Errorf("block %d: %+v\nwant %+v", block, got, want)
		}
	}
}

func TestClippedSpans(t *testing.T) {
	x := make([]float64, 20000)
	for i := range x {
		x[i] = 0.3 * math.Sin(float64(i))
	}
	for i := 1000; i < 1005; i++ {
		x[i] = 1
	}
	for i := 4094; i < 4099; i++ { // across cells
		x[i] = -1
	}
	x[9000], x[9001] = 1, 1 // two are no run
	r := mustScan(t, audio(48000, 24, x, x))
	top := recording.Run{Channel: 1, From: 1000, To: 1005, Why: "clipped"}
	low := recording.Run{Channel: 1, From: 4094, To: 4099, Why: "clipped"}
	for _, c := range []struct {
		from, to int64
		want     recording.Run
		hit      bool
	}{
		{0, 20000, top, true}, {0, 1000, recording.Run{}, false}, {0, 1001, top, true}, {1004, 1005, top, true},
		{1005, 4094, recording.Run{}, false}, {1005, 5000, low, true}, {4099, 20000, recording.Run{}, false},
	} {
		got, hit := r.Clipped(1, c.from, c.to)
		if hit != c.hit || got != c.want {
			t.Errorf("[%d, %d): %v %v, want %v %v", c.from, c.to, got, hit, c.want, c.hit)
		}
	}
	if got, hit := r.Clipped(0, 4000, 5000); !hit || got != low {
		t.Errorf("any channel: %v %v", got, hit)
	}
	if _, hit := r.Clipped(3, 0, 20000); hit {
		t.Error("a channel that is not there is clipped")
	}
}

// More places than are kept: runs are joined, none is lost.
func TestClipsStayBounded(t *testing.T) {
	x := make([]float64, 400000)
	for i := range x {
		x[i] = 0.1
		if i%100 < 4 {
			x[i] = 1
		}
	}
	r := mustScan(t, audio(48000, 16, x))
	if n := len(r.clips[0]); n > maxRuns {
		t.Errorf("%d runs kept", n)
	}
	for i := int64(0); i < 400000; i += 100 {
		if _, hit := r.Clipped(1, i, i+4); !hit {
			t.Fatalf("run at %d lost", i)
		}
	}
}

func near(t *testing.T, what string, got, want, tol float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tol) {
		t.Errorf("%s %.17g, want %.17g", what, got, want)
	}
}
