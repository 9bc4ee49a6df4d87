package sim

import (
	"math"
	"math/cmplx"
	"testing"
)

// TestCommonModeFromResistors holds worked values of the one-op-amp difference
// amplifier: exact worst cases from G_cm = (b - a)/(1 + b) and
// G_d = [a + b (1 + a)/(1 + b)]/2, and the usual approximation (1 + G)/d for
// one resistor off (textbook forms, also in op-amp makers' notes).
func TestCommonModeFromResistors(t *testing.T) {
	worst := func(g, tol float64) DiffAmp {
		// Every part at its limit, so that b < a; symmetric limits in the ratio.
		k := (1 + tol) / (1 - tol)
		return DiffAmp{R1: 1000, R2: 1000 * g * k, R3: 1000 * k, R4: 1000 * g}
	}
	for _, c := range []struct {
		name string
		amp  DiffAmp
		dB   float64
		tol  float64
	}{
		{"gain 1, four 1 % parts", worst(1, 0.01), 33.9794, 1e-3},
		{"gain 1, four 0.1 % parts", worst(1, 0.001), 53.9794, 1e-3},
		{"gain 1, four 0.01 % parts", worst(1, 0.0001), 73.9794, 1e-3},
		{"gain 10, four 1 % parts", worst(10, 0.01), 48.7866, 2e-3},
		{"gain 10, four 0.1 % parts", worst(10, 0.001), 68.7866, 1e-3},
		{"gain 1, one part 1 % off", DiffAmp{R1: 1e4, R2: 1e4, R3: 1e4, R4: 1.01e4}, 46.0206, 0.07}, // first order in 1 %
		{"gain 1, trimmed to 100 ppm", DiffAmp{R1: 1e4, R2: 1e4, R3: 1e4, R4: 1e4 * 1.0001}, 86.0206, 1e-3},
	} {
		within(t, c.name, decibel(c.amp.CMRR(1000)), c.dB, c.tol)
	}
}

// TestImbalancedSource: 10 ohm in one leg against 10 kohm a leg converts
// 10/10010 of the common mode, 60.0087 dB.
func TestImbalancedSource(t *testing.T) {
	d := DiffAmp{R1: 5000, R2: 5000, R3: 5000, R4: 5000}
	in := Common(0)
	in.HotOhm = 10
	within(t, "10 ohm over 10 kohm", -decibel(cmplx.Abs(d.Solve(1000, in).Out)), 60.0086815, 1e-6)
}

// TestImbalancedCapacitance: 50 pF more on one leg of 200 ohm at 1 kHz converts
// w R C = 84.04 dB (an approximation for w R C far below 1).
func TestImbalancedCapacitance(t *testing.T) {
	d := DiffAmp{R1: 1e9, R2: 1e9, R3: 1e9, R4: 1e9}
	in := Common(400)
	in.HotFarad, in.ColdFarad = 1.05e-9, 1.00e-9
	within(t, "50 pF", -decibel(cmplx.Abs(d.Solve(1000, in).Out)), 84.0364, 0.02)
}

func TestGainAtTheTerminals(t *testing.T) {
	d := DiffAmp{R1: 1000, R2: 33000, R3: 1000, R4: 33000}
	// From an ideal source R2/R1; 150 ohm in the legs does not change what the
	// terminals see, but for the cold arm's heavier load.
	near(t, "no source resistance", cmplx.Abs(d.Gain(1000, 0)), 33, 1e-12)
	near(t, "150 ohm", cmplx.Abs(d.Gain(1000, 150)), 33, 1e-3)
	near(t, "from the EMF", cmplx.Abs(d.Solve(1000, Differential(150)).Out), 33000.0/1075, 1e-12)
	if p := cmplx.Phase(d.Gain(1000, 150)); math.Abs(p) > 1e-9 {
		t.Errorf("phase %.3g rad, wanted 0: pin 2 is the hot one", p)
	}
	// One pole: GBW/(1 + R2/R1) = 100 kHz at half power.
	d.GainBandwidthHz = 3.4e6
	near(t, "at the op-amp's corner", cmplx.Abs(d.Gain(100e3, 0)), 33/math.Sqrt2, 1e-9)
}

// TestNoiseShares checks each arm's gain against the node equations, driven in
// that arm alone, and the sum against the closed form of a balanced stage with
// a quiet op-amp: two arms and two feedback resistors, referred to the EMF,
// 4kT [2 z + 2 z^2/R2 (1 + ...)] -> 4kT 2 z for R2 far above z.
func TestNoiseShares(t *testing.T) {
	d := DiffAmp{R1: 1000, R2: 10000, R3: 1010, R4: 9900}
	s := d.NoiseShares(150)
	cold := cmplx.Abs(d.Solve(1000, Drive{ColdEMF: 1, HotOhm: 75, ColdOhm: 75}).Out)
	hot := cmplx.Abs(d.Solve(1000, Drive{HotEMF: 1, HotOhm: 75, ColdOhm: 75}).Out)
	near(t, "cold arm", s[0].Density, cold*Thermal(1075, RoomK), 1e-12)
	near(t, "hot arm", s[1].Density, hot*Thermal(1085, RoomK), 1e-12)

	big := DiffAmp{R1: 1000, R2: 1e9, R3: 1000, R4: 1e9}
	near(t, "arms only", big.Noise(0, 0).Density/1e6, Thermal(2000, RoomK), 1e-3)

	// Op-amp noise alone: e times 1 + R2/R1.
	quiet := DiffAmp{R1: 1000, R2: 10000, R3: 1000, R4: 10000, VoltageNoise: 5e-9, CornerHz: 50, Kelvin: 1e-9}
	n := quiet.Noise(0, 0)
	near(t, "op-amp", n.Density, 11*5e-9, 1e-6)
	near(t, "its corner", n.CornerHz, 50, 1e-6)
}

// TestCableInduces: V = 2 pi f M l I, leading by a quarter turn.
func TestCableInduces(t *testing.T) {
	v := Cable{Metres: 100, MutualImbalance: 1e-10}.Induced(Mains{FreqHz: 50, Harmonics: []Line{{Order: 3, RMS: 0.1}}})
	near(t, "induced", v.Harmonics[0].RMS, 2*math.Pi*150*1e-10*100*0.1, 1e-12)
	near(t, "its phase", v.Harmonics[0].Turns, 0.25, 1e-12)
}
