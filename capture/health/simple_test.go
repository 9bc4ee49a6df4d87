package health

import (
	"strings"
	"testing"
)

// codesOf lists the flags of a report as "code channel".
func codesOf(r *Report) string {
	var s []string
	for _, f := range r.Flags {
		s = append(s, f.Code+" "+string(rune('0'+f.Channel)))
	}
	return strings.Join(s, ", ")
}

func TestFirstFlags(t *testing.T) {
	x := sum(sample(48000, 1, sine(0.5, 997, 0)), noise(48000, 1e-4, 1))
	y := append([]float64(nil), x...)
	y[40000] += 0.01
	dead := make([]float64, len(x))
	for _, c := range []struct {
		name string
		rec  *fake
		want string
	}{
		{"clean pair", audio(48000, 24, x, y), ""},
		{"copy", audio(48000, 24, x, y, x), "identical-channels 3"},
		{"two pairs", audio(48000, 24, x, y, y, x), "identical-channels 3, identical-channels 4"},
		{"dead second", audio(48000, 24, x, dead), "silent 2"},
		{"both dead", audio(48000, 24, dead, dead), "silent 1, silent 2"},
		{"one frame", audio(48000, 24, []float64{0.5}, []float64{0.5}), ""},
	} {
		if got := codesOf(mustScan(t, c.rec)); got != c.want {
			t.Errorf("%s: %q, want %q", c.name, got, c.want)
		}
	}
}
