package noise

import (
	"fmt"
	"math"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
	"benchslip/analyze/internal/spectrum"
	"benchslip/analyze/stage"
)

// detectorRate is the least rate, Hz, at which the detector sees the weighted
// voltage: its rectifier must not depend on where between the crests of a
// high tone the samples fall.
const detectorRate = 176000

// settled is when the mean indication starts, s after the meter does.
const settled = 2.0

// meter is the quasi-peak detector of ITU-R BS.468-4 at one rate: a full-wave
// rectifier and two followers in series. The Recommendation states readings
// for tone bursts, no time constants; these meet all of them. It starts at
// rest.
type meter struct {
	a, b  follower
	scale float64 // detector output to the RMS of a steady 1 kHz sine
}

// follower is a one-pole follower with separate rise and fall times, as
// factors a sample.
type follower struct{ rise, fall, y float64 }

func (f *follower) step(x float64) float64 {
	k := f.fall
	if x > f.y {
		k = f.rise
	}
	f.y += k * (x - f.y)
	return f.y
}

func newMeter(rate float64) *meter {
	factor := func(seconds float64) float64 { return -math.Expm1(-1 / (rate * seconds)) }
	m := &meter{
		a: follower{rise: factor(1.445e-3), fall: factor(292e-3)},
		b: follower{rise: factor(139.5e-3), fall: factor(164.8e-3)},
	}
	w := *m
	w.scale, w.a.y, w.b.y = 1, 1.387, 1.387 // near where a sine of 1 V RMS ends up
	steady, n := 0.0, int(0.7*rate)
	for i := 0; i < n; i++ {
		turn := 1000 * float64(i) / rate
		if y := w.step(math.Sqrt2 * math.Sin(2*math.Pi*(turn-math.Floor(turn)))); i > n-int(rate/500) {
			steady = math.Max(steady, y)
		}
	}
	m.scale = 1 / steady
	return m
}

// step takes one sample of the weighted voltage and returns the indication.
func (m *meter) step(x float64) float64 { return m.b.step(m.a.step(math.Abs(x))) * m.scale }

// indicated is what the meter shows over a signal.
type indicated struct {
	highest float64
	mean    float64   // after the first 2 s; 0 for shorter signals
	rms     float64   // of the weighted voltage
	each    []float64 // highest of every whole second after the first two
}

// indicate runs a signal, its mean taken off, through network and meter.
func indicate(s *analyze.Signal) indicated {
	up := 1
	for s.RateHz*float64(up) < detectorRate {
		up++
	}
	for up%7 == 0 || up > 6 && up%2 != 0 { // lengths of transforms: 2, 3 and 5 only
		up++
	}
	rate := s.RateHz * float64(up)
	m := newMeter(rate)
	f := spectrum.NewFilter(spectrum.Network468, s.RateHz, up)
	dc, equal := mean(s)
	if equal {
		return indicated{}
	}
	src := func(dst []float64, at int) int {
		n := s.Read(dst, at)
		for i := range dst[:n] {
			dst[i] -= dc
		}
		return n
	}
	var out indicated
	square, sum, at, second := 0.0, 0.0, 0, 0.0
	from, whole := int(settled*rate), int(rate)
	f.Run(src, s.Len(), func(y []float64) {
		part := 0.0
		for _, w := range y {
			part += w * w
			v := m.step(w)
			out.highest = math.Max(out.highest, v)
			if at >= from {
				sum += v
				second = math.Max(second, v)
				if (at-from+1)%whole == 0 {
					out.each = append(out.each, second)
					second = 0
				}
			}
			at++
		}
		square += part
	})
	out.rms = math.Sqrt(square / math.Max(float64(at), 1))
	if at > from {
		out.mean = sum / float64(at-from)
	}
	return out
}

// mean of a signal's samples, and whether they are all equal.
func mean(s *analyze.Signal) (dc float64, equal bool) {
	lo, hi, sum := math.Inf(1), math.Inf(-1), 0.0
	buf := make([]float64, 1<<14)
	for at := 0; at < s.Len(); {
		n := s.Read(buf, at)
		if n == 0 {
			break
		}
		part := 0.0
		for _, v := range buf[:n] {
			part += v
			lo, hi = math.Min(lo, v), math.Max(hi, v)
		}
		sum += part
		at += n
	}
	return sum / float64(max(s.Len(), 1)), !(lo < hi)
}

// swing is the relative standard uncertainty of the highest indication: on
// steady noise that of another second would differ by so much.
func (q indicated) swing() (u, dof float64) {
	if len(q.each) < 4 {
		return 0.05, 0 // of white noise; less for wider ones
	}
	mean, u1, dof := budget.TypeA(q.each)
	return u1 * math.Sqrt(dof+1) / mean, dof
}

// runQuasiPeak is the noise voltage of ITU-R BS.468-4: the weighting network,
// then the quasi-peak detector, started at rest, scaled so that a steady 1 kHz
// sine of U RMS reads U. The highest indication over the take is the reading.
func runQuasiPeak(p *analyze.Pass, s *analyze.Signal) analyze.Result {
	u := rmsUnit(s)
	q, bad := meterReads(s)
	if bad != nil {
		return analyze.RefuseWith(u, bad)
	}
	var b budget.Budget
	swing, dof := q.swing()
	b.A("swing of the indication", swing*q.highest, dof)
	b.Scale(s, q.highest)
	r := analyze.Result{Value: &q.highest, Unit: u, FullScaleSine: s.FullScaleSine()}
	b.Into(&r)
	r.Details = map[string]any{"weighting": "468", "detector": "quasi-peak", "rms_v": q.rms, "span_s": spanOf(s)}
	if q.mean > 0 {
		r.Details["mean_v"] = q.mean
	}
	r.Notes = []string{"quasi-peak reading after ITU-R BS.468-4, band edges not applied; on steady white noise it lies some 4.4 dB over the weighted RMS"}
	r.Figures = []analyze.Figure{stage.SpectrumFigure(p, stage.Decompose(p, s, stage.Options{}))}
	if !p.Has("floor") {
		return r
	}
	fs, bad := p.Signal("floor", "out")
	if bad != nil {
		return analyze.RefuseWith(u, bad)
	}
	f, bad := meterReads(fs)
	if bad != nil && bad.Code != analyze.NoSignal {
		return analyze.RefuseWith(u, bad)
	}
	// Indications of two noises do not add in any known way: from 10 dB on
	// the floor is too small to matter, nearer there is no value.
	r.Details["floor_take"], r.Details["floor_v"] = p.Take("floor").Name, f.highest
	if f.highest > 0 {
		over := 20 * math.Log10(q.highest/f.highest)
		r.Details["over_floor_db"] = over
		if over < 10 {
			return stage.FloorLimited(r, q.highest, true, over)
		}
	}
	return r
}

// meterReads checks that the meter can read a signal, and reads it.
func meterReads(s *analyze.Signal) (indicated, *analyze.Refusal) {
	if s.RateHz < 44000 {
		return indicated{}, &analyze.Refusal{Code: analyze.Bandwidth,
			Text: fmt.Sprintf("the 468 network reaches past %.6g Hz, half the rate of take %q", s.RateHz/2, s.Take.Name), Advice: "record at 48 kHz or more"}
	}
	if s.DurationS() < 0.5 {
		return indicated{}, &analyze.Refusal{Code: analyze.TooShort,
			Text: fmt.Sprintf("take %q holds %.3g s, the quasi-peak meter needs 0.5 s", s.Take.Name, s.DurationS()), Advice: "record 10 s or more"}
	}
	q := indicate(s)
	if q.highest == 0 {
		return q, &analyze.Refusal{Code: analyze.NoSignal,
			Text: fmt.Sprintf("take %q, channel %d: every sample is equal", s.Take.Name, s.Channel()), Advice: "check the connection and the channel"}
	}
	return q, nil
}
