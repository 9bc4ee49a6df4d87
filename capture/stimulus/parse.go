package stimulus

import (
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"

	"benchslip/capture/unit"
)

// mark begins the comment of a file that was written here, so that nobody's
// own comment is taken for a description.
const mark = "benchslip stimulus: "

// FromInfo finds the description in the text fields of a recording
// (recording.Info.Text). It reports false when there is none, or none that
// can be read.
func FromInfo(text map[string]string) (Spec, bool) {
	line, found := strings.CutPrefix(text["ICMT"], mark)
	if !found {
		return Spec{}, false
	}
	s, err := Parse(line)
	return s, err == nil
}

// Parse reads "KIND key=value ...". Keys stand in any order; those left out
// take their defaults; a space between number and unit is allowed. The Spec
// is complete and possible: it can be made.
func Parse(text string) (Spec, error) {
	words := strings.Fields(text)
	if len(words) == 0 {
		return Spec{}, fmt.Errorf("empty stimulus: expected a kind and keys, like \"sweep from=20Hz to=20kHz\"")
	}
	kind, ok := find(words[0])
	if !ok {
		var names []string
		for _, k := range Kinds() {
			names = append(names, k.Name)
		}
		return Spec{}, fmt.Errorf("stimulus: unknown kind %q%s", clip(words[0]), orNearest(words[0], names))
	}
	given, err := pairs(words[1:], kind)
	if err != nil {
		return Spec{}, err
	}
	listed := kind.takesList() && given["at"] != ""
	if listed {
		for _, name := range insteadOfAt {
			if _, both := given[name]; both {
				return Spec{}, fmt.Errorf("stimulus: %s cannot stand beside at, which lists the frequencies", name)
			}
		}
	}
	s := Spec{Kind: kind.Name}
	for _, k := range kind.Keys {
		value, stated := given[k.Name]
		if !stated {
			value = k.Default
			if value == "" || listed && slices.Contains(insteadOfAt, k.Name) {
				continue
			}
		}
		if err := k.set(&s, value); err != nil {
			return Spec{}, fmt.Errorf("stimulus: %s=%s: %w", k.Name, clip(value), err)
		}
	}
	if err := s.Check(); err != nil {
		return Spec{}, err
	}
	return s, nil
}

// insteadOfAt are the keys whose place a list of frequencies takes, in the
// kinds that take one.
var insteadOfAt = []string{"from", "to", "count"}

// pairs splits the words after the kind into keys and values.
func pairs(words []string, kind Kind) (map[string]string, error) {
	given := map[string]string{}
	last := ""
	for _, w := range words {
		name, value, ok := strings.Cut(w, "=")
		if !ok {
			if last == "" {
				return nil, fmt.Errorf("stimulus: %q: expected key=value", clip(w))
			}
			given[last] += w // "from=20 Hz"
			continue
		}
		var names []string
		for _, k := range kind.Keys {
			names = append(names, k.Name)
		}
		if !slices.Contains(names, name) {
			return nil, fmt.Errorf("stimulus: %s takes no key %q%s", kind.Name, clip(name), orNearest(name, names))
		}
		if _, twice := given[name]; twice {
			return nil, fmt.Errorf("stimulus: %s stands twice", name)
		}
		given[name], last = value, name
	}
	return given, nil
}

// takesList reports whether the kind takes either a list of frequencies or
// from, to and count.
func (k Kind) takesList() bool { return k.Name == "stepped-tones" || k.Name == "multitone" }

func orNearest(word string, words []string) string {
	if near := unit.Nearest(word, words); near != "" {
		return fmt.Sprintf("; did you mean %q?", near)
	}
	return "; expected one of " + strings.Join(words, ", ")
}

// clip keeps a message short whatever was typed.
func clip(s string) string {
	if len(s) > 40 {
		return s[:40] + "..."
	}
	return s
}

// number reads a quantity of a dimension in its base unit.
func number(text string, dim unit.Dim, example string) (float64, error) {
	q, err := unit.Parse(text)
	if err != nil {
		return 0, err
	}
	if q.Unit.Dim != dim {
		return 0, fmt.Errorf("expected a %s, like %s", dim, example)
	}
	return q.Linear(), nil
}

func hertz(name, def, doc string, field func(*Spec) *float64) Key {
	return Key{Name: name, Default: def, Doc: doc,
		set: func(s *Spec, v string) (err error) { *field(s), err = number(v, unit.Hertz, "1042Hz"); return },
		get: func(s *Spec) string {
			if *field(s) == 0 {
				return ""
			}
			return hertzText(*field(s))
		}}
}

func hertzList(name, def, doc string) Key {
	return Key{Name: name, Default: def, Doc: doc,
		set: func(s *Spec, v string) error {
			for _, part := range strings.Split(v, ",") {
				f, err := number(part, unit.Hertz, "1042Hz")
				if err != nil {
					return err
				}
				s.AtHz = append(s.AtHz, f)
			}
			return nil
		},
		get: func(s *Spec) string {
			var parts []string
			for _, f := range s.AtHz {
				parts = append(parts, hertzText(f))
			}
			return strings.Join(parts, ",")
		}}
}

func seconds(name, def, doc string, field func(*Spec) *float64) Key {
	return Key{Name: name, Default: def, Doc: doc,
		set: func(s *Spec, v string) (err error) { *field(s), err = number(v, unit.Second, "10s"); return },
		get: func(s *Spec) string { return secondsText(*field(s)) }}
}

// level reads dBFS. The number is kept as typed: it is a peak here, while the
// linear value of the unit is the RMS of a sine.
func level(name, def, doc string, field func(*Spec) *float64) Key {
	return Key{Name: name, Default: def, Doc: doc,
		set: func(s *Spec, v string) error {
			q, err := unit.Parse(v)
			if err != nil {
				return err
			}
			if q.Unit.Symbol != "dBFS" {
				return fmt.Errorf("expected a level in dBFS, like -10dBFS")
			}
			*field(s) = q.Number
			return nil
		},
		get: func(s *Spec) string { return strconv.FormatFloat(*field(s), 'f', -1, 64) + "dBFS" }}
}

func integer(name, def, doc string, field func(*Spec) *int) Key {
	return Key{Name: name, Default: def, Doc: doc,
		set: func(s *Spec, v string) (err error) {
			if *field(s), err = strconv.Atoi(v); err != nil {
				return fmt.Errorf("expected a whole number")
			}
			return nil
		},
		get: func(s *Spec) string {
			if *field(s) == 0 {
				return ""
			}
			return strconv.Itoa(*field(s))
		}}
}

func setRate(s *Spec, v string) error {
	f, err := number(v, unit.Hertz, "48kHz")
	if err != nil {
		return err
	}
	if f != math.Trunc(f) || math.Abs(f) > math.MaxInt32 {
		return fmt.Errorf("expected whole Hz")
	}
	s.RateHz = int(f)
	return nil
}

func setBits(s *Spec, v string) error {
	switch v {
	case "16", "24":
		s.Bits, _ = strconv.Atoi(v)
	case "32float":
		s.Bits = 32
	default:
		return fmt.Errorf("expected 16, 24 or 32float")
	}
	return nil
}

func bitsText(s *Spec) string {
	if s.Bits == 32 {
		return "32float"
	}
	return strconv.Itoa(s.Bits)
}

func setSecond(s *Spec, v string) error {
	words := []string{SecondSame, SecondInverted, SecondSilent, SecondNone}
	if !slices.Contains(words, v) {
		return fmt.Errorf("expected one of %s", strings.Join(words, ", "))
	}
	s.Second = v
	return nil
}
