package main

import (
	"slices"
	"strings"
	"testing"
)

const text = `benchslip demo DIR

Says what it does.
.not a request

for example
  benchslip demo "x\y"

names
  one      first
  two-two  second
  help     not below

options
  -o, --out DIR  write there
                 and here

exit status: 0 or 2
`

func TestPage(t *testing.T) {
	h := parse(text)
	if h.usage != "benchslip demo DIR" || !slices.Equal(h.commands, []string{"one", "two-two"}) {
		t.Fatalf("%q, %q", h.usage, h.commands)
	}
	got := page("benchslip-demo", "does a thing", "benchslip 1", h)
	for _, want := range []string{
		".TH \"BENCHSLIP\\-DEMO\" 1", "benchslip\\-demo \\- does a thing\n", "\\&.not a request", `"x\ey"`,
		".SH OPTIONS\n.nf\n  \\-o, \\-\\-out DIR", ".SH NOTES\n.nf\nexit status",
	} {
		if !strings.Contains(got, want) {
			t.Errorf("the page lacks %q:\n%s", want, got)
		}
	}
	for _, l := range strings.Split(got, "\n") {
		if strings.HasPrefix(l, ".") {
			switch strings.Fields(l)[0] {
			case ".TH", ".SH", ".B", ".nf", ".fi":
			default:
				t.Errorf("a request out of the text: %q", l)
			}
		}
	}
}
