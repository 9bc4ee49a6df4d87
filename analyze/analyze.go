// Package analyze is the contract of the analysis rooms: what a measure is
// given, what it gives back, and how a number carries its doubt.
//
// A measure is a value (Measure) with one pure function. It opens no file,
// prints nothing and reads no clock: everything arrives through the Pass.
// Inside, all values are linear and in SI base units (V, V/V, Hz, s ...); dB
// and prefixes appear only at the edges, in job limits and on the slip.
package analyze

import (
	"benchslip/capture/recording"
	"benchslip/capture/unit"
)

// Measure is one thing that can be measured, under its trade name.
type Measure struct {
	Name     string   // as in job files: "gain", "thdn"
	Title    string   // one line: what it is
	Doc      string   // definition in words, with band, detector, conditions
	Formula  string   // the definition as a formula, plain text
	Standard string   // standard and clause, or "common practice"
	Unit     string   // own unit of the result: "dB", "%", "V"
	Roles    []string // takes it reads, first the main one: "take", or "differential", "common"
	Keys     []string // check keys it takes beside those that all take
	Run      func(*Pass) Result
}

// Result is what a measure gives back. Exactly one of Value and Refusal is
// set; Bound may stand beside a Refusal.
type Result struct {
	Value   *float64 // linear, SI base unit of Unit's dimension
	Unit    unit.Unit
	Refusal *Refusal
	Bound   *Bound

	// Budget holds one standard uncertainty a source, in the linear unit of
	// Value (sensitivities already applied).
	Budget   []Contributor
	Interval *[2]float64 // linear; only where the estimator itself gives a range
	Unstated []string    // job keys whose uncertainty was not stated and is left out
	// Lacking names job keys of uncertainties that the value needs and nobody
	// stated: flag uncertainty-unstated, at best conditional-pass.
	Lacking []string

	// Conditional says why the row is at best conditional-pass; "" for no reason.
	Conditional string

	// FullScaleSine is the RMS in V of a sine that just reaches digital full
	// scale, for limits in dBFS; 0 where there is none.
	FullScaleSine float64

	Points   []Point // results of one row at several frequencies, each judged
	Flags    []recording.Flag
	Details  map[string]any // keys in product terms; finite numbers only
	Figures  []Figure
	Opinions []string // diagnoses: "consistent with ...; to confirm, ..."
	Notes    []string // conditions to print with the value
}

// Point is one of several results of a row.
type Point struct {
	Label   string // "1 kHz"
	Value   *float64
	Budget  []Contributor
	Bound   *Bound
	Refusal *Refusal
	// Limit is an upper limit of the point's own, beside those of the row; nil:
	// the point is judged by the row's.
	Limit *unit.Quantity
}

// Refusal says why there is no value, with evidence, and the cheapest way out.
type Refusal struct {
	Code   string // one of the reason codes below
	Text   string // what, where, how much
	Advice string // what to do: "record 8 s or more"
}

// Reason codes.
const (
	NoSignal        = "no-signal"
	NoTone          = "no-tone"
	AmbiguousTone   = "ambiguous-tone"
	Clipped         = "clipped"
	TooShort        = "too-short"
	ACCoupled       = "ac-coupled"
	Uncalibrated    = "uncalibrated"
	FloorLimited    = "floor-limited"
	BelowDetection  = "below-detection"
	Impossible      = "impossible"
	MissingTake     = "missing-take"
	Unreadable      = "unreadable"
	Unsupported     = "unsupported"
	NotEnoughPoints = "not-enough-points"
	Bandwidth       = "bandwidth"
	UnfitTake       = "unfit-take"
)

// NotApplicable is no reason code of the contract's list: a Refusal with this
// code makes the row not-applicable (conditions of the takes differ).
const NotApplicable = "not-applicable"

// Bound is what can be said when a value cannot, at 95 %.
type Bound struct {
	Upper bool    // true: the quantity lies below Value; false: above
	Value float64 // linear, same unit as the result's value
}

// Contributor is one line of an uncertainty budget.
type Contributor struct {
	Name string  // in words: "calibration of box"
	Kind string  // "A" (statistics of this take) or "B" (everything else)
	U    float64 // standard uncertainty, linear unit of the value, >= 0
	Dof  float64 // degrees of freedom; 0: infinite
	// Source names an error that several values share ("gear box scale"), so
	// that differences can let it cancel; "" for one's own. Sign is the sign
	// of the sensitivity (+1 when 0).
	Source string
	Sign   int
}

// Refuse is a Result without a value.
func Refuse(u unit.Unit, code, text, advice string) Result {
	return Result{Unit: u, Refusal: &Refusal{Code: code, Text: text, Advice: advice}}
}

// RefuseWith is a Result that passes a Refusal on.
func RefuseWith(u unit.Unit, r *Refusal) Result { return Result{Unit: u, Refusal: r} }
