package num

import (
	"fmt"
	"math"
	"math/rand/v2"
	"strconv"
	"strings"
	"testing"
)

// twin is the plain form: the longest prefix that matches the grammar, found
// by trying every length, and strconv for its value.
func twin(s string, mark byte) (v float64, n int) {
	for k := len(s); k > 0; k-- {
		p := s[:k]
		if mark == ',' {
			if strings.Contains(p, ".") {
				continue
			}
			p = strings.Replace(p, ",", ".", 1)
		}
		if strings.Trim(p, "0123456789+-.eE") != "" {
			continue // strconv also takes hexadecimal, inf, nan and underscores
		}
		v, err := strconv.ParseFloat(p, 64)
		if err == nil || math.IsInf(v, 0) {
			return v, k
		}
	}
	return 0, 0
}

func same(t *testing.T, s string, mark byte) {
	t.Helper()
	d, n := Scan([]byte(s), mark)
	v, k := twin(s, mark)
	if n != k || (n > 0 && math.Float64bits(d.V) != math.Float64bits(v)) {
		t.Fatalf("%q, mark %q: got %v from %d bytes, want %v from %d (strconv)", s, mark, d.V, n, v, k)
	}
}

func TestAgainstStrconv(t *testing.T) {
	for _, s := range []string{
		"", "-", "+", ".", "-.", "e5", "0", "-0", "+0.0", "1", "-1", "1.", ".5", "-.5", "1.5e", "1.5e+", "1e5", "1E+005", "1e-005",
		"-00.2464", "+392.3E-06", "1.2345678901234567", "0.30000000000000004", "9007199254740993", "9007199254740992.5",
		"1234567890123456789012", "0.0000000000000000000000000000001", "1e400", "-1e400", "1e-400", "5e-324", "2.4703282292062327e-324",
		"1.7976931348623157e308", "1.7976931348623159e308", "8.5e22", "1e23", "1.0E0", "0e99999999999", "1e99999999999", "1e-99999999999",
		"514.1mV", "-5120us", "1.2.3", "1,234", "12:34:56", "1-2", "0x10", "1_000", "inf", "NaN", "1e5e5", "2.2250738585072011e-308",
		"179769313486231580793728971405303415079934132710037826936173778980444968292764750946649017977587207096330286416692887910946555547851940402630657488671505820681908902000708383676273854845817711531764475730270069855571366959622842914819860834936475292719074168444365510704342711559699508093042880",
	} {
		same(t, s, '.')
		same(t, s, ',')
	}
	r := rand.New(rand.NewPCG(1, 2))
	for range 200000 {
		v := math.Float64frombits(r.Uint64())
		switch r.IntN(4) {
		case 0:
			same(t, strconv.FormatFloat(v, 'g', -1, 64), '.')
		case 1:
			same(t, fmt.Sprintf("%.*e", r.IntN(24), v), '.')
		case 2:
			same(t, fmt.Sprintf("%.*f", r.IntN(12), r.NormFloat64()*math.Pow(10, float64(r.IntN(12)-6))), '.')
		case 3:
			same(t, strings.Replace(fmt.Sprintf("%.*e", r.IntN(18), r.NormFloat64()), ".", ",", 1), ',')
		}
	}
}

func TestPrecisionPrinted(t *testing.T) {
	for _, c := range []struct {
		in           string
		last, digits int
	}{
		{"1.250e-3", -6, 4}, {"0.0010", -4, 2}, {"-00.2464", -4, 4}, {"100", 0, 3}, {"0.000", -3, 0}, {"1.6E-06", -7, 2}, {"12e3", 3, 2},
	} {
		if d, _ := Scan([]byte(c.in), '.'); d.Last != c.last || d.Digits != c.digits {
			t.Errorf("%q: got last %d, digits %d, want %d, %d", c.in, d.Last, d.Digits, c.last, c.digits)
		}
	}
}

func FuzzScan(f *testing.F) {
	for _, s := range []string{"1.5", "-0,25e-3", "1e", "99999999999999999999.9", ".e1", "+.1E+400"} {
		f.Add(s)
	}
	f.Fuzz(func(t *testing.T, s string) {
		if len(s) < 400 {
			same(t, s, '.')
			same(t, s, ',')
		}
	})
}

func BenchmarkScan(b *testing.B) {
	for _, s := range []string{"0.0001234", "-1.23456E-03", "-0.12345678901234567"} {
		b.Run(s, func(b *testing.B) {
			in := []byte(s)
			b.SetBytes(int64(len(in)))
			b.ReportAllocs()
			for b.Loop() {
				Scan(in, '.')
			}
		})
	}
}
