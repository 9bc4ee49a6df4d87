package health

import (
	"fmt"
	"math"
	"strings"
	"testing"
)

// A pair is a sick take and its healthy near-twin: what is wrong in one is
// nearly, but not quite, there in the other. All are invented here; what must
// be flagged follows from how they are made.
type pair struct {
	name    string
	sick    *fake
	want    string  // "code channel", in the order of the report
	from    int64   // first frame of the fault of the first flag; -1: not asked
	healthy []*fake // no flag at all
}

func TestPairs(t *testing.T) {
	sick, healthy := 0, 0
	for _, p := range pairs() {
		t.Run(p.name, func(t *testing.T) {
			r := mustScan(t, p.sick)
			if got := codesOf(r); got != p.want {
				t.Errorf("sick: %q, want %q%s", got, p.want, tell(r))
			} else if p.from >= 0 {
				f := r.Flags[0]
				at := int64(math.Round((*f.FromS - p.sick.info.StartS) * p.sick.info.RateHz))
				if at < p.from-2 || at > p.from+2 {
					t.Errorf("sick: flagged at frame %d, want %d%s", at, p.from, tell(r))
				}
			}
			for i, h := range p.healthy {
				if r := mustScan(t, h); len(r.Flags) > 0 {
					t.Errorf("healthy twin %d: %q%s", i+1, codesOf(r), tell(r))
				}
			}
		})
		sick++
		healthy += len(p.healthy)
	}
	t.Logf("%d sick takes, %d healthy ones", sick, healthy)
	if sick < 40 || healthy < 40 {
		t.Errorf("%d sick takes and %d healthy ones; want 40 of each", sick, healthy)
	}
}

func tell(r *Report) string {
	var b strings.Builder
	for _, f := range r.Flags {
		fmt.Fprintf(&b, "\n\t%s: channel %d: %s", f.Code, f.Channel, f.Message)
	}
	return b.String()
}

// Fixed material.
const fs = 48000

func tone(peak, hz float64) []float64 { return sample(fs, 1, sine(peak, hz, 0.4)) }

// live is a tone with the noise of an analogue path.
func live(peak, hz float64, seed uint64) []float64 {
	return sum(tone(peak, hz), noise(fs, 3e-5, seed))
}

// music is noise shaped like music: three resonances, peaking at peak.
func music(n int, peak float64, seed uint64) []float64 {
	e := noise(n, 1, seed)
	y := make([]float64, n)
	for _, f := range []float64{0.01, 0.07, 0.3} {
		var a, b float64
		for i := range y {
			v := 1.98*math.Cos(f)*a - 0.9801*b + e[i]*f
			a, b = v, a
			y[i] += v
		}
	}
	return scaled(y, peak)
}

func scaled(x []float64, peak float64) []float64 {
	m := 0.0
	for _, v := range x {
		m = max(m, math.Abs(v))
	}
	y := make([]float64, len(x))
	for i, v := range x {
		y[i] = v * peak / m
	}
	return y
}

// put overwrites x from at with y.
func put(x []float64, at int, y ...float64) []float64 {
	z := append([]float64(nil), x...)
	copy(z[at:], y)
	return z
}

// insert puts y before x[at]; the length stays.
func insert(x []float64, at int, y ...float64) []float64 {
	z := append([]float64(nil), x[:at]...)
	z = append(z, y...)
	return append(z, x[at:]...)[:len(x)]
}

func cat(parts ...[]float64) []float64 {
	var x []float64
	for _, p := range parts {
		x = append(x, p...)
	}
	return x
}

func constant(n int, v float64) []float64 {
	x := make([]float64, n)
	for i := range x {
		x[i] = v
	}
	return x
}

func times(k int, x []float64) []float64 {
	var y []float64
	for range k {
		y = append(y, x...)
	}
	return y
}

func square(rate, seconds, lo, hi, hz float64) []float64 {
	return sample(rate, seconds, func(t float64) float64 {
		if u := t*hz + 0.01; u-math.Floor(u) < 0.5 {
			return hi
		}
		return lo
	})
}

func one(f ...*fake) []*fake { return f }

func pairs() []pair {
	var all []pair
	all = append(all, clippedPairs()...)
	all = append(all, flatPairs()...)
	all = append(all, stillPairs()...)
	all = append(all, codePairs()...)
	all = append(all, repeatPairs()...)
	all = append(all, gapPairs()...)
	return all
}

func clippedPairs() []pair {
	loud := music(fs, 1.2, 11)
	at := func(x []float64, v float64, n int) []float64 { return put(x, 20000, constant(n, v)...) }
	in16 := func(x []float64) []float64 { y := append([]float64(nil), x...); quantise(y, 16); return y }
	q16, q24 := math.Ldexp(1, -15), math.Ldexp(1, -23)
	return []pair{
		{"16-bit sine over the top", audio(fs, 16, live(1.1, 997, 1)), "clipped 1", -1,
			one(audio(fs, 16, live(0.999, 997, 1)), audio(fs, 16, sample(fs, 1, sine(1-q16, 997, 0))))},
		{"24-bit sine over the top", audio(fs, 24, live(1.01, 997, 1)), "clipped 1", -1,
			one(audio(fs, 24, sample(fs, 1, sine(1-2*q24, 997, 0))))},
		{"8-bit sine over the top", audio(fs, 8, live(1.2, 997, 1)), "clipped 1", -1,
			one(audio(fs, 8, live(0.97, 997, 1)))},
		{"loud music", audio(fs, 16, loud), "clipped 1", -1,
			one(audio(fs, 16, scaled(loud, 0.99)), audio(fs, 16, scaled(loud, 1-2*q16)))},
		{"three samples at the top code", audio(fs, 16, at(live(0.3, 997, 1), 1, 3)), "clipped 1", 20000,
			one(audio(fs, 16, at(live(0.3, 997, 1), 1, 2)), audio(fs, 16, at(live(0.3, 997, 1), 1-2*q16, 3)))},
		{"three samples at the bottom code", audio(fs, 24, at(live(0.3, 997, 1), -1, 3)), "clipped 1", 20000,
			one(audio(fs, 24, at(live(0.3, 997, 1), -1, 2)))},
		{"second channel only", audio(fs, 24, live(0.3, 997, 1), at(live(0.3, 997, 2), 1, 5)), "clipped 2", 20000,
			one(audio(fs, 24, live(0.3, 997, 1), live(0.3, 997, 2)))},
		{"16 bits in a 24-bit file", audio(fs, 24, in16(live(1.1, 997, 1))), "clipped 1", -1,
			one(audio(fs, 24, in16(live(0.99, 997, 1))))},
		{"float at 1", audio(fs, 0, limit(live(1.1, 997, 1), -1, 1)), "clipped 1", -1,
			one(audio(fs, 0, live(1.1, 997, 1)), audio(fs, 0, live(1, 997, 1)), audio(fs, 0, tone(3, 997)))},
		{"float at -1 in a file that goes on to 2", audio(fs, 0, at(put(live(0.3, 997, 1), 30000, 2, 1.5), -1, 4)), "clipped 1", 20000,
			one(audio(fs, 0, at(put(live(0.3, 997, 1), 30000, 2, 1.5), -1, 2)))},
		{"square wave at full scale", audio(fs, 16, square(fs, 1, -1, 1, 100)), "clipped 1", -1,
			one(audio(fs, 16, square(fs, 1, -0.5, 0.5, 100)), audio(fs, 16, square(fs, 1, -0.75, 0.75, 997)), audio(fs, 24, square(fs, 1, -0.9921875, 0.9921875, 1000)))},
		// As the rule has it: not to be told from clipping, and the message says so.
		{"clean full-scale low tone at a high rate", audio(192000, 16, sample(192000, 0.5, sine(1, 20, 0))), "clipped 1", -1,
			one(audio(192000, 16, sample(192000, 0.5, sine(1-2*q16, 20, 0))), audio(192000, 24, sample(192000, 0.5, sine(0.9, 20, 0))))},
	}
}

func flatPairs() []pair {
	const sr = 1e6
	osc := func(peak, hz float64, seed uint64, rms float64) []float64 {
		x := sample(sr, 0.02, sine(peak, hz, 0.3))
		return sum(x, noise(len(x), rms, seed))
	}
	soft := sample(fs, 1, func(t float64) float64 { return 0.6 * math.Tanh(0.8*sine(1, 997, 0)(t)) })
	half := sample(fs, 1, func(t float64) float64 { return max(0, sine(0.7, 997, 0)(t)) })
	tri := sample(fs, 1, func(t float64) float64 { u := t*101 - math.Floor(t*101); return 0.7 * (4*math.Abs(u-0.5) - 1) })
	stair := sample(fs, 1, func(t float64) float64 { return sine(0.7, 100, 0)(math.Floor(t*4000) / 4000) })
	burst := func(x []float64) []float64 { return cat(constant(5000, 0), x[:9600], constant(5000, 0)) }
	return []pair{
		{"16-bit flat at 0.7", audio(fs, 16, limit(tone(0.9, 997), -0.7, 0.7)), "flat-top 1", -1,
			one(audio(fs, 16, tone(0.7, 997)), audio(fs, 16, soft))},
		{"24-bit flat at 0.5, both ways", audio(fs, 24, limit(tone(0.6, 200), -0.5, 0.5)), "flat-top 1", -1,
			one(audio(fs, 24, tone(0.5, 200)), audio(fs, 24, tri))},
		{"flat bottom only", audio(fs, 16, limit(tone(0.6, 440), -0.5, 1)), "flat-top 1", -1,
			one(audio(fs, 16, tone(0.6, 440)), audio(fs, 16, half))},
		{"float flat at 0.6", audio(fs, 0, limit(tone(0.8, 997), -0.6, 0.6)), "flat-top 1", -1,
			one(audio(fs, 0, tone(0.8, 997)), audio(fs, 0, tone(0.8, 1000)), audio(fs, 0, tone(0.8, 20)))},
		{"coherent tone, flat", audio(fs, 16, limit(tone(0.8, 1000), -0.6, 0.6)), "flat-top 1", -1,
			one(audio(fs, 16, tone(0.8, 1000)), audio(fs, 24, sample(fs, 10, sine(0.5, 1000, 0))))},
		{"scope, 8 bits, flat at 4 V", scope(sr, 0.04, limit(osc(4.6, 1000, 1, 0), -4, 4)), "flat-top 1", -1,
			one(scope(sr, 0.04, osc(4.6, 1000, 1, 0)), scope(sr, 0.04, osc(4.6, 1000, 1, 0.02)), scope(sr, 0.04, osc(4.6, 150, 1, 0)))},
		{"scope screen left at the top", scope(sr, 0.04, limit(osc(5.5, 500, 2, 0.01), -8, 5.08)), "flat-top 1", -1,
			one(scope(sr, 0.04, osc(5.06, 500, 2, 0.01)))},
		{"six-digit scope file", scope(sr, 1e-5, limit(osc(1, 200, 1, 0), -0.9, 0.9)), "flat-top 1", -1,
			one(scope(sr, 1e-5, osc(1, 200, 1, 0)), scope(sr, 1e-5, osc(1, 60, 1, 0)))},
		{"50 Hz flat at 96 kHz", audio(96000, 16, sample(96000, 1, func(t float64) float64 { return max(-0.6, min(0.6, sine(0.66, 50, 0)(t))) })), "flat-top 1", -1,
			one(audio(96000, 16, sample(96000, 1, sine(0.6, 50, 0))), audio(96000, 16, stair[:48000]))},
		{"flat tone between silences", audio(fs, 16, burst(limit(tone(0.9, 997), -0.7, 0.7))), "flat-top 1", -1,
			one(audio(fs, 16, burst(tone(0.7, 1000))), audio(fs, 16, square(fs, 1, -0.3, 0.3, 120)), scope(sr, 0.04, square(sr, 0.02, -2, 2, 700)),
				audio(fs, 24, sum(square(fs, 1, -0.3, 0.3, 120), noise(fs, 1e-5, 1))))},
	}
}

func stillPairs() []pair {
	x, y := live(0.5, 997, 1), live(0.5, 997, 2)
	pulse := put(constant(20000, 0.2), 9000, constant(300, 3.2)...)
	edge := sample(1e6, 0.02, func(t float64) float64 { return 3 / (1 + math.Exp(-(t-0.01)/3e-6)) })
	return []pair{
		{"dead channel", audio(fs, 24, x, constant(fs, 0)), "silent 2", 0,
			one(audio(fs, 24, x, noise(fs, 1e-7, 3)), audio(fs, 16, noise(fs, 2e-5, 3)))},
		{"DC only", scope(1e5, 0, constant(5000, 1.25)), "silent 1", 0,
			one(scope(1e5, 0.01, sum(constant(5000, 1.25), noise(5000, 0.006, 1))), scope(1e5, 0.01, put(constant(5000, 1.25), 2500, 1.26)))},
		{"no trace", scope(1e6, 0.04, constant(20000, 0.2)), "silent 1", 0,
			one(scope(1e6, 0.04, pulse), scope(1e6, 0.04, edge), scope(1e6, 0.04, sum(pulse, noise(20000, 0.02, 1))))},
		{"copy of a channel", audio(fs, 24, x, x), "identical-channels 2", 0,
			one(audio(fs, 24, x, put(x, 47999, x[47999]+1e-3)), audio(fs, 24, x, y))},
		{"copy in the fourth", audio(fs, 24, x, y, live(0.2, 50, 4), y), "identical-channels 4", 0,
			one(audio(fs, 24, x, y, live(0.2, 50, 4), live(0.2, 50, 5)))},
		{"copy of a float channel", audio(fs, 0, x, x), "identical-channels 2", 0,
			one(audio(fs, 0, x, scaled(x, 0.5)))},
		{"copy of a scope trace", scope(1e6, 0.04, pulse, pulse), "identical-channels 2", 0,
			one(scope(1e6, 0.04, pulse, put(pulse, 100, 0.24)))},
	}
}

func codePairs() []pair {
	const sr = 250e3
	osc := func(peak float64, rms float64) []float64 {
		x := sample(sr, 0.04, sine(peak, 1003, 0.3))
		return sum(x, noise(len(x), rms, 5))
	}
	gained := live(0.4, 997, 1)
	quantise(gained, 6)
	return []pair{
		{"8-bit file at -20 dBFS", audio(fs, 8, tone(0.1, 997)), "few-codes 1", 0,
			one(audio(fs, 8, tone(0.9, 997)), audio(fs, 8, tone(0.3, 997)), audio(fs, 16, tone(0.1, 997)), audio(fs, 16, tone(0.0105, 997)))},
		{"8-bit file at -38 dBFS", audio(fs, 8, tone(0.0126, 997)), "few-codes 1", 0,
			one(audio(fs, 8, noise(fs, 0.01, 1)), audio(fs, 16, tone(0.0004, 997)), audio(fs, 16, sum(tone(0.00005, 50), noise(fs, 3e-5, 1))))},
		{"6 bits inside 24", audio(fs, 24, scaled(gained, 0.3)), "few-codes 1", 0,
			one(audio(fs, 24, scaled(live(0.4, 997, 1), 0.3)), audio(fs, 24, sample(fs, 1, sine(0.5, 12000, 0))), audio(fs, 16, sample(fs, 1, sine(0.5, 6000, 0.1))))},
		{"scope, a fifth of the screen", scope(sr, 0.04, osc(1, 0)), "few-codes 1", 0,
			one(scope(sr, 0.04, osc(5, 0)), scope(sr, 0.04, osc(2, 0.02)), scope(sr, 0.04, noise(10000, 0.05, 1)))},
		{"scope, a few steps with noise", scope(sr, 0.04, osc(0.2, 0.01)), "few-codes 1", 0,
			one(scope(sr, 0.04, square(sr, 0.04, -0.4, 0.4, 1003)), scope(sr, 0.04, osc(0.02, 0.03)), scope(sr, 0.001, osc(0.2, 0.01)))},
	}
}

func repeatPairs() []pair {
	x, y := live(0.3, 997, 1), live(0.3, 443, 2)
	dup := func(x []float64, at, n int) []float64 { return insert(x, at, x[at-n:at]...) }
	over := func(x []float64, at, n int) []float64 { return put(x, at, x[at-n:at]...) }
	loop := noise(1024, 0.1, 9)
	loopTone := sample(fs, 1, func(t float64) float64 { // 1024-frame period, 5 lines
		v := 0.0
		for k := 1; k < 6; k++ {
			v += 0.1 * math.Sin(2*math.Pi*float64(k*k*3+4)/1024*fs*t+float64(k))
		}
		return v
	})
	clean := tone(0.3, 1000) // period 48 frames
	quiet := audio(fs, 16, noise(fs, 2e-5, 7)).x[0]
	chirp := sample(fs, 1, func(t float64) float64 { return 0.5 * math.Sin(2*math.Pi*20*1*(math.Exp(t*6.9)-1)/6.9) })
	scope8 := sum(sample(1e6, 0.05, sine(4, 1000.01, 0)))
	saw := sample(fs, 1, func(t float64) float64 { u := t * 100; return 0.5 * (u - math.Floor(u) - 0.5) })
	coherent := func(k float64, n int) []float64 {
		return sample(fs, float64(n)/fs, func(t float64) float64 { return 0.25 * math.Sin(2*math.Pi*k/1024*fs*t) })
	}
	return []pair{
		{"block of 256 played twice", audio(fs, 24, dup(x, 20000, 256)), "repeated-block 1", 20000,
			one(audio(fs, 24, x), audio(fs, 16, clean), audio(fs, 16, sample(fs, 10, sine(0.5, 1000, 0))))},
		{"block of 64 over the next", audio(fs, 24, over(x, 30000, 64)), "repeated-block 1", 30000,
			one(audio(fs, 24, over(x, 30000, 40)), audio(fs, 16, square(fs, 1, -0.4, 0.4, 100)), audio(fs, 16, square(fs, 1, -0.4, 0.4, 750)))},
		{"block of 4096", audio(fs, 16, dup(x, 12345, 4096)), "repeated-block 1", 12345,
			one(audio(fs, 16, x), audio(fs, 16, cat(coherent(21, 20000), constant(3000, 0), coherent(21, 20000))))},
		{"block of 100 in music", audio(fs, 16, over(music(fs, 0.8, 3), 777, 100)), "repeated-block 1", 777,
			one(audio(fs, 16, music(fs, 0.8, 3)), audio(fs, 0, music(fs, 0.8, 3)))},
		{"both channels", audio(fs, 24, dup(x, 20000, 512), dup(y, 20000, 512)), "repeated-block 0", 20000,
			one(audio(fs, 24, x, y), audio(fs, 24, x, clean))},
		{"beside a dead channel", audio(fs, 24, dup(x, 20000, 512), constant(fs, 0)), "repeated-block 1, silent 2", 20000,
			one(audio(fs, 24, x, quiet))},
		{"float", audio(fs, 0, dup(x, 20000, 480)), "repeated-block 1", 20000,
			one(audio(fs, 0, x), audio(fs, 0, clean), audio(fs, 0, loopTone))},
		{"stuck for nine blocks", audio(fs, 24, insert(x, 20000, times(9, x[19744:20000])...)), "repeated-block 1", 20000,
			one(audio(fs, 24, times(40, loop)), audio(fs, 16, cat(constant(4000, 0), times(9, loop), constant(4000, 0))), audio(fs, 16, times(40, scaled(loop, 0.9))))},
		{"stuck to the end", audio(fs, 16, insert(x, 40000, times(30, x[39700:40000])...)), "repeated-block 1", 40000,
			one(audio(fs, 16, loopTone), audio(fs, 16, cat(loopTone[:20000], constant(2000, 0))), audio(fs, 16, saw))},
		{"noise-free tone, off the period", audio(fs, 16, insert(sample(fs, 1, sine(0.3, 997, 0)), 20000, sample(fs, 1, sine(0.3, 997, 0))[19500:20000]...)), "repeated-block 1", 20000,
			one(audio(fs, 16, sample(fs, 1, sine(0.3, 997, 0))), audio(fs, 0, sample(fs, 1, sine(0.3, 997, 0))), audio(fs, 8, sample(fs, 1, sine(0.9, 997, 0))))},
		{"in a sweep", audio(fs, 24, dup(chirp, 30000, 700)), "repeated-block 1", 30000,
			one(audio(fs, 24, chirp), audio(fs, 16, chirp), audio(fs, 0, chirp))},
		{"quiet noise of a few steps", audio(fs, 16, dup(quiet, 20000, 300)), "repeated-block 1", 20000,
			one(audio(fs, 16, quiet), audio(fs, 16, noise(fs, 1e-5, 3)), audio(fs, 8, noise(fs, 4e-3, 3)))},
		{"scope trace", scope(1e6, 0.04, dup(sum(scope8, noise(50000, 0.03, 1)), 20000, 1000)), "repeated-block 1", 20000,
			one(scope(1e6, 0.04, sum(scope8, noise(50000, 0.03, 1))), scope(1e6, 0.04, scope8), scope(1e6, 0, scope8), scope(1e6, 0.01, sample(1e6, 0.05, sine(4, 2500, 0))))},
		{"two blocks back", audio(fs, 24, put(x, 20000, x[20000-1024:20000-512]...)), "repeated-block 1", 20000,
			one(audio(fs, 16, cat(coherent(21, 8000), coherent(33, 8000), coherent(50, 8000))),
				audio(fs, 24, cat(clean[:9600], scaled(clean, 0.1)[:9600], clean[:9600])))},
	}
}

func gapPairs() []pair {
	x, y := live(0.3, 997, 1), live(0.3, 443, 2)
	zero := func(x []float64, at, n int) []float64 { return put(x, at, constant(n, 0)...) }
	quiet := constant(fs/4, 0)
	toneOf := func(n int) []float64 { return sample(fs, float64(n)/fs, sine(0.3, 1000, 0)) } // whole periods for n = 48 k
	fade := func(x []float64) []float64 {                                                    // 20 ms raised cosine at both ends
		y := append([]float64(nil), x...)
		for i := range 960 {
			g := 0.5 - 0.5*math.Cos(math.Pi*float64(i)/960)
			y[i] *= g
			y[len(y)-1-i] *= g
		}
		return y
	}
	clean := sample(fs, 1, sine(0.3, 997, 0))
	gated := append([]float64(nil), clean...)
	for i := range gated {
		if i/1000%2 == 1 {
			gated[i] = 0
		}
	}
	half := sample(fs, 1, func(t float64) float64 { return max(0, sine(0.7, 50, 0)(t)) })
	cross := sample(fs, 1, func(t float64) float64 {
		v := sine(0.5, 20, 0)(t)
		return math.Copysign(max(0, math.Abs(v)-0.1), v)
	})
	unipolar := square(fs, 1, 0, 0.5, 120)
	burst := cat(quiet, x[:12000], quiet, x[12000:24000], quiet)
	return []pair{
		{"10 ms of zeros", audio(fs, 24, zero(x, 20000, 480)), "gap 1", 20000,
			one(audio(fs, 24, x), audio(fs, 24, zero(x, 20000, 20)), audio(fs, 24, burst))},
		{"1 ms of zeros, 16 bits", audio(fs, 16, zero(x, 20000, 48)), "gap 1", 20000,
			one(audio(fs, 16, cat(quiet, x, quiet)), audio(fs, 16, noise(fs, 1e-5, 1)), audio(fs, 16, half))},
		{"85 ms in both channels", audio(fs, 24, zero(x, 20000, 4096), zero(y, 20000, 4096)), "gap 0", 20000,
			one(audio(fs, 24, cat(quiet, fade(toneOf(9600)), quiet, fade(toneOf(9600)), quiet)))},
		{"200 ms, the tone going on behind them", audio(fs, 24, zero(x, 20000, 9600)), "gap 1", 20000,
			one(audio(fs, 24, insert(x, 20000, constant(9613, 0)...)), audio(fs, 24, zero(x, 20000, 13000)), audio(fs, 24, cat(x[:20000], quiet[:9600], x[:9600])))},
		{"one channel of two", audio(fs, 24, x, zero(y, 20000, 1024)), "gap 2", 20000,
			one(audio(fs, 24, x, cat(quiet, fade(y[:9600]), quiet, y[:14400])))},
		{"float music", audio(fs, 0, zero(music(fs, 0.5, 4), 20000, 512)), "gap 1", 20000,
			one(audio(fs, 0, cat(quiet, music(12000, 0.5, 4), quiet, music(12000, 0.5, 5), quiet)))},
		{"noise-free tone", audio(fs, 16, zero(clean, 20000, 500)), "gap 1", 20000,
			one(audio(fs, 16, cat(quiet, toneOf(9600), constant(2400, 0), toneOf(9600), quiet)), audio(fs, 16, gated), audio(fs, 16, cross), audio(fs, 16, unipolar))},
		{"zeros put in", audio(fs, 24, insert(x, 20000, constant(256, 0)...)), "gap 1", 20000,
			one(audio(fs, 24, cat(quiet, toneOf(9600), quiet, scaled(toneOf(9600), 0.1), quiet)), audio(fs, 0, cat(toneOf(9600), constant(960, 0), toneOf(4800), constant(960, 0), toneOf(4800))))},
		{"three gaps", audio(fs, 24, zero(zero(zero(x, 10000, 100), 20000, 100), 35000, 100)), "gap 1, gap 1, gap 1", 10000,
			one(audio(fs, 24, cat(times(8, cat(fade(toneOf(4800)), constant(960, 0))))))},
	}
}
