// Package sample holds an invented slip for the tests of the renderers: every
// verdict, bounds, a wide interval, flags with places, a waiver, a reading
// taken by hand, a missing take, hostile text, and figures of every kind. Its
// numbers are made up and prove nothing about measuring.
package sample

import (
	"fmt"
	"strings"

	"benchslip/analyze/slip"
)

// Hostile is text that tries to break out of every format: markup, quotes, a
// terminal sequence, direction marks that are not closed, a spreadsheet
// formula, a table cell of Markdown, bytes that are no text.
const Hostile = "=1+1|<script>alert('x')</script> & \"q\" \x1b[31mred\u009b0m \u202egnp.exe\u2069 ]]> `code` <!-- \x00\xff"

func p[T any](v T) *T { return &v }

func hash(c string) string { return strings.Repeat(c, 64)[:64] }

// Slip returns a fresh copy.
func Slip() *slip.Slip {
	return &slip.Slip{
		Format: 1, Sheet: "9f31c2a07d44", Verdict: slip.Fail,
		Tool:         slip.Tool{Name: "benchslip", Version: "0.0.0-test"},
		Job:          slip.Job{File: "preamp.toml", SHA256: hash("3a7c91e0"), Includes: []string{"gear.toml"}},
		LimitsSHA256: hash("b5520fd1"),
		Title:        "Lamp-room preamp after soldering",
		Unit: map[string]string{"model": "two-stage microphone preamplifier", "serial": "SP-017", "ticket": "SK-104",
			"place": "Skerry Point, keeper's workshop", "notes": Hostile},
		UnitKeys: []string{"model", "serial", "ticket", "place", "notes"},
		Record: map[string]string{"date": "2026-12-01", "operator": "M. Ardal", "spec": "lamp-room preamp targets, edition 3",
			"attempt": "2", "replaces": "41d0c77e02aa"},
		RecordKeys: []string{"date", "operator", "spec", "attempt", "replaces"},
		Rule:       slip.Rule{Decision: "four-way", Coverage: 2}, Mains: "50 Hz",
		Gear: []slip.Gear{
			{Name: "box", Kind: "audio", FullScale: "4.92 V peak", Coupling: "ac", Stated: "0.5 %", Calibrated: "2026-11-12", Notes: "channels taken as equal"},
			{Name: "scope", Kind: "scope", Coupling: "dc"},
		},
		Takes:    takes(),
		Checks:   checks(),
		Cautions: []string{"Phantom power off and decayed (below 0.5 V from pin 2 and pin 3 to pin 1) before a recorder or scope is connected.", "A scope's probe clip is protective earth: it may touch only points that are at earth."},
	}
}

func takes() []slip.Take {
	take := func(name, c string, rate float64, frames int64, setup string, where ...string) slip.Take {
		t := slip.Take{Name: name, File: "takes/" + name + ".wav", SHA256: p(hash(c)), Bytes: p(frames*6 + 44), Format: p("WAV 24-bit PCM"),
			RateHz: p(rate), Channels: p(2), Frames: p(frames), DurationS: p(float64(frames) / rate), Gear: "box", Setup: setup, Where: map[string]string{}}
		for i := 0; i < len(where); i += 2 {
			t.Where[where[i]] = where[i+1]
			t.WhereKeys = append(t.WhereKeys, where[i])
		}
		return t
	}
	ts := []slip.Take{
		take("g40", "0c", 96000, 768000, "", "gain", "40 dB", "source", "150 ohm"),
		take("g20", "1d", 96000, 768000, "", "gain", "20 dB", "source", "150 ohm"),
		take("g30", "2e", 96000, 768000, "", "gain", "30 dB", "source", "150 ohm"),
		take("drive", "3f", 96000, 576000, "", "gain", "40 dB", "level", "+20 dBu out"),
		take("quiet", "4a", 48000, 1440000, "", "gain", "60 dB", "source", "150 ohm plug"),
		take("sweep", "5b", 96000, 1920000, "", "gain", "40 dB"),
	}
	ts[3].Flags = []slip.Flag{{Code: "clipped", Take: "drive", Channel: p(1), Message: "the recorder is at full scale", FromS: p(5.25), ToS: p(5.2504)}}
	edge := slip.Take{Name: "edge", File: "takes/edge.csv", SHA256: p(hash("6c")), Bytes: p(int64(48213)), Format: p("scope CSV, comma, header row"),
		RateHz: p(25e6), Channels: p(1), Frames: p(int64(2500)), DurationS: p(1e-4), Gear: "scope", Where: map[string]string{},
		Assumptions: []string{"volts from the header \"CH1 (V)\"", "rate from the slope of the time column"}}
	lost := slip.Take{Name: "common", File: "takes/common.wav", Gear: "box", Where: map[string]string{"gain": "40 dB"}, WhereKeys: []string{"gain"},
		Fault: "missing-take: takes/common.wav is not there"}
	return append(ts, edge, lost)
}

func checks() []slip.Check {
	two := func(unit string, a, b float64) []slip.Contributor {
		return []slip.Contributor{
			{Name: "calibration of box", StandardUncertainty: a, Unit: unit, Kind: "B", Source: "gear box scale"},
			{Name: "repeatability over segments", StandardUncertainty: b, Unit: unit, Kind: "A", Dof: p(7.0)},
			{Name: "quantisation", StandardUncertainty: b / 40, Unit: unit, Kind: "B"},
		}
	}
	cs := []slip.Check{
		{Name: "Supply rail, positive", Measure: "entered", Class: "critical", Value: p(14.98), Unit: "V", Uncertainty: p(0.02), Coverage: p(2.0),
			Min: p(14.5), Max: p(15.5), Margin: p(0.48), Probability: p(1.0), Verdict: slip.Pass, By: "bench meter",
			Contributors: []slip.Contributor{{Name: "stated by hand", StandardUncertainty: 0.01, Unit: "V", Kind: "B"}}},
		{Name: "Gain at the 40 dB step", Measure: "gain", Class: "major", Clause: "4.1", Take: p("g40"), Takes: []slip.Role{{Role: "take", Name: "g40"}},
			Value: p(39.9802), Unit: "dB", Uncertainty: p(0.0605), Coverage: p(2.0), Min: p(39.5), Max: p(40.5), Typical: p(40.0), Margin: p(0.4802),
			Probability: p(1.0), Verdict: slip.Pass, Contributors: two("dB", 0.027, 0.0135), Conditions: []string{"tone found at 1042.003 Hz", "in: channel 2, out: channel 1"},
			Details: map[string]any{"fundamental": map[string]any{"frequency_hz": 1042.0031, "rms_v": 1.2216}, "span_s": [2]float64{0.5, 7.5}, "gap_hz": 2.0},
			Figures: []figure{wave("g40"), spectrum("g40", 0)}},
		{Name: "Gain steps: g20", Measure: "gain", Class: "major", Clause: "4.1", Take: p("g20"), Takes: []slip.Role{{Role: "take", Name: "g20"}},
			Value: p(20.4493), Unit: "dB", Uncertainty: p(0.1214), Coverage: p(2.43), Min: p(19.5), Max: p(20.5), Margin: p(0.0507),
			Probability: p(0.798), Verdict: slip.ConditionalPass, Contributors: two("dB", 0.03, 0.04), Advice: "needs U <= 0.05 dB: record 30 s or more",
			Figures: []figure{spectrum("g20", 1)}},
		{Name: "Gain steps: g30", Measure: "gain", Class: "major", Clause: "4.1", Take: p("g30"), Takes: []slip.Role{{Role: "take", Name: "g30"}},
			Value: p(30.5507), Unit: "dB", Uncertainty: p(0.1214), Coverage: p(2.43), Min: p(29.5), Max: p(30.5), Margin: p(-0.0507),
			Probability: p(0.202), Verdict: slip.ConditionalFail, Contributors: two("dB", 0.03, 0.04), Advice: "needs U <= 0.05 dB: record 30 s or more"},
		{Name: "THD+N at +20 dBu out", Measure: "thdn", Class: "minor", Clause: "4.4", Take: p("drive"), Takes: []slip.Role{{Role: "take", Name: "drive"}},
			Value: p(0.031249), Unit: "%", Uncertainty: p(0.00112), Coverage: p(2.0), Max: p(0.02), Typical: p(0.005), Margin: p(-0.011249), Probability: p(0.0),
			Verdict: slip.Fail, Contributors: two("%", 0.0002, 0.00052), Waiver: &slip.Waiver{By: "R. Holm", Why: "speech archive, never driven past +12 dBu", Ticket: "SK-109"},
			Flags:      []slip.Flag{{Code: "clipped", Take: "drive", Channel: p(1), Message: "the recorder is at full scale", FromS: p(5.25), ToS: p(5.2504)}},
			Opinions:   []string{"H2 stands 14 dB above H3: consistent with one rail lower than the other; to confirm, measure both rails under load."},
			Conditions: []string{"20 Hz .. 20 kHz, unweighted", "span 0.5 s .. 5 s"},
			Details:    map[string]any{"band_hz": [2]float64{20, 20000}, "weighting": "none", "method": "fitted fundamental, no notch filter", "harmonics": harmonics()},
			Figures:    []figure{spectrum("drive", 2)}},
		{Name: "THD at 0 dBu out", Measure: "thd", Class: "major", Clause: "4.4", Take: p("g40"), Takes: []slip.Role{{Role: "take", Name: "g40"}},
			Unit: "%", Bound: &slip.Bound{Kind: "upper", Value: 0.000412345, Unit: "%", Confidence: 0.95}, Max: p(0.02), Verdict: slip.Pass,
			Reason: "below-detection: no harmonic stands above the noise", Conditions: []string{"harmonics 2 .. 10"},
			Figures: []figure{spectrum("g40", 0)}},
		{Name: "Equivalent input noise", Measure: "ein", Class: "critical", Clause: "4.5", Take: p("quiet"),
			Takes: []slip.Role{{Role: "take", Name: "quiet"}, {Role: "gain_take", Name: "g40"}},
			Value: p(-126.312), Unit: "dBu", Uncertainty: p(0.252), Coverage: p(2.0), Max: p(-125.0), Margin: p(1.312), Probability: p(1.0), Verdict: slip.Pass,
			Contributors: two("dB", 0.12, 0.04), Unstated: []string{"source"}, Conditions: []string{"20 Hz .. 20 kHz, unweighted", "source 150 ohm, 290 K"},
			Details: map[string]any{"thermal_dbu": -130.93, "noise_figure_db": 4.62, "gain_db": 59.97, "noise_v": 3.72e-4}},
		{Name: "Hum at the output", Measure: "hum", Class: "major", Clause: "4.6", Take: p("quiet"), Takes: []slip.Role{{Role: "take", Name: "quiet"}},
			Value: p(3.1e-6), Unit: "V", Uncertainty: p(0.9e-6), Interval: &[2]float64{2.3e-6, 4.0e-6}, Coverage: p(2.0), Max: p(1e-5), Margin: p(6.9e-6),
			Probability: p(1.0), Verdict: slip.Pass, Contributors: two("V", 0.2e-6, 0.4e-6), Opinions: []string{"Odd orders lead: consistent with magnetic pick-up; to confirm, turn the unit by 90 degrees and record again."},
			Details: map[string]any{"mains_hz": 50.0112, "family": "odd", "family_confidence": 0.7}, Figures: []figure{comb(), cycle()}},
		{Name: "Common-mode rejection, 1 kHz", Measure: "cmrr", Class: "critical", Clause: "4.3", Takes: []slip.Role{{Role: "differential", Name: "g40"}, {Role: "common", Name: "common"}},
			Unit: "dB", Min: p(65.0), Verdict: slip.NotMeasurable, Reason: "missing-take: takes/common.wav is not there", Advice: "record the take \"common\": pins 2 and 3 joined, driven against pin 1"},
		{Name: "Crosstalk between the channels", Measure: "crosstalk", Class: "minor", Take: p("g40"), Takes: []slip.Role{{Role: "take", Name: "g40"}},
			Unit: "dB", Bound: &slip.Bound{Kind: "upper", Value: -68.4217, Unit: "dB", Confidence: 0.95}, Max: p(-70.0), Verdict: slip.NotMeasurable,
			Reason: "below-detection: the line at 1042 Hz does not stand above the noise", Advice: "raise the drive by 6 dB or record 30 s"},
		{Name: "Output offset", Measure: "dc", Class: "minor", Take: p("g40"), Takes: []slip.Role{{Role: "take", Name: "g40"}},
			Unit: "mV", Min: p(-10.0), Max: p(10.0), Verdict: slip.NotMeasurable, Reason: "ac-coupled: gear \"box\" blocks DC", Advice: "take it with a DC-coupled scope or enter a meter reading"},
		{Name: "Flatness", Measure: "flatness", Class: "minor", Clause: "4.2", Take: p("sweep"), Takes: []slip.Role{{Role: "take", Name: "sweep"}},
			Value: p(0.2135), Unit: "dB", Uncertainty: p(0.031), Coverage: p(2.0), Max: p(0.5), Margin: p(0.2865), Probability: p(1.0), Verdict: slip.Pass,
			Contributors: two("dB", 0.012, 0.008), Figures: []figure{response(), phase()}},
		{Name: "Slew rate", Measure: "slew_rate", Class: "info", Take: p("edge"), Takes: []slip.Role{{Role: "take", Name: "edge"}},
			Value: p(4.213e6), Unit: "V/s", Uncertainty: p(0.13e6), Coverage: p(2.0), Verdict: slip.NotJudged, Contributors: two("V/s", 6e4, 2e4),
			Flags:   []slip.Flag{{Code: "uncertainty-unstated", Take: "edge", Message: "`uncertainty` of gear \"scope\" is not stated"}},
			Figures: []figure{edge()}},
		{Name: "Gain at the 60 dB step", Measure: "gain", Class: "major", Optional: true, Take: p("g40"), Takes: []slip.Role{{Role: "take", Name: "g40"}},
			Unit: "dB", Min: p(59.0), Max: p(61.0), Verdict: slip.NotApplicable, Reason: "not-applicable: the check asks for gain 60 dB, the take states 40 dB"},
		{Name: "Dropouts while tapping", Measure: "events", Class: "major", Take: p("drive"), Takes: []slip.Role{{Role: "take", Name: "drive"}},
			Value: p(0.0), Unit: "", Uncertainty: p(0.0), Min: p(0.0), Max: p(0.0), Margin: p(0.0), Probability: p(1.0), Verdict: slip.Pass, Figures: []figure{timeline()}},
		{Name: "Level " + Hostile, Measure: "level", Class: "info", Clause: Hostile, Take: p("g40"), Takes: []slip.Role{{Role: "take", Name: "g40"}},
			Value: p(0.774597), Unit: "V", Uncertainty: p(0.0039), Coverage: p(2.0), Verdict: slip.NotJudged, Reason: "", Advice: "",
			Contributors: []slip.Contributor{{Name: Hostile, StandardUncertainty: 0.00195, Unit: "V", Kind: "B"}},
			Opinions:     []string{Hostile}, Notes: []string{Hostile}, Details: map[string]any{Hostile: Hostile}},
	}
	for i := range cs {
		if u := cs[i].Unit; cs[i].Min != nil || cs[i].Max != nil {
			cs[i].LimitUnit = &u
		}
	}
	return cs
}

func harmonics() []map[string]any {
	var out []map[string]any
	for h := 2; h <= 10; h++ {
		rel := -70.2 - 14*float64(h-2)
		if h > 4 {
			rel = -110 - float64(h)
		}
		out = append(out, map[string]any{"order": h, "frequency_hz": 1042.0031 * float64(h), "rms_v": 7.746e-3 / float64(h), "relative_db": rel, "in_band": true})
	}
	return out
}

// Many returns the sample with its rows repeated to n, for timing.
func Many(n int) *slip.Slip {
	s := Slip()
	base := s.Checks
	s.Checks = nil
	for i := range n {
		c := base[i%len(base)]
		c.Name = fmt.Sprintf("%s (%d)", c.Name, i/len(base))
		s.Checks = append(s.Checks, c)
	}
	return s
}
