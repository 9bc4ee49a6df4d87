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
	"benchslip/report/json"
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
		{"slip.txt", text.Render},
		{"slip.json", json.Render},
	}
}

// File is one file of a slip; Name has slashes.
type File struct {
	Name string
	Data []byte
}

// Build renders every file of a slip: figures and their data first, slip.json
// last, holding name, size and SHA-256 of the others. The slip is not changed;
// the same slip gives the same bytes.
func Build(s *slip.Slip) ([]File, error) {
	var files []File
	done := *s
	done.Files = nil
	for _, r := range All() {
		var b bytes.Buffer
		if err := r.Render(&b, &done); err != nil {
			return nil, fmt.Errorf("%s: %w", r.Name, err)
		}
		files = append(files, File{r.Name, b.Bytes()})
		h := sha256.Sum256(b.Bytes())
		done.Files = append(done.Files, slip.File{Name: r.Name, SHA256: hex.EncodeToString(h[:]), Bytes: int64(b.Len())})
	}
	return files, nil
}
