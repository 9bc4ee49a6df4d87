package noise

import (
	"fmt"
	"math"

	"benchslip/analyze"
	"benchslip/analyze/internal/budget"
	"benchslip/analyze/stage"
	"benchslip/capture/unit"
)

var dBu = unit.MustLookup("dBu")

// boltzmann is k in J/K, exact since the SI of 2019.
const boltzmann = 1.380649e-23

// standardTemperature is the one that noise figures are defined at (IEEE), K.
const standardTemperature = 290

// terminalsAllowance: without the unit's input resistance it is not known how
// far the source's voltage drops into the input, and a loaded source's own
// noise drops with it; 150 ohm into 1.5 kohm, a low mic input, loses 0.83 dB.
const terminalsAllowance = 1.0 // dB

// thermal is the noise voltage sqrt(4 k T R B), V RMS (Johnson and Nyquist
// 1928).
func thermal(ohms, kelvins, bandwidthHz float64) float64 {
	return math.Sqrt(4 * boltzmann * kelvins * ohms * bandwidthHz)
}

// ownPart is what the unit adds to its source's noise: powers subtract.
func ownPart(v, thermal float64) float64 { return math.Sqrt(v*v - thermal*thermal) }

// noiseBandwidth is that of a band under a weighting, Hz: the integral of
// |W(f)|^2, which a white density is multiplied by. Simpson's rule over lg f,
// where the curves are smooth.
func noiseBandwidth(b analyze.Band, gain func(float64) float64) float64 {
	if gain == nil {
		return b.High - b.Low
	}
	const steps = 2000 // even
	lo := math.Log(math.Max(b.Low, 1e-3))
	h := (math.Log(b.High) - lo) / steps
	sum := 0.0
	for i := 0; i <= steps; i++ {
		f := math.Exp(lo + float64(i)*h)
		w := 2 + 2*float64(i%2)
		if i == 0 || i == steps {
			w = 1
		}
		sum += w * gain(f) * f
	}
	return sum * h / 3
}

var ein = &analyze.Measure{
	Name:  "ein",
	Title: "equivalent input noise",
	Doc: "Noise of the take over the unit's gain: RMS of everything in the band (20 Hz to 20 kHz unless stated) under `weighting`, 468 read as RMS too. The gain is " +
		"stated (`gain`) or that of the tone in `gain_take`. `source` is the resistor fitted at the input; its thermal noise at `temperature` (290 K) stands beside " +
		"the value with the noise figure, and a reading below it is refused as impossible. With `input_resistance` and a gain taken from the terminals the noise is " +
		"referred to the source's EMF by (R_in + source)/R_in.",
	Formula:  "EIN = 20 lg(U_n / |G| / 0.774597 V);  thermal = sqrt(4 k T R B_w)",
	Standard: "IEC 60268-3 (equivalent noise input); k of the SI 2019; noise figure at 290 K (IEEE)",
	Unit:     "dBu",
	Roles:    []string{"take"},
	Keys: []string{"at", "band", "weighting", "gain", "gain_take", "gain_uncertainty", "floor", "source", "temperature",
		"input_resistance", "plane"},
	Run: runEIN,
}

func runEIN(p *analyze.Pass) analyze.Result {
	refuse := func(bad *analyze.Refusal) analyze.Result { return analyze.RefuseWith(dBu, bad) }
	s, bad := p.Signal("take", "out")
	if bad != nil {
		return refuse(bad)
	}
	if s.Unit != "V" {
		return analyze.Refuse(dBu, analyze.Uncalibrated,
			fmt.Sprintf("take %q has no volts at full scale, and dBu are volts", s.Take.Name), "state full_scale_peak or full_scale_sine for its gear (benchslip calibrate finds it)")
	}
	b, curve := p.Params.BandOr(20, 20000), stage.Weighting(p.Params.Weighting)
	n, bad := read(p, s, b, p.Params.Weighting)
	if bad != nil {
		return refuse(bad)
	}
	if n.P <= 0 {
		return analyze.Refuse(dBu, analyze.NoSignal, fmt.Sprintf("take %q, channel %d: nothing is in the band", s.Take.Name, s.Channel()), "check the connection and the channel")
	}
	g, ok, bad := stage.InputGain(p)
	if bad != nil {
		return refuse(bad)
	}
	if !ok {
		return analyze.Refuse(dBu, analyze.MissingTake, "neither `gain` nor `gain_take` is named", "state the gain, or name a take with a tone that it can be measured from")
	}
	if p.Has("gain_take") {
		if bad := stage.SameGain(s.Take, p.Take("gain_take")); bad != nil {
			return refuse(bad)
		}
	}
	floor, floored, bad := stage.TakeFloor(p, n.Power, func(s *analyze.Signal) (stage.Power, *analyze.Refusal) {
		n, bad := read(p, s, b, p.Params.Weighting)
		return n.Power, bad
	})
	if bad != nil {
		return refuse(bad)
	}
	net := n.Power
	if floored && !floor.Limited {
		net = floor.Net
	}
	// Noise at the recorder, then at the input, then at the source's EMF.
	volts := math.Sqrt(net.P)
	var own budget.Budget
	own.A("noise statistics", net.U/(2*volts), n.dof)
	own.Scale(s, volts)
	v, lines := stage.Refer(volts, own, s, g)
	up := toEMF(p.Params)
	v *= up
	for i := range lines.Lines {
		lines.Lines[i].U *= up
	}
	if p.Params.Source != nil {
		lines.Stated("source resistance", p.Params.Source, 0)
	}
	r := analyze.Result{Value: &v, Unit: dBu}
	lines.Into(&r)
	r.Flags = append(n.toneFlag(curve), floor.Flags...)
	r.Details = map[string]any{"band_hz": []float64{b.Low, b.High}, "weighting": weightingName(p.Params.Weighting), "detector": "RMS",
		"span_s": spanOf(s), "averages": n.lines.Noise.Averages, "gain_db": dB.FromLinear(g.G), "noise_v": volts,
		"plane": plane(p.Params), "thermal_dbu": nil, "noise_figure_db": nil,
		"hum_v": math.Sqrt(math.Max(stage.LinesIn(n.band, curve, n.lines.Mains).P, 0)) / g.G * up}
	n.character(p, &r, g.G/up)
	for k, d := range floor.Details {
		r.Details[k] = d
	}
	r.Figures = []analyze.Figure{stage.SpectrumFigure(p, n.lines)}
	if floored && floor.Limited {
		r = stage.FloorLimited(r, v, true, floor.Ratio)
	}
	return beside(p, r, v, noiseBandwidth(b, curve))
}

// plane is where the printed noise is referred to.
func plane(q *analyze.Params) string {
	if q.Plane == "emf" || q.InputR != nil && q.Source != nil {
		return "emf"
	}
	return "terminals"
}

// toEMF is the factor from the terminals to the source's EMF, (R + source)/R;
// 1 where the gain was taken from the EMF or a resistance is not stated.
func toEMF(q *analyze.Params) float64 {
	if q.Plane == "emf" || q.InputR == nil || q.Source == nil {
		return 1
	}
	return 1 + q.Source.Value.Linear() / *q.InputR
}

// beside puts the source's thermal noise and the noise figure next to the
// value v (V RMS at the input), and refuses a reading that lies beyond its
// uncertainty under the thermal noise.
func beside(p *analyze.Pass, r analyze.Result, v, bandwidthHz float64) analyze.Result {
	q := p.Params
	kelvins := float64(standardTemperature)
	if q.Temperature != nil {
		kelvins = *q.Temperature
	}
	r.Details["noise_bandwidth_hz"], r.Details["temperature_k"] = bandwidthHz, kelvins
	if q.Source == nil {
		r.Notes = append(r.Notes, "no `source` stated: not compared with its thermal noise")
		return r
	}
	ohms := q.Source.Value.Linear()
	r.Details["source_ohm"] = ohms
	if ohms <= 0 {
		return r
	}
	t := thermal(ohms, kelvins, bandwidthHz)
	tStandard := thermal(ohms, standardTemperature, bandwidthHz)
	r.Details["thermal_dbu"] = dBu.FromLinear(t)
	r.Details["noise_figure_db"] = dBu.FromLinear(v) - dBu.FromLinear(tStandard)
	if r.Details["noise_figure_db"].(float64) > 3 { // nearer, the difference is mostly error
		r.Details["amplifier_dbu"] = dBu.FromLinear(ownPart(v, t))
	}
	U, _, _, _ := budget.Expand(r.Budget, 2)
	lowest := t
	if plane(q) == "terminals" {
		lowest /= math.Pow(10, terminalsAllowance/20)
	}
	top := v + U
	if r.Bound != nil {
		top = r.Bound.Value
	}
	if top >= lowest {
		return r
	}
	bad := analyze.Refuse(dBu, analyze.Impossible,
		fmt.Sprintf("%.2f dBu lie %.2f dB under the thermal noise of %.4g ohm at %.4g K in this band (%.2f dBu): no unit is quieter than its source",
			dBu.FromLinear(v), dBu.FromLinear(t)-dBu.FromLinear(v), ohms, kelvins, dBu.FromLinear(t)),
		"check full_scale_peak, the gain (and that both takes were made at one setting), and that the source was fitted")
	bad.Details, bad.Flags, bad.Figures = r.Details, r.Flags, r.Figures
	return bad
}
