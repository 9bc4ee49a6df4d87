package unit

import "strings"

// Nearest returns the word of the list that text most likely stands for, or
// "" when none is near: a difference of case, or at most a third of the
// letters (one letter in words of up to five, never more than three) wrong,
// missing, added or swapped with a neighbour. Among equals the first wins.
func Nearest(text string, words []string) string {
	const longest = 64 // no key or unit is longer; bounds the work on wild input
	if text == "" || len(text) > longest {
		return ""
	}
	low := strings.ToLower(text)
	best, bestDist := "", 4
	for _, w := range words {
		if strings.EqualFold(w, text) && w != text {
			return w
		}
		n := max(len(w), len(text))
		allowed := min(max(1, n/3), 3)
		if n < 3 {
			allowed = 0
		}
		d := editDistance(low, strings.ToLower(w))
		if d <= allowed && d < bestDist {
			best, bestDist = w, d
		}
	}
	return best
}

// editDistance counts inserted, deleted, replaced and neighbour-swapped bytes
// between a and b (Damerau's distance, optimal string alignment).
func editDistance(a, b string) int {
	before, prev, cur := make([]int, len(b)+1), make([]int, len(b)+1), make([]int, len(b)+1)
	for j := range prev {
		prev[j] = j
	}
	for i := 1; i <= len(a); i++ {
		cur[0] = i
		for j := 1; j <= len(b); j++ {
			cost := 1
			if a[i-1] == b[j-1] {
				cost = 0
			}
			cur[j] = min(prev[j]+1, cur[j-1]+1, prev[j-1]+cost)
			if i > 1 && j > 1 && a[i-1] == b[j-2] && a[i-2] == b[j-1] {
				cur[j] = min(cur[j], before[j-2]+1)
			}
		}
		before, prev, cur = prev, cur, before
	}
	return prev[len(b)]
}
