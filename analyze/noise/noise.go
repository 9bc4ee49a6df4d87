// Package noise holds the measures of noise: level in a band with or without
// weighting, density, equivalent input noise and signal to noise.
//
// Powers come from averaged periodograms of the signal with its fitted lines
// taken out, weighted on the spectrum by the standards' own formulas, plus
// the lines' powers. The relative uncertainty of a noise power is
// 1/sqrt(B_s T), B_s = (int W^2 S)^2 / int (W^2 S)^2, for Gaussian noise.
package noise

import (
	"fmt"
	"math"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
	"benchslip/analyze/stage"
	"benchslip/capture/recording"
	"benchslip/capture/unit"
)

var (
	volt    = unit.MustLookup("V")
	dBFS    = unit.MustLookup("dBFS")
	density = unit.MustLookup("V/rtHz")
	fsDens  = unit.MustLookup("FS/rtHz")
	dB      = unit.MustLookup("dB")
)

// Measures lists the measures of this package.
func Measures() []*analyze.Measure {
	return []*analyze.Measure{noise, noiseDensity, ein, snr}
}

func spanOf(s *analyze.Signal) []float64 { return []float64{s.StartS, s.StartS + s.DurationS()} }

// ready checks what every noise power needs: the band inside the recording,
// and ten periods of its lower edge.
func ready(s *analyze.Signal, b analyze.Band) (stage.Band, *analyze.Refusal) {
	band, bad := stage.BandFor(s, b)
	if bad == nil && band.Open {
		bad = &analyze.Refusal{Code: analyze.TooShort,
			Text:   fmt.Sprintf("take %q holds %.3g s; noise from %.4g Hz on needs %.3g s (ten periods of the lower edge)", s.Take.Name, s.DurationS(), b.Low, 10/b.Low),
			Advice: fmt.Sprintf("record %.3g s or more", math.Max(10/b.Low, 10))}
	}
	return band, bad
}

// reading is the noise of one signal in a band.
type reading struct {
	stage.Power
	lines *stage.Lines
	band  stage.Band
	dof   float64 // of U where the parts' scatter decided it; 0: infinite
}

// read takes a signal apart and sums everything in the band under the
// weighting; a tone in a noise take counts.
func read(p *analyze.Pass, s *analyze.Signal, b analyze.Band, weighting string) (reading, *analyze.Refusal) {
	band, bad := ready(s, b)
	if bad != nil {
		return reading{}, bad
	}
	l, gain := stage.Apart(p, "take", s, 0), stage.Weighting(weighting)
	r := reading{Power: stage.Everything(l, band, gain), lines: l, band: band}
	if r.P > 0 {
		r.dof = r.unsteady(p, s, weightingName(weighting), gain)
	}
	return r, nil
}

// character adds what the noise is made of: its white and 1/f parts, and jumps
// between levels. gain takes densities to the input.
func (r reading) character(p *analyze.Pass, res *analyze.Result, gain float64) {
	if q, ok := shapeOf(r.lines); ok {
		q.into(res.Details, gain)
	}
	b := burstsIn(p, r.lines)
	b.largest, b.limit = b.largest/gain, b.limit/gain
	b.into(res, r.lines.Sig.Unit)
	if r.dof > 0 {
		res.Notes = append(res.Notes, "the noise is not steady: its power scatters from part to part of the take by more than its statistics explain, and the uncertainty says so")
	}
}

// toneFlag names a line that is no mains line and holds over a tenth of the
// power in the band.
func (r reading) toneFlag(gain func(float64) float64) []recording.Flag {
	lines := r.lines.Others
	if f := r.lines.Fundamental(); f != nil {
		lines = append([]stage.Line{*f}, lines...)
	}
	for _, q := range lines {
		g := 1.0
		if gain != nil {
			g = gain(q.Hz)
		}
		if r.band.InLine(q.Hz) && g*q.Power > 0.1*r.P {
			s := r.lines.Sig
			return []recording.Flag{{Code: recording.TonePresent, Take: s.Take.Name, Channel: s.Channel(),
				Message: fmt.Sprintf("a line at %.6g Hz holds %.0f %% of the power: this is not noise alone", q.Hz, 100*g*q.Power/r.P)}}
		}
	}
	return nil
}

func rmsUnit(s *analyze.Signal) unit.Unit {
	if s.Unit == "FS" {
		return dBFS
	}
	return volt
}

func weightingName(w string) string {
	if w == "" {
		return "none"
	}
	return w
}

var noise = &analyze.Measure{
	Name:  "noise",
	Title: "noise voltage in a band",
	Doc: "RMS of everything in the band (20 Hz to 20 kHz unless stated), DC left out, hum and tones left in; `weighting` A, C or 468 with 0 dB at 1 kHz, band " +
		"edges apply as well. With 468 the reading is that of the quasi-peak meter, the highest indication over the take, without band edges.",
	Formula:  "U_n = sqrt(integral of S(f) |W(f)|^2 df)",
	Standard: "IEC 61672-1 (A, C); ITU-R BS.468-4 (468)",
	Unit:     "V",
	Roles:    []string{"take"},
	Keys:     []string{"band", "weighting", "floor"},
	Run:      runNoise,
}

func runNoise(p *analyze.Pass) analyze.Result {
	s, bad := p.Signal("take", "out")
	if bad != nil {
		return analyze.RefuseWith(volt, bad)
	}
	u := rmsUnit(s)
	if p.Params.Weighting == "468" {
		return runQuasiPeak(p, s)
	}
	b := p.Params.BandOr(20, 20000)
	n, bad := read(p, s, b, p.Params.Weighting)
	if bad != nil {
		return analyze.RefuseWith(u, bad)
	}
	if n.P <= 0 {
		return analyze.Refuse(u, analyze.NoSignal, fmt.Sprintf("take %q, channel %d: nothing is in the band", s.Take.Name, s.Channel()), "check the connection and the channel")
	}
	v := math.Sqrt(n.P)
	var bud budget.Budget
	bud.A("noise statistics", n.U/(2*v), n.dof)
	bud.Scale(s, v)
	r := analyze.Result{Value: &v, Unit: u, FullScaleSine: s.FullScaleSine()}
	bud.Into(&r)
	r.Flags = n.toneFlag(stage.Weighting(p.Params.Weighting))
	r.Details = map[string]any{"band_hz": []float64{b.Low, b.High}, "weighting": weightingName(p.Params.Weighting), "detector": "RMS",
		"span_s": spanOf(s), "averages": n.lines.Noise.Averages, "hum_v": math.Sqrt(math.Max(stage.LinesIn(n.band, stage.Weighting(p.Params.Weighting), n.lines.Mains).P, 0))}
	n.character(p, &r, 1)
	r.Figures = []analyze.Figure{stage.SpectrumFigure(p, n.lines)}
	f, ok, bad := stage.TakeFloor(p, n.Power, func(s *analyze.Signal) (stage.Power, *analyze.Refusal) {
		n, bad := read(p, s, b, p.Params.Weighting)
		return n.Power, bad
	})
	if bad != nil {
		return analyze.RefuseWith(u, bad)
	}
	if ok {
		r = stage.Floor(r, f)
	}
	return r
}

var noiseDensity = &analyze.Measure{
	Name:     "noise_density",
	Title:    "noise density at a frequency",
	Doc:      "Root of the mean power density within 1/12 octave on both sides of `at`, lines left out, from at least 20 averages.",
	Formula:  "e_n = sqrt(mean of S(f), at 2^(-1/12) .. at 2^(1/12))",
	Standard: "Welch 1967",
	Unit:     "V/rtHz",
	Roles:    []string{"take"},
	Keys:     []string{"at"},
	Run:      runDensity,
}

func runDensity(p *analyze.Pass) analyze.Result {
	s, bad := p.Signal("take", "out")
	if bad != nil {
		return analyze.RefuseWith(density, bad)
	}
	u := density
	if s.Unit == "FS" {
		u = fsDens
	}
	at := 1000.0
	if len(p.Params.At) > 0 {
		at = p.Params.At[0]
	}
	lo, hi := at*math.Pow(2, -1.0/12), at*math.Pow(2, 1.0/12)
	if hi > s.RateHz/2 {
		return analyze.Refuse(u, analyze.Bandwidth, fmt.Sprintf("%.6g Hz lies too near half the sample rate of take %q", at, s.Take.Name), "record at a higher rate")
	}
	l := stage.Decompose(p, s, stage.Options{})
	averages := l.Noise.Averages * math.Max((hi-lo)/l.Noise.RBW(), 0)
	if averages < 20 || hi-lo < 2*l.Noise.StepHz {
		need := 20 / (hi - lo)
		return analyze.Refuse(u, analyze.TooShort,
			fmt.Sprintf("take %q allows %.0f averages in the sixth of an octave about %.6g Hz, 20 are needed", s.Take.Name, averages, at),
			fmt.Sprintf("record %.3g s or more", math.Ceil(math.Max(2*need, 2*s.DurationS()))))
	}
	mean := l.Noise.Integrate(lo, hi, nil) / (hi - lo)
	if mean <= 0 {
		return analyze.Refuse(u, analyze.NoSignal, fmt.Sprintf("take %q, channel %d holds no noise at all", s.Take.Name, s.Channel()), "check the connection and the channel")
	}
	v := math.Sqrt(mean)
	var b budget.Budget
	b.A("noise statistics", v/2/math.Sqrt((hi-lo)*s.DurationS()*l.Noise.Used), 0)
	b.Scale(s, v)
	r := analyze.Result{Value: &v, Unit: u}
	b.Into(&r)
	r.Details = map[string]any{"at_hz": at, "averages": averages, "span_s": spanOf(s), "band_hz": []float64{lo, hi}}
	reading{lines: l}.character(p, &r, 1)
	r.Figures = []analyze.Figure{stage.SpectrumFigure(p, l)}
	return r
}

var snr = &analyze.Measure{
	Name:  "snr",
	Title: "signal to noise ratio",
	Doc: "Power of the tone over the power in the band less fundamental, harmonics 2 to 10 and DC; hum counts as noise, `weighting` acts on the noise. With " +
		"`ref_level` that level over the noise of the take, no tone needed. With a tone near -60 dBFS the details hold the dynamic range of AES17.",
	Formula:  "SNR = 20 lg(U_1 / U_n)",
	Standard: "IEEE Std 1241 (SNR)",
	Unit:     "dB",
	Roles:    []string{"take"},
	Keys:     []string{"at", "band", "weighting", "floor", "ref_level"},
	Run:      runSNR,
}

// dynamicRange is that of AES17, dB: a full-scale sine over what is left beside
// a tone 60 dB below it (so that converters work), harmonics included, under
// the 468 curve shifted to 0 dB at 2 kHz and read as RMS. ok is false for
// tones farther than 5 dB from -60 dBFS and rates that do not hold 20 kHz.
func dynamicRange(l *stage.Lines, toneRMS float64) (float64, bool) {
	full := l.Sig.FullScaleSine()
	if full == 0 || math.Abs(20*math.Log10(toneRMS/full)+60) > 5 {
		return 0, false
	}
	band, bad := ready(l.Sig, analyze.Band{Low: 20, High: 20000})
	if bad != nil {
		return 0, false
	}
	curve := stage.Weighting("468")
	at2k := curve(2000)
	rest := stage.NoiseIn(l, band, curve).Plus(stage.LinesIn(band, curve, l.Harm[1:], l.Mains, l.Others)).P / at2k
	if rest <= 0 {
		return 0, false
	}
	return 20 * math.Log10(full/math.Sqrt(rest)), true
}

func runSNR(p *analyze.Pass) analyze.Result {
	s, bad := p.Signal("take", "out")
	if bad != nil {
		return analyze.RefuseWith(dB, bad)
	}
	b := p.Params.BandOr(20, 20000)
	band, bad := ready(s, b)
	if bad != nil {
		return analyze.RefuseWith(dB, bad)
	}
	gain := stage.Weighting(p.Params.Weighting)
	var l *stage.Lines
	var signal float64 // RMS
	var rest stage.Power
	var bud budget.Budget
	noiseOf := func(s *analyze.Signal) (stage.Power, *analyze.Refusal) {
		n, bad := read(p, s, b, p.Params.Weighting)
		return n.Power, bad
	}
	if p.Params.RefLevel != nil {
		ref := *p.Params.RefLevel
		signal = ref.Linear()
		if ref.Unit.Dim == unit.FullScale {
			signal *= s.FullScaleSine() * math.Sqrt2
		} else if s.Unit == "FS" {
			return analyze.Refuse(dB, analyze.Uncalibrated, fmt.Sprintf("`ref_level` is in volts, take %q has no volts at full scale", s.Take.Name), "state full_scale_peak for its gear")
		}
		l = stage.Decompose(p, s, stage.Options{})
		rest = stage.Everything(l, band, gain)
	} else {
		at := 0.0
		if len(p.Params.At) > 0 {
			at = p.Params.At[0]
		}
		tone, bad := stage.FindTone(p, at, s)
		if bad == nil {
			bad = tone.FullPeriods(s)
		}
		if bad != nil {
			return analyze.RefuseWith(dB, bad)
		}
		l = stage.Decompose(p, s, stage.Options{Tone: tone})
		f := l.Fundamental()
		if f == nil || f.Power <= 0 {
			return analyze.Refuse(dB, analyze.NoTone, fmt.Sprintf("take %q: no tone stands out of the noise", s.Take.Name), "record the tone again")
		}
		signal = f.RMS()
		rest = stage.NoiseIn(l, band, gain).Plus(stage.LinesIn(band, gain, l.Mains, l.Others))
		for _, q := range l.Harm {
			if q.Order > 10 {
				rest = rest.Plus(stage.LinesIn(band, gain, []stage.Line{q}))
			}
		}
	}
	total := rest
	f, floored, bad := stage.TakeFloor(p, rest, noiseOf)
	if bad != nil {
		return analyze.RefuseWith(dB, bad)
	}
	if floored && !f.Limited {
		rest = f.Net
	}
	if rest.P <= 0 {
		return analyze.Refuse(dB, analyze.BelowDetection, "no noise is left beside the tone and its harmonics", "none needed")
	}
	v := signal / math.Sqrt(rest.P)
	bud.A("noise statistics", v*rest.U/(2*rest.P), 0)
	if p.Params.RefLevel != nil && p.Params.RefLevel.Unit.Dim != unit.FullScale {
		bud.Scale(s, -v)
	}
	r := analyze.Result{Value: &v, Unit: dB}
	bud.Into(&r)
	r.Details = map[string]any{"band_hz": []float64{b.Low, b.High}, "weighting": weightingName(p.Params.Weighting), "detector": "RMS",
		"noise_v": math.Sqrt(rest.P), "signal_v": signal, "span_s": spanOf(s)}
	if l.Tone != nil {
		r.Details["fundamental"] = map[string]any{"frequency_hz": l.Tone.Hz, "rms_v": signal}
		r.Details["gap_hz"] = l.GapHz
		if d, ok := dynamicRange(l, signal); ok && p.Params.RefLevel == nil {
			r.Details["dynamic_range_db"] = d
			r.Details["dynamic_range_method"] = "AES17: full-scale sine over all but a tone near -60 dBFS, 20 Hz to 20 kHz, 468 curve with 0 dB at 2 kHz, RMS; of the recorder's full scale"
		}
	}
	r.Figures = []analyze.Figure{stage.SpectrumFigure(p, l)}
	for k, d := range f.Details {
		r.Details[k] = d
	}
	r.Flags = append(r.Flags, f.Flags...)
	if floored && f.Limited {
		return stage.FloorLimited(r, signal/math.Sqrt(total.P), false, f.Ratio)
	}
	return r
}
