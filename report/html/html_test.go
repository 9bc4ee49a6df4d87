package html

import (
	"fmt"
	"regexp"
	"slices"
	"strings"
	"testing"
	"time"

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

// tag is a start or end tag of the page. The page escapes > in attributes, so
// that a tag ends at the first one.
type tag struct {
	name, attrs, text string // text follows the tag
	end               bool
}

var tagForm = regexp.MustCompile(`(?s)<(/?)([a-zA-Z][a-zA-Z0-9]*)([^>]*)>([^<]*)`)

func tags(t *testing.T, page string) []tag {
	t.Helper()
	var out []tag
	for _, m := range tagForm.FindAllStringSubmatch(page, -1) {
		out = append(out, tag{strings.ToLower(m[2]), m[3], m[4], m[1] == "/"})
	}
	if len(out) < 20 {
		t.Fatalf("only %d tags found: the test reads the page wrong", len(out))
	}
	return out
}

var attrForm = regexp.MustCompile(`([a-zA-Z][-a-zA-Z:]*)\s*=\s*("[^"]*"|'[^']*'|[^\s"'>]+)`)

func attrs(g tag) map[string]string {
	out := map[string]string{}
	for _, m := range attrForm.FindAllStringSubmatch(g.attrs, -1) {
		out[strings.ToLower(m[1])] = strings.Trim(m[2], `"'`)
	}
	return out
}

// Every element is closed in order: the page is well formed although HTML
// would forgive more.
func TestNesting(t *testing.T) {
	void := []string{"meta", "br"}
	var stack []string
	for _, g := range tags(t, render(t, sample.Slip())) {
		switch {
		case slices.Contains(void, g.name) || strings.HasSuffix(g.attrs, "/"):
		case !g.end:
			stack = append(stack, g.name)
		case len(stack) == 0 || stack[len(stack)-1] != g.name:
			t.Fatalf("</%s> closes nothing; open: %v", g.name, stack)
		default:
			stack = stack[:len(stack)-1]
		}
	}
	if len(stack) > 0 {
		t.Errorf("left open: %v", stack)
	}
}

// Nothing runs, nothing is fetched, nothing leads out.
func TestSelfContained(t *testing.T) {
	page := render(t, sample.Slip())
	ids := map[string]bool{}
	var refs []string
	for _, g := range tags(t, page) {
		if slices.Contains([]string{"script", "form", "input", "button", "iframe", "frame", "object", "embed", "link", "base", "img", "image", "use", "foreignobject", "audio", "video"}, g.name) {
			t.Errorf("<%s%s> must not be there", g.name, g.attrs)
		}
		for k, v := range attrs(g) {
			switch {
			case strings.HasPrefix(k, "on"):
				t.Errorf("attribute %s on <%s>", k, g.name)
			case k == "href" || k == "src" || k == "xlink:href" || k == "action" || k == "srcset":
				if !strings.HasPrefix(v, "#") {
					t.Errorf("%s=%q leads out", k, v)
				}
				refs = append(refs, v[1:])
			case k == "aria-labelledby" || k == "aria-describedby":
				refs = append(refs, v)
			case k == "id":
				if ids[v] {
					t.Errorf("id %q twice", v)
				}
				ids[v] = true
			}
		}
	}
	for _, r := range refs {
		if !ids[r] {
			t.Errorf("reference to %q, which is not there", r)
		}
	}
	for _, bad := range []string{"@import", "url(", "://", "javascript:"} {
		if strings.Contains(strings.ToLower(page), bad) {
			t.Errorf("%q is in the page", bad)
		}
	}
}

func TestStructure(t *testing.T) {
	page := render(t, sample.Slip())
	if !strings.HasPrefix(page, "<!DOCTYPE html>\n<html lang=\"en\">\n<head>\n<meta charset=\"utf-8\">") || !strings.Contains(page, "<title>Fail: Lamp-room preamp") {
		t.Errorf("head of the page: %.200s", page)
	}
	list := tags(t, page)
	level, h1 := 0, 0
	for i, g := range list {
		a := attrs(g)
		switch {
		case g.end:
		case len(g.name) == 2 && g.name[0] == 'h' && g.name[1] >= '1' && g.name[1] <= '6':
			n := int(g.name[1] - '0')
			if n > level+1 || level == 0 && n != 1 {
				t.Errorf("<%s> follows level %d", g.name, level)
			}
			if n == 1 {
				h1++
			}
			level = n
		case g.name == "th" && a["scope"] == "":
			t.Errorf("<th%s> without a scope", g.attrs)
		case g.name == "svg":
			next := list[i+1]
			if next.name != "title" || strings.TrimSpace(next.text) == "" {
				t.Errorf("<svg%s> is not named by a title but begins with <%s>", g.attrs, next.name)
			}
		case g.name == "table":
			j := i
			for list[j].name != "th" {
				if list[j].name == "table" && list[j].end {
					t.Errorf("<table%s> has no header cell", g.attrs)
					break
				}
				j++
			}
		}
	}
	if h1 != 1 {
		t.Errorf("%d h1", h1)
	}
	if n := strings.Count(page, `class="strip"`); n != 14 {
		t.Errorf("%d limit strips, want one for each of the 14 rows with limits", n)
	}
}

func TestHostileText(t *testing.T) {
	page := render(t, sample.Slip())
	for _, want := range []string{"&lt;script&gt;alert(&#39;x&#39;)&lt;/script&gt;", "=1+1|", "\u202egnp.exe"} {
		if !strings.Contains(page, want) {
			t.Errorf("%q is not shown as typed", want)
		}
	}
	inside := 0
	for _, g := range tags(t, page) {
		if g.name == "bdi" {
			inside++
			if g.end {
				inside -= 2
			}
		}
		for _, r := range g.attrs + g.text {
			if r != '\n' && (r < 0x20 || r >= 0x7f && r < 0xa0) {
				t.Errorf("control character %U in <%s>", r, g.name)
			}
			if report.IsDirection(r) && (inside != 1 || g.name != "bdi" || g.end) {
				t.Errorf("direction mark %U outside of bdi, at <%s>", r, g.name)
			}
		}
	}
}

// Expected results follow from UAX #9: what opens must close in order.
func TestClosed(t *testing.T) {
	const rlo, lri, pdf, pdi = "\u202e", "\u2066", "\u202c", "\u2069"
	for in, want := range map[string]string{
		"plain":         "plain",
		rlo + "a":       rlo + "a" + pdf,
		pdi + "a" + pdf: "a",
		lri + rlo + "a": lri + rlo + "a" + pdf + pdi,
		rlo + "a" + pdi: rlo + "a" + pdf,
		rlo + "a" + pdf: rlo + "a" + pdf,
	} {
		if got := closed(in); got != want {
			t.Errorf("closed(%q) = %q, want %q", in, got, want)
		}
	}
}

func TestSheetNumberCannotLeaveTheStyle(t *testing.T) {
	s := sample.Slip()
	s.Sheet = `9f"; } </style><script>`
	page := render(t, s)
	if strings.Contains(page, "<script>") || !strings.Contains(page, `content: "Test record 9fstylescript"`) {
		t.Error("the sheet number breaks out of the style")
	}
}

func TestSays(t *testing.T) {
	page := render(t, sample.Slip())
	for _, want := range []string{"<strong>Fail</strong>", "1 row fails, 5 are open; 7 of 13 pass.", "fails: 1 minor; open: 1 critical",
		"passes, but not beyond doubt (about 80 in 100)", "Four-way rule, fixed before measuring", "taken as exact: source (row 7)",
		"entered by hand, with bench meter", "applies only to the item tested", "<h2>Opinion</h2>", "<h2>Waivers</h2>", "waived by R. Holm",
		"<b>To settle it:</b>", "End of test record 9f31c2a07d44", "Spectrum of take drive, out", "Marked: tone 1.042 kHz", "page \" counter(page)"} {
		if !strings.Contains(page, want) {
			t.Errorf("no %q", want)
		}
	}
	if strings.Contains(strings.ToLower(page), "certificate") || strings.Contains(strings.ToLower(page), "accredit") {
		t.Error("a test record is no certificate")
	}
	empty := render(t, &slip.Slip{Verdict: slip.NotJudged, Sheet: "0"})
	if !strings.Contains(empty, "The job has no checks.") || !strings.Contains(empty, "<strong>Not judged</strong>") {
		t.Error("an empty slip has no sheet of its own")
	}
}

// One sheet of 30 checks with figures stays a small file and is quick.
func TestSizeAndTime(t *testing.T) {
	s := sample.Many(30)
	for i := range s.Checks {
		for k := range s.Checks[i].Figures {
			s.Checks[i].Figures[k].Title += fmt.Sprint(" of row ", i) // no two alike
		}
	}
	start := time.Now()
	page := render(t, s)
	t.Logf("%d bytes in %v", len(page), time.Since(start))
	if len(page) > 2e6 {
		t.Errorf("%d bytes; a ticket takes 2 MB", len(page))
	}
}

func BenchmarkThirtyChecks(b *testing.B) {
	s := sample.Many(30)
	for b.Loop() {
		if err := Render(&strings.Builder{}, s); err != nil {
			b.Fatal(err)
		}
	}
}
