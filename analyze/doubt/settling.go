package doubt

import (
	"fmt"
	"math"

	"benchslip/capture/recording"
)

// A take that starts before things came to rest (phantom power decaying, an
// input capacitor charging) begins with a mean that falls to its end value
// like exp(-t/tau), seconds long.
const (
	leastMeans  = 16   // a tenth of a second each
	shortestTau = 0.15 // s
	explained   = 0.98 // share of the means' variance
	overScatter = 12   // of the means about the fit
	overSignal  = 0.02 // of the signal's RMS
)

func settling(l *listening) []Finding {
	m := l.frames.slow
	if len(m) < leastMeans {
		return nil
	}
	step := float64(l.frames.lag) / l.frames.rate
	span := float64(len(m)) * step
	best := decay{left: math.Inf(1)}
	for tau := shortestTau; tau < span/2.5; tau *= 1.1 {
		if d := fitDecay(m, step, tau); d.left < best.left {
			best = d
		}
	}
	if best.all == 0 || math.IsInf(best.left, 1) {
		return nil
	}
	scatter := math.Sqrt(best.left / float64(len(m)-3))
	ac := 0.0
	for _, f := range l.frames.list {
		ac += f.rms * f.rms / float64(len(l.frames.list))
	}
	size := math.Abs(best.size)
	if 1-best.left/best.all < explained || size < overScatter*scatter || size < overSignal*math.Sqrt(ac) || size < 4*l.sig.Step {
		return nil
	}
	end := int(5 * best.tau * l.frames.rate)
	return []Finding{l.found(recording.Settling, 0, min(end, l.sig.Len()),
		fmt.Sprintf("the mean starts %.3g %s off its end value and settles with a time constant of %.2g s: the take starts before things came to rest; wait, or set a span from %.2g s on",
			best.size, l.sig.Unit, best.tau, l.at(end)))}
}

// decay is a fit of c + size exp(-t/tau) to means.
type decay struct {
	tau, size float64
	left, all float64 // sums of squares: of what is left, and about the mean
}

func fitDecay(m []float64, step, tau float64) decay {
	n := float64(len(m))
	var se, see, sy, syy, sey float64
	for i, y := range m {
		e := math.Exp(-(float64(i)*step + slowS/2) / tau)
		se, see, sy, syy, sey = se+e, see+e*e, sy+y, syy+y*y, sey+e*y
	}
	d := decay{tau: tau, all: math.Max(syy-sy*sy/n, 0)}
	det := see - se*se/n
	if det <= 0 {
		d.left = math.Inf(1)
		return d
	}
	d.size = (sey - se*sy/n) / det
	d.left = math.Max(d.all-d.size*(sey-se*sy/n), 1e-18*d.all)
	return d
}
