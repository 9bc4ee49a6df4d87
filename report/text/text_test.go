package text

import (
	"strings"
	"testing"
	"unicode"

	"benchslip/analyze/slip"
	"benchslip/report"
	"benchslip/report/internal/sample"
)

func render(t *testing.T, s *slip.Slip) string {
	t.Helper()
	var b strings.Builder
	if err := Render(&b, s); err != nil {
		t.Fatal(err)
	}
	return b.String()
}

func TestSafeAndNarrow(t *testing.T) {
	for _, l := range strings.Split(render(t, sample.Slip()), "\n") {
		if w := report.Width(l); w > Width {
			t.Errorf("%d cells wide: %s", w, l)
		}
		for _, r := range l {
			if unicode.IsControl(r) || report.IsDirection(r) {
				t.Errorf("control or direction character %U in %q", r, l)
			}
		}
	}
}

// The verdict comes first, and every open row says why and what would settle it.
func TestSaysWhatIsAsked(t *testing.T) {
	out := render(t, sample.Slip())
	if !strings.HasPrefix(out, "FAIL  Lamp-room preamp after soldering\n1 row fails, 5 are open; 7 of 13 pass.\n") {
		t.Errorf("head: %q", out[:120])
	}
	flat := strings.Join(strings.Fields(out), " ")
	for _, want := range []string{
		"fails: 1 minor", "open: 1 critical, 2 major, 2 minor", "passes: critical 2 of 3",
		"20.45 ± 0.12 dB 19.5 .. 20.5 dB 0.05 dB", "passes, but not beyond doubt (about 80 in 100",
		"settle needs U <= 0.05 dB: record 30 s or more", "below 0.000413 % max 0.02 %",
		"entered by hand, with bench meter", "waived by R. Holm", "why missing-take: takes/common.wav is not there",
		"U: calibration of box 0.027 dB (80 %), repeatability over segments 0.013 dB (20 %)",
		"clipped take drive, channel 1, 5.25 s .. 5.2504 s (row 5): the recorder is at full scale",
		"taken as exact: source (row 7)", "range from 2.30 .. 4.00 µV", "applies only to the item tested",
		"Opinion, not measurement", "sha256 0c0c0c", "Test record 9f31c2a07d44",
	} {
		if !strings.Contains(flat, want) {
			t.Errorf("no %q in\n%s", want, out)
		}
	}
}

func TestEmptySlip(t *testing.T) {
	out := render(t, &slip.Slip{Verdict: slip.NotJudged})
	if !strings.HasPrefix(out, "NOT JUDGED  Untitled job\nThe job has no checks.\n") {
		t.Errorf("head of an empty slip: %q", out)
	}
}
