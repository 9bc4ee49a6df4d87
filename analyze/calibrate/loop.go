package calibrate

import (
	"context"
	"fmt"
	"math"
	"path/filepath"
	"strings"

	"benchslip/analyze"
	"benchslip/analyze/intake"
	"benchslip/analyze/stage"
	"benchslip/capture/recording"
	"benchslip/capture/stimulus"
)

// Loopback is a recording of a recorder's own output in its own input.
type Loopback struct {
	File string // base name: all lie in one folder
	Path string
	Spec *stimulus.Spec // what was played; nil: a tone, to be found
}

// LoopOptions of a loopback check.
type LoopOptions struct {
	Gear, Mode, Date string
}

// LoopJob writes the text of a job that checks a recorder by itself: its floor
// and hum in the silences, level, distortion and clock from a tone, match of
// the channels that carry it and separation from those that do not, flatness
// from a sweep. The slip shows values, or bounds, and judges nothing.
// The error is a *Fault, or that of ctx.
func LoopJob(ctx context.Context, loops []Loopback, o LoopOptions) (string, error) {
	w := &loopWriter{}
	w.line("# Loopback check of a recorder, written by benchslip calibrate --loop. Lay it")
	w.line("# beside the recordings to run it again.")
	w.line("format = 1")
	w.line("title = %s", quoted("Loopback of "+o.Gear))
	w.line("[unit]")
	w.line("model = %s", quoted(o.Gear))
	w.line("notes = \"the recorder's own output in its own input; values include the player's share\"")
	if o.Date != "" {
		w.line("[record]\ndate = %s", o.Date)
	}
	w.line("[gear.%s]\nkind = \"audio\"\ncoupling = \"ac\"", key(o.Gear))
	if o.Mode != "" {
		w.line("mode = %s", quoted(o.Mode))
	}
	w.line("[defaults]\ngear = %s", quoted(o.Gear))
	for i, l := range loops {
		suffix := ""
		if len(loops) > 1 {
			suffix = fmt.Sprintf(" (%s)", l.File)
		}
		if err := w.loop(ctx, i+1, l, suffix); err != nil {
			return "", err
		}
	}
	if w.checks.Len() == 0 {
		return "", fault("%s: holds nothing that a loopback check can read: no tone, no silence of a second or more", loops[0].File)
	}
	return w.head.String() + w.checks.String(), nil
}

type loopWriter struct{ head, checks strings.Builder }

func (w *loopWriter) line(format string, args ...any) { fmt.Fprintf(&w.head, format+"\n", args...) }

func (w *loopWriter) check(name, measure, take string, lines ...string) {
	fmt.Fprintf(&w.checks, "[[checks]]\nname = %s\nmeasure = %q\ntake = %q\nclass = \"info\"\n", quoted(name), measure, take)
	for _, l := range lines {
		w.checks.WriteString(l + "\n")
	}
}

// loop adds the takes and checks of one recording.
func (w *loopWriter) loop(ctx context.Context, n int, l Loopback, suffix string) error {
	t := &analyze.Take{Name: l.File, File: l.File, Path: l.Path}
	if err := intake.Open(ctx, t); err != nil {
		return err
	}
	if t.Fault != nil {
		return fault("%s", intake.Line(t.Fault))
	}
	defer t.Rec.Close()
	in := t.Rec.Info()
	switch {
	case in.Kind != recording.Audio:
		return fault("%s: a loopback check is for recorders; this holds volts of a scope", l.File)
	case in.RateHz <= 0:
		return fault("%s: has no sample rate", l.File)
	}
	h := heardIn(t)
	if len(h.driven) == 0 {
		return fault("%s: no channel holds a signal", l.File)
	}
	take := func(what string, from, to float64, more string) string {
		name := fmt.Sprintf("%s%d", what, n)
		w.line("[takes.%s]\nfile = %s%s", name, quoted(l.File), more)
		if to > from {
			w.line("span = \"%.3f s .. %.3f s\"", from, to)
		}
		return name
	}
	high := math.Min(20e3, 0.45*in.RateHz)
	band := fmt.Sprintf("band = \"20 Hz .. %.6g Hz\"", high)
	if h.quietTo-h.quietFrom >= leastQuietS {
		quiet := take("quiet", h.quietFrom, h.quietTo, "")
		for c := range in.Channels {
			out := fmt.Sprintf("out = %d", c+1)
			w.check(fmt.Sprintf("Floor, channel %d%s", c+1, suffix), "noise", quiet, out, band)
			w.check(fmt.Sprintf("Floor, channel %d, A-weighted%s", c+1, suffix), "noise", quiet, out, `weighting = "A"`)
			w.check(fmt.Sprintf("Hum, channel %d%s", c+1, suffix), "hum", quiet, out)
		}
	}
	if l.Spec != nil && l.Spec.Kind == "sweep" {
		name := take("sweep", 0, 0, "\nstimulus = "+quoted(l.Spec.String()))
		lo, hi := math.Max(20, 1.05*l.Spec.FromHz), math.Min(high, 0.95*l.Spec.ToHz)
		for _, c := range h.driven {
			w.check(fmt.Sprintf("Flatness, channel %d%s", c, suffix), "flatness", name, fmt.Sprintf("out = %d", c), fmt.Sprintf("band = \"%.6g Hz .. %.6g Hz\"", lo, hi))
		}
		return nil
	}
	hz, bad := h.tone(t)
	if bad != nil {
		return fault("%s; a sweep is named with --stimulus", intake.Line(bad))
	}
	at := math.Round(hz)
	if l.Spec != nil && len(l.Spec.AtHz) == 1 {
		at = l.Spec.AtHz[0]
	}
	tone := take("tone", h.from, h.to, "")
	w.tone(tone, suffix, at, band, h, len(in.Channels))
	return nil
}

// tone adds what one steady tone says about a recorder.
func (w *loopWriter) tone(take, suffix string, at float64, band string, h heard, channels int) {
	atKey := fmt.Sprintf("at = \"%.10g Hz\"", at)
	for _, c := range h.driven {
		out := fmt.Sprintf("out = %d", c)
		w.check(fmt.Sprintf("Level, channel %d%s", c, suffix), "level", take, out, band)
		w.check(fmt.Sprintf("THD, channel %d%s", c, suffix), "thd", take, out, atKey)
		w.check(fmt.Sprintf("THD+N, channel %d%s", c, suffix), "thdn", take, out, atKey, band)
	}
	first := h.driven[0]
	w.check(fmt.Sprintf("Clock against the player, tone of %.10g Hz%s", at, suffix), "tone_frequency", take, fmt.Sprintf("out = %d", first), atKey)
	for _, c := range h.driven[1:] {
		w.check(fmt.Sprintf("Match, channel %d against %d%s", c, first, suffix), "balance", take, fmt.Sprintf("out = %d", c), fmt.Sprintf("out2 = %d", first), atKey)
	}
	for c := 1; c <= channels; c++ {
		if !h.isDriven(c) {
			w.check(fmt.Sprintf("Separation, channel %d from %d%s", c, first, suffix), "crosstalk", take,
				fmt.Sprintf("driven = %d", first), fmt.Sprintf("out = %d", c), atKey)
		}
	}
}

// leastQuietS is the shortest silence that a floor is read from.
const leastQuietS = 1.0

// heard is where a loopback recording sounds and where it is silent, s, and
// which channels are driven.
type heard struct {
	from, to           float64 // sounding, less a little at the ends
	quietFrom, quietTo float64
	driven             []int
}

func (h heard) isDriven(c int) bool {
	for _, d := range h.driven {
		if d == c {
			return true
		}
	}
	return false
}

// drivenDB is how far below the loudest channel one still counts as driven.
const drivenDB = 20

// heardIn looks through the channels of a take.
func heardIn(t *analyze.Take) heard {
	in := t.Rec.Info()
	pass := &analyze.Pass{Params: &analyze.Params{}, Roles: map[string][]*analyze.Take{"take": {t}}, Stages: analyze.NewStages()}
	peaks := make([]float64, len(in.Channels))
	var best stage.Stretch
	loudest := -1
	for c := range in.Channels {
		s := analyze.NewSignal(t, c+1, 0, 0, in.Frames, 1)
		for _, q := range stage.Stretches(pass, s) {
			peaks[c] = math.Max(peaks[c], q.Peak)
			if loudest < 0 || q.Peak > best.Peak*1.0001 || c == loudest && q.To-q.From > best.To-best.From {
				best, loudest = q, c
			}
		}
	}
	var h heard
	if loudest < 0 || best.Peak == 0 {
		return h
	}
	for c, p := range peaks {
		if p > 0 && 20*math.Log10(best.Peak/p) < drivenDB {
			h.driven = append(h.driven, c+1)
		}
	}
	from, to := float64(best.From)/in.RateHz, float64(best.To)/in.RateHz
	end := in.DurationS()
	h.from, h.to = from, to
	const cut = 2 * edgeS
	if from > 0 || to < end-1/in.RateHz {
		h.from, h.to = from+cut, to-cut
	}
	// The longer of the silences, without its start and without what leads
	// into the sound.
	h.quietFrom, h.quietTo = cut, from-cut
	if end-to > from {
		h.quietFrom, h.quietTo = to+cut, end-cut
	}
	return h
}

// tone is the frequency of the tone on the first driven channel.
func (h heard) tone(t *analyze.Take) (float64, *analyze.Refusal) {
	pass := &analyze.Pass{Params: &analyze.Params{Wiring: analyze.Wiring{Out: fmt.Sprint(h.driven[0]),
		Span: &analyze.Span{From: h.from, To: h.to, HasFrom: true, HasTo: true}}},
		Roles: map[string][]*analyze.Take{"take": {t}}, Stages: analyze.NewStages()}
	x, bad := stage.Listen(pass, "take", 0)
	if bad != nil {
		return 0, bad
	}
	return x.Tone.Hz, nil
}

// OneFolder is the folder that all files lie in.
func OneFolder(paths []string) (string, error) {
	dir := filepath.Dir(paths[0])
	for _, p := range paths[1:] {
		if filepath.Dir(p) != dir {
			return "", fault("%s and %s lie in different folders: lay the loopback recordings into one", paths[0], p)
		}
	}
	return dir, nil
}
