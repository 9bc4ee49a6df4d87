package main

import (
	"context"
	"fmt"
	"path/filepath"
	"strconv"
	"strings"
	"time"

	"github.com/spf13/cobra"

	"benchslip/analyze"
	"benchslip/analyze/calibrate"
	"benchslip/analyze/job"
	"benchslip/analyze/run"
	"benchslip/capture/stimulus"
	"benchslip/capture/unit"
	"benchslip/report/renderers"
	"benchslip/report/text"
)

// calibrateOptions are the options of calibrate, as typed.
type calibrateOptions struct {
	readings, channels, loops, stimuli []string
	gear, mode, date, out              string
	meter, uncertainty, accuracy, band string
}

func (a *app) calibrateCommand() *cobra.Command {
	o := &calibrateOptions{}
	cmd := &cobra.Command{
		Use:   "calibrate FILE --reading VOLTS [FILE --reading VOLTS ...] | --loop FILE --out DIR",
		Short: "find volts at full scale from takes of a tone and meter readings",
		Long: `Finds a recorder's volts at digital full scale from a take of a tone and what a
meter read across the same input, and prints it as a gear entry for a job file.
Each FILE goes with the --reading (RMS) and --channel in the same place. Two
levels 20 dB apart must agree within 0.05 dB: a gain control or limiter in the
path shows itself there. Files of a scope give its probe factor.

Hand-held meters are right at 60 to 400 Hz and read low above; play a tone there
and state with --meter-band where yours holds.

With --loop, recordings of the recorder's own output in its own input give a slip
of its own: floor, hum, distortion, match and separation of channels, clock, and
from a sweep (--stimulus) its flatness.`,
		Example: `benchslip stimulus tone at=220Hz --out tone220.wav
benchslip calibrate loud.wav --reading "1.300 V" soft.wav --reading "0.1300 V" --channel 1 --gear recorder --accuracy "0.5 % + 1 mV" > gear/recorder.toml
benchslip calibrate --loop loop.wav --out loopback`,
	}
	f := cmd.Flags()
	f.SortFlags = false
	f.StringArrayVar(&o.readings, "reading", nil, "what the meter read, RMS: `VOLTS` like \"1.300 V\" or \"4.00 dBu\", one a FILE")
	f.StringArrayVar(&o.channels, "channel", nil, "channel `N` of the file, one for all or one a FILE (default 1)")
	f.StringVar(&o.gear, "gear", "recorder", "`NAME` of the gear entry")
	f.StringVar(&o.uncertainty, "uncertainty", "", "the meter's expanded uncertainty (k = 2), from its certificate: `U` like \"0.5 %\"")
	f.StringVar(&o.accuracy, "accuracy", "", "or its limit of error, from its data sheet: `LIMIT` like \"0.5 % + 2 mV\"")
	f.StringVar(&o.band, "meter-band", "", "where that holds: \"`A .. B`\" like \"40 Hz .. 400 Hz\"")
	f.StringVar(&o.meter, "meter", "", "which meter it was, for the record: `TEXT`")
	f.StringVar(&o.date, "date", "", "`DATE` of the calibration, 2026-12-01; no clock is read")
	f.StringVar(&o.mode, "mode", "", "input mode it holds for: `TEXT`")
	f.StringArrayVar(&o.loops, "loop", nil, "check the recorder by itself from `FILE`, its output recorded by its input")
	f.StringArrayVar(&o.stimuli, "stimulus", nil, "what was played into that --loop: a file, or `KIND KEY=VALUE ...`")
	f.StringVarP(&o.out, "out", "o", "", "with --loop: write the slip into `DIR`")
	cmd.RunE = func(cmd *cobra.Command, args []string) error {
		if err := noStdin(cmd, append(append([]string{}, args...), o.loops...)); err != nil {
			return err
		}
		if o.date != "" {
			if _, err := time.Parse(time.DateOnly, o.date); err != nil {
				return usagef("calibrate: --date %q is no date; write it as 2026-12-01", o.date)
			}
		}
		if len(o.loops) > 0 {
			if len(args)+len(o.readings) > 0 {
				return usagef("calibrate: --loop stands for itself; calibrate with readings in a call of its own")
			}
			return a.loopback(cmd.Context(), o)
		}
		return a.calibrate(cmd.Context(), args, o)
	}
	return cmd
}

func (a *app) calibrate(ctx context.Context, args []string, o *calibrateOptions) error {
	switch {
	case o.out != "" || len(o.stimuli) > 0:
		return usagef("calibrate: --out and --stimulus go with --loop; the gear entry goes to stdout")
	case len(args) == 0:
		return usagef("calibrate: no recording named; see benchslip calibrate --help")
	case len(args) != len(o.readings):
		return usagef("calibrate: %d recordings and %d readings; each FILE takes one --reading", len(args), len(o.readings))
	case len(o.channels) > 1 && len(o.channels) != len(args):
		return usagef("calibrate: %d recordings and %d channels; state one --channel for all, or one a FILE", len(args), len(o.channels))
	}
	opt := calibrate.Options{Gear: o.gear, Mode: o.mode, Date: o.date}
	var err error
	if opt.Meter, err = o.meterOf(); err != nil {
		return err
	}
	var points []calibrate.Point
	for i, file := range args {
		p := calibrate.Point{File: filepath.ToSlash(file), Path: file, Channel: 1}
		if p.Reading, err = reading(o.readings[i]); err != nil {
			return err
		}
		if len(o.channels) > 0 {
			text := o.channels[min(i, len(o.channels)-1)]
			if p.Channel, err = strconv.Atoi(text); err != nil || p.Channel < 1 {
				return usagef("calibrate: --channel %q: expected a number from 1", text)
			}
		}
		points = append(points, p)
	}
	e, err := calibrate.Run(ctx, points, opt)
	if err != nil {
		return err
	}
	fmt.Fprint(&a.out, e.TOML())
	return nil
}

// reading reads a meter's RMS.
func reading(text string) (unit.Quantity, error) {
	q, err := unit.Parse(text)
	switch {
	case err != nil:
		return q, usagef("calibrate: --reading %v", err)
	case q.Unit.Dim != unit.Volt:
		return q, usagef("calibrate: --reading %q: expected a voltage, like \"1.300 V\"", text)
	case q.Linear() <= 0:
		return q, usagef("calibrate: --reading %q: an RMS lies above 0 V", text)
	}
	return q, nil
}

func (o *calibrateOptions) meterOf() (m calibrate.Meter, err error) {
	m.Name = o.meter
	if o.uncertainty != "" && o.accuracy != "" {
		return m, usagef("calibrate: both --uncertainty and --accuracy are stated; keep the one that the meter's papers give")
	}
	if o.uncertainty != "" {
		q, err := unit.Parse(o.uncertainty)
		switch {
		case err != nil:
			return m, usagef("calibrate: --uncertainty %v", err)
		case q.Unit.Dim != unit.Ratio && q.Unit.Dim != unit.Volt || q.Unit.IsLog() && q.Unit.Symbol != "dB" || q.Number < 0:
			return m, usagef("calibrate: --uncertainty %q: expected a part of the reading or volts, like \"0.5 %%\"", o.uncertainty)
		}
		m.Expanded = &q
	}
	if o.accuracy != "" {
		if m.Limit, err = calibrate.ParseLimit(o.accuracy); err != nil {
			return m, usagef("calibrate: --accuracy %v", err)
		}
	}
	if o.band != "" {
		lo, hi, ok := strings.Cut(o.band, "..")
		f1, err1 := unit.Parse(lo)
		f2, err2 := unit.Parse(hi)
		if !ok || err1 != nil || err2 != nil || f1.Unit.Dim != unit.Hertz || f2.Unit.Dim != unit.Hertz || !(f1.Linear() < f2.Linear()) {
			return m, usagef("calibrate: --meter-band %q: expected two frequencies, like \"40 Hz .. 400 Hz\"", o.band)
		}
		m.Band = &analyze.Band{Low: f1.Linear(), High: f2.Linear()}
	}
	return m, nil
}

// loopJobFile is the name of the generated job beside the slip.
const loopJobFile = "loop.toml"

// loopback writes the slip of a recorder by itself.
func (a *app) loopback(ctx context.Context, o *calibrateOptions) error {
	if o.out == "" {
		return usagef("calibrate: no folder for the slip; write --out DIR")
	}
	if len(o.stimuli) > len(o.loops) {
		return usagef("calibrate: %d --stimulus for %d --loop", len(o.stimuli), len(o.loops))
	}
	dir, err := calibrate.OneFolder(o.loops)
	if err != nil {
		return err
	}
	var loops []calibrate.Loopback
	for i, path := range o.loops {
		l := calibrate.Loopback{File: filepath.Base(path), Path: path}
		if i < len(o.stimuli) && o.stimuli[i] != "" {
			if l.Spec, err = specOf(o.stimuli[i]); err != nil {
				return err
			}
		}
		loops = append(loops, l)
	}
	source, err := calibrate.LoopJob(ctx, loops, calibrate.LoopOptions{Gear: o.gear, Mode: o.mode, Date: o.date})
	if err != nil {
		return err
	}
	j, err := job.Parse(loopJobFile, dir, []byte(source), job.Options{Headers: header})
	if err != nil {
		a.jobFaults(err)
		return nil
	}
	bar := newProgress(a, false)
	s, err := run.Run(ctx, j, run.Options{Version: version, FullScale: true, Progress: bar.step})
	bar.done()
	if err != nil {
		return err
	}
	files, err := renderers.Build(s)
	if err != nil {
		return err
	}
	out := []outFile{{loopJobFile, []byte(source)}}
	for _, f := range files {
		out = append(out, outFile{f.Name, f.Data})
	}
	if err := (publisher{}).publish(o.out, out); err != nil {
		return err
	}
	if err := text.Summary(&a.out, s); err != nil {
		return err
	}
	fmt.Fprintf(&a.out, "\nslip %s written to %s\n", s.Sheet, filepath.ToSlash(o.out))
	return nil
}

// specOf reads what was played: a file written here, or a description.
func specOf(typed string) (*stimulus.Spec, error) {
	line := typed
	if strings.EqualFold(filepath.Ext(typed), ".wav") {
		found, ok := describes(typed)
		if !ok {
			return nil, usagef("calibrate: --stimulus %s: no stimulus file of ours, or not there; describe it: \"sweep from=20Hz to=20kHz\"", typed)
		}
		line = found
	}
	s, err := stimulus.Parse(line)
	if err != nil {
		return nil, usagef("calibrate: --stimulus %s", strings.TrimPrefix(err.Error(), "stimulus: "))
	}
	return &s, nil
}
