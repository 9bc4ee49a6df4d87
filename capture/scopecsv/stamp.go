package scopecsv

import (
	"bytes"
	"math"
	"strings"
)

// stamp is a clock reading: a date, a time of day, or both.
type stamp struct {
	hasDate, hasTime bool
	y, m, d          int  // date as read; with slashes m and d as month-first
	slashes          bool // m and d may stand the other way round
	s                float64
	q                float64 // what one unit of the last place read is worth in s
}

// readStamp reads the common ways to write clock time. Dates: 2026-12-31,
// 2026/12/31, 31.12.2026, 12/31/2026 or 31/12/2026, 31-Dec-2026. Times:
// 23:59:59, with a fraction after '.', ',' or a third colon, with AM or PM,
// 59:59.9 as minutes and seconds, 23:59. Between date and time a blank or T;
// behind the time Z or a zone, which is not applied.
func readStamp(b []byte) (stamp, bool) {
	var st stamp
	if len(b) < 4 || len(b) > 40 {
		return st, false
	}
	rest, ok := st.readDate(b)
	if ok {
		if len(rest) == 0 {
			return st, true
		}
		if rest[0] != ' ' && rest[0] != 'T' && rest[0] != 't' && rest[0] != '_' && rest[0] != '-' {
			return st, false
		}
		rest = bytes.TrimLeft(rest[1:], " -")
	}
	return st, st.readTime(rest)
}

// day counts days on one scale (Rata Die of the proleptic Gregorian calendar;
// the count used by Richards, "Mapping Time", 1998).
func (st stamp) day(monthFirst bool) int {
	y, m, d := st.y, st.m, st.d
	if st.slashes && !monthFirst {
		m, d = d, m
	}
	if m < 3 {
		y--
		m += 12
	}
	return 365*y + y/4 - y/100 + y/400 + (153*(m-3)+2)/5 + d
}

func digits(b []byte) (v, n int) {
	for n < len(b) && n < 9 && b[n]-'0' <= 9 {
		v = v*10 + int(b[n]-'0')
		n++
	}
	return v, n
}

func (st *stamp) readDate(b []byte) (rest []byte, ok bool) {
	a, n := digits(b)
	if n == 0 || n >= len(b) {
		return b, false
	}
	sep := b[n]
	if sep != '-' && sep != '/' && sep != '.' && sep != ' ' {
		return b, false
	}
	p := b[n+1:]
	if m, k := monthName(p); k > 0 && n <= 2 { // 31-Dec-2026
		p = p[k:]
		if len(p) < 2 || p[0] != sep {
			return b, false
		}
		y, k := digits(p[1:])
		if k != 2 && k != 4 || !st.set(y, m, a) {
			return b, false
		}
		return p[1+k:], true
	}
	if sep == ' ' {
		return b, false
	}
	m, k := digits(p)
	if k == 0 || k > 2 || k >= len(p) || p[k] != sep {
		return b, false
	}
	p = p[k+1:]
	d, k := digits(p)
	if k == 0 {
		return b, false
	}
	rest = p[k:]
	switch {
	case n == 4 && k <= 2: // 2026-12-31
		ok = st.set(a, m, d)
	case n <= 2 && (k == 4 || k == 2) && sep == '.': // 31.12.2026
		ok = st.set(d, m, a)
	case n <= 2 && (k == 4 || k == 2): // 12/31/2026 or 31/12/2026
		st.slashes = true
		ok = st.set(d, a, m) || st.set(d, m, a)
		st.m, st.d = a, m
	}
	if !ok {
		*st = stamp{}
		return b, false
	}
	return rest, true
}

// set takes a date whose month and day can be.
func (st *stamp) set(y, m, d int) bool {
	if y < 100 {
		y += 2000
	}
	if m < 1 || m > 12 || d < 1 || d > 31 || y > 9999 {
		return false
	}
	st.y, st.m, st.d, st.hasDate = y, m, d, true
	return true
}

func monthName(b []byte) (m, n int) {
	if len(b) < 3 {
		return 0, 0
	}
	i := strings.Index("janfebmaraprmayjunjulaugsepoctnovdec", strings.ToLower(string(b[:3])))
	if i < 0 || i%3 != 0 {
		return 0, 0
	}
	for n = 3; n < len(b) && (b[n]|0x20 >= 'a' && b[n]|0x20 <= 'z'); n++ {
	}
	return i/3 + 1, n
}

func (st *stamp) readTime(b []byte) bool {
	neg := false
	if len(b) > 0 && (b[0] == '-' || b[0] == '+') && !st.hasDate {
		neg = b[0] == '-'
		b = b[1:]
	}
	h, n := digits(b)
	if n == 0 || n > 5 || n >= len(b) || b[n] != ':' {
		return false
	}
	b = b[n+1:]
	m, n := digits(b)
	if n != 2 {
		return false
	}
	b = b[n:]
	var whole int
	st.q = 1
	frac := 0.0
	switch {
	case len(b) > 0 && b[0] == ':':
		s, n := digits(b[1:])
		if n != 2 || s > 60 || m > 59 {
			return false
		}
		whole = h*3600 + m*60 + s
		b = b[1+n:]
		if len(b) > 1 && (b[0] == '.' || b[0] == ',' || b[0] == ':') && b[1]-'0' <= 9 {
			var k int
			frac, k = fraction(b[1:])
			st.q = place(k)
			b = b[1+k:]
		}
	case len(b) > 1 && b[0] == '.' && b[1]-'0' <= 9: // minutes and seconds
		if m > 59 {
			return false
		}
		whole = h*60 + m
		var k int
		frac, k = fraction(b[1:])
		st.q = place(k)
		b = b[1+k:]
	default: // hours and minutes
		if m > 59 {
			return false
		}
		whole = h*3600 + m*60
		st.q = 60
	}
	tail := strings.ToLower(strings.TrimSpace(string(b)))
	switch tail {
	case "", "z", "utc", "gmt":
	case "am", "a.m.", "pm", "p.m.":
		if h < 1 || h > 12 {
			return false
		}
		if h == 12 {
			whole -= 12 * 3600
		}
		if tail[0] == 'p' {
			whole += 12 * 3600
		}
	default:
		if tail[0] != '+' && tail[0] != '-' || strings.Trim(tail[1:], "0123456789:") != "" || len(tail) > 6 {
			return false
		}
	}
	st.s = float64(whole) + frac
	if neg {
		st.s = -st.s
	}
	st.hasTime = true
	return true
}

// fraction reads digits behind the mark, correct to float64 for up to 15.
func fraction(b []byte) (v float64, n int) {
	m, scale := 0.0, 1.0
	for n < len(b) && b[n]-'0' <= 9 {
		if n < 15 {
			m = m*10 + float64(b[n]-'0')
			scale *= 10
		}
		n++
	}
	return m / scale, n
}

// place is the worth of the k-th decimal.
func place(k int) float64 { return math.Pow10(-k) }
