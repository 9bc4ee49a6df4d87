package judge

import (
	"testing"

	"benchslip/analyze/slip"
)

func TestOverall(t *testing.T) {
	row := func(verdict, class string) slip.Check { return slip.Check{Verdict: verdict, Class: class} }
	opt := func(verdict, reason string) slip.Check {
		return slip.Check{Verdict: verdict, Class: "major", Optional: true, Reason: reason}
	}
	pass, fail := row(slip.Pass, "major"), row(slip.Fail, "minor")
	for _, c := range []struct {
		name   string
		checks []slip.Check
		want   string
		exit   int
	}{
		{"nothing", nil, slip.NotJudged, 0},
		{"no limits", []slip.Check{row(slip.NotJudged, "major")}, slip.NotJudged, 0},
		{"passes", []slip.Check{pass, row(slip.NotJudged, "info")}, slip.Pass, 0},
		{"a minor one fails", []slip.Check{pass, fail, row(slip.ConditionalPass, "major")}, slip.Fail, 1},
		{"conditional pass", []slip.Check{pass, row(slip.ConditionalPass, "minor")}, slip.Inconclusive, 3},
		{"conditional fail", []slip.Check{pass, row(slip.ConditionalFail, "minor")}, slip.Inconclusive, 3},
		{"not measurable without limits", []slip.Check{row(slip.NotJudged, "major"), row(slip.NotMeasurable, "major")}, slip.Inconclusive, 3},
		{"not applicable", []slip.Check{pass, row(slip.NotApplicable, "major")}, slip.Inconclusive, 3},
		{"info not measurable", []slip.Check{pass, row(slip.NotMeasurable, "info")}, slip.Pass, 0},
		{"info alone", []slip.Check{row(slip.NotMeasurable, "info")}, slip.NotJudged, 0},
		{"optional, not applicable", []slip.Check{pass, opt(slip.NotApplicable, "")}, slip.Pass, 0},
		{"optional, take missing", []slip.Check{pass, opt(slip.NotMeasurable, "missing-take: no file")}, slip.Pass, 0},
		{"optional, clipped", []slip.Check{pass, opt(slip.NotMeasurable, "clipped: at 1 s")}, slip.Inconclusive, 3},
		{"optional fails", []slip.Check{pass, opt(slip.Fail, "")}, slip.Fail, 1},
		{"optional alone", []slip.Check{opt(slip.NotApplicable, "")}, slip.NotJudged, 0},
	} {
		got := Overall(c.checks)
		if got != c.want || Exit(got) != c.exit {
			t.Errorf("%s: %s, %d, want %s, %d", c.name, got, Exit(got), c.want, c.exit)
		}
	}
	for _, c := range [][3]int{{0, 0, 0}, {0, 3, 3}, {3, 1, 1}, {1, 2, 2}, {2, 3, 2}} {
		if Worse(c[0], c[1]) != c[2] || Worse(c[1], c[0]) != c[2] {
			t.Errorf("worse of %d and %d: %d", c[0], c[1], Worse(c[0], c[1]))
		}
	}
}

func TestHeadline(t *testing.T) {
	checks := []slip.Check{
		{Class: "critical", Verdict: slip.Pass}, {Class: "critical", Verdict: slip.Pass}, {Class: "critical", Verdict: slip.Pass},
		{Class: "major", Verdict: slip.Fail}, {Class: "minor", Verdict: slip.Fail}, {Class: "minor", Verdict: slip.Fail},
		{Class: "", Verdict: slip.ConditionalPass}, {Class: "info", Verdict: slip.NotJudged}, {Class: "major", Verdict: slip.NotJudged},
	}
	if got, want := Headline(checks), "fails: 1 major, 2 minor; open: 1 major; critical 3 of 3 pass"; got != want {
		t.Errorf("%q, want %q", got, want)
	}
	if got, want := Headline([]slip.Check{{Class: "critical", Verdict: slip.Fail}}), "fails: 1 critical; critical 0 of 1 pass"; got != want {
		t.Errorf("%q, want %q", got, want)
	}
	if got := Headline(nil); got != "nothing was judged: no limits were set" {
		t.Errorf("%q", got)
	}
}
