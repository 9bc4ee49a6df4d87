package run

import (
	"slices"
	"testing"

	"benchslip/analyze/slip"
)

func TestSayOnce(t *testing.T) {
	rows := []slip.Check{{Opinions: []string{"a", "b"}}, {Opinions: []string{"b", "c"}}, {Opinions: []string{"a"}}}
	sayOnce(rows)
	for i, want := range [][]string{{"a", "b"}, {"c"}, {}} {
		if !slices.Equal(rows[i].Opinions, want) {
			t.Errorf("row %d: %v, want %v", i, rows[i].Opinions, want)
		}
	}
}
