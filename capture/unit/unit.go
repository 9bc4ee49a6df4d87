// Package unit reads, converts and prints the quantities of the bench: volts
// and dBu, hertz, ohms, volts per root hertz.
//
// Inside the program every value is linear and in the SI base unit of its
// dimension (see Dim); prefixes and decibels exist only where people read and
// write. Level references are those of common audio practice:
//
//	dBu   20 lg(U / sqrt(0.6) V)   sqrt(0.6) V = 0.774597 V: 1 mW in 600 ohm
//	dBV   20 lg(U / 1 V)
//	dBm   10 lg(P / 1 mW)
//	dB    20 lg(ratio)             a ratio of amplitudes, x = V/V
//	dBFS  20 lg(RMS / RMS of a full-scale sine)   (AES17 convention)
//
// All voltages are RMS unless a measure says otherwise; a unit never does.
package unit

import "math"

// Dim is a dimension. Its comment names the linear base unit.
type Dim int

const (
	None                  Dim = iota // plain count, unit ""
	Volt                             // V
	Ratio                            // V/V, written x; 1 % is 0.01, 0 dB is 1
	Hertz                            // Hz
	Second                           // s
	Ohm                              // ohm
	Farad                            // F
	Watt                             // W
	Metre                            // m
	Kelvin                           // K
	Degree                           // degree of phase
	Ampere                           // A
	VoltPerMetre                     // V/m
	VoltPerSecond                    // V/s
	VoltPerRootHertz                 // V/rtHz
	FullScale                        // FS: fraction of digital full scale; see FullScaleSine
	FullScalePerRootHertz            // FS/rtHz
	FullScalePerSecond               // FS/s
	dims                             // number of dimensions
)

// FullScaleSine is the RMS, in FS, of a sine whose peak just reaches digital
// full scale: 1/sqrt(2). It is the reference of dBFS, so an RMS taken over
// samples in FS may be given to the unit dBFS as it stands: a full-scale
// sine (0.7071 FS) reads 0 dBFS, a full-scale square wave (1 FS) +3.01 dBFS.
const FullScaleSine = math.Sqrt2 / 2

// RefDBu is 0 dBu in V: the voltage of 1 mW in 600 ohm, sqrt(0.001 W x 600 ohm).
var RefDBu = math.Sqrt(0.6)

var dimNames = [dims]string{"a plain count", "voltage", "ratio", "frequency", "time",
	"resistance", "capacitance", "power", "length", "temperature", "phase", "current",
	"voltage per length", "slew rate", "voltage density", "level against full scale",
	"density against full scale", "slew rate against full scale"}

var dimBase = [dims]string{"", "V", "x", "Hz", "s", "ohm", "F", "W", "m", "K", "deg", "A",
	"V/m", "V/s", "V/rtHz", "FS", "FS/rtHz", "FS/s"}

// String names the dimension in words: "voltage", "frequency".
func (d Dim) String() string {
	if d < 0 || d >= dims {
		return "unknown dimension"
	}
	return dimNames[d]
}

// Base returns the linear SI base unit of the dimension.
func (d Dim) Base() Unit {
	if d < 0 || d >= dims {
		return Unit{}
	}
	return MustLookup(dimBase[d])
}

// Unit is a unit of measurement. Units compare with ==: two spellings of one
// unit give one value. The zero Unit is that of a plain count.
//
// A linear unit has base = (number + offset) * factor * 10^exp10; a
// logarithmic one base = ref * 10^(number / perDecade).
type Unit struct {
	Symbol string // canonical keyboard spelling: "uV", "kohm", "nV/rtHz", "degC"
	Dim    Dim

	exp10     int     // power of ten, prefixes of numerator and denominator together
	factor    float64 // 0 means 1; 60 for min
	offset    float64 // added to the number: 273.15 for degC
	perDecade float64 // 20 or 10 per decade; 0: linear
	ref       float64 // linear value at 0 dB
	bare      bool    // the prefix may be chosen freely when printing
}

// IsLog reports whether the unit is logarithmic (dB, dBu, dBm ...).
func (u Unit) IsLog() bool { return u.perDecade != 0 }

// DB reports whether differences in this unit are dB, that is for dB itself
// and for every level unit (dBu, dBV, dBm, dBFS). It equals IsLog.
func (u Unit) DB() bool { return u.IsLog() }

// ToLinear turns a number in this unit into the linear SI base unit of its
// dimension: dBu and dBV to V, dB to V/V, dBm to W, % and ppm to fractions,
// dBFS to FS (fraction of digital full scale, see FullScaleSine), degC to K.
func (u Unit) ToLinear(number float64) float64 {
	if u.perDecade != 0 {
		return u.ref * math.Pow(10, number/u.perDecade)
	}
	x := number + u.offset
	if u.factor != 0 {
		x *= u.factor
	}
	return shift(x, u.exp10)
}

// FromLinear is the inverse of ToLinear. In a logarithmic unit 0 gives -Inf
// and a negative value NaN; the caller guards against both.
func (u Unit) FromLinear(x float64) float64 {
	if u.perDecade != 0 {
		return u.perDecade * math.Log10(x/u.ref)
	}
	x = shift(x, -u.exp10)
	if u.factor != 0 {
		x /= u.factor
	}
	return x - u.offset
}

// shift multiplies by 10^e. Negative powers divide by the exact positive one,
// so that 39 mV is the float64 nearest to 0.039 V.
func shift(x float64, e int) float64 {
	if e < 0 {
		return x / math.Pow10(-e)
	}
	return x * math.Pow10(e)
}

// Proper returns the symbol with the signs of print: "µV", "kΩ", "nV/√Hz", "°C".
func (u Unit) Proper() string { return proper(u.Symbol) }

// String returns the keyboard spelling.
func (u Unit) String() string { return u.Symbol }

// MismatchError says that a value of one dimension was asked for in a unit of
// another.
type MismatchError struct {
	From Dim
	To   Unit
}

func (e *MismatchError) Error() string {
	to := e.To.Symbol
	if to == "" {
		to = "a plain count"
	}
	s := "a " + e.From.String() + " cannot be given in " + to + " (" + e.To.Dim.String() + ")"
	if e.From == None {
		s = "a plain count cannot be given in " + to + " (" + e.To.Dim.String() + ")"
	}
	if volts(e.From) && fullScale(e.To.Dim) || fullScale(e.From) && volts(e.To.Dim) {
		s += "; volts and full scale are tied only by a gear's full_scale_peak or full_scale_sine"
	}
	return s
}

func volts(d Dim) bool { return d == Volt || d == VoltPerSecond || d == VoltPerRootHertz }

func fullScale(d Dim) bool {
	return d == FullScale || d == FullScalePerSecond || d == FullScalePerRootHertz
}

// Convert gives a linear value of dimension from as a number in unit to.
// Volts and levels against full scale are different dimensions: only a gear's
// calibration ties them. The error is a *MismatchError.
func Convert(linear float64, from Dim, to Unit) (float64, error) {
	if from != to.Dim {
		return math.NaN(), &MismatchError{From: from, To: to}
	}
	return to.FromLinear(linear), nil
}
