package sim

import (
	"fmt"
	"math"
	"math/rand/v2"

	"benchslip/capture/wav"
)

// Recorder models a digital audio recorder: its own crystal, an AC-coupled
// input, input noise, and a converter with TPDF dither that stops at full
// scale.
type Recorder struct {
	RateHz        int       // nominal sample rate, Hz
	Bits          int       // 16, 24 or 32
	FullScalePeak float64   // V at digital full scale
	Match         []float64 // relative gain error of each channel; nil: none
	NoiseDensity  float64   // of each input, V/rtHz
	Leak          float64   // what each input hears of the sum of the others, V/V
	LowCutHz      float64   // one-pole high-pass of the input; 0: DC-coupled

	// The crystal runs fast by PPM + WanderPPM sin(2 pi t/WanderS), 1e-6.
	PPM       float64
	WanderPPM float64
	WanderS   float64

	Undithered bool
	Seed       uint64
}

// Apparent is the frequency at which a tone of true frequency f stands in the
// file, wander averaged out.
func (r Recorder) Apparent(f float64) float64 { return f / (1 + r.PPM*1e-6) }

// Grid returns the sample times of a take: frame n is taken when the crystal
// has counted n periods, n/rate = integral of (1 + its error). Solved to first
// order in the wander; the second is below 1e-12 for 1 ppm.
func (r Recorder) Grid(seconds float64) *Grid {
	return r.grid(0, int(math.Round(seconds*float64(r.RateHz))))
}

func (r Recorder) grid(from, to int) *Grid {
	g := &Grid{RateHz: float64(r.RateHz), T: make([]float64, to-from)}
	slow := 1 + r.PPM*1e-6
	for i := range g.T {
		t := float64(from+i) / (float64(r.RateHz) * slow)
		if r.WanderS > 0 {
			t -= r.WanderPPM * 1e-6 * r.WanderS / (2 * math.Pi) * (1 - math.Cos(2*math.Pi*t/r.WanderS))
		}
		g.T[i] = t
	}
	return g
}

// Samples returns what the converter puts out, planar, in fractions of full
// scale: code/2^(Bits-1).
func (r Recorder) Samples(seconds float64, channels ...Source) [][]float64 {
	n := int(math.Round(seconds * float64(r.RateHz)))
	ahead := settleSamples(r.LowCutHz, float64(r.RateHz))
	g := r.grid(-ahead, n)
	out := make([][]float64, len(channels))
	for c, source := range channels {
		x := make([]float64, len(g.T))
		source.Add(x, g)
		lowCut(x, r.LowCutHz, float64(r.RateHz))
		out[c] = x[ahead:]
	}
	r.leak(out)
	for c, x := range out {
		Noise{Density: r.NoiseDensity, Seed: r.Seed ^ uint64(c+1)<<32}.Add(x, &Grid{RateHz: g.RateHz, T: g.T[ahead:]})
		scale := 1 / r.FullScalePeak
		if c < len(r.Match) {
			scale *= 1 + r.Match[c]
		}
		for i := range x {
			x[i] *= scale
		}
		r.convert(x, uint64(c))
	}
	return out
}

// leak adds to each channel what it hears of the others.
func (r Recorder) leak(x [][]float64) {
	if r.Leak == 0 || len(x) < 2 {
		return
	}
	for i := range x[0] {
		var sum float64
		for _, ch := range x {
			sum += ch[i]
		}
		for _, ch := range x {
			ch[i] += r.Leak * (sum - ch[i])
		}
	}
}

// lowCut is an AC-coupled input, a one-pole high-pass: in place,
// y[n] = keep y[n-1] + (1 + keep)/2 (x[n] - x[n-1]), which is unity at half the
// rate and within 1e-6 of the analogue one at a hundred times its corner.
// Corner 0 leaves x alone.
func lowCut(x []float64, cornerHz, rateHz float64) {
	if cornerHz <= 0 || len(x) == 0 {
		return
	}
	keep := math.Exp(-2 * math.Pi * cornerHz / rateHz)
	last, y := x[0], 0.0
	for i, v := range x {
		y = keep*y + (1+keep)/2*(v-last)
		last, x[i] = v, y
	}
}

// settleSamples is how long an AC-coupled input runs before the take starts:
// 12 time constants, after which e^-12 of the start is left.
func settleSamples(cornerHz, rateHz float64) int {
	if cornerHz <= 0 {
		return 0
	}
	return int(12 / (2 * math.Pi * cornerHz) * rateHz)
}

// convert rounds to codes. TPDF dither is the difference of two uniform
// numbers of one step each, variance step^2/6; with the rounding's step^2/12
// the error has an RMS of half a step, whatever the signal (Lipshitz,
// Wannamaker, Vanderkooy 1992). Codes stop at -2^(Bits-1) and 2^(Bits-1) - 1.
func (r Recorder) convert(x []float64, channel uint64) {
	dither := rand.NewPCG(r.Seed, 1<<40|channel)
	full := math.Ldexp(1, r.Bits-1)
	for i, v := range x {
		v *= full
		if !r.Undithered {
			u := dither.Uint64()
			v += (float64(u>>32) - float64(u&0xFFFFFFFF)) * 0x1p-32
		}
		v = math.Floor(v + 0.5)
		x[i] = max(-full, min(full-1, v)) / full
	}
}

// Record writes a take as a WAV file, one channel a source. The text goes into
// the file's comment.
func (r Recorder) Record(path string, seconds float64, text string, channels ...Source) error {
	if len(channels) == 0 || r.FullScalePeak <= 0 || r.RateHz <= 0 {
		return fmt.Errorf("sim: %s: a recorder needs channels, a rate and a full scale above 0", path)
	}
	var info map[string]string
	if text != "" {
		info = map[string]string{"ICMT": text}
	}
	w, err := wav.Create(path, wav.Format{RateHz: r.RateHz, Channels: len(channels), Bits: r.Bits}, info)
	if err != nil {
		return err
	}
	defer w.Discard()
	if err := w.WriteBlock(r.Samples(seconds, channels...)); err != nil {
		return err
	}
	return w.Close()
}
