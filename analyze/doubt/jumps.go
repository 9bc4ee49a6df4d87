package doubt

import (
	"fmt"
	"math"
	"math/cmplx"

	"benchslip/capture/recording"
)

// A recorder that loses samples, or writes some twice, makes a steady tone
// jump in phase from one sample to the next. The phase in each frame is held
// against straight lines through the frames before and after it.
const (
	leastFramesRun = 12
	sides          = 3    // frames that a line is drawn through
	overPhase      = 9    // times the scatter of all such comparisons
	partOfSample   = 0.6  // of the phase of one sample
	leastJump      = 0.03 // rad; what is lost beyond whole periods may be less than a sample
	sameLevel      = 0.03
	maxJumps       = 6
)

func jumps(l *listening) []Finding {
	f := l.frames
	var out []Finding
	more := 0
	for _, t := range f.tones() {
		if t.len() < leastFramesRun {
			continue
		}
		for _, i := range f.breaks(t) {
			at, jump, sharp := l.place(i)
			if !sharp || l.known(at) {
				continue
			}
			if len(out) == maxJumps {
				more++
				continue
			}
			out = append(out, l.found(recording.Gap, at, at, l.jumpText(at, jump)))
		}
	}
	if more > 0 {
		out[len(out)-1].Message += fmt.Sprintf("; %d more such places follow", more)
	}
	return out
}

func (l *listening) jumpText(at int, jump float64) string {
	period := l.frames.rate / l.frames.hz
	lost := jump / (2 * math.Pi) * period
	if lost < 0 {
		lost += period
	}
	return fmt.Sprintf("at %.6g s the tone at %.6g Hz jumps by %+.3g rad within a sample: %.1f samples were lost, or %.1f came twice, give or take whole periods of %.1f",
		l.at(at), l.frames.hz, jump, lost, period-lost, period)
}

// breaks lists the frames of a stretch of tone in whose middle the phase
// jumps.
func (f *frames) breaks(t stretch) []int {
	n := t.len()
	phase := make([]float64, n) // unwrapped along the stretch
	for i := range phase {
		if i == 0 {
			continue
		}
		step := cmplx.Phase(f.list[t.from+i].z * cmplx.Conj(f.list[t.from+i-1].z))
		phase[i] = phase[i-1] + step
	}
	d := make([]float64, n)
	size := make([]float64, n)
	for i := sides; i+sides < n; i++ {
		before, after := ahead(phase[i-sides:i], 0), ahead(phase[i+1:i+1+sides], -1-sides)
		d[i] = math.Remainder(after-before, 2*math.Pi)
		size[i] = math.Abs(d[i])
	}
	limit := math.Max(overPhase*1.4826*median(size[sides:n-sides]), math.Min(leastJump, partOfSample*2*math.Pi*f.hz/f.rate))
	var out []int
	for i := sides; i+sides < n; i++ {
		if size[i] < limit || !f.level(t.from+i) {
			continue
		}
		top := true
		for k := max(sides, i-sides); k <= min(n-sides-1, i+sides); k++ {
			top = top && (size[k] < size[i] || size[k] == size[i] && k >= i)
		}
		if top {
			out = append(out, t.from+i)
		}
	}
	return out
}

// ahead is the value at the place one beyond the end of p (0) or so many
// places from there, of the straight line through p's three values.
func ahead(p []float64, places int) float64 {
	mean := (p[0] + p[1] + p[2]) / 3
	slope := (p[2] - p[0]) / 2
	return mean + slope*float64(2+places)
}

// level: the tone is as loud before frame i as after it.
func (f *frames) level(i int) bool {
	a, b := 0.0, 0.0
	for k := 1; k <= sides; k++ {
		a += cmplx.Abs(f.list[i-k].z)
		b += cmplx.Abs(f.list[i+k].z)
	}
	return math.Abs(a-b) < sameLevel*math.Max(a, b)
}

// place finds the sample at which the tone of the frames before i goes over
// into that of the frames after it, and by how much its phase jumps there.
// sharp: such a change explains the samples far better than a smooth one, and
// leaves little of them.
func (l *listening) place(i int) (at int, jump float64, sharp bool) {
	f := l.frames
	first := (i - 1) * f.n
	x := make([]float64, 3*f.n)
	x = x[:l.sig.Read(x, first)]
	mean := 0.0
	for _, v := range x {
		mean += v / float64(len(x))
	}
	before, after := f.model(i-sides, i), f.model(i+1, i+1+sides)
	// Squared errors if the change came before sample k.
	late := 0.0
	for k, v := range x {
		e := v - mean - after.at(first+k)
		late += e * e
	}
	best, where, early := late, 0, 0.0
	for k, v := range x {
		p, q := v-mean-before.at(first+k), v-mean-after.at(first+k)
		early += p * p
		late -= q * q
		if early+late < best {
			best, where = early+late, k+1
		}
	}
	at = first + where
	jump = math.Remainder(after.phase(at)-before.phase(at), 2*math.Pi)
	// A smooth passage through the same phases: interpolated over the frame.
	smooth := 0.0
	for k, v := range x {
		w := math.Min(1, math.Max(0, float64(k-f.n)/float64(f.n)))
		a := (before.amp + after.amp) / 2
		n := first + k
		e := v - mean - a*math.Cos(before.phase(n)+w*math.Remainder(after.phase(n)-before.phase(n), 2*math.Pi))
		smooth += e * e
	}
	// A burst of noise shifts the readings of the phase too: what is left must
	// be well under what the jump itself makes.
	made := 2 * math.Sin(math.Abs(jump)/2) * (before.amp + after.amp) / 2
	return at, jump, best < smooth && best/float64(len(x)) < made*made/8
}

// model is a tone of one frequency: amp cos(start + turn n).
type model struct{ amp, start, turn float64 }

func (m model) phase(n int) float64 {
	return math.Remainder(m.start+2*math.Pi*fraction(m.turn*float64(n)), 2*math.Pi)
}
func (m model) at(n int) float64 { return m.amp * math.Cos(m.phase(n)) }

// model fits frames [from, to), three of them.
func (f *frames) model(from, to int) model {
	p := make([]float64, 0, sides)
	amp := 0.0
	for i := from; i < to; i++ {
		z := f.list[i].z
		ph := cmplx.Phase(z)
		if len(p) > 0 {
			ph = p[len(p)-1] + math.Remainder(ph-p[len(p)-1], 2*math.Pi)
		}
		p = append(p, ph)
		amp += cmplx.Abs(z) / float64(to-from)
	}
	slope := (p[2] - p[0]) / 2 / float64(f.n) // rad a sample
	middle := float64(from+1)*float64(f.n) + float64(f.n)/2
	return model{amp, (p[0]+p[1]+p[2])/3 - slope*middle, f.hz/f.rate + slope/(2*math.Pi)}
}

// known: the samples alone have shown a fault at that place already.
func (l *listening) known(at int) bool {
	for _, g := range l.Take.Flags {
		if (g.Code == recording.Gap || g.Code == recording.RepeatedBlock) && (g.Channel == 0 || g.Channel == l.sig.Channel()) && g.FromS != nil && g.ToS != nil {
			if t := l.at(at); t > *g.FromS-2*l.frames.seconds(1) && t < *g.ToS+2*l.frames.seconds(1) {
				return true
			}
		}
	}
	return false
}
