package scopecsv

import (
	"fmt"
	"math"

	"benchslip/capture/recording"
)

// readTime turns the time column into seconds, ascending.
func (a *assembly) readTime() error {
	if a.time < 0 {
		return nil
	}
	k, h := &a.t.col[a.time], a.heads.col[a.time]
	a.stamp = k.v
	if k.count[clock] > 0 {
		return a.readClock(k)
	}
	f, from := 1.0, "no unit stated"
	switch q, _ := unitOf(k.unit); {
	case a.opt.TimeUnit != "":
		var uq quantity
		if uq, f = unitOf(a.opt.TimeUnit); uq != seconds {
			return a.fault(0, recording.ErrFormat, fmt.Sprintf("csv.time_unit %q is no unit of time", a.opt.TimeUnit), `write "s", "ms", "us" or "ns"`)
		}
		from = "csv.time_unit of the job"
		if k.glued > 0 {
			f = 1
		}
	case k.glued > 0 && q == seconds:
		from = "its cells"
	case k.glued > 0 && k.unit != "":
		return a.fault(a.lay.line, recording.ErrFormat, fmt.Sprintf("%s is to be time, its cells are in %q", a.title(a.time), k.unit), "say [takes.NAME.csv] time_column")
	case h.q == seconds:
		f, from = h.f, h.from
	case h.q != unknown:
		return a.fault(a.headLine(), recording.ErrAmbiguous, fmt.Sprintf("the unit %q of %s is no unit of time", h.unit, a.title(a.time)), `say [takes.NAME.csv] time_unit = "ms"`)
	case a.set.timeUnit.text != "":
		f, from = a.set.timeUnit.v, fmt.Sprintf("%q, line %d", a.set.timeUnit.key, a.set.timeUnit.line)
	}
	if from == "no unit stated" && a.opt.RateHz == 0 {
		var err error
		if f, from, err = a.epoch(); err != nil {
			return err
		}
	}
	if f != 1 {
		for i, v := range a.stamp {
			a.stamp[i] = scaled(v, f)
		}
	}
	unit := rounding(k.last, k.digits)
	a.grain = func(t float64) float64 { return f * unit(t/f) }
	if k.glued > 0 {
		a.grain = rounding(k.last, k.digits)
	}
	a.assume("time from %s (%s), in %s (%s)", a.title(a.time), a.timeFrom, unitName(f), from)
	a.turn()
	return nil
}

// epoch looks at unit-less stamps too large to be seconds of a record: counts
// of ms, us or ns since 1970 are told by their size (seconds since 1970 are
// below 1e10 until the year 2286), days of a spreadsheet's calendar are asked
// about, since seconds may look the same.
func (a *assembly) epoch() (f float64, from string, err error) {
	first, last := math.NaN(), math.NaN()
	for _, v := range a.stamp {
		if v == v {
			if first != first {
				first = v
			}
			last = v
		}
	}
	lo := math.Min(math.Abs(first), math.Abs(last))
	for _, u := range []struct {
		from, f float64
		name    string
	}{{1e17, 1e-9, "ns"}, {1e14, 1e-6, "us"}, {1e11, 1e-3, "ms"}} {
		if lo >= u.from && lo < u.from*1e3 {
			return u.f, "its size: " + u.name + " since 1970", nil
		}
	}
	step := math.Abs(last-first) / float64(max(1, len(a.stamp)-1))
	if lo > 20000 && lo < 80000 && step < 0.5 && step > 0 {
		for _, s := range a.set.interval {
			if math.Abs(s.v-step) < 0.01*step {
				return 1, "no unit stated", nil
			}
		}
		return 0, "", a.fault(a.lay.line, recording.ErrAmbiguous, fmt.Sprintf("%s begins at %g: seconds, or the days of a spreadsheet's calendar", a.title(a.time), first),
			`say [takes.NAME.csv] time_unit = "s", or the rate`)
	}
	return 1, "no unit stated", nil
}

func unitName(f float64) string {
	switch f {
	case 1:
		return "s"
	case 1e-3:
		return "ms"
	case 1e-6:
		return "us"
	case 1e-9:
		return "ns"
	case 1e-12:
		return "ps"
	case 60:
		return "min"
	case 3600:
		return "h"
	}
	return fmt.Sprintf("%g s", f)
}

// readClock turns clock times into seconds from the first row. A date in a
// column of its own is added; a clock without date that falls by most of a
// day has passed midnight.
func (a *assembly) readClock(k *column) error {
	from := "its clock times"
	if k.times == 0 {
		return a.fault(a.lay.line, recording.ErrAmbiguous, fmt.Sprintf("%s holds dates without a time of day", a.title(a.time)), "state the rate: "+rateKey)
	}
	dated := k.dates > 0
	for c, r := range a.role {
		if r == dateRole && !dated && a.t.col[c].count[clock] > 0 {
			for i, d := range a.t.col[c].v {
				a.stamp[i] += d
			}
			dated = true
			from += fmt.Sprintf(" and the dates of %s", a.title(c))
		}
	}
	q := k.q
	if a.millis >= 0 {
		ms := &a.t.col[a.millis]
		for i, v := range ms.v {
			a.stamp[i] += v / 1000
		}
		q = 1e-3 * pow10(ms.last)
		from += fmt.Sprintf(" and the milliseconds of %s", a.title(a.millis))
	}
	nights := 0.0
	prev := math.NaN()
	for i, v := range a.stamp {
		if v != v {
			continue
		}
		if !dated && v+nights < prev-43200 {
			nights += 86400
		}
		a.stamp[i] = v + nights
		prev = a.stamp[i]
	}
	if nights > 0 {
		from += ", midnight passed"
	}
	first := math.NaN()
	for _, v := range a.stamp {
		if v == v {
			first = v
			break
		}
	}
	a.grain = func(float64) float64 { return q }
	for i := range a.stamp {
		a.stamp[i] -= first
	}
	a.assume("time from %s (%s), counted in s from its first row", a.title(a.time), from)
	a.turn()
	return nil
}

// turn reverses a table whose time falls.
func (a *assembly) turn() {
	up, down := 0, 0
	for i := 1; i < len(a.stamp); i++ {
		switch {
		case a.stamp[i] > a.stamp[i-1]:
			up++
		case a.stamp[i] < a.stamp[i-1]:
			down++
		}
	}
	if down <= up {
		return
	}
	a.reversed = true
	n := a.t.n
	for c := range a.t.col {
		k := &a.t.col[c]
		reverse(k.v)
		for i := range k.lost {
			k.lost[i].from, k.lost[i].to = n-k.lost[i].to, n-k.lost[i].from
		}
		for i, j := 0, len(k.lost)-1; i < j; i, j = i+1, j-1 {
			k.lost[i], k.lost[j] = k.lost[j], k.lost[i]
		}
	}
	for i := range a.t.breaches {
		a.t.breaches[i].at = n - a.t.breaches[i].at
	}
	for i := range a.t.holes {
		a.t.holes[i].at = n - a.t.holes[i].at
	}
}

func reverse(v []float64) {
	for i, j := 0, len(v)-1; i < j; i, j = i+1, j-1 {
		v[i], v[j] = v[j], v[i]
	}
}

// lineOf is the line of frame n, turned round or not.
func (a *assembly) lineOf(n int) int {
	if a.reversed {
		n = a.t.n - 1 - n
	}
	return a.t.lineOf(n)
}
