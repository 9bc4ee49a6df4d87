package plan

import (
	"fmt"
	"math"
	"slices"
	"time"

	"benchslip/analyze"
	"benchslip/analyze/keys"
	"benchslip/capture/recording"
	"benchslip/capture/unit"
)

// doubts says what would make a check on this take not measurable, or never
// better than conditional, as far as the job and the header of the file show.
func (p *planner) doubts(t *analyze.Take, uses []use, info *recording.Info, n length, rate float64) []string {
	var out []string
	say := func(format string, args ...any) { out = appendNew(out, fmt.Sprintf(format, args...)) }
	var volts []string // checks that lack them
	for _, u := range uses {
		name := u.check.Name
		w := t.Wiring.Over(u.check.Params.Wiring)
		if wantsVolts(u) && !hasVolts(t, w.Out) {
			volts = appendNew(volts, name)
		}
		switch {
		case u.role != "take":
		case (u.check.Measure == "dc" || u.check.Measure == "thump") && ac(t, w.Out):
			say("%s: the gear is AC-coupled and loses DC; use a DC-coupled scope or a meter reading", name)
		case u.check.Measure == "oscillation" && !isScope(t):
			say("%s: a recorder hears nothing above half its rate; use a scope at 20 MHz or more samples a second", name)
		}
		for _, f := range u.check.Params.At {
			p.toneDoubts(u, f, rate, say)
		}
		if b := u.check.Params.Band; b != nil && rate > 0 && b.High > 0.49*rate {
			say("%s: its band reaches %s, and a recording at %s ends at half of that", name, hertz(b.High), hertz(rate))
		}
		p.windowDoubts(t, u, say)
		p.loudDoubts(t, u, say)
	}
	if volts != nil {
		say("no volts at full scale are known; calibrate, or state full_scale_peak for the gear: needed by %s", joinWords(volts))
	}
	p.companyDoubts(t, uses, say)
	if info == nil {
		return out
	}
	if d := info.DurationS(); n.least > 0 && d > 0 && d < n.least*(1-1e-9) {
		say("the recording is %s long, at least %s are needed", seconds(d), seconds(n.least))
	}
	if g := t.Gear; g != nil && g.Rate > 0 && info.RateHz > 0 && math.Abs(info.RateHz/g.Rate-1) > 1e-3 {
		say("the recording runs at %s, the gear was calibrated at %s", hertz(info.RateHz), hertz(g.Rate))
	}
	return out
}

// wantsVolts reports whether a row cannot be judged in fractions of full
// scale: its result is in volts and no limit is against full scale.
func wantsVolts(u use) bool {
	m, ok := keys.FindMeasure(u.check.Measure)
	if !ok || !slices.Contains(m.Dims, unit.Volt) && !slices.ContainsFunc(m.Dims, perVolt) {
		return false
	}
	if u.role == "gain_take" || u.role == "in_take" || u.check.Against != nil {
		return false
	}
	for _, row := range u.check.Rows() {
		for _, q := range []*unit.Quantity{row.Limits.Min, row.Limits.Max} {
			if q != nil && q.Unit.Dim == unit.FullScale {
				return false
			}
		}
	}
	return true
}

func perVolt(d unit.Dim) bool {
	return d == unit.VoltPerRootHertz || d == unit.VoltPerMetre || d == unit.VoltPerSecond || d == unit.Watt
}

// gearOf is the gear entry that holds for a channel of a take.
func gearOf(t *analyze.Take, channel string) *analyze.Gear {
	if t.Gear == nil {
		return nil
	}
	n := 0
	if _, err := fmt.Sscanf(channel, "%d", &n); err != nil || n < 1 {
		return t.Gear
	}
	return t.Gear.For(n)
}

func hasVolts(t *analyze.Take, channel string) bool {
	g := gearOf(t, channel)
	return g == nil && recordedAsCSV(t) || g != nil && g.Volts()
}

// recordedAsCSV guesses, for a take without gear, from the name alone.
func recordedAsCSV(t *analyze.Take) bool { return !isFile(t.File) }

func ac(t *analyze.Take, channel string) bool {
	g := gearOf(t, channel)
	return g != nil && !g.DC
}

// toneDoubts looks at a frequency that a check names.
func (p *planner) toneDoubts(u use, f, rate float64, say func(string, ...any)) {
	name := u.check.Name
	if u.check.Measure == "noise_density" || u.check.Measure == "response" {
		return
	}
	if rate > 0 && f > 0.45*rate {
		say("%s: a tone at %s is out of reach of a recording at %s", name, hertz(f), hertz(rate))
	}
	gap, line := p.gapToMains(f)
	switch {
	case gap < 0.05:
		say("%s: a tone at %s lies on the mains line at %s; move it by a few Hz", name, hertz(f), hertz(line))
	case gap < 0.5:
		say("%s: a tone at %s lies %s from the mains line at %s, and the supply wanders as far; move it by a few Hz", name, hertz(f), hertz(gap), hertz(line))
	case onHighOrder(p, f):
		say("%s: %s is a multiple of the mains frequency: hum of that order counts as signal; 943 Hz or 1042 Hz keep clear", name, hertz(f))
	}
}

// onHighOrder: a multiple of the supply's frequency beyond the fifth.
func onHighOrder(p *planner, f float64) bool {
	supplies := []float64{p.job.MainsHz}
	if p.job.MainsHz == 0 {
		supplies = []float64{50, 60}
	}
	for _, fm := range supplies {
		if h := math.Round(f / fm); h > 5 && h <= 40 && math.Abs(f-h*fm) < 0.5 {
			return true
		}
	}
	return false
}

// windowDoubts: a window narrower than twice the gear's uncertainty gives at
// best a conditional pass.
func (p *planner) windowDoubts(t *analyze.Take, u use, say func(string, ...any)) {
	g := gearOf(t, t.Wiring.Out)
	if u.role != "take" || !wantsVolts(u) || g == nil || g.ScaleU == nil || u.check.Measure == "dc" || u.check.Measure == "ein" {
		return
	}
	U := p.job.Coverage * *g.ScaleU
	if u.check.Measure == "power" {
		U *= 2
	}
	for _, row := range u.check.Rows() {
		l := row.Limits
		if l.Min == nil || l.Max == nil {
			continue
		}
		lo, hi := l.Min.Linear(), l.Max.Linear()
		if mid := (lo + hi) / 2; lo > 0 && hi-lo < 2*U*mid {
			say("%s: its limits lie %.2g %% apart, less than twice the gear's own uncertainty of %.2g %%: at best a conditional pass; calibrate with a better meter",
				row.Name, 100*(hi-lo)/mid, 100*U)
		}
	}
}

// loudDoubts: a level that the limits ask for and the recorder's input cannot
// hold.
func (p *planner) loudDoubts(t *analyze.Take, u use, say func(string, ...any)) {
	g := gearOf(t, t.Wiring.Out)
	if g == nil || g.FullScalePeak <= 0 || u.role != "take" {
		return
	}
	if v := asked(u); math.Sqrt2*v > g.FullScalePeak {
		say("%s: %s RMS has a peak of %s, above the recorder's full scale of %s: put a pad before it, and state the gear's full scale behind that pad",
			u.check.Name, unit.Pretty(v, unit.Volt), unit.Pretty(math.Sqrt2*v, unit.Volt), unit.Pretty(g.FullScalePeak, unit.Volt))
	}
}

// asked is the largest RMS in V that a check's limits ask the output to reach.
func asked(u use) float64 {
	out := 0.0
	c := u.check
	for _, row := range c.Rows() {
		q := row.Limits.Min
		if row.Limits.Nominal != nil {
			q = row.Limits.Nominal
		}
		switch {
		case q == nil:
		case q.Unit.Dim == unit.Volt && (c.Measure == "max_output" || c.Measure == "level"):
			out = math.Max(out, q.Linear())
		case q.Unit.Dim == unit.Watt && c.Params.Load != nil:
			out = math.Max(out, math.Sqrt(q.Linear()*c.Params.Load.Value.Linear()))
		}
	}
	return out
}

// companyDoubts: takes that stand alone where a second one would settle whose
// noise or hum it is.
func (p *planner) companyDoubts(t *analyze.Take, uses []use, say func(string, ...any)) {
	for _, u := range uses {
		if u.role != "take" {
			continue
		}
		has := func(role string) bool {
			for _, r := range u.check.Roles {
				if r.Name == role {
					return true
				}
			}
			return false
		}
		switch u.check.Measure {
		case "pickup":
			if !has("baseline") {
				say("%s: without a baseline take the receiver's own hum counts as pick-up", u.check.Name)
			}
			if t.Wiring.Over(u.check.Params.Wiring).Mains == "" {
				say("%s: without a mains reference channel only a range can be given", u.check.Name)
			}
		case "noise", "ein":
			if !has("floor") {
				say("%s: without a floor take the recorder's own noise counts as the unit's", u.check.Name)
			}
		case "thd", "thdn":
			if !has("loop") && u.check.Class == "critical" {
				say("%s: without a loop take the player's own distortion counts as the unit's", u.check.Name)
			}
		}
	}
}

// calibrationDays is how long a calibration is taken as fresh (common
// practice, no source).
const calibrationDays = 365

// gearDoubts says what to mind about the gear before anything is recorded.
func (p *planner) gearDoubts() []string {
	out := []string{}
	for _, g := range p.job.Gear {
		used := false
		for _, t := range p.job.Takes {
			used = used || t.Gear == g.Gear
		}
		if !used {
			continue
		}
		if g.Kind == recording.Audio && g.FullScalePeak == 0 {
			out = append(out, fmt.Sprintf("%s: no volts at full scale; calibrate it with a tone and a meter before the takes", g.Name))
		} else if g.Uncertainty == "" || g.Uncertainty == "unknown" {
			out = append(out, fmt.Sprintf("%s: the uncertainty of its volts is not stated, so that results in volts pass at best conditionally", g.Name))
		}
		measured, err1 := time.Parse(time.DateOnly, p.job.Date)
		calibrated, err2 := time.Parse(time.DateOnly, g.Calibrated)
		if err1 != nil || err2 != nil {
			continue
		}
		if days := int(math.Round(measured.Sub(calibrated).Hours() / 24)); days > calibrationDays {
			out = append(out, fmt.Sprintf("%s: calibrated on %s, %d days before %s; calibrate it again", g.Name, g.Calibrated, days, p.job.Date))
		}
	}
	return out
}
