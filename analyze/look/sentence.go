package look

import (
	"fmt"
	"math"
	"strings"

	"benchslip/analyze"
	"benchslip/analyze/stage"
	"benchslip/capture"
	"benchslip/capture/unit"
)

// sentence says in plain words what channel index c of a take holds: what is
// strongest in it, whether it clips, how much mains hum, how much DC. seen is
// nil where no lines could be looked for.
func sentence(t *analyze.Take, c int, seen *stage.Survey) string {
	in := t.Rec.Info()
	l := t.Health.Levels[c]
	ch := in.Channels[c]
	if l.Count == 0 {
		return "no sample has a value"
	}
	if l.AC == 0 {
		return "every sample is " + amount(l.Mean, ch.Unit)
	}
	parts := []string{strongest(l.AC, ch.Unit, seen)}
	if run, clips := t.Health.Clipped(c+1, 0, in.Frames); clips {
		at := fmt.Sprintf("frame %d", run.From)
		if in.RateHz > 0 {
			at = fmt.Sprintf("%.6g s", in.StartS+float64(run.From)/in.RateHz)
		}
		parts = append(parts, "clipped first at "+at)
	} else if in.Kind == capture.Audio {
		parts = append(parts, "nothing clipped")
	}
	if seen != nil && in.DurationS() >= humSeconds {
		parts = append(parts, hum(seen, ch.Unit))
	}
	if math.Abs(l.Mean) > l.AC/10 {
		parts = append(parts, "DC "+amount(l.Mean, ch.Unit))
	}
	return strings.Join(parts, ", ")
}

// strongest names the strongest line: a tone when it holds more than half of
// the AC power.
func strongest(ac float64, u string, seen *stage.Survey) string {
	if seen == nil {
		return level(ac, u) + " RMS about the mean"
	}
	if len(seen.Peaks) == 0 {
		return "no line stands out, " + level(ac, u) + " in all"
	}
	p := seen.Peaks[0]
	at := fmt.Sprintf("%.5g Hz at %s", p.Hz, level(math.Sqrt(p.Power), u))
	if p.Power < ac*ac/2 {
		return fmt.Sprintf("%s in all, strongest line %s", level(ac, u), at)
	}
	if f, _ := comb(seen); f > 0 && isMultiple(p.Hz, f, seen.ToleranceHz()) {
		return "mains hum, strongest line " + at
	}
	return "tone " + at
}

// humSeconds is the shortest take in which mains lines are told from others:
// ten periods of 50 Hz.
const humSeconds = 0.2

// hum says how the mains lines stand to the strongest line.
func hum(seen *stage.Survey, u string) string {
	f, power := comb(seen)
	if f == 0 {
		return "no mains hum seen"
	}
	name := fmt.Sprintf("%.3g Hz hum ", f)
	top := seen.Peaks[0]
	if isMultiple(top.Hz, f, seen.ToleranceHz()) {
		return name + level(math.Sqrt(power), u) + " in all"
	}
	return name + fmt.Sprintf("%.0f dB below it", 10*math.Log10(top.Power/power))
}

// comb finds the mains among the peaks: the supply (50 or 60 Hz, within 1 %)
// whose orders hold the most power, and that power; 0 for none. The
// first or second order must be among them.
func comb(seen *stage.Survey) (hz, power float64) {
	tol := seen.ToleranceHz()
	for _, nominal := range []float64{50, 60} {
		base := 0.0
		for k := 1.0; k <= 2 && base == 0; k++ {
			for _, p := range seen.Peaks {
				if math.Abs(p.Hz/k-nominal) <= 0.01*nominal+tol/k {
					base = p.Hz / k
					break
				}
			}
		}
		if base == 0 {
			continue
		}
		sum := 0.0
		for _, p := range seen.Peaks {
			if isMultiple(p.Hz, base, tol) {
				sum += p.Power
			}
		}
		if sum > power {
			hz, power = base, sum
		}
	}
	return hz, power
}

// mostOrders is the highest mains order looked for: above it some multiple
// lies near every line.
const mostOrders = 20

func isMultiple(hz, base, tol float64) bool {
	k := math.Round(hz / base)
	// The base's own error grows with the order: 0.02 % of it.
	return k >= 1 && k <= mostOrders && math.Abs(hz-k*base) <= 2*tol+2e-4*hz
}

// level is an RMS in the words of the channel's unit.
func level(rms float64, u string) string {
	if u == "FS" {
		return fmt.Sprintf("%.1f dBFS", 20*math.Log10(rms/unit.FullScaleSine))
	}
	return amount(rms, u)
}

func amount(x float64, u string) string {
	if u == "V" {
		return unit.Pretty(x, unit.Volt)
	}
	return strings.TrimSpace(fmt.Sprintf("%.4g %s", x, u))
}
