package sim

import (
	"math"
	"math/cmplx"
)

// DiffAmp is a difference amplifier of one op-amp and four resistors:
//
//	pin 3 (cold) --- R1 --+-- R2 || C2 --- output
//	                      |
//	                    (-)
//	                    (+)
//	                      |
//	pin 2 (hot)  --- R3 --+-- R4 || C4 --- 0 V
//
// With a = R2/R1 and b = R4/R3 its common-mode gain is (b - a)/(1 + b) and its
// differential gain [a + b (1 + a)/(1 + b)]/2: it rejects common mode only as
// well as R2/R1 = R4/R3.
type DiffAmp struct {
	R1, R2, R3, R4 float64 // ohm
	C2, C4         float64 // F, across R2 and R4; 0: none

	GainBandwidthHz float64 // of the op-amp; 0: unlimited
	OpAmpCMRR       float64 // of the op-amp alone, V/V; 0: unlimited

	VoltageNoise float64 // of the op-amp, V/rtHz, white part
	CornerHz     float64 // of the op-amp's 1/f voltage noise
	CurrentNoise float64 // of each op-amp input, A/rtHz
	Offset       float64 // of the op-amp, V at its input

	Kelvin float64 // temperature of the resistors; 0: RoomK
}

// Drive is what is connected to the input: an EMF behind a resistance in each
// leg, and a capacitance from each pin to the screen.
type Drive struct {
	HotEMF, ColdEMF     complex128 // V
	HotOhm, ColdOhm     float64    // 0: an ideal source on that pin
	HotFarad, ColdFarad float64    // pin to screen (pin 1, 0 V)
}

// Differential is a balanced drive of 1 V between the legs, half the source
// resistance in each.
func Differential(sourceOhm float64) Drive {
	return Drive{HotEMF: 0.5, ColdEMF: -0.5, HotOhm: sourceOhm / 2, ColdOhm: sourceOhm / 2}
}

// Common is 1 V on both legs, half the source resistance in each; 0 ohm joins
// the pins.
func Common(sourceOhm float64) Drive {
	return Drive{HotEMF: 1, ColdEMF: 1, HotOhm: sourceOhm / 2, ColdOhm: sourceOhm / 2}
}

// Pins are the voltages that a drive makes, V against 0 V.
type Pins struct {
	Hot, Cold complex128 // pins 2 and 3
	Out       complex128
}

// Input is what lies across the input terminals, pin 2 less pin 3.
func (p Pins) Input() complex128 { return p.Hot - p.Cold }

// HotLeg is pin 2 against pin 1: the drive of a common-mode test.
func (p Pins) HotLeg() complex128 { return p.Hot }

// Solve returns the pins at frequency f, Hz, from the node equations of the
// circuit above, the op-amp taken as ideal but for its own common-mode error
// and its bandwidth.
func (d DiffAmp) Solve(f float64, in Drive) Pins {
	jw := complex(0, 2*math.Pi*f)
	z2 := 1 / (complex(1/d.R2, 0) + jw*complex(d.C2, 0))
	z4 := 1 / (complex(1/d.R4, 0) + jw*complex(d.C4, 0))
	r1, r3 := complex(d.R1, 0), complex(d.R3, 0)

	// The hot leg is a divider: the op-amp input draws nothing.
	hot := in.HotEMF
	if in.HotOhm > 0 {
		load := jw*complex(in.HotFarad, 0) + 1/(r3+z4)
		hot /= 1 + complex(in.HotOhm, 0)*load
	}
	plus := hot * z4 / (r3 + z4)

	// The op-amp's own common-mode error is a voltage in series with its input.
	minus := plus
	if d.OpAmpCMRR > 0 {
		minus += plus / complex(d.OpAmpCMRR, 0)
	}

	// The cold leg works against the op-amp's input, held at minus.
	cold := in.ColdEMF
	if in.ColdOhm > 0 {
		y := complex(1/in.ColdOhm, 0)
		cold = (in.ColdEMF*y + minus/r1) / (y + jw*complex(in.ColdFarad, 0) + 1/r1)
	}
	out := minus - (cold-minus)/r1*z2
	if d.GainBandwidthHz > 0 {
		out /= 1 + jw/complex(2*math.Pi*d.GainBandwidthHz/d.noiseGain(in.ColdOhm), 0)
	}
	return Pins{Hot: hot, Cold: cold, Out: out}
}

// noiseGain is the gain from a voltage at the op-amp's input to the output.
func (d DiffAmp) noiseGain(coldOhm float64) float64 { return 1 + d.R2/(d.R1+coldOhm) }

// Gain is the complex gain from the input terminals to the output, with a
// balanced source of the given resistance.
func (d DiffAmp) Gain(f, sourceOhm float64) complex128 {
	p := d.Solve(f, Differential(sourceOhm))
	return p.Out / p.Input()
}

// CommonGain is the complex gain from the joined pins to the output.
func (d DiffAmp) CommonGain(f float64) complex128 { return d.Solve(f, Common(0)).Out }

// CMRR is |differential gain| over |common-mode gain|, V/V, both from sources
// without resistance.
func (d DiffAmp) CMRR(f float64) float64 {
	return cmplx.Abs(d.Gain(f, 0)) / cmplx.Abs(d.CommonGain(f))
}

// Mismatch is (R4/R3)/(R2/R1) - 1.
func (d DiffAmp) Mismatch() float64 { return d.R4/d.R3/(d.R2/d.R1) - 1 }

// NoiseShare is one part of the output noise.
type NoiseShare struct {
	Name    string
	Density float64 // V/rtHz at the output, white part
}

// NoiseShares returns the parts of the output noise with a source resistance
// across the input, half of it counted to each leg. Each is a density times
// its gain to the output; z1 = R1 + source/2, z3 = R3 + source/2, and
// n = 1 + R2/z1 is the noise gain:
//
//	z1: sqrt(4kT z1) R2/z1          R2: sqrt(4kT R2)
//	z3: sqrt(4kT z3) n R4/(z3+R4)   R4: sqrt(4kT R4) n z3/(z3+R4)
//	op-amp: e n, i R2 (cold input), i (z3 || R4) n (hot input)
//
// The capacitors and the op-amp's bandwidth are left out: their corners must
// lie far above the audio band.
func (d DiffAmp) NoiseShares(sourceOhm float64) []NoiseShare {
	kelvin := d.Kelvin
	if kelvin == 0 {
		kelvin = RoomK
	}
	z1, z3 := d.R1+sourceOhm/2, d.R3+sourceOhm/2
	n := d.noiseGain(sourceOhm / 2)
	return []NoiseShare{
		{"cold arm", Thermal(z1, kelvin) * d.R2 / z1},
		{"hot arm", Thermal(z3, kelvin) * n * d.R4 / (z3 + d.R4)},
		{"R2", Thermal(d.R2, kelvin)},
		{"R4", Thermal(d.R4, kelvin) * n * z3 / (z3 + d.R4)},
		{"op-amp current, cold input", d.CurrentNoise * d.R2},
		{"op-amp current, hot input", d.CurrentNoise * n * z3 * d.R4 / (z3 + d.R4)},
		{"op-amp voltage", d.VoltageNoise * n},
	}
}

// Noise is the noise at the output: the shares are independent, so their
// powers add; only the op-amp's voltage noise has a 1/f part.
func (d DiffAmp) Noise(sourceOhm float64, seed uint64) Noise {
	var white float64
	for _, s := range d.NoiseShares(sourceOhm) {
		white += s.Density * s.Density
	}
	e := d.VoltageNoise * d.noiseGain(sourceOhm/2)
	return Noise{Density: math.Sqrt(white), CornerHz: d.CornerHz * e * e / white, Seed: seed}
}

// OutputOffset is the DC at the output with a source resistance across the
// input, V: the op-amp's offset times the noise gain.
func (d DiffAmp) OutputOffset(sourceOhm float64) float64 {
	return d.Offset * d.noiseGain(sourceOhm/2)
}
