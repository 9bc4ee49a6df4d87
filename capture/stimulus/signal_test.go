package stimulus

import (
	"fmt"
	"math"
	"math/cmplx"
	"os"
	"path/filepath"
	"testing"

	"benchslip/capture/recording"
	"benchslip/capture/wav"
)

func crest(x []float64) float64 {
	largest, power := 0.0, 0.0
	for _, v := range x {
		largest = max(largest, math.Abs(v))
		power += v * v
	}
	return largest / math.Sqrt(power/float64(len(x)))
}

// fullLevel cuts the signal to the stretch at its full level.
func fullLevel(s Spec, x []float64) []float64 {
	start, length := s.Span()
	from := int(math.Round(start * float64(s.RateHz)))
	return x[from : from+int(math.Round(length*float64(s.RateHz)))]
}

// TestSteps: between its ends each step is the sine that the schedule says.
func TestSteps(t *testing.T) {
	for _, text := range []string{
		"tone at=997.3Hz length=1s rate=44.1kHz", "pilot length=500ms", "stepped-tones count=4 each=300ms gap=33.3ms rate=44.1kHz",
		"stepped-levels count=3 each=200ms", "level-ramp length=500ms",
	} {
		s := parse(t, text)
		x := samplesOf(t, s)
		steps := s.Steps()
		for k, st := range steps {
			rate := float64(s.RateHz)
			from, to := int(math.Round(st.StartS*rate)), int(math.Round((st.StartS+st.LengthS)*rate))
			for i := from; i < to; i++ {
				dt := float64(i)/rate - st.StartS
				want := st.Peak * math.Pow(st.EndPeak/st.Peak, dt/st.LengthS) * math.Sin(2*math.Pi*st.Hz*dt)
				if math.Abs(x[i]-want) > 1e-10 { // what want itself loses in dt at 20 kHz
					t.Fatalf("%s step %d frame %d: got %v, want %v", text, k, i, x[i], want)
				}
			}
		}
	}
	s := parse(t, "stepped-levels from=-20dBFS to=-2dBFS count=7")
	for k, st := range s.Steps() {
		if got, want := 20*math.Log10(st.Peak), -20+3*float64(k); math.Abs(got-want) > 1e-9 {
			t.Errorf("level %d: got %v dBFS, want %v", k, got, want)
		}
	}
	if got := s.Steps()[1].StartS - s.Steps()[0].StartS; math.Abs(got-1.22) > 1e-9 { // each + gap + two fades
		t.Errorf("steps are %v s apart, want 1.22", got)
	}
}

// TestStepsClearOfMains: spaced steps of 1 s keep 4 Hz from the first five
// multiples of 50 and 60 Hz and stay close to even spacing; listed ones are
// left alone.
func TestStepsClearOfMains(t *testing.T) {
	steps := parse(t, "stepped-tones").Steps()
	if len(steps) != 31 || math.Abs(steps[0].Hz-20) > 1e-9 || math.Abs(steps[30].Hz-20000) > 1e-9 {
		t.Fatalf("%d steps from %v to %v Hz", len(steps), steps[0].Hz, steps[len(steps)-1].Hz)
	}
	moved := 0
	for k, st := range steps {
		for h := 1.0; h <= 5; h++ {
			if math.Abs(st.Hz-50*h) < 3.999 || math.Abs(st.Hz-60*h) < 3.999 {
				t.Errorf("step at %v Hz is too close to the mains", st.Hz)
			}
		}
		even := 20 * math.Pow(1000, float64(k)/30)
		if math.Abs(st.Hz/even-1) > 0.1 {
			t.Errorf("step %d at %v Hz, far from %v Hz", k, st.Hz, even)
		}
		if math.Abs(st.Hz-even) > 1e-9 {
			moved++
		}
	}
	if moved == 0 || moved > 10 {
		t.Errorf("%d steps were moved", moved)
	}
	if f := parse(t, "stepped-tones at=50Hz,100Hz").Steps()[0].Hz; f != 50 {
		t.Errorf("a listed tone was moved to %v Hz", f)
	}
}

// TestSweepLaw pins the constants of the exponential sweep 20 Hz .. 20 kHz,
// 10 s. Unsynchronised: L = T / ln(f2/f1) and leads L ln n (Farina, AES 108th
// Convention, 2000); synchronised: L f1 whole (Novak, Lotton, Simon, JAES 63
// (2015) 786). Figures computed from these formulas.
func TestSweepLaw(t *testing.T) {
	near := func(what string, got, want, within float64) {
		t.Helper()
		if !(math.Abs(got-want) <= within) {
			t.Errorf("%s: got %.9f, want %.9f", what, got, want)
		}
	}
	free := Sweep{L: 10 / math.Log(1000)}
	near("free L", free.L, 1.44764827, 1e-8)
	near("free lead of order 2", free.Lead(2), 1.00343332, 1e-8)
	near("free lead of order 3", free.Lead(3), 1.59040418, 1e-8)

	s := parse(t, "sweep from=20Hz to=20kHz length=10s")
	w, ok := s.Sweep()
	if !ok {
		t.Fatal("no sweep")
	}
	near("L", w.L, 1.45, 1e-9)
	near("duration", w.LengthS, 10.0162452, 1e-7)
	near("lead of order 2", w.Lead(2), 1.005063412, 1e-9)
	near("lead of order 3", w.Lead(3), 1.592987819, 1e-9)
	near("L f1 is whole", w.L*w.F1, math.Round(w.L*w.F1), 1e-9)
	near("start", w.StartS, 1.1, 1e-12)
	if _, ok := parse(t, "tone").Sweep(); ok {
		t.Error("a tone has no sweep")
	}

	// The n-th harmonic of the sweep is the sweep L ln n later.
	sig := &sweep{w, float64(s.RateHz)}
	at := func(x float64) float64 { // sin of the phase at time x, by the law
		return math.Sin(2 * math.Pi * w.F1 * w.L * math.Exp(x/w.L))
	}
	for _, n := range []int{2, 3, 5} {
		for _, x := range []float64{0.1, 1, 2.5} {
			phase := math.Mod(w.F1*w.L*math.Exp(x/w.L), 1)
			if got, want := at(x+w.Lead(n)), math.Sin(2*math.Pi*float64(n)*phase); math.Abs(got-want) > 1e-7 {
				t.Errorf("order %d at %v s: got %v, want %v", n, x, got, want)
			}
		}
	}
	one := make([]float64, 1)
	for _, n := range []int64{0, 1, 48000, 300000} {
		sig.fill(one, n)
		if want := w.Peak * at(float64(n)/48000); math.Abs(one[0]-want) > 1e-9 {
			t.Errorf("frame %d: got %v, want %v", n, one[0], want)
		}
	}
}

// TestSweepSpectrum compares the transform of the samples with the form found
// by stationary phase for the synchronised sweep,
//
//	X(f) = Peak/2 sqrt(L/f) exp(j 2 pi f L (1 - ln(f/f1)) - j pi/4)
//
// 20 Hz .. 20 kHz, 10 s, 1 kHz, peak 1: |X| = 0.019039 s (numeric 0.019045 with
// abrupt ends), phase within 3e-4 rad (computed, numpy).
func TestSweepSpectrum(t *testing.T) {
	s := parse(t, "sweep length=10s peak=-6dBFS rate=192kHz")
	x := samplesOf(t, s)
	w, _ := s.Sweep()
	rate := float64(s.RateHz)
	for _, f := range []float64{100, 1000, 9000} {
		var sum, turn complex128
		step := cmplx.Rect(1, -2*math.Pi*f/rate)
		for i, v := range x {
			if i%1024 == 0 { // before errors of the recursion add up
				turn = cmplx.Rect(1, -2*math.Pi*math.Mod(f*(float64(i)/rate-w.StartS), 1))
			}
			sum += complex(v, 0) * turn
			turn *= step
		}
		got := sum / complex(rate*w.Peak, 0)
		want := cmplx.Rect(0.5*math.Sqrt(w.L/f), 2*math.Pi*f*w.L*(1-math.Log(f/w.F1))-math.Pi/4)
		if r := got / want; math.Abs(cmplx.Abs(r)-1) > 1e-3 || math.Abs(cmplx.Phase(r)) > 1e-3 {
			t.Errorf("%v Hz: magnitude off by %.2e, phase by %.2e rad", f, cmplx.Abs(r)-1, cmplx.Phase(r))
		}
		if f == 1000 && math.Abs(cmplx.Abs(want)-0.019039) > 1e-6 {
			t.Errorf("the form gives %v at 1 kHz", cmplx.Abs(want))
		}
	}
}

// TestCrest: crest factors of N equal tones on the first N multiples of the
// grid, 65536 points, phases after Schroeder (IEEE Trans. Inf. Theory IT-16
// (1970) 85); figures computed with numpy from his formula. The same measure
// on zero phases must give sqrt(2 N).
func TestCrest(t *testing.T) {
	for n, want := range map[int]float64{8: 1.78668, 16: 1.82597, 31: 1.78192702, 64: 1.70659} {
		list := "1Hz"
		for k := 2; k <= n; k++ {
			list += fmt.Sprintf(",%dHz", k)
		}
		s := parse(t, "multitone at="+list+" period=1s length=1s rate=65536Hz")
		if got := crest(fullLevel(s, samplesOf(t, s))); math.Abs(got-want) > 1e-3 {
			t.Errorf("%d tones: crest factor %.5f, want %.5f", n, got, want)
		}
	}
	zero := make([]float64, 65536)
	for i := range zero {
		for k := 1; k <= 31; k++ {
			zero[i] += math.Cos(2 * math.Pi * float64(k*i) / 65536)
		}
	}
	if got := crest(zero); math.Abs(got-7.87400787) > 1e-4 {
		t.Errorf("zero phases: crest factor %.8f, want 7.87400787", got)
	}
	// Lines far apart, 31 spaced evenly in octaves: 4.334 (numpy 1.24.2 from
	// the same formula; the median of 200 random phases is 4.05).
	s := parse(t, "multitone length=1s")
	if got := crest(fullLevel(s, samplesOf(t, s))); math.Abs(got-4.334) > 1e-3 {
		t.Errorf("31 tones spaced in octaves: crest factor %.4f", got)
	}
}

// TestTones: the sum of the tones that are told is the signal, period after
// period, and default lines avoid the mains and even multiples.
func TestTones(t *testing.T) {
	for _, text := range []string{
		"multitone period=500ms length=1s rate=44.1kHz", "multitone at=99Hz,1234Hz period=250ms length=250ms",
		"modulation-pair length=300ms", "difference-pair length=300ms",
	} {
		s := parse(t, text)
		x := fullLevel(s, samplesOf(t, s))
		tones := s.Tones()
		for i := 0; i < len(x); i += 97 {
			want := 0.0
			for _, tn := range tones {
				want += tn.Peak * math.Cos(2*math.Pi*turns(tn.Hz, float64(s.RateHz), int64(i))+tn.PhaseRad)
			}
			if math.Abs(x[i]-want) > 1e-10 {
				t.Fatalf("%s frame %d: got %v, the tones give %v", text, i, x[i], want)
			}
		}
	}
	for _, tn := range parse(t, "multitone").Tones() {
		if tn.Hz != math.Round(tn.Hz) || math.Mod(tn.Hz, 2) != 1 {
			t.Errorf("tone at %v Hz is no odd multiple of 1 Hz", tn.Hz)
		}
	}
	// IEC 60268-3: modulation distortion 60 Hz and 7 kHz at 4:1 = 12.04 dB,
	// difference-frequency distortion with equal tones (clauses from memory).
	if p := parse(t, "modulation-pair").Tones(); p[0].Hz != 60 || p[1].Hz != 7000 || math.Abs(20*math.Log10(p[0].Peak/p[1].Peak)-12.0412) > 1e-4 {
		t.Errorf("modulation pair %+v", p)
	}
	if p := parse(t, "difference-pair").Tones(); p[0].Hz != 19000 || p[1].Hz != 20000 || p[0].Peak != p[1].Peak {
		t.Errorf("difference pair %+v", p)
	}
}

// TestPulse: no DC, four times as high as deep, positive first, also after a
// high-pass at 20 Hz like that of a coupled input.
func TestPulse(t *testing.T) {
	s := parse(t, "pulse length=1s")
	x := samplesOf(t, s)
	starts := s.Pulses()
	if len(starts) != 4 || starts[1]-starts[0] != 0.25 {
		t.Fatalf("pulses at %v", starts)
	}
	sum, lo, hi := 0.0, 0.0, 0.0
	for _, v := range x {
		sum, lo, hi = sum+v, min(lo, v), max(hi, v)
	}
	if math.Abs(sum) > 1e-9 || math.Abs(hi/-lo-4) > 1e-3 {
		t.Errorf("sum %v, highest %v, lowest %v", sum, hi, lo)
	}
	top := int(math.Round((starts[2] + s.WidthS/2) * float64(s.RateHz)))
	if math.Abs(x[top]-s.peak()) > 1e-12 {
		t.Errorf("sample at the top is %v, want %v", x[top], s.peak())
	}
	a := math.Exp(-2 * math.Pi * 20 / float64(s.RateHz))
	y, last, largest := 0.0, 0.0, 0.0
	for _, v := range x {
		y, last = a*(y+v-last), v
		if math.Abs(y) > math.Abs(largest) {
			largest = y
		}
	}
	if largest < 0 {
		t.Errorf("after a high-pass the largest sample is %v", largest)
	}
}

// TestPinkFilter: the amplitude falls as 1/sqrt(f) within 0.1 dB over the
// audio band at every usual rate; pink is so defined (common practice).
func TestPinkFilter(t *testing.T) {
	for _, rate := range []float64{44100, 48000, 88200, 96000, 192000} {
		f := newPinkFilter(20, rate)
		lo, hi := math.Inf(1), math.Inf(-1)
		for hz := 20.0; hz <= 20000; hz *= 1.01 {
			w := 2 * math.Pi * hz / rate
			d := 20 * math.Log10(f.response(w)*math.Sqrt(w))
			lo, hi = min(lo, d), max(hi, d)
		}
		if lo < -0.1 || hi > 0.1 {
			t.Errorf("%v Hz: %.3f .. %.3f dB off", rate, lo, hi)
		}
		// The samples obey the response: a unit pulse's transform.
		hz := 1000.0
		var sum complex128
		for i := range int(rate) {
			v := 0.0
			if i == 0 {
				v = 1
			}
			sum += complex(f.next(v), 0) * cmplx.Rect(1, -2*math.Pi*math.Mod(hz*float64(i)/rate, 1))
		}
		if r := cmplx.Abs(sum) / f.response(2*math.Pi*hz/rate); math.Abs(r-1) > 1e-3 {
			t.Errorf("%v Hz: samples give %v of the response", rate, r)
		}
	}
}

// TestNoiseSpectrum measures octave bands of made noise. White noise has
// power in proportion to bandwidth and a variance of peak^2/3; pink has equal
// power in every octave. A band of B Hz over T s scatters by 4.34/sqrt(B T)
// dB; four times that is allowed, and 0.1 dB for the filter.
func TestNoiseSpectrum(t *testing.T) {
	const seconds = 5.461333333333333 // 2^18 frames at 48 kHz
	for _, kind := range []string{"white-noise", "pink-noise"} {
		s := parse(t, kind+" length=6s rate=48kHz")
		x := fullLevel(s, samplesOf(t, s))[:1<<18]
		power := 0.0
		spectrum := make([]complex128, len(x))
		for i, v := range x {
			power += v * v
			spectrum[i] = complex(v, 0)
		}
		fft(spectrum)
		if rms := math.Sqrt(power / float64(len(x))); kind == "white-noise" && math.Abs(rms*math.Sqrt(3)/s.peak()-1) > 0.005 {
			t.Errorf("white: RMS %v for a peak of %v, want 1/sqrt 3 of it", rms, s.peak())
		}
		// Power between lo and hi, a unit of bandwidth (white) or of ln f (pink).
		density := func(lo, hi float64) float64 {
			sum := 0.0
			for k := int(lo * seconds); k < int(hi*seconds); k++ {
				sum += real(spectrum[k] * cmplx.Conj(spectrum[k]))
			}
			if kind == "pink-noise" {
				return sum / math.Log(hi/lo)
			}
			return sum / (hi - lo)
		}
		ref := density(1000, 4000)
		for lo := 31.25; lo < 16001; lo *= 2 {
			hi := min(2*lo, 20000)
			d := 10 * math.Log10(density(lo, hi)/ref)
			allowed := 4*4.34/math.Sqrt((hi-lo)*seconds) + 0.1
			if math.Abs(d) > allowed {
				t.Errorf("%s %v .. %v Hz: %.2f dB off, allowed %.2f", kind, lo, hi, d, allowed)
			}
		}
	}
}

// fft is the textbook transform of 2^k values in place.
func fft(x []complex128) {
	n := len(x)
	if n == 1 {
		return
	}
	even, odd := make([]complex128, n/2), make([]complex128, n/2)
	for i := range even {
		even[i], odd[i] = x[2*i], x[2*i+1]
	}
	fft(even)
	fft(odd)
	for k := range even {
		t := cmplx.Rect(1, -2*math.Pi*float64(k)/float64(n)) * odd[k]
		x[k], x[k+n/2] = even[k]+t, even[k]-t
	}
}

// TestSecondChannel also sees the dither of a silent channel: triangular, two
// steps wide, then rounded: RMS sqrt(1/12 + 2/12) = 0.5 step (computed).
func TestSecondChannel(t *testing.T) {
	for _, second := range []string{SecondSame, SecondInverted, SecondSilent, SecondNone} {
		s := parse(t, "tone length=2s bits=16 second="+second)
		path := filepath.Join(t.TempDir(), "s.wav")
		if err := Write(path, s); err != nil {
			t.Fatal(err)
		}
		r, err := wav.Open(path)
		if err != nil {
			t.Fatal(err)
		}
		y, err := recording.ReadAll(r)
		r.Close()
		if err != nil {
			t.Fatal(err)
		}
		if second == SecondNone {
			if len(y) != 1 {
				t.Errorf("%d channels", len(y))
			}
			continue
		}
		factor := map[string]float64{SecondSame: 1, SecondInverted: -1, SecondSilent: 0}[second]
		power := 0.0
		x := samplesOf(t, s)
		for i := range x {
			e := (y[1][i] - factor*x[i]) * 32768
			power += e * e
		}
		// 192 000 samples scatter by 0.2 %.
		if rms := math.Sqrt(power / float64(len(x))); math.Abs(rms-0.5) > 0.005 {
			t.Errorf("second=%s: error of %.4f steps RMS, want 0.5", second, rms)
		}
	}
}

// The same description gives the same bytes; float files hold no dither.
func TestSameBytes(t *testing.T) {
	dir := t.TempDir()
	for _, text := range []string{"pink-noise length=200ms", "tone length=200ms bits=16", "tone length=200ms bits=32float"} {
		s := parse(t, text)
		var files [2][]byte
		for i := range files {
			path := filepath.Join(dir, "a.wav")
			if err := Write(path, s); err != nil {
				t.Fatal(err)
			}
			b, err := os.ReadFile(path)
			if err != nil {
				t.Fatal(err)
			}
			files[i] = b
		}
		if string(files[0]) != string(files[1]) {
			t.Errorf("%s: two runs differ", text)
		}
	}
	s := parse(t, "tone length=200ms bits=32float")
	x := samplesOf(t, s)
	r, err := wav.Open(filepath.Join(dir, "a.wav"))
	if err != nil {
		t.Fatal(err)
	}
	defer r.Close()
	y, err := recording.ReadAll(r)
	if err != nil {
		t.Fatal(err)
	}
	for i := range x {
		if y[0][i] != float64(float32(x[i])) {
			t.Fatalf("float frame %d: got %v, want %v", i, y[0][i], x[i])
		}
	}
}

// A stimulus that cannot be written leaves nothing behind.
func TestWriteFails(t *testing.T) {
	dir := t.TempDir()
	s := parse(t, "tone length=100ms")
	if err := Write(filepath.Join(dir, "none", "s.wav"), s); err == nil {
		t.Error("a missing folder is no error")
	}
	s.PeakDBFS = 3
	if err := Write(filepath.Join(dir, "s.wav"), s); err == nil {
		t.Error("a peak above full scale is no error")
	}
	if left, _ := os.ReadDir(dir); len(left) > 0 {
		t.Errorf("left behind: %v", left)
	}
}

// TestFades: outside the full level the sine goes on under half a raised
// cosine, the mirror of the other end; both meet the full level without a step.
func TestFades(t *testing.T) {
	s := parse(t, "tone at=5kHz length=100ms fade=50ms before=10ms after=10ms peak=-20dBFS")
	x := samplesOf(t, s)
	rate, n := float64(s.RateHz), s.frames(s.FadeS)
	first, last := s.frames(s.BeforeS)+n, s.frames(s.BeforeS)+n+s.frames(s.LengthS)
	for k := range n {
		weight := math.Pow(math.Sin(math.Pi/2*(float64(k)+0.5)/float64(n)), 2)
		for _, at := range []int64{first - n + k, last + n - 1 - k} {
			want := weight * s.peak() * math.Sin(2*math.Pi*turns(5000, rate, at-first))
			if math.Abs(x[at]-want) > 1e-12 {
				t.Fatalf("frame %d: got %v, want %v", at, x[at], want)
			}
		}
	}
	if int64(len(x)) != last+n+s.frames(s.AfterS) {
		t.Errorf("%d frames", len(x))
	}
}
