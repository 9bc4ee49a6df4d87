package commonmode

import (
	"math"
	"math/cmplx"
	"testing"
)

// bench is the circuit around a one-op-amp difference stage, solved from its
// node equations alone: EMF - source resistor - pin (with a capacitance to
// ground) - coupling capacitor - R1 or R3 - op-amp with R2 and R4. 0: none
// (a short for series parts).
type bench struct {
	r1, r2, r3, r4       float64
	c2, c4               float64
	rsHot, rsCold        float64
	pinHot, pinCold      float64 // F to ground
	seriesHot, seriesCld float64 // coupling capacitors, F
}

func four(r1, r2, r3, r4 float64) bench { return bench{r1: r1, r2: r2, r3: r3, r4: r4} }

const (
	hot = iota
	cold
	afterHot
	afterCold
	plus
	minus
	out
	nodes
)

// solve returns the node voltages for EMFs of eHot and eCold at f Hz.
func (b bench) solve(f float64, eHot, eCold complex128) [nodes]complex128 {
	jw := complex(0, 2*math.Pi*f)
	var m [nodes][nodes + 1]complex128
	g := func(r float64) complex128 { return complex(1/math.Max(r, 1e-6), 0) }
	ground := func(n int, y complex128) { m[n][n] += y }
	join := func(a, c int, y complex128) {
		m[a][a] += y
		m[c][c] += y
		m[a][c] -= y
		m[c][a] -= y
	}
	series := func(c float64) complex128 {
		if c == 0 {
			return 1e6
		}
		return jw * complex(c, 0)
	}
	for _, leg := range []struct {
		pin int
		rs  float64
		e   complex128
		c   float64
	}{{hot, b.rsHot, eHot, b.pinHot}, {cold, b.rsCold, eCold, b.pinCold}} {
		ground(leg.pin, g(leg.rs)+jw*complex(leg.c, 0))
		m[leg.pin][nodes] += leg.e * g(leg.rs)
	}
	join(hot, afterHot, series(b.seriesHot))
	join(cold, afterCold, series(b.seriesCld))
	join(afterHot, plus, g(b.r3))
	ground(plus, g(b.r4)+jw*complex(b.c4, 0))
	join(afterCold, minus, g(b.r1))
	join(minus, out, g(b.r2)+jw*complex(b.c2, 0))
	// The op-amp delivers what current the output needs and holds its inputs
	// equal.
	m[out] = [nodes + 1]complex128{}
	m[out][plus], m[out][minus] = 1, -1
	return eliminate(m)
}

func eliminate(m [nodes][nodes + 1]complex128) (x [nodes]complex128) {
	for c := range nodes {
		p := c
		for r := c + 1; r < nodes; r++ {
			if cmplx.Abs(m[r][c]) > cmplx.Abs(m[p][c]) {
				p = r
			}
		}
		m[c], m[p] = m[p], m[c]
		for r := c + 1; r < nodes; r++ {
			k := m[r][c] / m[c][c]
			for j := c; j <= nodes; j++ {
				m[r][j] -= k * m[c][j]
			}
		}
	}
	for r := nodes - 1; r >= 0; r-- {
		s := m[r][nodes]
		for j := r + 1; j < nodes; j++ {
			s -= m[r][j] * x[j]
		}
		x[r] = s / m[r][r]
	}
	return x
}

// gains are the differential one, output over pin 2 - pin 3, and the
// common-mode one, output over the joined drive.
func (b bench) gains(f float64) (gd, gc, in complex128) {
	v := b.solve(f, 0.5, -0.5)
	in = v[hot] - v[cold]
	return v[out] / in, b.solve(f, 1, 1)[out], in
}

func (b bench) rejection(f float64) float64 {
	gd, gc, _ := b.gains(f)
	return 20 * math.Log10(cmplx.Abs(gd)/cmplx.Abs(gc))
}

// The nodal solution itself against the closed forms of the stage: worst case
// of tolerances, one resistor off (closed form to first order), a ratio left
// after a trim.
func TestNodal(t *testing.T) {
	for _, c := range []struct {
		name string
		b    bench
		want float64 // dB
		tol  float64
	}{
		{"1 %, unity gain, worst case", four(10e3*0.99, 10e3*1.01, 10e3*1.01, 10e3*0.99), 33.9794001, 1e-4},
		{"0.1 %, unity gain, worst case", four(10e3*0.999, 10e3*1.001, 10e3*1.001, 10e3*0.999), 53.9794001, 1e-4},
		{"1 %, gain 10, worst case", four(10e3*0.99, 100e3*1.01, 10e3*1.01, 100e3*0.99), 48.7859432, 2e-4},
		{"one resistor off by 1 %", four(10e3, 10e3, 10e3, 10e3*1.01), 46.0205999, 0.07},
		{"100 ppm of ratio left", four(10e3, 10e3, 10e3, 10e3*1.0001), 86.0205999, 1e-3},
	} {
		if got := c.b.rejection(100); math.Abs(got-c.want) > c.tol {
			t.Errorf("%s: %.5f dB, want %.5f", c.name, got, c.want)
		}
	}
}
