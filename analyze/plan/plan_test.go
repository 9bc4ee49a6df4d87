package plan

import (
	"io/fs"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"benchslip/analyze/job"
	"benchslip/capture/recording"
	"benchslip/capture/stimulus"
	"benchslip/capture/unit"
)

// load writes a job file and reads it.
func load(t *testing.T, text string) *job.Job {
	t.Helper()
	path := filepath.Join(t.TempDir(), "job.toml")
	if err := os.WriteFile(path, []byte(text), 0o666); err != nil {
		t.Fatal(err)
	}
	j, err := job.Load(path, job.Options{})
	if err != nil {
		t.Fatal(err)
	}
	return j
}

const gear = `
format = 1
title = "A unit"
[mains]
frequency = "50 Hz"
[gear.box]
kind = "audio"
full_scale_peak = "5 V"
uncertainty = "0.5 %"
[gear.bare]
kind = "audio"
[gear.scope]
kind = "scope"
`

func take(name, keys string) string {
	return "[takes." + name + "]\nfile = \"takes/" + name + ".wav\"\ngear = \"box\"\n" + keys + "\n"
}

func check(name, measure, keys string) string {
	return "[[checks]]\nname = \"" + name + "\"\nmeasure = \"" + measure + "\"\n" + keys + "\n"
}

func find(t *testing.T, p *Plan, name string) Take {
	t.Helper()
	for _, k := range p.Takes {
		if k.Name == name {
			return k
		}
	}
	t.Fatalf("no take %q in the plan", name)
	return Take{}
}

// Whatever the order in the job: the instrument first, then DC, small signal,
// noise; full level late, switching and the long watch last.
func TestOrder(t *testing.T) {
	text := gear
	for _, n := range []string{"watch", "thump", "full", "edge", "cross", "joined", "pair", "noise", "thd", "sweep", "gain", "dc", "loop", "floor"} {
		keys := ""
		switch n {
		case "gain", "thd", "sweep", "pair", "joined":
			keys = "in = 2"
		case "dc", "thump", "edge":
			keys = `gear = "scope"`
		}
		k := take(n, keys)
		if strings.Contains(keys, "gear") {
			k = strings.Replace(k, "gear = \"box\"\n", "", 1)
		}
		text += k
	}
	text += check("Events", "events", `take = "watch"`) +
		check("Thump", "thump", `take = "thump"`) +
		check("Power", "power", "take = \"full\"\nload = \"8 ohm\"") +
		check("Rise", "rise_time", `take = "edge"`) +
		check("Crosstalk", "crosstalk", "take = \"cross\"\ndriven = 1\nout = 2") +
		check("CMRR", "cmrr", "differential = \"pair\"\ncommon = \"joined\"") +
		check("Noise", "noise", "take = \"noise\"\nfloor = \"floor\"") +
		check("THD", "thd", "take = \"thd\"\nloop = \"loop\"") +
		check("Flat", "flatness", `take = "sweep"`) +
		check("Gain", "gain", `take = "gain"`) +
		check("DC", "dc", `take = "dc"`)
	p := Make(load(t, text), Options{})
	var got []string
	for _, k := range p.Takes {
		got = append(got, k.Name)
		if !k.Missing {
			t.Errorf("%s is not missing", k.Name)
		}
		if len(k.Wiring) == 0 || k.Level == "" || len(k.Checks) != 1 {
			t.Errorf("%s: wiring %q, level %q, checks %q", k.Name, k.Wiring, k.Level, k.Checks)
		}
	}
	want := []string{"floor", "loop", "dc", "gain", "sweep", "thd", "noise", "joined", "pair", "cross", "edge", "full", "thump", "watch"}
	if !slices.Equal(got, want) {
		t.Errorf("order %v, wanted %v", got, want)
	}
	if p.Missing != len(want) {
		t.Errorf("%d missing", p.Missing)
	}
	for name, kind := range map[string]string{"gain": "tone", "loop": "", "sweep": "sweep", "noise": "", "floor": "", "pair": "tone", "cross": "tone", "watch": "tone", "dc": "", "thump": ""} {
		k := find(t, p, name)
		if name == "loop" {
			kind = "tone"
		}
		if (k.Stimulus == "") != (kind == "") || !strings.HasPrefix(k.Signal, kind) {
			t.Errorf("%s: file %q, signal %q, wanted %q", name, k.Stimulus, k.Signal, kind)
		}
	}
	if k := find(t, p, "edge"); k.Source == "" || k.Stimulus != "" {
		t.Errorf("an edge is driven by %q, file %q", k.Source, k.Stimulus)
	}
	if k := find(t, p, "cross"); !strings.Contains(k.Signal, "second=silent") {
		t.Errorf("crosstalk drives %q", k.Signal)
	}
}

// The files of a plan can be made, lie inside the folder, and takes that play
// the same share one.
func TestFiles(t *testing.T) {
	text := gear + take("a", "in = 2") + take("b", "in = 2") + take("c", "in = 2\nstimulus = \"mine/tone.wav\"") +
		take("d", "in = 2\nstimulus = \"sweep from=10Hz to=20kHz length=5s\"") + take("e", "in = 2") + take("f", "in = 2") +
		check("A", "gain", "each = [\"a\", \"b\", \"c\"]\nat = \"943 Hz\"") +
		check("D", "flatness", `take = "d"`) + check("E", "modulation_distortion", `take = "e"`) +
		check("F", "difference_distortion", "take = \"f\"\norder = 2")
	p := Make(load(t, text), Options{})
	files := Files(p)
	if len(files) != 5 {
		t.Fatalf("%d files: %+v", len(files), files)
	}
	for _, f := range files {
		if f.Spec == nil {
			t.Errorf("%s cannot be made", f.Name)
			continue
		}
		if f.Spec.RateHz < 44100 || f.Spec.PeakDBFS >= 0 {
			t.Errorf("%s: rate %d, peak %g dBFS", f.Name, f.Spec.RateHz, f.Spec.PeakDBFS)
		}
		if !filepath.IsLocal(filepath.FromSlash(f.Name)) || strings.ContainsAny(f.Name, " \\:*?\"<>|") {
			t.Errorf("%q is no name for every system", f.Name)
		}
	}
	a, b, c := find(t, p, "a"), find(t, p, "b"), find(t, p, "c")
	if a.Stimulus != b.Stimulus || !strings.Contains(a.Signal, "at=943Hz") {
		t.Errorf("a plays %q (%s), b %q", a.Stimulus, a.Signal, b.Stimulus)
	}
	if c.Stimulus != "mine/tone.wav" || !strings.Contains(c.Signal, "at=943Hz") {
		t.Errorf("c plays %q (%s)", c.Stimulus, c.Signal)
	}
}

// Every kind of stimulus, with keys that are not the default, has a file name
// of its own.
func TestFileNamesDiffer(t *testing.T) {
	seen := map[string]string{}
	long := "multitone at="
	for f := 100; f < 2000; f += 37 {
		long += stimulusHz(f) + ","
	}
	for _, text := range []string{"tone", "tone before=2s", "tone after=2s", "tone at=943Hz", "tone peak=-20dBFS", "tone rate=96kHz",
		"sweep", "sweep from=10Hz", "pilot", "pulse", strings.TrimSuffix(long, ","), strings.TrimSuffix(long, ",") + ",2001Hz"} {
		s, err := stimulus.Parse(text)
		if err != nil {
			t.Fatal(err)
		}
		name := fileName(s)
		if other, twice := seen[name]; twice {
			t.Errorf("%q and %q are both called %s", text, other, name)
		}
		seen[name] = text
		if len(name) > 80 {
			t.Errorf("%q has a name of %d bytes", text, len(name))
		}
	}
}

func stimulusHz(f int) string { return compact(float64(f), unit.Hertz) }

// The length comes from the resolution that the checks need.
func TestLength(t *testing.T) {
	for _, c := range []struct {
		name, keys, check string
		least             float64 // s
		why               string
	}{
		// A mains line at 150 Hz is 2 Hz away: 4/2 Hz = 2 s, but 8 s for lines 1 Hz apart.
		{"a tone", "in = 2", check("C", "thd", "take = \"x\"\nat = \"943 Hz\""), 8, "stimulus"},
		// 0.2 Hz from 150 Hz: 4/0.2 = 20 s.
		{"a tone beside the mains", "in_level = \"1 V\"\nspan = \"0 s .. 2 s\"", check("C", "gain", "take = \"x\"\nat = \"150.2 Hz\""), 20, "mains line"},
		// Sixth of an octave about 10 Hz: 10 (2^(1/12) - 2^(-1/12)) = 1.156 Hz; 100 averages.
		{"density", "", check("C", "noise_density", "take = \"x\"\nat = \"10 Hz\""), 86, "averages"},
		{"low band", "", check("C", "noise", "take = \"x\"\nband = \"0.5 Hz .. 20 kHz\""), 40, "lower end"},
		{"hum", "", check("C", "hum", "take = \"x\""), 20, "mains line"},
		{"events", "", check("C", "events", "take = \"x\""), 60, ""},
		{"a span", "span = \"100 s .. 120 s\"", check("C", "hum", "take = \"x\""), 120, "span"},
	} {
		p := Make(load(t, gear+take("x", c.keys)+c.check), Options{})
		k := find(t, p, "x")
		if k.LengthS == nil || *k.LengthS < c.least || *k.LengthS > 1.8*c.least+3 {
			t.Errorf("%s: %v s, wanted about %g s (%s)", c.name, number(k.LengthS), c.least, k.LengthWhy)
		}
		if !strings.Contains(k.LengthWhy, c.why) {
			t.Errorf("%s: because %q, wanted %q", c.name, k.LengthWhy, c.why)
		}
	}
}

func number(x *float64) float64 {
	if x == nil {
		return math.NaN()
	}
	return *x
}

// What would make a check not measurable is said while it can be changed.
func TestDoubts(t *testing.T) {
	for _, c := range []struct{ name, keys, check, want string }{
		{"no volts", "gear = \"bare\"", check("C", "noise", "take = \"x\"\nmax = \"1 mV\""), "volts at full scale"},
		{"no volts, none needed", "gear = \"bare\"\nin = 2", check("C", "gain", "take = \"x\"\nmin = \"1 dB\""), ""},
		{"no volts, limit against full scale", "gear = \"bare\"", check("C", "level", "take = \"x\"\nmax = \"-20 dBFS\""), ""},
		{"DC through AC", "", check("C", "dc", "take = \"x\"\nmax = \"1 mV\""), "AC-coupled"},
		{"tone on a mains line", "in = 2", check("C", "gain", "take = \"x\"\nat = \"100 Hz\""), "mains line"},
		{"1 kHz is the twentieth mains line", "in = 2", check("C", "thd", "take = \"x\"\nat = \"1 kHz\""), "943 Hz"},
		{"band beyond the rate", "gear = \"fixed\"", check("C", "noise", "take = \"x\"\nband = \"20 Hz .. 40 kHz\""), "band reaches"},
		{"window narrower than the gear allows", "", check("C", "level", "take = \"x\"\nnominal = \"1 V\"\nwithin = \"0.3 %\""), "conditional pass"},
		{"recorder too small", "", check("C", "power", "take = \"x\"\nload = \"8 ohm\"\nmin = \"8 W\""), "pad"}, // 8 V RMS, 11.3 V peak
		{"no baseline", "", check("C", "pickup", "take = \"x\"\nlength = \"85 m\""), "baseline"},
		{"no floor", "", check("C", "noise", `take = "x"`), "floor"},
		{"two signals", "in = 2", check("C", "gain", `take = "x"`) + check("D", "flatness", `take = "x"`), "takes of their own"},
		{"nobody reads it", "", check("C", "entered", "value = \"1 V\""), "no check"},
	} {
		text := gear + "[gear.fixed]\nkind = \"audio\"\nfull_scale_peak = \"5 V\"\nrate = \"48 kHz\"\n" + take("x", c.keys) + c.check
		if strings.Contains(c.keys, "gear") {
			text = strings.Replace(text, "gear = \"box\"\n", "", 1)
		}
		k := find(t, Make(load(t, text), Options{}), "x")
		all := strings.Join(k.Doubts, "; ")
		if c.want == "" && all != "" || !strings.Contains(all, c.want) {
			t.Errorf("%s: %q, wanted %q", c.name, all, c.want)
		}
	}
}

// Cautions stand at the step they belong to, and none is ever about taking an
// earth off.
func TestCautions(t *testing.T) {
	text := gear + take("floor", "") + take("noise", "where = { source = \"150 ohm\" }") + take("full", "in = 2") +
		strings.Replace(take("dc", "gear = \"scope\""), "gear = \"box\"\n", "", 1) + take("run", "mains = 2") +
		check("Noise", "noise", "take = \"noise\"\nfloor = \"floor\"") + check("DC", "dc", `take = "dc"`) +
		check("Power", "power", "take = \"full\"\nload = \"8 ohm\"\nmin = \"8 W\"") + check("Run", "pickup", "take = \"run\"\nlength = \"85 m\"")
	p := Make(load(t, text), Options{})
	for name, want := range map[string][]string{
		"floor": nil,
		"noise": {cautionPhantom},
		"dc":    {cautionFirst, cautionMains, cautionEarth, cautionClip},
		"full":  {cautionPad, cautionBurst, cautionEars, "for 25 W or more"}, // 8 W, three times: 24 W
		"run":   {cautionWire, cautionEarth},
	} {
		got := strings.Join(find(t, p, name).Cautions, "\n")
		for _, w := range want {
			if !strings.Contains(got, w) {
				t.Errorf("%s lacks the caution %q", name, w)
			}
		}
		if want == nil && got != "" {
			t.Errorf("%s: %q", name, got)
		}
	}
	for _, k := range p.Takes {
		for _, c := range append(append([]string{}, k.Cautions...), p.First...) {
			for _, bad := range []string{"lift", "disconnect the earth", "remove the earth", "earth adapt"} {
				if strings.Contains(strings.ToLower(c), bad) {
					t.Errorf("%s: %q", k.Name, c)
				}
			}
		}
	}
}

// What is there is told from what is missing, and from what cannot be read.
func TestFound(t *testing.T) {
	text := gear + take("there", "in = 2") + take("lost", "in = 2") + take("broken", "in = 2") +
		check("Gain", "gain", "each = [\"there\", \"lost\", \"broken\"]\nat = \"110 Hz\"")
	header := func(path string, _ recording.Options) (*recording.Info, error) {
		switch filepath.Base(path) {
		case "there.wav":
			return &recording.Info{Format: "WAV 24-bit PCM", RateHz: 48000, Frames: 4800, Channels: make([]recording.Channel, 2)}, nil
		case "broken.wav":
			return nil, &recording.Error{Path: path, Offset: 12, What: "no data chunk", Class: recording.ErrFormat}
		}
		return nil, fs.ErrNotExist
	}
	p := Make(load(t, text), Options{Header: header})
	there, lost, broken := find(t, p, "there"), find(t, p, "lost"), find(t, p, "broken")
	if p.Missing != 1 || there.Missing || !lost.Missing || broken.Missing {
		t.Errorf("%d missing: %v %v %v", p.Missing, there.Missing, lost.Missing, broken.Missing)
	}
	if !strings.Contains(there.Found, "0.1") && !strings.Contains(there.Found, "100") {
		t.Errorf("found %q", there.Found)
	}
	if !strings.Contains(strings.Join(there.Doubts, " "), "at least") {
		t.Errorf("0.1 s of 110 Hz beside 100 Hz: %q", there.Doubts)
	}
	if !strings.Contains(broken.Fault, "takes/broken.wav") || !strings.Contains(broken.Fault, "no data chunk") {
		t.Errorf("fault %q", broken.Fault)
	}
}
