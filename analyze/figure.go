package analyze

// Figure is a plot as data; report draws it. Finite numbers only.
type Figure struct {
	ID      string // file-safe, unique in a slip once the row's number is put before it
	Title   string // says what is shown, of which take
	Caption string // resolution bandwidth, RMS a line or density, envelope ...
	X, Y    Axis
	Series  []Series
	Marks   []Mark
	Rules   []Rule
}

// Axis of a figure. Min == Max: found from the data.
type Axis struct {
	Label    string // "frequency"
	Unit     string // "Hz"
	Log      bool
	Min, Max float64
}

// Series kinds.
const (
	Line     = "line"     // Y over X
	Points   = "points"   // marks only
	Bars     = "bars"     // bars from the axis foot to Y
	Envelope = "envelope" // filled between Low and Y
)

// Series is one curve. X and Y have one length; Low only for Envelope.
type Series struct {
	Name string
	Kind string
	X, Y []float64
	Low  []float64
}

// Mark is a point worth naming: told apart by shape and label, never by
// colour alone.
type Mark struct {
	Kind  string // "tone", "harmonic", "mains", "line", "event"
	X, Y  float64
	Label string // "H2", "50 Hz"
}

// Rule is a straight line across the figure: a limit, a band edge, a floor.
type Rule struct {
	Label    string
	Vertical bool
	At       float64
}
