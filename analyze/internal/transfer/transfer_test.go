package transfer

import (
	"encoding/json"
	"math"
	"math/cmplx"
	"os"
	"testing"

	"benchslip/analyze"
	"benchslip/analyze/internal/trial"
)

var short = []string{
	"sweep length=3s",
	"sweep from=5Hz to=22kHz length=3s before=400ms after=600ms",
	"sweep from=20Hz to=9kHz length=2s rate=96kHz",
	"stepped-tones count=16 each=300ms gap=50ms",
	"multitone length=2s",
	"white-noise length=2s",
	"pink-noise length=2s",
}

// Circuits in closed form are recovered within 0.01 dB and, after one common
// delay, 0.1 degrees, beyond what the noise takes (four standard
// uncertainties), and the errors are of the size that is claimed.
func TestCircuits(t *testing.T) {
	units := []struct {
		name string
		h    func(float64) complex128
	}{
		{"coupled, second-order top", chain(highpass(10), section(40000, 0.8), delayed(31.3e-6))},
		{"inverting, narrow, 2.2 ms late", chain(inverted, highpass(40), lowpass(15000), delayed(2.2e-3))},
		{"two poles below", chain(highpass(12), highpass(3))},
	}
	for _, text := range short {
		in := trial.Played(text)
		heard := in.Copy().Noise(1e-4, 2)
		for i, u := range units {
			out := in.Through(u.h).Noise(1e-4, uint64(10+i))
			c := curveOf(t, out, heard)
			db, deg, chi := worst(c, u.h)
			if db > 0.01 || deg > 0.1 {
				t.Errorf("%s, %s: off by %.4f dB, %.3f deg", text, u.name, db, deg)
			}
			if chi > 2.5 || len(c.Used()) < 14 || len(c.Used()) < len(c.Points)*9/10 {
				t.Errorf("%s, %s: chi-square %.2f over %d of %d points", text, u.name, chi, len(c.Used()), len(c.Points))
			}
			want := 1.0
			if u.name[0] == 'i' {
				want = -1
			}
			if c.Impulse.Sign != want {
				t.Errorf("%s, %s: polarity %g", text, u.name, c.Impulse.Sign)
			}
		}
	}
}

// Filters run in the time domain, their responses by scipy 1.10
// (testdata/make_filters.py).
func TestScipyFilters(t *testing.T) {
	var file struct {
		Filters []struct {
			Name       string
			SOS        [][6]float64
			Hz, Re, Im []float64
		}
	}
	data, err := os.ReadFile("testdata/filters.json")
	if err != nil {
		t.Fatal(err)
	}
	if err := json.Unmarshal(data, &file); err != nil {
		t.Fatal(err)
	}
	for _, text := range []string{"sweep length=3s", "white-noise length=3s"} {
		in := trial.Played(text)
		for _, f := range file.Filters {
			out := in.Copy()
			for _, s := range f.SOS {
				var a, b float64 // transposed direct form II
				for i, x := range out.X {
					y := s[0]*x + a
					a = s[1]*x - s[4]*y + b
					b = s[2]*x - s[5]*y
					out.X[i] = y
				}
			}
			c := curveOf(t, out.Noise(3e-6, 5), in)
			for i, hz := range f.Hz {
				q, bad := c.At(hz)
				if bad != nil {
					t.Fatal(bad)
				}
				want := complex(f.Re[i], f.Im[i])
				if cmplx.Abs(want) < 1e-3 { // 60 dB down: noise
					continue
				}
				e := q.H / want
				db := math.Abs(20*math.Log10(cmplx.Abs(e))) - 4*8.69*q.U
				deg := math.Abs(cmplx.Phase(e))*180/math.Pi - 4*57.3*q.U
				if db > 0.01 || deg > 0.1 {
					t.Errorf("%s, %s at %.5g Hz: off by %.4f dB, %.3f deg", text, f.Name, hz, db, deg)
				}
			}
		}
	}
}

// A sweep's distortion stays out of the response, and the responses of
// higher orders come out as the closed form has them: y = x + a x^2 + b x^3
// with x = A sin phi gives a fundamental of A (1 + 3/4 b A^2) and, relative
// to the sweep, a second order of -j a A/2 and a third of -b A^2/4
// (polynomial nonlinearity; cos 2 phi and sin 3 phi against sin 2 phi and
// sin 3 phi of the synchronised sweep).
func TestOrders(t *testing.T) {
	in := trial.Played("sweep to=9kHz length=4s peak=-0.5dBFS")
	A := math.Pow(10, -0.5/20)
	a, b := 0.02, 0.01
	out := in.Copy()
	for i, x := range in.X {
		out.X[i] = x + a*x*x + b*x*x*x
	}
	out.Noise(1e-6, 1)
	tk := trial.Take("t", out, in)
	sh := shapeOf(mustSignal(t, tk, "in"))
	sp, bad := transform(mustSignal(t, tk, "out"), mustSignal(t, tk, "in"), sh)
	if bad != nil {
		t.Fatal(bad)
	}
	for _, hz := range []float64{150, 400, 1000, 3000} {
		half := 3 / (sh.Law.L * math.Ln2)
		g := &regression{X: sp.X, Y: sp.Y, centre: hz / sp.stepHz, half: half / sp.stepHz, order: 2, stretch: sp.stretch}
		for n := 2; n <= 4; n++ {
			g.leads = append(g.leads, sh.Law.L*math.Log(float64(n))*sp.stepHz)
		}
		e := g.solve()
		for _, q := range []struct {
			name      string
			got, want complex128
		}{
			{"fundamental", e.H, complex(1+0.75*b*A*A, 0)},
			{"second", e.Orders[0], complex(0, -a*A/2)},
			{"third", e.Orders[1], complex(-b*A*A/4, 0)},
			{"fourth", e.Orders[2], 0},
		} {
			if cmplx.Abs(q.got-q.want) > 3e-5 {
				t.Errorf("%g Hz, %s: %.6f, want %.6f", hz, q.name, q.got, q.want)
			}
		}
	}
	c := curveOf(t, out, in)
	for _, q := range c.Used() { // the level falls in the fades
		limit := 0.002
		if q.Hz < 60 { // about where the second order begins, which no shifted sweep describes
			limit = 0.01
		}
		if e := 20 * math.Log10(cmplx.Abs(q.H)/(1+0.75*b*A*A)); q.Hz > 22 && q.Hz < 8500 && math.Abs(e) > limit {
			t.Errorf("the response at %.4g Hz is off by %.4f dB beside 2 %% of distortion", q.Hz, e)
		}
	}
}

func mustSignal(t *testing.T, tk *analyze.Take, key string) *analyze.Signal {
	t.Helper()
	tk.Wiring.In = "2"
	s, bad := passOf(tk).SignalOf(tk, "take", key)
	if bad != nil {
		t.Fatal(bad)
	}
	return s
}

// Coherence and random error of H1 after Bendat and Piersol: white noise with
// independent noise at the output, gamma^2 = 1/(1 + N/S), and a relative
// error of sqrt((1 - gamma^2)/(2 gamma^2 n)) with n lines joined.
func TestCoherence(t *testing.T) {
	const sigma, noise = 0.1, 0.1
	in := trial.New(48000, 4).Noise(sigma, 1)
	out := in.Copy().Noise(noise, 2)
	c := curveOf(t, out, in)
	want := 1 / (1 + noise*noise/(sigma*sigma))
	sum, count, ratio := 0.0, 0.0, 0.0
	for _, q := range c.Points {
		if q.Hz < 1000 {
			continue
		}
		sum += q.Coherence
		count++
		// Lines of a tricube window of +-1/24 octave that count: (sum w)^2 /
		// sum w^2 of 2 B, 1.16 B with a second-order polynomial costs 9/4.
		n := 2 * q.Hz * (math.Pow(2, 1.0/24) - 1) * 4 * 0.5878 / 1.93
		ratio += q.U / math.Sqrt((1-want)/(2*want*n))
	}
	if got := sum / count; math.Abs(got-want) > 0.02 {
		t.Errorf("coherence %.3f, want %.3f", got, want)
	}
	t.Logf("claimed error %.3f of the formula's", ratio/count)
	if r := ratio / count; r < 0.9 || r > 1.15 {
		t.Errorf("claimed error is %.3f times the formula's", r)
	}
}

// Hum 50 dB under the tone level moves the response by no more than what is
// claimed.
func TestHum(t *testing.T) {
	h := highpass(10)
	for _, text := range short {
		in := trial.Played(text)
		out := in.Through(h).Mains(50.02, 0.01, []float64{3e-4, 1e-4, 2e-4, 0, 1e-4}, 3).Noise(1e-5, 1)
		c := curveOf(t, out, in)
		db, deg, _ := worst(c, h)
		if db > 0.01 || deg > 0.1 {
			t.Errorf("%s: off by %.4f dB, %.3f deg beyond the claim", text, db, deg)
		}
	}
}
