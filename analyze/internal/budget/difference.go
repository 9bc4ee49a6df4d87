package budget

import (
	"math"

	"benchslip/analyze"
)

// Difference returns the budget of y = ca A - cb B from those of A and B:
// ca and cb are the sensitivities of y, 1 and 1 for a plain difference, y/A
// and y/B for a quotient A/B. Errors of one Source cancel by their signed
// sensitivities (JCGM 100 5.2.2, r = 1); all others are independent, and
// those of B say so in their names.
func Difference(a, b []analyze.Contributor, ca, cb float64) []analyze.Contributor {
	out := make([]analyze.Contributor, 0, len(a)+len(b))
	for _, l := range a {
		out = append(out, times(l, ca))
	}
	for _, l := range b {
		l = times(l, -cb)
		if l.Source == "" {
			l.Name += " (other take)"
		}
		out = append(out, l)
	}
	return cancelled(out)
}

// times scales a line; the sign matters for shared ones alone.
func times(l analyze.Contributor, c float64) analyze.Contributor {
	l.U *= math.Abs(c)
	if c < 0 && l.Source != "" {
		l.Sign = -signOf(l)
	}
	return l
}

func signOf(l analyze.Contributor) int {
	if l.Sign < 0 {
		return -1
	}
	return 1
}

// together merges lines that share a Source into one with a signed U, in the
// order of first appearance.
func together(lines []analyze.Contributor) []analyze.Contributor {
	out := make([]analyze.Contributor, 0, len(lines))
	at := map[string]int{}
	for _, l := range lines {
		if l.Source != "" {
			l.U *= float64(signOf(l))
			if i, seen := at[l.Source]; seen {
				out[i].U += l.U
				if l.Dof > 0 && (out[i].Dof <= 0 || l.Dof < out[i].Dof) {
					out[i].Dof = l.Dof
				}
				continue
			}
			at[l.Source] = len(out)
		}
		out = append(out, l)
	}
	return out
}

// cancelled merges lines of one Source and drops those that vanish, up to
// rounding.
func cancelled(lines []analyze.Contributor) []analyze.Contributor {
	largest := map[string]float64{}
	for _, l := range lines {
		largest[l.Source] = math.Max(largest[l.Source], l.U)
	}
	var out []analyze.Contributor
	for _, l := range together(lines) {
		if l.Source != "" {
			if math.Abs(l.U) <= 1e-12*largest[l.Source] {
				continue
			}
			l.Sign = sign(l.U)
		}
		l.U = math.Abs(l.U)
		out = append(out, l)
	}
	return out
}
