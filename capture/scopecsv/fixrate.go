package scopecsv

import (
	"fmt"
	"math"
	"strconv"

	"benchslip/capture/recording"
)

// Three sources of the rate are compared: the slope of time on row over the
// whole record, the stated interval, and the median step. Two agree when they
// differ by less than the rounding of what they were read from:
//
//	slope   one unit of the stamps' last digit over the longest stretch
//	median  one unit of the stamps' last digit over one step
//	stated  half a unit of its own last digit
//
// plus slackRate for figures that were computed in single precision.
const slackRate = 2e-6

// maxPlaces is how many flags of one kind name their own place.
const maxPlaces = 8

// fixRate finds rate and start and flags what is doubtful about them.
func (a *assembly) fixRate() error {
	stated, err := a.stated()
	if err != nil {
		return err
	}
	switch {
	case a.time >= 0:
		return a.rateFromColumn(stated)
	case a.index >= 0:
		a.indexBreaks()
	}
	switch {
	case a.opt.RateHz > 0:
		a.info.RateHz = a.opt.RateHz
		a.assume("rate %s Hz from csv.rate of the job", hz(a.info.RateHz))
	case stated != nil:
		a.info.RateHz = stated.rate
		a.assume("rate %s Hz from %q, line %d; there is no time column", hz(stated.rate), stated.key, stated.line)
	default:
		what := "the file states no sample rate and has no time column"
		if len(a.set.named) > 0 {
			what = fmt.Sprintf("the file names %q but gives no value for it", a.set.named[0])
		}
		a.flag(recording.RateDoubt, 0, nil, nil, "%s; state it: %s", what, rateKey)
	}
	if len(a.set.start) > 0 && a.info.RateHz > 0 {
		s := a.set.start[0]
		a.info.StartS = s.v
		a.assume("first sample at %s s from %q, line %d", short(s.text), s.key, s.line)
	}
	return nil
}

// stated is the one interval that the settings state. Two that differ by more
// than their digits are refused unless a time column or the job decides.
func (a *assembly) stated() (*figure, error) {
	var best *figure
	for i := range a.set.interval {
		s := &a.set.interval[i]
		switch {
		case best == nil:
			best = s
		case math.Abs(s.v-best.v) <= s.half+best.half+slackRate*best.v:
			if s.half < best.half*0.999 {
				best = s
			}
		case a.time >= 0:
			// The time column is the judge: keep the one nearer to it.
			m := a.measure()
			if math.Abs(s.v-m.step) < math.Abs(best.v-m.step) {
				best = s
			}
		case a.opt.RateHz > 0:
		default:
			return nil, a.fault(s.line, recording.ErrAmbiguous, fmt.Sprintf("%q is %s here, %q in line %d is %s", s.key, short(s.text), best.key, best.line, short(best.text)), "say which holds: "+rateKey)
		}
	}
	return best, nil
}

func (a *assembly) measure() timing {
	if a.timed == nil {
		m := measureTime(a.stamp, a.grain)
		a.timed = &m
	}
	return *a.timed
}

// rateFromColumn weighs the time column against what is stated.
func (a *assembly) rateFromColumn(stated *figure) error {
	m := a.measure()
	n := len(a.stamp)
	for _, v := range a.stamp {
		if v == v {
			a.info.StartS = v
			break
		}
	}
	if n < 2 || !(m.step > 0) {
		switch {
		case a.opt.RateHz > 0:
			a.info.RateHz = a.opt.RateHz
			a.assume("rate %s Hz from csv.rate of the job", hz(a.info.RateHz))
		case stated != nil:
			a.info.RateHz = stated.rate
			a.assume("rate %s Hz from %q, line %d", hz(stated.rate), stated.key, stated.line)
			if n > 1 {
				a.flag(recording.RateDoubt, 0, nil, nil, "%s never rises; the rate is the stated one", a.title(a.time))
			}
		default:
			a.flag(recording.RateDoubt, 0, nil, nil, "%s gives no rate (%s); state it: %s", a.title(a.time), plural(n, "row"), rateKey)
		}
		return nil
	}
	a.flagColumn(m)
	slope := figure{v: m.step, half: m.bound, rate: 1 / m.step}
	median := figure{v: m.median, half: 1.01 * m.q}
	medianOK := agree(slope, median, 1e-4)
	switch {
	case a.opt.RateHz > 0:
		a.info.RateHz = a.opt.RateHz
		a.assume("rate %s Hz from csv.rate of the job", hz(a.opt.RateHz))
		if d := a.opt.RateHz*m.step - 1; m.usable && math.Abs(d) > 500e-6+m.bound/m.step {
			a.flag(recording.RateDoubt, 0, nil, nil, "the job says %s Hz, the time column %s Hz", hz(a.opt.RateHz), hz(1/m.step))
		}
	case m.usable && (medianOK || stated == nil || agree(slope, *stated, slackRate)):
		a.rateFromSlope(m, slope, stated)
		if err := a.checkThousand(m.step, stated); err != nil {
			return err
		}
	case stated != nil && agree(*stated, median, slackRate):
		a.info.RateHz = stated.rate
		a.assume("rate %s Hz from %q, line %d; the median step agrees", hz(stated.rate), stated.key, stated.line)
		a.flag(recording.RateDoubt, 0, nil, nil, "the time column's slope is %s a sample, the stated interval %s, the median step %s: the slope is dropped", seconds3(m.step), seconds3(stated.v), seconds3(m.median))
	case stated != nil:
		return a.fault(a.lineOf(max(m.worstAt, 0)), recording.ErrAmbiguous,
			fmt.Sprintf("the rate is in doubt: slope of the time column %s a sample, median step %s, %q (line %d) %s", seconds3(m.step), seconds3(m.median), stated.key, stated.line, seconds3(stated.v)),
			"say which holds: "+rateKey)
	case m.pairs:
		a.flag(recording.RateDoubt, 0, nil, nil, "two rows a time stamp give no sample rate; state it if they are samples: %s", rateKey)
	default:
		a.flag(recording.RateDoubt, 0, nil, nil, "no one rate fits the time column (median step %s, mean %s); state one: %s, or set resample = true there", seconds3(m.median), seconds3(m.step), rateKey)
	}
	if a.opt.Resample && !m.even && !m.pairs {
		return a.resample(m, stated)
	}
	return nil
}

// agree compares two intervals with the rounding of both.
func agree(x, y figure, slack float64) bool {
	return math.Abs(x.v-y.v) <= x.half+y.half+slack*math.Abs(x.v)
}

// rateFromSlope takes the rate from the time column, or the stated figure
// where the column cannot tell it apart from the slope.
func (a *assembly) rateFromSlope(m timing, slope figure, stated *figure) {
	rows := fmt.Sprintf("the slope of the time column over %d rows", len(a.stamp))
	switch {
	case stated != nil && math.Abs(stated.v-slope.v) <= slope.half+slackRate*1e-3*slope.v && !a.statedIsRounded(m, stated):
		a.info.RateHz = stated.rate
		a.assume("rate %s Hz from %q, line %d; %s agrees within its rounding", hz(a.info.RateHz), stated.key, stated.line, rows)
	default:
		a.info.RateHz = m.rate(len(a.stamp))
		a.assume("rate %s Hz from %s", hz(a.info.RateHz), rows)
		if stated == nil {
			return
		}
		if agree(slope, *stated, slackRate) {
			a.assume("%q, line %d, agrees within its digits", stated.key, stated.line)
			return
		}
		a.flag(recording.RateDoubt, 0, nil, nil, "%q (line %d) says %s a sample, the rows step %s (median %s): the rows are taken", stated.key, stated.line, seconds3(stated.v), seconds3(m.step), seconds3(m.median))
	}
}

// statedIsRounded says whether the stated figure looks like a rounded form of
// the column's own, rounder one: 1.5873e+06 Hz beside steps of 0.63 us.
func (a *assembly) statedIsRounded(m timing, stated *figure) bool {
	own := m.rate(len(a.stamp))
	return math.Abs(1/own-stated.v) <= stated.half*1.01 && own != stated.rate && digitsOf(own) < digitsOf(stated.rate) && digitsOf(own) < digitsOf(stated.v)
}

// digitsOf is the number of significant digits of the rounder of v and 1/v.
func digitsOf(v float64) int {
	n := func(x float64) int { return len(strconv.FormatFloat(rounded(x, 1e-12), 'e', -1, 64)) }
	return min(n(v), n(1/v))
}

// rate is the rate of a fitted column of n rows: the roundest figure within
// the fit's uncertainty. Rounded stamps leave the slope with about
// q/n^1.5 (uniform rounding errors), jitter with 3.5 rms/n^1.5.
func (m timing) rate(n int) float64 {
	u := m.q
	if !m.even {
		u = math.Max(u, 3.5*m.rms)
	}
	slack := 2 * u / math.Pow(float64(n), 1.5)
	if m.worst < 0.02*m.q {
		slack = m.noise / math.Pow(float64(n), 1.5) // every step is the same to the last digit: that is the step
	}
	return roundRate(m.step, math.Min(slack, m.bound)/m.step)
}

// checkThousand refuses a stated interval that is a power of 1000 away from
// the column's: one of the two has the wrong unit, and with it the rate.
func (a *assembly) checkThousand(step float64, stated *figure) error {
	if stated == nil || a.opt.TimeUnit != "" {
		return nil
	}
	e := math.Log10(stated.v/step) / 3
	if k := math.Round(e); k != 0 && math.Abs(e-k) < 0.002 {
		return a.fault(a.headLine(), recording.ErrAmbiguous,
			fmt.Sprintf("the time column steps %s if it is in s, but %q (line %d) says %s: one has the wrong unit", seconds3(step), stated.key, stated.line, seconds3(stated.v)),
			`say [takes.NAME.csv] time_unit = "ms" (or "us", "ns"), or the rate`)
	}
	return nil
}

// flagColumn flags what is odd about the time column itself.
func (a *assembly) flagColumn(m timing) {
	if a.reversed {
		a.flag(recording.TimeJitter, 0, nil, nil, "time falls from row to row; the rows were turned round so that it rises")
	}
	if a.maybeCount {
		a.flag(recording.RateDoubt, 0, nil, nil, "the first column is taken as seconds, though it may count rows; if so state the rate: %s", rateKey)
	}
	lostTimes := 0
	at := -1
	for i, v := range a.stamp {
		if v != v {
			if lostTimes++; at < 0 {
				at = i
			}
		}
	}
	if lostTimes > 0 {
		a.flag(recording.Overrange, 0, nil, nil, "%s without a readable time, the first in line %d", plural(lostTimes, "row"), a.lineOf(at))
	}
	if m.repeats > 0 {
		from, to := a.place(m.repeatAt-1, m.repeatAt)
		if m.pairs {
			a.flag(recording.DuplicateTime, 0, from, to, "every time stamp stands twice (first in lines %d and %d): pairs, perhaps of minimum and maximum, not samples in a row", a.lineOf(m.repeatAt-1), a.lineOf(m.repeatAt))
		} else {
			a.flag(recording.DuplicateTime, 0, from, to, "%s repeat the one before (first in line %d); stamps are read to %s", plural(m.repeats, "time stamp"), a.lineOf(m.repeatAt), seconds3(m.q))
		}
	}
	for i, b := range m.breaks {
		a.breakAt(b)
		if i >= maxPlaces || m.scattered {
			continue
		}
		from, to := a.place(b-1, b)
		d := a.stamp[b] - a.stamp[b-1]
		more := ""
		if i == maxPlaces-1 && len(m.breaks) > maxPlaces {
			more = fmt.Sprintf(" (and %d more)", len(m.breaks)-maxPlaces)
		}
		switch {
		case d == 0:
		case d < 0:
			if *from > *to {
				from, to = to, from
			}
			a.flag(recording.Gap, 0, from, to, "time falls back by %s at line %d: another stretch begins%s", seconds3(-d), a.lineOf(b), more)
		default:
			a.flag(recording.Gap, 0, from, to, "%s are missing before line %d (a step of %.4g samples)%s", seconds3(d-m.step), a.lineOf(b), d/m.step, more)
		}
	}
	if !m.even {
		from, to := a.place(max(m.worstAt-1, 0), m.worstAt)
		a.flag(recording.TimeJitter, 0, from, to, "time stamps are uneven: up to %s off an even grid (line %d), %s RMS, with steps of %s", seconds3(m.worst), a.lineOf(m.worstAt), seconds3(m.rms), seconds3(m.step))
	}
}

// breakAt marks that frames b-1 and b do not follow each other: an empty run,
// which every span across it meets.
func (a *assembly) breakAt(b int) {
	if len(a.joints) < maxLost {
		a.joints = append(a.joints, b)
	}
}

// indexBreaks flags rows that a count shows to be missing.
func (a *assembly) indexBreaks() {
	v := a.t.col[a.index].v
	n := 0
	for i := 1; i < len(v); i++ {
		if d := v[i] - v[i-1]; d != 1 {
			a.breakAt(i)
			if n++; n <= maxPlaces {
				a.flag(recording.Gap, 0, nil, nil, "the count goes from %g to %g at line %d", v[i-1], v[i], a.lineOf(i))
			}
		}
	}
}

// checkLength compares the number of rows with the stated one.
func (a *assembly) checkLength() error {
	if a.t.cut > 0 {
		a.flag(recording.Truncated, 0, nil, nil, "the last row, line %d, is cut off and left out", a.t.cut)
	}
	n := a.rows
	stretches := len(a.joints) + 1
	for _, s := range a.set.length {
		if s.v < 2 || s.v != math.Trunc(s.v) {
			continue
		}
		if s.v == float64(n) || s.v*float64(stretches) == float64(n) {
			return nil
		}
		for _, c := range a.chans {
			if k := a.t.col[c].count; s.v == float64(k[number]) {
				return nil
			}
		}
	}
	for _, s := range a.set.length {
		if s.v < 2 || s.v != math.Trunc(s.v) {
			continue
		}
		code, word := recording.Truncated, "only"
		if float64(n) > s.v {
			code, word = recording.SizeMended, "yet"
		}
		a.flag(code, 0, nil, nil, "%q (line %d) promises %s samples, %s %d rows are there", s.key, s.line, short(s.text), word, n)
		break
	}
	return nil
}

// hz prints a rate.
func hz(v float64) string { return strconv.FormatFloat(v, 'g', 12, 64) }
