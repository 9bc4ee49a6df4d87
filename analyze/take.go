package analyze

import (
	"benchslip/capture/health"
	"benchslip/capture/recording"
)

// Gear is a recorder or scope input with its calibration. Uncertainties here
// are standard ones (k = 1); the job file states expanded ones (k = 2).
type Gear struct {
	Name          string
	Kind          string   // recording.Audio or recording.Scope
	FullScalePeak float64  // V at digital full scale; 0: not stated (audio)
	Probe         float64  // factor on a scope file's volts; 1 when not stated
	ScaleU        *float64 // relative standard uncertainty of the volts; nil: not stated or "unknown"
	OffsetU       float64  // V
	DC            bool     // coupling = "dc"
	Clock         float64  // relative standard uncertainty of the time base
	ChannelMatch  float64  // relative standard uncertainty between channels
	Separation    float64  // dB, positive; 0: none stated
	Skew          float64  // s, standard uncertainty between channels
	Rate          float64  // Hz the calibration holds for; 0: any
	Mode          string
	Calibrated    string // date as typed

	// Channels holds complete entries for channels with a table of their
	// own; OwnScale says that their scale error is independent of the rest.
	Channels map[int]*Gear
	OwnScale bool
}

// For returns the entry that holds for channel n.
func (g *Gear) For(n int) *Gear {
	if c, ok := g.Channels[n]; ok {
		return c
	}
	return g
}

// Calibrated reports whether samples can be put into volts.
func (g *Gear) Volts() bool { return g.Kind == recording.Scope || g.FullScalePeak > 0 }

// Condition is one entry of a take's or check's `where`.
type Condition struct{ Key, Value string }

// Take is one recording as the job names it.
type Take struct {
	Name     string
	File     string // as typed, with /
	Path     string // where it lies
	Gear     *Gear  // nil: none named (audio without volts, or scope volts as written)
	Wiring   Wiring
	Where    []Condition
	Note     string
	Setup    string
	Stimulus string // a WAV file as typed, or the description of a stimulus
	Played   string // where that file lies; "" for a description
	CSV      recording.Options

	// Set when the file was opened.
	Rec    recording.Recording
	Health *health.Report
	SHA256 string
	Flags  []recording.Flag // all flags of the file, named with the take
	Fault  *Refusal         // missing-take, unreadable, unsupported; Rec is nil then

	PlayedRec   recording.Recording // the file that was played; nil for a description
	PlayedFault *Refusal            // why that file cannot be read
}

// Condition returns the value of a key of the take's `where`.
func (t *Take) Condition(key string) (string, bool) {
	for _, c := range t.Where {
		if c.Key == key {
			return c.Value, true
		}
	}
	return "", false
}
