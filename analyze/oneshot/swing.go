package oneshot

import (
	"math"
	"slices"

	"benchslip/analyze/internal/budget"
	"benchslip/analyze/internal/spectrum"
)

// swing is an oscillation.
type swing struct {
	hz, uHz    float64
	band       *[2]float64 // of a hump; nil: a line
	rms, u     float64     // V; u from noise and the ends
	stays      []stay
	env        []float64 // peak amplitude, by sample
	continuous bool
	irregular  bool // its amplitude is that of noise
	half       int  // of the demodulator's running means, samples
	look       *look
}

// measureSwing finds size, frequency and course of what was found, with a wider
// filter again when it turns out to wander or to be a hump.
func measureSwing(y []float64, rate float64, f find) *swing {
	w := sizeSwing(y, rate, f, f.hz(), 0)
	h := w.hump(y, rate, f)
	if lo, hi := f.ridge(y, rate); h == nil && hi-lo > 2 {
		h = sizeSwing(y, rate, f, float64(lo+hi)/2*f.look.stepK, float64(hi-lo+2)*f.look.stepK).hump(y, rate, f)
	}
	if h != nil {
		w = sizeSwing(y, rate, f, h.hz, 1.3*(h.band[1]-h.band[0]))
		w.hz, w.band = h.hz, &h.band
		w.rms /= h.kept(rate, w.half)
		w.uHz = w.width() / math.Sqrt(12*math.Max(w.main().long()/rate*w.width(), 1))
	}
	if w.irregular {
		_, n := w.power()
		w.u = math.Hypot(w.u, w.rms/math.Sqrt(4*math.Max(n/rate*w.width(), 0.25)))
	}
	return w
}

// sizeSwing demodulates at hz, for a wanderer over a width in Hz.
func sizeSwing(y []float64, rate float64, f find, hz, width float64) *swing {
	l := f.look
	floor := l.floor[f.k]
	w := &swing{hz: hz, look: l}
	// The running mean of the demodulator: as short as noise allows (half of
	// the height at five sigma), so that starts and stops are sharp; one and a
	// half periods at least; at most half of a frame, or what lets the width
	// through.
	half := max(int(0.75*rate/hz), 1)
	most := max(l.m/4, half)
	if width > 0 {
		most = max(min(most, int(0.15*rate/width/2)), half)
	}
	for last := false; ; {
		b, gain := bright(y, rate, w.hz)
		z := demodulate(b, rate, w.hz, gain, half)
		top := w.lasting(amplitudes(z), 3*(2*half+1))
		if last {
			break
		}
		need := int(100 * 4 * floor * 0.55 * rate / 2 / (top * top) / 2)
		if last = need <= half*5/4 || half == most; !last {
			half = min(need, 4*half, most)
			continue
		}
		if width > 0 {
			break
		}
		if d := drift(z, w.main(), rate, half, 2*top); math.Abs(d) < 2*l.stepK {
			w.hz += d
		}
	}
	w.half = half
	w.sharpen(2*half + 1)
	share := noiseShare(floor, rate, half)
	if w.irregular = len(w.stays) > 4 && w.uneven(); w.irregular {
		// Noise-like: its power, averaged over more and more of its own swings.
		for wide, same := len(y)/len(w.stays), 0; len(w.stays) > 1 && same < 2 && wide < len(y)/16; wide *= 2 {
			n := len(w.stays)
			w.smoothPower(wide)
			if same++; len(w.stays) < n {
				same = 0
			}
		}
	}
	mean, n := w.power()
	n = math.Max(n, 1)
	w.rms = math.Sqrt(math.Max(mean-share, 0) / 2)
	long := float64(2*half+1) * 3 // of the three running means together
	lasts := math.Max(w.main().long(), 1)
	// Rife and Boorstyn: var f = 12 sigma^2/(A^2 N^3) (rate/2 pi)^2, complex noise.
	w.uHz = math.Sqrt(12*floor*rate/math.Max(mean, 1e-300)/(lasts*lasts*lasts)) / (2 * math.Pi) * rate
	w.u = budget.RSS(math.Sqrt(floor*rate/2/n), 0.3*w.rms*math.Min(long/lasts, 1)/math.Sqrt(3))
	w.course(len(y), int(long))
	return w
}

func amplitudes(z []complex128) []float64 {
	env := make([]float64, len(z))
	for i, v := range z {
		env[i] = math.Hypot(real(v), imag(v))
	}
	return env
}

// lasting finds the largest amplitude that is kept for n samples, which an edge
// in the signal does not keep, and where the envelope is over half of it for
// that long. Amplitudes beyond it (edges again) are cut.
func (w *swing) lasting(env []float64, n int) (top float64) {
	w.env, w.stays = env, nil
	n = min(n, len(w.env))
	for a := 0; a+n <= len(w.env); a += max(n/4, 1) {
		top = math.Max(top, slices.Min(w.env[a:a+n]))
	}
	for i, v := range w.env {
		w.env[i] = math.Min(v, 2*top)
	}
	for _, s := range stays(w.env, top/2, n/2) {
		if s.long() >= float64(n) {
			w.stays = append(w.stays, s)
		}
	}
	return top
}

// sharpen finds maximum and flanks again in an envelope that is averaged over a
// fiftieth of the longest stay: a slow flank crosses half of the height once.
func (w *swing) sharpen(n int) {
	half := int(w.main().long() / 100)
	if half < 1 || len(w.stays) == 0 {
		return
	}
	env, top := smooth(w.env, half), 0.0
	for _, s := range w.stays {
		top = math.Max(top, slices.Max(env[int(s.from):min(int(s.to)+1, len(env))]))
	}
	w.stays = nil
	for _, s := range stays(env, top/2, n) {
		if s.long() >= float64(3*n) {
			w.stays = append(w.stays, s)
		}
	}
}

// main is the longest stay; everything where there is none.
func (w *swing) main() stay {
	best := stay{0, 0}
	for _, s := range w.stays {
		if s.long() > best.long() {
			best = s
		}
	}
	if best.long() == 0 {
		return stay{0, float64(len(w.env))}
	}
	return best
}

// uneven tells the swings of noise, most of which just pass half of the largest
// one, from bursts of a size.
func (w *swing) uneven() bool {
	var tops []float64
	most := 0.0
	for _, s := range w.stays {
		top := slices.Max(w.env[int(s.from):min(int(s.to)+1, len(w.env))])
		tops = append(tops, top)
		most = math.Max(most, top)
	}
	return spectrum.Median(tops) < 0.8*most
}

// power is the mean of the squared envelope over all stays, and their number
// of samples. In long stays the spikes that edges of the signal leave, over 1.5
// times what lies before and behind, do not count.
func (w *swing) power() (mean, n float64) {
	reach := 3 * (2*w.half + 1) // of a spike
	for _, s := range w.stays {
		a, b := int(math.Ceil(s.from)), min(int(math.Ceil(s.to)), len(w.env))
		env := w.env[a:max(a, b)]
		local := smooth(env, 4*reach)
		for i := 0; i < len(env); i++ {
			if len(env) > 20*reach && !w.irregular {
				around := math.Max(local[max(i-5*reach, 0)], local[min(i+5*reach, len(env)-1)])
				if i+reach/2 < len(env) && env[i+reach/2] > 1.5*around {
					i += reach // half before it, half behind
					continue
				}
			}
			mean += env[i] * env[i]
			n++
		}
	}
	if n == 0 {
		return 0, 0
	}
	return mean / n, n
}

// smoothPower replaces the envelope by the root of its square, averaged.
func (w *swing) smoothPower(half int) {
	p := make([]float64, len(w.env))
	for i, v := range w.env {
		p[i] = v * v
	}
	p = smooth(p, half)
	top := 0.0
	for i, v := range p {
		w.env[i] = math.Sqrt(math.Max(v, 0))
		top = math.Max(top, w.env[i])
	}
	w.stays = stays(w.env, top/2, half)
}

// width of the hump in Hz, 0 for a line.
func (w *swing) width() float64 {
	if w.band == nil {
		return 0
	}
	return w.band[1] - w.band[0]
}

// course decides whether it lasts through the take.
func (w *swing) course(n, slack int) {
	total := 0.0
	for _, s := range w.stays {
		total += s.long()
	}
	w.continuous = total > 0.98*float64(n) ||
		len(w.stays) == 1 && w.stays[0].from < float64(slack) && w.stays[0].to > float64(n-slack)
}
