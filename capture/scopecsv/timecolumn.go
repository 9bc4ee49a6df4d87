package scopecsv

import (
	"fmt"
	"math"
	"strconv"
	"strings"

	"benchslip/capture/recording"
)

// rising says whether a column only rises or only falls.
func (a *assembly) rising(c int) bool {
	up, down := 0, 0
	v := a.t.col[c].v
	for i := 1; i < len(v); i++ {
		switch {
		case v[i] > v[i-1]:
			up++
		case v[i] < v[i-1]:
			down++
		}
	}
	return up == 0 || down == 0
}

// counting says whether a column holds whole numbers that rise by 1 in nearly
// all rows.
func (a *assembly) counting(c int) bool {
	k := &a.t.col[c]
	if !k.whole || k.count[number] == 0 || k.count[clock] > 0 || k.glued > 0 {
		return false
	}
	one := 0
	for i := 1; i < len(k.v); i++ {
		if k.v[i]-k.v[i-1] == 1 {
			one++
		}
	}
	return one >= (len(k.v)-1)*9/10
}

// evenAxis says whether a column rises (or falls) in even steps as a time
// column does.
func (a *assembly) evenAxis(c int) bool {
	k := &a.t.col[c]
	if k.count[number] < 3 || k.count[number] < a.t.n {
		return false
	}
	v := k.v
	if v[len(v)-1] < v[0] {
		v = reversedCopy(v)
	}
	m := measureTime(v, rounding(k.last, k.digits))
	return m.step > 0 && m.usable && len(m.breaks)*20 <= a.t.n
}

func reversedCopy(v []float64) []float64 {
	out := make([]float64, len(v))
	for i, x := range v {
		out[len(v)-1-i] = x
	}
	return out
}

// timeByOption takes the time column that the job names.
func (a *assembly) timeByOption() error {
	want := strings.TrimSpace(a.opt.TimeColumn)
	if strings.EqualFold(want, "none") {
		for c, r := range a.role {
			if r == dateRole || r == channel && a.t.col[c].count[clock] > 0 {
				a.role[c] = leftOut
			}
		}
		return nil
	}
	found := -1
	for c, h := range a.heads.col {
		if h.full != "" && h.full == want {
			found = c
		}
	}
	for c, h := range a.heads.col {
		if found < 0 && h.name != "" && strings.EqualFold(h.name, want) {
			found = c
		}
	}
	if n, err := strconv.Atoi(want); found < 0 && err == nil && n >= 1 && n <= a.lay.width {
		found = n - 1
	}
	if found < 0 || a.role[found] == leftOut {
		return a.fault(a.headLine(), recording.ErrAmbiguous, fmt.Sprintf("no column of numbers is called %q", want), "correct csv.time_column in the job file: a header text or a number from 1")
	}
	a.setTime(found)
	a.timeFrom = "csv.time_column of the job"
	return nil
}

func (a *assembly) setTime(c int) {
	a.time = c
	a.role[c] = timeRole
}

// timeByLook finds the time column by unit, then by name, then by its even
// steps; a column that counts rows is no time.
func (a *assembly) timeByLook() error {
	var byUnit, byName, byClock []int
	for c, r := range a.role {
		if r != channel {
			continue
		}
		h, k := a.heads.col[c], &a.t.col[c]
		q, _ := unitOf(k.unit)
		switch {
		case k.count[clock]*2 > k.count[number]:
			byClock = append(byClock, c)
		case k.glued > 0 && q == seconds, k.glued == 0 && h.q == seconds:
			byUnit = append(byUnit, c)
		case h.q == unknown && timeWord(h.full) && k.glued == 0:
			byName = append(byName, c)
		}
	}
	if len(byClock) > 0 {
		byUnit = a.takeMillis(byClock[0], byUnit)
	}
	for _, list := range [][]int{byUnit, byName} {
		for _, c := range list {
			if a.time < 0 && (a.axisLike(c) || len(list) == 1 && timeWord(a.heads.col[c].full)) {
				a.setTime(c)
				a.timeFrom = "its header"
			}
		}
	}
	if a.time < 0 && len(byClock) > 0 {
		a.setTime(byClock[0])
		a.timeFrom = "its clock times"
	}
	if a.time < 0 {
		a.timeByShape()
	}
	if a.time < 0 {
		return nil
	}
	// Row numbers beside a time column are no channel; nor is a copy of it.
	first := -1
	for c, r := range a.role {
		if r != channel {
			continue
		}
		h := a.heads.col[c]
		if first < 0 {
			first = c
		}
		if a.counting(c) && (indexWord(h.full) || c < a.time && h.q == unknown) {
			a.role[c] = indexRole
			a.assume("%s left out: it counts the rows", a.title(c))
			continue
		}
		again := h.q == seconds || h.q == unknown && timeWord(h.full)
		if !again && h.full == "" && c > a.time+1 && a.sameAs(c, a.time) {
			again = true
		}
		if again && a.axisLike(c) {
			if !a.sameAs(c, a.time) {
				return a.fault(a.headLine(), recording.ErrAmbiguous, fmt.Sprintf("%s and %s are both time and differ", a.title(a.time), a.title(c)), "export the channels on one time axis, or say [takes.NAME.csv] time_column")
			}
			a.role[c] = leftOut
			a.assume("%s left out: it repeats the time column", a.title(c))
		}
	}
	return nil
}

// takeMillis adds a column of milliseconds 0..999 to a clock that shows whole
// seconds.
func (a *assembly) takeMillis(c int, byUnit []int) []int {
	if a.t.col[c].q < 1 {
		return byUnit
	}
	for i, d := range byUnit {
		k, h := &a.t.col[d], a.heads.col[d]
		if h.f != 1e-3 || k.glued > 0 {
			continue
		}
		fits := true
		for _, v := range k.v {
			fits = fits && !(v < 0 || v >= 1000)
		}
		if fits {
			a.role[d] = leftOut
			a.millis = d
			return append(byUnit[:i:i], byUnit[i+1:]...)
		}
	}
	return byUnit
}

// axisLike says whether a column rises or falls in most rows.
func (a *assembly) axisLike(c int) bool {
	up, down, n := 0, 0, 0
	v := a.t.col[c].v
	for i := 1; i < len(v); i++ {
		switch {
		case v[i] > v[i-1]:
			up++
			n++
		case v[i] < v[i-1]:
			down++
			n++
		case v[i] == v[i-1]:
			n++
		}
	}
	return n > 0 && (down*10 <= up || up*10 <= down) && up+down > 0
}

// sameAs says whether two columns hold the same values wherever both do.
func (a *assembly) sameAs(c, d int) bool {
	x, y := a.t.col[c], a.t.col[d]
	fx, fy := a.factor(c), a.factor(d)
	tol := math.Max(pow10(x.last)*fx, pow10(y.last)*fy)
	for i := range x.v {
		if diff := math.Abs(x.v[i]*fx - y.v[i]*fy); diff > tol {
			return false
		}
	}
	return true
}

func (a *assembly) factor(c int) float64 {
	if h := a.heads.col[c]; h.q == seconds && a.t.col[c].glued == 0 {
		return h.f
	}
	return 1
}

// timeByShape takes the first column of numbers as time when nothing says
// otherwise and it steps evenly.
func (a *assembly) timeByShape() {
	for c, r := range a.role {
		if r != channel {
			continue
		}
		h := a.heads.col[c]
		others := 0
		for d, rd := range a.role {
			if d > c && rd == channel {
				others++
			}
		}
		if others == 0 || h.q != unknown || a.t.col[c].glued > 0 {
			return
		}
		if a.counting(c) {
			if h.full == "" && len(a.lay.pre) == 0 && others == 1 {
				// Two bare columns are seconds and volts; whole numbers may
				// as well be a count.
				a.setTime(c)
				a.timeFrom = "two columns without a header"
				a.maybeCount = true
				return
			}
			a.role[c] = indexRole
			a.index = c
			a.assume("%s counts the rows", a.title(c))
			// A count may be followed by the time.
			for d := c + 1; d < len(a.role); d++ {
				if a.role[d] == channel {
					hd := a.heads.col[d]
					if hd.full == "" && others > 1 && hd.q == unknown && a.evenAxis(d) && !a.counting(d) {
						a.setTime(d)
						a.timeFrom = "its even steps"
					}
					break
				}
			}
			return
		}
		if h.full == "" || !channelName(h.name) || a.stepsAsStated(c) {
			if a.axisLike(c) && (h.full != "" || a.t.col[c].count[number] == a.t.n) {
				a.setTime(c)
				a.timeFrom = "its even steps"
				if h.full == "" {
					a.timeFrom = "its place and even steps, no header"
				}
			}
		}
		return
	}
}

// stepsAsStated says whether a column steps by the interval that the settings
// state.
func (a *assembly) stepsAsStated(c int) bool {
	v := a.t.col[c].v
	for _, s := range a.set.interval {
		if step := math.Abs(v[len(v)-1]-v[0]) / float64(max(1, len(v)-1)); math.Abs(step-s.v) < 0.01*s.v {
			return true
		}
	}
	return false
}

// channelName says whether a header names a channel or a voltage.
func channelName(t string) bool {
	w := strings.ToLower(strings.TrimSpace(t))
	if w == "" {
		return false
	}
	for _, p := range []string{"volt", "spannung", "tension", "ampl", "signal", "value", "wert", "data", "input", "output", "u_", "v_", "vin", "vout", "current", "level", "adc", "y"} {
		if strings.HasPrefix(w, p) {
			return true
		}
	}
	parts := strings.Fields(strings.NewReplacer("_", " ", "-", " ").Replace(w))
	return len(parts) > 0 && channelWord(parts[0]) && w != "a"
}
