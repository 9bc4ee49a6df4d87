package spectrum

import (
	"math"
	"math/cmplx"
)

// Weighting returns the power gain |W(f)|^2 of a named curve, 1 at 1 kHz
// exactly: "A", "C" (IEC 61672-1:2013, Annex E, pole formula), "468" (ITU-R
// BS.468-4, rational form of the network in its Fig. 1a), nil for "" or
// "none". ok is false for other names.
func Weighting(name string) (gain func(hz float64) float64, ok bool) {
	switch name {
	case "", "none":
		return nil, true
	case "A":
		return normal(aCurve), true
	case "C":
		return normal(cCurve), true
	case "468":
		return normal(curve468), true
	}
	return nil, false
}

func normal(amplitude func(hz float64) float64) func(float64) float64 {
	at1k := amplitude(1000)
	return func(hz float64) float64 {
		a := amplitude(hz) / at1k
		return a * a
	}
}

// Poles of IEC 61672-1:2013 Annex E in Hz, from its construction with
// fr = 1000, fL = 10^1.5, fH = 10^3.9, fA = 10^2.45, D = sqrt(1/2):
// b = (fr^2 + fL^2 fH^2/fr^2 - D (fL^2 + fH^2))/(1 - D), c = fL^2 fH^2.
var poleF1, poleF2, poleF3, poleF4 = func() (f1, f2, f3, f4 float64) {
	fr2, fL2, fH2 := 1e6, math.Pow(10, 3), math.Pow(10, 7.8)
	d := math.Sqrt(0.5)
	b := (fr2 + fL2*fH2/fr2 - d*(fL2+fH2)) / (1 - d)
	c := fL2 * fH2
	root := math.Sqrt(b*b - 4*c)
	fA := math.Pow(10, 2.45)
	return math.Sqrt((-b - root) / 2), (3 - math.Sqrt(5)) / 2 * fA, (3 + math.Sqrt(5)) / 2 * fA, math.Sqrt((-b + root) / 2)
}()

func cCurve(f float64) float64 {
	f2 := f * f
	return poleF4 * poleF4 * f2 / ((f2 + poleF1*poleF1) * (f2 + poleF4*poleF4))
}

func aCurve(f float64) float64 {
	f2 := f * f
	return cCurve(f) * f2 / math.Sqrt((f2+poleF2*poleF2)*(f2+poleF3*poleF3))
}

// curve468 is the amplitude response of the BS.468-4 network, which peaks by
// 12.2 dB at 6.3 kHz.
func curve468(f float64) float64 { return cmplx.Abs(rational468(f)) }

// rational468 is the network of BS.468-4 Fig. 1a in closed form, a zero at 0
// and six poles: s/(polynomial of s) at s = j 2 pi f, its even powers in h1,
// the odd ones in h2.
func rational468(f float64) complex128 {
	f2 := f * f
	h1 := 1 - 1.363894795463638e-7*f2 + 2.043828333606125e-15*f2*f2 - 4.737338981378384e-24*f2*f2*f2
	h2 := f * (5.559488023498642e-4 - 2.118150887518656e-11*f2 + 1.306612257412824e-19*f2*f2)
	return complex(0, 1.246332637532143e-4*f) / complex(h1, h2)
}

// Network468 is the complex response of the BS.468-4 weighting network, 0 dB
// at 1 kHz, exp(+j w t).
func Network468(hz float64) complex128 {
	return rational468(hz) / complex(curve468(1000), 0)
}
