package health

import (
	"math"
	"math/bits"
	"slices"
)

// MaxCodes is how many different values of a channel are told apart.
const MaxCodes = 4096

// codes gathers which values a channel uses.
type codes struct {
	table []uint64 // open hash of the bit patterns + 1 seen; 0: empty
	n     int
	full  bool // more than MaxCodes

	grid   bool   // all samples so far are multiples of 2^-31
	or     uint32 // all samples as 32-bit codes, or'ed
	enough uint32 // bits of or that settle the matter: nothing lower can follow
}

func newCodes(validBits int) codes {
	c := codes{table: make([]uint64, 2*MaxCodes), grid: true}
	if validBits > 0 && validBits <= 32 {
		c.enough = 1 << (32 - validBits)
	} else {
		c.enough = 1
	}
	return c
}

func (c *codes) feed(x []float64) {
	if c.grid && c.or&c.enough == 0 {
		c.feedGrid(x)
	}
	if c.full {
		return
	}
	for _, v := range x {
		u := math.Float64bits(v + 0) // -0 becomes +0
		if v-v != 0 {
			continue
		}
		if c.put(u); c.full {
			c.table = nil
			return
		}
	}
}

// feedGrid notes which bits of a 32-bit code are in use.
func (c *codes) feedGrid(x []float64) {
	for _, v := range x {
		if v-v != 0 {
			continue
		}
		s := v * (1 << 31)
		k := int64(s)
		if float64(k) != s {
			c.grid = false
			return
		}
		c.or |= uint32(k)
		if c.or&c.enough != 0 {
			return
		}
	}
}

func (c *codes) put(u uint64) {
	key := u + 1
	i := (u * 0x9E3779B97F4A7C15) >> (64 - 13)
	for c.table[i] != 0 {
		if c.table[i] == key {
			return
		}
		i = (i + 1) & (2*MaxCodes - 1)
	}
	if c.n == MaxCodes {
		c.full = true
		return
	}
	c.table[i] = key
	c.n++
}

// used is the number of bits of a fixed-point code that the samples need, 0
// when they lie on no such grid. (32 less the bits that are always 0.)
func (c *codes) used() int {
	if !c.grid || c.or == 0 {
		return 0
	}
	return 32 - bits.TrailingZeros32(c.or)
}

// values returns the different values in order; nil when there were too many.
func (c *codes) values() []float64 {
	if c.full {
		return nil
	}
	v := make([]float64, 0, c.n)
	for _, key := range c.table {
		if key != 0 {
			v = append(v, math.Float64frombits(key-1))
		}
	}
	slices.Sort(v)
	return v
}

// step is the distance of neighbouring values: the median of their spacings
// where three in four lie within 30 % of it, which digital gain after the
// converter and decimal rounding leave in place. Uneven spacings are no
// steps: a tone in step with the sample rate visits few values, but not even
// ones. Then, and with too many values, it is the lowest bit in use. 0: none
// to be seen.
func (c *codes) step() float64 {
	grid := 0.0
	if used := c.used(); used > 0 {
		grid = math.Ldexp(1, 1-used)
	}
	v := c.values()
	if len(v) < 3 {
		return grid
	}
	d := make([]float64, len(v)-1)
	for i := range d {
		d[i] = v[i+1] - v[i]
	}
	slices.Sort(d)
	mid := d[len(d)/2]
	even := 0
	for _, e := range d {
		if math.Abs(e-mid) <= 0.3*mid {
			even++
		}
	}
	if 4*even < 3*len(d) {
		return grid
	}
	return mid
}
