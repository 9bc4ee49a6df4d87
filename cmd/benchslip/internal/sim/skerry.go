package sim

// The demo's bench: the oral-history archive in the lighthouse at Skerry
// Point. Preamp SP-017 comes back from soldering (ticket SK-104); SP-016
// receives the 85 m balanced run from the lamp room to the keeper's cottage.
// Everything here is invented; the circuits are ordinary.

const (
	sourceOhm = 150.0 // test source and termination
	recordHz  = 48000
)

// skerryRecorder is the recorder as it is; the job states 4.92 V within 0.5 %
// channels equal within 0.05 dB
// and 100 dB apart.
func skerryRecorder(seed uint64) Recorder {
	return Recorder{
		RateHz: recordHz, Bits: 24,
		FullScalePeak: 4.92 * 1.0016,
		Match:         []float64{+0.0006, -0.0006}, // 0.010 dB apart
		NoiseDensity:  45e-9,
		LowCutHz:      3,
		PPM:           31, WanderPPM: 0.12, WanderS: 11,
		Seed: seed,
	}
}

// skerryScope is the 8-bit oscilloscope: output DC-coupled, rail AC-coupled.
func skerryScope(seed uint64) Scope {
	return Scope{
		RateHz: 10000, StartS: -0.2, Bits: 8, Divs: 8,
		Inputs: []Probe{
			{Name: "Output", VoltsPerDiv: 5e-3, GainError: 0.011, OffsetError: 0.35e-3, NoiseRMS: 0.12e-3},
			{Name: "Rail", VoltsPerDiv: 2e-3, GainError: -0.008, NoiseRMS: 0.12e-3, LowCutHz: 8},
		},
		Seed: seed,
	}
}

// skerryMains is the lighthouse's supply during one take.
func skerryMains(meanHz, startTurns float64) Mains {
	return Mains{FreqHz: meanHz, DriftHz: 0.011, DriftS: 23, StartTurns: startTurns}
}

// arms are the four resistors of one gain step.
type arms struct{ r1, r2, r3, r4 float64 }

// SP-017. The arms are 0.1 % parts except where a comment says otherwise.
var (
	// In R4 of the 20 dB step a 1 % part sits where a 0.1 % part belongs,
	// 0.82 % high: this is what the demo's failing check finds.
	sp017at20 = arms{1000.3, 10003, 999.9, 10082}
	// At 30 dB 33.2 kohm stand in for 31.6 kohm, a matched pair: common mode
	// is rejected well, but the step lies 0.4 dB high, at the very limit.
	sp017at30 = arms{1000.3, 33160, 999.9, 33154}
	sp017at40 = arms{1000.3, 100040, 999.9, 99970}
)

// SP-016, the receiver in the cottage.
var sp016at40 = arms{999.7, 99980, 1000.2, 100010}

// skerryPreamp builds a unit of the series at one gain step.
func skerryPreamp(a arms, supply Mains) Preamp {
	return Preamp{
		Amp: DiffAmp{
			R1: a.r1, R2: a.r2, R3: a.r3, R4: a.r4,
			C2: 4.7e-12, C4: 4.9e-12,
			GainBandwidthHz: 50e6, OpAmpCMRR: 1e6, // 120 dB
			VoltageNoise: 2.7e-9, CornerHz: 60, CurrentNoise: 0.5e-12,
			Offset: 26e-6,
		},
		Output: OutputStage{BuildOutOhm: 47, LoadOhm: 10e3, K2: 1.6e-5, K3: 5e-6},
		// The supply's stray field, odd harmonics; the rails' ripple, even ones.
		InputHum: supply.With(
			Line{1, 0.130e-6, 0.08, 0.01, 9}, Line{3, 0.046e-6, 0.31, 0.03, 7},
			Line{5, 0.028e-6, 0.77, 0.05, 8}, Line{7, 0.012e-6, 0.12, 0.06, 6},
		),
		Ripple: supply.With(
			Line{2, 3.1e-6, 0.40, 0.01, 9}, Line{4, 1.3e-6, 0.55, 0.02, 9}, Line{6, 0.6e-6, 0.71, 0.03, 9},
		),
	}
}

// generator returns tones as the bench's player puts them out: its own crystal
// is 12 ppm slow.
func generator(rms float64, freqs ...float64) Tones {
	var t Tones
	for i, f := range freqs {
		t = append(t, Tone{FreqHz: f * (1 - 12e-6), RMS: rms, Turns: 0.13 + 0.27*float64(i)})
	}
	return t
}

// skerryCable is the 85 m run: foil shield with a drain wire, grounded at both
// ends as installed.
var skerryCable = Cable{
	Metres: 85, MutualImbalance: 2e-10,
	OhmPerMetre: 0.08, FaradPerMetre: 100e-12, FaradMismatch: 0.03,
}

// shieldCurrent flows along the run's shield between the two earths, A: the
// building's neutral current, rich in multiples of three.
func shieldCurrent(supply Mains) Mains {
	return supply.With(
		Line{1, 45e-3, 0.03, 0.01, 11}, Line{2, 2e-3, 0.60, 0.03, 9}, Line{3, 28e-3, 0.21, 0.03, 8},
		Line{5, 9e-3, 0.48, 0.04, 7}, Line{7, 5e-3, 0.83, 0.05, 9}, Line{9, 6e-3, 0.37, 0.06, 6},
		Line{15, 2e-3, 0.15, 0.08, 7},
	)
}

// mainsVoltage is the supply itself, V.
func mainsVoltage(supply Mains) Mains {
	return supply.With(
		Line{Order: 1, RMS: 231}, Line{Order: 3, RMS: 4.6, Turns: 0.52}, Line{Order: 5, RMS: 6.7, Turns: 0.11},
		Line{Order: 7, RMS: 3.4, Turns: 0.64}, Line{Order: 9, RMS: 1.2, Turns: 0.9}, Line{Order: 11, RMS: 2.5, Turns: 0.27},
	)
}

// mainsWire is the recorder's second channel in the cottage: a metre of
// insulated wire beside a lamp's lead, across 10 kohm.
func mainsWire(supply Mains) Source { return WireBesideLead(4e-12, 10e3, mainsVoltage(supply)) }
