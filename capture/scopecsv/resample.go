package scopecsv

import (
	"fmt"
	"math"
	"strconv"

	"benchslip/capture/recording"
)

// resample puts uneven samples on an even grid by straight lines between
// neighbours, on request only. A grid point inside a gap (a step over 1.5
// medians) or beside a missing sample has no value. Straight lines lower a
// tone by about (pi f step)^2/2 and add images; the flag says so.
func (a *assembly) resample(m timing, stated *figure) error {
	step := m.median
	switch {
	case a.opt.RateHz > 0:
		step = 1 / a.opt.RateHz
	case stated != nil:
		step = stated.v
	}
	for i := 1; i < len(a.stamp); i++ {
		if !(a.stamp[i] > a.stamp[i-1]) {
			return a.fault(a.lineOf(i), recording.ErrAmbiguous, "time does not rise here; uneven samples can be put on an even grid only where it does", "remove the rows, or state the rate: "+rateKey)
		}
	}
	t0, t1 := a.stamp[0], a.stamp[len(a.stamp)-1]
	n := int(math.Floor((t1-t0)/step*(1+1e-12))) + 1
	if !(step > 0) || float64(n) > 8*float64(len(a.stamp))+16 {
		return a.fault(a.lay.line, recording.ErrAmbiguous, fmt.Sprintf("an even grid of %s would have over eight points a sample", seconds3(step)), "state a lower rate: "+rateKey)
	}
	widest := 1.5 * m.median
	for _, c := range a.chans {
		k := &a.t.col[c]
		v, grid := k.v, make([]float64, n)
		k.lost = nil
		j := 0
		for i := range grid {
			t := t0 + float64(i)*step
			for j+2 < len(a.stamp) && a.stamp[j+1] <= t {
				j++
			}
			x0, x1 := a.stamp[j], a.stamp[j+1]
			w := (t - x0) / (x1 - x0)
			switch {
			case w <= 0:
				grid[i] = v[j]
			case w >= 1:
				grid[i] = v[j+1]
			case x1-x0 > widest:
				grid[i] = math.NaN()
			default:
				grid[i] = v[j] + w*(v[j+1]-v[j])
			}
			if grid[i] != grid[i] {
				k.lose(i, blank, "no sample near", a.lineOf(j))
			}
		}
		k.v = grid
	}
	a.t.n = n
	a.info.Frames = int64(n)
	a.joints = nil
	a.stamp = nil
	a.info.RateHz = 1 / step
	a.info.StartS = t0
	a.assume("put on an even grid of %s Hz by straight lines between samples, as the job asks", strconv.FormatFloat(1/step, 'g', 12, 64))
	return nil
}
