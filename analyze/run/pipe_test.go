//go:build unix

package run

import (
	"context"
	"os"
	"strings"
	"syscall"
	"testing"

	"benchslip/analyze"
	"benchslip/analyze/slip"
)

// A pipe is never opened: a run would wait for it for ever.
func TestPipeIsNoTake(t *testing.T) {
	j := load(t, toneJob+levelRow+"max = \"2 V\"\n")
	if err := os.Remove(j.Takes[0].Path); err != nil {
		t.Fatal(err)
	}
	if err := syscall.Mkfifo(j.Takes[0].Path, 0o666); err != nil {
		t.Skip(err)
	}
	s, err := Run(context.Background(), j, Options{})
	if err != nil {
		t.Fatal(err)
	}
	if c := s.Checks[0]; c.Verdict != slip.NotMeasurable || !strings.HasPrefix(c.Reason, analyze.Unreadable) {
		t.Errorf("%s: %s", c.Verdict, c.Reason)
	}
	if s.Takes[0].SHA256 != nil || s.Takes[0].Fault == "" || s.Takes[0].Name != "tone" {
		t.Errorf("the take's entry: %+v", s.Takes[0])
	}
}
