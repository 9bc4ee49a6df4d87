//go:build unix

package scopecsv

import (
	"path/filepath"
	"syscall"
	"testing"
	"time"

	"benchslip/capture/recording"
)

func TestPipesAreNotOpened(t *testing.T) {
	fifo := filepath.Join(t.TempDir(), "a.csv")
	if err := syscall.Mkfifo(fifo, 0o600); err != nil {
		t.Skip(err)
	}
	done := make(chan error, 1)
	go func() { _, err := Open(fifo, recording.Options{}); done <- err }()
	select {
	case err := <-done:
		if err == nil {
			t.Error("a pipe was opened")
		}
	case <-time.After(5 * time.Second):
		t.Fatal("Open waits on a pipe")
	}
}
