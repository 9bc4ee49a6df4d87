package hum

import (
	"fmt"
	"math"

	"benchslip/analyze/stage"
)

// Family words.
const (
	magnetic = "magnetic"  // a smooth fundamental: stray fields of transformers
	odd      = "odd"       // f, 3f, 5f, 7f: distorted mains
	triplen  = "triplen"   // 3f, 9f, 15f: currents that add in a neutral or an earth
	fullWave = "full-wave" // 2f, 4f, 6f, falling: ripple of a supply
	halfWave = "half-wave" // f, 2f, 3f, falling: half of a rectifier
	needles  = "needles"   // many orders of like size: short pulses
	mixed    = "mixed"
	none     = "none"
)

// surest is the most confidence one take deserves.
const surest = 0.95

// family is a guess at what kind of source a comb has.
type family struct {
	word       string
	evidence   string
	confidence float64
}

// comb powers by order, 0 where an order does not stand out of the noise.
type shape struct {
	p     [familyOrders + 1]float64
	seen  int
	total float64
}

func (r *reading) shape() shape {
	var s shape
	for _, q := range r.Mains {
		if q.Order <= familyOrders && !q.Dropped && q.Power > 0 && stage.MainsDetected(r.Lines, q, familyOrders) {
			s.p[q.Order] = q.Power
			s.seen++
			s.total += q.Power
		}
	}
	return s
}

func (r *reading) family() family {
	s := r.shape()
	return s.family()
}

// features of a comb, ratios of powers in dB, clipped to +-60.
type features struct {
	above   float64 // all harmonics over the fundamental
	evens   float64 // even orders over odd ones, fundamental among them
	evens3  float64 // even orders over odd ones from the third on
	fifth   float64 // orders 5 and 7 over the fundamental
	third   float64 // 3, 9, 15 ... over the fundamental
	triplen float64 // share of 3, 9, 15 ... in the odd orders from the third on, 0..1
	high    float64 // share of orders from the 11th on in all from the second on, 0..1
	many    int     // orders from the second on within 20 dB of the strongest of them
	strong  int     // the strongest order
}

// never is the floor of ratios, dB.
const never = 60

func ratio(a, b float64) float64 {
	switch {
	case a <= 0 && b <= 0:
		return 0
	case a <= 0:
		return -never
	case b <= 0:
		return never
	}
	return math.Max(-never, math.Min(never, 10*math.Log10(a/b)))
}

func (s *shape) features() features {
	var even, odd3, tri, high, above, most float64
	var f features
	for h := 1; h <= familyOrders; h++ {
		p := s.p[h]
		if p > s.p[f.strong] {
			f.strong = h
		}
		if h == 1 {
			continue
		}
		above += p
		most = math.Max(most, p)
		if h > 10 {
			high += p
		}
		switch {
		case h%2 == 0:
			even += p
		default:
			odd3 += p
			if h%3 == 0 {
				tri += p
			}
		}
	}
	for h := 2; h <= familyOrders; h++ {
		if s.p[h] > 0 && s.p[h] >= most/100 {
			f.many++
		}
	}
	f.above = ratio(above, s.p[1])
	f.evens = ratio(even, odd3+s.p[1])
	f.evens3 = ratio(even, odd3)
	f.fifth = ratio(s.p[5]+s.p[7], s.p[1])
	f.third = ratio(tri, s.p[1])
	if odd3 > 0 {
		f.triplen = tri / odd3
	}
	if above > 0 {
		f.high = high / above
	}
	return f
}

// over is a smooth step: 0 well below at, 1/2 there, 1 well above.
func over(x, at, width float64) float64 { return 1 / (1 + math.Exp(-(x-at)/width)) }
func under(x, at, width float64) float64 {
	return 1 - over(x, at, width)
}

// family weighs the marks of each kind. Marks are soft steps between what the
// kinds' closed forms give; their product says how well a kind fits. Mixed is
// what no kind fits. The confidence falls with the runner-up.
//
// Closed forms behind the steps, as amplitude of order h over the strongest:
// full-wave rectified sine 3/(4m^2-1) at h = 2m; half-wave rectified sine 0.424
// at 2f, 0.085 at 4f, nothing at 3f; sawtooth 1/h; square 1/h, triangle 1/h^2
// on odd orders; short pulses flat.
func (s *shape) family() family {
	if s.seen == 0 {
		return family{none, "no order stands out of the noise", surest}
	}
	f := s.features()
	saw, sine := s.halfWaves()
	half := math.Max(saw, sine)
	thirds := over(f.triplen, 0.68, 0.03) * over(f.third, -8.5, 1.2)
	sharp := over(f.high, 0.27, 0.03) * over(float64(f.many), 7, 0.7) * over(f.above, -12, 2)
	fits := []struct {
		word string
		fit  float64
	}{
		{needles, sharp},
		{fullWave, over(f.evens, 4, 1.2) * (1 - sharp)},
		{halfWave, half * (1 - sharp)},
		{magnetic, under(f.above, -11, 1.5) * under(f.fifth, -23.5, 1.5) * under(ratio(s.p[2]+s.p[4], s.p[1]), -14, 2) * (1 - half)},
		{triplen, thirds * under(f.evens3, -4, 1.2) * (1 - sharp) * (1 - half)},
		{odd, over(f.fifth, -23.5, 1.5) * (1 - thirds) * under(f.evens3, -4, 1.2) * (1 - sharp) * (1 - half)},
	}
	best, second := 0, 1
	for i := range fits {
		switch {
		case fits[i].fit > fits[best].fit:
			best, second = i, best
		case i != best && fits[i].fit > fits[second].fit || second == best:
			second = i
		}
	}
	top, next := fits[best].fit, fits[second].fit
	if best == second {
		next = 0
	}
	out := family{word: fits[best].word, evidence: s.evidence(f)}
	if top < 0.4 {
		out.word = mixed
		out.confidence = surest * (1 - top/0.8)
	} else {
		out.confidence = surest * top / (top + next)
	}
	if s.seen < 3 && out.word != magnetic { // one or two lines are a thin ground
		out.confidence *= 0.6
	}
	return out
}

// halfWaves is how well the comb fits a sawtooth at f (all orders, falling
// evenly) and a half-wave rectified sine (f and even orders only).
func (s *shape) halfWaves() (saw, sine float64) {
	db := func(h int) float64 { return 10 * math.Log10(s.p[h]) }
	run := 0
	for run < 8 && s.p[run+1] > 0 {
		run++
	}
	if run >= 4 {
		// Straight line of level over lg order; roughness about it.
		var sx, sy, sxx, sxy float64
		for h := 1; h <= run; h++ {
			x := math.Log10(float64(h))
			sx, sy, sxx, sxy = sx+x, sy+db(h), sxx+x*x, sxy+x*db(h)
		}
		n := float64(run)
		slope := (n*sxy - sx*sy) / (n*sxx - sx*sx) // dB a decade: -20 for 1/h
		rough := 0.0
		for h := 1; h <= run; h++ {
			d := db(h) - (sy-slope*sx)/n - slope*math.Log10(float64(h))
			rough += d * d / n
		}
		// Even orders lie on the line of the odd ones beside them, not below.
		contrast, pairs := 0.0, 0.0
		for h := 2; h < run; h += 2 {
			contrast += db(h) - (db(h-1)+db(h+1))/2
			pairs++
		}
		saw = under(math.Abs(contrast/pairs), 4, 0.5) * under(math.Sqrt(rough), 3.4, 0.4) * under(slope, -9, 1.5) * over(slope, -38, 2) * over(db(2)-db(1), -16, 1)
	}
	odd3 := 0.0
	for h := 3; h <= familyOrders; h += 2 {
		odd3 += s.p[h]
	}
	if s.p[1] > 0 && s.p[2] > 0 && s.p[4] > 0 {
		d := db(2) - db(1) + 7.4 // 20 lg 0.424
		e := db(4) - db(2) + 14  // 20 lg 0.2
		sine = math.Exp(-d*d/18) * math.Exp(-e*e/50) * under(ratio(odd3, s.p[2]), -9, 1.2)
	}
	return saw, sine
}

// evidence tells the figures the guess rests on.
func (s *shape) evidence(f features) string {
	share := func(p float64) string { return fmt.Sprintf("%.0f %%", 100*p/s.total) }
	var even, odd3, tri float64
	for h := 2; h <= familyOrders; h++ {
		switch {
		case h%2 == 0:
			even += s.p[h]
		default:
			odd3 += s.p[h]
			if h%3 == 0 {
				tri += s.p[h]
			}
		}
	}
	text := fmt.Sprintf("of the hum's power the fundamental holds %s, even orders %s, odd orders from the third on %s", share(s.p[1]), share(even), share(odd3))
	if odd3 > 0.01*s.total {
		text += fmt.Sprintf(" (multiples of three %.0f %% of these)", 100*tri/odd3)
	}
	text += fmt.Sprintf("; the strongest is order %d; %d of %d orders stand out of the noise", f.strong, s.seen, familyOrders)
	if f.high > 0.1 {
		text += fmt.Sprintf(", those from the 11th on hold %.0f %% of all harmonics", 100*f.high)
	}
	return text
}

// details writes the family's three entries.
func (f family) details(d map[string]any) {
	d["family"], d["family_evidence"], d["family_confidence"] = f.word, f.evidence, math.Round(100*f.confidence)/100
}

// causes and the one action that would tell, by family (common practice, no
// source).
var causes = map[string][2]string{
	magnetic: {"the stray field of a transformer or wall adaptor in a loop of the wiring or an input transformer",
		"move or turn the unit by 10 cm: a level that changes by more than 6 dB says so"},
	odd: {"fields or earth currents of distorted mains, which itself may hold some per cent of orders 3, 5 and 7",
		"record a mains reference beside it (an insulated wire laid along a mains lead) and compare the ratios of its orders"},
	triplen: {"currents in the building's neutral or earth, where multiples of three add: a loop through the earth connections",
		"feed both ends from one outlet for a take, every protective earth in place: hum that falls by more than 6 dB says so"},
	fullWave: {"ripple of a supply with a full-wave rectifier: small reservoir, regulator without headroom, or a poor 0 V return",
		"record the ripple on the rails at the same load and compare the combs"},
	halfWave: {"a rectifier of which one half works, or one winding off",
		"record the ripple on each rail: its frequency should be twice the mains"},
	needles: {"short pulses, twice a period: rectifiers or dimmers coupled through capacitance",
		"lower the source impedance (150 ohm at the far end, then a short) and check the screen's continuity: needles that vanish came in electrically"},
	mixed: {"more than one source", "switch the suspects (lights, supplies, motors) off one by one and take again"},
}

// opinion is what the family suggests, in words; "" for none.
func (f family) opinion(take string) string {
	c, ok := causes[f.word]
	if !ok {
		return ""
	}
	how := "consistent with"
	if f.confidence < 0.6 {
		how = "loosely consistent with"
	}
	return fmt.Sprintf("hum of take %s (%s): %s %s; to confirm, %s", take, f.word, how, c[0], c[1])
}
