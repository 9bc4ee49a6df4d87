// Package renderers lists every renderer of a slip and builds the slip's
// files in memory. A new renderer is one line in All.
package renderers

import (
	"bytes"
	"crypto/sha256"
	"encoding/hex"
	"fmt"
	"io"

	"benchslip/analyze/slip"
	"benchslip/report"
	"benchslip/report/csv"
	"benchslip/report/figure"
	"benchslip/report/html"
	"benchslip/report/json"
	"benchslip/report/junit"
	"benchslip/report/markdown"
	"benchslip/report/pdf"
	"benchslip/report/text"
)

// Renderer writes one file of a slip.
type Renderer struct {
	Name   string // of the file: "slip.html"
	Render func(io.Writer, *slip.Slip) error
}

// All lists the renderers in the order of the files. slip.json comes last: it
// holds the hashes of the others.
func All() []Renderer {
	return []Renderer{
		{"slip.html", html.Render},
		{"slip.txt", text.Render},
		{"slip.csv", csv.Render},
		{"slip.pdf", pdf.Render},
		{"slip.md", markdown.Render},
		{"slip.xml", junit.Render},
		{"slip.json", json.Render},
	}
}

// File is one file of a slip; Name has slashes.
type File struct {
	Name string
	Data []byte
}

// Build renders every file of a slip: the figures in plots/ with their data
// beside them, the documents, and slip.json last, which holds name, size and
// SHA-256 of the others. The slip is not changed; the same slip gives the same
// bytes. Writing them to a folder is the caller's part.
func Build(s *slip.Slip) ([]File, error) {
	var files []File
	done := *s
	done.Files = nil
	add := func(name string, data []byte) {
		files = append(files, File{name, data})
		h := sha256.Sum256(data)
		done.Files = append(done.Files, slip.File{Name: name, SHA256: hex.EncodeToString(h[:]), Bytes: int64(len(data))})
	}
	for _, f := range report.Figures(s) {
		svg, _ := figure.SVG(f.Figure, f.Name, true)
		add("plots/"+f.Name+".svg", svg)
		add("plots/"+f.Name+".csv", figure.CSV(f.Figure))
	}
	for _, r := range All() {
		var b bytes.Buffer
		if err := r.Render(&b, &done); err != nil {
			return nil, fmt.Errorf("%s: %w", r.Name, err)
		}
		add(r.Name, b.Bytes())
	}
	return files, nil
}
