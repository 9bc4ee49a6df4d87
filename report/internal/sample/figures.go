package sample

import (
	"fmt"
	"math"
	"math/rand/v2"

	"benchslip/analyze"
)

type figure = analyze.Figure

func noise() *rand.Rand { return rand.New(rand.NewPCG(7, 11)) }

func wave(take string) figure {
	var x, y, in []float64
	for i := range 480 {
		t := float64(i) / 96000
		x = append(x, t*1e3)
		y = append(y, 1.7276*math.Sin(2*math.Pi*1042*t))
		in = append(in, 1.5*math.Sin(2*math.Pi*1042*t+0.4))
	}
	return figure{ID: "waveform", Title: "Waveform of take " + take, Caption: "First 5 ms of the span.",
		X: analyze.Axis{Label: "time", Unit: "ms"}, Y: analyze.Axis{Label: "voltage", Unit: "V"},
		Series: []analyze.Series{{Name: "out (channel 1)", Kind: analyze.Line, X: x, Y: y}, {Name: "in (channel 2), times 100", Kind: analyze.Line, X: x, Y: in}}}
}

// spectrum is a long trace: 40 000 lines, so that it has to be thinned.
func spectrum(take string, variant int) figure {
	r := noise()
	const n = 40000
	x, y := make([]float64, n), make([]float64, n)
	for i := range x {
		f := float64(i+1) * 1.2
		x[i] = f
		floor := -128 + 6*math.Exp(-f/120) + float64(variant)
		y[i] = floor + 10*math.Log10(r.ExpFloat64()+1e-3)
		for h := 1; h <= 7; h++ {
			if h != 3 && math.Abs(f-50*float64(h)) < 0.7 {
				y[i] = -104 - 3*float64(h)
			}
			if math.Abs(f-1042*float64(h)) < 0.7 {
				y[i] = math.Max(floor+5, harmonic(h, variant))
			}
		}
	}
	f := figure{ID: "spectrum", Title: "Spectrum of take " + take + ", out",
		Caption: "RMS a line, resolution bandwidth 1.8 Hz.",
		X:       analyze.Axis{Label: "frequency", Unit: "Hz", Log: true, Min: 10, Max: 48000},
		Y:       analyze.Axis{Label: "level", Unit: "dBu"},
		Series:  []analyze.Series{{Name: "out", Kind: analyze.Line, X: x, Y: y}},
		Marks:   []analyze.Mark{{Kind: "tone", X: 1042, Y: 2, Label: "1.042 kHz"}, {Kind: "mains", X: 50, Y: -107, Label: "50 Hz"}, {Kind: "mains", X: 100, Y: -110, Label: "100 Hz"}},
		Rules:   []analyze.Rule{{Label: "20 Hz", Vertical: true, At: 20}, {Label: "20 kHz", Vertical: true, At: 20000}}}
	for h := 2; h <= 5; h++ {
		f.Marks = append(f.Marks, analyze.Mark{Kind: "harmonic", X: 1042 * float64(h), Y: math.Max(-121, harmonic(h, variant)), Label: fmt.Sprintf("H%d", h)})
	}
	return f
}

// harmonic is the level of an order in dBu: clean, better, overdriven.
func harmonic(h, variant int) float64 {
	if h == 1 {
		return 2
	}
	return []float64{-108, -112, -68}[variant] - 9*float64(h-2)
}

func comb() figure {
	var x, y, fx, fy []float64
	for h := 1; h <= 20; h++ {
		x = append(x, float64(h))
		v := 2.6 / float64(h)
		if h%2 == 0 {
			v /= 6
		}
		y = append(y, v)
		fx, fy = append(fx, float64(h)), append(fy, 0.08)
	}
	return figure{ID: "comb", Title: "Mains harmonics of take quiet", Caption: "RMS a harmonic; the line is the detection threshold.",
		X: analyze.Axis{Label: "order of 50.011 Hz", Unit: ""}, Y: analyze.Axis{Label: "voltage", Unit: "µV"},
		Series: []analyze.Series{{Name: "harmonics", Kind: analyze.Bars, X: x, Y: y}, {Name: "detection threshold", Kind: analyze.Line, X: fx, Y: fy}}}
}

func cycle() figure {
	r := noise()
	var x, lo, hi, mid []float64
	for i := range 400 {
		ph := float64(i) / 400 * 360
		v := 4*math.Sin(ph*math.Pi/180) + 1.5*math.Sin(3*ph*math.Pi/180+0.6)
		x, mid = append(x, ph), append(mid, v)
		lo, hi = append(lo, v-1.5-r.Float64()), append(hi, v+1.5+r.Float64())
	}
	return figure{ID: "cycle", Title: "Take quiet folded on the mains cycle", Caption: "Mean over 1498 cycles; the band holds 95 % of them.",
		X: analyze.Axis{Label: "phase of the mains", Unit: "deg", Min: 0, Max: 360}, Y: analyze.Axis{Label: "voltage", Unit: "µV"},
		Series: []analyze.Series{{Name: "95 % of the cycles", Kind: analyze.Envelope, X: x, Y: hi, Low: lo}, {Name: "mean", Kind: analyze.Line, X: x, Y: mid}}}
}

func response() figure {
	var x, y []float64
	for f := 5.0; f < 45000; f *= math.Pow(2, 1.0/24) {
		x = append(x, f)
		y = append(y, -10*math.Log10(1+math.Pow(3.1/f, 2))-10*math.Log10(1+math.Pow(f/91000, 2)))
	}
	return figure{ID: "response", Title: "Gain against frequency, take sweep", Caption: "Relative to 1 kHz, 1/24 octave.",
		X: analyze.Axis{Label: "frequency", Unit: "Hz", Log: true}, Y: analyze.Axis{Label: "gain", Unit: "dB"},
		Series: []analyze.Series{{Name: "gain", Kind: analyze.Line, X: x, Y: y}},
		Rules:  []analyze.Rule{{Label: "+0.5 dB", At: 0.5}, {Label: "-0.5 dB", At: -0.5}}}
}

func phase() figure {
	var x, y []float64
	for f := 10.0; f < 40000; f *= math.Pow(2, 1.0/3) {
		x = append(x, f)
		y = append(y, (math.Atan(3.1/f)-math.Atan(f/91000))*180/math.Pi)
	}
	return figure{ID: "phase", Title: "Phase against frequency, take sweep", Caption: "After one common delay of 12.1 us.",
		X: analyze.Axis{Label: "frequency", Unit: "Hz", Log: true}, Y: analyze.Axis{Label: "phase", Unit: "deg"},
		Series: []analyze.Series{{Name: "phase", Kind: analyze.Points, X: x, Y: y}}}
}

func edge() figure {
	r := noise()
	var x, y []float64
	for i := range 2500 {
		t := float64(i)*0.04 - 10
		v := 0.0
		if t > 0 {
			v = 10 * (1 - math.Exp(-t/1.4)*(math.Cos(t*1.1)))
		}
		x, y = append(x, t), append(y, math.Round((v+0.04*r.NormFloat64())/0.08)*0.08)
	}
	return figure{ID: "edge", Title: "Rising edge of take edge", Caption: "8-bit scope, one step is 80 mV.",
		X: analyze.Axis{Label: "time", Unit: "µs"}, Y: analyze.Axis{Label: "voltage", Unit: "V"},
		Series: []analyze.Series{{Name: "CH1", Kind: analyze.Line, X: x, Y: y}},
		Marks:  []analyze.Mark{{Kind: "line", X: 0.3, Y: 1, Label: "10 %"}, {Kind: "line", X: 2.2, Y: 9, Label: "90 %"}},
		Rules:  []analyze.Rule{{Label: "base", At: 0}, {Label: "top", At: 10}}}
}

func timeline() figure {
	r := noise()
	var x, y []float64
	for i := range 200000 {
		x, y = append(x, float64(i)/33333), append(y, 2*math.Sin(float64(i)*0.7)+0.1*r.NormFloat64())
	}
	return figure{ID: "timeline", Title: "Timeline of take drive", Caption: "Whole take.",
		X: analyze.Axis{Label: "time", Unit: "s"}, Y: analyze.Axis{Label: "voltage", Unit: "V"},
		Series: []analyze.Series{{Name: "out", Kind: analyze.Line, X: x, Y: y}},
		Marks:  []analyze.Mark{{Kind: "event", X: 5.25, Y: 2.2, Label: "clip"}}}
}
