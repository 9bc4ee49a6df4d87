package oneshot

import (
	"fmt"
	"math"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
)

var thump = &analyze.Measure{
	Name:  "thump",
	Title: "largest excursion after switching",
	Doc: "Largest |x - mean of the quiet part before| from the first sample that leaves the noise of the quiet start of the span; unsigned, noise in. For power " +
		"and phantom switching, DC-coupled takes only: an AC-coupled input makes another wave of it. Details give the area (signed integral of x - mean before) " +
		"and the time to the last entry into `tolerance` (2 % unless stated) of the excursion about the final level.",
	Formula:  "max |x - mean before|;  area = integral (x - mean before) dt",
	Standard: "common practice",
	Unit:     "V",
	Roles:    []string{"take"},
	Keys:     []string{"tolerance"},
	Run:      runThump,
}

// calm is the quiet start of a take.
type calm struct {
	mean, noise, most float64 // most: largest excursion
	n                 int     // samples
}

// calmStart takes the start of x, a fiftieth of it at least, and as much more
// as stays within three times what that swings by and within six sigma.
func calmStart(x []float64) calm {
	var first calm
	first.of(x[:max(len(x)/50, 8)])
	limit := math.Max(3*first.most, 6*first.noise)
	n := first.n
	for n < len(x) && math.Abs(x[n]-first.mean) <= limit {
		n++
	}
	var c calm
	c.of(x[:n])
	return c
}

// drift is how far the means of the two halves of the quiet start lie apart.
func (c calm) drift(x []float64) float64 {
	var a, b calm
	a.of(x[:c.n/2])
	b.of(x[c.n/2 : c.n])
	return math.Abs(b.mean - a.mean)
}

func (c *calm) of(x []float64) {
	*c = calm{n: len(x)}
	for _, v := range x {
		c.mean += v / float64(len(x))
	}
	for _, v := range x {
		c.noise += (v - c.mean) * (v - c.mean) / float64(len(x))
		c.most = math.Max(c.most, math.Abs(v-c.mean))
	}
	c.noise = math.Sqrt(c.noise)
}

func runThump(p *analyze.Pass) analyze.Result {
	s, x, bad := samples(p)
	u := plainUnit(s)
	if bad != nil {
		return analyze.RefuseWith(u, bad)
	}
	if !s.Gear.DC {
		return analyze.Refuse(u, analyze.ACCoupled,
			fmt.Sprintf("take %q was recorded through an AC-coupled input, which changes the course of a thump", s.Take.Name),
			"record it with a DC-coupled scope; or, where the input does pass DC, state coupling = \"dc\" for the gear")
	}
	if len(x) < 50 {
		return analyze.Refuse(u, analyze.TooShort, fmt.Sprintf("take %q holds only %d samples in the span", s.Take.Name, len(x)), "record some seconds before and after the switching")
	}
	c := calmStart(x)
	d := func(i int) float64 { return x[i] - c.mean }
	at := 0
	for i := range x {
		if math.Abs(d(i)) > math.Abs(d(at)) {
			at = i
		}
	}
	top := math.Abs(d(at))
	r := analyze.Result{Unit: u, Details: map[string]any{"span_s": spanOf(s), "before_v": c.mean, "before_noise_v": c.noise, "quiet_s": float64(c.n) / s.RateHz}}
	w, how := trace(s, x, 0, len(x))
	fig := analyze.Figure{ID: fmt.Sprintf("thump-%s-ch%d", s.Take.Name, s.Channel()), Title: fmt.Sprintf("Switching in take %s, channel %d", s.Take.Name, s.Channel()),
		Caption: fmt.Sprintf("quiet for the first %.3g s%s", float64(c.n)/s.RateHz, how), X: analyze.Axis{Label: "time", Unit: "s"}, Y: voltageAxis(s),
		Series: []analyze.Series{w}, Rules: []analyze.Rule{{Label: "mean before", At: c.mean}}}
	mark := func(i float64, v float64, label string) {
		fig.Marks = append(fig.Marks, analyze.Mark{Kind: "event", X: timeOf(s, i), Y: v, Label: label})
	}
	drift := c.drift(x)
	switch {
	case top == 0:
		return analyze.Refuse(u, analyze.NoSignal, fmt.Sprintf("take %q, channel %d: every sample is equal", s.Take.Name, s.Channel()), "check the connection and the channel")
	case c.n >= len(x) && drift < c.most/2:
		// The largest excursion is that of the noise.
		v := top + s.Step/2
		r.Refusal = &analyze.Refusal{Code: analyze.BelowDetection,
			Text: fmt.Sprintf("nothing leaves the noise of take %q, whose largest excursion is %.3g %s", s.Take.Name, top, s.Unit), Advice: "check that the span holds the switching"}
		var b budget.Budget
		b.Scale(s, v)
		r.Bound = &analyze.Bound{Upper: true, Value: v + 2*b.U()}
		r.Figures = []analyze.Figure{fig}
		return r
	case drift > 0.05*top:
		r.Refusal = &analyze.Refusal{Code: analyze.TooShort,
			Text:   fmt.Sprintf("take %q has no quiet part before the switching: its first %.2g s drift by %.3g %s", s.Take.Name, float64(c.n)/s.RateHz, drift, s.Unit),
			Advice: "start recording 5 s before switching, or set a span that does"}
		r.Figures = []analyze.Figure{fig}
		return r
	}
	r.Value = &top
	var b budget.Budget
	b.A("noise of one sample", c.noise, 0)
	b.A("mean of the quiet part", c.noise/math.Sqrt(float64(c.n)), 0)
	b.B("drift of the quiet part", drift/math.Sqrt(3))
	b.Quantisation(s, 1)
	b.B("course between samples", between(x, at)/math.Sqrt(3))
	b.Scale(s, top)
	b.Into(&r)
	r.Details["at_s"], r.Details["onset_s"] = timeOf(s, float64(at)), timeOf(s, float64(c.n))
	r.Details["peak_v"] = d(at)
	mark(float64(c.n), x[min(c.n, len(x)-1)], "onset")
	mark(float64(at), x[at], "largest")
	end, settled := settles(x, c, top*tolerance(p))
	if settled {
		r.Details["settle_s"] = (end - float64(c.n)) / s.RateHz
		mark(end, x[min(int(end), len(x)-1)], "settled")
	} else {
		r.Notes = append(r.Notes, "the signal does not come to rest within the span: no settling time, and the area is that up to its end")
	}
	area, u2 := area(s, x, c, end, settled, top)
	r.Details["area_vs"], r.Details["area_uncertainty_vs"] = area, 2*u2
	r.Figures = []analyze.Figure{fig}
	return r
}

// between is how far the course between samples may go beyond the largest one:
// as far as the parabola through it and its neighbours, and not further than
// the way to the nearer of them.
func between(x []float64, at int) float64 {
	if at == 0 || at+1 >= len(x) {
		return 0
	}
	l, r := x[at-1]-x[at], x[at+1]-x[at]
	if l*r <= 0 {
		return 0
	}
	return math.Min((l-r)*(l-r)/(8*math.Abs(l+r)), math.Min(math.Abs(l), math.Abs(r)))
}

// settles is the sample index of the last entry into +-limit about the final
// level (the mean of the last tenth); false when that tenth itself is not at
// rest. Noise is averaged over at most a fortieth of the time that a first look
// finds.
func settles(x []float64, c calm, limit float64) (end float64, ok bool) {
	n := len(x) / 10
	var final calm
	final.of(x[len(x)-n:])
	aim := limit / 60
	half := 0
	for range 2 {
		y := smooth(x, half)
		last := len(x) - 1
		for last > c.n && math.Abs(y[last]-final.mean) <= limit {
			last--
		}
		if ok = last < len(x)-n; ok {
			a, b := math.Abs(y[last]-final.mean), math.Abs(y[last+1]-final.mean)
			end = float64(last) + math.Min(math.Max((a-limit)/(a-b), 0), 1)
		} else {
			end = float64(len(x))
		}
		half = quiet(c.noise, aim, (last-c.n)/80)
		if half == 0 {
			break
		}
	}
	return end, ok
}

// area is the integral of x - mean before, from the onset on, in V s. Where
// the signal comes back to where it was, it goes on for two and a half times
// the time to settle (the 2 % that an exponential has left then is counted);
// where it does not, it ends as it settles.
func area(s *analyze.Signal, x []float64, c calm, end float64, settled bool, top float64) (v, u float64) {
	to := len(x)
	if settled {
		to = int(end) + 1
		var final calm
		final.of(x[len(x)-len(x)/10:])
		if math.Abs(final.mean-c.mean) < math.Max(0.01*top, 4*c.noise/math.Sqrt(float64(min(c.n, len(x)/10)))) {
			to = min(len(x), c.n+int(2.5*(end-float64(c.n)))+1)
		}
	}
	for _, y := range x[c.n:to] {
		v += y - c.mean
	}
	n := float64(to - c.n)
	var b budget.Budget
	b.A("noise", c.noise*math.Sqrt(n)/s.RateHz, 0)
	b.A("mean before", c.noise/math.Sqrt(float64(c.n))*n/s.RateHz, 0)
	b.B("first sample", top/2/s.RateHz)
	b.Scale(s, v/s.RateHz)
	return v / s.RateHz, b.U()
}
