package sim

import (
	"math"
	"math/rand/v2"
)

// Boltzmann is the Boltzmann constant in J/K, exact in the SI since 2019.
const Boltzmann = 1.380649e-23

// RoomK is the temperature of all resistors here unless a circuit says
// otherwise: 290 K, the reference temperature of noise figures.
const RoomK = 290.0

// Thermal is the open-circuit noise density of a resistor, V/rtHz:
// sqrt(4 k T R) (Johnson 1928, Nyquist 1928).
func Thermal(ohm, kelvin float64) float64 { return math.Sqrt(4 * Boltzmann * kelvin * ohm) }

// random returns a generator of its own for each (seed, stream).
func random(seed, stream uint64) *rand.Rand { return rand.New(rand.NewPCG(seed, stream)) }

// Noise is Gaussian noise, white from DC to half the sample rate, with a
// density of Density sqrt(1 + CornerHz/f).
type Noise struct {
	Density  float64 // V/rtHz, one-sided, of the white part
	CornerHz float64 // where the 1/f part equals the white one; 0: none
	Seed     uint64
}

// Add implements Source. White samples have a variance of Density^2 rate/2.
//
// The 1/f part is a sum of independent one-pole noises with poles p spaced by
// a factor r: each has the density c p/(f^2 + p^2), and since the integral of
// p/(f^2 + p^2) over ln p is pi/(2 f), c = Density^2 CornerHz ln r 2/pi gives
// Density^2 CornerHz/f. With r = 4 the ripple is 0.4 % of the 1/f power; poles
// run from 0.25 Hz to a quarter of the rate, so it holds from about 1 Hz to a
// tenth of the rate, beyond which the white part hides it.
func (s Noise) Add(dst []float64, g *Grid) {
	r := random(s.Seed, 0)
	sigma := s.Density * math.Sqrt(g.RateHz/2)
	for i := range dst {
		dst[i] += sigma * r.NormFloat64()
	}
	if s.CornerHz <= 0 {
		return
	}
	const ratio = 4.0
	for k, pole := 1, 0.25; pole < g.RateHz/4; k, pole = k+1, pole*ratio {
		// The integral of c p/(f^2 + p^2) over f from 0 is c pi/2: the
		// variance of this pole's noise, whatever the pole.
		power := s.Density * s.Density * s.CornerHz * math.Log(ratio)
		keep := math.Exp(-2 * math.Pi * pole / g.RateHz)
		push := math.Sqrt(power * (1 - keep*keep))
		// Each pole is pushed by coin tosses, 64 from one draw: behind a pole
		// far below the rate many of them add up to a normal distribution, and
		// the poles near the rate hold little of the power.
		coin := rand.NewPCG(s.Seed, uint64(k))
		x := math.Sqrt(power) * r.NormFloat64() // settled from the start
		var bits uint64
		for i := range dst {
			if i%64 == 0 {
				bits = coin.Uint64()
			}
			dst[i] += x
			x = keep*x + push*float64(int64(bits&1)*2-1)
			bits >>= 1
		}
	}
}

// BandRMS is the noise's RMS between two frequencies:
// Density sqrt(high - low + CornerHz ln(high/low)).
func (s Noise) BandRMS(low, high float64) float64 {
	return s.Density * math.Sqrt(high-low+s.CornerHz*math.Log(high/low))
}

// At is the density at f, V/rtHz.
func (s Noise) At(f float64) float64 { return s.Density * math.Sqrt(1+s.CornerHz/f) }
