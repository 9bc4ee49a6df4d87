package sim

import (
	"math"
	"math/cmplx"
)

// Truth is what a row of the demo's slips must come out as, computed from the
// circuit alone: no recording is read.
type Truth struct {
	Job, Check string  // "preamp", the row's name
	Value      float64 // in Unit
	Unit       string  // "dB", "V", "%", "Hz", "dBu"
}

// Truths lists the truth of every row of the demo that has one. Rows that are
// typed in by hand have none.
func Truths() []Truth {
	var out []Truth
	add := func(job, check string, value float64, unit string) {
		out = append(out, Truth{job, check, value, unit})
	}
	steps := []struct {
		take string
		arms arms
	}{{"tone20", sp017at20}, {"tone30", sp017at30}, {"tone40", sp017at40}}
	for _, s := range steps {
		p := skerryPreamp(s.arms, demoMains(0))
		add("preamp", "Gain steps: "+s.take, decibel(cmplx.Abs(p.Gain(testHz, sourceOhm))), "dB")
		add("preamp", "Polarity: "+s.take, 1, "")
	}

	at40 := skerryPreamp(sp017at40, demoMains(105))
	gain := at40.Gain(testHz, sourceOhm)
	quiet := at40.Noise(sourceOhm, 0)
	hum := at40.Hum(sourceOhm)
	tone := toneTruth(at40, 0.0216, hum)

	add("preamp", "DC offset at the output", at40.OutputDC(sourceOhm), "V")
	add("preamp", "Ripple on the positive rail", rail(demoMains(110)).(Sum)[1].(Mains).Total(), "V")
	add("preamp", "Output level of the distortion take", dBu(tone.total), "dBu")
	add("preamp", "Phase at 1 kHz", cmplx.Phase(gain)*180/math.Pi, "deg")
	add("preamp", "THD at +8 dBu", 100*tone.thd, "%")
	add("preamp", "THD+N at +8 dBu", 100*tone.thdn, "%")
	add("preamp", "SINAD at +8 dBu", -decibel(tone.thdn), "dB")
	add("preamp", "Signal to noise at +8 dBu", tone.snr, "dB")

	flat := func(float64) float64 { return 1 }
	noise := bandRMS(quiet, hum, 20, 20e3, flat)
	add("preamp", "Output noise", dBu(noise), "dBu")
	add("preamp", "Output noise, A-weighted", dBu(bandRMS(quiet, hum, 20, 20e3, aWeight)), "dBu")
	add("preamp", "Equivalent input noise", dBu(noise/cmplx.Abs(gain)), "dBu")
	add("preamp", "Noise density at 1 kHz", quiet.At(1000), "V/rtHz")
	add("preamp", "Hum at the output", dBu(hum.Total()), "dBu")
	add("preamp", "Hum against noise", decibel(hum.Total()/quiet.BandRMS(20, 20e3)), "dB")

	at20 := skerryPreamp(sp017at20, demoMains(0))
	add("preamp", "CMRR at the 20 dB step", decibel(at20.Amp.CMRR(testHz)), "dB")
	add("preamp", "CMRR at the 40 dB step", worstCMRR(at40.Amp, Differential(sourceOhm), Common(0)), "dB")

	supply := demoMains(202)
	line := receiver(supply)
	loop := sourceOhm + skerryCable.LoopOhm()
	lineGain := cmplx.Abs(line.Gain(testHz, sourceOhm))
	lineHum := line.Hum(loop)
	lineQuiet := line.Noise(loop, 0)
	own := skerryPreamp(sp016at40, demoMains(201))
	add("cable", "Mains frequency", supply.MeanHz(0, cableS), "Hz")
	add("cable", "Gain of the receiver", decibel(lineGain), "dB")
	add("cable", "Hum of the receiver alone", own.Hum(sourceOhm).Total()/lineGain, "V")
	add("cable", "Hum with the run", lineHum.Total()/lineGain, "V")
	// What the run adds: the difference of the two combs, each against the
	// phase of its own supply.
	added := lineHum
	added.Harmonics = append([]Line(nil), lineHum.Harmonics...)
	for _, l := range own.Hum(sourceOhm).Harmonics {
		l.Turns += 0.5
		added.Harmonics = append(added.Harmonics, l)
	}
	add("cable", "Pick-up along the run", added.merged().Total()/lineGain/skerryCable.Metres, "V/m")
	add("cable", "Hum against noise", decibel(lineHum.Total()/lineQuiet.BandRMS(20, 20e3)), "dB")
	add("cable", "Noise with the run, A-weighted", dBu(bandRMS(lineQuiet, lineHum, 20, 20e3, aWeight)), "dBu")
	add("cable", "Noise density at 1 kHz", lineQuiet.At(1000), "V/rtHz")
	add("cable", "CMRR through the run", worstCMRR(line.Amp,
		skerryCable.Load(Differential(sourceOhm)), skerryCable.Load(Common(sourceOhm))), "dB")
	return out
}

// worstCMRR is the smallest CMRR over the demo's frequencies, dB.
func worstCMRR(d DiffAmp, pair, joined Drive) float64 {
	worst := math.Inf(1)
	for _, f := range commonHz {
		p, c := d.Solve(f, pair), d.Solve(f, joined)
		worst = min(worst, decibel(cmplx.Abs(p.Out/p.Input())/cmplx.Abs(c.Out/c.HotLeg())))
	}
	return worst
}

// toneParts are the figures of a tone at the load: ratios, V, dB.
type toneParts struct{ total, thd, thdn, snr float64 }

// toneTruth follows a tone of an EMF through the amplifier and the bent output
// stage, with the noise of 20 Hz .. 20 kHz and the hum beside it.
func toneTruth(p Preamp, emf float64, hum Mains) toneParts {
	k := p.Output.Divider()
	before := emf * cmplx.Abs(p.Amp.Solve(testHz, Differential(sourceOhm)).Out)
	h := Curve{K2: p.Output.K2, K3: p.Output.K3}.HarmonicsOf(math.Sqrt2 * before)
	one := k * h[1] / math.Sqrt2
	harmonics := k * math.Hypot(h[2], h[3]) / math.Sqrt2
	noise := math.Hypot(p.Noise(sourceOhm, 0).BandRMS(20, 20e3), hum.Total())
	rest := math.Hypot(harmonics, noise)
	return toneParts{
		total: math.Hypot(one, rest),
		thd:   harmonics / one,
		thdn:  rest / math.Hypot(one, rest),
		snr:   decibel(one / noise),
	}
}

// bandRMS integrates weighted noise over a band, log steps, and adds the lines
// of a comb inside it as powers.
func bandRMS(n Noise, comb Mains, low, high float64, weight func(float64) float64) float64 {
	const steps = 20000
	var sum float64
	for i := range steps { // midpoints in lg f: df = f d(ln f)
		f := low * math.Pow(high/low, (float64(i)+0.5)/steps)
		v := n.At(f) * weight(f)
		sum += v * v * f * math.Log(high/low) / steps
	}
	for _, l := range comb.Harmonics {
		if f := float64(l.Order) * comb.FreqHz; f >= low && f <= high {
			v := l.RMS * weight(f)
			sum += v * v
		}
	}
	return math.Sqrt(sum)
}

// aWeight is the A-weighting as a ratio, 1 at 1 kHz: pole frequencies of IEC
// 61672-1, annex E.
func aWeight(f float64) float64 {
	raw := func(f float64) float64 {
		f *= f
		sq := func(x float64) float64 { return x * x }
		return sq(12194.217) * f * f / ((f + sq(20.598997)) * (f + sq(12194.217)) *
			math.Sqrt((f+sq(107.65265))*(f+sq(737.86223))))
	}
	return raw(f) / raw(1000)
}

func decibel(ratio float64) float64 { return 20 * math.Log10(ratio) }

// dBu is a level re 0.774597 V, 1 mW in 600 ohm.
func dBu(v float64) float64 { return decibel(v / math.Sqrt(0.6)) }
