package transfer

import (
	"math"
	"math/cmplx"
	"syscall"
	"testing"
	"time"

	"benchslip/analyze"
	"benchslip/analyze/internal/trial"
)

// Closed forms of circuits.
func highpass(fc float64) func(float64) complex128 {
	return func(f float64) complex128 {
		if f == 0 {
			return 0
		}
		return 1 / complex(1, -fc/f)
	}
}

func lowpass(fc float64) func(float64) complex128 {
	return func(f float64) complex128 { return 1 / complex(1, f/fc) }
}

// section is a second-order low-pass.
func section(f0, q float64) func(float64) complex128 {
	return func(f float64) complex128 {
		u := f / f0
		return 1 / complex(1-u*u, u/q)
	}
}

func delayed(tau float64) func(float64) complex128 {
	return func(f float64) complex128 { return turnsOf(-f * tau) }
}

func inverted(float64) complex128 { return -1 }

func chain(hs ...func(float64) complex128) func(float64) complex128 {
	return func(f float64) complex128 {
		v := complex128(1)
		for _, h := range hs {
			v *= h(f)
		}
		return v
	}
}

func passOf(tk *analyze.Take) *analyze.Pass {
	return trial.Pass(nil, analyze.Params{}, map[string]*analyze.Take{"take": tk})
}

func curveOf(t testing.TB, out, in *trial.Signal) *Curve {
	t.Helper()
	tk := trial.Take("t", out, in)
	tk.Wiring.In = "2"
	c, bad := Of(passOf(tk), tk, "take")
	if bad != nil {
		t.Fatal(bad)
	}
	return c
}

// worst compares the points that count with the truth: the largest errors in
// dB and, after one common delay is taken off, in degrees, each less four
// standard uncertainties, and chi-square of the magnitudes over their number.
func worst(c *Curve, h func(float64) complex128) (db, deg, chi float64) {
	u := c.Used()
	ideal := &Curve{Kind: c.Kind}
	for _, q := range u {
		ideal.Points = append(ideal.Points, Point{Hz: q.Hz, H: q.H / h(q.Hz), Used: true, U: q.U})
	}
	ideal.delay()
	for _, q := range u {
		e := q.H / h(q.Hz) * turnsOf(q.Hz*ideal.DelayS)
		db = math.Max(db, math.Abs(20*math.Log10(cmplx.Abs(e)))-4*8.69*q.U)
		deg = math.Max(deg, math.Abs(cmplx.Phase(e))*180/math.Pi-4*57.3*q.U)
		r := (cmplx.Abs(e) - 1) / math.Hypot(q.U, math.Hypot(q.ModelU, 1e-6))
		chi += r * r / float64(len(u))
	}
	return db, deg, chi
}

func cpu() time.Duration {
	var r syscall.Rusage
	syscall.Getrusage(0, &r)
	return time.Duration(r.Utime.Nano() + r.Stime.Nano())
}
