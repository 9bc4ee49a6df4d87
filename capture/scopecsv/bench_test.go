package scopecsv

import (
	"fmt"
	"math"
	"strconv"
	"testing"

	"benchslip/capture/recording"
)

// millionRows writes the plain shape: a time column and two channels.
func millionRows(n int) []byte {
	b := []byte("Time (s),CH1 (V),CH2 (V)\n")
	for i := range n {
		b = strconv.AppendFloat(b, float64(i)*1e-6-0.1, 'f', 6, 64)
		b = append(b, ',')
		b = strconv.AppendFloat(b, math.Sin(float64(i)*0.01), 'f', 4, 64)
		b = append(b, ',')
		b = strconv.AppendFloat(b, math.Cos(float64(i)*0.0123), 'e', 5, 64)
		b = append(b, '\n')
	}
	return b
}

func BenchmarkMillionRows(b *testing.B) {
	text := millionRows(1_000_000)
	b.SetBytes(int64(len(text)))
	b.ReportAllocs()
	for b.Loop() {
		t, err := parse("a.csv", text, int64(len(text)), recording.Options{})
		if err != nil || t.info.Frames != 1_000_000 {
			b.Fatal(err, fmt.Sprint(t))
		}
	}
}
