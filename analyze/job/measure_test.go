package job

import (
	"strings"
	"testing"

	"benchslip/analyze/keys"
)

func TestFromMeasure(t *testing.T) {
	opts := map[string]string{
		"at": "1042 Hz", "min": "39.5 dB", "in": "2", "channel": "1", "in_take": "/abs/stim.wav",
		"full_scale_peak": "4.92 V", "gear_uncertainty": "0.5 %", "mains_frequency": "60 Hz", "coverage": "3", "csv_skip": "2", "span": "1 s ..",
	}
	j, err := FromMeasure("gain", []string{`C:\takes\a.wav`, "../b.wav"}, opts, Options{Headers: fakeHeaders})
	if err != nil {
		t.Fatal(err)
	}
	c := j.Checks[0]
	rows := c.Rows()
	if len(rows) != 2 || rows[0].Name != `gain: C:\takes\a.wav` || rows[1].Main[0].Path != "../b.wav" {
		t.Errorf("rows: %+v", rows)
	}
	if c.Params.At[0] != 1042 || c.Params.Out != "1" || c.Params.In != "2" || rows[0].Limits.Min.Text != "39.5 dB" || !c.Params.Span.HasFrom {
		t.Errorf("params: %+v", c.Params)
	}
	if rows[0].Roles()["in_take"][0].Path != "/abs/stim.wav" || len(j.Takes) != 3 {
		t.Errorf("roles: %v", rows[0].Roles())
	}
	if g := j.Takes[0].Gear; g == nil || g.FullScalePeak != 4.92 || *g.ScaleU != 0.0025 || j.MainsHz != 60 || j.Coverage != 3 || j.Takes[0].CSV.Skip != 2 {
		t.Errorf("gear %+v", g)
	}
	one, err := FromMeasure("level", []string{"a.wav"}, nil, Options{})
	if err != nil || one.Checks[0].Rows()[0].Name != "level" || one.Takes[0].Gear != nil {
		t.Errorf("plain: %+v, %v", one, err)
	}
	many, err := FromMeasure("max_output", []string{"a.wav", "b.wav"}, map[string]string{"thdn": "1 %"}, Options{})
	if err != nil || len(many.Checks[0].Rows()) != 1 || len(many.Checks[0].Rows()[0].Main) != 2 {
		t.Errorf("max_output: %+v, %v", many, err)
	}
	cm, err := FromMeasure("cmrr", nil, map[string]string{"differential": "d.wav", "common": "c.wav", "in": "2", "at": "100 Hz, 1 kHz"}, Options{})
	if err != nil || len(cm.Checks[0].Params.At) != 2 || cm.Checks[0].Rows()[0].Roles()["common"][0].File != "c.wav" {
		t.Errorf("cmrr: %+v, %v", cm, err)
	}
	hand, err := FromMeasure("entered", nil, map[string]string{"value": "15 V", "uncertainty": "0.1 V", "max": "16 V"}, Options{})
	if err != nil || hand.Checks[0].Params.Value.Number != 15 || hand.Checks[0].Rows()[0].Limits.Max == nil {
		t.Errorf("entered: %+v, %v", hand, err)
	}
	// a recorder's take and a scope's: each option goes where it belongs
	both, err := FromMeasure("level", []string{"a.csv", "b.wav"}, map[string]string{"full_scale_peak": "4 V", "gear_uncertainty": "1 %"}, Options{Headers: fakeHeaders})
	if err != nil || both.Takes[0].Gear.Kind != "scope" || both.Takes[1].Gear.FullScalePeak != 4 {
		t.Errorf("both kinds: %+v, %v", both, err)
	}
}

func TestFromMeasureFaults(t *testing.T) {
	for _, c := range []struct {
		name  string
		files []string
		opts  map[string]string
		want  []string // start of each line
	}{
		{"gian", []string{"a.wav"}, nil, []string{"measure: unknown measure \"gian\"; did you mean `gain`?"}},
		{"gain", []string{"a.wav"}, map[string]string{"in": "2", "att": "1 kHz", "min": "3 V"}, []string{"--att: measure gain has no such option; did you mean --at?"}},
		{"gain", []string{"a.wav"}, map[string]string{"in": "2", "at": "1042", "min": "39,5 dB"}, []string{`--at: ` + "`at`" + `: "1042" has no unit: write "1042 Hz"`, `--min: `}},
		{"level", []string{"a.wav"}, map[string]string{"weighting": "A"}, []string{"--weighting: measure level has no such option; it belongs to noise"}},
		{"level", []string{"a.wav"}, map[string]string{"out": "2"}, []string{"--out: measure level has no such option; the channel is chosen with --channel"}},
		{"level", []string{"a.wav"}, map[string]string{"gain_tak": "2"}, []string{"--gain-tak: measure level has no such option"}},
		{"thd", []string{"a.wav"}, map[string]string{"harmonics": "ten"}, []string{"--harmonics: "}},
		{"level", nil, nil, []string{"measure level: expected a FILE"}},
		{"cmrr", []string{"a.wav"}, nil, []string{"measure cmrr: reads no plain FILE: name its takes with --differential and --common"}},
		{"gain", []string{"a.wav"}, nil, []string{"measure gain: measure `gain` needs `in`"}},
		{"level", []string{"a.wav"}, map[string]string{"channel": "3"}, []string{"--channel: "}},
		{"level", []string{"a.wav", "a.wav"}, nil, []string{"FILE: "}},
	} {
		_, err := FromMeasure(c.name, c.files, c.opts, Options{Headers: fakeHeaders})
		if err == nil {
			t.Errorf("%s %v %v was taken", c.name, c.files, c.opts)
			continue
		}
		lines := strings.Split(err.Error(), "\n")
		if len(lines) != len(c.want) {
			t.Errorf("%s %v: %d lines:\n%v", c.name, c.opts, len(lines), err)
			continue
		}
		for i, w := range c.want {
			if !strings.HasPrefix(lines[i], w) {
				t.Errorf("got  %s\nwant %s", lines[i], w)
			}
		}
	}
}

func TestMeasureKeys(t *testing.T) {
	for _, m := range keys.Measures() {
		seen := map[string]bool{}
		for _, k := range MeasureKeys(m.Name) {
			if seen[k.Option] {
				t.Errorf("%s: --%s twice", m.Name, k.Option)
			}
			seen[k.Option] = true
		}
		if seen["out"] || m.Roles != nil && !seen["channel"] {
			t.Errorf("%s: options %v", m.Name, seen)
		}
	}
}
