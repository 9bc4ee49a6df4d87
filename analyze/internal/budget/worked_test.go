package budget

import (
	"math"
	"testing"

	"benchslip/analyze"
	"benchslip/capture/unit"
)

// own makes independent lines of the given standard uncertainties.
func own(u ...float64) []analyze.Contributor {
	var out []analyze.Contributor
	for _, x := range u {
		out = append(out, analyze.Contributor{Kind: "B", U: x})
	}
	return out
}

// with gives the lines degrees of freedom, in order.
func with(lines []analyze.Contributor, dof ...float64) []analyze.Contributor {
	for i := range dof {
		lines[i].Dof = dof[i]
	}
	return lines
}

func u(lines []analyze.Contributor) float64  { x, _ := Combine(lines); return x }
func nu(lines []analyze.Contributor) float64 { _, x := Combine(lines); return x }

// Coverages of 95.45 % (a little over 2: erf(sqrt 2) is 95.44997 %) and 99 %.
const (
	k95 = 2.000002444
	k99 = 2.5758293035489
)

// Readings of JCGM 100 H.2: V/V, I/mA, phase/rad, five simultaneous sets.
var h2 = [5][3]float64{{5.007, 19.663, 1.0456}, {4.994, 19.639, 1.0438}, {5.005, 19.640, 1.0468},
	{4.990, 19.685, 1.0428}, {4.999, 19.678, 1.0433}}

func h2Of(f func(v, i, phi float64) float64) (mean, u float64) {
	var x []float64
	for _, r := range h2 {
		x = append(x, f(r[0], r[1]*1e-3, r[2]))
	}
	mean, u, _ = TypeA(x)
	return mean, u
}

func first(a, _ float64) float64  { return a }
func second(_, b float64) float64 { return b }

// TestWorked checks against worked examples. "closed form" rows were computed
// from the formula named, outside this program.
func TestWorked(t *testing.T) {
	h1 := with(own(25, 9.7, 2.9, 16.6), 18, 25.6, 50, 2)
	g4 := with(own(0.25, 0.57, 0.82), 9, 4, 14)
	daily := []float64{172, 116, 13, 144, 106, 31, 60, 125, 163, 41} // JCGM 100 table H.9, uV over 10 V
	within := []float64{60, 77, 111, 101, 67, 93, 80, 73, 88, 86}
	_, sDay, _ := TypeA(daily)
	dB := own(0.06, 0.05, 0.03)
	dB[1].Dof = 4
	// Two channels of 1 % with correlation r: a shared part sqrt(r) that
	// cancels in the quotient, and an own part sqrt(1-r) each.
	ratio := func(r float64) float64 {
		c := func() []analyze.Contributor {
			return []analyze.Contributor{{U: 0.01 * math.Sqrt(r), Source: "volts"}, {U: 0.01 * math.Sqrt(1-r)}}
		}
		return DecibelsPer(unit.Ratio) * u(Difference(c(), c(), 1, 1))
	}
	_, byTotal, byFloor, _ := Subtract(math.Pow(10, -100./20), math.Pow(10, -106./20))
	gain := unit.New(20, "dB")

	for _, c := range []struct {
		name      string
		got, want float64
		tol       float64
		source    string
	}{
		{"end gauge: combined, nm", u(h1), 31.6711225, 1e-7, "JCGM 100 H.1.4 prints 32; closed form"},
		{"end gauge: effective degrees", nu(h1), 16.764554, 1e-5, "JCGM 100 H.1.6 prints 16.7 (from memory); closed form"},
		{"end gauge: t99 at 16", Coverage(k99, nu(h1)), 2.92078162, 1e-7, "JCGM 100 table G.2 prints 2.92"},
		{"end gauge: U99, nm", Coverage(k99, nu(h1)) * 32, 93, 0.5, "JCGM 100 H.1.6 prints 93 (read second-hand)"},
		{"three factors: combined, %", u(g4), 1.02946588, 1e-8, "JCGM 100 G.4.1 prints 1.03; closed form"},
		{"three factors: degrees", nu(g4), 19.0, 0.005, "JCGM 100 G.4.1 prints 19.0"},
		{"three factors: U95, %", 1.03 * Coverage(1.959963984540, nu(g4)), 2.2, 0.05, "JCGM 100 G.4.1 prints 2.2 (from memory)"},
		{"voltmeter: type B, uV", Rectangular(14e-6*0.928571e6 + 2e-6*1e6), 8.66025404, 1e-5, "JCGM 100 4.3.7 prints 8.7; 15/sqrt 3"},
		{"voltmeter: combined, uV", RSS(12, 8.7), 14.8219432, 1e-7, "JCGM 100 5.1.5 prints 15; closed form"},
		{"impedance: R", first(h2Of(func(v, i, p float64) float64 { return v / i * math.Cos(p) })), 127.73217, 1e-3, "JCGM 100 table H.4: 127.732"},
		{"impedance: u(R)", second(h2Of(func(v, i, p float64) float64 { return v / i * math.Cos(p) })), 0.071, 5e-4, "JCGM 100 table H.4: 0.071"},
		{"impedance: X", first(h2Of(func(v, i, p float64) float64 { return v / i * math.Sin(p) })), 219.846512, 1e-3, "JCGM 100 table H.4: 219.847"},
		{"impedance: u(X)", second(h2Of(func(v, i, p float64) float64 { return v / i * math.Sin(p) })), 0.295, 1e-3, "JCGM 100 table H.4: 0.295"},
		{"impedance: Z", first(h2Of(func(v, i, _ float64) float64 { return v / i })), 254.259702, 1e-3, "JCGM 100 table H.4: 254.260"},
		{"impedance: u(Z)", second(h2Of(func(v, i, _ float64) float64 { return v / i })), 0.236, 5e-4, "JCGM 100 table H.4: 0.236"},
		{"days: scatter of the means, uV", sDay * math.Sqrt(10), 57.0895009, 1e-6, "JCGM 100 H.5 prints 57"},
		{"days: pooled within, uV", RSS(within...) / math.Sqrt(10), 84.8869837, 1e-6, "JCGM 100 H.5 prints 85"},
		{"days: u of the grand mean, uV", sDay, 18.0532853, 1e-6, "JCGM 100 H.5 prints 18"},
		{"step attenuator, dB", RSS(.009, .0025, .0011, .02, .0017, .0003, .0003, .002, .002), 0.0223501678, 1e-9, "EA-4/02 30 dB attenuator: 0.0224 (entries from memory)"},
		{"four rectangular terms, 95 %", 1.959964 * u(own(1, 1, 1, 1)), 3.919928, 1e-6, "JCGM 101 9.2 prints 3.92"},
		{"dB of 1 %", 0.01 * DecibelsPer(unit.Volt), 0.0868588964, 1e-10, "closed form (20/ln 10) u"},
		{"1 % of 0.1 dB", Relative(gain, unit.New(0.2, "dB")), 0.0115129255, 1e-10, "closed form (ln 10/20) u, k = 2 taken off"},
		{"quotient, r = 0, dB", ratio(0), 0.122837029, 1e-8, "JCGM 100 5.2.2; closed form"},
		{"quotient, r = 0.9, dB", ratio(0.9), 0.0388444794, 1e-8, "JCGM 100 5.2.2; closed form"},
		{"quotient, r = 1, dB", ratio(1), 0, 1e-12, "JCGM 100 5.2.2; closed form"},
		{"certificate, dB", Relative(gain, unit.New(0.12, "dB")) * DecibelsPer(unit.Ratio), 0.06, 1e-12, "JCGM 100 4.3.3: U/k"},
		{"meter on AC, V", Rectangular(0.0006*0.7 + 0.0003*1), 0.000415692194, 1e-12, "JCGM 100 4.3.7; closed form"},
		{"floor 6 dB down: sensitivity", byTotal, 1.33544983, 1e-7, "closed form Pt/(Pt-Pn)"},
		{"floor 6 dB down: u, dB", RSS(0.2*byTotal, 0.2*byFloor), 0.275387207, 1e-7, "closed form"},
		{"three dB terms", u(dB), 0.0836660027, 1e-9, "closed form"},
		{"three dB terms: k", Coverage(k95, nu(dB)), 2.08393267, 1e-6, "Student's t at 31 degrees, computed with an independent library"},
		{"ripple +-0.1 dB", ArcSine(0.1), 0.0707106781, 1e-9, "common practice; closed form a/sqrt 2"},
		{"triangular +-0.1 dB", Triangular(0.1), 0.040824829, 1e-9, "JCGM 100 4.3.9; closed form a/sqrt 6"},
	} {
		if math.Abs(c.got-c.want) > c.tol {
			t.Errorf("%s: got %.9g, want %.9g +- %g (%s)", c.name, c.got, c.want, c.tol, c.source)
		}
	}
}

// Student's factors for 95.45 %: JCGM 100 table G.2 to two decimals, and to
// eight from an independent library.
func TestStudent(t *testing.T) {
	for _, c := range []struct{ nu, printed, full float64 }{
		{1, 13.97, 13.9678115}, {2, 4.53, 4.52655076}, {3, 3.31, 3.30682992}, {5, 2.65, 2.64865425},
		{10, 2.28, 2.28368161}, {20, 2.13, 2.13302836}, {50, 2.05, 2.05125078},
	} {
		got := student(k95, c.nu)
		if math.Abs(got-c.printed) > 0.0051 || math.Abs(got-c.full) > 1e-7*c.full {
			t.Errorf("nu %g: %.9g, want %.9g (table G.2: %g)", c.nu, got, c.full, c.printed)
		}
	}
	// Closed forms (Abramowitz and Stegun 26.7, inverted): one degree
	// tan(pi p/2), two p sqrt(2/(1-p^2)) with p = 1-q, for small and large k.
	for _, k := range []float64{1e-6, 0.01, 0.5, 1, 2, 3, 5, 9, 20, 36} {
		p, q := math.Erf(k/math.Sqrt2), math.Erfc(k/math.Sqrt2)
		one := 1 / math.Tan(math.Pi/2*q)
		if p < 0.5 {
			one = math.Tan(math.Pi / 2 * p)
		}
		near(t, student(k, 1), one, 1e-9, "one degree, k", k)
		near(t, student(k, 2), p*math.Sqrt(2/(q*(1+p))), 1e-9, "two degrees, k", k)
	}
}

// At 50 effective degrees of freedom the normal law takes over; below, the
// degrees are truncated.
func TestCoverage(t *testing.T) {
	for _, c := range []struct{ k, nu, want float64 }{
		{2, math.Inf(1), 2}, {2, 50, 2}, {3, 1e6, 3}, {0.7, 80, 0.7},
		{2, math.Nextafter(50, 0), student(2, 50)}, // a hair below is rounding: 50 degrees of Student's law
		{2, 49.9, student(2, 49)}, {2, 16.999, student(2, 16)}, {2, 17, student(2, 17)},
		{2, 17 * (1 - 1e-15), student(2, 17)}, {3, 4.5, student(3, 4)}, {2, 0.3, student(2, 1)},
	} {
		if got := Coverage(c.k, c.nu); got != c.want {
			t.Errorf("Coverage(%g, %v) = %.9g, want %.9g", c.k, c.nu, got, c.want)
		}
	}
	for _, k := range []float64{0.001, 1, 2, 3, 8, 40, 1e9} {
		for nu := 1.0; nu < 50; nu += 7 {
			if got := Coverage(k, nu); math.IsInf(got, 0) || got < math.Min(k, mostCoverage) {
				t.Errorf("Coverage(%g, %g) = %g: not finite, or below the normal law's", k, nu, got)
			}
		}
	}
}

// JCGM 106:2012 7.2 to 7.4: conformance probabilities.
func TestConforming(t *testing.T) {
	inf := math.Inf(1)
	near(t, Conforming((1-0.85)/0.1, inf), 0.933192799, 1e-8, "upper limit, Phi(1.5)", 0)
	near(t, Conforming((1-0.8)/0.2, inf)-Conforming((-1-0.8)/0.2, inf), 0.841344746, 1e-8, "two-sided", 0)
	near(t, Conforming((-5.40+5.47)/0.05, inf), 0.92, 0.005, "breakdown voltage, JCGM 106 7.3 prints 0.92 (from memory)", 0)
	near(t, Conforming((16.3-13.6)/1.8, inf)-Conforming((12.5-13.6)/1.8, inf), 0.66, 0.005, "motor oil, JCGM 106 7.4 prints 0.66 (from memory)", 0)
	near(t, Conforming(-2, inf), 0.0227501319, 1e-8, "false accept at w = U", 0)
	near(t, Conforming(0, 3), 0.5, 1e-12, "at the limit", 0)
	// Student's one-sided 95 % point at 10 degrees is 1.812 (JCGM 100 table G.2, 90 % column).
	near(t, Conforming(1.8124611, 10), 0.95, 1e-7, "t at 10 degrees", 0)
}

func near(t *testing.T, got, want, rel float64, what string, at float64) {
	t.Helper()
	if !(math.Abs(got-want) <= rel*math.Abs(want)) {
		t.Errorf("%s %g: got %.12g, want %.12g", what, at, got, want)
	}
}
