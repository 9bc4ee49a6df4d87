package pdf

import (
	"bytes"
	"compress/zlib"
	"io"
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"strings"
	"testing"
	"unicode/utf16"

	"benchslip/analyze/slip"
	"benchslip/report"
	"benchslip/report/internal/sample"
)

func render(t *testing.T, s *slip.Slip) []byte {
	t.Helper()
	var b bytes.Buffer
	if err := Render(&b, s); err != nil {
		t.Fatal(err)
	}
	if !bytes.HasPrefix(b.Bytes(), []byte("%PDF-")) || !bytes.HasSuffix(bytes.TrimSpace(b.Bytes()), []byte("%%EOF")) {
		t.Fatal("no PDF")
	}
	return b.Bytes()
}

var (
	stream = regexp.MustCompile(`(?s)stream\r?\n(.*?)\r?\nendstream`)
	shown  = regexp.MustCompile(`(?s)\(((?:\\.|[^\\)])*)\) Tj`)
)

// texts reads the pages' content streams itself: strings are UTF-16BE, as
// PDF 1.7 (ISO 32000-1, 9.7.5) lays down for the encoding used.
func texts(t *testing.T, raw []byte) []string {
	t.Helper()
	var out []string
	for _, m := range stream.FindAllSubmatch(raw, -1) {
		z, err := zlib.NewReader(bytes.NewReader(m[1]))
		if err != nil {
			continue // a font
		}
		content, err := io.ReadAll(z)
		if err != nil {
			continue
		}
		for _, s := range shown.FindAllSubmatch(content, -1) {
			b := unescape(s[1])
			var u []uint16
			for i := 0; i+1 < len(b); i += 2 {
				u = append(u, uint16(b[i])<<8|uint16(b[i+1]))
			}
			out = append(out, string(utf16.Decode(u)))
		}
	}
	if len(out) < 15 {
		t.Fatalf("only %d texts found: the test reads the file wrong", len(out))
	}
	return out
}

func unescape(b []byte) []byte {
	var out []byte
	for i := 0; i < len(b); i++ {
		if b[i] == '\\' && i+1 < len(b) {
			i++
			if b[i] == 'r' {
				out = append(out, '\r')
				continue
			}
		}
		out = append(out, b[i])
	}
	return out
}

func TestVerdictAndNamesAreText(t *testing.T) {
	s := sample.Slip()
	all := strings.Join(texts(t, render(t, s)), " ")
	for _, want := range []string{"Fail", "1 row fails, 5 are open; 7 of 13 pass.", "Test record 9f31c2a07d44", "20.45 ± 0.12 dB", "page 1 of ",
		"End of test record 9f31c2a07d44", "This record applies only to the item tested.", "3.10 ± 0.90 µV", "Opinion"} {
		if !strings.Contains(all, want) {
			t.Errorf("no %q", want)
		}
	}
	for _, c := range s.Checks[:15] {
		if !strings.Contains(all, c.Name) {
			t.Errorf("no %q", c.Name)
		}
	}
	pages := strings.Count(all, "Test record 9f31c2a07d44") - 1 // once more in the head
	if n := strings.Count(all, "page "); n != pages || pages < 2 {
		t.Errorf("sheet number on %d pages, page number on %d", pages, n)
	}
}

// poppler is an independent reader where it is installed.
func TestPopplerReadsIt(t *testing.T) {
	tool, err := exec.LookPath("pdftotext")
	if err != nil {
		t.Skip("pdftotext is not installed")
	}
	file := filepath.Join(t.TempDir(), "slip.pdf")
	if err := os.WriteFile(file, render(t, sample.Slip()), 0o644); err != nil {
		t.Fatal(err)
	}
	var errs bytes.Buffer
	cmd := exec.Command(tool, "-layout", file, "-")
	cmd.Stderr = &errs
	out, err := cmd.Output()
	if err != nil || errs.Len() > 0 {
		t.Fatalf("%v %s", err, errs.String())
	}
	for _, want := range []string{"Lamp-room preamp after soldering", "Gain at the 40 dB step", "39.980 ± 0.060 dB", "conditional", "3.10 ± 0.90 µV", "∞"} {
		if !bytes.Contains(out, []byte(want)) {
			t.Errorf("no %q in the text", want)
		}
	}
}

func TestDates(t *testing.T) {
	s := sample.Slip()
	if raw := render(t, s); !bytes.Contains(raw, []byte("/CreationDate (D:20261201000000)")) {
		t.Error("the job's date is not the file's")
	}
	s.Record = map[string]string{}
	raw := render(t, s)
	for _, bad := range []string{"CreationDate", "ModDate", "D:20"} {
		if bytes.Contains(raw, []byte(bad)) {
			t.Errorf("an undated job has %s in its file", bad)
		}
	}
	// Offsets in the cross-reference table still point at objects.
	table := regexp.MustCompile(`(?m)^(\d{10}) 00000 n`).FindAllSubmatch(raw, -1)
	for _, m := range table {
		at := 0
		for _, c := range m[1] {
			at = at*10 + int(c-'0')
		}
		if !regexp.MustCompile(`^\d+ 0 obj`).Match(raw[at:min(len(raw), at+20)]) {
			t.Errorf("no object at %d", at)
		}
	}
	if len(table) < 10 {
		t.Errorf("%d objects", len(table))
	}
}

func TestOddSlips(t *testing.T) {
	emoji := "\U0001f527 漢字 \u202e العربية {nb} (paren\\) " + strings.Repeat("long", 200)
	for name, s := range map[string]*slip.Slip{
		"empty":     {},
		"no figure": {Title: emoji, Verdict: slip.NotJudged, Checks: []slip.Check{{Name: emoji, Measure: emoji, Verdict: emoji}}},
		"hostile": {Title: sample.Hostile, Sheet: sample.Hostile, Unit: map[string]string{sample.Hostile: sample.Hostile, emoji: emoji},
			Takes: []slip.Take{{Name: emoji, File: emoji, Fault: emoji}}, Gear: []slip.Gear{{Name: emoji}}, Cautions: []string{emoji}},
		"many": sample.Many(60),
	} {
		raw := render(t, s)
		if len(raw) > 1_000_000 {
			t.Errorf("%s: %d bytes", name, len(raw))
		}
		for _, x := range texts(t, raw) {
			for _, r := range x {
				if r < 0x20 || report.IsDirection(r) {
					t.Errorf("%s: %U in %q", name, r, x)
				}
			}
		}
	}
}

func TestSameBytes(t *testing.T) {
	if !bytes.Equal(render(t, sample.Slip()), render(t, sample.Slip())) {
		t.Error("two files of one slip differ")
	}
}

func BenchmarkThirtyChecks(b *testing.B) {
	s := sample.Many(30)
	for b.Loop() {
		if err := Render(io.Discard, s); err != nil {
			b.Fatal(err)
		}
	}
}
