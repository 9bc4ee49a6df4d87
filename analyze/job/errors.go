package job

import (
	"fmt"
	"slices"
	"sort"
	"strconv"
	"strings"
	"unicode"

	"benchslip/capture/unit"
)

// Error is one fault of a job with its place.
type Error struct {
	File      string // as the user named it; the option ("--at") for a measure without a job file
	Line, Col int    // from 1, in characters; 0 without a job file
	Text      string // what is wrong, what was expected, what to write
}

func (e *Error) Error() string {
	if e.Line == 0 {
		return e.File + ": " + e.Text
	}
	return fmt.Sprintf("%s:%d:%d: %s", e.File, e.Line, e.Col, e.Text)
}

// Errors are all faults of a job in the order of the text, included files
// last. Its message has one line a fault.
type Errors []*Error

func (e Errors) Error() string {
	lines := make([]string, len(e))
	for i, x := range e {
		lines[i] = x.Error()
	}
	return strings.Join(lines, "\n")
}

// mostErrors bounds what a wild file can make us say; hints, which compare
// words with words, stop earlier.
const (
	mostErrors = 1000
	mostHints  = 200
)

// faults gathers errors.
type faults struct {
	list []fault
	seen map[fault]bool
	late []fault // told only where nothing else is said of the line
}

type fault struct {
	pos
	text string
}

func (f *faults) add(p pos, format string, args ...any) {
	if len(f.list) >= mostErrors {
		return
	}
	x := fault{p, fmt.Sprintf(format, args...)}
	if f.seen[x] { // a default that is wrong for many checks is told once
		return
	}
	if f.seen == nil {
		f.seen = map[fault]bool{}
	}
	f.seen[x] = true
	f.list = append(f.list, x)
}

// err returns the faults as one error, nil when there are none.
func (f *faults) err() error {
	for _, l := range f.late {
		if !slices.ContainsFunc(f.list, func(o fault) bool { return o.line() == l.line() }) {
			f.list = append(f.list, l)
		}
	}
	f.late = nil
	if len(f.list) == 0 {
		return nil
	}
	sort.SliceStable(f.list, func(i, j int) bool {
		a, b := f.list[i].pos, f.list[j].pos
		if a.src.index != b.src.index {
			return a.src.index < b.src.index
		}
		return a.off < b.off
	})
	var out Errors
	for _, x := range f.list {
		e := &Error{File: x.src.name, Text: x.text}
		if !x.src.option {
			e.Line, e.Col = x.src.place(x.off)
		}
		out = append(out, e)
	}
	if len(f.list) >= mostErrors {
		out = append(out, &Error{File: out[0].File, Text: "more than " + strconv.Itoa(mostErrors) + " faults; the rest is not listed"})
	}
	return out
}

// meant is "; did you mean `x`?" for the nearest of words, or "".
func (f *faults) meant(text string, words []string) string {
	if len(f.list) > mostHints {
		return ""
	}
	if w := unit.Nearest(text, words); w != "" {
		return "; did you mean " + tick(w) + "?"
	}
	return ""
}

// tick shows a word of the job file: `at`. Long or unprintable text is cut
// and escaped, so that a message stays one short line.
func tick(s string) string { return "`" + clean(s) + "`" }

// quote shows user text in double quotes.
func quote(s string) string { return `"` + clean(s) + `"` }

// clean makes text fit for one line of a terminal.
func clean(s string) string {
	const most = 60
	var b strings.Builder
	n := 0
	for _, r := range s {
		if n++; n > most {
			b.WriteString("...")
			break
		}
		if unicode.IsPrint(r) {
			b.WriteRune(r)
		} else {
			b.WriteString(strings.Trim(strconv.QuoteRuneToASCII(r), "'"))
		}
	}
	return b.String()
}

// list joins words for a message: "`a`, `b` or `c`".
func list(words []string) string {
	const most = 12
	shown := make([]string, 0, len(words))
	for i, w := range words {
		if i == most && len(words) > most+1 {
			return strings.Join(shown, ", ") + " ..."
		}
		shown = append(shown, tick(w))
	}
	if n := len(shown); n > 1 {
		return strings.Join(shown[:n-1], ", ") + " or " + shown[n-1]
	}
	return strings.Join(shown, "")
}
