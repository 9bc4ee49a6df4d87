package job

import (
	"os"
	"path/filepath"
	"strings"
	"testing"

	"benchslip/capture/unit"
)

// nominal and within become min and max in the nominal's unit, as decimals
// that one would write.
func TestAround(t *testing.T) {
	for _, c := range []struct{ nominal, within, min, max string }{
		{"40 dB", "0.5 dB", "39.5 dB", "40.5 dB"},
		{"-125 dBu", "1 dB", "-126 dBu", "-124 dBu"},
		{"13 dBm", "0.5 dB", "12.5 dBm", "13.5 dBm"},
		{"-20 dBFS", "0.1 dB", "-20.1 dBFS", "-19.9 dBFS"},
		{"0.3 V", "0.1 V", "0.2 V", "0.4 V"},
		{"15 V", "200 mV", "14.8 V", "15.2 V"},
		{"15 V", "2 %", "14.7 V", "15.3 V"},
		{"-15 V", "2 %", "-15.3 V", "-14.7 V"},
		{"100 x", "1 %", "99 x", "101 x"},
		{"100 x", "2 x", "98 x", "102 x"},
		{"1 %", "0.2 %", "0.8 %", "1.2 %"}, // points: the nominal itself is in %
		{"10 kHz", "50 Hz", "9.95 kHz", "10.05 kHz"},
		{"2 ms", "100 ppm", "1.9998 ms", "2.0002 ms"},
		{"20 degC", "2 K", "18 degC", "22 degC"},
		{"1", "0", "1", "1"},
	} {
		nom, err := unit.Parse(c.nominal)
		if err != nil {
			t.Fatal(err)
		}
		w, err := unit.Parse(c.within)
		if err != nil {
			t.Fatal(err)
		}
		half, why := halfWidth(nom, w)
		if why != "" {
			t.Errorf("%s within %s: %s", c.nominal, c.within, why)
			continue
		}
		lo, hi := shifted(nom, -half), shifted(nom, half)
		wantLo, _ := unit.Parse(c.min)
		wantHi, _ := unit.Parse(c.max)
		if *lo != wantLo || *hi != wantHi {
			t.Errorf("%s within %s: got %s .. %s, want %s .. %s", c.nominal, c.within, lo.Text, hi.Text, c.min, c.max)
		}
	}
}

const gains = `[takes.a]
file = "a.wav"
in = 2
[takes.b]
file = "b.wav"
in = 2
`

func TestLimitsFrom(t *testing.T) {
	dir := t.TempDir()
	if err := os.Mkdir(filepath.Join(dir, "golden"), 0o755); err != nil {
		t.Fatal(err)
	}
	slip := `{"format": 1, "checks": [
		{"name": "gain: a", "value": 39.98, "unit": "dB"}, {"name": "gain: b", "value": 20.02, "unit": "dB"},
		{"name": "hiss", "value": null, "unit": "dBu"}, {"name": "rate", "value": 1, "unit": "Hz"}]}`
	write := func(name, text string) {
		if err := os.WriteFile(filepath.Join(dir, filepath.FromSlash(name)), []byte(text), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	write("golden/slip.json", slip)
	write("golden/other.json", `{"a": 1}`)
	job := func(s string) (*Job, error) { return parse("job.toml", dir, []byte(gains+"[[checks]]\n"+s), Options{}) }

	j, err := job("name = \"gain\"\nmeasure = \"gain\"\neach = [\"a\", \"b\"]\nlimits_from = \"golden/slip.json\"\nwithin = \"0.5 dB\"\n")
	if err != nil {
		t.Fatal(err)
	}
	rows := j.Checks[0].Rows()
	if rows[0].Limits.Min.Text != "39.48 dB" || rows[1].Limits.Max.Text != "20.52 dB" || rows[0].Limits.From != "golden/slip.json" {
		t.Errorf("got %+v, %+v", rows[0].Limits, rows[1].Limits)
	}
	if len(j.Slips) != 1 || string(j.Slips[0].Data) != slip {
		t.Error("the slip's bytes were not kept")
	}
	for _, c := range []struct{ text, part string }{
		{"name = \"gian\"\nmeasure = \"gain\"\ntake = \"a\"\nlimits_from = \"golden/slip.json\"\nwithin = \"0.5 dB\"\n", "has no check \"gian\""},
		{"name = \"hiss\"\nmeasure = \"noise\"\ntake = \"a\"\nlimits_from = \"golden/slip.json\"\nwithin = \"0.5 dB\"\n", "has no value"},
		{"name = \"rate\"\nmeasure = \"gain\"\ntake = \"a\"\nlimits_from = \"golden/slip.json\"\nwithin = \"0.5 dB\"\n", "is a frequency, expected a ratio"},
		{"name = \"gain: a\"\nmeasure = \"gain\"\ntake = \"a\"\nlimits_from = \"golden/other.json\"\nwithin = \"0.5 dB\"\n", "is no slip.json"},
		{"name = \"gain: a\"\nmeasure = \"gain\"\ntake = \"a\"\nlimits_from = \"golden\"\nwithin = \"0.5 dB\"\n", "is a folder"},
	} {
		if _, err := job(c.text); err == nil || !strings.Contains(err.Error(), c.part) {
			t.Errorf("%v, want %q", err, c.part)
		}
	}
}

// A default holds where a take or check is silent, never against what it
// says: not another way to name takes or limits, not a key the measure does
// not take.
func TestDefaults(t *testing.T) {
	j := mustRead(t, gains+`[gear.box]
kind = "audio"
[gear.other]
kind = "audio"
[defaults]
gear = "box"
out = 2
where = { room = "lamp" }
band = "20 Hz .. 20 kHz"
take = "a"
min = "1 dB"
within = "0.5 dB"
class = "minor"
csv.skip = 1
[takes.c]
file = "c.csv"
gear = "other"
out = 1
where = { room = "yard" }
csv.decimal = ","
[[checks]]
name = "silent"
measure = "gain"
[[checks]]
name = "own"
measure = "gain"
each = ["b"]
nominal = "20 dB"
class = "major"
[[checks]]
name = "band"
measure = "thd"
max = "2 dB"
[[checks]]
name = "nominal alone"
measure = "snr"
nominal = "90 dB"
`)
	a, c := j.Takes[0], j.Takes[2]
	if a.Gear.Name != "box" || a.Wiring.Out != "2" || a.Where[0].Value != "lamp" || a.CSV.Skip != 1 {
		t.Errorf("take without its own: %+v", a)
	}
	if c.Gear.Name != "other" || c.Wiring.Out != "1" || c.Where[0].Value != "yard" || c.CSV.Decimal != "," || c.CSV.Skip != 1 {
		t.Errorf("take with its own: %+v", c)
	}
	silent, own, band, alone := j.Checks[0], j.Checks[1], j.Checks[2], j.Checks[3]
	if silent.Class != "minor" || silent.Params.Out != "" || silent.Where != nil || silent.Rows()[0].Main[0] != a || silent.Params.Band != nil {
		t.Errorf("silent check: %+v", silent)
	}
	if l := silent.Rows()[0].Limits; l.Min.Text != "1 dB" || l.Max != nil {
		t.Errorf("silent limits: %+v", l)
	}
	if l := own.Rows()[0].Limits; own.Class != "major" || own.Rows()[0].Name != "own: b" || l.Min.Text != "19.5 dB" {
		t.Errorf("own: %+v %+v", own, l)
	}
	if l := band.Rows()[0].Limits; band.Params.Band.High != 20000 || l.Max.Text != "2 dB" {
		t.Errorf("band: %+v %+v", band, l)
	}
	if l := alone.Rows()[0].Limits; l.Max.Text != "90.5 dB" {
		t.Errorf("default within: %+v", l)
	}
}

func TestInclude(t *testing.T) {
	dir := t.TempDir()
	files := map[string]string{
		"gear.toml":     "[gear.box]\r\nkind = \"audio\"\r\n",
		"sub/more.toml": "format = 1\n[takes.b]\nfile = \"b.wav\"\ngear = \"box\"\n[[checks]]\nname = \"two\"\nmeasure = \"level\"\ntake = \"a\"\n",
		"bad.toml":      "title = \"x\"\n[gaer.y]\n[gear.box]\nkind = \"audio\"\n[[checks]]\nname = \"one\"\nmeasure = \"level\"\ntake = \"zz\"\n",
	}
	for name, text := range files {
		p := filepath.Join(dir, filepath.FromSlash(name))
		if err := os.MkdirAll(filepath.Dir(p), 0o755); err != nil {
			t.Fatal(err)
		}
		if err := os.WriteFile(p, []byte(text), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	main := "include = [\"gear.toml\", \"sub/more.toml\"]\n[takes.a]\nfile = \"a.wav\"\ngear = \"box\"\n[[checks]]\nname = \"one\"\nmeasure = \"level\"\ntake = \"b\"\n"
	path := filepath.Join(dir, "job.toml")
	if err := os.WriteFile(path, []byte(main), 0o644); err != nil {
		t.Fatal(err)
	}
	j, err := Load(path, Options{})
	if err != nil {
		t.Fatal(err)
	}
	if len(j.Takes) != 2 || j.Takes[0].Name != "a" || j.Takes[1].Gear.Name != "box" || j.Checks[0].Name != "one" || j.Checks[1].Name != "two" {
		t.Errorf("got %+v", j)
	}
	// Takes of an included file lie relative to the job file.
	if j.Takes[1].Path != filepath.Join(dir, "b.wav") {
		t.Errorf("included take at %s", j.Takes[1].Path)
	}
	if len(j.Sources) != 3 || j.Sources[2].Name != "sub/more.toml" || string(j.Sources[1].Data) != files["gear.toml"] {
		t.Errorf("sources: %v", j.Sources)
	}
	if err := os.WriteFile(path, []byte("include = [\"gear.toml\", \"bad.toml\"]\ntitel = \"x\"\n"), 0o644); err != nil {
		t.Fatal(err)
	}
	_, err = Load(path, Options{})
	bad := filepath.Join(dir, "bad.toml")
	for _, part := range []string{
		path + ":2:1: unknown key `titel`", bad + ":1:1: `title` belongs in the job file itself", bad + ":2:2: unknown key `gaer`",
		bad + ":3:7: the gear `box` is defined twice, first in " + filepath.Join(dir, "gear.toml") + ":1", bad + ":8:8: `take`: unknown take \"zz\"",
	} {
		if err == nil || !strings.Contains(err.Error(), part) {
			t.Errorf("%q is not told in\n%v", part, err)
		}
	}
	if n := strings.Count(err.Error(), "\n"); n != 4 {
		t.Errorf("%d lines:\n%v", n+1, err)
	}
}

// With another root the takes are looked for there, and stay there.
func TestTakeRoot(t *testing.T) {
	j, err := parse("job.toml", "bench", []byte(gains), Options{TakeRoot: filepath.Join("units", "017")})
	if err != nil {
		t.Fatal(err)
	}
	if want := filepath.Join("units", "017", "a.wav"); j.Takes[0].Path != want {
		t.Errorf("got %s, want %s", j.Takes[0].Path, want)
	}
}

func TestRoles(t *testing.T) {
	j := mustRead(t, gains+"[[checks]]\nname = \"n\"\nmeasure = \"noise\"\nrepeat = [\"a\", \"b\"]\nfloor = \"b\"\nagainst = \"b\"\n")
	row := j.Checks[0].Rows()[0]
	if len(row.Main) != 2 || row.Check.Against.Name != "b" {
		t.Fatalf("row: %+v", row)
	}
	got := row.Roles(row.Main[0])
	if len(got["take"]) != 1 || got["take"][0].Name != "a" || got["floor"][0].Name != "b" || len(got) != 2 {
		t.Errorf("roles: %v", got)
	}
}
