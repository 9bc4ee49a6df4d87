package csv

import (
	stdcsv "encoding/csv"
	"strconv"
	"strings"
	"testing"

	"benchslip/analyze/slip"
	"benchslip/report/internal/sample"
)

// The standard library's reader is the independent one.
func read(t *testing.T, s *slip.Slip) [][]string {
	t.Helper()
	var b strings.Builder
	if err := Render(&b, s); err != nil {
		t.Fatal(err)
	}
	if strings.Count(b.String(), "\n") != strings.Count(b.String(), "\r\n") || strings.Count(b.String(), "\r") != strings.Count(b.String(), "\r\n") {
		t.Error("a line does not end in CR LF, or a field holds a line break")
	}
	rows, err := stdcsv.NewReader(strings.NewReader(b.String())).ReadAll() // also holds every row to one width
	if err != nil {
		t.Fatal(err)
	}
	return rows
}

func TestReadsBack(t *testing.T) {
	s := sample.Slip()
	rows := read(t, s)
	if len(rows) != len(s.Checks)+1 {
		t.Fatalf("%d rows for %d checks", len(rows), len(s.Checks))
	}
	col := map[string]int{}
	for i, h := range rows[0] {
		col[h] = i
	}
	for i, c := range s.Checks {
		row := rows[i+1]
		for name, want := range map[string]*float64{"value": c.Value, "uncertainty": c.Uncertainty, "min": c.Min, "max": c.Max, "margin": c.Margin} {
			cell := row[col[name]]
			got, err := strconv.ParseFloat(cell, 64)
			if want == nil != (cell == "") || want != nil && (err != nil || got != *want) {
				t.Errorf("row %d, %s: %q", i+1, name, cell)
			}
		}
		if row[col["verdict"]] != c.Verdict || row[col["unit"]] != c.Unit || row[col["sheet"]] != s.Sheet {
			t.Errorf("row %d: %q", i+1, row)
		}
	}
	if got := rows[9][col["takes"]]; got != "differential g40, common common" {
		t.Errorf("takes %q", got)
	}
}

func TestNoFormulas(t *testing.T) {
	s := &slip.Slip{}
	for _, text := range []string{"=1+1", "+1", "-1", "@x", "\t=1", "\r=1", "  =1", "=\"a\",b", sample.Hostile} {
		s.Checks = append(s.Checks, slip.Check{Name: text, Measure: text, Clause: text, Reason: text, Advice: text, Unit: text, Waiver: &slip.Waiver{By: text}, Unstated: []string{text}})
	}
	for i, row := range read(t, s)[1:] {
		for k, cell := range row {
			if cell = strings.TrimSpace(cell); k > 0 && cell != "" && strings.ContainsAny(cell[:1], "=+-@\t\r") {
				t.Errorf("row %d: a spreadsheet would run %q", i+1, cell)
			}
		}
	}
}
