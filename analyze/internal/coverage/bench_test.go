package coverage

import (
	"math"
	"math/rand/v2"

	"benchslip/analyze"
	"benchslip/analyze/internal/trial"
	"benchslip/capture/recording"
	"benchslip/capture/recording/memory"
	"benchslip/capture/unit"
)

// bench is one random set-up: a recorder with its true errors and its stated
// uncertainties.
type bench struct {
	*rand.Rand
	rate, seconds float64
	bits          int
	dither        bool
	full          float64    // stated volts at full scale (peak)
	scale         float64    // relative error of that figure
	match         [2]float64 // relative errors of the channels beside it
	offset        float64    // V, read too much
	gear          *analyze.Gear
	mains         float64
	id            uint64
}

// newBench draws a set-up. full asks for the rates and lengths of real takes
// now and then, which cost more time.
func newBench(seed uint64, full bool) *bench {
	b := &bench{Rand: rand.New(rand.NewPCG(seed, 2026)), id: seed << 8}
	b.rate = []float64{8000, 11025, 12000}[b.IntN(3)]
	b.seconds = b.uniform(0.7, 1.1)
	if full {
		b.seconds = b.uniform(1, 2)
		switch b.IntN(8) {
		case 0:
			b.rate = []float64{44100, 48000}[b.IntN(2)]
			b.seconds = b.uniform(1, 4)
		case 1:
			b.seconds = b.uniform(5, 12)
		}
	}
	b.bits, b.dither = []int{16, 24, 24}[b.IntN(3)], true
	b.full = math.Pow(10, b.uniform(-0.3, 1.3))
	u := b.logarithmic(0.0005, 0.02) // standard
	b.gear = &analyze.Gear{Name: "box", Kind: recording.Audio, FullScalePeak: b.full, DC: true, ScaleU: &u, Clock: 50e-6}
	b.scale = u * b.NormFloat64()
	if b.IntN(2) == 0 {
		b.gear.ChannelMatch = b.logarithmic(0.0005, 0.01)
		b.match[1] = b.gear.ChannelMatch * b.NormFloat64() // channel 1 was calibrated
	}
	b.gear.OffsetU = b.logarithmic(1e-4, 1e-2) * b.full
	b.offset = b.gear.OffsetU * b.NormFloat64()
	b.mains = b.uniform(49.85, 50.15)
	return b
}

func (b *bench) uniform(lo, hi float64) float64 { return lo + (hi-lo)*b.Float64() }

func (b *bench) logarithmic(lo, hi float64) float64 {
	return lo * math.Pow(hi/lo, b.Float64())
}

func (b *bench) phase() float64 { return b.uniform(0, 2*math.Pi) }

// next is a seed of its own for each noise.
func (b *bench) next() uint64 {
	b.id++
	return b.id
}

// volts is a new signal in V.
func (b *bench) volts() *trial.Signal { return trial.New(b.rate, b.seconds) }

// density is the noise density (V/rtHz) of white noise of the RMS over half
// the rate.
func (b *bench) density(rms float64) float64 { return rms / math.Sqrt(b.rate/2) }

// band is the widest band of the rate that a job would state.
func (b *bench) band() analyze.Band { return analyze.Band{Low: 20, High: math.Min(20000, 0.45*b.rate)} }

// tone draws a test tone clear of the mains, with five harmonics in the band.
func (b *bench) tone() float64 {
	for {
		hz := b.logarithmic(70, b.rate/13.5)
		d := math.Abs(hz - b.mains*math.Round(hz/b.mains))
		if d > 5/b.seconds || hz > 5.5*b.mains && d > 2/b.seconds {
			return hz
		}
	}
}

// hum is the RMS of mains orders 1..n about a size, falling with the order.
func (b *bench) hum(size float64, n int) []float64 {
	u := make([]float64, n)
	for k := range u {
		u[k] = size * math.Pow(10, -b.Float64()) / float64(k+1)
	}
	return u
}

func (b *bench) addHum(s *trial.Signal, rms []float64) *trial.Signal {
	return s.Mains(b.mains, b.uniform(0, 0.02), rms, b.next())
}

// record is the take of the signals (V) that the bench's recorder makes:
// their true volts read with the recorder's errors.
func (b *bench) record(name string, channels ...*trial.Signal) *analyze.Take {
	var data [][]float64
	for c, s := range channels {
		k := (1 + b.scale) * (1 + b.match[c%2]) / b.full
		x := &trial.Signal{Rate: s.Rate, X: make([]float64, len(s.X))}
		for i, v := range s.X {
			x.X[i] = v*k + b.offset/b.full
		}
		if b.bits > 0 {
			x.Quantise(b.bits, b.dither, b.next())
		}
		data = append(data, x.X)
	}
	t := &analyze.Take{Name: name, Rec: memory.New(recording.Audio, b.rate, data...), Gear: b.gear}
	if len(channels) == 2 {
		t.Wiring.In = "2"
	}
	if b.bits > 0 {
		trial.Bits(t, b.bits)
	}
	return t
}

// stated is a quantity as a job states it: the true value read with an error
// of its expanded uncertainty, both in the unit.
func (b *bench) stated(key string, truth float64, symbol string, relative float64) *analyze.Stated {
	u := unit.MustLookup(symbol)
	v := truth * (1 + relative/2*b.NormFloat64())
	return &analyze.Stated{Key: key, Value: unit.Quantity{Number: u.FromLinear(v), Unit: u},
		Uncertainty: &unit.Quantity{Number: 100 * relative, Unit: unit.MustLookup("%")}}
}
