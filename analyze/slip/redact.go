package slip

import (
	"fmt"
	"slices"
	"strings"
)

// Withheld stands in a redacted slip where a text was.
const Withheld = "(withheld)"

// Redact takes the texts of free keys of unit and record ("operator",
// "customer") out of the slip, and wherever else its title, notes, conditions,
// waivers and remarks repeat them. Names of takes, checks and gear stay: rows
// are found by them. A key that neither unit nor record has is an error that
// lists those there are. Redacted then says what was withheld.
func (s *Slip) Redact(keys []string) error {
	var values []string
	for _, k := range keys {
		found := false
		for _, m := range []map[string]string{s.Unit, s.Record} {
			v, ok := m[k]
			if !ok {
				continue
			}
			found = true
			if v = strings.TrimSpace(v); v != Withheld && v != "" {
				values = append(values, v)
			}
			m[k] = Withheld
		}
		if !found {
			return fmt.Errorf("the slip has no field %q to withhold; there is %s", k, strings.Join(s.fields(), ", "))
		}
		if !slices.Contains(s.Redacted, k) {
			s.Redacted = append(s.Redacted, k)
		}
	}
	slices.Sort(s.Redacted)
	// The longest first, so that no part of one is left of another.
	slices.SortStableFunc(values, func(a, b string) int { return len(b) - len(a) })
	clean := func(text string) string {
		for _, v := range values {
			if len([]rune(v)) >= 3 { // shorter ones stand inside other words
				text = strings.ReplaceAll(text, v, Withheld)
			}
		}
		return text
	}
	for _, text := range s.texts() {
		*text = clean(*text)
	}
	maps := []map[string]string{s.Unit, s.Record}
	for i := range s.Takes {
		maps = append(maps, s.Takes[i].Where)
	}
	for _, m := range maps {
		for k, v := range m {
			m[k] = clean(v)
		}
	}
	return nil
}

// fields lists the free keys of unit and record.
func (s *Slip) fields() []string {
	var out []string
	for _, m := range []map[string]string{s.Unit, s.Record} {
		for k := range m {
			if !slices.Contains(out, k) {
				out = append(out, k)
			}
		}
	}
	slices.Sort(out)
	if out == nil {
		out = []string{"none"}
	}
	return out
}

// texts are the free texts of a slip outside its maps.
func (s *Slip) texts() []*string {
	out := []*string{&s.Title}
	for i := range s.Gear {
		out = append(out, &s.Gear[i].Notes)
	}
	for i := range s.Takes {
		t := &s.Takes[i]
		out = append(out, &t.Note, &t.File, &t.Fault)
		for j := range t.Flags {
			out = append(out, &t.Flags[j].Message)
		}
	}
	for i := range s.Checks {
		c := &s.Checks[i]
		out = append(out, &c.Clause, &c.Reason, &c.Advice, &c.By)
		if c.Waiver != nil {
			out = append(out, &c.Waiver.By, &c.Waiver.Why, &c.Waiver.Ticket)
		}
		for _, list := range [][]string{c.Opinions, c.Notes, c.Conditions} {
			for j := range list {
				out = append(out, &list[j])
			}
		}
		for j := range c.Flags {
			out = append(out, &c.Flags[j].Message)
		}
	}
	return out
}
