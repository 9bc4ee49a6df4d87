package hum

import (
	"fmt"
	"math"
	"sort"

	"benchslip/analyze/stage"
)

// Kinds of lines that are no hum, as details.other_lines names them.
const (
	kindTone     = "tone"
	kindHarmonic = "tone harmonic"
	kindSideband = "mains sideband of the tone"
	kindBus      = "digital bus"
	kindSupply   = "other supply"
	kindSwitch   = "switching"
	kindLine     = "line"
)

// switchingFrom is where lines without another reason are taken for a
// switching supply: above hearing, as such supplies are built.
const switchingFrom = 18e3

// busRates are frame rates of digital buses that couple into audio wiring:
// 1 kHz and 8 kHz with their multiples (common practice, no source).
var busRates = []float64{1000, 8000}

// otherLines names the lines beside the comb, strongest first.
func (r *reading) otherLines() []map[string]any {
	type line struct {
		kind string
		q    stage.Line
		note string
	}
	var list []line
	tone := 0.0
	seen := func(q stage.Line) bool { return q.Power > 4*q.U && q.Power > 0 }
	for _, q := range r.Harm {
		switch {
		case !seen(q):
		case q.Order == 1:
			tone = q.Hz
			kind := kindTone
			if bus(q.Hz, r.clock()) > 0 && q.Power < 1e-4*r.fullPower() {
				kind = kindBus
			}
			list = append(list, line{kind, q, ""})
		default:
			list = append(list, line{kindHarmonic, q, fmt.Sprintf("H%d", q.Order)})
		}
	}
	if tone == 0 {
		tone = r.strongestOther()
	}
	for _, q := range r.Others {
		if !seen(q) {
			continue
		}
		l := line{kindLine, q, ""}
		tol := 0.3 + 1e-4*q.Hz
		k, side := sideband(q.Hz, tone, r.hz, tol)
		rate := bus(q.Hz, r.clock())
		switch {
		case q.Hz == tone:
			l.kind = kindTone
			if rate > 0 {
				l.kind = kindBus
			}
		case side && q.Hz != tone:
			l.kind, l.note = kindSideband, fmt.Sprintf("%+d x mains", k)
		case rate > 0:
			l.kind, l.note = kindBus, fmt.Sprintf("%.0f x %g kHz", math.Round(q.Hz/rate), rate/1000)
		case r.otherSupply(q.Hz) > 0:
			l.kind, l.note = kindSupply, fmt.Sprintf("%g Hz", r.otherSupply(q.Hz))
		case q.Hz >= switchingFrom:
			l.kind = kindSwitch
		}
		list = append(list, l)
	}
	sort.SliceStable(list, func(a, b int) bool { return list[a].q.Power > list[b].q.Power })
	var out []map[string]any
	for _, l := range list {
		e := map[string]any{"kind": l.kind, "frequency_hz": l.q.Hz, "rms_v": l.q.RMS()}
		if l.note != "" {
			e["note"] = l.note
		}
		out = append(out, e)
	}
	return out
}

// clock is the relative error that a recorder's clock may have, as a limit.
func (r *reading) clock() float64 { return math.Max(2*r.Sig.Gear.Clock, 1e-4) }

// fullPower is the mean square of a full-scale sine; 1 V^2 without one.
func (r *reading) fullPower() float64 {
	if fs := r.Sig.FullScaleSine(); fs > 0 {
		return fs * fs
	}
	return 1
}

// strongestOther is the strongest line beside the comb that no bus explains.
func (r *reading) strongestOther() float64 {
	best, hz := 0.0, 0.0
	for _, q := range r.Others {
		if q.Power > best && bus(q.Hz, r.clock()) == 0 {
			best, hz = q.Power, q.Hz
		}
	}
	return hz
}

// bus is the frame rate that hz is a multiple of, up to 20 times; 0 for none.
func bus(hz, clock float64) float64 {
	for i := len(busRates) - 1; i >= 0; i-- {
		k := math.Round(hz / busRates[i])
		if k >= 1 && k <= 20 && math.Abs(hz-k*busRates[i]) <= clock*hz+0.02 {
			return busRates[i]
		}
	}
	return 0
}

// sideband: hz lies a few times the mains frequency beside the tone.
func sideband(hz, tone, mains, tol float64) (k int, ok bool) {
	if tone <= 0 || mains <= 0 {
		return 0, false
	}
	x := math.Round((hz - tone) / mains)
	return int(x), x != 0 && math.Abs(x) <= 6 && math.Abs(hz-tone-x*mains) <= tol
}

// otherSupply is the public supply, other than one's own, that hz is a low
// multiple of; 0 for none.
func (r *reading) otherSupply(hz float64) float64 {
	for _, f := range []float64{50, 60} {
		k := math.Round(hz / f)
		if math.Abs(f/r.hz-1) > 0.1 && k >= 1 && k <= 5 && math.Abs(hz-k*f) < 0.01*hz {
			return f
		}
	}
	return 0
}
