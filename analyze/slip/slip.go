// Package slip is the result of a run as data: the model that every renderer
// draws and that slip.json holds. Keys may be added; none is renamed.
//
// Value, Uncertainty, Interval, Bound.Value, Min, Max, Typical and Margin of a
// check share its Unit. Nothing in it is NaN or infinite.
package slip

import "benchslip/analyze"

// Slip is one finished run.
type Slip struct {
	Format       int               `json:"format"` // 1
	Sheet        string            `json:"sheet"`  // first 12 hex digits of a hash over job, takes and version
	Verdict      string            `json:"verdict"`
	Tool         Tool              `json:"tool"`
	Job          Job               `json:"job"`
	LimitsSHA256 string            `json:"limits_sha256"`
	Record       map[string]string `json:"record"`
	Unit         map[string]string `json:"unit"`
	Rule         Rule              `json:"rule"`
	Mains        string            `json:"mains"` // as typed, "find" or ""
	Gear         []Gear            `json:"gear"`
	Takes        []Take            `json:"takes"`
	Checks       []Check           `json:"checks"`
	Cautions     []string          `json:"cautions"`
	Files        []File            `json:"files"` // the other files of the slip with their hashes

	// Order of the free keys as typed, for the sheet.
	UnitKeys, RecordKeys []string `json:"-"`
	Title                string   `json:"title"`

	// Redacted names the fields whose texts were withheld; none in most slips.
	Redacted []string `json:"redacted,omitempty"`
}

// Tool names the program.
type Tool struct {
	Name    string `json:"name"`
	Version string `json:"version"`
}

// Job names the job file by base name and hash.
type Job struct {
	File     string   `json:"file"`
	SHA256   string   `json:"sha256"`
	Includes []string `json:"includes,omitempty"`
}

// Rule is the decision rule, fixed before measuring.
type Rule struct {
	Decision string  `json:"decision"` // four-way, guarded, simple
	Coverage float64 `json:"coverage"` // k
}

// Gear is one gear entry in words, for the sheet.
type Gear struct {
	Name       string `json:"name"`
	Kind       string `json:"kind"`
	FullScale  string `json:"full_scale"` // "4.92 V peak", ""
	Coupling   string `json:"coupling"`
	Stated     string `json:"uncertainty"` // as typed, "" not stated
	Calibrated string `json:"calibrated"`
	Notes      string `json:"notes"` // "channels taken as equal" ...
}

// File is one file of the slip beside slip.json.
type File struct {
	Name   string `json:"name"`
	SHA256 string `json:"sha256"`
	Bytes  int64  `json:"bytes"`
}

// Take is one recording. A missing or unreadable one keeps its entry, with
// nulls and its fault.
type Take struct {
	Name        string            `json:"name"`
	File        string            `json:"file"`
	SHA256      *string           `json:"sha256"`
	Bytes       *int64            `json:"bytes"`
	Format      *string           `json:"format"`
	RateHz      *float64          `json:"rate_hz"`
	Channels    *int              `json:"channels"`
	Frames      *int64            `json:"frames"`
	DurationS   *float64          `json:"duration_s"`
	Assumptions []string          `json:"assumptions"`
	Flags       []Flag            `json:"flags"`
	Gear        string            `json:"gear"`
	Where       map[string]string `json:"where"`
	WhereKeys   []string          `json:"-"` // order as typed
	Setup       string            `json:"setup"`
	Note        string            `json:"note"`
	Fault       string            `json:"fault"` // why it could not be read; "" when it could
}

// Flag is a coded warning; Channel nil: the whole take; FromS, ToS nil: no place.
type Flag struct {
	Code    string   `json:"code"`
	Take    string   `json:"take"`
	Channel *int     `json:"channel"`
	Message string   `json:"message"`
	FromS   *float64 `json:"from_s"`
	ToS     *float64 `json:"to_s"`
}

// Role is a take with what it is for.
type Role struct {
	Role string `json:"role"`
	Name string `json:"name"`
}

// Bound is a one-sided statement at 95 %.
type Bound struct {
	Kind       string  `json:"kind"` // "upper", "lower"
	Value      float64 `json:"value"`
	Unit       string  `json:"unit"`
	Confidence float64 `json:"confidence"`
}

// Contributor is one line of the budget, in the check's unit.
type Contributor struct {
	Name                string   `json:"name"`
	StandardUncertainty float64  `json:"standard_uncertainty"`
	Unit                string   `json:"unit"`
	Kind                string   `json:"kind"`
	Dof                 *float64 `json:"dof"`    // null: infinite
	Source              string   `json:"source"` // names an error shared with other values; "" own
}

// Waiver is printed; verdict and exit stay.
type Waiver struct {
	By     string `json:"by"`
	Why    string `json:"why"`
	Ticket string `json:"ticket"`
}

// Check is one judged row.
type Check struct {
	Name         string        `json:"name"`
	Measure      string        `json:"measure"`
	Class        string        `json:"class"`
	Clause       string        `json:"clause"`
	Optional     bool          `json:"optional"`
	Take         *string       `json:"take"`
	Takes        []Role        `json:"takes"`
	Value        *float64      `json:"value"`
	Unit         string        `json:"unit"`
	Uncertainty  *float64      `json:"uncertainty"`
	Interval     *[2]float64   `json:"interval"`
	Coverage     *float64      `json:"coverage"` // k used; null without a value
	Bound        *Bound        `json:"bound"`
	Contributors []Contributor `json:"contributors"`
	Unstated     []string      `json:"unstated"`
	Min          *float64      `json:"min"`
	Max          *float64      `json:"max"`
	Typical      *float64      `json:"typical"`
	LimitUnit    *string       `json:"limit_unit"`
	Margin       *float64      `json:"margin"`
	Probability  *float64      `json:"probability"` // of conformity
	Verdict      string        `json:"verdict"`
	Reason       string        `json:"reason"` // begins with a code
	Advice       string        `json:"advice"`
	Flags        []Flag        `json:"flags"`
	Waiver       *Waiver       `json:"waiver"`
	Opinions     []string      `json:"opinions"`
	Notes        []string      `json:"notes"`
	By           string        `json:"entered_with"` // "entered by hand" rows: with what
	// Conditions of the row in words ("20 Hz .. 20 kHz, A-weighted, span ...").
	Conditions []string       `json:"conditions"`
	Details    map[string]any `json:"details"`

	Figures []analyze.Figure `json:"-"`
}

// Verdicts of checks.
const (
	Pass            = "pass"
	ConditionalPass = "conditional-pass"
	ConditionalFail = "conditional-fail"
	Fail            = "fail"
	NotMeasurable   = "not-measurable"
	NotApplicable   = "not-applicable"
	NotJudged       = "not-judged"
)

// Inconclusive is the slip's verdict when no check fails and one is open.
const Inconclusive = "inconclusive"
