package renderers

import (
	"bytes"
	"flag"
	"os"
	"path/filepath"
	"regexp"
	"testing"

	"benchslip/report/internal/sample"
)

var update = flag.Bool("update", false, "write the golden files anew")

// golden holds the sample slip as rendered. Goldens show layout and wording;
// that numbers are right is checked where they are made.
const golden = "../../testdata/golden/sample"

// kept are the files whose bytes are kept; the others are tested by reading
// them back.
var kept = map[string]bool{"slip.txt": true, "slip.json": true, "slip.html": true, "slip.md": true, "slip.csv": true, "slip.xml": true}

var drawing = regexp.MustCompile(`(?s)(<div class="white"><svg.*?</desc>).*?</svg>\s*</div>`)

// The hashes of drawings may differ between processors by a last digit.
var hashes = regexp.MustCompile(`(?s)"files": \[.*?\n  \]`)

func TestGolden(t *testing.T) {
	files, err := Build(sample.Slip())
	if err != nil {
		t.Fatal(err)
	}
	seen := map[string]bool{}
	for _, f := range files {
		if !kept[f.Name] {
			continue
		}
		seen[f.Name] = true
		if f.Name == "slip.html" {
			// Drawings are tested where they are made; here they would drown
			// the page.
			f.Data = drawing.ReplaceAll(f.Data, []byte("$1\n(drawing)</svg></div>"))
		}
		if f.Name == "slip.json" {
			f.Data = hashes.ReplaceAll(f.Data, []byte(`"files": []`))
		}
		path := filepath.Join(golden, f.Name)
		if *update {
			if err := os.MkdirAll(golden, 0o755); err != nil {
				t.Fatal(err)
			}
			if err := os.WriteFile(path, f.Data, 0o644); err != nil {
				t.Fatal(err)
			}
			continue
		}
		want, err := os.ReadFile(path)
		if err != nil {
			t.Errorf("%v (go test -update writes it)", err)
			continue
		}
		if !bytes.Equal(f.Data, want) {
			t.Errorf("%s differs from its golden at line %d; see the difference with git diff after go test -update", f.Name, firstDifference(f.Data, want))
		}
	}
	entries, err := os.ReadDir(golden)
	if err != nil {
		t.Fatal(err)
	}
	for _, e := range entries {
		if !seen[e.Name()] {
			t.Errorf("%s is an orphan: no renderer writes it", e.Name())
		}
	}
}

func firstDifference(a, b []byte) int {
	line := 1
	for i := range min(len(a), len(b)) {
		if a[i] != b[i] {
			break
		}
		if a[i] == '\n' {
			line++
		}
	}
	return line
}

func TestSameBytes(t *testing.T) {
	first, err := Build(sample.Slip())
	if err != nil {
		t.Fatal(err)
	}
	again, err := Build(sample.Slip())
	if err != nil {
		t.Fatal(err)
	}
	for i := range first {
		if first[i].Name != again[i].Name || !bytes.Equal(first[i].Data, again[i].Data) {
			t.Errorf("%s: two builds of one slip differ", first[i].Name)
		}
	}
}
