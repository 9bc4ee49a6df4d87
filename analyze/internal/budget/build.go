package budget

import (
	"fmt"
	"math"

	"benchslip/analyze"
)

// Budget collects the contributors of one value. The zero value is ready.
//
// Arguments named value are the sensitivity of the result to a relative
// error: for a result proportional to x^p it is p times the result, negative
// when the result falls as x grows. A result in V takes the value itself, a
// power 2 P.
type Budget struct {
	Lines    []analyze.Contributor
	Lacking  []string // job keys that the value needs and nobody stated
	Unstated []string // job keys taken as exact
}

// A adds a line of type A: statistics of this take. dof 0 is infinite.
func (b *Budget) A(name string, u, dof float64) { b.add(name, "A", "", u, dof) }

// B adds a line of type B that is the value's own.
func (b *Budget) B(name string, u float64) { b.add(name, "B", "", u, 0) }

// Shared adds a line of type B whose error other values share under the name
// source; u carries the sign of the sensitivity.
func (b *Budget) Shared(name, source string, u float64) { b.add(name, "B", source, u, 0) }

// add drops lines of exactly 0, which say nothing.
func (b *Budget) add(name, kind, source string, u, dof float64) {
	if u == 0 {
		return
	}
	l := analyze.Contributor{Name: name, Kind: kind, U: math.Abs(u), Dof: dof, Source: source}
	if source != "" {
		l.Sign = sign(u)
	}
	b.Lines = append(b.Lines, l)
}

func sign(x float64) int {
	if x < 0 {
		return -1
	}
	return 1
}

// U is the combined standard uncertainty so far.
func (b *Budget) U() float64 {
	u, _ := Combine(b.Lines)
	return u
}

// Into hands the budget to a result, after what it holds already.
func (b *Budget) Into(r *analyze.Result) {
	r.Budget = append(r.Budget, b.Lines...)
	for _, k := range b.Lacking {
		r.Lacking = once(r.Lacking, k)
	}
	for _, k := range b.Unstated {
		r.Unstated = once(r.Unstated, k)
	}
}

// once appends s unless list holds it.
func once(list []string, s string) []string {
	for _, have := range list {
		if have == s {
			return list
		}
	}
	return append(list, s)
}

// Offset adds the offset uncertainty of the gear, V, one error a channel; for
// DC quantities only. sensitivity is 1 for a result in V.
func (b *Budget) Offset(sig *analyze.Signal, sensitivity float64) {
	if sig.Unit != "V" {
		return
	}
	for _, l := range legs(sig) {
		b.Shared("offset of "+gearName(sig), fmt.Sprintf("gear %s channel %d offset", gearName(sig), l.channel),
			l.gear.OffsetU*sensitivity*float64(l.sign))
	}
}

// Clock adds the time base. Frequencies and slew rates give their value,
// times and delays minus theirs: a fast clock reads times long and
// frequencies low.
func (b *Budget) Clock(sig *analyze.Signal, value float64) {
	b.Shared("time base of "+gearName(sig), "gear "+gearName(sig)+" clock", sig.Gear.Clock*value)
}

// Skew adds the time between two channels of a take, s; sensitivity in the
// result's unit per s (1 for a delay, 360 f for a phase in degrees).
func (b *Budget) Skew(over, under *analyze.Signal, sensitivity float64) {
	if over.Channel() == under.Channel() {
		return
	}
	b.Shared(fmt.Sprintf("skew of channels %d and %d", over.Channel(), under.Channel()),
		fmt.Sprintf("gear %s skew %d/%d", gearName(over), over.Channel(), under.Channel()), over.Gear.Skew*sensitivity)
}

// Quantisation adds the converter's step as a rectangular error of one
// reading: q/sqrt 12 (JCGM 100 F.2.2.1); sensitivity 1 for a mean in V. A
// float file has no known step and adds nothing.
func (b *Budget) Quantisation(sig *analyze.Signal, sensitivity float64) {
	b.B("converter step", Rectangular(sig.Step/2)*sensitivity)
}

// gearName is the name of the gear for words and sources.
func gearName(sig *analyze.Signal) string {
	switch {
	case sig.Take.Gear != nil && sig.Take.Gear.Name != "":
		return sig.Take.Gear.Name
	case sig.Gear.Name != "":
		return sig.Gear.Name
	}
	return "the recorder"
}
