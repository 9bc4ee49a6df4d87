package junit

import (
	"encoding/xml"
	"strings"
	"testing"

	"benchslip/analyze/slip"
	"benchslip/report/internal/sample"
)

// read is a reader of its own, by the names that build servers use.
type read struct {
	Suites []struct {
		Tests    int `xml:"tests,attr"`
		Failures int `xml:"failures,attr"`
		Skipped  int `xml:"skipped,attr"`
		Props    []struct {
			Name  string `xml:"name,attr"`
			Value string `xml:"value,attr"`
		} `xml:"properties>property"`
		Cases []struct {
			Name    string `xml:"name,attr"`
			Time    string `xml:"time,attr"`
			Failure *struct {
				Message string `xml:"message,attr"`
			} `xml:"failure"`
			Skipped *struct {
				Message string `xml:"message,attr"`
			} `xml:"skipped"`
		} `xml:"testcase"`
	} `xml:"testsuite"`
}

func TestMapping(t *testing.T) {
	s := sample.Slip()
	s.Checks[4].Reason = strings.Repeat("Ω long reason ", 100)
	var b strings.Builder
	if err := Render(&b, s); err != nil {
		t.Fatal(err)
	}
	var got read
	if err := xml.Unmarshal([]byte(b.String()), &got); err != nil {
		t.Fatal(err)
	}
	u := got.Suites[0]
	if u.Tests != len(s.Checks) || len(u.Cases) != len(s.Checks) {
		t.Fatalf("%d cases for %d checks", len(u.Cases), len(s.Checks))
	}
	fail, skip := 0, 0
	for i, c := range u.Cases {
		want := ""
		switch s.Checks[i].Verdict {
		case slip.Fail:
			want = "failure"
			fail++
		case slip.ConditionalPass, slip.ConditionalFail, slip.NotMeasurable, slip.NotApplicable:
			want = "skipped"
			skip++
		}
		if (c.Failure != nil) != (want == "failure") || (c.Skipped != nil) != (want == "skipped") {
			t.Errorf("case %d (%s): want %q", i+1, s.Checks[i].Verdict, want)
		}
		for _, m := range []*struct {
			Message string `xml:"message,attr"`
		}{c.Failure, c.Skipped} {
			if m != nil && (len(m.Message) >= 500 || m.Message == "") {
				t.Errorf("case %d: message of %d bytes", i+1, len(m.Message))
			}
		}
		if c.Time != "" {
			t.Error("a time, which differs from run to run")
		}
	}
	if u.Failures != fail || u.Skipped != skip || fail != 1 || skip != 6 {
		t.Errorf("%d failures, %d skipped; want %d, %d", u.Failures, u.Skipped, fail, skip)
	}
	if u.Props[0].Name != "verdict" || u.Props[0].Value != s.Verdict {
		t.Errorf("properties %v", u.Props)
	}
	if m := u.Cases[2].Skipped.Message; !strings.Contains(m, "20.45 ± 0.12 dB") || !strings.Contains(m, "19.5 .. 20.5 dB") || !strings.Contains(m, "record 30 s") {
		t.Errorf("message %q", m)
	}
}
