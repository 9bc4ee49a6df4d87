// Package keys is the one table of what a job file may say: every key with
// its place, kind, unit and default, every measure with its roles, and which
// key belongs to which measure. The job reader, the command line and the
// documentation all take it from here.
package keys

import (
	"slices"

	"benchslip/capture/unit"
)

// Place is where a key may stand; places combine with |.
type Place uint16

const (
	Job     Place = 1 << iota // top of the job file
	Rule                      // [rule]
	Mains                     // [mains]
	Record                    // [record]
	Gear                      // [gear.NAME]
	Channel                   // [gear.NAME.channel.N]
	Take                      // [takes.NAME]
	CSV                       // [takes.NAME.csv]
	Check                     // [[checks]]
	Waiver                    // waiver of a check
)

// Kind is the form of a key's value.
type Kind int

const (
	Text        Kind = iota // free text
	Word                    // one of Words
	Integer                 // whole number without quotes
	Number                  // number without quotes
	Bool                    // true or false
	Date                    // 2026-12-01
	Quantity                // number with unit in quotes, of one of Dims
	Quantities              // one Quantity or a list
	Uncertainty             // expanded (k = 2): %, dB, or a unit of the key it belongs to; or "unknown"
	Range                   // "20 Hz .. 20 kHz"; see Open
	Channels                // channel number from 1, CSV column name, or difference "1-2"
	Path                    // file, with /, inside the job's folder
	Paths                   // list of files
	GearRef                 // name of a gear entry
	TakeRef                 // name of a take
	TakeRefs                // list of takes
	TakeOrList              // name of a take, or a list where the measure reads several
	Table                   // table of free keys
	Limit                   // quantity in a unit of the measure; with `each` also a table by take
)

// Sign says which numbers a key takes.
type Sign int

const (
	Any         Sign = iota
	Positive         // linear value above 0
	NotNegative      // number as written not below 0, also in dB
	Above0           // number as written above 0, also in dB
)

// Key is one key of the job file.
type Key struct {
	Name     string
	In       Place
	Kind     Kind
	Dims     []unit.Dim // Quantity, Quantities, Range: dimensions taken; nil: any
	Unit     string     // unit to suggest where someone wrote a bare number
	Linear   bool       // decibel units are not taken
	Open     bool       // Range: one end may be left out
	Words    []string   // Word
	Sign     Sign
	Least    int      // Integer: smallest; Most 0: no upper end
	Most     int      // Integer: largest
	Of       string   // Uncertainty: the key it belongs to
	Default  string   // what holds when it is not stated, in words; "" nothing
	Doc      string   // one line
	Measures []string // Check keys: the measures that take it; nil: all
}

// Takes reports whether a check of the measure may state the key.
func (k Key) Takes(measure string) bool {
	return k.In&Check != 0 && (k.Measures == nil || slices.Contains(k.Measures, measure))
}

// Find returns the key of that name at a place.
func Find(name string, in Place) (Key, bool) {
	for _, i := range byName[name] {
		if table[i].In&in != 0 {
			return table[i], true
		}
	}
	return Key{}, false
}

// byName finds the entries of a name; a name may mean one thing for gear and
// another for a check.
var byName = func() map[string][]int {
	m := map[string][]int{}
	for i := range table {
		m[table[i].Name] = append(m[table[i].Name], i)
	}
	return m
}()

// At lists the keys of a place (or of several, combined) in the order of the
// documentation.
func At(in Place) []Key {
	var out []Key
	for _, k := range table {
		if k.In&in != 0 {
			out = append(out, k)
		}
	}
	return out
}

// Names lists the names of At.
func Names(in Place) []string {
	var out []string
	for _, k := range At(in) {
		out = append(out, k.Name)
	}
	return out
}

// For lists the keys that a check of the measure may state, those that every
// measure takes among them.
func For(measure string) []Key {
	var out []Key
	for _, k := range At(Check) {
		if k.Takes(measure) {
			out = append(out, k)
		}
	}
	return out
}

// Own lists the names of the keys that a measure takes beside those that all
// measures of a recording take.
func Own(measure string) []string {
	var out []string
	for _, k := range For(measure) {
		// oneMain is all but three measures; no group of its own is as large.
		if k.Measures != nil && len(k.Measures) < len(oneMain) {
			out = append(out, k.Name)
		}
	}
	return out
}

// Measure is what the job file needs to know of a measure.
type Measure struct {
	Name   string
	Unit   string     // the result's own unit: limits without better knowledge are suggested in it
	Dims   []unit.Dim // dimensions a limit may have; nil: any (entered)
	Signed bool       // the result may be negative or zero: limits in decibels make no sense
	Peak   bool       // a sample's size, not an RMS: limits in dBFS make no sense
	Plain  bool       // `against` gives a plain difference in the own unit; else a difference in dB
	List   bool       // `take` may be a list
	Roles  []string   // takes it cannot do without, main one first; nil: none
	Needs  []Need     // keys it cannot do without
}

// Need is a set of keys of which a check (or each of its takes) states one.
type Need []string

// FindMeasure returns the measure of that name.
func FindMeasure(name string) (Measure, bool) {
	for i := range measures {
		if measures[i].Name == name {
			return measures[i], true
		}
	}
	return Measure{}, false
}

// Measures lists all measures in the order of the documentation.
func Measures() []Measure { return slices.Clone(measures) }

// MeasureNames lists their names.
func MeasureNames() []string {
	out := make([]string, len(measures))
	for i, m := range measures {
		out[i] = m.Name
	}
	return out
}
