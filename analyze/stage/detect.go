package stage

import (
	"math"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
)

// Mains orders are read as means over M blocks of block powers. Noise alone
// gives such a mean a chi-square law with 2M degrees of freedom.

// mainsBlocks is M.
func mainsBlocks(l *Lines) float64 { return float64(len(l.Blocks)) }

// MainsThreshold is the RMS that an order's corrected reading must reach to
// count as detected among n orders; noise alone reaches it in one of a
// thousand takes. The smaller of the mean over blocks and of the whole span.
func MainsThreshold(l *Lines, q Line, n int) float64 {
	p := FalseAlarm / float64(max(n, 1)) / 2
	M := mainsBlocks(l)
	over := budget.MeanThreshold(M, p) - 1
	blocks := q.Share * over
	whole := q.Dens / l.Sig.DurationS() * (math.Log(1/p) - 1)
	return math.Sqrt(math.Max(0, math.Min(blocks, whole)))
}

// MainsDetected: either the mean of block powers or the coherent mean over
// the whole span stands out of the noise.
func MainsDetected(l *Lines, q Line, n int) bool {
	if q.Dropped {
		return false
	}
	p := FalseAlarm / float64(max(n, 1)) / 2
	M := mainsBlocks(l)
	if q.Power > 0 && q.Power+q.Share > q.Share*budget.MeanThreshold(M, p) {
		return true
	}
	whole := q.Dens / l.Sig.DurationS()
	return q.Whole > 0 && q.Power > 0 && q.Whole+whole > whole*math.Log(1/p)
}

// MainsBound is the RMS whose probability of a reading (sum of mean block
// powers, noise shares included) below the one seen is 5 %.
func MainsBound(l *Lines, read float64, shares []float64) (rms float64, ok bool) {
	M := len(l.Blocks)
	spread := make([]float64, 0, M*len(shares))
	for _, s := range shares {
		for m := 0; m < M; m++ {
			spread = append(spread, s/float64(M))
		}
	}
	return budget.UpperBoundOf(read, spread, 0.95)
}

// MainsHzU is the standard uncertainty in Hz of the mean mains frequency from
// noise: the Cramer-Rao bound of a comb over the span, its blocks taken as
// independent; at least the scatter of the blocks' frequencies over sqrt(M).
func MainsHzU(l *Lines) float64 {
	weight := 0.0
	dens := 0.0
	for _, q := range l.Mains {
		if q.Power > 0 && !q.Dropped {
			weight += float64(q.Order*q.Order) * 2 * q.Power
			dens = math.Max(dens, q.Dens)
		}
	}
	if weight == 0 {
		return 0
	}
	M := mainsBlocks(l)
	Tb := l.Sig.DurationS() / M
	// var f = 12 (2 S/T_b... ) : sigma_z^2 = S/T_b per quadrature of a peak phasor.
	block := math.Sqrt(12*dens/Tb/weight) / (2 * math.Pi * Tb)
	return block / math.Sqrt(M)
}

// OtherSupply is the frequency of a comb of another supply than the job's, 0
// when none is found.
func OtherSupply(p *analyze.Pass, l *Lines) float64 {
	v := SurveyOf(p, l.Sig)
	skip := func(hz float64) bool { return l.Tone != nil && isHarmonic(hz, l.Tone.Hz, v.ToleranceHz()) }
	for _, f := range nominals[:2] {
		if math.Abs(f/p.MainsHz-1) < 0.02 {
			continue
		}
		if c := combNear(v, f, skip); c.Hz > 0 && c.Score > 30 && len(c.Orders) >= 2 {
			return c.Hz
		}
	}
	return 0
}

// BoundAnywhere is the RMS that the sum over mains orders (each times a power
// gain) stays below at 95 %, wherever within the supply's range (1 % about the
// nominal frequency) its frequency lies: the bound of the largest reading of
// the survey. Places of the tone and other lines read as noise.
func BoundAnywhere(p *analyze.Pass, l *Lines, orders []int, gains []float64) float64 {
	v := SurveyOf(p, l.Sig)
	nominal := mainsNominal(p)
	if nominal <= 0 {
		nominal = l.MainsHz
	}
	if len(orders) == 0 || nominal <= 0 {
		return 0
	}
	S := append([]float64(nil), v.S...)
	for _, set := range [][]Line{l.Harm, l.Others} {
		for _, q := range set {
			for k := max(int((q.Hz/v.StepHz)-v.Lobe), 0); k <= int(q.Hz/v.StepHz+v.Lobe)+1 && k < len(S); k++ {
				S[k] = math.Min(S[k], v.Floor[k])
			}
		}
	}
	K := int(math.Max(1, math.Round(v.Averages)))
	top := orders[len(orders)-1]
	most := 0.0
	spread := make([]float64, 0, K*len(orders))
	for f := nominal * (1 - supplyRange); f <= nominal*(1+supplyRange); f += v.StepHz / 4 / float64(top) {
		read := 0.0
		for i, o := range orders {
			if k := int(float64(o)*f/v.StepHz + 0.5); k < len(S) {
				read += gains[i] * S[k] * v.RBW()
			}
		}
		most = math.Max(most, read)
	}
	for i, o := range orders {
		if k := int(float64(o)*nominal/v.StepHz + 0.5); k < len(S) {
			for range K {
				spread = append(spread, gains[i]*v.Floor[k]*v.RBW()/float64(K))
			}
		}
	}
	b, ok := budget.UpperBoundOf(most, spread, 0.95)
	if !ok {
		return 0
	}
	return b
}
