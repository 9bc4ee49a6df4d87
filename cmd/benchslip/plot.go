package main

import (
	"bytes"
	"fmt"
	"os"
	"path/filepath"
	"regexp"
	"strconv"

	"benchslip/analyze"
	"benchslip/report/figure"
)

// svgHead is the beginning of a figure's own document: its declaration and
// the size of its root.
var svgHead = regexp.MustCompile(`^(?:<\?xml[^>]*\?>\s*)?<svg xmlns="[^"]*" viewBox="0 0 (\d+) (\d+)" width="\d+" height="\d+"`)

// stacked draws figures below each other as one SVG document.
func stacked(figs []analyze.Figure) []byte {
	var body bytes.Buffer
	width, height := 0, 0
	for i := range figs {
		svg, _ := figure.SVG(&figs[i], figs[i].ID, true)
		m := svgHead.FindSubmatchIndex(svg)
		if m == nil {
			panic("figure: an SVG without viewBox and size")
		}
		w, _ := strconv.Atoi(string(svg[m[2]:m[3]]))
		h, _ := strconv.Atoi(string(svg[m[4]:m[5]]))
		fmt.Fprintf(&body, "<svg y=\"%d\" viewBox=\"0 0 %d %d\" width=\"%d\" height=\"%d\"%s", height, w, h, w, h, svg[m[1]:])
		width, height = max(width, w), height+h
	}
	return fmt.Appendf(nil, "<?xml version=\"1.0\" encoding=\"UTF-8\"?>\n<svg xmlns=\"http://www.w3.org/2000/svg\" viewBox=\"0 0 %d %d\" width=\"%d\" height=\"%d\">\n%s</svg>\n",
		width, height, width, height, body.String())
}

// writeFile writes one file of a result, whole or not at all: beside its place
// under a dot name first.
func writeFile(path string, data []byte) error {
	tmp := filepath.Join(filepath.Dir(path), ".new-"+filepath.Base(path))
	if err := os.WriteFile(tmp, data, 0o666); err != nil {
		os.Remove(tmp)
		return fmt.Errorf("%s: cannot be written: %w", path, cause(err))
	}
	if err := os.Rename(tmp, path); err != nil {
		os.Remove(tmp)
		return fmt.Errorf("%s: cannot be written: %w", path, cause(err))
	}
	return nil
}
