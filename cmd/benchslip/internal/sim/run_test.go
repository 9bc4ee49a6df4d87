package sim

import (
	"context"
	"math"
	"path/filepath"
	"testing"

	"benchslip/analyze/job"
	"benchslip/analyze/run"
	"benchslip/analyze/slip"
)

var slips = map[string]*slip.Slip{}

// slipOf runs a job of the demo, once for all tests.
func slipOf(t *testing.T, name string) *slip.Slip {
	t.Helper()
	if s := slips[name]; s != nil {
		return s
	}
	j, err := job.Load(filepath.Join(demo, name, name+".toml"), job.Options{})
	if err != nil {
		t.Fatal(err)
	}
	s, err := run.Run(context.Background(), j, run.Options{Version: "test"})
	if err != nil {
		t.Fatal(err)
	}
	slips[name] = s
	return s
}

// TestSlipsTellTheTruth runs both jobs and compares every measured value with
// the circuit it came from. U is for 95 %, so one row in twenty may lie outside
// it; 1.5 U (three standard uncertainties) none. The seeds are fixed.
func TestSlipsTellTheTruth(t *testing.T) {
	if testing.Short() {
		t.Skip("runs the whole analysis")
	}
	compared, outside := 0, 0
	for _, name := range []string{"preamp", "cable"} {
		s := slipOf(t, name)
		rows := map[string]slip.Check{}
		for _, c := range s.Checks {
			rows[c.Name] = c
			for _, f := range c.Flags {
				t.Errorf("%s, %s: flag %s: %s", name, c.Name, f.Code, f.Message)
			}
		}
		for _, want := range Truths() {
			if want.Job != name {
				continue
			}
			c, ok := rows[want.Check]
			delete(rows, want.Check)
			switch {
			case !ok:
				t.Errorf("%s: no row %q", name, want.Check)
				continue
			case c.Value == nil:
				t.Errorf("%s, %s: no value: %s", name, want.Check, c.Reason)
				continue
			}
			scale, ok := map[string]float64{want.Unit: 1, "mV": 1e-3, "uV": 1e-6, "uV/rtHz": 1e-6, "uV/m": 1e-6}[c.Unit]
			if !ok {
				t.Errorf("%s, %s: in %q, the truth is in %q", name, want.Check, c.Unit, want.Unit)
				continue
			}
			compared++
			off, u := math.Abs(*c.Value*scale-want.Value), 0.0 // counts have no U
			if c.Uncertainty != nil {
				u = *c.Uncertainty * scale
			}
			t.Logf("%-7s %-36s %12.6g, truth %12.6g, U %.2g %s", name, c.Name, *c.Value*scale, want.Value, u, want.Unit)
			if off > u {
				outside++
			}
			if off > 1.5*u+1e-12*math.Abs(want.Value) {
				t.Errorf("%s, %s: %.6g, the circuit says %.6g, U is %.2g %s", name, want.Check, *c.Value*scale, want.Value, u, want.Unit)
			}
		}
		for left, c := range rows {
			if c.Measure != "entered" && left != "Speech to noise" {
				t.Errorf("%s: row %q has no truth", name, left)
			}
		}
	}
	if compared < 25 || outside > compared/10 {
		t.Errorf("%d rows compared, %d outside their uncertainty", compared, outside)
	}
}

// TestFailingRowNamesItsResistor: the mismatch beside the failing CMRR is that
// of the resistors, 1 % of it allowed for the output divider and the channels.
func TestFailingRowNamesItsResistor(t *testing.T) {
	if testing.Short() {
		t.Skip("runs the whole analysis")
	}
	for _, c := range slipOf(t, "preamp").Checks {
		if c.Name == "CMRR at the 20 dB step" {
			got, ok := c.Details["mismatch"].(float64)
			if !ok {
				t.Fatalf("no mismatch in the details: %v", c.Details)
			}
			near(t, "mismatch", got, skerryPreamp(sp017at20, demoMains(0)).Amp.Mismatch(), 0.01)
			return
		}
	}
	t.Error("the row is missing")
}

// TestDemoShowsItsVerdicts: one row fails for its resistor, one stays open at
// its limit, everything else passes.
func TestDemoShowsItsVerdicts(t *testing.T) {
	if testing.Short() {
		t.Skip("runs the whole analysis")
	}
	for name, open := range map[string]map[string]string{
		"preamp": {"CMRR at the 20 dB step": slip.Fail, "Gain steps: tone30": slip.ConditionalPass},
		"cable":  {},
	} {
		for _, c := range slipOf(t, name).Checks {
			want := open[c.Name]
			if want == "" {
				want = slip.Pass
			}
			if c.Class == "info" {
				want = slip.NotJudged
			}
			if c.Verdict != want {
				t.Errorf("%s, %s: %s, wanted %s (%s)", name, c.Name, c.Verdict, want, c.Reason)
			}
		}
	}
}
