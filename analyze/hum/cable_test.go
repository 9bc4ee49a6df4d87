package hum

import (
	"math"
	"strings"
	"testing"

	"benchslip/analyze"
	"benchslip/analyze/internal/trial"
	"benchslip/capture/unit"
)

// Hum of a run put together from a receiver's own, a magnetic, an electric and
// a shield-current part is taken apart into them.
func TestCableSummary(t *testing.T) {
	b := bench{rate: 4000, T: 5, noise: 2e-6}
	own := map[int]complex128{1: 3e-5}
	field := map[int]complex128{1: 2e-4i, 3: 3e-5}
	electric := map[int]complex128{3: 8e-5, 5: 6e-5i}
	shield := map[int]complex128{3: -3e-4, 9: 1e-4}
	join := func(parts ...map[int]complex128) map[int]complex128 {
		out := map[int]complex128{}
		for _, p := range parts {
			for o, z := range p {
				out[o] += z
			}
		}
		return out
	}
	var takes []*analyze.Take
	for i, c := range []struct {
		setup string
		hum   map[int]complex128
	}{
		{"baseline", own}, {"end-short", join(own, field)}, {"end-150", join(own, field, electric)}, {"pin1-joined", join(own, field, electric, shield)},
	} {
		tk := b.take(c.setup, uint64(i), c.hum)
		tk.Setup = c.setup
		takes = append(takes, tk)
	}
	other := b.take("elsewhere", 9, own)
	other.Setup, other.Where[0].Value = "loads-on", "20 dB"
	takes = append(takes, other)
	gain := unit.New(40, "dB")
	p := trial.Pass(pickup, analyze.Params{Gain: &analyze.Stated{Value: gain, Key: "gain"}}, nil)
	c, bad := CableSummary(p, takes)
	if bad != nil {
		t.Fatal(bad)
	}
	size := func(m map[int]complex128) float64 {
		s := 0.0
		for _, z := range m {
			s += abs2(z)
		}
		return math.Sqrt(s)
	}
	want := map[string]float64{"magnetic": size(field), "electric": size(electric), "shield current": size(shield)}
	for _, w := range c.Couplings {
		if math.Abs(w.RMS/want[w.Way]-1) > 0.02 {
			t.Errorf("%s: %.4g V, want %.4g V", w.Way, w.RMS, want[w.Way])
		}
		delete(want, w.Way)
	}
	if len(want) > 0 || len(c.Rows) != 4 || len(c.Left) != 1 {
		t.Errorf("missing %v; rows %v; left %v", want, c.Rows, c.Left)
	}
	if r := c.Rows[0]; math.Abs(r.RMS/3e-5-1) > 0.01 || math.Abs(r.Input*100-r.RMS) > 1e-12 || r.U <= 0 {
		t.Errorf("row %+v", r)
	}
	if !strings.Contains(c.Answer, ": the cable") || !strings.Contains(strings.Join(c.Opinions(), " "), "shield current") || c.Details()["cable_takes"] == nil {
		t.Errorf("answer %q, opinions %q", c.Answer, c.Opinions())
	}
	if _, bad := CableSummary(p, takes[:1]); bad == nil {
		t.Error("one take makes no summary")
	}
}
