package analyze

import "benchslip/capture/unit"

// Wiring says which channels of a take are what. A check's own entries win
// over the take's.
type Wiring struct {
	Out, In, Out2, Driven, Mains string // "1", "CH2", "1-2"; "" not stated (out: "1")
	Span                         *Span
	InLevel                      *unit.Quantity // RMS of the stimulus tone at the unit's input
	InUncertainty                *unit.Quantity
	InFactor                     float64 // 0: not stated (1)
}

// Over returns w with the entries that top states put over it.
func (w Wiring) Over(top Wiring) Wiring {
	put := func(dst *string, s string) {
		if s != "" {
			*dst = s
		}
	}
	put(&w.Out, top.Out)
	put(&w.In, top.In)
	put(&w.Out2, top.Out2)
	put(&w.Driven, top.Driven)
	put(&w.Mains, top.Mains)
	if top.Span != nil {
		w.Span = top.Span
	}
	if top.InLevel != nil {
		w.InLevel = top.InLevel
	}
	if top.InUncertainty != nil {
		w.InUncertainty = top.InUncertainty
	}
	if top.InFactor != 0 {
		w.InFactor = top.InFactor
	}
	return w
}

// Span is a stretch of a take on its own time axis: From <= t < To, s.
// Either end may be open.
type Span struct {
	From, To       float64
	HasFrom, HasTo bool
	Text           string
}

// Band is a frequency range in Hz.
type Band struct{ Low, High float64 }

// Stated is a quantity someone typed with its (optional) expanded uncertainty.
type Stated struct {
	Value       unit.Quantity
	Uncertainty *unit.Quantity // expanded, k = 2; nil: not stated
	Key         string         // the job key, for `unstated`
}

// Params are the keys of a check that a measure may read; zero values and
// nils mean "not stated". Frequencies in Hz, resistances in ohm.
type Params struct {
	Wiring
	At        []float64
	Band      *Band
	Weighting string // "", "none", "A", "C", "468"
	Order     int
	Harmonics int
	Reference string // "", "fundamental", "total"

	Gain        *Stated
	Source      *Stated
	Temperature *float64 // K
	InputR      *float64 // input_resistance
	Plane       string   // "", "terminals", "emf"

	R1, R2, R3, R4 *float64
	SourceMatch    *float64 // fraction

	Load, Series, Length, Resistance, Rails *Stated

	Ref      *float64 // Hz
	Drop     *float64 // dB, positive number
	RefLevel *unit.Quantity
	MaxEach  *unit.Quantity
	THDN     *float64 // fraction

	Tolerance      *float64 // fraction
	InstrumentRise *float64 // s
	Above          *float64 // Hz

	Value       *unit.Quantity // entered
	Uncertainty *unit.Quantity
	With        string
}

// BandOr returns the stated band or lo..hi.
func (p *Params) BandOr(lo, hi float64) Band {
	if p.Band != nil {
		return *p.Band
	}
	return Band{lo, hi}
}
