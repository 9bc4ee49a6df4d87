package keys

// Groups of measures that share keys.
var (
	tone = []string{"gain", "phase", "polarity", "delay", "tone_frequency", "thd", "harmonic", "thdn", "sinad",
		"modulation_distortion", "difference_distortion"}
	impedances = []string{"output_impedance", "input_impedance"}
	corners    = []string{"corner_low", "corner_high"}
	unitLimits = []string{"max_output", "power", "clip_symmetry"}
	referred   = []string{"ein", "hum", "hum_ratio", "pickup"} // may be referred to the input
)

// measured are the measures that read a recording, oneMain those of them
// with a main take of their own.
var measured, oneMain = func() (all, main []string) {
	for _, m := range measures {
		if m.Roles != nil {
			all = append(all, m.Name)
		}
		if len(m.Roles) == 1 {
			main = append(main, m.Name)
		}
	}
	return all, main
}()

func join(lists ...[]string) []string {
	var out []string
	for _, l := range lists {
		out = append(out, l...)
	}
	return out
}

const either = Gear | Channel

// table in the order of the documentation.
var table = []Key{
	{Name: "format", In: Job, Kind: Integer, Least: 1, Most: 1, Default: "1", Doc: "version of the job file's form"},
	{Name: "title", In: Job, Kind: Text, Doc: "title of the slip"},
	{Name: "include", In: Job, Kind: Paths, Doc: "files with more gear, takes or checks"},

	{Name: "decision", In: Rule, Kind: Word, Words: []string{"four-way", "guarded", "simple"}, Default: "four-way", Doc: "decision rule, fixed before measuring"},
	{Name: "coverage", In: Rule, Kind: Number, Sign: Above0, Default: "2", Doc: "k of the expanded uncertainty"},

	{Name: "frequency", In: Mains, Kind: Quantity, Dims: hertz, Unit: "Hz", Sign: Positive, Words: []string{"find"}, Default: "find", Doc: "nominal mains frequency, or \"find\""},

	{Name: "date", In: Record, Kind: Date, Doc: "date of the record"},
	{Name: "measured", In: Record, Kind: Text, Doc: "when or where it was measured"},
	{Name: "operator", In: Record, Kind: Text, Doc: "who measured"},
	{Name: "attempt", In: Record, Kind: Text, Doc: "number of this attempt"},
	{Name: "replaces", In: Record, Kind: Text, Doc: "sheet that this one replaces"},
	{Name: "spec", In: Record, Kind: Text, Doc: "edition of the specification judged against"},
	{Name: "approved", In: Record, Kind: Text, Doc: "who approved it"},

	{Name: "kind", In: either, Kind: Word, Words: []string{"audio", "scope"}, Doc: "audio: samples are fractions of full scale; scope: volts"},
	{Name: "full_scale_peak", In: either, Kind: Quantity, Dims: volt, Unit: "V", Linear: true, Sign: Positive, Doc: "volts at digital full scale"},
	{Name: "full_scale_sine", In: either, Kind: Quantity, Dims: volt, Unit: "dBu", Sign: Positive, Doc: "RMS of a sine that just reaches full scale"},
	{Name: "probe", In: either, Kind: Number, Sign: Above0, Default: "1", Doc: "extra factor on a scope file's volts"},
	{Name: "coupling", In: either, Kind: Word, Words: []string{"ac", "dc"}, Default: "ac for audio, dc for scope", Doc: "ac: DC is not measurable"},
	{Name: "uncertainty", In: either, Kind: Uncertainty, Of: "full_scale_peak", Unit: "%", Doc: "of the volts, expanded (k = 2)"},
	{Name: "offset_uncertainty", In: either, Kind: Quantity, Dims: volt, Unit: "mV", Linear: true, Sign: NotNegative, Default: "0 V", Doc: "of the zero, expanded (k = 2); enters DC only"},
	{Name: "calibrated", In: either, Kind: Date, Doc: "date of the calibration"},
	{Name: "clock", In: Gear, Kind: Quantity, Dims: ratio, Unit: "ppm", Linear: true, Sign: NotNegative, Default: "100 ppm", Doc: "relative uncertainty of the sample clock, expanded (k = 2)"},
	{Name: "channel_match", In: Gear, Kind: Quantity, Dims: ratio, Unit: "dB", Sign: NotNegative, Default: "0 dB", Doc: "possible difference between channels, expanded (k = 2)"},
	{Name: "separation", In: Gear, Kind: Quantity, Dims: ratio, Unit: "dB", Sign: Above0, Doc: "channel separation, a positive dB"},
	{Name: "skew", In: Gear, Kind: Quantity, Dims: seconds, Unit: "ns", Sign: NotNegative, Default: "0 s", Doc: "possible delay between channels, expanded (k = 2)"},
	{Name: "rate", In: Gear, Kind: Quantity, Dims: hertz, Unit: "Hz", Sign: Positive, Doc: "sample rate the calibration holds for"},
	{Name: "mode", In: Gear, Kind: Text, Doc: "input mode the calibration holds for"},

	{Name: "file", In: Take, Kind: Path, Doc: "the recording, relative to the job file"},
	{Name: "gear", In: Take, Kind: GearRef, Doc: "what recorded it"},
	{Name: "note", In: Take, Kind: Text, Doc: "free text, printed"},
	{Name: "setup", In: Take, Kind: Word, Words: []string{"baseline", "end-150", "end-short", "pin1-joined", "shield-open", "loads-on"}, Doc: "what a cable run was connected to"},
	{Name: "out", In: Take | Check, Kind: Channels, Default: "1", Doc: "channel of the unit's output", Measures: measured},
	{Name: "in", In: Take | Check, Kind: Channels, Doc: "channel of the stimulus at the unit's input", Measures: measured},
	{Name: "out2", In: Take | Check, Kind: Channels, Doc: "channel to compare with", Measures: []string{"balance"}},
	{Name: "driven", In: Take | Check, Kind: Channels, Doc: "channel that is driven", Measures: []string{"crosstalk"}},
	{Name: "mains", In: Take | Check, Kind: Channels, Doc: "channel of the mains phase reference", Measures: []string{"hum", "pickup"}},
	{Name: "span", In: Take | Check, Kind: Range, Dims: seconds, Unit: "s", Open: true, Default: "the whole take", Doc: "stretch of the take to use", Measures: measured},
	{Name: "in_level", In: Take | Check, Kind: Quantity, Dims: volt, Unit: "V", Sign: Positive, Doc: "RMS of the tone at the unit's input, where it was not recorded", Measures: measured},
	{Name: "in_uncertainty", In: Take | Check, Kind: Uncertainty, Of: "in_level", Unit: "%", Doc: "of in_level, expanded (k = 2)", Measures: measured},
	{Name: "in_factor", In: Take | Check, Kind: Number, Sign: Above0, Default: "1", Doc: "factor from the recorded input to that between the terminals", Measures: measured},
	{Name: "stimulus", In: Take, Kind: Text, Default: "recognised", Doc: "WAV file that was played, or its description"},
	{Name: "where", In: Take | Check, Kind: Table, Doc: "conditions of a take; a check's must equal them"},
	{Name: "csv", In: Take, Kind: Table, Doc: "how to read a CSV file that leaves it open"},

	{Name: "separator", In: CSV, Kind: Word, Words: []string{",", ";", "tab", "blank"}, Default: "found", Doc: "between columns"},
	{Name: "decimal", In: CSV, Kind: Word, Words: []string{".", ","}, Default: "found", Doc: "decimal mark"},
	{Name: "skip", In: CSV, Kind: Integer, Default: "found", Doc: "rows to skip at the top"},
	{Name: "time_column", In: CSV, Kind: Channels, Words: []string{"none"}, Default: "found", Doc: "header or number of the time column, or \"none\""},
	{Name: "time_unit", In: CSV, Kind: Word, Words: []string{"s", "ms", "us", "ns"}, Default: "found", Doc: "unit of the time column"},
	{Name: "rate", In: CSV, Kind: Quantity, Dims: hertz, Unit: "Hz", Sign: Positive, Default: "found", Doc: "sample rate to use"},
	{Name: "value_unit", In: CSV, Kind: Word, Words: []string{"V", "mV", "uV"}, Default: "found", Doc: "unit of the values"},
	{Name: "resample", In: CSV, Kind: Bool, Default: "false", Doc: "put samples taken at uneven times on an even grid (straight between them)"},

	{Name: "name", In: Check, Kind: Text, Doc: "name of the row"},
	{Name: "measure", In: Check, Kind: Word, Doc: "what is measured"},
	{Name: "class", In: Check, Kind: Word, Words: []string{"critical", "major", "minor", "info"}, Default: "major", Doc: "weight of the row; info is never judged"},
	{Name: "clause", In: Check, Kind: Text, Doc: "line of the specification"},
	{Name: "optional", In: Check, Kind: Bool, Default: "false", Doc: "a missing take or other conditions do not leave the slip open"},
	{Name: "take", In: Check, Kind: TakeOrList, Doc: "the take it reads", Measures: oneMain},
	{Name: "each", In: Check, Kind: TakeRefs, Doc: "takes: one row each", Measures: oneMain},
	{Name: "repeat", In: Check, Kind: TakeRefs, Doc: "takes of the same thing: their mean", Measures: oneMain},
	{Name: "against", In: Check, Kind: TakeRef, Doc: "relative to the same measure of this take", Measures: oneMain},
	{Name: "min", In: Check, Kind: Limit, Doc: "lower limit"},
	{Name: "max", In: Check, Kind: Limit, Doc: "upper limit"},
	{Name: "nominal", In: Check, Kind: Limit, Doc: "centre of the limits, with within"},
	{Name: "within", In: Check, Kind: Limit, Doc: "half width of the limits about nominal: dB, % of it, or its unit"},
	{Name: "typical", In: Check, Kind: Limit, Doc: "printed, never judged"},
	{Name: "limits_from", In: Check, Kind: Path, Doc: "slip.json whose value of the same name is the nominal"},
	{Name: "waiver", In: Check, Kind: Table, Doc: "by, why, ticket: printed; the verdict stays"},
	{Name: "by", In: Waiver, Kind: Text, Doc: "who waives"},
	{Name: "why", In: Waiver, Kind: Text, Doc: "for what reason"},
	{Name: "ticket", In: Waiver, Kind: Text, Doc: "where it is written down"},

	{Name: "at", In: Check, Kind: Quantities, Dims: hertz, Unit: "Hz", Sign: Positive, Default: "found", Doc: "frequency (cmrr: or a list)",
		Measures: join(tone, []string{"cmrr", "response", "noise_density", "ein", "crosstalk", "balance", "snr"}, impedances, unitLimits)},
	{Name: "band", In: Check, Kind: Range, Dims: hertz, Unit: "Hz", Sign: Positive, Default: "20 Hz .. 20 kHz", Doc: "frequencies that count",
		Measures: []string{"level", "thd", "thdn", "sinad", "noise", "ein", "snr", "hum_ratio", "flatness", "max_output", "power"}},
	{Name: "weighting", In: Check, Kind: Word, Words: []string{"none", "A", "C", "468"}, Default: "none", Doc: "frequency weighting of the noise",
		Measures: []string{"noise", "ein", "snr", "hum", "hum_ratio"}},
	{Name: "order", In: Check, Kind: Integer, Least: 1, Most: 100, Doc: "order of the harmonic or product",
		Measures: []string{"harmonic", "hum", "modulation_distortion", "difference_distortion"}},
	{Name: "harmonics", In: Check, Kind: Integer, Least: 1, Most: 100, Default: "10 for thd, 20 for hum", Doc: "highest order that counts",
		Measures: []string{"thd", "hum", "hum_ratio", "pickup"}},
	{Name: "reference", In: Check, Kind: Word, Words: []string{"fundamental", "total"}, Default: "fundamental", Doc: "what distortion is related to", Measures: []string{"thd"}},
	{Name: "gain", In: Check, Kind: Quantity, Dims: ratio, Unit: "dB", Sign: Positive, Doc: "gain from the input to the recording", Measures: referred},
	{Name: "gain_take", In: Check, Kind: TakeRef, Doc: "take that the gain is measured from", Measures: referred},
	{Name: "gain_uncertainty", In: Check, Kind: Uncertainty, Of: "gain", Unit: "dB", Doc: "of gain, expanded (k = 2)", Measures: referred},
	{Name: "source", In: Check, Kind: Quantity, Dims: ohms, Unit: "ohm", Sign: NotNegative, Doc: "source resistance", Measures: []string{"ein", "input_impedance", "cmrr"}},
	{Name: "temperature", In: Check, Kind: Quantity, Dims: kelvins, Unit: "degC", Sign: Positive, Default: "290 K", Doc: "of the source resistance", Measures: []string{"ein", "input_impedance"}},
	{Name: "input_resistance", In: Check, Kind: Quantity, Dims: ohms, Unit: "ohm", Sign: Positive, Doc: "of the unit, for noise referred to the source's EMF", Measures: []string{"ein", "input_impedance"}},
	{Name: "plane", In: Check, Kind: Word, Words: []string{"terminals", "emf"}, Default: "terminals", Doc: "where the gain was taken from", Measures: []string{"ein", "input_impedance"}},
	{Name: "r1", In: Check, Kind: Quantity, Dims: ohms, Unit: "ohm", Sign: Positive, Doc: "resistor of the difference stage", Measures: []string{"cmrr"}},
	{Name: "r2", In: Check, Kind: Quantity, Dims: ohms, Unit: "ohm", Sign: Positive, Doc: "resistor of the difference stage", Measures: []string{"cmrr"}},
	{Name: "r3", In: Check, Kind: Quantity, Dims: ohms, Unit: "ohm", Sign: Positive, Doc: "resistor of the difference stage", Measures: []string{"cmrr"}},
	{Name: "r4", In: Check, Kind: Quantity, Dims: ohms, Unit: "ohm", Sign: Positive, Doc: "resistor of the difference stage", Measures: []string{"cmrr"}},
	{Name: "source_match", In: Check, Kind: Quantity, Dims: ratio, Unit: "%", Linear: true, Sign: NotNegative, Doc: "match of the two source resistors", Measures: []string{"cmrr"}},
	{Name: "floor", In: Check, Kind: TakeRef, Doc: "take with the recorder's input terminated: its power is taken off",
		Measures: []string{"level", "noise", "ein", "snr", "thdn", "sinad", "hum"}},
	{Name: "loop", In: Check, Kind: TakeRef, Doc: "take of the recorder's output straight into its input", Measures: []string{"thd", "harmonic", "thdn", "sinad"}},
	{Name: "baseline", In: Check, Kind: TakeRef, Doc: "take with the run terminated at the receiver", Measures: []string{"hum", "pickup"}},
	{Name: "differential", In: Check, Kind: TakeRef, Doc: "take driven between pins 2 and 3", Measures: []string{"cmrr"}},
	{Name: "common", In: Check, Kind: TakeRef, Doc: "take with both pins driven together", Measures: []string{"cmrr"}},
	{Name: "open", In: Check, Kind: TakeRef, Doc: "take without the load", Measures: []string{"output_impedance"}},
	{Name: "loaded", In: Check, Kind: TakeRef, Doc: "take with the load", Measures: []string{"output_impedance"}},
	{Name: "direct", In: Check, Kind: TakeRef, Doc: "take without the series resistor", Measures: []string{"input_impedance"}},
	{Name: "series_take", In: Check, Kind: TakeRef, Doc: "take with the series resistor", Measures: []string{"input_impedance"}},
	{Name: "in_take", In: Check, Kind: TakeRef, Doc: "take of the stimulus, where it was recorded apart", Measures: []string{"gain"}},
	{Name: "load", In: Check, Kind: Quantity, Dims: ohms, Unit: "ohm", Sign: Positive, Doc: "load resistance, at that power", Measures: join([]string{"power", "max_output"}, impedances)},
	{Name: "load_uncertainty", In: Check, Kind: Uncertainty, Of: "load", Unit: "%", Doc: "of load, expanded (k = 2)", Measures: join([]string{"power", "max_output"}, impedances)},
	{Name: "series", In: Check, Kind: Quantity, Dims: ohms, Unit: "ohm", Sign: Positive, Doc: "series resistance", Measures: []string{"input_impedance"}},
	{Name: "series_uncertainty", In: Check, Kind: Uncertainty, Of: "series", Unit: "%", Doc: "of series, expanded (k = 2)", Measures: []string{"input_impedance"}},
	{Name: "length", In: Check, Kind: Quantity, Dims: metres, Unit: "m", Sign: Positive, Doc: "length of the cable run", Measures: []string{"pickup"}},
	{Name: "length_uncertainty", In: Check, Kind: Uncertainty, Of: "length", Unit: "%", Doc: "of length, expanded (k = 2)", Measures: []string{"pickup"}},
	{Name: "resistance", In: Check, Kind: Quantity, Dims: ohms, Unit: "ohm", Sign: Positive, Doc: "resistance that sets the corner, for advice on the capacitor", Measures: corners},
	{Name: "resistance_uncertainty", In: Check, Kind: Uncertainty, Of: "resistance", Unit: "%", Doc: "of resistance, expanded (k = 2)", Measures: corners},
	{Name: "rails", In: Check, Kind: Quantity, Dims: volt, Unit: "V", Linear: true, Sign: Positive, Doc: "supply of the output stage, each side", Measures: join(unitLimits, []string{"level", "peak", "gain"})},
	{Name: "rails_uncertainty", In: Check, Kind: Uncertainty, Of: "rails", Unit: "%", Doc: "of rails, expanded (k = 2)", Measures: join(unitLimits, []string{"level", "peak", "gain"})},
	{Name: "ref", In: Check, Kind: Quantity, Dims: hertz, Unit: "Hz", Sign: Positive, Default: "1 kHz", Doc: "frequency the response is related to", Measures: join([]string{"response", "flatness"}, corners)},
	{Name: "drop", In: Check, Kind: Quantity, Dims: ratio, Unit: "dB", Sign: Above0, Default: "3.00 dB", Doc: "fall that makes the corner", Measures: corners},
	{Name: "ref_level", In: Check, Kind: Quantity, Dims: volts, Unit: "dBu", Sign: Positive, Doc: "nominal level the result is related to", Measures: []string{"snr", "hum", "pickup"}},
	{Name: "max_each", In: Check, Kind: Quantity, Dims: volts, Unit: "dBu", Sign: Positive, Doc: "level that no single harmonic may exceed", Measures: []string{"hum"}},
	{Name: "thdn", In: Check, Kind: Quantity, Dims: ratio, Unit: "%", Sign: Positive, Default: "1 %", Doc: "THD+N that marks the limit", Measures: []string{"max_output", "power"}},
	{Name: "tolerance", In: Check, Kind: Quantity, Dims: ratio, Unit: "%", Linear: true, Sign: Positive, Default: "2 %", Doc: "band about the final value, of the step", Measures: []string{"settling_time", "droop", "thump", "overshoot"}},
	{Name: "instrument_rise", In: Check, Kind: Quantity, Dims: seconds, Unit: "ns", Sign: NotNegative, Default: "0 s", Doc: "rise time of the instrument, taken off in squares", Measures: []string{"rise_time", "fall_time", "slew_rate"}},
	{Name: "above", In: Check, Kind: Quantity, Dims: hertz, Unit: "Hz", Sign: Positive, Default: "20 kHz", Doc: "oscillation is looked for above this", Measures: []string{"oscillation"}},
	{Name: "value", In: Check, Kind: Quantity, Doc: "reading taken by hand", Measures: []string{"entered"}},
	{Name: "uncertainty", In: Check, Kind: Uncertainty, Of: "value", Doc: "of the reading, expanded (k = 2)", Measures: []string{"entered"}},
	{Name: "with", In: Check, Kind: Text, Doc: "what it was read with", Measures: []string{"entered"}},
}
