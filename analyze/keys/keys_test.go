package keys_test

import (
	"slices"
	"testing"

	"benchslip/analyze/keys"
	"benchslip/analyze/measures"
)

// What a measure says of itself and what the table says of it agree.
func TestMeasuresAgree(t *testing.T) {
	all := measures.All()
	if len(all) < 20 {
		t.Fatalf("only %d measures", len(all))
	}
	for _, m := range all {
		k, ok := keys.FindMeasure(m.Name)
		if !ok {
			t.Errorf("%s is not in the table", m.Name)
			continue
		}
		if k.Unit != m.Unit {
			t.Errorf("%s: own unit %q, in the table %q", m.Name, m.Unit, k.Unit)
		}
		own, said := plain(keys.Own(m.Name), k), plain(m.Keys, k)
		if !slices.Equal(own, said) {
			t.Errorf("%s takes\n%v, in the table\n%v", m.Name, said, own)
		}
		for _, r := range k.Roles {
			if !slices.Contains(m.Roles, r) {
				t.Errorf("%s: role %q is missing from %v", m.Name, r, m.Roles)
			}
		}
	}
}

// plain leaves out what goes without saying: the takes a measure reads, and
// the uncertainty of a quantity it takes.
func plain(names []string, m keys.Measure) []string {
	var out []string
	for _, n := range names {
		if k, _ := keys.Find(n, keys.Check); k.Kind != keys.Uncertainty && !slices.Contains(m.Roles, n) || n == "uncertainty" {
			out = append(out, n)
		}
	}
	slices.Sort(out)
	return out
}
