package job

import (
	"fmt"
	"math"
	"strings"
	"testing"

	"benchslip/analyze"
	"benchslip/analyze/keys"
	"benchslip/capture/unit"
)

// every key of the table, written as in the manual, reaches the job.

const twoTakes = `[takes.a]
file = "a.wav"
in = 2
driven = 2
out2 = 2
[takes.b]
file = "b.wav"
in = 2
`

// needed are the keys a measure cannot do without, as text.
var needed = map[string]string{
	"harmonic": "order = 2\n", "difference_distortion": "order = 2\n", "noise_density": "at = \"1 kHz\"\n",
	"response": "at = \"1 kHz\"\n", "ein": "gain = \"40 dB\"\n", "pickup": "length = \"85 m\"\n",
	"cmrr": "differential = \"a\"\ncommon = \"b\"\n", "output_impedance": "open = \"a\"\nloaded = \"b\"\nload = \"8 ohm\"\n",
	"input_impedance": "direct = \"a\"\nseries_take = \"b\"\nseries = \"1 kohm\"\n", "power": "load = \"8 ohm\"\n",
	"entered": "value = \"1 V\"\n",
}

func takeName(t *analyze.Take) any {
	if t == nil {
		return nil
	}
	return t.Name
}

func roleName(role string) func(*Check) any {
	return func(c *Check) any { return takeName(first(c.Rows()[0].Roles()[role])) }
}

func first(ts []*analyze.Take) *analyze.Take {
	if len(ts) == 0 {
		return nil
	}
	return ts[0]
}

func num(get func(*analyze.Params) *float64) func(*Check) any {
	return func(c *Check) any {
		if x := get(&c.Params); x != nil {
			return *x
		}
		return nil
	}
}

func stated(get func(*analyze.Params) *analyze.Stated) func(*Check) any {
	return func(c *Check) any {
		if s := get(&c.Params); s != nil {
			return s.Value.Linear()
		}
		return nil
	}
}

func statedU(get func(*analyze.Params) *analyze.Stated) func(*Check) any {
	return func(c *Check) any {
		if s := get(&c.Params); s != nil && s.Uncertainty != nil {
			return s.Uncertainty.Text
		}
		return nil
	}
}

func text(q *unit.Quantity) any {
	if q == nil {
		return nil
	}
	return q.Text
}

type sample struct {
	measure string
	toml    string // the whole line, and what the key needs beside it
	get     func(*Check) any
	want    any
}

var checkSamples = map[string]sample{
	"name":             {"level", "", func(c *Check) any { return c.Name }, "row"},
	"measure":          {"level", "", func(c *Check) any { return c.Measure }, "level"},
	"class":            {"level", `class = "critical"`, func(c *Check) any { return c.Class }, "critical"},
	"clause":           {"level", `clause = "4.2"`, func(c *Check) any { return c.Clause }, "4.2"},
	"optional":         {"level", `optional = true`, func(c *Check) any { return c.Optional }, true},
	"take":             {"max_output", `take = ["a", "b"]`, func(c *Check) any { return len(c.Rows()[0].Roles()["take"]) }, 2},
	"each":             {"level", `each = ["a", "b"]`, func(c *Check) any { return c.Rows()[1].Name }, "row: b"},
	"repeat":           {"level", `repeat = ["a", "b"]`, func(c *Check) any { return len(c.Repeat) + len(c.Rows()[0].Main) }, 4},
	"against":          {"level", `against = "b"`, func(c *Check) any { return takeName(c.Against) }, "b"},
	"min":              {"level", `min = "1 V"`, func(c *Check) any { return text(c.Rows()[0].Limits.Min) }, "1 V"},
	"max":              {"level", `max = "-60 dBFS"`, func(c *Check) any { return text(c.Rows()[0].Limits.Max) }, "-60 dBFS"},
	"nominal":          {"level", "nominal = \"4 dBu\"\nwithin = \"1 dB\"", func(c *Check) any { return text(c.Rows()[0].Limits.Max) }, "5 dBu"},
	"within":           {"level", "nominal = \"2 V\"\nwithin = \"5 %\"", func(c *Check) any { return text(c.Rows()[0].Limits.Min) }, "1.9 V"},
	"typical":          {"level", `typical = "3 mV"`, func(c *Check) any { return text(c.Rows()[0].Limits.Typical) }, "3 mV"},
	"waiver":           {"level", `waiver = { by = "K", why = "old", ticket = "SK-1" }`, func(c *Check) any { return *c.Waiver }, Waiver{"K", "old", "SK-1"}},
	"where":            {"level", `where = { gain = "40 dB", phantom = true }`, func(c *Check) any { return fmt.Sprint(c.Where) }, "[{gain 40 dB} {phantom true}]"},
	"out":              {"level", `out = "1-2"`, func(c *Check) any { return c.Params.Out }, "1-2"},
	"in":               {"gain", `in = 1`, func(c *Check) any { return c.Params.In }, "1"},
	"out2":             {"balance", `out2 = 2`, func(c *Check) any { return c.Params.Out2 }, "2"},
	"driven":           {"crosstalk", `driven = "CH2"`, func(c *Check) any { return c.Params.Driven }, "CH2"},
	"mains":            {"hum", `mains = 2`, func(c *Check) any { return c.Params.Mains }, "2"},
	"span":             {"level", `span = "-1 ms .."`, func(c *Check) any { return *c.Params.Span }, analyze.Span{From: -0.001, HasFrom: true, Text: "-1 ms .."}},
	"in_level":         {"gain", `in_level = "-40 dBu"`, func(c *Check) any { return text(c.Params.InLevel) }, "-40 dBu"},
	"in_uncertainty":   {"gain", `in_uncertainty = "0.1 dB"`, func(c *Check) any { return text(c.Params.InUncertainty) }, "0.1 dB"},
	"in_factor":        {"gain", `in_factor = 2`, func(c *Check) any { return c.Params.InFactor }, 2.0},
	"at":               {"cmrr", `at = ["100 Hz", "1 kHz"]`, func(c *Check) any { return fmt.Sprint(c.Params.At) }, "[100 1000]"},
	"band":             {"thd", `band = "20 Hz .. 22.05 kHz"`, func(c *Check) any { return *c.Params.Band }, analyze.Band{Low: 20, High: 22050}},
	"weighting":        {"noise", `weighting = "468"`, func(c *Check) any { return c.Params.Weighting }, "468"},
	"order":            {"hum", `order = 3`, func(c *Check) any { return c.Params.Order }, 3},
	"harmonics":        {"thd", `harmonics = 100`, func(c *Check) any { return c.Params.Harmonics }, 100},
	"reference":        {"thd", `reference = "total"`, func(c *Check) any { return c.Params.Reference }, "total"},
	"gain":             {"hum", `gain = "100 x"`, stated(func(p *analyze.Params) *analyze.Stated { return p.Gain }), 100.0},
	"gain_take":        {"hum", `gain_take = "b"`, roleName("gain_take"), "b"},
	"gain_uncertainty": {"ein", `gain_uncertainty = "1 %"`, statedU(func(p *analyze.Params) *analyze.Stated { return p.Gain }), "1 %"},
	"source":           {"ein", `source = "150 Ω"`, stated(func(p *analyze.Params) *analyze.Stated { return p.Source }), 150.0},
	"temperature":      {"ein", `temperature = "20 degC"`, num(func(p *analyze.Params) *float64 { return p.Temperature }), 293.15},
	"input_resistance": {"ein", `input_resistance = "1.5 kohm"`, num(func(p *analyze.Params) *float64 { return p.InputR }), 1500.0},
	"plane":            {"ein", `plane = "emf"`, func(c *Check) any { return c.Params.Plane }, "emf"},
	"r1":               {"cmrr", `r1 = "10 kohm"`, num(func(p *analyze.Params) *float64 { return p.R1 }), 1e4},
	"r2":               {"cmrr", `r2 = "10 kohm"`, num(func(p *analyze.Params) *float64 { return p.R2 }), 1e4},
	"r3":               {"cmrr", `r3 = "10 kohm"`, num(func(p *analyze.Params) *float64 { return p.R3 }), 1e4},
	"r4":               {"cmrr", `r4 = "10 kohm"`, num(func(p *analyze.Params) *float64 { return p.R4 }), 1e4},
	"source_match":     {"cmrr", `source_match = "0.1 %"`, num(func(p *analyze.Params) *float64 { return p.SourceMatch }), 0.001},
	"floor":            {"noise", `floor = "b"`, roleName("floor"), "b"},
	"loop":             {"thd", `loop = "b"`, roleName("loop"), "b"},
	"baseline":         {"pickup", `baseline = "b"`, roleName("baseline"), "b"},
	"differential":     {"cmrr", "", roleName("differential"), "a"},
	"common":           {"cmrr", "", roleName("common"), "b"},
	"open":             {"output_impedance", "", roleName("open"), "a"},
	"loaded":           {"output_impedance", "", roleName("loaded"), "b"},
	"direct":           {"input_impedance", "", roleName("direct"), "a"},
	"series_take":      {"input_impedance", "", roleName("series_take"), "b"},
	"in_take":          {"gain", `in_take = "b"`, roleName("in_take"), "b"},

	"load":                   {"power", "", stated(func(p *analyze.Params) *analyze.Stated { return p.Load }), 8.0},
	"load_uncertainty":       {"power", `load_uncertainty = "1 %"`, statedU(func(p *analyze.Params) *analyze.Stated { return p.Load }), "1 %"},
	"series":                 {"input_impedance", "", stated(func(p *analyze.Params) *analyze.Stated { return p.Series }), 1000.0},
	"series_uncertainty":     {"input_impedance", `series_uncertainty = "10 ohm"`, statedU(func(p *analyze.Params) *analyze.Stated { return p.Series }), "10 ohm"},
	"length":                 {"pickup", "", stated(func(p *analyze.Params) *analyze.Stated { return p.Length }), 85.0},
	"length_uncertainty":     {"pickup", `length_uncertainty = "1 m"`, statedU(func(p *analyze.Params) *analyze.Stated { return p.Length }), "1 m"},
	"resistance":             {"corner_low", `resistance = "50 kohm"`, stated(func(p *analyze.Params) *analyze.Stated { return p.Resistance }), 5e4},
	"resistance_uncertainty": {"corner_low", "resistance = \"50 kohm\"\nresistance_uncertainty = \"20 %\"", statedU(func(p *analyze.Params) *analyze.Stated { return p.Resistance }), "20 %"},
	"rails":                  {"max_output", `rails = "15 V"`, stated(func(p *analyze.Params) *analyze.Stated { return p.Rails }), 15.0},
	"rails_uncertainty":      {"max_output", "rails = \"15 V\"\nrails_uncertainty = \"0.2 V\"", statedU(func(p *analyze.Params) *analyze.Stated { return p.Rails }), "0.2 V"},

	"ref":             {"flatness", `ref = "500 Hz"`, num(func(p *analyze.Params) *float64 { return p.Ref }), 500.0},
	"drop":            {"corner_high", `drop = "1 dB"`, num(func(p *analyze.Params) *float64 { return p.Drop }), 1.0},
	"ref_level":       {"snr", `ref_level = "4 dBu"`, func(c *Check) any { return text(c.Params.RefLevel) }, "4 dBu"},
	"max_each":        {"hum", `max_each = "10 uV"`, func(c *Check) any { return text(c.Params.MaxEach) }, "10 uV"},
	"thdn":            {"max_output", `thdn = "0.1 %"`, num(func(p *analyze.Params) *float64 { return p.THDN }), 0.001},
	"tolerance":       {"settling_time", `tolerance = "1 %"`, num(func(p *analyze.Params) *float64 { return p.Tolerance }), 0.01},
	"instrument_rise": {"rise_time", `instrument_rise = "35 ns"`, num(func(p *analyze.Params) *float64 { return p.InstrumentRise }), 35e-9},
	"above":           {"oscillation", `above = "100 kHz"`, num(func(p *analyze.Params) *float64 { return p.Above }), 1e5},
	"value":           {"entered", "", func(c *Check) any { return text(c.Params.Value) }, "1 V"},
	"uncertainty":     {"entered", `uncertainty = "0.02 V"`, func(c *Check) any { return text(c.Params.Uncertainty) }, "0.02 V"},
	"with":            {"entered", `with = "bench meter"`, func(c *Check) any { return c.Params.With }, "bench meter"},
}

func TestEveryCheckKey(t *testing.T) {
	for _, k := range keys.At(keys.Check) {
		if k.Name == "limits_from" {
			continue // see TestLimitsFrom
		}
		s, ok := checkSamples[k.Name]
		if !ok {
			t.Errorf("no sample for %q", k.Name)
			continue
		}
		m, _ := keys.FindMeasure(s.measure)
		body := "[[checks]]\nname = \"row\"\nmeasure = \"" + s.measure + "\"\n" + s.toml + "\n"
		if len(m.Roles) == 1 && !strings.Contains(s.toml, "take = [") && !strings.HasPrefix(s.toml, "each") && !strings.HasPrefix(s.toml, "repeat") {
			body += "take = \"a\"\n"
		}
		for _, line := range strings.SplitAfter(needed[s.measure], "\n") {
			if name, _, _ := strings.Cut(line, " "); !strings.Contains("\n"+s.toml, "\n"+name+" ") {
				body += line
			}
		}
		j, err := read(t, twoTakes+body, Options{})
		if err != nil {
			t.Errorf("%s: %v", k.Name, err)
			continue
		}
		if got := s.get(j.Checks[0]); got != s.want {
			t.Errorf("%s: got %v, want %v", k.Name, got, s.want)
		}
	}
}

// Each check key is refused by every measure that does not take it.
func TestKeysOfOtherMeasures(t *testing.T) {
	pairs := 0
	for _, m := range keys.Measures() {
		text, foreign := twoTakes+"[[checks]]\nname = \"row\"\nmeasure = \""+m.Name+"\"\n", []string(nil)
		for _, k := range keys.At(keys.Check) {
			if !k.Takes(m.Name) {
				text += k.Name + " = 1\n"
				foreign = append(foreign, k.Name)
			}
		}
		_, err := parse("job.toml", "testdata", []byte(text), Options{})
		for _, name := range foreign {
			pairs++
			if err == nil || !strings.Contains(err.Error(), "measure `"+m.Name+"` does not take the key `"+name+"`") {
				t.Errorf("%s takes %s", m.Name, name)
			}
		}
	}
	if pairs < 1000 {
		t.Fatalf("only %d pairs", pairs)
	}
}

func TestEveryOtherKey(t *testing.T) {
	for _, c := range []struct {
		place keys.Place
		head  string
		lines map[string]string
		get   func(*Job, string) any
		want  map[string]any
	}{
		{keys.Gear, "[gear.g]\n", map[string]string{
			"kind": `kind = "audio"`, "full_scale_peak": `full_scale_peak = "4.92 V"`, "full_scale_sine": `full_scale_sine = "13 dBu"`,
			"probe": `probe = 10`, "coupling": `coupling = "dc"`, "uncertainty": `uncertainty = "0.1 dB"`,
			"offset_uncertainty": `offset_uncertainty = "2 mV"`, "calibrated": `calibrated = "2026-11-12"`, "clock": `clock = "50 ppm"`,
			"channel_match": `channel_match = "0.05 dB"`, "separation": `separation = "80 dB"`, "skew": `skew = "20 ns"`,
			"rate": `rate = "96 kHz"`, "mode": `mode = "line"`,
		}, func(j *Job, k string) any {
			g := j.Gear[0]
			switch k {
			case "kind":
				return g.Kind
			case "full_scale_peak", "full_scale_sine":
				return round(g.FullScalePeak)
			case "probe":
				return g.Probe
			case "coupling":
				return g.DC
			case "uncertainty":
				return round(*g.ScaleU)
			case "offset_uncertainty":
				return g.OffsetU
			case "calibrated":
				return g.Calibrated
			case "clock":
				return round(g.Gear.Clock)
			case "channel_match":
				return round(g.ChannelMatch)
			case "separation":
				return round(g.Separation)
			case "skew":
				return g.Skew
			case "rate":
				return g.Rate
			}
			return g.Mode
		}, map[string]any{
			// dB to a fraction by 8.685890 dB; standard = half the expanded
			"kind": "audio", "full_scale_peak": 4.92, "full_scale_sine": round(math.Sqrt2 * math.Sqrt(0.6) * math.Pow(10, 0.65)), "probe": 10.0,
			"coupling": true, "uncertainty": round(0.1 / 8.685889638 / 2), "offset_uncertainty": 0.001, "calibrated": "2026-11-12",
			"clock": 25e-6, "channel_match": round(0.05 / 8.685889638 / 2), "separation": 80.0, "skew": 1e-8, "rate": 96e3, "mode": "line",
		}},
		{keys.Take, "[takes.t]\n", map[string]string{
			"file": "", "gear": `gear = "g"`, "note": `note = "n"`, "setup": `setup = "end-150"`, "out": `out = "CH1"`, "in": `in = 2`,
			"out2": `out2 = 2`, "driven": `driven = 2`, "mains": `mains = 2`, "span": `span = ".. 7 s"`, "in_level": `in_level = "7.75 mV"`,
			"in_uncertainty": "in_level = \"1 V\"\nin_uncertainty = \"unknown\"", "in_factor": `in_factor = 2.0`,
			"stimulus": `stimulus = "sweep from=20Hz to=20kHz length=10s peak=-10dBFS"`, "where": `where.gain = "40 dB"`, "csv": `csv.skip = 3`,
		}, func(j *Job, k string) any {
			v, w := j.Takes[0], j.Takes[0].Wiring
			switch k {
			case "file":
				return v.File
			case "gear":
				return v.Gear.Name
			case "note":
				return v.Note
			case "setup":
				return v.Setup
			case "out":
				return w.Out
			case "in":
				return w.In
			case "out2":
				return w.Out2
			case "driven":
				return w.Driven
			case "mains":
				return w.Mains
			case "span":
				return w.Span.To
			case "in_level":
				return w.InLevel.Linear()
			case "in_uncertainty":
				return w.InUncertainty == nil
			case "in_factor":
				return w.InFactor
			case "stimulus":
				return v.Stimulus
			case "where":
				s, _ := v.Condition("gain")
				return s
			}
			return v.CSV.Skip
		}, map[string]any{"file": "t.wav", "gear": "g", "note": "n", "setup": "end-150", "out": "CH1", "in": "2", "out2": "2", "driven": "2",
			"mains": "2", "span": 7.0, "in_level": 0.00775, "in_uncertainty": true, "in_factor": 2.0,
			"stimulus": "sweep from=20Hz to=20kHz length=10s peak=-10dBFS", "where": "40 dB", "csv": 3}},
		{keys.CSV, "[takes.t]\n", map[string]string{
			"separator": `csv.separator = ";"`, "decimal": `csv.decimal = ","`, "skip": `csv.skip = 2`, "time_column": `csv.time_column = "none"`,
			"time_unit": `csv.time_unit = "us"`, "rate": `csv.rate = "1 MHz"`, "value_unit": `csv.value_unit = "mV"`, "resample": `csv.resample = true`,
		}, func(j *Job, k string) any {
			o := j.Takes[0].CSV
			return map[string]any{"separator": o.Separator, "decimal": o.Decimal, "skip": o.Skip, "time_column": o.TimeColumn,
				"time_unit": o.TimeUnit, "rate": o.RateHz, "value_unit": o.ValueUnit, "resample": o.Resample}[k]
		}, map[string]any{"separator": ";", "decimal": ",", "skip": 2, "time_column": "none", "time_unit": "us", "rate": 1e6, "value_unit": "mV", "resample": true}},
	} {
		for _, k := range keys.At(c.place) {
			line, ok := c.lines[k.Name]
			if !ok {
				t.Errorf("no sample for %q", k.Name)
				continue
			}
			body := c.head + line + "\n"
			switch {
			case c.place != keys.Gear:
				body += "file = \"t.wav\"\n[gear.g]\nkind = \"audio\"\n"
			case k.Name == "probe":
				body += "kind = \"scope\"\n"
			case k.Name != "kind":
				body += "kind = \"audio\"\n"
			}
			j, err := read(t, body, Options{})
			if err != nil {
				t.Errorf("%s: %v", k.Name, err)
				continue
			}
			if got := c.get(j, k.Name); got != c.want[k.Name] {
				t.Errorf("%s: got %v, want %v", k.Name, got, c.want[k.Name])
			}
		}
	}
	j := mustRead(t, "format = 1\ntitle = \"T\"\n[rule]\ndecision = \"guarded\"\ncoverage = 3\n[mains]\nfrequency = \"find\"\n[record]\n"+
		"date = 2026-12-01\nmeasured = \"lamp room\"\noperator = \"K\"\nattempt = 2\nreplaces = \"9f31c2a07d44\"\nspec = \"3\"\napproved = \"L\"\n")
	if j.Title != "T" || j.Decision != "guarded" || j.Coverage != 3 || j.Mains != "find" || j.MainsHz != 0 || len(j.Record) != len(keys.At(keys.Record)) || j.Record[3].Value != "2" {
		t.Errorf("head: %+v", j)
	}
}

func round(x float64) float64 { return math.Round(x*1e9) / 1e9 }

// The table agrees with itself: names once a place, measures that exist.
func TestTable(t *testing.T) {
	known := map[string]bool{}
	for _, m := range keys.Measures() {
		if known[m.Name] {
			t.Errorf("measure %s twice", m.Name)
		}
		known[m.Name] = true
		if u, err := unit.Lookup(m.Unit); err != nil || len(m.Dims) > 0 && u.Dim != m.Dims[0] {
			t.Errorf("%s: own unit %q does not fit its limits", m.Name, m.Unit)
		}
		for _, r := range m.Roles {
			if k, ok := keys.Find(r, keys.Check); !ok || !k.Takes(m.Name) {
				t.Errorf("%s needs %s and does not take it", m.Name, r)
			}
		}
		for _, need := range m.Needs {
			for _, n := range need {
				if _, ok := keys.Find(n, keys.Check|keys.Take); !ok {
					t.Errorf("%s needs %q, which is no key", m.Name, n)
				}
			}
		}
	}
	if len(known) < 40 {
		t.Fatalf("only %d measures", len(known))
	}
	for place := keys.Job; place <= keys.Waiver; place <<= 1 {
		seen := map[string]bool{}
		for _, k := range keys.At(place) {
			if seen[k.Name] {
				t.Errorf("key %s twice", k.Name)
			}
			seen[k.Name] = true
			for _, m := range k.Measures {
				if !known[m] {
					t.Errorf("key %s belongs to %q, which is no measure", k.Name, m)
				}
			}
			if k.Doc == "" {
				t.Errorf("key %s has no line of documentation", k.Name)
			}
		}
	}
}
