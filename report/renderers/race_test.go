package renderers

import (
	"bytes"
	"sync"
	"testing"

	"benchslip/report/internal/sample"
)

// Several slips may be built at once; they come out as they would alone.
func TestBuildAtOnce(t *testing.T) {
	want, err := Build(sample.Slip())
	if err != nil {
		t.Fatal(err)
	}
	var group sync.WaitGroup
	for range 3 {
		group.Go(func() {
			got, err := Build(sample.Slip())
			if err != nil {
				t.Error(err)
				return
			}
			for i := range want {
				if !bytes.Equal(got[i].Data, want[i].Data) {
					t.Errorf("%s differs", want[i].Name)
				}
			}
		})
	}
	group.Wait()
}
