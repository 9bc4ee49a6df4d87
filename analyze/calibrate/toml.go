package calibrate

import (
	"fmt"
	"math"
	"strconv"
	"strings"
	"unicode"

	"benchslip/capture/recording"
	"benchslip/capture/unit"
)

// TOML is the entry as text for a job file, with what it rests on in comments.
func (e *Entry) TOML() string {
	var b strings.Builder
	comment := func(format string, args ...any) {
		fmt.Fprintf(&b, "# %s\n", oneLine(fmt.Sprintf(format, args...)))
	}
	for i, c := range e.Channels {
		for _, r := range c.Points {
			comment("channel %d: %s, %.5g Hz at %s, meter %s RMS: %s", c.Number, r.File, r.Hz, e.levelText(r.RMS), r.Reading, e.factorText(r.Factor))
			comment("  read from %.4g s to %.4g s", r.FromS, r.ToS)
		}
		if i == len(e.Channels)-1 && e.Meter.Name != "" {
			comment("meter: %s", e.Meter.Name)
		}
	}
	for _, n := range e.Notes {
		comment("note: %s", n)
	}
	for i, c := range e.Channels {
		if i == 0 {
			fmt.Fprintf(&b, "[gear.%s]\nkind = %q\n", key(e.Gear), e.Kind)
		} else {
			fmt.Fprintf(&b, "[gear.%s.channel.%d]\n", key(e.Gear), c.Number)
		}
		if e.Kind == recording.Scope {
			fmt.Fprintf(&b, "probe = %s\n", significant(c.Factor, 6))
		} else {
			fmt.Fprintf(&b, "full_scale_peak = \"%s V\"\n", significant(c.Factor, 6))
		}
		if c.Known {
			fmt.Fprintf(&b, "uncertainty = \"%s %%\"       # expanded, k = 2\n", up(100*c.U))
		} else {
			b.WriteString("uncertainty = \"unknown\"\n")
		}
		if i > 0 {
			if e.Date != "" {
				fmt.Fprintf(&b, "calibrated = %s\n", e.Date)
			}
			continue
		}
		if e.Kind == recording.Audio {
			b.WriteString("coupling = \"ac\"             # a tone says nothing about DC\n")
			fmt.Fprintf(&b, "rate = \"%s Hz\"            # the takes it was found at\n", significant(e.RateHz, 9))
		}
		if e.Date != "" {
			fmt.Fprintf(&b, "calibrated = %s\n", e.Date)
		}
		if e.Mode != "" {
			fmt.Fprintf(&b, "mode = %s\n", quoted(e.Mode))
		}
	}
	return b.String()
}

// levelText prints a tone's RMS as the file has it.
func (e *Entry) levelText(rms float64) string {
	if e.Kind == recording.Scope {
		return unit.Pretty(rms, unit.Volt) + " RMS"
	}
	return fmt.Sprintf("%.2f dBFS", 20*math.Log10(rms/unit.FullScaleSine))
}

// key writes a name as a TOML key: bare where it may stand bare.
func key(name string) string {
	bare := name != ""
	for _, r := range name {
		bare = bare && (r >= 'a' && r <= 'z' || r >= 'A' && r <= 'Z' || r >= '0' && r <= '9' || r == '_' || r == '-')
	}
	if bare {
		return name
	}
	return quoted(name)
}

// quoted writes a TOML basic string (TOML 1.0, "String"): control and format
// characters as \u escapes.
func quoted(s string) string {
	var b strings.Builder
	b.WriteByte('"')
	for _, r := range s {
		switch {
		case r == '"' || r == '\\':
			b.WriteByte('\\')
			b.WriteRune(r)
		case unicode.IsControl(r) || unicode.Is(unicode.Cf, r) && r <= 0xffff:
			fmt.Fprintf(&b, "\\u%04X", r)
		case unicode.Is(unicode.Cf, r):
			fmt.Fprintf(&b, "\\U%08X", r)
		default:
			b.WriteRune(r)
		}
	}
	b.WriteByte('"')
	return b.String()
}

// oneLine keeps a comment in its line.
func oneLine(s string) string {
	return strings.Map(func(r rune) rune {
		if unicode.IsControl(r) || unicode.Is(unicode.Cf, r) || r == 0x2028 || r == 0x2029 {
			return '\ufffd'
		}
		return r
	}, s)
}

// significant prints x with n significant digits, without an exponent.
func significant(x float64, n int) string {
	y, _ := strconv.ParseFloat(strconv.FormatFloat(x, 'e', n-1, 64), 64)
	return strconv.FormatFloat(y, 'f', -1, 64)
}

// up rounds an uncertainty up to two significant digits.
func up(x float64) string {
	if x <= 0 {
		return "0"
	}
	step := math.Pow(10, math.Floor(math.Log10(x))-1)
	return significant(math.Ceil(x/step*(1-1e-9))*step, 2)
}
