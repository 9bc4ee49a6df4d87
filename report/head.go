package report

import (
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"

	"benchslip/analyze/slip"
)

// Head is the top of a sheet: does it pass, by how much, how sure.
type Head struct {
	Title   string   // of the job
	Verdict string   // "Fail"
	Lead    string   // one sentence: "1 row fails and 2 are open."
	Counts  []string // by class
	Closest string   // the row with the least room; "" without judged values
	Rule    string   // the decision rule in one sentence
	Leaves  string   // what the uncertainties leave out
	Flags   string   // codes of the flags, each once; "" none
	Sheet   string
}

// HeadOf puts the head of a slip into words.
func HeadOf(s *slip.Slip, rows []Row) Head {
	t := Count(s)
	h := Head{Title: Title(s), Counts: t.Counts(), Rule: RuleSentence(s.Rule), Sheet: Clean(s.Sheet)}
	h.Verdict = headVerdict(s.Verdict)
	h.Lead = lead(s, t)
	h.Closest = closest(rows)
	h.Leaves = leaves(s)
	var codes []string
	for _, f := range Flags(s) {
		if !slices.Contains(codes, f.Code) {
			codes = append(codes, f.Code)
		}
	}
	h.Flags = strings.Join(codes, ", ")
	return h
}

// Title is the job's title, or a plain one.
func Title(s *slip.Slip) string {
	if t := strings.TrimSpace(Clean(s.Title)); t != "" {
		return t
	}
	if f := strings.TrimSpace(Clean(s.Job.File)); f != "" {
		return f
	}
	return "Untitled job"
}

func headVerdict(v string) string {
	w := Verdict(v)
	if w == "" {
		return "No verdict"
	}
	return strings.ToUpper(w[:1]) + w[1:]
}

func lead(s *slip.Slip, t Tally) string {
	fails, open, pass, judged := sum(t.Fail), sum(t.Open), sum(t.Pass), sum(t.Judged)
	switch {
	case t.Rows == 0:
		return "The job has no checks."
	case judged == 0:
		return "No limits were set: values are shown, nothing is judged."
	case fails == 0 && open == 0:
		if judged == 1 {
			return "The one judged row passes."
		}
		return fmt.Sprintf("All %d judged rows pass.", judged)
	case fails == 0:
		return fmt.Sprintf("Nothing fails, but %s open; %d of %d pass.", count(open, "row is", "rows are"), pass, judged)
	case open == 0:
		return fmt.Sprintf("%s; %d of %d pass.", count(fails, "row fails", "rows fail"), pass, judged)
	}
	return fmt.Sprintf("%s, %s open; %d of %d pass.", count(fails, "row fails", "rows fail"), count(open, "is", "are"), pass, judged)
}

func count(n int, one, many string) string {
	if n == 1 {
		return "1 " + one
	}
	return strconv.Itoa(n) + " " + many
}

// closest names the row whose margin is smallest against its uncertainty. A
// margin in dB and one in volts cannot be compared; both in units of U can.
func closest(rows []Row) string {
	best, at := math.Inf(1), -1
	for i := range rows {
		c := rows[i].Check
		if c.Margin == nil || c.Uncertainty == nil || *c.Uncertainty <= 0 || c.Class == info || c.Verdict == slip.NotJudged {
			continue
		}
		if m := *c.Margin / *c.Uncertainty; m < best {
			best, at = m, i
		}
	}
	if at < 0 {
		return ""
	}
	r := &rows[at]
	in := Digits(math.Abs(best), 2)
	if math.Abs(best) >= 100 {
		in = "over 100"
	}
	if *r.Check.Margin < 0 {
		return fmt.Sprintf("row %d, %s: %s outside its limit, %s times its uncertainty", r.N, r.Name, r.Scale.Diff(-*r.Check.Margin), in)
	}
	return fmt.Sprintf("row %d, %s: margin %s, %s times its uncertainty", r.N, r.Name, r.Margin, in)
}

// RuleSentence says the decision rule in one sentence.
func RuleSentence(r slip.Rule) string {
	k := "k = " + Digits(r.Coverage, 3)
	if r.Coverage == 2 {
		k += ", about 95 %"
	}
	switch r.Decision {
	case "four-way":
		return "Four-way rule, fixed before measuring: a row passes or fails outright only when its value lies at least its expanded uncertainty U (" + k + ") away from the limit; nearer than that it is conditional."
	case "guarded":
		return "Guarded rule, fixed before measuring: a row passes only when its value lies inside the limit by at least its expanded uncertainty U (" + k + "); otherwise it fails."
	case "simple":
		return "Simple rule, fixed before measuring: the value alone is held against the limit; the expanded uncertainty U (" + k + ") is shown and not applied."
	}
	return "Decision rule: " + Clean(r.Decision) + " (" + k + ")."
}

// leaves says what the uncertainties leave out: keys that nobody stated, by
// row.
func leaves(s *slip.Slip) string {
	var keys []string
	rows := map[string][]string{}
	for i, c := range s.Checks {
		for _, k := range c.Unstated {
			k = Clean(k)
			if rows[k] == nil {
				keys = append(keys, k)
			}
			rows[k] = append(rows[k], strconv.Itoa(i+1))
		}
	}
	out := "U covers what the recordings show and what the job states; it does not cover wrong wiring or a wrong take."
	if keys == nil {
		return out
	}
	var parts []string
	for _, k := range keys {
		parts = append(parts, k+" ("+rowList(rows[k])+")")
	}
	return "Stated without an uncertainty, taken as exact: " + strings.Join(parts, ", ") + ". " + out
}

func rowList(n []string) string {
	if len(n) == 1 {
		return "row " + n[0]
	}
	return "rows " + strings.Join(n, ", ")
}
