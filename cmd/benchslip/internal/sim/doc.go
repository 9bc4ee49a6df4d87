// Package sim makes recordings whose truth is known: voltages from circuit
// models, taken by a model of a recorder or of an oscilloscope, written as the
// files that such instruments write. The demo is made of it, and tests take it
// as a signal source.
//
//	rec := sim.Recorder{RateHz: 48000, Bits: 24, FullScalePeak: 4.92, PPM: 38, NoiseDensity: 50e-9, Seed: 1}
//	err := rec.Record("tone.wav", 5, sim.Tone{FreqHz: 1042, RMS: 1}, sim.Noise{Density: 6e-7, Seed: 2})
//
// All quantities are in SI base units: volts, ohms, farads, seconds, hertz, and
// noise densities in V/rtHz or A/rtHz, one-sided. Levels are RMS unless a name
// says Peak. Phases are in turns (1 = 360 degrees), a cosine at time 0 being
// phase 0. A relative frequency error of 1e-6 is 1 ppm.
//
// The same values and seeds give the same samples.
package sim
