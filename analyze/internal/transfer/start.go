package transfer

import (
	"math"
	"math/cmplx"

	"benchslip/analyze"
	"benchslip/analyze/internal/spectrum"
)

// coarse finds when the stimulus began, to a millisecond or a few.
func coarse(out *analyze.Signal, ref reference, sh *Shape) float64 {
	if sh.Kind == Steps || sh.Kind == Multitone {
		return byEnvelope(out, ref)
	}
	return byCorrelation(out, ref)
}

// byEnvelope slides the envelope of the stimulus along that of the output.
// The envelopes are told in steps, sounding or not, so that the unit's
// response does not weigh.
func byEnvelope(out *analyze.Signal, ref reference) float64 {
	a := onOff(out)
	b := onOff(signalOf("stimulus", ref.x, ref.rate))
	if len(a) == 0 || len(b) == 0 {
		return 0
	}
	blockA := float64(max(8, int(blockS*out.RateHz+0.5))) / out.RateHz
	blockB := float64(max(8, int(blockS*ref.rate+0.5))) / ref.rate
	best, at := math.Inf(-1), 0
	for lag := -len(b) + 1; lag < len(a); lag++ {
		sum := 0.0
		for i := max(0, lag); i < len(a); i++ {
			j := int((float64(i-lag) + 0.5) * blockA / blockB)
			if j >= len(b) {
				break
			}
			sum += a[i] * b[j]
		}
		if sum > best {
			best, at = sum, lag
		}
	}
	return float64(at) * blockA
}

// onOff is +1 where a signal sounds, -1 where it is silent, its mean taken
// off.
func onOff(s *analyze.Signal) []float64 {
	e := envelopeOf(s)
	runs, _ := e.sounding(s.Len())
	v := make([]float64, len(e.peak))
	for i := range v {
		v[i] = -1
	}
	for _, r := range runs {
		for i := r[0] / e.block; i < min((r[1]+e.block-1)/e.block, len(v)); i++ {
			v[i] = 1
		}
	}
	center(v)
	return v
}

// coarseRate is about the rate that the correlation works at, Hz.
const coarseRate = 16000

// byCorrelation takes the largest of the impulse response that output and
// stimulus give at a low rate.
func byCorrelation(out *analyze.Signal, ref reference) float64 {
	by := max(1, int(out.RateHz/coarseRate))
	rate := out.RateHz / float64(by)
	y := make([]float64, out.Len()/by)
	buf := make([]float64, by)
	for i := range y {
		for _, v := range buf[:out.Read(buf, i*by)] {
			y[i] += v
		}
	}
	// The means of by samples delay both alike: the stimulus is read at their
	// middles.
	step := ref.rate / rate
	x := resample(ref.x, int(float64(len(ref.x))/step), float64(by-1)/2*ref.rate/out.RateHz, step)
	center(x)
	center(y)
	n := spectrum.FastLengthUp(len(x) + len(y))
	w := spectrum.NewWhole(n)
	X, Y := w.Forward(x), w.Forward(y)
	top := 0.0
	for _, v := range X {
		top = math.Max(top, abs2(v))
	}
	for k := range Y {
		Y[k] *= cmplx.Conj(X[k]) / complex(abs2(X[k])+1e-4*top, 0)
	}
	h := w.Back(Y)
	at := 0
	for i, v := range h {
		if math.Abs(v) > math.Abs(h[at]) {
			at = i
		}
	}
	if at > len(y) {
		at -= n
	}
	return float64(at) / rate
}
