package analyze

import (
	"fmt"
	"math"
	"sync"

	"benchslip/capture/recording"
)

// Signal is one channel, or the difference of two, of a take over a span, in
// V (unit "V") or in fractions of full scale (unit "FS") when no volts are
// known. Sample n lies at StartS + n/RateHz on the take's own time axis.
// Several goroutines may read it at once.
type Signal struct {
	Take   *Take
	Unit   string // "V" or "FS"
	RateHz float64
	StartS float64 // time of sample 0
	Gear   *Gear   // entry of the (first) channel; never nil
	Step   float64 // converter step in Unit, 0: none known

	plus, minus           int // channel numbers from 1; minus 0: none
	plusScale, minusScale float64
	from, to              int64 // frames

	mu  sync.Mutex
	err error
}

// Len is the number of samples.
func (s *Signal) Len() int { return int(s.to - s.from) }

// DurationS is Len / RateHz.
func (s *Signal) DurationS() float64 { return float64(s.Len()) / s.RateHz }

// Channel is the number of the (first) channel, from 1.
func (s *Signal) Channel() int { return s.plus }

// Minus is the number of the channel that is subtracted; 0: none.
func (s *Signal) Minus() int { return s.minus }

// Part is samples [from, to) of the signal, 0 <= from <= to <= Len, as a
// signal of its own.
func (s *Signal) Part(from, to int) *Signal {
	return &Signal{Take: s.Take, Unit: s.Unit, RateHz: s.RateHz, StartS: s.StartS + float64(from)/s.RateHz, Gear: s.Gear, Step: s.Step,
		plus: s.plus, minus: s.minus, plusScale: s.plusScale, minusScale: s.minusScale, from: s.from + int64(from), to: s.from + int64(to)}
}

// Scale is the factor from the file's samples to Unit.
func (s *Signal) Scale() float64 { return s.plusScale }

// ID names take, channels and span: equal IDs hold equal samples.
func (s *Signal) ID() string {
	return fmt.Sprintf("%s/%d-%d/%d..%d/%g", s.Take.Name, s.plus, s.minus, s.from, s.to, s.plusScale)
}

// FullScaleSine is the RMS in Unit of a sine that just reaches full scale;
// 0 for scope takes.
func (s *Signal) FullScaleSine() float64 {
	if s.Take.Rec == nil || s.Take.Rec.Info().Kind != recording.Audio {
		return 0
	}
	return math.Abs(s.plusScale) / math.Sqrt2
}

// Read fills dst with samples from index at on, in Unit. It returns how many
// were filled, short only at the end. An I/O error is kept for Err and reads
// as the end.
func (s *Signal) Read(dst []float64, at int) int {
	if rest := s.Len() - at; len(dst) > rest {
		if rest <= 0 {
			return 0
		}
		dst = dst[:rest]
	}
	channels := len(s.Take.Rec.Info().Channels)
	got := s.readChannel(dst, channels, s.plus, at)
	for i := range dst[:got] {
		dst[i] *= s.plusScale
	}
	if s.minus == 0 {
		return got
	}
	other := make([]float64, got)
	n := s.readChannel(other, channels, s.minus, at)
	for i, v := range other[:n] {
		dst[i] -= v * s.minusScale
	}
	return n
}

func (s *Signal) readChannel(dst []float64, channels, number, at int) int {
	planes := make([][]float64, channels)
	done := 0
	for done < len(dst) {
		planes[number-1] = dst[done:]
		n, err := s.Take.Rec.ReadAt(planes, s.from+int64(at+done))
		done += n
		if err != nil {
			s.mu.Lock()
			if s.err == nil {
				s.err = err
			}
			s.mu.Unlock()
			break
		}
		if n == 0 {
			break
		}
	}
	return done
}

// All reads the whole signal: 8 bytes a sample, for short takes.
func (s *Signal) All() []float64 {
	x := make([]float64, s.Len())
	return x[:s.Read(x, 0)]
}

// Err is the first I/O error that a Read met.
func (s *Signal) Err() error {
	s.mu.Lock()
	defer s.mu.Unlock()
	return s.err
}

// NewSignal makes a Signal of channel plus (less channel minus when not 0) of
// an opened take over frames [from, to).
func NewSignal(t *Take, plus, minus int, from, to int64, factor float64) *Signal {
	in := t.Rec.Info()
	s := &Signal{Take: t, RateHz: in.RateHz, plus: plus, minus: minus, from: from, to: to, Unit: "V"}
	if in.RateHz > 0 {
		s.StartS = in.StartS + float64(from)/in.RateHz
	}
	s.Gear = gearFor(t, in, plus)
	scale, volts := scaleOf(s.Gear, in.Channels[plus-1])
	s.plusScale = scale * factor
	if minus > 0 {
		other, ok := scaleOf(gearFor(t, in, minus), in.Channels[minus-1])
		s.minusScale, volts = other*factor, volts && ok
		if !volts { // differences of fractions of full scale
			s.plusScale, s.minusScale = factor, factor
		}
	}
	if !volts {
		s.Unit = "FS"
	}
	s.Step = in.Channels[plus-1].Step * math.Abs(s.plusScale)
	return s
}

// gearFor is the gear entry of a channel; a bare one when the job names none.
func gearFor(t *Take, in *recording.Info, channel int) *Gear {
	if t.Gear == nil {
		return &Gear{Kind: in.Kind, Probe: 1, Clock: 50e-6, DC: in.Kind == recording.Scope}
	}
	return t.Gear.For(channel)
}

// scaleOf is the factor from file samples to volts, and whether it is known.
func scaleOf(g *Gear, c recording.Channel) (float64, bool) {
	if c.Unit == "V" {
		if g.Probe != 0 {
			return g.Probe, true
		}
		return 1, true
	}
	if g.FullScalePeak > 0 {
		return g.FullScalePeak, true
	}
	return 1, false
}
