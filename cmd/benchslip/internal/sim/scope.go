package sim

import (
	"bytes"
	"fmt"
	"math"
	"os"
	"strconv"
)

// Probe is one input of a Scope.
type Probe struct {
	Name        string  // column name; the unit is added in brackets
	VoltsPerDiv float64 // V
	GainError   float64 // relative
	OffsetError float64 // V
	NoiseRMS    float64 // V, of the input, white
	LowCutHz    float64 // AC coupling, one-pole; 0: DC-coupled
}

// Scope models a sampling oscilloscope: a coarse converter over Divs divisions
// of the screen, no dither, and a text file of volts.
type Scope struct {
	RateHz float64
	StartS float64 // time of the first row; the trigger is at 0
	Bits   int     // 8 commonly
	Divs   int     // vertical divisions, the converter's whole range
	Inputs []Probe
	Seed   uint64
}

// Step is one converter step of an input, V.
func (s Scope) Step(input int) float64 {
	return s.Inputs[input].VoltsPerDiv * float64(s.Divs) / math.Ldexp(1, s.Bits)
}

// Samples returns the volts on the screen, planar: whole converter steps,
// stopped at the edges of the screen.
func (s Scope) Samples(seconds float64, inputs ...Source) [][]float64 {
	n := int(math.Round(seconds * s.RateHz))
	out := make([][]float64, len(inputs))
	for c, source := range inputs {
		p := s.Inputs[c]
		ahead := settleSamples(p.LowCutHz, s.RateHz)
		g := &Grid{RateHz: s.RateHz, T: make([]float64, ahead+n)}
		for i := range g.T {
			g.T[i] = s.StartS + float64(i-ahead)/s.RateHz
		}
		x := make([]float64, len(g.T))
		source.Add(x, g)
		lowCut(x, p.LowCutHz, s.RateHz)
		x = x[ahead:]
		r := random(s.Seed, uint64(c))
		step, half := s.Step(c), math.Ldexp(1, s.Bits-1)
		for i, v := range x {
			v = v*(1+p.GainError) + p.OffsetError + p.NoiseRMS*r.NormFloat64()
			code := math.Floor(v/step + 0.5)
			x[i] = max(-half, min(half-1, code)) * step
		}
		out[c] = x
	}
	return out
}

// CSV renders a take: a few settings, a blank row, a header row with units,
// then time in s and volts.
func (s Scope) CSV(seconds float64, inputs ...Source) []byte {
	x := s.Samples(seconds, inputs...)
	var b bytes.Buffer
	fmt.Fprintf(&b, "Record length,%d\n", len(x[0]))
	fmt.Fprintf(&b, "Sample interval,%s,s\n", strconv.FormatFloat(1/s.RateHz, 'E', 6, 64))
	for c, p := range s.Inputs {
		coupling := "DC"
		if p.LowCutHz > 0 {
			coupling = "AC"
		}
		fmt.Fprintf(&b, "Channel %d,%s,%s,V/div,%s\n", c+1, p.Name, strconv.FormatFloat(p.VoltsPerDiv, 'g', -1, 64), coupling)
	}
	b.WriteString("\nTime (s)")
	for _, p := range s.Inputs {
		fmt.Fprintf(&b, ",%s (V)", p.Name)
	}
	b.WriteByte('\n')
	var row []byte
	for i := range x[0] {
		row = strconv.AppendFloat(row[:0], s.StartS+float64(i)/s.RateHz, 'f', 6, 64)
		for _, ch := range x {
			row = append(row, ',')
			row = strconv.AppendFloat(row, ch[i], 'E', 6, 64)
		}
		row = append(row, '\n')
		b.Write(row)
	}
	return b.Bytes()
}

// Record writes a take as a CSV file.
func (s Scope) Record(path string, seconds float64, inputs ...Source) error {
	if len(inputs) == 0 || len(inputs) != len(s.Inputs) {
		return fmt.Errorf("sim: %s: %d sources for %d scope inputs", path, len(inputs), len(s.Inputs))
	}
	return os.WriteFile(path, s.CSV(seconds, inputs...), 0o644)
}
