package main

import (
	"go/parser"
	"go/token"
	"io/fs"
	"path/filepath"
	"slices"
	"sort"
	"strconv"
	"strings"
	"testing"
)

// The walls of the house, kept by this test:
//
//   - data flows capture -> analyze -> report, with cmd on top: a room imports
//     its own floor and the floors below, never one above;
//   - rooms of one floor do not import each other, except the contracts of
//     their floor and the stages named here;
//   - a third-party module has one owning room; tests may use the WAV module
//     as an independent reader.

// floors, from the bottom up.
var floors = []string{"capture", "analyze", "report", "cmd"}

// shared packages may be imported by every room of their floor.
var shared = []string{
	"capture/recording", "capture/unit", "capture/num",
	"analyze", "analyze/slip", "analyze/keys", "analyze/stage", "analyze/internal/...",
	"report", "report/internal/...",
	"cmd/benchslip/internal/...",
}

// stages names what else a room may import on its own floor. "*" is a list
// that gathers the others.
var stages = map[string][]string{
	"capture":           {"*"},
	"capture/stimulus":  {"capture/wav"}, // writes what is to be played
	"analyze":           {},
	"analyze/measures":  {"*"},
	"analyze/run":       {"*"},
	"analyze/look":      {"analyze/intake"},
	"analyze/plan":      {"analyze/job"}, // plans what a job names
	"analyze/calibrate": {"analyze/intake"},
	"report/renderers":  {"*"},
	"report/html":       {"report/figure", "report/text"},
	"report/pdf":        {"report/figure"},
	"report/markdown":   {"report/figure"},
}

// owners of third-party modules, by import path prefix.
var owners = map[string][]string{
	"github.com/go-audio/":           {"capture/wav"},
	"github.com/pelletier/go-toml/":  {"analyze/job"},
	"gonum.org/v1/gonum/dsp/fourier": {"analyze/internal/spectrum"},
	"gonum.org/v1/gonum/":            {"analyze"},
	"gonum.org/v1/plot":              {"report/figure", "report/pdf"},
	"codeberg.org/go-pdf/fpdf":       {"report/pdf"},
	"codeberg.org/go-fonts/":         {"report/figure", "report/pdf"},
	"golang.org/x/image":             {"report/figure", "report/pdf"},
	"github.com/spf13/":              {"cmd"},
	"golang.org/x/term":              {"cmd"},
}

// forbidden standard packages: nothing here talks to a network, and nothing
// leaves Go's type system.
var forbidden = []string{"net", "net/http", "unsafe", "C", "plugin"}

func TestImportsKeepTheWalls(t *testing.T) {
	edges := readImports(t, filepath.Join("..", ".."))
	if len(edges) < 20 {
		t.Fatalf("only %d imports found: is the walk looking at the right folder?", len(edges))
	}
	for _, e := range edges {
		if why := breach(e); why != "" {
			t.Errorf("%s imports %s: %s", e.file, e.path, why)
		}
	}
}

// TestImportsNoticesBreaches gives breach one of each kind.
func TestImportsNoticesBreaches(t *testing.T) {
	bad := []edge{
		{room: "capture/wav", path: "benchslip/analyze"},
		{room: "analyze/tone", path: "benchslip/report"},
		{room: "report/html", path: "benchslip/cmd/benchslip"},
		{room: "capture/wav", path: "benchslip/capture/scopecsv"},
		{room: "analyze/tone", path: "benchslip/analyze/noise"},
		{room: "analyze/tone", path: "benchslip/analyze/job"},
		{room: "report/html", path: "benchslip/report/pdf"},
		{room: "analyze/tone", path: "gonum.org/v1/gonum/dsp/fourier"},
		{room: "report/html", path: "github.com/spf13/cobra"},
		{room: "analyze/run", path: "github.com/pelletier/go-toml/v2"},
		{room: "analyze/run", path: "example.org/unknown"},
		{room: "capture", path: "net/http"},
	}
	for _, e := range bad {
		if breach(e) == "" {
			t.Errorf("%s may import %s, and should not", e.room, e.path)
		}
	}
	good := []edge{
		{room: "analyze/tone", path: "benchslip/analyze/internal/sinefit"},
		{room: "analyze/tone", path: "benchslip/capture/recording"},
		{room: "capture", path: "benchslip/capture/wav"},
		{room: "capture/wav", path: "github.com/go-audio/wav"},
		{room: "report/html", path: "benchslip/analyze/slip"},
		{room: "cmd/benchslip", path: "benchslip/report/text"},
		{room: "analyze/noise", path: "gonum.org/v1/gonum/stat"},
		{room: "analyze/noise", path: "math"},
	}
	for _, e := range good {
		if why := breach(e); why != "" {
			t.Errorf("%s may not import %s: %s", e.room, e.path, why)
		}
	}
}

// edge is one import: room is the importing folder.
type edge struct {
	file, room, path string
	test             bool
}

// readImports parses the import blocks of every Go file under root.
func readImports(t *testing.T, root string) []edge {
	t.Helper()
	var edges []edge
	err := filepath.WalkDir(root, func(path string, d fs.DirEntry, err error) error {
		if err != nil {
			return err
		}
		if d.IsDir() && path != root && (strings.HasPrefix(d.Name(), ".") || d.Name() == "testdata") {
			return filepath.SkipDir
		}
		if d.IsDir() || !strings.HasSuffix(path, ".go") {
			return nil
		}
		f, err := parser.ParseFile(token.NewFileSet(), path, nil, parser.ImportsOnly)
		if err != nil {
			return err
		}
		rel, err := filepath.Rel(root, path)
		if err != nil {
			return err
		}
		rel = filepath.ToSlash(rel)
		room := filepath.ToSlash(filepath.Dir(rel))
		for _, spec := range f.Imports {
			p, err := strconv.Unquote(spec.Path.Value)
			if err != nil {
				return err
			}
			edges = append(edges, edge{rel, room, p, strings.HasSuffix(rel, "_test.go")})
		}
		return nil
	})
	if err != nil {
		t.Fatal(err)
	}
	return edges
}

// breach says what is wrong with an import; "" when nothing is.
func breach(e edge) string {
	if slices.Contains(forbidden, e.path) && !(e.test && e.path == "unsafe") {
		return "not allowed here"
	}
	inside, ours := strings.CutPrefix(e.path, "benchslip/")
	if !ours {
		return foreign(e)
	}
	from, to := floorOf(e.room), floorOf(inside)
	switch {
	case from < 0 || to < 0:
		return "a folder outside the four floors"
	case to > from:
		return "data flows " + strings.Join(floors, " -> ") + ", never back"
	case to < from || inside == e.room || matches(shared, inside) || e.test:
		return ""
	}
	if allowed := stages[e.room]; slices.Contains(allowed, "*") || slices.Contains(allowed, inside) {
		return ""
	}
	if from == len(floors)-1 {
		return "" // the command's own rooms
	}
	return "rooms of one floor do not import each other; declare a stage or move what is shared down"
}

// foreign judges an import from outside the module: standard packages have no
// dot in their first element.
func foreign(e edge) string {
	first, _, _ := strings.Cut(e.path, "/")
	if !strings.Contains(first, ".") {
		return ""
	}
	prefixes := make([]string, 0, len(owners))
	for p := range owners {
		prefixes = append(prefixes, p)
	}
	// Longest first, so that a package's own rule wins over its module's.
	sort.Slice(prefixes, func(i, j int) bool { return len(prefixes[i]) > len(prefixes[j]) })
	for _, p := range prefixes {
		if !strings.HasPrefix(e.path, p) {
			continue
		}
		for _, o := range owners[p] {
			if e.room == o || strings.HasPrefix(e.room, o+"/") {
				return ""
			}
		}
		if e.test && p == "github.com/go-audio/" {
			return ""
		}
		return "belongs to " + strings.Join(owners[p], ", ")
	}
	return "a module without an owner: give it one here and its reason in DEVELOPERS.md"
}

func floorOf(room string) int {
	first, _, _ := strings.Cut(room, "/")
	return slices.Index(floors, first)
}

// matches reports whether a pattern of the list names room; "x/..." names
// everything below x.
func matches(list []string, room string) bool {
	for _, p := range list {
		if base, all := strings.CutSuffix(p, "/..."); p == room || all && strings.HasPrefix(room, base+"/") {
			return true
		}
	}
	return false
}
