package hum

import (
	"fmt"
	"math"

	"benchslip/analyze"
	"benchslip/analyze/stage"
	"benchslip/capture/unit"
)

// Cable is what the takes of one run, each with its `setup`, say together.
type Cable struct {
	Rows      []CableRow
	Couplings []Coupling
	Answer    string   // "cable or receiver?" in one line; "" without a baseline
	Left      []string // takes left out, with the reason
}

// CableRow is the hum of one take.
type CableRow struct {
	Setup, Take string
	RMS, U      float64 // V at the recorder, U expanded (k = 2); RMS a bound where Bound is set
	Input       float64 // V at the receiver's input; RMS where no gain is known
	DBu         float64 // of Input
	Bound       bool    // no order stands out: RMS and Input are upper bounds
}

// Coupling is one way into the run: what the hum of one setup has more than
// that of another.
type Coupling struct {
	Way        string
	More, Less string  // setups that are compared
	RMS        float64 // V at the recorder: |difference|, or the larger of each order where phases are not known
	Low, High  float64 // its range
	ChangeDB   float64 // total hum of More over that of Less
}

// ways lists what setups tell apart (common practice, no source). A short at
// the far end takes electric pick-up away, which needs a source impedance;
// magnetic pick-up stays.
var ways = []struct{ way, more, less string }{
	{"magnetic", "end-short", "baseline"},
	{"electric", "end-150", "end-short"},
	{"shield current", "pin1-joined", "end-150"},
	{"shield current mechanism or pin-1 fault", "pin1-joined", "shield-open"},
	{"loads switched on", "loads-on", "end-150"},
}

// CableSummary compares the takes of one cable run by their `setup`, the first
// of each. All must be made with the gear, channel and gain of the first;
// others are left out. The gain to the receiver's input is that of the pass
// (`gain` or role "gain_take").
func CableSummary(p *analyze.Pass, takes []*analyze.Take) (*Cable, *analyze.Refusal) {
	g, _, bad := stage.InputGain(p)
	if bad != nil {
		return nil, bad
	}
	top := highest(p.Params)
	out := &Cable{}
	by := map[string]*reading{}
	var first *analyze.Signal
	for _, t := range takes {
		if t.Setup == "" || by[t.Setup] != nil {
			continue
		}
		s, bad := p.SignalOf(t, "take", "out")
		if bad == nil && first != nil {
			bad = comparable(first, s)
		}
		var r *reading
		if bad == nil {
			r, bad = read(p, "take", s, top)
		}
		if bad != nil {
			out.Left = append(out.Left, fmt.Sprintf("%s: %s", t.Name, bad.Text))
			continue
		}
		if first == nil {
			first = s
		}
		by[t.Setup] = r
		row := CableRow{Setup: t.Setup, Take: t.Name}
		if c := r.sum(0, top, nil, nil); c.seen && c.P > 0 {
			b := rmsBudget(r, math.Sqrt(c.P), c.Power)
			row.RMS, row.U = math.Sqrt(c.P), 2*b.U()
		} else {
			row.RMS, row.Bound = r.bound(p, c), true
		}
		row.Input = row.RMS / g.G
		row.DBu = dBu.FromLinear(math.Max(row.Input, 1e-15)) // -300 dBu stands for nothing at all
		out.Rows = append(out.Rows, row)
	}
	if len(out.Rows) < 2 {
		return nil, &analyze.Refusal{Code: analyze.MissingTake, Text: fmt.Sprintf("%d takes of the run state their setup, at least two are needed", len(out.Rows)),
			Advice: "state `setup` for the takes of the run"}
	}
	for _, w := range ways {
		more, less := by[w.more], by[w.less]
		if more == nil || less == nil {
			continue
		}
		a := add(more, less, top)
		if len(a.orders) == 0 {
			continue
		}
		out.Couplings = append(out.Couplings, Coupling{Way: w.way, More: w.more, Less: w.less, RMS: a.value, Low: a.low, High: a.high,
			ChangeDB: ratio(a.run*a.run, a.base*a.base)})
	}
	out.answer(by, top)
	return out, nil
}

// answer compares the run as installed, or with 150 ohm, with its baseline.
func (c *Cable) answer(by map[string]*reading, top int) {
	base := by["baseline"]
	if base == nil {
		return
	}
	for _, setup := range []string{"pin1-joined", "loads-on", "end-150", "end-short"} {
		if run := by[setup]; run != nil {
			if a := add(run, base, top); len(a.orders) > 0 {
				c.Answer = a.blame(run.Sig.Take.Name, base.Sig.Take.Name)
			}
			return
		}
	}
}

// Details puts the summary into details, as other rows have them.
func (c *Cable) Details() map[string]any {
	var rows, ways []map[string]any
	for _, r := range c.Rows {
		e := map[string]any{"setup": r.Setup, "take": r.Take, "rms_v": r.RMS, "input_rms_v": r.Input, "level_dbu": r.DBu}
		if r.Bound {
			e["bound"] = "upper"
		} else {
			e["uncertainty_v"] = r.U
		}
		rows = append(rows, e)
	}
	for _, w := range c.Couplings {
		ways = append(ways, map[string]any{"kind": w.Way, "more": w.More, "less": w.Less, "rms_v": w.RMS, "low_v": w.Low, "high_v": w.High, "change_db": w.ChangeDB})
	}
	d := map[string]any{"cable_takes": rows}
	if len(ways) > 0 {
		d["cable_couplings"] = ways
	}
	return d
}

// Opinions puts the summary into words.
func (c *Cable) Opinions() []string {
	var out []string
	if c.Answer != "" {
		out = append(out, c.Answer)
	}
	best := -1
	for i, w := range c.Couplings {
		if best < 0 || w.Low > c.Couplings[best].High {
			best = i
		}
	}
	if best >= 0 && len(c.Couplings) > 1 {
		w := c.Couplings[best]
		out = append(out, fmt.Sprintf("of the ways into the run that were compared, %s (%s against %s) brings most: %s .. %s at the recorder", w.Way, w.More, w.Less,
			unit.Pretty(w.Low, unit.Volt), unit.Pretty(w.High, unit.Volt)))
	}
	return append(out, c.Left...)
}
