package run

import (
	"context"
	"fmt"
	"math"
	"time"

	"benchslip/analyze"
	"benchslip/analyze/intake"
	"benchslip/capture"
	"benchslip/capture/recording"
)

// openTakes opens every take, several at once. A take that is missing or
// cannot be read keeps its fault; the others go on.
func openTakes(ctx context.Context, takes []*analyze.Take, date string, opt Options, tell func(string)) error {
	errs := make([]error, len(takes))
	err := parallel(ctx, opt.Workers, len(takes), func(i int) {
		t := takes[i]
		errs[i] = intake.Open(ctx, t)
		t.Flags = append(t.Flags, stale(t, date)...)
		tell("read " + t.Name)
	})
	for _, e := range append(errs, err) {
		if e != nil {
			return e
		}
	}
	return nil
}

func closeTakes(takes []*analyze.Take) {
	for _, t := range takes {
		intake.Close(t)
	}
}

// calibrationDays is how long a calibration is taken as fresh (common
// practice: a year).
const calibrationDays = 365

// stale flags a take whose gear was calibrated more than a year before the
// job's date, or at another sample rate or input mode than the take's. No
// clock is read: without dates nothing is said.
func stale(t *analyze.Take, date string) []recording.Flag {
	if t.Gear == nil || t.Rec == nil {
		return nil
	}
	var flags []recording.Flag
	flag := func(format string, args ...any) {
		flags = append(flags, capture.Flag{Code: recording.StaleCalibration, Take: t.Name, Message: fmt.Sprintf(format, args...)})
	}
	g := t.Gear
	measured, err1 := time.Parse(time.DateOnly, date)
	calibrated, err2 := time.Parse(time.DateOnly, g.Calibrated)
	if err1 == nil && err2 == nil {
		days := int(math.Round(measured.Sub(calibrated).Hours() / 24))
		if days > calibrationDays {
			flag("gear %s was calibrated on %s, %d days before %s; calibrate it again", g.Name, g.Calibrated, days, date)
		}
	}
	if rate := t.Rec.Info().RateHz; g.Rate > 0 && rate > 0 && math.Abs(rate/g.Rate-1) > 1e-3 {
		flag("gear %s was calibrated at %.6g Hz, the take runs at %.6g Hz", g.Name, g.Rate, rate)
	}
	if mode, stated := t.Condition("mode"); stated && g.Mode != "" && mode != g.Mode {
		flag("gear %s was calibrated in mode %q, the take was made in mode %q", g.Name, g.Mode, mode)
	}
	return flags
}
