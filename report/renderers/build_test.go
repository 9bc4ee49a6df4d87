package renderers

import (
	"crypto/sha256"
	"encoding/hex"
	stdjson "encoding/json"
	"path"
	"strings"
	"testing"

	"benchslip/analyze/slip"
	"benchslip/report/internal/sample"
)

func TestBuild(t *testing.T) {
	s := sample.Slip()
	files, err := Build(s)
	if err != nil {
		t.Fatal(err)
	}
	if s.Files != nil {
		t.Error("the slip was changed")
	}
	var got slip.Slip
	if err := stdjson.Unmarshal(files[len(files)-1].Data, &got); err != nil {
		t.Fatal(err)
	}
	if len(got.Files) != len(files)-1 {
		t.Errorf("slip.json lists %d files of %d", len(got.Files), len(files)-1)
	}
	seen := map[string]bool{}
	total := 0
	for i, f := range files {
		total += len(f.Data)
		if seen[strings.ToLower(f.Name)] || path.Clean(f.Name) != f.Name || strings.HasPrefix(f.Name, "..") || strings.ContainsAny(f.Name, `\: `) {
			t.Errorf("file name %q", f.Name)
		}
		seen[strings.ToLower(f.Name)] = true
		if i < len(got.Files) {
			h := sha256.Sum256(f.Data)
			if g := got.Files[i]; g.Name != f.Name || g.SHA256 != hex.EncodeToString(h[:]) || g.Bytes != int64(len(f.Data)) {
				t.Errorf("slip.json says %+v of %s", g, f.Name)
			}
		}
		if strings.HasSuffix(f.Name, ".svg") {
			if len(f.Data) > 100_000 {
				t.Errorf("%s: %d bytes", f.Name, len(f.Data))
			}
			if !hasFile(files, strings.TrimSuffix(f.Name, ".svg")+".csv") {
				t.Errorf("%s has no data beside it", f.Name)
			}
		}
	}
	if total > 2_000_000 {
		t.Errorf("%d files take %d bytes; a ticket takes 2 MB", len(files), total)
	}
}

func hasFile(files []File, name string) bool {
	for _, f := range files {
		if f.Name == name {
			return true
		}
	}
	return false
}

func BenchmarkBuildThirtyChecks(b *testing.B) {
	s := sample.Many(30)
	for b.Loop() {
		if _, err := Build(s); err != nil {
			b.Fatal(err)
		}
	}
}
