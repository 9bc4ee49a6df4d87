// Package measures is the explicit list of everything that can be measured.
package measures

import (
	"benchslip/analyze"
	"benchslip/analyze/channels"
	"benchslip/analyze/commonmode"
	"benchslip/analyze/events"
	"benchslip/analyze/hum"
	"benchslip/analyze/impedance"
	"benchslip/analyze/level"
	"benchslip/analyze/limits"
	"benchslip/analyze/noise"
	"benchslip/analyze/oneshot"
	"benchslip/analyze/response"
	"benchslip/analyze/tone"
)

// All lists the measures in the order they are shown.
func All() []*analyze.Measure {
	var all []*analyze.Measure
	for _, list := range [][]*analyze.Measure{
		level.Measures(),
		tone.Measures(),
		noise.Measures(),
		hum.Measures(),
		commonmode.Measures(),
		limits.Measures(),
		response.Measures(),
		channels.Measures(),
		impedance.Measures(),
		oneshot.Measures(),
		events.Measures(),
	} {
		all = append(all, list...)
	}
	return all
}

// ByName finds a measure; nil when there is none of that name.
func ByName(name string) *analyze.Measure {
	for _, m := range All() {
		if m.Name == name {
			return m
		}
	}
	return nil
}
