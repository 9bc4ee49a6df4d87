package markdown

import (
	"regexp"
	"strings"
	"testing"

	"benchslip/analyze/slip"
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

var bar = regexp.MustCompile(`(^|[^\\])\|`)

func TestTable(t *testing.T) {
	s := sample.Slip()
	n := 0
	for _, l := range strings.Split(render(t, s), "\n") {
		if strings.HasPrefix(l, "|") {
			n++
			if got := len(bar.FindAllString(l, -1)); got != 7 {
				t.Errorf("%d bars in %q", got, l)
			}
		}
	}
	if n != len(s.Checks)+2 {
		t.Errorf("%d table lines for %d checks", n, len(s.Checks))
	}
}

func TestSays(t *testing.T) {
	page := render(t, sample.Slip())
	for _, want := range []string{"# Fail: Lamp-room preamp after soldering\n", "**1 row fails, 5 are open; 7 of 13 pass.**", "fails: 1 minor",
		"| 3 | **conditional pass** | Gain steps: g20 | 20.45 ± 0.12 dB | 19.5 .. 20.5 dB | 0.05 dB |",
		"to settle it: record the take \"common\"", "applies only to the item tested", "`9f31c2a07d44`", "## Opinion, not measurement"} {
		if !strings.Contains(page, want) {
			t.Errorf("no %q in\n%s", want, page)
		}
	}
}

func TestText(t *testing.T) {
	for in, want := range map[string]string{
		"a|b":                   `a\|b`,
		"<b>&":                  "&lt;b&gt;&amp;",
		"`x` *y* [z](http://e)": "\\`x\\` \\*y\\* \\[z\\](http&#58;//e)",
		"@name www.e.org":       "&#64;name www&#46;e.org",
		"a\nb":                  "a b",
	} {
		if got := text(in); got != want {
			t.Errorf("text(%q) = %q, want %q", in, got, want)
		}
	}
	if strings.Contains(render(t, sample.Slip()), "<script") {
		t.Error("markup came through")
	}
}
