package health

import (
	"math"
	"math/rand/v2"
	"os"
	"strconv"
	"strings"
	"testing"
)

// TestHealthyAtRandom draws healthy takes - tones, pairs of tones, sweeps,
// shaped noise, square, triangle and pulse trains, with and without noise and
// silence, in all formats - and wants no flag on any but `few-codes`, and
// that only where the tone does span few steps (`silent` where it spans none). HEALTHY=n draws n of them.
func TestHealthyAtRandom(t *testing.T) {
	n := 150
	if s := os.Getenv("HEALTHY"); s != "" {
		n, _ = strconv.Atoi(s)
	}
	for seed := range uint64(n) {
		rec, what, steps := randomHealthy(seed)
		r := mustScan(t, rec)
		for _, f := range r.Flags {
			if f.Code == "few-codes" && steps < 130 || f.Code == "silent" && steps < 20 {
				continue
			}
			if f.Code == "gap" && *f.ToS-*f.FromS > maxLag/rec.info.RateHz && strings.Contains(what, "silences") {
				continue // the phase fits by chance, see gaps
			}
			t.Errorf("seed %d: %s: %s: channel %d: %s", seed, what, f.Code, f.Channel, f.Message)
		}
	}
}

func randomHealthy(seed uint64) (rec *fake, what string, steps float64) {
	r := rand.New(rand.NewPCG(seed, 99))
	pick := func(v ...float64) float64 { return v[r.IntN(len(v))] }
	logUniform := func(a, b float64) float64 { return a * math.Pow(b/a, r.Float64()) }
	rate := pick(44100, 48000, 96000, 192000)
	bits := int(pick(8, 16, 16, 24, 24, 0))
	isScope := r.IntN(4) == 0
	n := 30000 + r.IntN(60000)
	if isScope {
		rate = pick(1e5, 1e6, 2.5e8)
		n = 1000 + r.IntN(100000)
	}
	seconds := float64(n) / rate
	peak := logUniform(0.001, 0.97)
	hz := logUniform(3/seconds, 0.45*rate)
	if r.IntN(3) == 0 {
		hz = math.Max(1, math.Round(hz/100)) * 100 // often in step with the rate
	}
	phase := pick(0, 0, 6*r.Float64())
	cycle := func(t float64) float64 { u := hz*t + phase/7; return u - math.Floor(u) }
	waves := []struct {
		name string
		w    wave
	}{
		{"tone", sine(peak, hz, phase)},
		{"tone", sine(peak, hz, phase)},
		{"two tones", func(t float64) float64 { return (sine(peak, hz, phase)(t) + sine(peak, hz/7.3, 0)(t)) / 2 }},
		{"sweep", func(t float64) float64 {
			k := math.Log(100) / seconds
			return peak * math.Sin(2*math.Pi*0.004*rate*(math.Exp(k*t)-1)/k)
		}},
		{"square", func(t float64) float64 { return peak * math.Copysign(1, cycle(t)-0.5) }},
		{"square from 0", func(t float64) float64 { return peak * math.Round(cycle(t)) }},
		{"triangle", func(t float64) float64 { return peak * (4*math.Abs(cycle(t)-0.5) - 1) }},
		{"saw", func(t float64) float64 { return peak * (2*cycle(t) - 1) }},
		{"pulses", func(t float64) float64 { return peak * math.Exp(-40*cycle(t)) }},
		{"one pulse", func(t float64) float64 { return peak * math.Exp(-math.Abs(t-seconds/2)/seconds*100) }},
		{"one step", func(t float64) float64 { return peak / (1 + math.Exp(-(t-seconds/2)/seconds*3000)) }},
		{"half sines", func(t float64) float64 { return max(0, sine(peak, hz, phase)(t)) }},
		{"amplitude modulated", func(t float64) float64 { return sine(peak, hz, phase)(t) * (0.6 + 0.4*sine(1, hz/50, 0)(t)) }},
		{"decay", func(t float64) float64 { return sine(peak, hz, phase)(t) * math.Exp(-3*t/seconds) }},
		{"hum", func(t float64) float64 {
			return peak / 2 * (sine(1, 50.01, 0)(t) + sine(0.3, 150.03, 1)(t) + sine(0.2, 250.05, 2)(t))
		}},
		{"noise", nil},
	}
	w := waves[r.IntN(len(waves))]
	x := make([]float64, n)
	if w.w != nil {
		x = sample(rate, seconds, w.w)
	} else {
		x = music(len(x), peak, seed)
	}
	what = w.name
	rms := pick(0, 0, logUniform(1e-7, 0.01*peak))
	if rms > 0 {
		what += " with noise"
		x = sum(x, noise(len(x), rms, seed))
	}
	if r.IntN(4) == 0 && !isScope {
		what += " between silences"
		quiet := constant(5000+r.IntN(9000), 0)
		part := x[:len(x)/2]
		x = cat(quiet, part, quiet, part[:len(part)*2/3], quiet)
	}
	what += " " + strconv.FormatFloat(hz, 'g', 6, 64) + " Hz peak " + strconv.FormatFloat(peak, 'g', 3, 64) + " noise " + strconv.FormatFloat(rms, 'g', 3, 64)
	if isScope {
		step := pick(0, 1.0/128, 1.0/2048, 1e-5)
		x = scaled(x, peak)
		if rms == 0 && w.w == nil {
			step = 0
		}
		steps = 2 * peak / math.Max(step, 1e-12)
		what += " scope step " + strconv.FormatFloat(step, 'g', 3, 64) + " rate " + strconv.FormatFloat(rate, 'g', 3, 64)
		rec = scope(rate, step, x)
	} else {
		x = scaled(x, peak)
		steps = math.Inf(1)
		if bits > 0 {
			steps = peak * math.Ldexp(1, bits)
		}
		what += " bits " + strconv.Itoa(bits) + " rate " + strconv.FormatFloat(rate, 'g', 6, 64)
		rec = audio(rate, bits, x)
	}
	return rec, what, steps
}
