package scopecsv_test

import (
	"fmt"
	"os"
	"path/filepath"

	"benchslip/capture/recording"
	"benchslip/capture/scopecsv"
)

// A table with settings above it, semicolons, decimal commas and millivolts:
// what is read, and what had to be assumed for it.
func Example() {
	dir, _ := os.MkdirTemp("", "bench")
	defer os.RemoveAll(dir)
	path := filepath.Join(dir, "take.csv")
	_ = os.WriteFile(path, []byte("Abtastrate;10 kHz\nZeit (ms);Ausgang (mV)\n-0,1;12,5\n0,0;-3,5\n0,1;####\n0,2;7,25\n"), 0o600)

	rec, err := scopecsv.Open(path, recording.Options{})
	if err != nil {
		fmt.Println(err)
		return
	}
	in := rec.Info()
	v, _ := recording.ReadAll(rec)
	fmt.Printf("%g Hz from %g s: %s in %s %v\n", in.RateHz, in.StartS, in.Channels[0].Name, in.Channels[0].Unit, v[0])
	for _, a := range in.Assumptions {
		fmt.Println("-", a)
	}
	for _, f := range in.Flags {
		fmt.Println(f.Code+":", f.Message)
	}
	// Output:
	// 10000 Hz from -0.0001 s: Ausgang in V [0.0125 -0.0035 NaN 0.00725]
	// - text, cells parted by semicolons, decimals behind a comma
	// - time from column 1 "Zeit (ms)" (its header), in ms (its header)
	// - rate 10000 Hz from "Abtastrate", line 1; the slope of the time column over 4 rows agrees within its rounding
	// - channel 1 in mV (its header)
	// overrange: 1 sample of 4 without a value (####, first in line 5)
}
