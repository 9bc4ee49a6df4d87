package response

import (
	"fmt"
	"math"
	"math/cmplx"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
	"benchslip/analyze/internal/transfer"
)

const cornerDoc = howFound + "The outermost frequency where the response has fallen by `drop` (3.00 dB unless stated) from that at `ref` (1 kHz), interpolated by the " +
	"magnitude of a first- or second-order filter fitted to the points about it. `details.pole_hz` is the half-power frequency of that filter, 0.24 % away from a " +
	"3.00 dB corner of first order. With `resistance` stated, the capacitor that makes this pole with it is given, and the nearest E12 and E24 values (IEC 60063)."

var cornerLow = &analyze.Measure{
	Name:     "corner_low",
	Title:    "lower corner frequency",
	Doc:      cornerDoc,
	Formula:  "lowest f with |H(f)| = |H(ref)| 10^(-drop/20)",
	Standard: "IEC 60268-3 (effective frequency range)",
	Unit:     "Hz",
	Roles:    []string{"take"},
	Keys:     []string{"resistance", "ref", "drop"},
	Run:      func(p *analyze.Pass) analyze.Result { return runCorner(p, true) },
}

var cornerHigh = &analyze.Measure{
	Name:     "corner_high",
	Title:    "upper corner frequency",
	Doc:      cornerDoc,
	Formula:  "highest f with |H(f)| = |H(ref)| 10^(-drop/20)",
	Standard: "IEC 60268-3 (effective frequency range)",
	Unit:     "Hz",
	Roles:    []string{"take"},
	Keys:     []string{"resistance", "ref", "drop"},
	Run:      func(p *analyze.Pass) analyze.Result { return runCorner(p, false) },
}

func runCorner(p *analyze.Pass, low bool) analyze.Result {
	c, ref, bad := found(p)
	if bad != nil {
		return analyze.RefuseWith(hertz, bad)
	}
	drop := 3.0
	if p.Params.Drop != nil {
		drop = *p.Params.Drop
	}
	r := analyze.Result{Unit: hertz}
	describe(&r, c, ref)
	r.Details["drop_db"] = drop
	u := c.Used()
	if !low { // outermost first, whichever side
		for i, j := 0, len(u)-1; i < j; i, j = i+1, j-1 {
			u[i], u[j] = u[j], u[i]
		}
	}
	limit := cmplx.Abs(ref.H) * math.Pow(10, -drop/20)
	at := crossing(u, limit)
	if at <= 0 {
		noCrossing(&r, c, u, limit, low)
		return r
	}
	f := fitCorner(u, at, cmplx.Abs(ref.H), drop, low, c.Dense)
	r.Value = &f.hz
	var b budget.Budget
	b.A("noise about the corner", f.u*f.hz, f.dof)
	b.A("noise at the reference", ref.U/math.Abs(f.slope)*f.hz, ref.Dof)
	steps := math.Hypot(u[at].StepU, ref.StepU)
	b.B("converter steps", steps/math.Abs(f.slope)*f.hz)
	b.B(modelName(c), u[at].ModelU/math.Abs(f.slope)*f.hz)
	b.Clock(c.Out, f.hz)
	b.Into(&r)
	r.Details["corner_hz"], r.Details["order"], r.Details["method"] = f.hz, f.order, f.method
	r.Details["slope_db_octave"] = f.slope * 20 / math.Ln10 * math.Ln2
	if f.pole > 0 {
		r.Details["pole_hz"] = f.pole
		capacitor(p, &r, &f)
	}
	for i := range r.Figures { // the corner in the gain's figure
		if r.Figures[i].Y.Unit == "dB" {
			r.Figures[i].Rules = append(r.Figures[i].Rules,
				analyze.Rule{Label: fmt.Sprintf("-%.4g dB", drop), At: -drop},
				analyze.Rule{Label: fmt.Sprintf("%.4g Hz", f.hz), Vertical: true, At: f.hz})
		}
	}
	return r
}

// crossing is the index of the first point, from the outermost inwards, that
// reaches limit; 0 when the outermost does, -1 when none does.
func crossing(u []transfer.Point, limit float64) int {
	for i, q := range u {
		if cmplx.Abs(q.H) >= limit {
			return i
		}
	}
	return -1
}

// noCrossing refuses with what the outermost point says.
func noCrossing(r *analyze.Result, c *transfer.Curve, u []transfer.Point, limit float64, low bool) {
	q := u[0]
	side := "above"
	if low {
		side = "below"
	}
	r.Refusal = &analyze.Refusal{Code: analyze.NotEnoughPoints,
		Text: fmt.Sprintf("take %q: at %.5g Hz, the outermost that counts, the response is still %.3g dB over the corner, which lies %s",
			c.Out.Take.Name, q.Hz, level(q.H)-20*math.Log10(limit), side),
		Advice: fmt.Sprintf("play a stimulus that reaches well %s %.4g Hz", side, q.Hz)}
	r.Bound = &analyze.Bound{Upper: low, Value: q.Hz}
	key := "lower_bound"
	if low {
		key = "upper_bound"
	}
	r.Details[key] = q.Hz
}

// corner is what the fit about a crossing finds.
type corner struct {
	hz, u, dof float64 // u: relative standard uncertainty of hz from noise
	pole       float64 // half-power frequency of the model; 0: none
	poleU      float64 // relative
	slope      float64 // d ln|H| / d ln f at the corner
	order      int     // of the model; 0: none fitted
	method     string
}

// trust is the smallest relative error of a point that the fits tell apart.
const trust = 2e-5

// fitCorner interpolates the crossing between u[at-1] and u[at]. With
// v = (f_x/f)^2 at the low end, (f/f_x)^2 at the high one, the magnitudes of
// filters of order n without zeros obey
//
//	|H(ref)|^2/|H|^2 = p_0 + p_1 v + ... + p_n v^n,
//
// which is linear in p, whatever the level between the pass band and the
// reference. First order is tried first, over two octaves to each side, then
// second, then narrower stretches, then third and fourth; the first that fits
// its points within three times their variance counts. Where none does the
// curve itself is interpolated.
func fitCorner(u []transfer.Point, at int, ref, drop float64, low, dense bool) corner {
	fx := math.Sqrt(u[at].Hz * u[at-1].Hz)
	target := math.Pow(10, drop/10)
	var best *corner
	bestChi := math.Inf(1)
	for _, try := range []struct {
		octaves float64
		order   int
	}{{2, 1}, {2, 2}, {1, 1}, {1, 2}, {0.5, 1}, {0.5, 2}, {1, 3}, {1, 4}} {
		f, chi, ok := fitModel(u, fx, ref, target, try.octaves, try.order, low)
		if !ok || f.hz < fx/2 || f.hz > 2*fx {
			continue
		}
		if dense { // neighbouring points share most of their lines
			f.u *= math.Sqrt(3)
			f.poleU *= math.Sqrt(3)
		}
		if chi <= 3 {
			return f
		}
		if chi < bestChi {
			keep := f
			keep.u *= math.Sqrt(chi)
			keep.poleU *= math.Sqrt(chi)
			best, bestChi = &keep, chi
		}
	}
	f := interpolate(u, at, ref, target)
	if best != nil {
		f.pole, f.poleU, f.order = best.pole, math.Max(best.poleU, math.Abs(math.Log(best.hz/f.hz))), best.order
		// How far model and interpolation disagree tells what either is worth.
		f.u = math.Hypot(f.u, math.Min(math.Abs(math.Log(best.hz/f.hz)), 0.02)/math.Sqrt(3))
	}
	return f
}

func fitModel(u []transfer.Point, fx, ref, target, octaves float64, order int, low bool) (f corner, chi float64, ok bool) {
	var v, z, w []float64
	for _, q := range u {
		if math.Abs(math.Log2(q.Hz/fx)) > octaves {
			continue
		}
		x := q.Hz / fx
		if low {
			x = 1 / x
		}
		y := ref * ref / abs2(q.H)
		s := 2 * y * math.Sqrt(q.U*q.U+q.StepU*q.StepU+trust*trust)
		v, z, w = append(v, x*x), append(z, y), append(w, 1/(s*s))
	}
	if len(v) < order+2 {
		return f, 0, false
	}
	p, ok := polynomial(v, z, w, order+1)
	if !ok || p.c[0] <= 0 {
		return f, 0, false
	}
	hzOf := func(x float64) float64 {
		if low {
			return fx / math.Sqrt(x)
		}
		return fx * math.Sqrt(x)
	}
	// The corner lies within the stretch, the pole not far from it.
	top := math.Exp2(2 * octaves)
	x, ok := p.rises(target, 1/top, top)
	if !ok {
		return f, 0, false
	}
	f = corner{hz: hzOf(x), u: p.spread(x) / (2 * x * p.slope(x)), dof: float64(len(v) - order - 1), order: order,
		method: fmt.Sprintf("magnitude of order %d fitted to %d points within %.2g octaves", order, len(v), octaves)}
	f.slope = x * p.slope(x) / p.value(x) // d ln|H|/d ln f = -(1/2) d ln z/d ln f, v goes with f^-2
	if !low {
		f.slope = -f.slope
	}
	if y, ok := p.rises(2*p.c[0], 1/top/16, top*16); ok {
		f.pole, f.poleU = hzOf(y), p.spread(y)/(2*y*p.slope(y))
	}
	return f, p.chi, true
}

// interpolate finds the crossing on a cubic of ln|H| over ln f through the
// four points about it (fewer at the ends).
func interpolate(u []transfer.Point, at int, ref, target float64) corner {
	lo, hi := max(at-2, 0), min(at+2, len(u))
	goal := math.Log(ref) - math.Log(target)/2
	value := func(x float64) float64 { // Lagrange
		s := 0.0
		for i := lo; i < hi; i++ {
			l := math.Log(cmplx.Abs(u[i].H))
			for j := lo; j < hi; j++ {
				if j != i {
					l *= (x - math.Log(u[j].Hz)) / (math.Log(u[i].Hz) - math.Log(u[j].Hz))
				}
			}
			s += l
		}
		return s
	}
	a, b := math.Log(u[at-1].Hz), math.Log(u[at].Hz) // below, reached
	for range 60 {
		m := (a + b) / 2
		if value(m) < goal {
			a = m
		} else {
			b = m
		}
	}
	h := (math.Log(u[at].Hz) - math.Log(u[at-1].Hz)) * 1e-3
	slope := (value(b+h) - value(b-h)) / (2 * h)
	if slope == 0 || math.IsNaN(slope) {
		slope = (math.Log(cmplx.Abs(u[at].H)) - math.Log(cmplx.Abs(u[at-1].H))) / (math.Log(u[at].Hz) - math.Log(u[at-1].Hz))
	}
	un := math.Max(math.Hypot(u[at].U, trust), math.Hypot(u[at-1].U, trust))
	return corner{hz: math.Exp(b), u: un / math.Abs(slope), dof: u[at].Dof, slope: slope, method: "cubic in lg f through the points about it"}
}
