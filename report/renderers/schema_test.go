package renderers

import (
	stdjson "encoding/json"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"benchslip/analyze/slip"
	"benchslip/report/internal/sample"
	"benchslip/report/json/jsontest"
)

func slipJSON(t *testing.T, s *slip.Slip) []byte {
	t.Helper()
	files, err := Build(s)
	if err != nil {
		t.Fatal(err)
	}
	last := files[len(files)-1]
	if last.Name != "slip.json" {
		t.Fatalf("the last file is %s", last.Name)
	}
	return last.Data
}

func faults(t *testing.T, doc []byte) string {
	t.Helper()
	schema, err := os.ReadFile("../../testdata/slip.schema.json")
	if err != nil {
		t.Fatal(err)
	}
	f, err := jsontest.Validate(schema, doc)
	if err != nil {
		t.Fatal(err)
	}
	return strings.Join(f, "\n")
}

func TestSlipFitsTheSchema(t *testing.T) {
	if f := faults(t, slipJSON(t, sample.Slip())); f != "" {
		t.Error(f)
	}
}

// Every slip.json among the goldens is held against the schema.
func TestGoldenSlipsFitTheSchema(t *testing.T) {
	n := 0
	err := filepath.WalkDir("../../testdata/golden", func(path string, d os.DirEntry, err error) error {
		if err != nil || d.Name() != "slip.json" {
			return err
		}
		n++
		doc, err := os.ReadFile(path)
		if err != nil {
			return err
		}
		if f := faults(t, doc); f != "" {
			t.Errorf("%s:\n%s", path, f)
		}
		return nil
	})
	if err != nil || n == 0 {
		t.Errorf("%d slips found (%v)", n, err)
	}
}

// The schema notices what it is there for: each change makes a good slip bad.
func TestSchemaNotices(t *testing.T) {
	good := slipJSON(t, sample.Slip())
	for name, spoil := range map[string]func(s, check map[string]any){
		"a check without a key":  func(s, c map[string]any) { delete(c, "interval") },
		"a renamed key":          func(s, c map[string]any) { c["tolerance"] = c["uncertainty"]; delete(c, "uncertainty") },
		"an unknown verdict":     func(s, c map[string]any) { c["verdict"] = "fine" },
		"a number as text":       func(s, c map[string]any) { c["value"] = "39.98" },
		"a negative uncertainty": func(s, c map[string]any) { c["uncertainty"] = -0.1 },
		"a pass without value or bound": func(s, c map[string]any) {
			c["value"], c["uncertainty"], c["coverage"], c["margin"] = nil, nil, nil, nil
		},
		"a margin without a value":     func(s, c map[string]any) { c["value"], c["uncertainty"], c["coverage"] = nil, nil, nil },
		"a reason without a code":      func(s, c map[string]any) { c["verdict"], c["reason"] = "not-measurable", "do not know" },
		"an interval of three":         func(s, c map[string]any) { c["interval"] = []any{1, 2, 3} },
		"a contributor without a kind": func(s, c map[string]any) { delete(c["contributors"].([]any)[0].(map[string]any), "kind") },
		"a short hash":                 func(s, c map[string]any) { s["limits_sha256"] = "abc" },
		"another format":               func(s, c map[string]any) { s["format"] = 2 },
		"a job with a path":            func(s, c map[string]any) { s["job"].(map[string]any)["file"] = "a/b.toml" },
		"a take without its hash key":  func(s, c map[string]any) { delete(s["takes"].([]any)[0].(map[string]any), "sha256") },
	} {
		var s map[string]any
		if err := stdjson.Unmarshal(good, &s); err != nil {
			t.Fatal(err)
		}
		spoil(s, s["checks"].([]any)[1].(map[string]any))
		bad, err := stdjson.Marshal(s)
		if err != nil {
			t.Fatal(err)
		}
		if faults(t, bad) == "" {
			t.Errorf("%s goes unnoticed", name)
		}
	}
}
