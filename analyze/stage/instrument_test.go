package stage

import (
	"math"
	"testing"

	"benchslip/analyze"
	"benchslip/analyze/internal/trial"
	"benchslip/capture/recording"
	"benchslip/capture/unit"
)

// floored runs TakeFloor and Floor for a total of 1 V^2 whose floor lies dB
// below it, both powers uncertain by u relative.
func floored(t *testing.T, dB, u float64) (analyze.Result, Floored) {
	t.Helper()
	p := trial.Pass(nil, analyze.Params{}, map[string]*analyze.Take{"floor": trial.Take("f", trial.New(8000, 1))})
	low := math.Pow(10, -dB/10)
	f, ok, bad := TakeFloor(p, Power{1, u}, func(*analyze.Signal) (Power, *analyze.Refusal) { return Power{low, u * low}, nil })
	if !ok || bad != nil {
		t.Fatal(ok, bad)
	}
	one := 1.0
	r := analyze.Result{Value: &one, Unit: unit.MustLookup("V"), Details: map[string]any{},
		Budget: []analyze.Contributor{{Name: "noise", Kind: "A", U: u / 2}, {Name: "calibration", Kind: "B", U: 0.005}}}
	return Floor(r, f), f
}

// Powers add: a total 20, 15, 10, 6 dB over the floor reads 0.04, 0.14, 0.46,
// 1.26 dB too high (10 lg(1 - 10^(-R/10)), rounded as bench practice quotes
// them). The sensitivities of the net power to total and floor are P_t/(P_t -
// P_n) and P_n/(P_t - P_n): 1.3354 and 0.3354 at 6.0 dB (JCGM 100 5.1.3 on
// that formula).
func TestFloorPower(t *testing.T) {
	for _, c := range []struct{ R, off float64 }{{20, 0.04}, {15, 0.14}, {10, 0.46}, {6.0001, 1.26}, {3.0001, 3.02}} {
		r, f := floored(t, c.R, 0.01)
		if r.Value == nil {
			t.Errorf("%g dB: %v", c.R, r.Refusal)
			continue
		}
		if got := -20 * math.Log10(*r.Value); math.Abs(got-c.off) > 0.0051 {
			t.Errorf("%g dB: %.4f dB taken off, want %.2f", c.R, got, c.off)
		}
		low := math.Pow(10, -c.R/10)
		// u(net)/net of the power, halved for the root, times the value.
		want := *r.Value / 2 * math.Hypot(0.01*1/(1-low), 0.01*low/(1-low))
		if got := r.Budget[0].U; math.Abs(got-want) > 1e-9 {
			t.Errorf("%g dB: u %.6f, want %.6f", c.R, got, want)
		}
		if got := r.Budget[1].U / *r.Value; math.Abs(got-0.005) > 1e-12 {
			t.Errorf("%g dB: calibration %.6f of the value, want 0.005", c.R, got)
		}
		if near := len(f.Flags) == 1 && f.Flags[0].Code == recording.NearFloor; near != (c.R < 6) {
			t.Errorf("%g dB: flags %v", c.R, f.Flags)
		}
	}
	r, _ := floored(t, 6, 0.01)
	at6 := math.Pow(10, -0.6)
	if a, b := 1/(1-at6), at6/(1-at6); math.Abs(a-1.3354) > 1e-4 || math.Abs(b-0.3354) > 1e-4 || r.Value == nil {
		t.Errorf("sensitivities %.4f, %.4f", a, b)
	}
	// Nearer than 3 dB there is no value, only what the reading and its U allow.
	for _, R := range []float64{2.99, 1, 0, -1} {
		r, _ := floored(t, R, 0.01)
		want := 1 + 2*math.Hypot(0.005, 0.005)
		if r.Value != nil || r.Refusal == nil || r.Refusal.Code != analyze.FloorLimited || r.Bound == nil || !r.Bound.Upper || math.Abs(r.Bound.Value-want) > 1e-12 {
			t.Errorf("%g dB: %+v bound %+v", R, r.Refusal, r.Bound)
		}
	}
}
