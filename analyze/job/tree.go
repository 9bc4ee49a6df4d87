package job

import (
	"bytes"
	"errors"
	"fmt"
	"sort"
	"strings"
	"unicode/utf8"

	"github.com/pelletier/go-toml/v2"
	"github.com/pelletier/go-toml/v2/unstable"
)

// The TOML text becomes a tree of nodes that know where they stand. The
// library's own decoder tells one type error and then stops, so values are
// judged on the tree instead; the decoder still has the last word on whether
// the text is TOML at all.

// source is one text: a file, or one option of a command line.
type source struct {
	name   string
	index  int // order among the job's texts
	data   []byte
	lines  []int // offset of each line's first byte
	option bool  // no lines: name is the option
}

// place gives line and column from 1; columns count characters.
func (s *source) place(off int) (line, col int) {
	i := sort.SearchInts(s.lines, off+1) - 1
	if i < 0 {
		return 1, 1
	}
	return i + 1, utf8.RuneCount(s.data[s.lines[i]:min(off, len(s.data))]) + 1
}

// pos is a place in a source.
type pos struct {
	src *source
	off int
}

// line returns "job.toml:12" for messages that point at another place.
func (p pos) line() string {
	if p.src.option {
		return p.src.name
	}
	n, _ := p.src.place(p.off)
	return fmt.Sprintf("%s:%d", p.src.name, n)
}

type kind int

const (
	tableKind kind = iota
	arrayKind
	stringKind
	integerKind
	floatKind
	boolKind
	dateKind // date, time or both
)

var kindNames = [...]string{"a table", "a list", "text in quotes", "a whole number", "a number", "true or false", "a date"}

// node is a value, a table or a list.
type node struct {
	kind kind
	at   pos    // of the value; of the header's name for [tables]
	key  pos    // of the key that holds it
	text string // string: its content; other scalars: as typed

	items []*node          // list
	names []string         // table: keys in the order of the text
	under map[string]*node // table

	headed bool // table that a [header] opened
	closed bool // inline table or list: nothing can be added
	broken bool // a line of this table could not be read: say nothing about what it lacks
}

func newTable(at, key pos) *node {
	return &node{kind: tableKind, at: at, key: key, under: map[string]*node{}}
}

func (n *node) get(name string) *node {
	if n == nil {
		return nil
	}
	return n.under[name]
}

func (n *node) put(name string, v *node) {
	n.names = append(n.names, name)
	n.under[name] = v
}

// newSource strips a byte-order mark and finds the lines.
func newSource(name string, index int, data []byte) *source {
	data = bytes.TrimPrefix(data, []byte("\xef\xbb\xbf"))
	s := &source{name: name, index: index, data: data, lines: []int{0}}
	for i, b := range data {
		if b == '\n' {
			s.lines = append(s.lines, i+1)
		}
	}
	return s
}

// parseTree reads the text into a tree. Syntax errors go to f; reading goes
// on after them where that is safe, with the tables concerned marked broken.
func parseTree(s *source, f *faults) *node {
	root := newTable(pos{s, 0}, pos{s, 0})
	if why, off := encoding(s.data); why != "" {
		f.add(pos{s, off}, "%s: save the file as UTF-8 text", why)
		root.broken = true
		return root
	}
	b := &builder{src: s, faults: f, root: root, table: root}
	before := len(f.list)
	for base := 0; base < len(s.data); {
		var ok bool
		if base, ok = b.run(base); ok {
			break
		}
	}
	if len(f.list) == before {
		b.lastWord()
	}
	return root
}

// encoding says why the bytes are no text and where; "" when they are.
func encoding(data []byte) (why string, off int) {
	if bytes.HasPrefix(data, []byte("\xff\xfe")) || bytes.HasPrefix(data, []byte("\xfe\xff")) {
		return "the file is UTF-16", 0
	}
	for i := 0; i < len(data); {
		r, n := utf8.DecodeRune(data[i:])
		switch {
		case r == 0:
			return "the file holds zero bytes, so it is no text", i
		case r == utf8.RuneError && n == 1:
			return "the file is not UTF-8", i
		}
		i += n
	}
	return "", 0
}

// builder turns the parser's expressions into the tree.
type builder struct {
	src    *source
	faults *faults
	root   *node
	table  *node // the table that key = value lines go into; nil: skip them
}

// run parses from byte base on. It returns true at the end of the text, else
// the byte to go on from after a syntax error.
func (b *builder) run(base int) (int, bool) {
	var p unstable.Parser
	rest := b.src.data[base:]
	p.Reset(rest)
	end := 0 // of the last good expression
	for p.NextExpression() {
		e := p.Expression()
		switch e.Kind {
		case unstable.Table, unstable.ArrayTable:
			b.open(e, base)
		case unstable.KeyValue:
			if b.table != nil {
				b.keyValue(b.table, e, base)
			}
		}
		if r := lastRange(e); int(r.Offset+r.Length) > end {
			end = int(r.Offset + r.Length)
		}
	}
	err := p.Error()
	if err == nil {
		return len(b.src.data), true
	}
	off := len(rest)
	var pe *unstable.ParserError
	message := err.Error()
	if errors.As(err, &pe) {
		message = pe.Message
		if len(pe.Highlight) > 0 {
			off = int(p.Range(pe.Highlight).Offset)
		}
	}
	return b.recover(base+off, base+end, message)
}

// lastRange is the last byte range known of an expression.
func lastRange(e *unstable.Node) unstable.Range {
	if e.Kind == unstable.KeyValue {
		return e.Raw
	}
	var last unstable.Range
	for it := e.Key(); it.Next(); {
		last = it.Node().Raw
	}
	return last
}

// recover tells a syntax error at byte off and finds where to go on. Only a
// fault that stands in the line in which its expression began is stepped
// over; good is the end of the last expression that was understood.
func (b *builder) recover(off, good int, message string) (int, bool) {
	data := b.src.data
	start := bytes.LastIndexByte(data[:min(off, len(data))], '\n') + 1
	line := data[start:]
	next := len(data)
	if i := bytes.IndexByte(line, '\n'); i >= 0 {
		line, next = line[:i], start+i+1
	}
	text, col := syntaxText(string(bytes.TrimRight(line, "\r")), message, off-start)
	b.faults.add(pos{b.src, start + col}, "%s", text)
	if b.table != nil {
		b.table.broken = true
	}
	b.root.broken = true
	header := bytes.HasPrefix(bytes.TrimLeft(line, " \t"), []byte("["))
	switch between := bytes.TrimSpace(blankComments(data[good:max(start, good)])); {
	case good > start, len(between) > 0 && !onlyTail(between):
		return len(data), true // the expression began lines above: no telling where it ends
	case header:
		b.table = nil // what follows belongs to a table whose name is lost
	}
	return next, next >= len(data)
}

// onlyTail reports whether text is no more than the end of a header line.
func onlyTail(text []byte) bool { return len(bytes.Trim(text, "] \t\r\n")) == 0 }

// blankComments drops comment lines and comments behind a value's end.
func blankComments(text []byte) []byte {
	var out []byte
	for _, l := range bytes.Split(text, []byte("\n")) {
		if i := bytes.IndexByte(l, '#'); i >= 0 {
			l = l[:i]
		}
		out = append(append(out, l...), '\n')
	}
	return out
}

// open follows a [table] or [[list of tables]] header.
func (b *builder) open(e *unstable.Node, base int) {
	at := b.root
	var parts []*unstable.Node
	for it := e.Key(); it.Next(); {
		parts = append(parts, it.Node())
	}
	for i, k := range parts {
		name, where := string(k.Data), pos{b.src, base + int(k.Raw.Offset)}
		next, last := at.get(name), i == len(parts)-1
		switch {
		case next == nil && last && e.Kind == unstable.ArrayTable:
			l := &node{kind: arrayKind, at: where, key: where}
			at.put(name, l)
			next = appendTable(l, where)
		case next == nil:
			next = newTable(where, where)
			at.put(name, next)
			next.headed = last
		case next.closed || next.kind != tableKind && next.kind != arrayKind:
			b.twice(name, where, next)
			b.table = nil
			return
		case next.kind == arrayKind && last && e.Kind == unstable.ArrayTable:
			next = appendTable(next, where)
		case next.kind == arrayKind && !last:
			next = next.items[len(next.items)-1]
		case next.kind == arrayKind || last && (next.headed || e.Kind == unstable.ArrayTable):
			b.twice(name, where, next)
			b.table = nil
			return
		case last:
			next.headed, next.at, next.key = true, where, where
		}
		at = next
	}
	b.table = at
}

func appendTable(l *node, where pos) *node {
	t := newTable(where, where)
	t.headed = true
	l.items = append(l.items, t)
	return t
}

func (b *builder) twice(name string, where pos, first *node) {
	b.faults.add(where, "%s is given twice, first in %s", tick(name), first.key.line())
}

// keyValue enters one key = value into table t.
func (b *builder) keyValue(t *node, e *unstable.Node, base int) {
	var parts []*unstable.Node
	for it := e.Key(); it.Next(); {
		parts = append(parts, it.Node())
	}
	for i, k := range parts {
		name, where := string(k.Data), pos{b.src, base + int(k.Raw.Offset)}
		old := t.get(name)
		if i == len(parts)-1 {
			if old != nil {
				b.twice(name, where, old)
				return
			}
			t.put(name, b.value(e.Value(), where, b.valueAt(k, base), base))
			return
		}
		if old == nil {
			old = newTable(where, where)
			t.put(name, old)
		} else if old.kind != tableKind || old.closed {
			b.twice(name, where, old)
			return
		}
		t = old
	}
}

// valueAt is the place of the value behind the last part of a key: the parser
// gives none for lists.
func (b *builder) valueAt(k *unstable.Node, base int) pos {
	off := base + int(k.Raw.Offset+k.Raw.Length)
	for off < len(b.src.data) && strings.IndexByte(" \t=", b.src.data[off]) >= 0 {
		off++
	}
	return pos{b.src, off}
}

// value turns a parsed value into a node; near is its place when the parser
// knows none.
func (b *builder) value(v *unstable.Node, key, near pos, base int) *node {
	n := &node{at: near, key: key, text: string(v.Data)}
	if v.Raw.Length > 0 {
		n.at = pos{b.src, base + int(v.Raw.Offset)}
	}
	switch v.Kind {
	case unstable.String:
		n.kind = stringKind
	case unstable.Integer:
		n.kind = integerKind
	case unstable.Float:
		n.kind = floatKind
	case unstable.Bool:
		n.kind = boolKind
	case unstable.Array:
		n.kind, n.closed = arrayKind, true
		for it := v.Children(); it.Next(); {
			n.items = append(n.items, b.value(it.Node(), key, n.at, base))
		}
	case unstable.InlineTable:
		n.kind, n.under = tableKind, map[string]*node{}
		for it := v.Children(); it.Next(); {
			b.keyValue(n, it.Node(), base)
		}
		closeAll(n)
	default:
		n.kind = dateKind
	}
	return n
}

// closeAll marks an inline table and what dotted keys made inside it.
func closeAll(n *node) {
	n.closed = true
	for _, name := range n.names {
		if c := n.under[name]; c.kind == tableKind && !c.closed {
			closeAll(c)
		}
	}
}

// lastWord asks the library's decoder whether the text is TOML after all:
// dates that are none, numbers out of range, tables defined in two ways.
func (b *builder) lastWord() {
	var all map[string]any
	err := toml.Unmarshal(b.src.data, &all)
	var de *toml.DecodeError
	switch {
	case err == nil:
	case errors.As(err, &de):
		line, col := de.Position()
		off := len(b.src.data)
		if line >= 1 && line <= len(b.src.lines) {
			off = min(b.src.lines[line-1]+max(col-1, 0), off)
		}
		b.faults.late = append(b.faults.late, fault{pos{b.src, off}, plainText(strings.TrimPrefix(de.Error(), "toml: "))})
	default:
		b.faults.late = append(b.faults.late, fault{pos{b.src, 0}, plainText(strings.TrimPrefix(err.Error(), "toml: "))})
	}
}
