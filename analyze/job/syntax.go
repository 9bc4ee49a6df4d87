package job

import (
	"regexp"
	"strings"

	"benchslip/capture/unit"
)

// unquoted finds KEY = VALUE where the value was left without quotes.
var unquoted = regexp.MustCompile(`^\s*([A-Za-z0-9_.\-]+)\s*=\s*([^"'\[\]{}#]+?)\s*(#.*)?$`)

// syntaxText words a fault of the TOML syntax for someone who fills in a
// form: first the slips people make, then the parser's own message. col is
// the byte of the line where the parser stumbled; the place returned is that
// of the text in question.
func syntaxText(line, message string, col int) (string, int) {
	if m := unquoted.FindStringSubmatchIndex(line); m != nil {
		if text := unquotedText(line[m[2]:m[3]], line[m[4]:m[5]]); text != "" {
			return text, m[4]
		}
	}
	start := len(line) - len(strings.TrimLeft(line, " \t"))
	trimmed := strings.TrimSpace(line)
	switch {
	case strings.Contains(message, "escape") && strings.Contains(line, `\`):
		return "a backslash in \"...\" starts an escape: use / in paths", col
	case strings.Contains(message, "cannot have new lines"):
		return "the text is not closed: its quotes end in the line they begin in" + inLine(line), col
	case !strings.Contains(line, "=") && strings.Contains(line, ":") && !strings.HasPrefix(trimmed, "["):
		return "expected key = value, got " + quote(trimmed), start
	}
	return plainText(message) + inLine(line), col
}

// unquotedText words the fault of key = value where value lacks its quotes;
// "" when it is something else.
func unquotedText(key, value string) string {
	write := func(v string) string { return "write " + clean(key) + " = \"" + clean(v) + "\"" }
	switch strings.ToLower(value) {
	case "true", "false", "yes", "no", "on", "off":
		return "write true or false, in small letters"
	}
	if strings.Contains(value, `\`) {
		return "text stands in quotes, and paths take /: " + write(strings.ReplaceAll(value, `\`, "/"))
	}
	q, err := unit.Parse(value)
	if point := strings.Replace(value, ",", ".", 1); err != nil && point != value {
		if q, e := unit.Parse(point); e == nil && q.Unit.Dim == unit.None {
			return "decimal comma: a quantity stands in quotes, with a point and its unit, like \"" + clean(point) + " dB\""
		} else if e == nil {
			return "decimal comma: a quantity stands in quotes, with a point: " + write(point)
		}
	}
	switch {
	case err == nil && q.Unit.Dim == unit.None:
		return ""
	case err == nil:
		return "a quantity stands in quotes: " + write(value)
	case strings.Contains(value, ".."):
		return "a range stands in quotes: " + write(value)
	}
	return "text stands in quotes: " + write(value)
}

func inLine(line string) string {
	if t := strings.TrimSpace(line); t != "" {
		return " in " + quote(t)
	}
	return ""
}

// plainText takes the library's jargon out of a message.
func plainText(s string) string {
	s = strings.NewReplacer("expected newline but got", "expected the end of the line, got",
		"unexpected character", "unexpected", "at start of value", "where a value should stand",
		"invalid character at start of key", "no key begins with").Replace(s)
	return clean200(s)
}

// clean200 is clean for whole messages.
func clean200(s string) string {
	const most = 200
	out := strings.Map(func(r rune) rune {
		if r < ' ' || r == 0x7f {
			return ' '
		}
		return r
	}, s)
	if r := []rune(out); len(r) > most {
		return string(r[:most]) + "..."
	}
	return out
}
