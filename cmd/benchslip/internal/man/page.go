package main

import (
	"fmt"
	"strings"
)

// help is a command's help in parts.
type help struct {
	usage    string   // its first line
	about    []string // lines up to the first section
	sections []section
	commands []string // names below it
	shorts   []string // what each does, in one line
}

type section struct {
	title string
	lines []string
}

// titles are the sections of a help text, each a line of its own.
var titles = map[string]bool{"for example": true, "commands": true, "names": true, "options": true}

// parse takes a help text apart.
func parse(text string) help {
	var h help
	lines := strings.Split(strings.TrimRight(text, "\n"), "\n")
	h.usage = strings.TrimSpace(lines[0])
	var at *section
	for _, l := range lines[1:] {
		switch {
		case titles[l]:
			h.sections = append(h.sections, section{title: l})
			at = &h.sections[len(h.sections)-1]
		case at == nil:
			h.about = append(h.about, l)
		case l != "" && !strings.HasPrefix(l, " "):
			// What follows the options of the program itself.
			h.sections = append(h.sections, section{title: "notes"})
			at = &h.sections[len(h.sections)-1]
			at.lines = append(at.lines, l)
		default:
			at.lines = append(at.lines, l)
			if fields := strings.Fields(l); (at.title == "commands" || at.title == "names") && strings.HasPrefix(l, "  ") && len(fields) > 0 && fields[0] != "help" {
				h.commands = append(h.commands, fields[0])
				h.shorts = append(h.shorts, strings.Join(fields[1:], " "))
			}
		}
	}
	return h
}

// page sets a help text in the man macros. Help texts are laid out in columns
// already, so they stand as they are; nothing in them is taken for a request.
// short says in one line what the command does.
func page(name, short, version string, h help) string {
	var b strings.Builder
	about := trimmed(h.about)
	fmt.Fprintf(&b, ".TH %s 1 \"\" %s \"\"\n", quote(strings.ToUpper(name)), quote(version))
	fmt.Fprintf(&b, ".SH NAME\n%s \\- %s\n", escape(name), escape(short))
	fmt.Fprintf(&b, ".SH SYNOPSIS\n.B %s\n", escape(h.usage))
	block(&b, "DESCRIPTION", about)
	for _, s := range h.sections {
		block(&b, strings.ToUpper(s.title), trimmed(s.lines))
	}
	return b.String()
}

func block(b *strings.Builder, title string, lines []string) {
	if len(lines) == 0 {
		return
	}
	fmt.Fprintf(b, ".SH %s\n.nf\n", title)
	for _, l := range lines {
		b.WriteString(escape(l) + "\n")
	}
	b.WriteString(".fi\n")
}

// trimmed drops empty lines at both ends.
func trimmed(lines []string) []string {
	for len(lines) > 0 && strings.TrimSpace(lines[0]) == "" {
		lines = lines[1:]
	}
	for len(lines) > 0 && strings.TrimSpace(lines[len(lines)-1]) == "" {
		lines = lines[:len(lines)-1]
	}
	return lines
}

// escape keeps text from being read as requests: a backslash is \e, a hyphen
// that someone may copy is \-, and a line that begins with a dot or an
// apostrophe gets an empty character before it.
func escape(s string) string {
	s = strings.ReplaceAll(s, `\`, `\e`)
	s = strings.ReplaceAll(s, "-", `\-`)
	if strings.HasPrefix(s, ".") || strings.HasPrefix(s, "'") {
		s = `\&` + s
	}
	return s
}

// quote writes one argument of a request.
func quote(s string) string { return `"` + strings.ReplaceAll(escape(s), `"`, `\(dq`) + `"` }
