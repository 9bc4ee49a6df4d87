//go:build unix

package wav

import (
	"errors"
	"path/filepath"
	"strings"
	"syscall"
	"testing"

	"benchslip/capture/recording"
)

func TestPipe(t *testing.T) {
	path := filepath.Join(t.TempDir(), "take.wav")
	if err := syscall.Mkfifo(path, 0o600); err != nil {
		t.Skip(err)
	}
	if _, err := Open(path); !errors.Is(err, recording.ErrFormat) || !strings.Contains(err.Error(), "pipe") {
		t.Errorf("got %v", err)
	}
}
