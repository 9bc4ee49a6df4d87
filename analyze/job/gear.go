package job

import (
	"math"
	"strings"

	"benchslip/analyze"
	"benchslip/analyze/keys"
	"benchslip/capture/recording"
	"benchslip/capture/unit"
)

// dbPerRelative turns a small relative uncertainty into dB: 20/ln 10.
const dbPerRelative = 20 / math.Ln10

// defaultClock is the expanded (k = 2) relative uncertainty of a sample clock
// nobody stated: crystals of recorders are specified to some tens of ppm.
const defaultClock = 100e-6

// readGear reads [gear.NAME] and its channels. Expanded figures (k = 2) of
// the file become standard ones.
func (r *reader) readGear(name string, n *node) {
	if n.kind != tableKind {
		r.add(n.at, "%s: got %s, expected a table: write [gear.%s]", tick(name), kindNames[n.kind], clean(name))
		return
	}
	where := "[gear." + clean(name) + "]"
	if !r.once("gear", name, n.key) {
		return
	}
	r.unknown(n, append(keys.Names(keys.Gear), "channel"), where)
	g := &Gear{Gear: &analyze.Gear{Name: name, Probe: 1, Clock: defaultClock / 2}}
	r.gear[name] = g
	r.job.Gear = append(r.job.Gear, g)
	g.Kind = r.word(n.get("kind"), find("kind", keys.Gear))
	if n.get("kind") == nil && !n.broken {
		r.add(n.key, `gear %s says no kind: write kind = "audio" or kind = "scope"`, tick(name))
	}
	g.DC = g.Kind == recording.Scope
	r.fillGear(g, n, keys.Gear)
	g.Coupling = "ac"
	if g.DC {
		g.Coupling = "dc"
	}
	channels := r.table(n, "channel")
	if channels == nil {
		return
	}
	for _, number := range channels.names {
		c := channels.under[number]
		num, ok := channelNumber(number)
		if !ok {
			r.add(c.key, "channel %s: expected a number from 1 up, like [gear.%s.channel.2]", tick(number), clean(name))
			continue
		}
		if c.kind != tableKind {
			r.add(c.at, "channel %s: got %s, expected a table: write [gear.%s.channel.%d]", tick(number), kindNames[c.kind], clean(name), num)
			continue
		}
		r.unknown(c, keys.Names(keys.Channel), "[gear."+clean(name)+".channel."+number+"]")
		r.channelGear(g, num, c)
	}
}

// channelGear adds a complete entry for one channel: the gear's own with what
// the channel states put over it. Stating anything of the scale makes its
// error independent of the other channels'.
func (r *reader) channelGear(g *Gear, num int, c *node) {
	one := *g.Gear
	one.Channels, one.OwnScale = nil, false
	if kind := r.word(c.get("kind"), find("kind", keys.Channel)); kind != "" && g.Kind != "" && kind != g.Kind {
		r.add(c.get("kind").at, "channel %d of gear %s is %s, the gear itself %s: give it an entry of its own", num, tick(g.Name), quote(kind), quote(g.Kind))
	}
	for _, k := range []string{"full_scale_peak", "full_scale_sine", "probe", "uncertainty"} {
		one.OwnScale = one.OwnScale || c.get(k) != nil
	}
	r.fillGear(&Gear{Gear: &one, FullScale: g.FullScale}, c, keys.Channel)
	if g.Channels == nil {
		g.Channels = map[int]*analyze.Gear{}
	}
	g.Channels[num] = &one
}

// fillGear reads the keys that a gear entry and its channels share, and for
// an entry the others.
func (r *reader) fillGear(g *Gear, n *node, in keys.Place) {
	k := func(name string) keys.Key { return find(name, in) }
	r.fullScale(g, n, k)
	if v := n.get("probe"); v != nil {
		if g.Kind == recording.Audio {
			r.add(v.key, "%s belongs to a scope: a recorder's volts come from %s", tick("probe"), tick("full_scale_peak"))
		} else if p := r.number(v, k("probe")); p != 0 {
			g.Probe = p
		}
	}
	if w := r.word(n.get("coupling"), k("coupling")); w != "" {
		g.DC = w == "dc"
	}
	r.scaleUncertainty(g, n.get("uncertainty"), k("uncertainty"))
	if q := r.quantity(n.get("offset_uncertainty"), k("offset_uncertainty")); q != nil {
		g.OffsetU = q.Linear() / 2
	}
	if d := r.date(n.get("calibrated"), k("calibrated")); d != "" {
		g.Calibrated = d
	}
	if in == keys.Channel {
		return
	}
	if q := r.quantity(n.get("clock"), k("clock")); q != nil {
		g.Gear.Clock, g.Clock = q.Linear()/2, true
	}
	if q := r.quantity(n.get("channel_match"), k("channel_match")); q != nil {
		g.ChannelMatch, g.Match = relative(*q, 0)/2, true
	}
	if q := r.quantity(n.get("separation"), k("separation")); q != nil {
		g.Separation = unit.MustLookup("dB").FromLinear(q.Linear())
		if g.Separation <= 0 {
			r.add(n.get("separation").at, "%s: %s is not above 0 dB: write the channel separation as a positive dB", tick("separation"), quote(q.Text))
		}
	}
	if q := r.quantity(n.get("skew"), k("skew")); q != nil {
		g.Skew = q.Linear() / 2
	}
	if q := r.quantity(n.get("rate"), k("rate")); q != nil {
		g.Rate = q.Linear()
	}
	g.Mode = r.textOf(n.get("mode"), k("mode"), true)
}

// fullScale reads one of the two full-scale keys. A sine of U RMS reaches
// sqrt(2) U at its peak.
func (r *reader) fullScale(g *Gear, n *node, k func(string) keys.Key) {
	peak, sine := n.get("full_scale_peak"), n.get("full_scale_sine")
	if peak != nil && sine != nil {
		second := peak
		if sine.key.off > peak.key.off {
			second = sine
		}
		r.add(second.key, "both %s and %s are stated: keep the one the data sheet or calibration gives", tick("full_scale_peak"), tick("full_scale_sine"))
	}
	for _, v := range []*node{peak, sine} {
		if v != nil && g.Kind == recording.Scope {
			r.add(v.key, "a scope has no full scale: its samples are volts already (%s is the factor to apply)", tick("probe"))
			return
		}
	}
	if q := r.quantity(peak, k("full_scale_peak")); q != nil {
		g.FullScalePeak, g.FullScale = q.Linear(), q.Text+" peak"
	}
	if q := r.quantity(sine, k("full_scale_sine")); q != nil {
		g.FullScalePeak, g.FullScale = math.Sqrt2*q.Linear(), q.Text+" sine"
	}
}

// scaleUncertainty reads the uncertainty of the volts: relative, in dB, or in
// volts of a stated full scale.
func (r *reader) scaleUncertainty(g *Gear, n *node, k keys.Key) {
	if n == nil {
		return
	}
	of := []unit.Dim{unit.Volt}
	q, unknown := r.uncertainty(n, k, of)
	if unknown {
		g.ScaleU, g.Uncertainty = nil, "unknown"
		return
	}
	if q == nil {
		return
	}
	whole := g.FullScalePeak
	if strings.HasSuffix(g.FullScale, " sine") {
		whole /= math.Sqrt2
	}
	if q.Unit.Dim == unit.Volt && whole == 0 {
		r.add(n.at, "%s: %s needs a full scale to relate to: write it in %% or dB", tick(k.Name), quote(q.Text))
		return
	}
	u := relative(*q, whole) / 2
	g.ScaleU, g.Uncertainty = &u, q.Text
}

// relative turns an uncertainty into a fraction: dB by its slope at zero (the
// way back on the slip is the same), other units by the whole they belong to.
func relative(q unit.Quantity, whole float64) float64 {
	switch {
	case q.Unit.IsLog():
		return q.Number / dbPerRelative
	case q.Unit.Dim == unit.Ratio:
		return q.Linear()
	}
	return q.Linear() / whole
}
