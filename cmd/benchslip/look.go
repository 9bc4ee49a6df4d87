package main

import (
	"fmt"
	"math"
	"path/filepath"
	"strings"

	"github.com/spf13/cobra"

	"benchslip/analyze/intake"
	"benchslip/analyze/look"
	"benchslip/analyze/slip"
	"benchslip/capture"
	"benchslip/capture/unit"
	"benchslip/report"
	"benchslip/report/json"
)

func (a *app) lookCommand() *cobra.Command {
	var asJSON bool
	var plot string
	var csv csvOptions
	cmd := &cobra.Command{
		Use:   "look FILE...",
		Short: "say what recordings hold",
		Long: `Says what each recording holds: format, channels, rate, length, the levels of
every channel before any gear is applied, flags with their places, what was
assumed, and one plain sentence a channel.

Levels of audio files are fractions of digital full scale (FS); dBFS is relative
to the RMS of a full-scale sine. Levels of scope files are volts as written.`,
		Example: "benchslip look takes/tone.wav takes/edge.csv",
		Args:    files("recording"),
	}
	cmd.Flags().SortFlags = false
	cmd.Flags().BoolVar(&asJSON, "json", false, "print it for a program instead")
	cmd.Flags().StringVar(&plot, "plot", "", "draw waveform and spectrum of each channel of one recording into `FILE.svg`")
	csv.add(cmd)
	cmd.RunE = func(cmd *cobra.Command, args []string) error {
		opt, err := csv.options(cmd)
		if err != nil {
			return err
		}
		if plot != "" && (len(args) > 1 || !strings.EqualFold(filepath.Ext(plot), ".svg")) {
			return usagef("look: --plot draws one recording into a file that ends in .svg")
		}
		doc := struct {
			Format int          `json:"format"`
			Files  []*look.File `json:"files"`
		}{Format: 1}
		for _, path := range args {
			f, fault, err := look.Open(cmd.Context(), filepath.ToSlash(path), path, opt, plot != "")
			if err != nil {
				return err
			}
			if fault != nil {
				a.message("benchslip: %s", intake.Line(fault))
				a.status = exitFault
				continue
			}
			doc.Files = append(doc.Files, f)
		}
		if len(doc.Files) == 0 {
			return nil
		}
		if plot != "" {
			if len(doc.Files[0].Figures) == 0 {
				return fmt.Errorf("%s: nothing to draw: no channel has a rate and a value in every sample", args[0])
			}
			if err := writeFile(plot, stacked(doc.Files[0].Figures)); err != nil {
				return err
			}
		}
		if asJSON {
			a.raw = true
			return json.Write(&a.out, doc)
		}
		for i, f := range doc.Files {
			if i > 0 {
				fmt.Fprintln(&a.out)
			}
			a.printLook(f)
		}
		return nil
	}
	return cmd
}

// csvOptions are the options that help with text files, named as in a job's
// [takes.NAME.csv].
type csvOptions struct {
	separator, decimal, timeColumn, timeUnit, rate, valueUnit string
	skip                                                      int
	resample                                                  bool
}

func (c *csvOptions) add(cmd *cobra.Command) {
	f := cmd.Flags()
	f.StringVar(&c.separator, "csv-separator", "", "`WORD` between CSV columns: \",\" \";\" \"tab\" \"blank\"")
	f.StringVar(&c.decimal, "csv-decimal", "", "decimal `MARK` of a CSV: \".\" or \",\"")
	f.IntVar(&c.skip, "csv-skip", 0, "`ROWS` to skip at the top of a CSV")
	f.StringVar(&c.timeColumn, "csv-time-column", "", "`NAME` or number of a CSV's time column, or \"none\"")
	f.StringVar(&c.timeUnit, "csv-time-unit", "", "`UNIT` of a CSV's times: s, ms, us, ns")
	f.StringVar(&c.rate, "csv-rate", "", "sample `RATE` of a CSV: \"10 MHz\"")
	f.StringVar(&c.valueUnit, "csv-value-unit", "", "`UNIT` of a CSV's values: V, mV, uV")
	f.BoolVar(&c.resample, "csv-resample", false, "put a CSV's samples taken at uneven times on an even grid")
}

func (c *csvOptions) options(cmd *cobra.Command) (capture.Options, error) {
	opt := capture.Options{Separator: c.separator, Decimal: c.decimal, Skip: c.skip,
		TimeColumn: c.timeColumn, TimeUnit: c.timeUnit, ValueUnit: c.valueUnit, Resample: c.resample}
	if c.rate != "" {
		q, err := unit.Parse(c.rate)
		if err != nil || q.Unit.Dim != unit.Hertz || q.Linear() <= 0 {
			return opt, usagef("%s: --csv-rate %q is no rate; write it as \"10 MHz\"", words(cmd), c.rate)
		}
		opt.RateHz = q.Linear()
	}
	return opt, nil
}

func (a *app) printLook(f *look.File) {
	out := &a.out
	fmt.Fprintf(out, "%s\n", f.File)
	channels := count(int64(*f.Channels), "channel")
	rate := "rate unknown"
	if f.RateHz != nil {
		rate = rateText(*f.RateHz)
	}
	fmt.Fprintf(out, "  format   %s, %s, %s\n", *f.Format, channels, rate)
	length := fmt.Sprintf("%s, %d bytes", count(*f.Frames, "frame"), *f.Bytes)
	if f.DurationS != nil {
		length = fmt.Sprintf("%.7g s, %s", *f.DurationS, length)
	}
	fmt.Fprintf(out, "  length   %s\n", length)
	for _, s := range f.Assumptions {
		fmt.Fprintf(out, "  assumed  %s\n", report.Clean(s))
	}
	for _, fl := range f.Flags {
		fmt.Fprintf(out, "  flag     %s\n", flagText(fl))
	}
	rows := [][]string{{"channel", "mean", "RMS", "lowest", "highest", "peak", "crest", ""}}
	for _, l := range f.Levels {
		rows = append(rows, levelRow(l))
	}
	fmt.Fprint(out, columns(rows, "  "))
	for _, l := range f.Levels {
		if l.Text != "" {
			fmt.Fprintf(out, "  %s: %s\n", channelName(l), l.Text)
		}
	}
}

func count(n int64, what string) string {
	if n == 1 {
		return "1 " + what
	}
	return fmt.Sprintf("%d %ss", n, what)
}

// rateText prints a sample rate with all its digits: "44.1 kHz".
func rateText(hz float64) string {
	switch {
	case hz >= 1e6:
		return fmt.Sprintf("%.7g MHz", hz/1e6)
	case hz >= 1e3:
		return fmt.Sprintf("%.7g kHz", hz/1e3)
	}
	return fmt.Sprintf("%.7g Hz", hz)
}

func channelName(l look.Level) string {
	if l.Name != "" {
		return fmt.Sprintf("%d (%s)", l.Channel, report.Clean(l.Name))
	}
	return fmt.Sprint(l.Channel)
}

func levelRow(l look.Level) []string {
	show := func(x *float64) string {
		switch {
		case x == nil:
			return "-"
		case l.Unit == "V":
			return unit.Pretty(*x, unit.Volt)
		}
		return strings.TrimSpace(fmt.Sprintf("%.6g %s", *x, l.Unit))
	}
	row := []string{channelName(l), show(l.Mean), show(l.RMS), show(l.Min), show(l.Max), show(l.Peak), "-", ""}
	if l.Crest != nil {
		row[6] = fmt.Sprintf("%.2f dB", 20*math.Log10(*l.Crest))
	}
	if l.Unit == "FS" && l.RMS != nil && *l.RMS > 0 {
		row[7] = fmt.Sprintf("RMS %.2f dBFS", 20*math.Log10(*l.RMS/unit.FullScaleSine))
	}
	return row
}

// flagText is a flag in one line: code, channel, message.
func flagText(f slip.Flag) string {
	where := ""
	if f.Channel != nil {
		where = fmt.Sprintf(" (channel %d)", *f.Channel)
	}
	return f.Code + where + ": " + report.Clean(f.Message)
}

// columns sets rows in columns of equal width, the last as wide as it is.
func columns(rows [][]string, indent string) string {
	var width []int
	for _, r := range rows {
		for c, s := range r {
			if c == len(width) {
				width = append(width, 0)
			}
			width[c] = max(width[c], report.Width(s))
		}
	}
	var b strings.Builder
	for _, r := range rows {
		line := indent
		for c, s := range r {
			line += s + strings.Repeat(" ", width[c]-report.Width(s)+2)
		}
		b.WriteString(strings.TrimRight(line, " ") + "\n")
	}
	return b.String()
}
