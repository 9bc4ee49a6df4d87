package oneshot

import (
	"fmt"
	"math"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
	"benchslip/analyze/internal/sinefit"
	"benchslip/analyze/stage"
)

var ripple = &analyze.Measure{
	Name:  "ripple",
	Title: "ripple of a rail, peak to peak",
	Doc: "Largest less smallest sample of the span, noise in, DC out. Details give the RMS about the mean and its two parts: mains harmonics (1 to 40) and the " +
		"rest (noise, switching, signal). A rectifier behind a full bridge ripples at twice the mains frequency.",
	Formula:  "max x - min x;  rms^2 = mains^2 + rest^2",
	Standard: "common practice",
	Unit:     "V",
	Roles:    []string{"take"},
	Run:      runRipple,
}

func runRipple(p *analyze.Pass) analyze.Result {
	s, bad := p.Signal("take", "out")
	u := plainUnit(s)
	if bad != nil {
		return analyze.RefuseWith(u, bad)
	}
	lo, hi, mean, rms := moments(s)
	if err := s.Err(); err != nil {
		return analyze.Refuse(u, analyze.Unreadable, fmt.Sprintf("take %q: %v", s.Take.Name, err), "copy the file again")
	}
	if !(hi > lo) {
		return analyze.Refuse(u, analyze.NoSignal, fmt.Sprintf("take %q, channel %d: every sample is equal", s.Take.Name, s.Channel()),
			"use a more sensitive range (AC coupling helps on a rail), and check the connection")
	}
	v := hi - lo
	r := analyze.Result{Value: &v, Unit: u}
	var b budget.Budget
	b.B("converter steps of both extremes", s.Step/math.Sqrt(6))
	b.Scale(s, v)
	b.Into(&r)
	r.Details = map[string]any{"span_s": spanOf(s), "rms_v": rms, "max_v": hi - mean, "min_v": lo - mean}
	if s.Gear.DC {
		r.Details["mean_v"] = mean
	}
	power, hz, ok := mainsPart(p, s, mean)
	if ok {
		power = math.Max(0, math.Min(power, rms*rms))
		r.Details["mains_v"], r.Details["mains_hz"] = math.Sqrt(power), hz
		r.Details["rest_v"] = math.Sqrt(rms*rms - power)
		if power > rms*rms/2 {
			r.Opinions = append(r.Opinions, fmt.Sprintf("most of the ripple is mains (%.3g of %.3g V RMS): consistent with a small reservoir capacitor, a regulator in dropout "+
				"or its return shared with the rectifier; to confirm, measure before and after the regulator under load", math.Sqrt(power), rms))
		}
	} else {
		r.Notes = append(r.Notes, "the span holds less than one period of the mains: its part cannot be told from the rest")
	}
	f := stage.WaveformFigure(s, s.DurationS())
	f.Rules = append(f.Rules, analyze.Rule{Label: "max", At: hi}, analyze.Rule{Label: "min", At: lo})
	r.Figures = []analyze.Figure{f}
	return r
}

// moments are the extremes, the mean and the RMS about it, in two passes.
func moments(s *analyze.Signal) (lo, hi, mean, rms float64) {
	lo, hi = math.Inf(1), math.Inf(-1)
	n := float64(s.Len())
	each(s, func(x float64) {
		lo, hi = math.Min(lo, x), math.Max(hi, x)
		mean += x
	})
	mean /= n
	each(s, func(x float64) { rms += (x - mean) * (x - mean) })
	return lo, hi, mean, math.Sqrt(rms / n)
}

func each(s *analyze.Signal, fn func(x float64)) {
	buf := make([]float64, min(s.Len(), 1<<15))
	for at := 0; ; {
		n := s.Read(buf, at)
		if n == 0 {
			return
		}
		for _, x := range buf[:n] {
			fn(x)
		}
		at += n
	}
}

// mainsPart is the power of the mains harmonics and their frequency. From ten
// periods on they are tracked as everywhere; a scope's screen of one to ten
// periods is fitted over whole periods of the nominal frequency (unknown: 50
// or 60 Hz, whichever holds more), moved by up to 1 % where it holds enough of
// them to tell.
func mainsPart(p *analyze.Pass, s *analyze.Signal, mean float64) (power, hz float64, ok bool) {
	nominal := p.MainsHz
	least := nominal
	if least == 0 {
		least = 50
	}
	if s.DurationS()*least >= 10 {
		l := stage.Decompose(p, s, stage.Options{}) // no test tone: 6 x 50 Hz would pass for one
		if l.MainsHz == 0 {
			return 0, 0, false
		}
		for _, q := range l.Mains {
			if !q.Dropped {
				power += q.Power
			}
		}
		return power, l.MainsHz, true
	}
	if s.DurationS()*least < 1 || s.Len() > mostSamples {
		return 0, 0, false
	}
	tries := []float64{nominal}
	if nominal == 0 {
		tries = []float64{50, 60}
	}
	x := s.All()
	for i := range x {
		x[i] -= mean
	}
	for _, f := range tries {
		spread := 0.0
		if s.DurationS()*f >= 2 {
			spread = 0.01
		}
		for k := -5.0; k <= 5; k++ {
			g := f * (1 + spread*k/5)
			if w := combPower(x, g/s.RateHz); w > power {
				power, hz = w, g
			}
			if spread == 0 {
				break
			}
		}
	}
	return power, hz, hz > 0
}

// combPower is the mean square of harmonics 1 to 40 of nu (periods a sample)
// in x, mean taken off, over a whole number of periods, less the share that
// white noise has in it.
func combPower(x []float64, nu float64) float64 {
	n := min(int(math.Round(math.Floor(float64(len(x))*nu+0.02)/nu)), len(x))
	var freqs []float64
	for k := 1; k <= stage.MaxOrder && float64(k)*nu < 0.45; k++ {
		freqs = append(freqs, float64(k)*nu)
	}
	if len(freqs) == 0 || n <= 4*len(freqs) {
		return 0
	}
	solver, err := sinefit.NewSolver(freqs, n)
	if err != nil {
		return 0
	}
	sum, all := 0.0, 0.0
	for _, z := range solver.Block(x[:n]).Z {
		sum += (real(z)*real(z) + imag(z)*imag(z)) / 2
	}
	for _, v := range x[:n] {
		all += v * v / float64(n)
	}
	return sum - math.Max(all-sum, 0)*2*float64(len(freqs))/float64(n)
}
