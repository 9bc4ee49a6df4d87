package sim

import (
	"math"
	"math/cmplx"
)

// OutputStage is a follower with a build-out resistor that works into a load.
// Its curve bends the voltage before the divider.
type OutputStage struct {
	BuildOutOhm float64
	LoadOhm     float64 // 0: open
	K2, K3      float64 // of Curve, 1/V and 1/V^2
}

// Divider is the share of the voltage that reaches the load.
func (s OutputStage) Divider() float64 {
	if s.LoadOhm == 0 {
		return 1
	}
	return s.LoadOhm / (s.LoadOhm + s.BuildOutOhm)
}

// scaled is a source times a factor.
func scaled(of Source, by float64) Source {
	return Func(func(dst []float64, g *Grid) {
		x := make([]float64, len(dst))
		of.Add(x, g)
		for i, v := range x {
			dst[i] += by * v
		}
	})
}

// Preamp is a difference amplifier with its output stage and the hum that its
// own supply leaves in it. One value stands for one gain step.
type Preamp struct {
	Amp    DiffAmp
	Output OutputStage
	// InputHum is induced into the input wiring, V as an EMF in series with
	// the source; Ripple reaches the output past all gain. Both share one
	// supply.
	InputHum, Ripple Mains
}

// Gain is the complex gain from the input terminals to the load.
func (p Preamp) Gain(f, sourceOhm float64) complex128 {
	return p.Amp.Gain(f, sourceOhm) * complex(p.Output.Divider(), 0)
}

// emfGain is the gain from the source's EMF to the load.
func (p Preamp) emfGain(sourceOhm float64) func(float64) complex128 {
	return func(f float64) complex128 {
		return p.Amp.Solve(f, Differential(sourceOhm)).Out * complex(p.Output.Divider(), 0)
	}
}

// Hum is the comb at the load, both ways in added as vectors.
func (p Preamp) Hum(sourceOhm float64) Mains {
	out := p.InputHum.Through(p.emfGain(sourceOhm))
	out.Harmonics = append(out.Harmonics, p.Ripple.Through(func(float64) complex128 {
		return complex(p.Output.Divider(), 0)
	}).Harmonics...)
	return out.merged()
}

// merged adds lines of one order as phasors; each keeps the wander of the
// first.
func (m Mains) merged() Mains {
	sum := map[int]complex128{}
	for _, l := range m.Harmonics {
		sum[l.Order] += cmplx.Rect(l.RMS, 2*math.Pi*l.Turns)
	}
	var lines []Line
	done := map[int]bool{}
	for _, l := range m.Harmonics {
		if done[l.Order] {
			continue
		}
		done[l.Order] = true
		l.RMS, l.Turns = cmplx.Abs(sum[l.Order]), cmplx.Phase(sum[l.Order])/(2*math.Pi)
		lines = append(lines, l)
	}
	return m.With(lines...)
}

// Noise is the noise at the load.
func (p Preamp) Noise(sourceOhm float64, seed uint64) Noise {
	n := p.Amp.Noise(sourceOhm, seed)
	n.Density *= p.Output.Divider()
	return n
}

// OutputDC is the offset at the load, V.
func (p Preamp) OutputDC(sourceOhm float64) float64 {
	return p.Amp.OutputOffset(sourceOhm) * p.Output.Divider()
}

// Quiet is the output with a source resistance and no signal: noise, hum and
// offset.
func (p Preamp) Quiet(sourceOhm float64, seed uint64) Source {
	return Sum{p.Noise(sourceOhm, seed), p.Hum(sourceOhm), DC(p.OutputDC(sourceOhm))}
}

// Driven returns the output and what the second channel records, for tones
// that are EMFs of the drive d (whose own EMFs are factors on them). seen picks
// what is recorded: Pins.Input or Pins.HotLeg.
func (p Preamp) Driven(emf Tones, d Drive, seen func(Pins) complex128, seed uint64) (out, in Source) {
	in = emf.Through(func(f float64) complex128 { return seen(p.Amp.Solve(f, d)) })
	amp := emf.Through(func(f float64) complex128 { return p.Amp.Solve(f, d).Out })
	bent := Curve{K2: p.Output.K2, K3: p.Output.K3, Of: amp}
	return Sum{scaled(bent, p.Output.Divider()), p.Quiet(d.HotOhm+d.ColdOhm, seed)}, in
}

// Cable is a shielded pair. Current along its shield makes a difference
// voltage in the pair wherever the two cores do not couple to the shield
// alike; the voltage rises in proportion to frequency and to length (Muncy,
// "Noise Susceptibility in Analog and Digital Signal Processing Systems",
// J. Audio Eng. Soc. 43(6), 1995, from memory).
type Cable struct {
	Metres float64

	// MutualImbalance is the difference of the cores' mutual inductances to
	// the shield, H/m.
	MutualImbalance float64

	OhmPerMetre   float64 // each core
	FaradPerMetre float64 // core to shield
	FaradMismatch float64 // relative difference between the cores
}

// Induced is the voltage in the pair, as an EMF in series with the source, of
// a shield current given line by line (RMS in A): V = 2 pi f M l I, leading
// the current by a quarter turn.
func (c Cable) Induced(shieldCurrent Mains) Mains {
	return shieldCurrent.Through(func(f float64) complex128 {
		return complex(0, 2*math.Pi*f*c.MutualImbalance*c.Metres)
	})
}

// LoopOhm is the resistance that the pair adds to the source.
func (c Cable) LoopOhm() float64 { return 2 * c.OhmPerMetre * c.Metres }

// Load puts the cable's capacitances across a drive's pins.
func (c Cable) Load(d Drive) Drive {
	each := c.FaradPerMetre * c.Metres
	d.HotFarad = each * (1 + c.FaradMismatch/2)
	d.ColdFarad = each * (1 - c.FaradMismatch/2)
	return d
}

// WireBesideLead is what a length of insulated wire laid beside a mains lead
// puts across a resistor, by capacitance: V = 2 pi f C R U, leading the mains
// by a quarter turn (C R far below a period). Nothing touches the mains.
func WireBesideLead(farad, ohm float64, mains Mains) Mains {
	return mains.Through(func(f float64) complex128 {
		return complex(0, 2*math.Pi*f*farad*ohm)
	})
}
