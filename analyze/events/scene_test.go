package events

import (
	"math"
	"math/rand/v2"
	"sort"

	"benchslip/analyze"
	"benchslip/capture/recording"
)

// scene is a long recording that is computed as it is read: a tone, white noise
// and mains lines, with things that happen at known times.
type scene struct {
	in       recording.Info
	hz, amp  float64 // the tone
	noise    float64 // RMS
	mains    float64 // Hz
	bits     int     // 0: not quantised
	seed     uint64
	happened []happening
}

// happening changes the samples from time at on.
type happening struct {
	kind  string // as the measure calls it
	at    float64
	lasts float64
	what  string // "level", "lost", "silence", "click", "burst", "hum on", "hum off", "dc"
	size  float64
}

const sceneBlock = 4096

func newScene(rate, seconds float64, s scene) *scene {
	s.in = recording.Info{Format: "computed", Kind: recording.Audio, RateHz: rate, Frames: int64(math.Round(rate * seconds)),
		Channels: []recording.Channel{{Unit: "FS"}}}
	if s.bits > 0 {
		s.in.Channels[0].Bits, s.in.Channels[0].Step = s.bits, math.Exp2(float64(1-s.bits))
	}
	sort.SliceStable(s.happened, func(a, b int) bool { return s.happened[a].at < s.happened[b].at })
	return &s
}

func (s *scene) Info() *recording.Info { return &s.in }
func (s *scene) Close() error          { return nil }

func (s *scene) ReadAt(dst [][]float64, frame int64) (int, error) {
	x := dst[0]
	done := 0
	for done < len(x) && frame < s.in.Frames {
		block := s.block(frame / sceneBlock)
		n := copy(x[done:], block[frame%sceneBlock:])
		n = int(min(int64(n), s.in.Frames-frame))
		done += n
		frame += int64(n)
	}
	return done, nil
}

// block computes samples that depend on their number and the scene alone.
func (s *scene) block(k int64) []float64 {
	r := rand.New(rand.NewPCG(s.seed, uint64(k)))
	x := make([]float64, sceneBlock)
	rate := s.in.RateHz
	start := float64(k*sceneBlock) / rate
	end := start + sceneBlock/rate
	// What holds at the start of the block.
	gain, shift, hum, dc := 1.0, 0.0, 0.0, 0.0
	var inside []happening
	apply := func(h happening) {
		switch h.what {
		case "level":
			gain *= h.size
		case "lost":
			shift += h.size // samples
		case "hum on":
			hum = h.size
		case "hum off":
			hum = 0
		case "dc":
			dc += h.size
		}
	}
	for _, h := range s.happened {
		switch {
		case h.at >= end:
		case h.at+h.lasts < start && h.at < start:
			apply(h)
		default:
			inside = append(inside, h)
		}
	}
	next := 0
	phase := func(n float64) float64 { p := s.hz / rate * n; return 2 * math.Pi * (p - math.Floor(p)) }
	turn := complexTurn(2 * math.Pi * s.hz / rate)
	w := complexTurn(phase(float64(k*sceneBlock) + shift))
	for i := range x {
		n := float64(k*sceneBlock + int64(i))
		t := n / rate
		for next < len(inside) && inside[next].at <= t {
			apply(inside[next])
			w = complexTurn(phase(n + shift))
			next++
		}
		v := gain * s.amp * real(w)
		w *= turn
		v += s.noise*r.NormFloat64() + dc
		if hum > 0 {
			a := 2 * math.Pi * s.mains * t
			v += hum * math.Sqrt2 * (math.Sin(a) + 0.3*math.Sin(3*a+1)) / math.Sqrt(1.09)
		}
		for _, h := range inside {
			if t < h.at {
				continue
			}
			switch h.what {
			case "click":
				if t-h.at < 20e-3 {
					v += h.size * math.Exp(-(t-h.at)/0.3e-3) // a pop that dies away
				}
			case "burst":
				if t < h.at+h.lasts {
					v += h.size * r.NormFloat64()
				}
			case "silence":
				if t < h.at+h.lasts {
					v = 0
				}
			}
		}
		if s.bits > 0 {
			q := s.in.Channels[0].Step
			v = math.Floor(v/q+r.Float64()-r.Float64()+0.5) * q
		}
		x[i] = v
	}
	return x
}

func complexTurn(a float64) complex128 { s, c := math.Sincos(a); return complex(c, s) }

// take of a scene, full scale 1 V.
func (s *scene) take() *analyze.Take {
	zero := 0.0
	return &analyze.Take{Name: "t", Rec: s, Gear: &analyze.Gear{Name: "box", Kind: recording.Audio, FullScalePeak: 1, ScaleU: &zero, DC: true}}
}
