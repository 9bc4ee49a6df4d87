// Package num reads decimal numbers out of text fast, correctly rounded, and
// says how finely each was printed.
package num

import (
	"math"
	"strconv"
)

// Decimal is what a printed number tells beside its value.
type Decimal struct {
	V      float64 // nearest float64 (ties to even); ±Inf beyond its range
	Last   int     // power of ten of the last digit printed: 1.250e-3 has -6
	Digits int     // digits printed from the first that is not zero; 0 for a zero
}

// maxExponent bounds the exponent that is followed exactly; beyond it every
// value is 0 or infinite whatever the mantissa (which is under a field's
// length of digits).
const maxExponent = 1 << 20

// exact10 are the powers of ten that float64 holds exactly. A mantissa below
// 2^53 multiplied or divided by one of them is rounded once, hence correctly
// (W. D. Clinger, "How to read floating point numbers accurately", PLDI 1990).
var exact10 = [...]float64{1e0, 1e1, 1e2, 1e3, 1e4, 1e5, 1e6, 1e7, 1e8, 1e9, 1e10, 1e11,
	1e12, 1e13, 1e14, 1e15, 1e16, 1e17, 1e18, 1e19, 1e20, 1e21, 1e22}

// Scan reads the longest decimal number at the start of b: an optional sign,
// digits with at most one mark among them, and an optional exponent. mark is
// the decimal mark, '.' or ','. n is the number of bytes read, 0 when b does
// not begin with a number. It allocates only for numbers of more than 15
// digits or far exponents.
func Scan(b []byte, mark byte) (d Decimal, n int) {
	var m uint64 // the first 19 significant digits
	i, sig, frac := 0, 0, 0
	if i < len(b) && (b[i] == '-' || b[i] == '+') {
		i++
	}
	first := i
	for ; i < len(b); i++ {
		c := b[i] - '0'
		if c > 9 {
			break
		}
		if sig < 19 {
			m = m*10 + uint64(c)
		}
		if m != 0 {
			sig++
		}
	}
	any := i > first
	if i < len(b) && b[i] == mark {
		at := i + 1
		for i = at; i < len(b); i++ {
			c := b[i] - '0'
			if c > 9 {
				break
			}
			if sig < 19 {
				m = m*10 + uint64(c)
			}
			if m != 0 {
				sig++
			}
		}
		frac = i - at
		any = any || frac > 0
	}
	if !any {
		return Decimal{}, 0
	}
	exp := 0
	if i < len(b) && b[i]|0x20 == 'e' {
		j, down := i+1, false
		if j < len(b) && (b[j] == '-' || b[j] == '+') {
			down = b[j] == '-'
			j++
		}
		at := j
		for ; j < len(b) && b[j]-'0' <= 9; j++ {
			if exp < maxExponent {
				exp = exp*10 + int(b[j]-'0')
			}
		}
		if j > at {
			i = j
			if down {
				exp = -exp
			}
		} else {
			exp = 0
		}
	}
	last := exp - frac
	d = Decimal{Last: last, Digits: sig}
	if sig <= 19 && m < 1<<53 && last >= -22 && last <= 22 {
		v := float64(m)
		if last < 0 {
			v /= exact10[-last]
		} else {
			v *= exact10[last]
		}
		if b[0] == '-' {
			v = -v
		}
		d.V = v
		return d, i
	}
	d.V = slow(b[:i], mark)
	return d, i
}

// slow leaves the rounding to strconv, which is correct for any length.
func slow(b []byte, mark byte) float64 {
	if mark != '.' {
		p := append([]byte(nil), b...)
		for i := range p {
			if p[i] == mark {
				p[i] = '.'
			}
		}
		b = p
	}
	v, err := strconv.ParseFloat(string(b), 64)
	if err != nil && !math.IsInf(v, 0) {
		return math.NaN() // cannot happen: the grammar above is a subset of strconv's
	}
	return v
}
