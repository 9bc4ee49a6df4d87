package capture_test

import (
	"encoding/binary"
	"errors"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"benchslip/capture"
)

// wave is a mono 16-bit WAV file with the given samples, by the published
// layout: RIFF, fmt of 16 bytes, data.
func wave(samples ...int16) []byte {
	b := []byte("RIFF\x00\x00\x00\x00WAVEfmt \x10\x00\x00\x00\x01\x00\x01\x00\x40\x1f\x00\x00\x80\x3e\x00\x00\x02\x00\x10\x00data")
	b = binary.LittleEndian.AppendUint32(b, uint32(2*len(samples)))
	for _, s := range samples {
		b = binary.LittleEndian.AppendUint16(b, uint16(s))
	}
	binary.LittleEndian.PutUint32(b[4:], uint32(len(b)-8))
	return b
}

// Content decides, never the name.
func TestOpenGoesByContent(t *testing.T) {
	dir := t.TempDir()
	table := []byte("Time (s),Voltage (V)\n0,0.5\n0.001,-0.25\n0.002,0.125\n0.003,1\n")
	for name, c := range map[string]struct {
		data []byte
		kind string
	}{
		"a.wav": {wave(1, 2, 3), capture.Audio},
		"b.csv": {wave(1, 2, 3), capture.Audio},
		"c.wav": {table, capture.Scope},
		"d":     {table, capture.Scope},
	} {
		path := filepath.Join(dir, name)
		if err := os.WriteFile(path, c.data, 0o666); err != nil {
			t.Fatal(err)
		}
		rec, err := capture.Open(path, capture.Options{})
		if err != nil {
			t.Errorf("%s: %v", name, err)
			continue
		}
		if got := rec.Info().Kind; got != c.kind {
			t.Errorf("%s: kind %q", name, got)
		}
		rec.Close()
	}
}

// What is no recording gives one line that begins with the path, and says
// which of its kinds it is.
func TestOpenRefuses(t *testing.T) {
	dir := t.TempDir()
	file := func(name, data string) string {
		path := filepath.Join(dir, name)
		if err := os.WriteFile(path, []byte(data), 0o666); err != nil {
			t.Fatal(err)
		}
		return path
	}
	for _, c := range []struct {
		path  string
		class error
		part  string
	}{
		{filepath.Join(dir, "none.wav"), fs.ErrNotExist, "no such file"},
		{dir, capture.ErrFormat, "folder"},
		{file("empty.wav", ""), capture.ErrFormat, "empty"},
		{file("zeros.bin", strings.Repeat("\x00", 100)), capture.ErrFormat, "00 00"},
		{file("picture.bin", "\x89PNG\r\n\x1a\n\x00\x00\x00\x0dIHDR\x00\x01\x02\x03"), nil, ""},
		{file("words.txt", "the quick brown fox\njumps over the lazy dog\n"), nil, ""},
	} {
		rec, err := capture.Open(c.path, capture.Options{})
		if err == nil {
			rec.Close()
			t.Errorf("%s was opened", c.path)
			continue
		}
		var e *capture.Error
		if !errors.As(err, &e) || c.class != nil && !errors.Is(err, c.class) {
			t.Errorf("%s: %T, %v", c.path, err, err)
		}
		if text := err.Error(); !strings.HasPrefix(text, c.path) || !strings.Contains(text, c.part) || strings.Contains(text, "\n") {
			t.Errorf("message %q lacks %q", text, c.part)
		}
	}
}
