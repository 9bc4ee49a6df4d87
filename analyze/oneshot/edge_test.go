package oneshot

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
	"benchslip/analyze/internal/trial"
)

// Closed forms, amplitude 1, x in units of tau (first order) or 1/omega_n.
func firstOrder(x float64) float64 { return 1 - math.Exp(-math.Max(x, 0)) }

func secondOrder(zeta float64) func(x float64) float64 {
	w := math.Sqrt(1 - zeta*zeta)
	return func(x float64) float64 {
		x = math.Max(x, 0)
		return 1 - math.Exp(-zeta*x)*(math.Cos(w*x)+zeta/w*math.Sin(w*x))
	}
}

// Reference values: rise time of one pole times its bandwidth, ln 9/(2 pi) =
// 0.349699153; settling of one pole to 0.1 %, 6.90775528 time constants from
// the start of the step; overshoot of a second-order system, zeta = 0.2,
// exp(-pi zeta/sqrt(1-zeta^2)) = 0.526620599; zeta for 25 % overshoot,
// 0.403712752 (all closed forms; handbook results of linear systems).
const (
	riseTimesBandwidth = 0.349699153
	settleTo01Percent  = 6.90775528
	overshootZeta02    = 0.526620599
	zetaFor25Percent   = 0.403712752
)

// shotOf samples low + size*form((t-t0)/scale), n samples, quantised to bits
// over +-1 V (0: not), noise in converter steps (or V without bits).
type shotOf struct {
	form            func(x float64) float64
	low, size       float64
	rate, t0, scale float64
	n, bits         int
	noise           float64
	seed            uint64
}

func (o shotOf) take() *analyze.Take {
	s := &trial.Signal{Rate: o.rate, X: make([]float64, o.n)}
	for i := range s.X {
		s.X[i] = o.low + o.size*o.form((float64(i)/o.rate-o.t0)/o.scale)
	}
	q := 1.0
	if o.bits > 0 {
		q = math.Exp2(float64(1 - o.bits))
	}
	s.Noise(o.noise*q, o.seed)
	if o.bits == 0 {
		return trial.Take("t", s)
	}
	return trial.Bits(trial.Take("t", s.Quantise(o.bits, false, o.seed)), o.bits)
}

func must(t *testing.T, r analyze.Result) (v, u float64) {
	t.Helper()
	if r.Value == nil {
		t.Fatalf("refused: %+v", r.Refusal)
	}
	U, _, _, _ := budget.Expand(r.Budget, 2)
	return *r.Value, U
}

func refused(t *testing.T, what string, r analyze.Result, code string) {
	t.Helper()
	if r.Value != nil || r.Refusal == nil || r.Refusal.Code != code {
		t.Errorf("%s: %+v, want %s", what, r.Refusal, code)
	}
}

// where the closed form settles for good, from its 50 % crossing, in x.
func settlingOf(form func(float64) float64, tol float64) float64 {
	half, last := 0.0, 0.0
	const dx = 5e-4
	for x := 0.0; x < 80; x += dx {
		v := form(x)
		if half == 0 && v >= 0.5 {
			half = x
		}
		if math.Abs(v-1) > tol {
			last = x
		}
	}
	return last - half
}

// One-pole and second-order steps against their closed forms: 1 % at 12 bits,
// 3 % at 8 bits, or one sample.
func TestClosedForms(t *testing.T) {
	tol := 0.01
	zeta := secondOrder(0.2)
	for _, bits := range []int{0, 12, 8} {
		limit := map[int]float64{0: 0.01, 12: 0.01, 8: 0.03}[bits]
		for _, noise := range []float64{0, 0.5} {
			if bits == 0 && noise > 0 {
				continue
			}
			for _, perTau := range []float64{9.7, 130, 2200} {
				one := shotOf{form: firstOrder, low: -0.83, size: 1.61, rate: 1e6, scale: perTau * 1e-6, n: int(perTau * 22), t0: (8.013*perTau + 0.3) * 1e-6, bits: bits, noise: noise, seed: 3}
				two := one
				two.form, two.size, two.n, two.scale = zeta, 1.05, int(perTau*30), one.scale/3
				name := fmt.Sprintf("%d bits, noise %g, %g samples a time constant", bits, noise, perTau)
				check := func(what string, r analyze.Result, want, sample, limit float64) {
					t.Helper()
					v, u := must(t, r)
					err := math.Abs(v - want)
					if err > math.Max(limit*math.Abs(want), sample) {
						t.Errorf("%s: %s %.6g, want %.6g", name, what, v, want)
					}
					if err > 1.5*u {
						t.Errorf("%s: %s %.6g, want %.6g, U only %.3g", name, what, v, want, u)
					}
				}
				dt := 1e-6
				bandwidth := 1 / (2 * math.Pi * one.scale)
				on := trial.On(one.take())
				check("rise time", on.Run(riseTime, analyze.Params{}), riseTimesBandwidth/bandwidth, dt, limit)
				check("slew rate", on.Run(slewRate, analyze.Params{}), 0.8*one.size/(riseTimesBandwidth/bandwidth), 0, 1.3*limit)
				// From the 50 % crossing: ln 2 time constants after the start.
				check("settling to 2 %", on.Run(settlingTime, analyze.Params{}), one.scale*(math.Log(50)-math.Ln2), dt, limit)
				check("overshoot of one pole", on.Run(overshoot, analyze.Params{}), 0, 0.001, 0)
				on = trial.On(two.take())
				check("overshoot", on.Run(overshoot, analyze.Params{}), overshootZeta02, 0, limit)
				if bits != 8 {
					check("settling to 1 %", on.Run(settlingTime, analyze.Params{Tolerance: &tol}), two.scale*settlingOf(zeta, tol), dt, limit)
				}
			}
		}
	}
	fine := 0.001
	long := shotOf{form: firstOrder, size: 0.9, rate: 1e6, scale: 100e-6, n: 2600, t0: 500e-6}
	v, _ := must(t, trial.Run(settlingTime, analyze.Params{Tolerance: &fine}, long.take()))
	if want := 100e-6 * (settleTo01Percent - math.Ln2); math.Abs(v/want-1) > 0.01 {
		t.Errorf("settling to 0.1 %%: %.5g s, want %.5g", v, want)
	}
	long.form = secondOrder(zetaFor25Percent)
	r := trial.Run(overshoot, analyze.Params{}, long.take())
	if v, _ := must(t, r); math.Abs(v-0.25) > 0.0005 || math.Abs(r.Details["damping"].(float64)-zetaFor25Percent) > 0.001 {
		t.Errorf("overshoot %.5f at damping %.5f, want 0.25 at %.5f", v, r.Details["damping"], zetaFor25Percent)
	}
}

// Random steps: at least 9 of 10 errors within U, none beyond twice that.
func TestUncertaintiesHold(t *testing.T) {
	runs := 60
	if testing.Short() {
		runs = 20
	}
	names := []string{"rise", "slew", "settling", "overshoot"}
	inside, count := make([]int, 4), make([]int, 4)
	for seed := range runs {
		r := rand.New(rand.NewPCG(uint64(seed), 8))
		per := math.Exp(r.Float64()*5.5) * 4
		o := shotOf{rate: 1e6, scale: per * 1e-6, bits: []int{8, 10, 12, 16}[seed%4], noise: []float64{0, 0.3, 1, 2}[r.IntN(4)], seed: uint64(seed)}
		o.size = 0.8 + 0.9*r.Float64()
		o.low = -0.5*o.size + 0.1*(r.Float64()-0.5)
		o.t0 = (10*per + r.Float64()) * 1e-6
		o.n = int(25 * per)
		zeta := 0.15 + r.Float64()
		two := o
		two.scale = o.scale / 3
		two.size *= 0.6
		two.form, o.form = secondOrder(math.Min(zeta, 0.7)), firstOrder
		on, tw := trial.On(o.take()), trial.On(two.take())
		z := math.Min(zeta, 0.7)
		for i, c := range []struct {
			r    analyze.Result
			want float64
		}{
			{on.Run(riseTime, analyze.Params{}), o.scale * math.Log(9)},
			{on.Run(slewRate, analyze.Params{}), 0.8 * o.size / (o.scale * math.Log(9))},
			{on.Run(settlingTime, analyze.Params{}), o.scale * (math.Log(50) - math.Ln2)},
			{tw.Run(overshoot, analyze.Params{}), math.Exp(-math.Pi * z / math.Sqrt(1-z*z))},
		} {
			if c.r.Value == nil {
				if c.r.Refusal.Code != analyze.FloorLimited {
					t.Errorf("seed %d, %s: %+v", seed, names[i], c.r.Refusal)
				}
				continue
			}
			U, _, _, _ := budget.Expand(c.r.Budget, 2)
			count[i]++
			err := math.Abs(*c.r.Value - c.want)
			if err <= U {
				inside[i]++
			}
			if err > 2*U {
				t.Errorf("seed %d (%d bits, noise %g, %.1f samples a time constant), %s: %.6g, want %.6g, U %.3g", seed, o.bits, o.noise, per, names[i], *c.r.Value, c.want, U)
			}
		}
	}
	for i, n := range names {
		t.Logf("%s: %d of %d within U", n, inside[i], count[i])
		if 10*inside[i] < 9*count[i] || count[i] < runs/2 {
			t.Errorf("%s: only %d of %d within U (%d runs)", n, inside[i], count[i], runs)
		}
	}
}
