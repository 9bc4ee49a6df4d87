package scopecsv

import (
	"os"
	"path/filepath"
	"testing"

	"benchslip/capture/recording"
)

func TestPlain(t *testing.T) {
	p := filepath.Join(t.TempDir(), "a.csv")
	os.WriteFile(p, []byte("Sample rate,1000\nTime (ms),CH1 (mV),CH2 (V)\n0,1,2\n1,-3.5,4\n2,5,6\n3,7,8\n"), 0o600)
	r, err := Open(p, recording.Options{})
	if err != nil {
		t.Fatal(err)
	}
	in := r.Info()
	if in.RateHz != 1000 || in.Frames != 4 || len(in.Channels) != 2 || in.Channels[0].Name != "CH1" {
		t.Errorf("got %+v", in)
	}
	got, err := recording.ReadAll(r)
	if err != nil || got[0][1] != -3.5e-3 || got[1][3] != 8 {
		t.Errorf("got %v, %v", got, err)
	}
}
