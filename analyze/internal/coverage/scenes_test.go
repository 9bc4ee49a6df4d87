package coverage

import (
	"math"
	"math/cmplx"

	"benchslip/analyze"
	"benchslip/analyze/internal/spectrum"
	"benchslip/analyze/internal/trial"
	"benchslip/capture/recording/memory"
	"benchslip/capture/unit"
)

// sample is one random take (or pair) with the true value of what a measure
// reads from it, linear in the base unit of the measure.
type sample struct {
	params analyze.Params
	roles  map[string]*analyze.Take
	truth  float64
	size   float64 // what errors are taken relative to; 0: the truth
}

// scene draws samples of one measure.
type scene struct {
	name, measure string
	draw          func(b *bench) sample
}

// above are the scenes at least 10 dB over detection.
var above = []scene{
	{"gain, two channels", "gain", gainTwo},
	{"gain, stated level", "gain", gainStated},
	{"level of tone and all", "level", levelOf},
	{"dc", "dc", dcOf},
	{"thd", "thd", func(b *bench) sample { return thdOf(b, 10, 50) }},
	{"harmonic", "harmonic", func(b *bench) sample { return harmonicOf(b, 10, 50) }},
	{"thdn", "thdn", residualOf},
	{"sinad", "sinad", func(b *bench) sample {
		s := residualOf(b)
		s.truth = 1 / s.truth
		return s
	}},
	{"noise", "noise", func(b *bench) sample { return noiseOf(b, "") }},
	{"noise A", "noise", func(b *bench) sample { return noiseOf(b, "A") }},
	{"hum", "hum", func(b *bench) sample { return humOf(b, 10, 50, 0) }},
	{"hum, one order", "hum", func(b *bench) sample { return humOf(b, 10, 50, 1+b.IntN(5)) }},
	{"cmrr", "cmrr", func(b *bench) sample { return cmrrOf(b, 10, 50) }},
	{"ein, stated gain", "ein", func(b *bench) sample { return einOf(b, 0) }},
	{"ein, stated input level", "ein", func(b *bench) sample { return einOf(b, 1) }},
	{"noise over a floor", "noise", func(b *bench) sample { return flooredOf(b, "") }},
	{"noise A over a floor", "noise", func(b *bench) sample { return flooredOf(b, "A") }},
	{"thdn over a floor", "thdn", flooredResidual},
	{"ein, two-channel gain", "ein", func(b *bench) sample { return einOf(b, 2) }},
}

// about are the scenes near and below detection.
var about = []scene{
	{"thd", "thd", func(b *bench) sample { return thdOf(b, -30, 10) }},
	{"harmonic", "harmonic", func(b *bench) sample { return harmonicOf(b, -30, 10) }},
	{"hum", "hum", func(b *bench) sample { return humOf(b, -30, 10, 0) }},
	{"hum, one order", "hum", func(b *bench) sample { return humOf(b, -30, 10, 1+b.IntN(5)) }},
	{"cmrr", "cmrr", func(b *bench) sample { return cmrrOf(b, -30, 10) }},
}

// output draws the level of a test tone, V peak, and the RMS of the noise
// under it.
func (b *bench) output() (amp, noise float64) {
	amp = b.full * b.logarithmic(0.05, 0.7)
	return amp, amp * b.logarithmic(1e-5, 1e-2)
}

func gainTwo(b *bench) sample {
	hz, g := b.tone(), math.Pow(10, b.uniform(-1, 2))
	amp, noise := b.output()
	in := math.Min(amp/g, 0.7*b.full)
	amp = in * g
	if amp > 0.7*b.full {
		amp, in = 0.7*b.full, 0.7*b.full/g
	}
	out := b.addHum(b.volts().Tone(hz, amp, b.phase()), b.hum(amp*1e-3, 5)).Noise(noise, b.next())
	out.Tone(2*hz, amp*1e-3, b.phase()).Tone(3*hz, amp*1e-3, b.phase())
	ref := b.volts().Tone(hz, in, b.phase()).Noise(in*b.logarithmic(1e-5, 1e-2), b.next())
	return sample{roles: one(b.record("t", out, ref)), truth: g}
}

func one(t *analyze.Take) map[string]*analyze.Take { return map[string]*analyze.Take{"take": t} }

// gainStated measures against a stated level, itself read with an error.
func gainStated(b *bench) sample {
	hz := b.tone()
	amp, noise := b.output()
	out := b.addHum(b.volts().Tone(hz, amp, b.phase()), b.hum(amp*1e-3, 5)).Noise(noise, b.next())
	t := b.record("t", out)
	in := b.logarithmic(1e-3, 1)
	b.stateLevel(t, in)
	return sample{roles: one(t), truth: amp / math.Sqrt2 / in}
}

func (b *bench) stateLevel(t *analyze.Take, rms float64) {
	s := b.stated("in_level", rms, "V", b.logarithmic(0.002, 0.04))
	t.Wiring.InLevel, t.Wiring.InUncertainty = &s.Value, s.Uncertainty
}

func square(u []float64) float64 {
	p := 0.0
	for _, v := range u {
		p += v * v
	}
	return p
}

// floor is the mean square of what the recorder itself adds, in true volts at
// its input: rounding with triangular dither, half a step RMS.
func (b *bench) floor() float64 {
	q := b.full / (1 + b.scale) * math.Exp2(float64(1-b.bits))
	return q * q / 4
}

// share is the part of white noise that lies in a band.
func (b *bench) share(band analyze.Band) float64 { return (band.High - band.Low) / (b.rate / 2) }

func levelOf(b *bench) sample {
	hz, band := b.tone(), b.band()
	amp, noise := b.output()
	noise *= 10
	hum := b.hum(amp*b.logarithmic(1e-4, 1e-1), 6)
	h2 := amp * b.logarithmic(1e-4, 1e-1)
	s := b.addHum(b.volts().Tone(hz, amp, b.phase()).Tone(2*hz, h2, b.phase()), hum).Noise(noise, b.next())
	p := amp*amp/2 + h2*h2/2 + square(hum) + (noise*noise+b.floor())*b.share(band)
	return sample{params: analyze.Params{Band: &band}, roles: one(b.record("t", s)), truth: math.Sqrt(p)}
}

func dcOf(b *bench) sample {
	amp, noise := b.output()
	amp *= 0.5
	v := b.full * b.uniform(-0.3, 0.3)
	if b.IntN(3) == 0 { // an eight-bit screen without dither
		b.bits, b.dither = 8, false
	}
	s := b.addHum(b.volts().Tone(b.tone(), amp, b.phase()), b.hum(amp*1e-2, 5)).Noise(noise, b.next()).DC(v)
	return sample{roles: one(b.record("t", s)), truth: v, size: b.full}
}

// distorted is a take of a tone with its orders (RMS, second first), in
// noise, with hum.
func distorted(b *bench, hz, amp, noise float64, orders []float64) *analyze.Take {
	s := b.addHum(b.volts().Tone(hz, amp, b.phase()), b.hum(amp*b.logarithmic(1e-5, 1e-2), 6)).Noise(noise, b.next())
	for k, u := range orders {
		s.Tone(float64(k+2)*hz, math.Sqrt2*u, b.phase())
	}
	return b.record("t", s)
}

// threshold is the RMS at which one line in white noise (RMS over half the
// rate, the recorder's own added) counts as detected: sqrt(S/T ln(1/p)).
func (b *bench) threshold(noise float64) float64 {
	return b.density(math.Sqrt(noise*noise+b.floor())) * math.Sqrt(math.Log(1e3)/b.seconds)
}

// thdOf draws harmonics lo..hi dB over the threshold of one line.
func thdOf(b *bench, lo, hi float64) sample {
	hz := b.tone()
	amp, noise := b.output()
	n := 1 + b.IntN(5)
	u := make([]float64, n)
	for k := range u {
		u[k] = b.threshold(noise) * math.Pow(10, b.uniform(lo, hi)/20)
	}
	band := b.band()
	return sample{params: analyze.Params{Band: &band}, roles: one(distorted(b, hz, amp, noise, u)), truth: math.Sqrt(square(u)) / (amp / math.Sqrt2)}
}

func harmonicOf(b *bench, lo, hi float64) sample {
	hz := b.tone()
	amp, noise := b.output()
	order := 2 + b.IntN(4)
	u := make([]float64, 5)
	for k := range u {
		u[k] = b.threshold(noise) * math.Pow(10, b.uniform(lo, hi)/20)
	}
	return sample{params: analyze.Params{Order: order}, roles: one(distorted(b, hz, amp, noise, u)), truth: u[order-2] / (amp / math.Sqrt2)}
}

func residualOf(b *bench) sample {
	hz, band := b.tone(), b.band()
	amp, noise := b.output()
	u := make([]float64, 3)
	for k := range u {
		u[k] = noise * b.logarithmic(0.01, 10)
	}
	hum := b.hum(noise*b.logarithmic(0.01, 3), 6)
	s := b.addHum(b.volts().Tone(hz, amp, b.phase()), hum).Noise(noise, b.next())
	rest := (noise*noise+b.floor())*b.share(band) + square(hum) + square(u)
	for k, v := range u {
		s.Tone(float64(k+2)*hz, math.Sqrt2*v, b.phase())
	}
	return sample{params: analyze.Params{Band: &band}, roles: one(b.record("t", s)), truth: math.Sqrt(rest / (rest + amp*amp/2))}
}

// coloured adds noise with the one-sided density S(f) = 2 sigma^2/rate
// |1/(1 - a z^-1)|^2 and returns the integral of S W over a band.
func (b *bench) coloured(s *trial.Signal, sigma, a float64, band analyze.Band, weighting string) float64 {
	x := b.volts().Noise(sigma, b.next())
	y := 0.0
	for range 3000 { // settled before the take
		y = a*y + sigma*b.NormFloat64()
	}
	for i, v := range x.X {
		y = a*y + v
		s.X[i] += y
	}
	gain, _ := spectrum.Weighting(weighting)
	const n = 20000 // midpoint rule
	sum := 0.0
	for i := range n {
		f := band.Low + (band.High-band.Low)*(float64(i)+0.5)/n
		h := 1 / cmplx.Abs(1-complex(a, 0)*cmplx.Exp(complex(0, -2*math.Pi*f/b.rate)))
		g := 1.0
		if gain != nil {
			g = gain(f)
		}
		sum += h * h * g * (band.High - band.Low) / n
	}
	return sum * sigma * sigma / (b.rate / 2)
}

func noiseOf(b *bench, weighting string) sample {
	s, p, par := quiet(b, b.full*b.logarithmic(1e-5, 0.1), weighting)
	return sample{params: par, roles: one(b.record("t", s)), truth: math.Sqrt(p)}
}

// quiet draws a noise take in V with its power in the band.
func quiet(b *bench, sigma float64, weighting string) (*trial.Signal, float64, analyze.Params) {
	band := b.band()
	if b.IntN(3) == 0 {
		band.Low, band.High = b.logarithmic(20, 200), b.uniform(0.2, 0.45)*b.rate
	}
	b.bits = 24
	a := []float64{0, 0.5, 0.9, -0.3}[b.IntN(4)]
	s := b.volts()
	p := b.coloured(s, sigma, a, band, weighting)
	if b.IntN(2) == 0 {
		hum := b.hum(sigma*b.logarithmic(0.01, 0.5), 6)
		b.addHum(s, hum)
		gain, _ := spectrum.Weighting(weighting)
		for k, u := range hum {
			hz := float64(k+1) * b.mains
			if hz < band.Low-1 || hz > band.High {
				continue
			}
			g := 1.0
			if gain != nil {
				g = gain(hz)
			}
			p += g * u * u
		}
	}
	if math.Abs(band.Low-b.mains*math.Round(band.Low/b.mains)) < 2 {
		return quiet(b, sigma, weighting) // a line on the band's edge
	}
	return s, p, analyze.Params{Band: &band, Weighting: weighting}
}

// humOf draws orders lo..hi dB over the threshold of one of them; order 0:
// their sum.

func humOf(b *bench, lo, hi float64, order int) sample {
	b.bits = 24
	noise := b.full * b.logarithmic(1e-5, 1e-2)
	n := 1 + b.IntN(12)
	if order > 0 {
		n = 5
	}
	u := make([]float64, n)
	for k := range u {
		u[k] = b.threshold(noise) * math.Pow(10, b.uniform(lo, hi)/20)
	}
	s := b.addHum(b.volts(), u).Noise(noise, b.next())
	if b.IntN(3) == 0 { // clear of the twenty orders that count
		s.Tone(b.uniform(1060, 0.3*b.rate), 0.3*b.full, b.phase())
	}
	truth := math.Sqrt(square(u))
	if order > 0 {
		truth = u[order-1]
	}
	return sample{params: analyze.Params{Order: order}, roles: one(b.record("t", s)), truth: truth}
}

// cmrrOf draws a common-mode line lo..hi dB over its threshold.
func cmrrOf(b *bench, lo, hi float64) sample {
	hz := b.tone()
	amp, noise := b.output()
	gd := b.logarithmic(0.3, 30)
	in := math.Min(amp/gd, 0.7*b.full)
	amp = in * gd
	two := b.IntN(2) == 0
	take := func(name string, out, in float64) *analyze.Take {
		ref := math.Min(in, 0.7*b.full)
		x := b.addHum(b.volts().Tone(hz, out, b.phase()), b.hum(b.threshold(noise), 4)).Noise(noise, b.next())
		if !two {
			t := b.record(name, x)
			b.stateLevel(t, ref/math.Sqrt2)
			return t
		}
		return b.record(name, x, b.volts().Tone(hz, ref, b.phase()).Noise(ref*1e-4, b.next()))
	}
	d := take("d", amp, in)
	drive := b.full * b.uniform(0.2, 0.6)
	rest := math.Sqrt2 * b.threshold(noise) * math.Pow(10, b.uniform(lo, hi)/20)
	c := take("c", rest, drive)
	return sample{params: analyze.Params{At: []float64{hz * (1 + b.uniform(-1e-3, 1e-3))}},
		roles: map[string]*analyze.Take{"differential": d, "common": c}, truth: amp / in / (rest / drive)}
}

// einOf draws a noise take and its gain: stated (0), from a take with a
// stated input level (1), or with the input on a second channel (2).
func einOf(b *bench, kind int) sample {
	g := b.logarithmic(30, 1000)
	// Thermal noise of 150 ohm alone would give 1.55 nV/rtHz; well above it.
	sigma := b.logarithmic(3e-9, 100e-9) * math.Sqrt(b.rate/2) * g
	s, p, par := quiet(b, sigma, []string{"", "A"}[b.IntN(2)])
	par.Source = &analyze.Stated{Key: "source", Value: unit.New(150, "ohm")}
	roles := one(b.record("t", s))
	switch kind {
	case 0:
		par.Gain = b.stated("gain", g, "x", b.logarithmic(0.005, 0.05))
	default:
		hz := b.tone()
		amp, noise := b.output()
		out := b.volts().Tone(hz, amp, b.phase()).Noise(noise, b.next())
		if kind == 1 {
			t := b.record("g", out)
			b.stateLevel(t, amp/g/math.Sqrt2)
			roles["gain_take"] = t
			break
		}
		roles["gain_take"] = b.record("g", out, b.volts().Tone(hz, amp/g, b.phase()).Noise(amp/g*1e-3, b.next()))
	}
	return sample{params: par, roles: roles, truth: math.Sqrt(p) / g}
}

// flooredOf draws a noise take 6..20 dB over the recorder's own noise, which
// has a take of its own.
func flooredOf(b *bench, weighting string) sample {
	b.bits = 24
	band := b.band()
	own := b.full * b.logarithmic(1e-5, 1e-3)
	unit := own * math.Sqrt(math.Pow(10, b.uniform(6.5, 20)/10)-1) // powers add
	s := b.volts()
	p := b.coloured(s, unit, 0, band, weighting)
	floor := b.volts().Noise(own, b.next())
	roles := one(b.record("t", s.Noise(own, b.next())))
	roles["floor"] = b.record("f", floor)
	return sample{params: analyze.Params{Band: &band, Weighting: weighting}, roles: roles, truth: math.Sqrt(p)}
}

// flooredResidual draws a tone whose noise stands 6..20 dB over the recorder's.
func flooredResidual(b *bench) sample {
	s := flooredOf(b, "")
	t := s.roles["take"]
	hz, amp := b.tone(), 0.5*b.full
	clean := &trial.Signal{Rate: b.rate, X: make([]float64, t.Rec.Info().Frames)}
	clean.Tone(hz, amp*(1+b.scale)/b.full, b.phase())
	data := t.Rec.(*memory.Recording).Data[0]
	for i, v := range clean.X {
		data[i] += v
	}
	s.truth /= math.Hypot(s.truth, amp/math.Sqrt2)
	return s
}
