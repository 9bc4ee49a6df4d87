package intake

import (
	"context"
	"path/filepath"
	"strings"
	"testing"

	"benchslip/analyze"
)

// The file that a take was played from is opened beside it. When it cannot
// be, the take itself stays whole, and the fault names the stimulus as the
// job does.
func TestPlayed(t *testing.T) {
	x := take(filepath.Join(bench, "hum.wav"))
	x.Stimulus, x.Played = "takes/tone.wav", filepath.Join(bench, "tone.wav")
	if err := Open(context.Background(), x); err != nil || x.Fault != nil || x.PlayedFault != nil || x.PlayedRec == nil {
		t.Fatal(err, x.Fault, x.PlayedFault)
	}
	Close(x)

	x = take(filepath.Join(bench, "hum.wav"))
	x.Stimulus, x.Played = "takes/none.wav", filepath.Join(t.TempDir(), "none.wav")
	if err := Open(context.Background(), x); err != nil || x.Fault != nil || x.Rec == nil {
		t.Fatal(err, x.Fault)
	}
	defer Close(x)
	f := x.PlayedFault
	if x.PlayedRec != nil || f == nil || f.Code != analyze.MissingTake || !strings.Contains(f.Text, "takes/none.wav") || strings.Contains(f.Text, t.Name()) {
		t.Errorf("%+v", f)
	}
}
