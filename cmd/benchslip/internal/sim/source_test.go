package sim

import (
	"math"
	"math/cmplx"
	"testing"
)

// near fails unless got is within a relative tolerance of want.
func near(t *testing.T, what string, got, want, rel float64) {
	t.Helper()
	if !(math.Abs(got-want) <= rel*math.Abs(want)) {
		t.Errorf("%s: got %.9g, wanted %.9g within %.2g of it", what, got, want, rel)
	}
}

// within fails unless got is within an absolute tolerance of want.
func within(t *testing.T, what string, got, want, tol float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tol) {
		t.Errorf("%s: got %.9g, wanted %.9g +- %.2g", what, got, want, tol)
	}
}

// wave is what a source gives over a plain grid.
func wave(s Source, rate float64, n int) []float64 {
	g := &Grid{RateHz: rate, T: make([]float64, n)}
	for i := range g.T {
		g.T[i] = float64(i) / rate
	}
	x := make([]float64, n)
	s.Add(x, g)
	return x
}

func rms(x []float64) float64 {
	var sum float64
	for _, v := range x {
		sum += v * v
	}
	return math.Sqrt(sum / float64(len(x)))
}

func mean(x []float64) float64 {
	var sum float64
	for _, v := range x {
		sum += v
	}
	return sum / float64(len(x))
}

// fit is the least-squares fit of a constant and tones of known frequencies:
// the normal equations, solved by elimination. It returns the tones' peak
// phasors (cosine at sample 0) and the RMS of what is left.
func fit(x []float64, rate float64, freqs ...float64) ([]complex128, float64) {
	m := 1 + 2*len(freqs)
	row := make([]float64, m)
	a := make([][]float64, m)
	for i := range a {
		a[i] = make([]float64, m+1)
	}
	fill := func(n int) {
		row[0] = 1
		for k, f := range freqs {
			p := f / rate * float64(n)
			s, c := math.Sincos(2 * math.Pi * (p - math.Floor(p)))
			row[1+2*k], row[2+2*k] = c, s
		}
	}
	for n, v := range x {
		fill(n)
		for i, r := range row {
			for j := i; j < m; j++ {
				a[i][j] += r * row[j]
			}
			a[i][m] += r * v
		}
	}
	for i := range a {
		for j := range i {
			a[i][j] = a[j][i]
		}
	}
	for i := range a {
		for k := i + 1; k < m; k++ {
			f := a[k][i] / a[i][i]
			for j := i; j <= m; j++ {
				a[k][j] -= f * a[i][j]
			}
		}
	}
	u := make([]float64, m)
	for i := m - 1; i >= 0; i-- {
		u[i] = a[i][m]
		for j := i + 1; j < m; j++ {
			u[i] -= a[i][j] * u[j]
		}
		u[i] /= a[i][i]
	}
	var rest float64
	for n, v := range x {
		fill(n)
		for i, r := range row {
			v -= u[i] * r
		}
		rest += v * v
	}
	out := make([]complex128, len(freqs))
	for k := range freqs {
		out[k] = complex(u[1+2*k], -u[2+2*k])
	}
	return out, math.Sqrt(rest / float64(len(x)))
}

// TestToneIsPure compares a tone of 20 000 periods with phases from integer
// arithmetic, which have no rounding before the cosine.
func TestToneIsPure(t *testing.T) {
	const rate, f, n = 48000, 1042, 48000 * 20000 / 1042
	x := wave(Tone{FreqHz: f, RMS: 1 / math.Sqrt2}, rate, n)
	var worst float64
	for i, v := range x {
		k := (i * f) % rate
		want := math.Cos(2 * math.Pi * float64(k) / rate)
		worst = max(worst, math.Abs(v-want))
	}
	if worst > 1e-10 { // -200 dB
		t.Errorf("largest error %.3g of the peak, wanted below 1e-10", worst)
	}
}

func TestToneLevelAndPhase(t *testing.T) {
	x := wave(Tones{{FreqHz: 1000, RMS: 2, Turns: 0.125}, {FreqHz: 3001.7, RMS: 0.01, Turns: -0.4}}, 48000, 48000)
	u, rest := fit(x, 48000, 1000, 3001.7)
	near(t, "first peak", cmplx.Abs(u[0]), 2*math.Sqrt2, 1e-9)
	within(t, "first phase", cmplx.Phase(u[0]), math.Pi/4, 1e-9)
	near(t, "second peak", cmplx.Abs(u[1]), 0.01*math.Sqrt2, 1e-9)
	within(t, "second phase", cmplx.Phase(u[1]), -0.8*math.Pi, 1e-8)
	if rest > 1e-9 {
		t.Errorf("rest %.3g, wanted nothing else in the wave", rest)
	}
}

// TestCurve checks the worked values of y = x + 0.01 x^2 + 0.005 x^3 for a
// peak of 1: fundamental A + 3/4 a3 A^3, second a2 A^2/2, third a3 A^3/4, shift
// a2 A^2/2, THD 0.00513462718 (computed from these powers of the cosine).
func TestCurve(t *testing.T) {
	c := Curve{K2: 0.01, K3: 0.005, Of: Tone{FreqHz: 1000, RMS: 1 / math.Sqrt2}}
	x := wave(c, 48000, 4800)
	u, rest := fit(x, 48000, 1000, 2000, 3000)
	near(t, "fundamental", real(u[0]), 1.00375, 1e-9)
	near(t, "second", real(u[1]), 0.005, 1e-9)
	near(t, "third", real(u[2]), 0.00125, 1e-9)
	near(t, "shift", mean(x), 0.005, 1e-9)
	near(t, "THD", math.Hypot(cmplx.Abs(u[1]), cmplx.Abs(u[2]))/cmplx.Abs(u[0]), 0.00513462718, 1e-8)
	if rest > 1e-12 {
		t.Errorf("rest %.3g: the curve makes other lines", rest)
	}
	h := c.HarmonicsOf(1)
	for k, want := range []float64{0.005, 1.00375, 0.005, 0.00125} {
		near(t, "closed form", h[k], want, 1e-12)
	}
}

func TestMainsLinesKeepStep(t *testing.T) {
	m := Mains{FreqHz: 50.013, StartTurns: 0.3, Harmonics: []Line{
		{Order: 1, RMS: 3e-3, Turns: 0.1}, {Order: 3, RMS: 1e-3, Turns: 0.25}, {Order: 40, RMS: 2e-6, Turns: 0.7},
	}}
	x := wave(m, 48000, 96000)
	u, rest := fit(x, 48000, 50.013, 3*50.013, 40*50.013)
	for k, l := range m.Harmonics {
		near(t, "line", cmplx.Abs(u[k]), math.Sqrt2*l.RMS, 1e-9)
		turns := float64(l.Order)*0.3 + l.Turns
		within(t, "phase", math.Remainder(cmplx.Phase(u[k])/(2*math.Pi)-turns, 1), 0, 1e-8)
	}
	if rest > 1e-12 {
		t.Errorf("rest %.3g V, wanted only the lines", rest)
	}
	near(t, "total", m.Total(), rms(x), 1e-4)
}

// TestMainsDrifts compares the comb with its definition, sample by sample, and
// the mean frequency with the phase it turned.
func TestMainsDrifts(t *testing.T) {
	m := Mains{FreqHz: 49.98, DriftHz: 0.02, DriftS: 20, StartTurns: 0.4, Harmonics: []Line{
		{Order: 1, RMS: 1, Turns: 0.1}, {Order: 7, RMS: 0.2, Turns: 0.6, WanderTurns: 0.05, WanderS: 7},
	}}
	const rate, n = 8000, 80000
	x := wave(m, rate, n)
	for i := 0; i < n; i += 101 {
		at := float64(i) / rate
		// theta is the integral of f(t), by the midpoint rule here.
		theta := 0.4
		for k := range 1000 {
			s := at * (float64(k) + 0.5) / 1000
			theta += (49.98 + 0.02*math.Sin(2*math.Pi*s/20)) * at / 1000
		}
		swing := 0.05 * math.Sin(2*math.Pi*(at/7+0.17*7))
		want := math.Sqrt2*math.Cos(2*math.Pi*(theta+0.1)) + 0.2*math.Sqrt2*math.Cos(2*math.Pi*(7*theta+0.6+swing))
		within(t, "comb", x[i], want, 3e-5) // blocks are straight: 256 samples are 32 ms here
	}
	// Mean of f over 0..5 s: 49.98 + 0.02 (20/(2 pi 5)) (1 - cos(pi/2)).
	within(t, "mean frequency", m.MeanHz(0, 5), 49.98+0.02*20/(2*math.Pi*5), 1e-12)
}
