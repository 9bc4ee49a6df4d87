// Package trial makes recordings of known truth in memory and runs measures on
// them. Only tests import it.
package trial

import (
	"math"
	"math/rand/v2"

	"benchslip/analyze"
	"benchslip/capture/recording"
	"benchslip/capture/recording/memory"
)

// Signal is samples being put together.
type Signal struct {
	Rate float64
	X    []float64
}

// New is seconds of silence.
func New(rate, seconds float64) *Signal {
	return &Signal{rate, make([]float64, int(math.Round(rate*seconds)))}
}

// reduced is the fractional part of f i / rate, exact to rounding of f/rate.
func reduced(nu float64, i int) float64 {
	p := nu * float64(i)
	return p - math.Round(p) + math.FMA(nu, float64(i), -p)
}

// Tone adds amp cos(2 pi hz t + phase), argument reduced before the cosine.
func (s *Signal) Tone(hz, amp, phase float64) *Signal {
	for i := range s.X {
		s.X[i] += amp * math.Cos(2*math.Pi*reduced(hz/s.Rate, i)+phase)
	}
	return s
}

// Swing adds a tone whose phase (rad) departs from hz by swing(t).
func (s *Signal) Swing(hz, amp float64, swing func(t float64) float64) *Signal {
	for i := range s.X {
		s.X[i] += amp * math.Cos(2*math.Pi*reduced(hz/s.Rate, i)+swing(float64(i)/s.Rate))
	}
	return s
}

// Noise adds white Gaussian noise of the RMS over the whole band.
func (s *Signal) Noise(rms float64, seed uint64) *Signal {
	r := rand.New(rand.NewPCG(seed, 77))
	for i := range s.X {
		s.X[i] += rms * r.NormFloat64()
	}
	return s
}

// DC adds a constant.
func (s *Signal) DC(v float64) *Signal {
	for i := range s.X {
		s.X[i] += v
	}
	return s
}

// Mains adds harmonics of a supply whose frequency wanders by wander Hz
// (sinusoidally, 17 s period); rms[k] is the RMS of order k+1.
func (s *Signal) Mains(hz, wander float64, rms []float64, seed uint64) *Signal {
	r := rand.New(rand.NewPCG(seed, 5))
	at := r.Float64() * 2 * math.Pi
	const period = 17
	for k, u := range rms {
		if u == 0 {
			continue
		}
		ph := r.Float64() * 2 * math.Pi
		h := float64(k + 1)
		for i := range s.X {
			t := float64(i) / s.Rate
			turn := reduced(h*hz/s.Rate, i) - h*wander*period/(2*math.Pi)*math.Cos(2*math.Pi*t/period+at)
			s.X[i] += u * math.Sqrt2 * math.Cos(2*math.Pi*turn+ph)
		}
	}
	return s
}

// Quantise rounds to bits over +-1, with triangular dither of one step each
// way or none.
func (s *Signal) Quantise(bits int, dither bool, seed uint64) *Signal {
	q := math.Exp2(float64(1 - bits))
	r := rand.New(rand.NewPCG(seed, 3))
	for i, v := range s.X {
		d := 0.0
		if dither {
			d = r.Float64() - r.Float64()
		}
		s.X[i] = math.Floor(v/q+d+0.5) * q
	}
	return s
}

// Take makes a take of channels in full-scale units; full scale is 1 V peak
// with a calibration uncertainty of 0 and DC passed.
func Take(name string, channels ...*Signal) *analyze.Take {
	var data [][]float64
	for _, c := range channels {
		data = append(data, c.X)
	}
	zero := 0.0
	return &analyze.Take{Name: name, Rec: memory.New(recording.Audio, channels[0].Rate, data...),
		Gear: &analyze.Gear{Name: "box", Kind: recording.Audio, FullScalePeak: 1, ScaleU: &zero, DC: true}}
}

// Bits says that a take's samples are codes of so many bits.
func Bits(t *analyze.Take, bits int) *analyze.Take {
	r := t.Rec.(*memory.Recording)
	for i := range r.In.Channels {
		r.In.Channels[i].Bits = bits
		r.In.Channels[i].Step = math.Exp2(float64(1 - bits))
	}
	return t
}

// Pass is a pass of a measure over takes by role, mains 50 Hz.
func Pass(m *analyze.Measure, params analyze.Params, roles map[string]*analyze.Take) *analyze.Pass {
	p := &analyze.Pass{Measure: m, Params: &params, Roles: map[string][]*analyze.Take{}, MainsHz: 50, Stages: analyze.NewStages()}
	for r, t := range roles {
		p.Roles[r] = []*analyze.Take{t}
	}
	return p
}

// Run runs a measure on one take.
func Run(m *analyze.Measure, params analyze.Params, t *analyze.Take) analyze.Result {
	return m.Run(Pass(m, params, map[string]*analyze.Take{"take": t}))
}

// Bench runs several measures on the same takes, sharing their stages.
type Bench struct {
	Roles  map[string]*analyze.Take
	stages *analyze.Stages
}

// On is a Bench for one take.
func On(t *analyze.Take) *Bench { return Between(map[string]*analyze.Take{"take": t}) }

// Between is a Bench for takes by role.
func Between(roles map[string]*analyze.Take) *Bench { return &Bench{roles, analyze.NewStages()} }

// Run runs one measure.
func (b *Bench) Run(m *analyze.Measure, params analyze.Params) analyze.Result {
	p := Pass(m, params, b.Roles)
	p.Stages = b.stages
	return m.Run(p)
}
