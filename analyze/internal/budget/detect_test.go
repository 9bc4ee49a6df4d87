package budget

import (
	"math"
	"testing"
)

// Detection limits of one line, in density/sqrt(T): thresholds from the closed
// form sqrt(ln 1/p); RMS for a probability of detection from the noncentral
// chi-square law of an independent general-purpose library.
func TestDetectionTable(t *testing.T) {
	for _, c := range []struct{ p, threshold, p50, p90, p95 float64 }{
		{1e-2, 2.14597, 2.02357, 2.95184, 3.21325},
		{1e-3, 2.62826, 2.53006, 3.45089, 3.71097},
		{1e-4, 3.03485, 2.95051, 3.86771, 4.12708},
	} {
		th := Threshold(1, 1, c.p)
		near(t, th, c.threshold, 3e-6, "threshold at p", c.p)
		for _, d := range []struct{ probability, rms float64 }{{0.5, c.p50}, {0.9, c.p90}, {0.95, c.p95}} {
			near(t, Detection(d.rms, th, 1), d.probability, 5e-6, "probability of detection at p", c.p)
			// The upper bound turns the same law round: a reading on the
			// threshold, seen with 95 %, bounds the line at that RMS.
			b, ok := UpperBound(th*th, 1, 1, d.probability)
			if !ok {
				t.Fatalf("no bound for a reading at the threshold of p = %g", c.p)
			}
			near(t, b, d.rms, 3e-6, "bound at p", c.p)
		}
	}
	near(t, Threshold(1, 10, 1e-3), 0.831129068, 1e-9, "10 s, sqrt(ln(1/p)/T)", 0)
	near(t, Threshold(10e-9, 10, 1e-3), 8.31129068e-9, 1e-8, "10 nV/rtHz, V", 0)
	near(t, ShareThreshold(Share(10e-9, 10)*3.8832, 1e-3), 1.63780937e-8, 1e-6, "with a flat-top window, noise bandwidth 3.8832 bins", 0)
	b, _ := UpperBound(math.Pow(Threshold(1, 10, 1e-3), 2), Share(1, 10), 1, 0.95)
	near(t, b, 1.17351034, 1e-6, "95 % detection in 10 s, independent library", 0)
}

// Marcum's function has closed forms at a = b (published identity):
// Q_1(a, a) = (1 + e^{-a^2} I_0(a^2))/2, and at a = 0 a finite sum:
// Q_m(0, b) = e^{-b^2/2} sum_{k<m} (b^2/2)^k / k!.
func TestMarcumClosedForms(t *testing.T) {
	for _, a := range []float64{0.01, 0.3, 1, 2, 5, 12, 25} {
		near(t, MarcumQ(1, a, a), (1+besselI0Scaled(a*a))/2, 1e-10, "Q_1(a, a), a", a)
	}
	for m := 1; m <= 30; m += 7 {
		for _, b := range []float64{0.1, 1, 3, 6} {
			sum, term := 0.0, 1.0
			for k := 0; k < m; k++ {
				sum += term
				term *= b * b / 2 / float64(k+1)
			}
			// a tiny offset takes the other branch
			for _, a := range []float64{0, 1e-6} {
				if got, want := MarcumQ(m, a, b), math.Exp(-b*b/2)*sum; math.Abs(got-want) > 1e-11 {
					t.Errorf("Q_%d(%g, %g) = %.12g, want %.12g", m, a, b, got, want)
				}
			}
		}
	}
}

// besselI0Scaled is e^-x I_0(x) by its integral (1/pi) int_0^pi e^{x(cos t - 1)} dt;
// the trapezoid on a period converges faster than any power.
func besselI0Scaled(x float64) float64 {
	const n = 4000
	sum := 0.0
	for i := range n {
		sum += math.Exp(x * (math.Cos(math.Pi*(float64(i)+0.5)/n) - 1))
	}
	return sum / n
}

// Large arguments: the law's normal limit (Sankaran's transform, Biometrika
// 50, 1963, good to 1e-3 there), monotone and inside 0..1 everywhere.
func TestNoncentralLarge(t *testing.T) {
	for _, c := range []struct{ dof, lambda float64 }{{2, 1e3}, {40, 1e4}, {200, 1e6}, {2, 1e8}, {1e4, 10}} {
		mean, sd := c.dof+c.lambda, math.Sqrt(2*(c.dof+2*c.lambda))
		last := -1.0
		for _, z := range []float64{-6, -2, -1, 0, 1, 2, 6} {
			p := NoncentralChiSquare(mean+z*sd, c.dof, c.lambda)
			if !(p >= last && p <= 1) {
				t.Errorf("dof %g lambda %g z %g: %g after %g", c.dof, c.lambda, z, p, last)
			}
			last = p
			h := 1 - 2*(c.dof+c.lambda)*(c.dof+3*c.lambda)/(3*math.Pow(c.dof+2*c.lambda, 2))
			pp := (c.dof + 2*c.lambda) / math.Pow(c.dof+c.lambda, 2)
			m := (h - 1) * (1 - 3*h)
			x := (math.Pow((mean+z*sd)/mean, h) - (1 + h*pp*(h-1-0.5*(2-h)*m*pp))) / (h * math.Sqrt(2*pp) * (1 + 0.5*m*pp))
			if want := Conforming(x, math.Inf(1)); math.Abs(p-want) > 1e-3 {
				t.Errorf("dof %g lambda %g z %g: %g, Sankaran %g", c.dof, c.lambda, z, p, want)
			}
		}
	}
}

// lcg is the noise of sums of twelve uniforms: mean 0, variance 1.
type lcg uint32

func (s *lcg) next() float64 {
	g := -6.0
	for range 12 {
		*s = *s*1664525 + 1013904223
		g += (float64(*s) + 0.5) / (1 << 32)
	}
	return g
}

// A bound at 95 % lies below the truth in 5 % of takes, no more (exact law:
// equal shares) and near it for unequal ones; LineU is the scatter of the
// corrected sum.
func TestBoundHolds(t *testing.T) {
	s := lcg(12345)
	const trials = 2000
	for _, c := range []struct {
		name   string
		rms    []float64
		shares []float64
		lo, hi float64 // share of takes in which the bound misses
	}{
		{"one line", []float64{2}, []float64{1}, 0.04, 0.06},
		{"twenty equal shares", repeat(20, 1), repeat(20, 1), 0.04, 0.06},
		{"falling shares", []float64{3, 1, 1, 0.5, 0.5}, []float64{4, 2, 1, 0.5, 0.25}, 0.02, 0.07},
	} {
		missed, none := 0, 0
		var sum, squares float64
		truth, share := RSS(c.rms...), 0.0
		var lineU []float64
		for i := range c.rms {
			share += c.shares[i]
			lineU = append(lineU, LineU(c.rms[i]*c.rms[i], c.shares[i], 0))
		}
		for range trials {
			power := 0.0
			for i, v := range c.rms {
				sd := math.Sqrt(c.shares[i] / 2)
				a, b := v+sd*s.next(), sd*s.next()
				power += a*a + b*b
			}
			net := power - share
			sum += net
			squares += net * net
			b, ok := UpperBoundOf(power, c.shares, 0.95)
			if !ok {
				b = SumThreshold(c.shares, 1e-3)
				none++
			}
			if b < truth {
				missed++
			}
		}
		if r := float64(missed) / trials; r < c.lo || r > c.hi {
			t.Errorf("%s: bound below the truth in %.3f of takes, want %g..%g (%d without)", c.name, r, c.lo, c.hi, none)
		}
		mean := sum / trials
		sd := math.Sqrt(squares/trials - mean*mean)
		near(t, sd, RSS(lineU...), 0.05, c.name+": scatter", 0)
		if math.Abs(mean-truth*truth) > 4*sd/math.Sqrt(trials) {
			t.Errorf("%s: corrected power %g, want %g: biased", c.name, mean, truth*truth)
		}
	}
}

func repeat(n int, x float64) []float64 {
	out := make([]float64, n)
	for i := range out {
		out[i] = x
	}
	return out
}

func TestBoundEdges(t *testing.T) {
	if _, ok := UpperBound(0, 1, 5, 0.95); ok {
		t.Error("a reading of nothing has a bound")
	}
	if _, ok := UpperBound(0.04, 1, 1, 0.95); ok { // P(reading <= 0.04) = 1-e^-0.04 = 3.9 % without any signal
		t.Error("a reading that noise alone undercuts in 3.9 % of takes has a bound")
	}
	if b, ok := UpperBound(0.06, 1, 1, 0.95); !ok || b > 0.5 { // 5.8 %
		t.Errorf("a reading of 0.06 shares: %g, %v", b, ok)
	}
	if b, ok := UpperBound(9, 0, 3, 0.95); !ok || b != 3 {
		t.Errorf("without noise: %g, %v, want 3", b, ok)
	}
	for _, p := range []float64{1e-2, 1e-3, 1e-5} {
		near(t, SumThreshold([]float64{2.5}, p), ShareThreshold(2.5, p), 1e-9, "threshold of a sum of one, p", p)
	}
	near(t, SumThreshold(repeat(4, 2.5), 1e-3), math.Sqrt(2.5/2*26.124), 1e-4, "four lines; chi-square tables, 8 degrees, 0.999: 26.12 (from memory)", 0)
	one, _ := UpperBound(40, 1, 10, 0.95)
	same, _ := UpperBoundOf(40, repeat(10, 1), 0.95)
	near(t, same, one, 1e-12, "equal shares", 0)
}

func TestFloor(t *testing.T) {
	// Closed form -10 lg(1 - 10^(-d/10)): 20, 15, 10, 6, 3 dB above the floor
	// the truth lies 0.04, 0.14, 0.46, 1.26, 3.0 dB below the reading.
	for d, want := range map[float64]float64{20: 0.0436, 15: 0.1396, 10: 0.4576, 6: 1.2563, 3: 3.0206} {
		net, _, _, ok := Subtract(1, math.Pow(10, -d/20))
		if !ok || math.Abs(-20*math.Log10(net)-want) > 1e-4 {
			t.Errorf("%g dB above the floor: %.4f dB, want %.4f", d, -20*math.Log10(net), want)
		}
	}
	if _, _, _, ok := Subtract(1, 1); ok {
		t.Error("floor equal to the total was subtracted")
	}
	// Vector sums 20, 10, 6 dB below: +0.8/-0.9, +2.4/-3.3, +3.5/-6.0 dB.
	for d, want := range map[float64][2]float64{20: {0.83, -0.92}, 10: {2.39, -3.30}, 6: {3.53, -6.04}} {
		lo, hi := VectorRange(1, math.Pow(10, -d/20))
		if math.Abs(20*math.Log10(hi)-want[0]) > 0.01 || math.Abs(20*math.Log10(lo)-want[1]) > 0.01 {
			t.Errorf("%g dB: %.2f..%.2f dB, want %v", d, 20*math.Log10(lo), 20*math.Log10(hi), want)
		}
	}
}

// LineU with a share that was itself found, from one average.
func TestLineUEstimatedShare(t *testing.T) {
	s := lcg(777)
	const trials, dof, rms, share = 20000, 2, 0.5, 1.0
	var sum, squares float64
	for range trials {
		a, b := rms+s.next()*math.Sqrt(share/2), s.next()*math.Sqrt(share/2)
		found := 0.0
		for range dof {
			g := s.next()
			found += share * g * g / dof
		}
		net := a*a + b*b - found
		sum += net
		squares += net * net
	}
	mean := sum / trials
	near(t, math.Sqrt(squares/trials-mean*mean), LineU(rms*rms, share, dof), 0.02, "scatter with an estimated share", 0)
	if LineU(-1, 2, 0) != 2 {
		t.Error("a negative power changes the noise's own scatter")
	}
}
