package keys

import "benchslip/capture/unit"

// Shorthands for dimensions. A level may also be limited against digital full
// scale: it is then judged without a calibration.
var (
	count         = []unit.Dim{unit.None}
	volt          = []unit.Dim{unit.Volt}
	volts         = []unit.Dim{unit.Volt, unit.FullScale}
	ratio         = []unit.Dim{unit.Ratio}
	seconds       = []unit.Dim{unit.Second}
	hertz         = []unit.Dim{unit.Hertz}
	ohms          = []unit.Dim{unit.Ohm}
	watts         = []unit.Dim{unit.Watt}
	metres        = []unit.Dim{unit.Metre}
	kelvins       = []unit.Dim{unit.Kelvin}
	degrees       = []unit.Dim{unit.Degree}
	voltsPerMetre = []unit.Dim{unit.VoltPerMetre}
	densities     = []unit.Dim{unit.VoltPerRootHertz, unit.FullScalePerRootHertz}
	slopes        = []unit.Dim{unit.VoltPerSecond, unit.FullScalePerSecond}
)

var oneTake = []string{"take"}

var measures = []Measure{
	// level
	{Name: "dc", Unit: "V", Dims: volts, Signed: true, Plain: true, Roles: oneTake},
	{Name: "level", Unit: "V", Dims: volts, Roles: oneTake},
	{Name: "peak", Unit: "V", Dims: volts, Peak: true, Roles: oneTake},
	{Name: "crest", Unit: "x", Dims: ratio, Roles: oneTake},
	{Name: "mains_frequency", Unit: "Hz", Dims: hertz, Plain: true, Roles: oneTake},
	{Name: "entered", Unit: "", Plain: true, Needs: []Need{{"value"}}},

	// tone
	{Name: "gain", Unit: "dB", Dims: ratio, Roles: oneTake, Needs: []Need{{"in", "in_level", "in_take"}}},
	{Name: "phase", Unit: "deg", Dims: degrees, Plain: true, Roles: oneTake, Needs: []Need{{"in"}}},
	{Name: "polarity", Unit: "", Dims: count, Plain: true, Roles: oneTake, Needs: []Need{{"in", "stimulus"}}},
	{Name: "delay", Unit: "s", Dims: seconds, Plain: true, Roles: oneTake, Needs: []Need{{"in", "stimulus"}}},
	{Name: "tone_frequency", Unit: "Hz", Dims: hertz, Plain: true, Roles: oneTake},
	{Name: "thd", Unit: "%", Dims: ratio, Roles: oneTake},
	{Name: "harmonic", Unit: "dB", Dims: ratio, Roles: oneTake, Needs: []Need{{"order"}}},
	{Name: "thdn", Unit: "%", Dims: ratio, Roles: oneTake},
	{Name: "sinad", Unit: "dB", Dims: ratio, Roles: oneTake},
	{Name: "modulation_distortion", Unit: "%", Dims: ratio, Roles: oneTake},
	{Name: "difference_distortion", Unit: "%", Dims: ratio, Roles: oneTake, Needs: []Need{{"order"}}},

	// noise
	{Name: "noise", Unit: "V", Dims: volts, Roles: oneTake},
	{Name: "noise_density", Unit: "V/rtHz", Dims: densities, Roles: oneTake, Needs: []Need{{"at"}}},
	{Name: "ein", Unit: "dBu", Dims: volt, Roles: oneTake, Needs: []Need{{"gain", "gain_take"}}},
	{Name: "snr", Unit: "dB", Dims: ratio, Roles: oneTake},

	// hum
	{Name: "hum", Unit: "V", Dims: volts, Roles: oneTake},
	{Name: "hum_ratio", Unit: "dB", Dims: ratio, Roles: oneTake},
	{Name: "pickup", Unit: "V/m", Dims: voltsPerMetre, Roles: oneTake, Needs: []Need{{"length"}}},

	// common mode
	{Name: "cmrr", Unit: "dB", Dims: ratio, Roles: []string{"differential", "common"}, Needs: []Need{{"in", "in_level"}}},

	// response
	{Name: "response", Unit: "dB", Dims: ratio, Roles: oneTake, Needs: []Need{{"at"}}},
	{Name: "flatness", Unit: "dB", Dims: ratio, Roles: oneTake},
	{Name: "corner_low", Unit: "Hz", Dims: hertz, Plain: true, Roles: oneTake},
	{Name: "corner_high", Unit: "Hz", Dims: hertz, Plain: true, Roles: oneTake},

	// channels
	{Name: "crosstalk", Unit: "dB", Dims: ratio, Roles: oneTake, Needs: []Need{{"driven"}}},
	{Name: "balance", Unit: "dB", Dims: ratio, Roles: oneTake, Needs: []Need{{"out2"}}},

	// impedance
	{Name: "output_impedance", Unit: "ohm", Dims: ohms, Plain: true, Roles: []string{"open", "loaded"}, Needs: []Need{{"load"}}},
	{Name: "input_impedance", Unit: "ohm", Dims: ohms, Plain: true, Roles: []string{"direct", "series_take"}, Needs: []Need{{"series"}}},

	// limits of the unit
	{Name: "max_output", Unit: "V", Dims: volts, List: true, Roles: oneTake},
	{Name: "power", Unit: "W", Dims: watts, List: true, Roles: oneTake, Needs: []Need{{"load"}}},
	{Name: "clip_symmetry", Unit: "%", Dims: ratio, Signed: true, Roles: oneTake},

	// one-shot
	{Name: "rise_time", Unit: "s", Dims: seconds, Plain: true, Roles: oneTake},
	{Name: "fall_time", Unit: "s", Dims: seconds, Plain: true, Roles: oneTake},
	{Name: "settling_time", Unit: "s", Dims: seconds, Plain: true, Roles: oneTake},
	{Name: "overshoot", Unit: "%", Dims: ratio, Signed: true, Roles: oneTake},
	{Name: "droop", Unit: "%", Dims: ratio, Signed: true, Roles: oneTake},
	{Name: "slew_rate", Unit: "V/s", Dims: slopes, Roles: oneTake},
	{Name: "ripple", Unit: "V", Dims: volts, Peak: true, Roles: oneTake},
	{Name: "thump", Unit: "V", Dims: volts, Peak: true, Roles: oneTake},
	{Name: "oscillation", Unit: "V", Dims: volts, Roles: oneTake},

	// events
	{Name: "events", Unit: "", Dims: count, Plain: true, Roles: oneTake},
}
