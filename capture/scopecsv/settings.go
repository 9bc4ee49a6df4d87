package scopecsv

import (
	"strings"

	"benchslip/capture/num"
)

// figure is a quantity stated in the settings.
type figure struct {
	v    float64 // in s, V or plain
	half float64 // half a unit of the last digit written, in the same unit
	rate float64 // 1/v as written, for intervals
	text string  // as written
	key  string
	line int
	q    quantity
}

// settings are what the rows beside the samples say.
type settings struct {
	text     map[string]string // all pairs, as written
	interval []figure          // s between samples, from an interval or a rate
	start    []figure          // s, time of the first sample
	length   []figure          // number of samples
	scale    []figure          // V per count
	offset   string            // name of a setting that gives counts an offset too
	timeUnit figure            // unit stated for the horizontal axis
	valUnit  []figure          // units stated for the vertical axis, one a channel
	probe    []figure
	mode     string // acquisition mode, as written
	modeLine int
	named    []string // names of settings met without a value
}

// plainKey brings a setting's name into words in lower case: "Sample_Rate:" -> "sample rate".
// The unit in brackets is cut off and returned.
func plainKey(key string) (plain, unit string) {
	key = strings.Trim(key, " \t\"#%!*;:=")
	if name, in, ok := bracketed(key); ok && name != "" {
		key, unit = name, in
	} else if i := strings.LastIndex(key, " in "); i > 0 {
		if q, _ := unitOf(key[i+4:]); q == seconds || q == hertz || q == volts {
			key, unit = key[:i], key[i+4:]
		}
	}
	var b strings.Builder
	prev := rune(0)
	for _, r := range key {
		if r >= 'A' && r <= 'Z' && prev >= 'a' && prev <= 'z' {
			b.WriteByte(' ')
		}
		switch r {
		case '_', '-', '.', ':', '/', '\t':
			b.WriteByte(' ')
		default:
			b.WriteString(strings.ToLower(string(r)))
		}
		prev = r
	}
	return strings.Join(strings.Fields(b.String()), " "), unit
}

// settingKind is what a setting's name stands for.
type settingKind uint8

const (
	noSetting settingKind = iota
	intervalSetting
	rateSetting
	startSetting
	lengthSetting
	scaleSetting
	offsetSetting
	timeUnitSetting
	valueUnitSetting
	probeSetting
	modeSetting
	otherSetting
)

var settingWords = map[string]settingKind{
	"sample interval": intervalSetting, "sampling interval": intervalSetting, "time interval": intervalSetting, "interval": intervalSetting, "increment": intervalSetting, "x increment": intervalSetting, "xincrement": intervalSetting,
	"x incr": intervalSetting, "xincr": intervalSetting, "x inc": intervalSetting, "xinc": intervalSetting, "time increment": intervalSetting, "horizontal interval": intervalSetting, "horizontal increment": intervalSetting, "horz interval": intervalSetting, "hor interval": intervalSetting,
	"delta x": intervalSetting, "deltax": intervalSetting, "delta t": intervalSetting, "deltat": intervalSetting, "delta time": intervalSetting, "time delta": intervalSetting, "dt": intervalSetting, "d t": intervalSetting, "dx": intervalSetting, "t delta": intervalSetting, "tdelta": intervalSetting, "\u03b4t": intervalSetting, "\u0394t": intervalSetting, "sample period": intervalSetting, "sampling period": intervalSetting,
	"sample spacing": intervalSetting, "time step": intervalSetting, "timestep": intervalSetting, "x step": intervalSetting, "time per sample": intervalSetting, "time resolution": intervalSetting, "x resolution": intervalSetting, "logging interval": intervalSetting, "log interval": intervalSetting, "recording interval": intervalSetting, "record interval": intervalSetting,
	"scan interval": intervalSetting, "scan period": intervalSetting, "acquisition interval": intervalSetting, "point interval": intervalSetting, "time between samples": intervalSetting, "abtastintervall": intervalSetting, "intervall": intervalSetting, "intervalle": intervalSetting, "intervalo": intervalSetting, "waveform delta": intervalSetting, "wf increment": intervalSetting, "horiz interval": intervalSetting, "sampinterval": intervalSetting, "sample time interval": intervalSetting, "period per sample": intervalSetting, "xunit per point": intervalSetting, "seconds per sample": intervalSetting, "sec per sample": intervalSetting, "s per sample": intervalSetting, "time inc": intervalSetting, "x delta": intervalSetting, "xdelta": intervalSetting,

	"clock": intervalSetting, "h resolution": intervalSetting, "hresolution": intervalSetting, "horizontal resolution": intervalSetting, "t inc": intervalSetting, "tinc": intervalSetting, "x axis increment": intervalSetting, "xaxis increment": intervalSetting,
	"sample rate": rateSetting, "sampling rate": rateSetting, "samplerate": rateSetting, "samplingrate": rateSetting, "sampling frequency": rateSetting, "sample frequency": rateSetting, "samplingfrequency": rateSetting, "fs": rateSetting, "sr": rateSetting, "rate": rateSetting, "scan rate": rateSetting, "acquisition rate": rateSetting, "sampling speed": rateSetting, "sample speed": rateSetting, "sample clock": rateSetting, "sampling": rateSetting, "update rate": rateSetting,
	"samples per second": rateSetting, "samples s": rateSetting, "sps": rateSetting, "sa s": rateSetting, "s s": rateSetting, "logging rate": rateSetting, "data rate": rateSetting, "abtastrate": rateSetting, "abtastfrequenz": rateSetting, "samp rate": rateSetting, "sampl rate": rateSetting, "daq rate": rateSetting, "adc rate": rateSetting, "sample rate hz": rateSetting, "actual sample rate": rateSetting, "points per second": rateSetting, "acq rate": rateSetting, "fr\u00e9quence d'\u00e9chantillonnage": rateSetting, "frecuencia de muestreo": rateSetting, "sampling freq": rateSetting, "sample freq": rateSetting, "f sample": rateSetting, "f s": rateSetting,

	"h offset": startSetting, "hoffset": startSetting, "start": startSetting, "x0": startSetting, "x 0": startSetting, "xzero": startSetting, "x zero": startSetting, "x origin": startSetting, "xorigin": startSetting, "x start": startSetting, "start x": startSetting, "t0": startSetting, "time zero": startSetting, "first sample": startSetting, "time of first sample": startSetting, "first point": startSetting, "start offset": startSetting, "x offset": startSetting, "xoffset": startSetting, "x first": startSetting, "xstart": startSetting, "time start": startSetting, "start time": startSetting, "horizontal start": startSetting,

	"record length": lengthSetting, "recordlength": lengthSetting, "points": lengthSetting, "samples": lengthSetting, "number of points": lengthSetting, "number of samples": lengthSetting, "sample count": lengthSetting, "samples count": lengthSetting, "num samples": lengthSetting, "num points": lengthSetting, "no of samples": lengthSetting, "no of points": lengthSetting, "data points": lengthSetting, "numsamples": lengthSetting, "n samples": lengthSetting, "npoints": lengthSetting, "n points": lengthSetting, "nr pt": lengthSetting, "nr of points": lengthSetting, "record size": lengthSetting, "waveform length": lengthSetting, "waveform points": lengthSetting,
	"data length": lengthSetting, "datalength": lengthSetting, "samples per channel": lengthSetting, "points per channel": lengthSetting, "memory length": lengthSetting, "total samples": lengthSetting, "total points": lengthSetting, "segment size": lengthSetting, "point count": lengthSetting, "sample number": lengthSetting, "sample points": lengthSetting, "sampling points": lengthSetting, "block size": lengthSetting, "blocksize": lengthSetting, "data count": lengthSetting, "sample length": lengthSetting, "number of data": lengthSetting, "number of rows": lengthSetting, "rows": lengthSetting, "anzahl": lengthSetting, "wfm points": lengthSetting, "pts": lengthSetting, "number of readings": lengthSetting, "number of records": lengthSetting, "total records": lengthSetting,

	"volts per count": scaleSetting, "volt per count": scaleSetting, "v per count": scaleSetting, "v count": scaleSetting, "volts count": scaleSetting, "volts per lsb": scaleSetting, "v lsb": scaleSetting, "volt per lsb": scaleSetting, "v per lsb": scaleSetting, "lsb": scaleSetting, "lsb size": scaleSetting, "lsb value": scaleSetting, "volts per code": scaleSetting, "volts per bit": scaleSetting, "v bit": scaleSetting, "v per bit": scaleSetting, "scale v count": scaleSetting, "counts to volts": scaleSetting, "volts per adc count": scaleSetting, "v per adc count": scaleSetting, "y mult": scaleSetting, "ymult": scaleSetting, "y increment": scaleSetting, "yincrement": scaleSetting, "yinc": scaleSetting, "y inc": scaleSetting, "v per code": scaleSetting, "mv per count": scaleSetting, "count size": scaleSetting,
	"y off": offsetSetting, "yoff": offsetSetting, "y zero": offsetSetting, "yzero": offsetSetting, "y origin": offsetSetting, "yorigin": offsetSetting, "yreference": offsetSetting, "y reference": offsetSetting, "yref": offsetSetting, "count offset": offsetSetting, "zero count": offsetSetting, "offset counts": offsetSetting, "code offset": offsetSetting, "midscale": offsetSetting, "mid scale": offsetSetting, "adc offset": offsetSetting, "zero code": offsetSetting, "y offset": offsetSetting, "yoffset": offsetSetting,

	"h unit": timeUnitSetting, "hunit": timeUnitSetting, "horizontal units": timeUnitSetting, "horizontal unit": timeUnitSetting, "time units": timeUnitSetting, "time unit": timeUnitSetting, "x units": timeUnitSetting, "x unit": timeUnitSetting, "xunit": timeUnitSetting, "xunits": timeUnitSetting, "x unit label": timeUnitSetting, "x axis unit": timeUnitSetting, "horz units": timeUnitSetting, "time base unit": timeUnitSetting, "timebase unit": timeUnitSetting, "x axis units": timeUnitSetting, "time axis unit": timeUnitSetting,
	"v unit": valueUnitSetting, "vunit": valueUnitSetting, "vertical units": valueUnitSetting, "vertical unit": valueUnitSetting, "y units": valueUnitSetting, "y unit": valueUnitSetting, "yunit": valueUnitSetting, "yunits": valueUnitSetting, "units": valueUnitSetting, "unit": valueUnitSetting, "y unit label": valueUnitSetting, "y axis unit": valueUnitSetting, "value unit": valueUnitSetting, "value units": valueUnitSetting, "voltage unit": valueUnitSetting, "voltage units": valueUnitSetting, "vert units": valueUnitSetting, "data unit": valueUnitSetting, "y axis units": valueUnitSetting, "einheit": valueUnitSetting, "unit y": valueUnitSetting, "channel units": valueUnitSetting,

	"probe attenuation": probeSetting, "probe": probeSetting, "attenuation": probeSetting, "probe factor": probeSetting, "probe ratio": probeSetting, "probe atten": probeSetting, "attn": probeSetting,
	"acquisition mode": modeSetting, "acq mode": modeSetting, "acquire mode": modeSetting, "sampling mode": modeSetting, "sample mode": modeSetting, "acquisition type": modeSetting, "acquisition": modeSetting, "acquire": modeSetting, "mode": modeSetting, "acquire type": modeSetting,

	"source": otherSetting, "channel": noSetting, "date": noSetting, "model": otherSetting, "firmware": otherSetting, "firmware version": otherSetting, "serial": otherSetting, "serial number": otherSetting, "vertical scale": otherSetting, "vertical offset": otherSetting, "horizontal scale": otherSetting, "horizontal offset": otherSetting, "trigger": otherSetting, "trigger level": otherSetting, "coupling": otherSetting, "comment": noSetting, "note": otherSetting, "bandwidth": otherSetting, "trigger point": otherSetting, "trigger time": otherSetting, "y scale": otherSetting, "x scale": otherSetting, "scale": otherSetting, "offset": otherSetting, "position": otherSetting, "time base": otherSetting, "timebase": noSetting, "trigger mode": otherSetting, "trigger source": otherSetting, "persistence": otherSetting, "title": otherSetting, "operator": otherSetting, "version": otherSetting, "waveform type": otherSetting, "waveform": noSetting, "instrument": otherSetting, "file": otherSetting, "name": noSetting,
}

func settingOf(key string) (settingKind, string) {
	plain, unit := plainKey(key)
	if k, ok := settingWords[plain]; ok {
		return k, unit
	}
	// A channel's name before or behind a known setting: "CH1 sample interval".
	if i := strings.IndexByte(plain, ' '); i > 0 && channelWord(plain[:i]) {
		if k, ok := settingWords[plain[i+1:]]; ok {
			return k, unit
		}
	}
	if i := strings.LastIndexByte(plain, ' '); i > 0 && (channelWord(plain[i+1:]) || isUnitWord(plain[i+1:])) {
		if k, ok := settingWords[plain[:i]]; ok {
			if isUnitWord(plain[i+1:]) && unit == "" {
				unit = plain[i+1:]
			}
			return k, unit
		}
	}
	return noSetting, unit
}

func isUnitWord(w string) bool {
	q, _ := unitOf(w)
	return q == seconds || q == hertz || q == volts
}

func settingWord(key string) bool {
	k, _ := settingOf(key)
	return k != noSetting
}

// channelWord says whether a word in lower case names a channel.
func channelWord(w string) bool {
	for _, p := range []string{"ch", "chan", "channel", "c", "analog", "a", "kanal", "voie", "canal", "trace", "input"} {
		if r := strings.TrimPrefix(w, p); r != w && r != "" && strings.Trim(r, "0123456789abcd") == "" && len(r) <= 2 {
			return true
		}
	}
	return len(w) == 1 && (w[0] >= '1' && w[0] <= '9' || w[0] >= 'a' && w[0] <= 'd')
}

// stated reads a figure with its unit: "1.0e-6", "1 us", "250 MSa/s", "10k".
// unit is one stated elsewhere (behind the name or in the next cell).
func (st style) stated(value, unit string) (figure, bool) {
	t := strings.TrimSpace(strings.Trim(value, "\""))
	// "Analog:700000", "CH1:2.0": a name before the figure
	if i := strings.LastIndexAny(t, ":="); i > 0 && t[0] > '9' && i < len(t)-1 {
		t = strings.TrimSpace(t[i+1:])
	}
	fig := figure{text: t}
	b := []byte(t)
	mark := st.mark
	if _, n := num.Scan(b, '.'); mark == ',' && n == len(b) && strings.Contains(t, ".") {
		mark = '.' // settings may keep the point where samples have commas
	}
	d, n := num.Scan(b, mark)
	if n == 0 {
		return fig, false
	}
	rest := strings.TrimSpace(t[n:])
	if rest == "" {
		rest = unit
	}
	factor := 1.0
	if rest != "" {
		q, f, ok := rateUnit(rest)
		if !ok {
			return fig, false
		}
		fig.q, factor = q, f
	}
	fig.v = d.V * factor
	fig.half = 0.5 * pow10(d.Last) * factor
	return fig, fig.v == fig.v && fig.v < overrange && fig.v > -overrange
}

// rateUnit reads the unit of a stated figure: of time, of rate, or a prefix.
func rateUnit(w string) (quantity, float64, bool) {
	w = strings.Trim(w, " ()[]")
	if q, f := unitOf(w); q == seconds || q == hertz || q == volts {
		return q, f, true
	}
	w = strings.ReplaceAll(w, " ", "")
	l := strings.ToLower(w)
	before := func(tail string) (float64, bool) {
		if len(l) != len(w) || !strings.HasSuffix(l, tail) {
			return 0, false
		}
		return prefix(w[:len(w)-len(tail)])
	}
	for _, u := range perSecond {
		if f, ok := before(u); ok {
			return hertz, f, true
		}
	}
	for _, u := range []string{"s/sample", "sec/sample", "s/sa", "s/pt", "s/point"} {
		if f, ok := before(u); ok {
			return seconds, f, true
		}
	}
	switch l {
	case "pts", "points", "point", "samples", "sample", "sa", "pt", "x", ":1", "/sec":
		return unknown, 1, true
	case "kpts", "ksa", "kpt", "kpoints", "ksamples":
		return unknown, 1e3, true
	case "mpts", "msa", "mpt", "mpoints", "msamples":
		return unknown, 1e6, true
	}
	if f, ok := prefix(w); ok {
		return unknown, f, true
	}
	if strings.HasPrefix(l, "v/") || strings.HasPrefix(l, "mv/") || strings.HasPrefix(l, "uv/") || strings.HasPrefix(l, "volts/") {
		f := 1.0
		switch l[0] {
		case 'm':
			f = 1e-3
		case 'u':
			f = 1e-6
		}
		return volts, f, !strings.HasSuffix(l, "/div")
	}
	return unknown, 0, false
}

// perSecond are the ways to write samples a second, in lower case.
var perSecond = []string{"samples/second", "samples/sec", "samples/s", "sample/s", "sa/sec", "sa/s", "pts/s", "points/s", "s/sec", "s/second", "s/s", "smp/s", "samp/s", "sps", "readings/s", "scans/s", "hz"}

func prefix(w string) (float64, bool) {
	switch strings.TrimSpace(w) {
	case "k", "K":
		return 1e3, true
	case "M", "meg":
		return 1e6, true
	case "G":
		return 1e9, true
	case "m":
		return 1e-3, true
	case "u", "\u00b5", "\u03bc":
		return 1e-6, true
	case "n":
		return 1e-9, true
	case "p":
		return 1e-12, true
	case "":
		return 1, true
	}
	return 0, false
}
