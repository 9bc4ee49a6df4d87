package sim

import (
	"math"
	"testing"
)

// TestThermal checks published constants through worked values: 150 ohm at
// 290 K in 20 kHz give 2.19195313e-07 V, 1 kohm at 300 K 4.07035478e-09 V/rtHz
// (sqrt(4kTRB), k exact in the SI since 2019).
func TestThermal(t *testing.T) {
	near(t, "150 ohm", Thermal(150, 290)*math.Sqrt(20000), 2.19195313e-07, 1e-8)
	near(t, "1 kohm", Thermal(1000, 300), 4.07035478e-09, 1e-8)
}

// TestWhiteNoise: N samples of a normal distribution have a relative standard
// deviation of sqrt(1/(2N)) in their RMS, kurtosis 3 +- sqrt(24/N).
func TestWhiteNoise(t *testing.T) {
	const rate, n = 48000, 1 << 18
	x := wave(Noise{Density: 6e-7, Seed: 5}, rate, n)
	want := 6e-7 * math.Sqrt(rate/2)
	near(t, "RMS", rms(x), want, 4*math.Sqrt(1/(2.0*n)))
	within(t, "mean", mean(x), 0, 4*want/math.Sqrt(n))
	var four float64
	for _, v := range x {
		four += math.Pow(v/want, 4) / n
	}
	within(t, "kurtosis", four, 3, 4*math.Sqrt(24.0/n))
	y := wave(Noise{Density: 6e-7, Seed: 6}, rate, n)
	var both float64
	for i := range x {
		both += x[i] * y[i] / (want * want) / n
	}
	within(t, "correlation of two seeds", both, 0, 4/math.Sqrt(n))
}

// TestFlickerNoise compares periodogram powers at a few frequencies with
// Density^2 (1 + corner/f). 4 bins of 300 Hann blocks of 1 s: neighbouring Hann
// bins are correlated (4/9), so about 2.2 free bins, 660 averages, 4 %.
func TestFlickerNoise(t *testing.T) {
	const rate, blocks = 4000, 300
	s := Noise{Density: 1e-6, CornerHz: 100, Seed: 7}
	x := wave(s, rate, rate*blocks)
	window := make([]float64, rate)
	var norm float64
	for i := range window {
		window[i] = 0.5 - 0.5*cosTable[i]
		norm += window[i] * window[i]
	}
	for _, f := range []int{8, 30, 120, 500} {
		var got, want float64
		for k := f; k < f+4; k++ {
			want += s.At(float64(k)) * s.At(float64(k)) / 4
			for b := range blocks {
				var re, im float64
				for i, v := range x[b*rate : (b+1)*rate] {
					c := (k * i) % rate
					re += window[i] * v * cosTable[c]
					im += window[i] * v * cosTable[(c+rate/4)%rate]
				}
				got += 2 * (re*re + im*im) / (rate * norm) / blocks / 4
			}
		}
		near(t, "power density", got, want, 0.16) // 4 standard deviations
	}
	near(t, "band", s.BandRMS(20, 20000), 1e-6*math.Sqrt(19980+100*math.Log(1000)), 1e-12)
}

// cosTable holds cos(2 pi i/4000).
var cosTable = func() [4000]float64 {
	var c [4000]float64
	for i := range c {
		c[i] = math.Cos(2 * math.Pi * float64(i) / 4000)
	}
	return c
}()
