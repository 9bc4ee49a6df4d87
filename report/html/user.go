package html

import (
	"html/template"
	"strings"
	"unicode/utf8"

	"benchslip/report"
)

// user writes text that someone typed, as typed: markup escaped, control
// characters made visible, direction marks kept but closed and shut into an
// element of their own, so that they cannot reach what stands around it.
func user(s string) template.HTML {
	return template.HTML("<bdi>" + template.HTMLEscapeString(closed(printable(s))) + "</bdi>")
}

// userLines is user that keeps line breaks.
func userLines(s string) template.HTML {
	var out []string
	for _, l := range strings.Split(strings.ReplaceAll(s, "\r\n", "\n"), "\n") {
		out = append(out, string(user(l)))
	}
	return template.HTML(strings.Join(out, "<br>"))
}

func printable(s string) string {
	return strings.Map(func(r rune) rune {
		switch {
		case report.IsDirection(r):
			return r
		case r == '\n' || r == '\t' || r == '\r':
			return ' '
		case !report.Printable(r):
			return utf8.RuneError
		}
		return r
	}, s)
}

// closed ends every embedding, override and isolate that the text opens, and
// drops marks that end one it did not open (UAX #9, section 2).
func closed(s string) string {
	const pdf, pdi = '\u202c', '\u2069'
	var b strings.Builder
	var open []rune // what ends the innermost open one
	for _, r := range s {
		switch r {
		case '\u202a', '\u202b', '\u202d', '\u202e':
			open = append(open, pdf)
		case '\u2066', '\u2067', '\u2068':
			open = append(open, pdi)
		case pdf, pdi:
			if n := len(open); n == 0 || open[n-1] != r {
				continue
			}
			open = open[:len(open)-1]
		}
		b.WriteRune(r)
	}
	for i := len(open) - 1; i >= 0; i-- {
		b.WriteRune(open[i])
	}
	return b.String()
}
