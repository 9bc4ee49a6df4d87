package events

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"benchslip/analyze"
	"benchslip/analyze/internal/trial"
	"benchslip/capture/recording"
)

func list(r analyze.Result) []map[string]any {
	l, _ := r.Details["list"].([]map[string]any)
	return l
}

// agrees holds what was found against what happened: kind, time within 1 ms
// (hum within half a mains period), nothing else.
func agrees(t *testing.T, name string, r analyze.Result, happened []happening) {
	t.Helper()
	if r.Value == nil {
		t.Errorf("%s: %+v", name, r.Refusal)
		return
	}
	found := list(r)
	if int(*r.Value) != len(happened) || len(found) != len(happened) {
		t.Errorf("%s: %v events, %d happened:", name, *r.Value, len(happened))
		for _, e := range found {
			t.Logf("  %v", e)
		}
		return
	}
	for i, h := range happened {
		within := 1e-3
		if h.kind == "hum" {
			within = 10e-3
		}
		if e := found[i]; e["kind"] != h.kind || math.Abs(e["at_s"].(float64)-h.at) > within {
			t.Errorf("%s: found %v, happened %s at %.5f s", name, e, h.kind, h.at)
		}
	}
}

// Every kind, on a tone and on silence, at several rates and resolutions, also
// where two stretches meet (32 s, 64 s).
func TestEveryKind(t *testing.T) {
	onTone := []happening{
		{"step", 5.1234, 0, "level", 0.97}, {"click", 9.8765, 0, "click", 0.02}, {"dropout", 14.222, 0, "lost", 7}, {"dropout", 20.5, 0.04, "silence", 0},
		{"burst", 26.3333, 0.05, "burst", 0.004}, {"click", 31.9999, 0, "click", 0.02}, {"hum", 36.717, 0, "hum on", 0.003}, {"hum", 43.919, 0, "hum off", 0},
		{"burst", 48, 3, "burst", 0.002}, {"step", 60, 0, "level", 1.02}, {"click", 64.0001, 0, "click", 0.03}, {"step", 68, 0, "dc", 0.004},
		{"dropout", 73, 0.4, "silence", 0}, {"dropout", 78, 0, "lost", 1}, {"burst", 83, 0.3, "burst", 0.001},
	}
	var inSilence []happening
	for _, h := range onTone {
		if h.what != "level" && h.what != "lost" {
			inSilence = append(inSilence, h)
		}
	}
	for _, c := range []struct {
		rate, hz, amp float64
		noise         float64
		bits          int
	}{
		{16000, 1042.7, 0.2, 3e-4, 0},
		{44100, 997.3, 0.5, 2e-4, 16},
		{16000, 311.1, 0.3, 1e-4, 0},
		{16000, 0, 0, 3e-4, 16},
	} {
		things := onTone
		if c.amp == 0 {
			things = inSilence
		}
		s := newScene(c.rate, 90, scene{hz: c.hz, amp: c.amp, noise: c.noise, mains: 49.95, bits: c.bits, seed: 1, happened: append([]happening(nil), things...)})
		name := fmt.Sprintf("%g Hz, tone %g Hz, %d bits", c.rate, c.hz, c.bits)
		r := trial.Run(events, analyze.Params{}, s.take())
		agrees(t, name, r, things)
		if per := r.Details["events_per_hour"].(float64); math.Abs(per-float64(len(things))*40) > 1e-9 {
			t.Errorf("%s: %g events an hour", name, per)
		}
	}
}

// Sizes: change of the RMS of a step and of hum, peak of a click, RMS of a burst
// and of what a dropout lacks.
func TestSizes(t *testing.T) {
	things := []happening{{"step", 5, 0, "level", 0.9}, {"click", 9, 0, "click", 0.05}, {"hum", 13, 0, "hum on", 0.004}, {"hum", 17, 0, "hum off", 0},
		{"burst", 21, 0.1, "burst", 0.01}, {"dropout", 25, 0.1, "silence", 0}}
	s := newScene(16000, 30, scene{hz: 1042.7, amp: 0.2, noise: 1e-4, mains: 50.03, seed: 4, happened: things})
	r := trial.Run(events, analyze.Params{}, s.take())
	agrees(t, "sizes", r, things)
	rms := 0.2 / math.Sqrt2
	for i, want := range []float64{-0.1 * rms, 0.05, 0.004, -0.004, 0.01, 0.9 * rms} {
		if got := list(r)[i]["size_v"].(float64); math.Abs(got/want-1) > 0.1 {
			t.Errorf("%s: size %.5g V, want %.5g", things[i].kind, got, want)
		}
	}
	if dB := list(r)[0]["change_db"].(float64); math.Abs(dB-20*math.Log10(0.9)) > 0.02 {
		t.Errorf("step of %.4f dB, want %.4f", dB, 20*math.Log10(0.9))
	}
}

// Seeded scenes of random tones and times: all is found, nothing else.
func TestRandomTimes(t *testing.T) {
	runs := 5
	if testing.Short() {
		runs = 2
	}
	for seed := range runs {
		r := rand.New(rand.NewPCG(uint64(seed), 11))
		amp := 0.1 + 0.3*r.Float64()
		var things []happening
		kinds := []happening{{"step", 0, 0, "level", 1.03}, {"step", 0, 0, "level", 0.96}, {"click", 0, 0, "click", 0.01}, {"dropout", 0, 0, "lost", 3},
			{"dropout", 0, 0.02, "silence", 0}, {"burst", 0, 0.03, "burst", 0.003}, {"hum", 0, 0, "hum on", 0.002}, {"hum", 0, 0, "hum off", 0}}
		at := 2.0
		for i := range 16 {
			h := kinds[i%len(kinds)]
			at += 1.5 + 2*r.Float64()
			h.at = at
			things = append(things, h)
		}
		s := newScene(16000, at+3, scene{hz: 300 + 2000*r.Float64(), amp: amp, noise: 2e-4, mains: 49.9 + 0.2*r.Float64(), seed: uint64(seed), happened: things})
		agrees(t, fmt.Sprintf("seed %d, tone %.1f Hz", seed, s.hz), trial.Run(events, analyze.Params{}, s.take()), things)
	}
}

// A clean tone, hum and noise hold no event: none in an hour and a half of
// takes, whatever rate, resolution and level (designed for one in a thousand
// hours).
func TestFalseAlarms(t *testing.T) {
	runs := 24
	if testing.Short() {
		runs = 10
	}
	for i := range runs {
		r := rand.New(rand.NewPCG(uint64(i), 5))
		s := scene{hz: 200 + 2000*r.Float64(), amp: 0.3 * float64(i%3) / 2, noise: []float64{1e-5, 1e-3, 3e-6, 3e-2}[i%4], mains: 50, seed: uint64(i)}
		if i%5 == 3 {
			s.bits = 16
		}
		if i%5 == 0 {
			s.happened = []happening{{"", -1, 0, "hum on", 0.003}}
		}
		res := trial.Run(events, analyze.Params{}, newScene([]float64{4000, 8000, 16000}[i%3], 75, s).take())
		if res.Value == nil || *res.Value != 0 {
			t.Errorf("scene %d: %+v, %v", i, res.Refusal, list(res))
		}
	}
}

// An hour, read in stretches: every event within 1 ms, no other.
func TestHour(t *testing.T) {
	if testing.Short() {
		t.Skip("an hour of samples")
	}
	var things []happening
	for i, h := range []happening{{"step", 0, 0, "level", 1.05}, {"click", 0, 0, "click", 0.02}, {"dropout", 0, 0, "lost", 5}, {"hum", 0, 0, "hum on", 0.003},
		{"burst", 0, 0.08, "burst", 0.004}, {"hum", 0, 0, "hum off", 0}, {"dropout", 0, 0.03, "silence", 0}, {"step", 0, 0, "level", 0.95}, {"click", 0, 0, "click", 0.02}} {
		h.at = 17.321 + float64(i)*397.77123
		things = append(things, h)
	}
	s := newScene(4000, 3600, scene{hz: 1042.7, amp: 0.2, noise: 2e-4, mains: 50.02, seed: 9, happened: things})
	agrees(t, "an hour", trial.Run(events, analyze.Params{}, s.take()), things)
}

// What is nearer than 20 ms is one; flags of the file count; refusals.
func TestOneOrTwo(t *testing.T) {
	run := func(h ...happening) analyze.Result {
		return trial.Run(events, analyze.Params{}, newScene(16000, 10, scene{hz: 1042.7, amp: 0.2, noise: 2e-4, mains: 50, seed: 2, happened: h}).take())
	}
	if r := run(happening{"", 4, 0, "click", 0.02}, happening{"", 4.012, 0, "click", 0.03}); *r.Value != 1 {
		t.Errorf("12 ms apart: %v", list(r))
	}
	if r := run(happening{"", 4, 0, "click", 0.02}, happening{"", 4.04, 0, "click", 0.03}); *r.Value != 2 {
		t.Errorf("40 ms apart: %v", list(r))
	}
	if r := run(happening{"", 4, 0, "level", 0.9}, happening{"", 4.001, 0, "click", 0.03}); *r.Value != 1 || list(r)[0]["kind"] != "step" {
		t.Errorf("a step that clicks: %v", list(r))
	}
	// 0.05 dB is no step; its jump may be heard as a click.
	for _, e := range list(run(happening{"", 4, 0, "level", math.Pow(10, 0.05/20)})) {
		if e["kind"] != "click" {
			t.Errorf("0.05 dB: %v", e)
		}
	}
	if r := run(happening{"", 4, 0, "level", math.Pow(10, 0.15/20)}); *r.Value != 1 || list(r)[0]["kind"] != "step" {
		t.Errorf("0.15 dB: %v", list(r))
	}
	take := newScene(16000, 10, scene{noise: 2e-4, seed: 2}).take()
	from, to := recording.Place(3.5, 3.6)
	take.Flags = []recording.Flag{{Code: recording.RepeatedBlock, Channel: 1, FromS: from, ToS: to}}
	if r := trial.Run(events, analyze.Params{}, take); *r.Value != 1 || list(r)[0]["kind"] != "dropout" || list(r)[0]["at_s"] != 3.5 {
		t.Errorf("a repeated block: %v", list(r))
	}
	for name, c := range map[string]struct {
		take *analyze.Take
		code string
	}{
		"short":    {trial.Take("t", trial.New(48000, 0.5).Noise(0.1, 1)), analyze.TooShort},
		"slow":     {trial.Take("t", trial.New(100, 60).Noise(0.1, 1)), analyze.Unsupported},
		"constant": {trial.Take("t", trial.New(8000, 10).DC(0.1)), analyze.NoSignal},
	} {
		if r := trial.Run(events, analyze.Params{}, c.take); r.Value != nil || r.Refusal.Code != c.code {
			t.Errorf("%s: %+v", name, r.Refusal)
		}
	}
	// Computed without any noise: nothing to tell apart, nothing found.
	if r := trial.Run(events, analyze.Params{}, trial.Take("t", trial.New(8000, 20).Tone(313.3, 0.4, 0))); *r.Value != 0 {
		t.Errorf("a computed tone: %v", list(r))
	}
	if r := trial.Run(events, analyze.Params{}, trial.Bits(trial.Take("t", trial.New(8000, 20).Tone(313.3, 0.4, 0).Quantise(16, false, 1)), 16)); *r.Value != 0 {
		t.Errorf("a tone of whole codes: %v", list(r))
	}
}
