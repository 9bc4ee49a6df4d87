package stage

import (
	"math"

	"benchslip/analyze/internal/sinefit"
)

// walk gathers what the blocks say of a comb's frequency.
type walk struct {
	orders []float64
	noise  []float64 // density beneath each order, V^2/Hz
	rateHz float64
	blocks []Block
	nu     []float64 // cycles per sample
	power  []float64 // sum over blocks of |z|^2/2 of each order
}

func newWalk(orders []float64, hz float64, v *Survey) *walk {
	w := &walk{orders: orders, rateHz: v.RateHz, power: make([]float64, len(orders))}
	for _, o := range orders {
		k := min(int(o*hz/v.StepHz+0.5), len(v.Floor)-1)
		w.noise = append(w.noise, v.Floor[k])
	}
	return w
}

// sure is how far over the noise of its block (13 dB) a comb must stand for
// its own frequency there to be taken as it is.
const sure = 20

// search is how far, in resolution widths, the strongest orders of a comb near
// the noise may lie from where they were expected: beyond, noise led astray.
const search = 0.6

// add takes a block's frequency, the one expected, and the orders' peak
// phasors. It reports whether the next block may start from there.
func (w *walk) add(b Block, nu, expected float64, z []complex128) bool {
	T := float64(b.To-b.From) / w.rateHz
	var share, p2, p4 float64
	for i, v := range z {
		o2 := w.orders[i] * w.orders[i]
		p := abs2(v) / 2
		w.power[i] += p
		share += o2 * w.noise[i] / T
		p2 += o2 * p
		p4 += o2 * o2 * p
	}
	clear := p2 > sure*share
	if !clear && p2 > 0 {
		typical := math.Sqrt(p4 / p2) // order
		if math.Abs(nu-expected)*float64(b.To-b.From)*typical > search {
			nu = expected
		}
	}
	w.blocks = append(w.blocks, b)
	w.nu = append(w.nu, nu)
	return clear
}

// track smooths the blocks' frequencies. Least squares over orders o with
// phasors z in noise of density S_o scatter over a block of T seconds by
//
//	var f = 12/(4 pi^2 T^3) sum(o^2 |z|^2 S_o)/(sum o^2 |z|^2)^2
//
// (the Cramer-Rao bound for one order, or equal noise). The powers are means
// over the blocks, noise shares off: those of single blocks would call a block
// sure where its noise was large. Near the noise the estimates scatter more,
// up to what the search allows.
func (w *walk) track(samples int) *sinefit.Track {
	at := make([]float64, len(w.blocks))
	u2 := make([]float64, len(w.blocks))
	M := float64(len(w.blocks))
	for m, b := range w.blocks {
		at[m] = b.Middle()
		T := float64(b.To-b.From) / w.rateHz
		var weight, spread, share, fourth float64
		for i, o := range w.orders {
			s := w.noise[i] / T
			p := 2 * o * o * math.Max(w.power[i]/M-s, s/10)
			weight += p
			fourth += o * o * p
			spread += p * w.noise[i]
			share += 2 * o * o * s
		}
		v := 0.0
		if weight > 0 {
			near := 1 + share/weight
			v = 12 / (4 * math.Pi * math.Pi * T * T * T) * spread / (weight * weight) * near * near
			reach := search / T / math.Sqrt(fourth/weight)
			v = math.Min(v, reach*reach/3) // rectangular over the search
		}
		u2[m] = math.Max(v/(w.rateHz*w.rateHz), 1e-32)
	}
	smooth, _ := sinefit.SmoothFrequencies(w.nu, u2)
	return sinefit.FromFrequencies(samples, at, smooth)
}
