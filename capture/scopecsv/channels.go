package scopecsv

import (
	"benchslip/capture/recording"
	"math"
)

// fixTime finds rate and start.
func (a *assembly) fixTime() error {
	if a.time < 0 {
		return nil
	}
	k := &a.t.col[a.time]
	h := a.heads.col[a.time]
	f := 1.0
	if h.q == seconds {
		f = h.f
	}
	a.stamp = k.v
	for i := range a.stamp {
		a.stamp[i] = scaled(a.stamp[i], f)
	}
	m := measureTime(a.stamp, func(t float64) float64 { return f * rounding(k.last, k.digits)(t/f) })
	a.info.RateHz = roundRate(m.step, math.Min(m.bound/m.step, 2*m.q/m.step/math.Pow(float64(a.t.n), 1.5)))
	a.info.StartS = a.stamp[0]
	return nil
}

func (a *assembly) channels() error {
	a.info.Frames = int64(a.t.n)
	for _, c := range a.chans {
		h := a.heads.col[c]
		f := 1.0
		if h.q == volts {
			f = h.f
		}
		v := a.t.col[c].v
		for i := range v {
			v[i] = scaled(v[i], f)
		}
		a.out = append(a.out, v)
		a.info.Channels = append(a.info.Channels, recording.Channel{Name: h.name, Full: h.full, Unit: "V"})
	}
	return nil
}
