package oneshot

import (
	"fmt"
	"math"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
)

var droop = &analyze.Measure{
	Name:  "droop",
	Title: "droop of the flat after a step",
	Doc: "How far the flat after the edge falls towards 0 V from its start to its end, in % of its start, on the first step whose size is over half of the " +
		"largest. The flat starts when the signal has settled to its own trend within `tolerance` of the step (2 % unless stated) and ends before the next edge " +
		"or with the span. Both ends are read from a polynomial through all of the flat. Negative when the flat rises. A coupling capacitor C with R lets a flat " +
		"of length T fall by 1 - exp(-T/(R C)).",
	Formula:  "100 (V_start - V_end) / V_start %",
	Standard: "common practice; edges after IEEE Std 181",
	Unit:     "%",
	Roles:    []string{"take"},
	Keys:     []string{"tolerance"},
	Run:      runDroop,
}

// flat is the trend after an edge.
type flat struct {
	f        poly
	shift    float64 // index of the first sample, seen from the polynomial's
	from, to int     // samples
}

func (f flat) at(i float64) float64 { return f.f.at(i + f.shift) }

// flat finds the trend of the stretch after the edge and where the signal
// joins it for good.
func (e *edge) flat(tol float64) (flat, bool) {
	v, start := e.after()
	noise, steps := e.raw()
	half := 0
	if largestOf(float64(len(v)), noise)+steps > tol/2 {
		half = (e.last - e.first) / 4
	}
	n := float64(2*half + 1)
	limit := math.Max(tol, 1.5*(largestOf(float64(len(v))/n, noise/math.Sqrt(n))+steps))
	from := min(e.last-e.first, len(v)/10) // the edge's own corner
	for range 12 {
		if len(v)-from < 8 {
			return flat{}, false
		}
		f := trend(v[from:])
		d := make([]float64, len(v))
		for i := range d {
			d[i] = v[i] - f.at(float64(i-from))
		}
		d = smooth(d, half)
		joined := 0
		for i := len(d) - 1; i >= 0; i-- {
			// Far outside its samples a polynomial says nothing.
			if math.Abs(d[i]) > limit || i < from-(len(v)-from)/10 {
				joined = i + 1
				break
			}
		}
		// What is left of the edge where the signal joins the trend would
		// bend it: the polynomial is fitted to what lies twice as far behind.
		clear := joined + min(2*joined+e.last-e.first, (len(v)-joined)/10)
		if d := clear - from; joined <= from && d*d <= max(4, len(v)*len(v)/250000) {
			return flat{f, float64(joined - from), start + joined, start + len(v)}, true
		}
		from = clear
	}
	return flat{}, false
}

// trend fits a polynomial, raising its degree while the last coefficient
// stands out of the noise (three standard deviations), and once more: what the
// noise just hides would still bend the ends.
func trend(y []float64) poly {
	most := min(maxDegree, len(y)/4)
	last := 1
	for d, misses := 2, 0; d <= most && misses < 2; d++ {
		f := fitPoly(y, d)
		if math.Abs(f.c[d]) > 3*f.rms*math.Sqrt(f.inv[d][d]) && f.rms > 1e-12 {
			last, misses = d, 0
		} else {
			misses++
		}
	}
	return fitPoly(y, max(min(last+1, most), 1))
}

func runDroop(p *analyze.Pass) analyze.Result {
	e, bad := edgeOf(p, either)
	if bad != nil {
		return analyze.RefuseWith(percent, bad)
	}
	r := analyze.Result{Unit: percent}
	e.finish(p, &r)
	tol := tolerance(p)
	fl, ok := e.flat(tol)
	long := float64(fl.to - fl.from)
	if !ok || long < 2*e.t90.at-2*e.t10.at {
		r.Refusal = &analyze.Refusal{Code: analyze.TooShort,
			Text:   fmt.Sprintf("the signal does not settle to a flat within +-%.3g %% of the step after the edge at %.6g s", 100*tol, timeOf(e.s, e.t50.at)),
			Advice: "record the flat to its end, or state a wider tolerance"}
		return r
	}
	a, b := 0.0, long-1
	start, end := e.level(fl.at(a)), e.level(fl.at(b))
	if math.Abs(start) < 0.02*e.size() {
		r.Refusal = &analyze.Refusal{Code: analyze.Impossible,
			Text:   fmt.Sprintf("the flat after the edge starts at %.4g V, so that it has nowhere to fall to", start),
			Advice: "set a span about an edge that leads away from 0 V"}
		return r
	}
	value := (start - end) / start
	r.Value = &value
	size := e.size()
	noise, steps := e.raw()
	var bud budget.Budget
	// d(1 - end/start): the two ends share the polynomial.
	bud.A("noise of the flat", math.Max(noise, math.Min(fl.f.rms, 10*e.noise))*size*fl.f.contrast(end/start, a+fl.shift, b+fl.shift)/math.Abs(start), 0)
	bud.B("converter steps", steps/math.Sqrt(3)*size*math.Sqrt2/math.Abs(start)/math.Sqrt(math.Max(1, math.Abs(start-end)/math.Max(e.s.Step, 1e-300))))
	// The flat might as well have been said to last from edge to edge.
	bud.B("where the flat starts and ends", math.Abs(value)*(float64(e.jump.to)-e.t50.at-long)/long/math.Sqrt(3))
	if e.s.Gear.DC {
		bud.Offset(e.s, value/start)
	}
	bud.Into(&r)
	r.Details["flat_start_s"] = timeOf(e.s, float64(fl.from))
	r.Details["flat_end_s"] = timeOf(e.s, float64(fl.to-1))
	r.Details["flat_start_v"], r.Details["flat_end_v"] = start, end
	r.Details["of_step_percent"] = 100 * math.Abs(start-end) / size
	f := e.figureOver(fl.to)
	for _, m := range []struct {
		i int
		v float64
		l string
	}{{fl.from, start, "start"}, {fl.to - 1, end, "end"}} {
		f.Marks = append(f.Marks, analyze.Mark{Kind: "line", X: timeOf(e.s, float64(m.i)), Y: m.v, Label: m.l})
	}
	r.Figures[0] = f
	return r
}
