package scopecsv

import "math"

// column is one column of the table as it was read.
type column struct {
	v     []float64      // one value a row; NaN where there is none
	count [prose + 1]int // cells by kind
	lost  []lost         // where and why there is no value, at most maxLost runs

	// Numbers.
	start  int  // line of the first one
	last   int  // power of ten of the finest digit printed
	digits int  // most significant digits printed
	whole  bool // none has decimals

	// Units glued to numbers: "514.1mV".
	glued  int    // how many cells have one
	unit   string // the first; "" for a bare prefix such as "514.1m"
	mixed  int    // line of the first that measures something else; 0: none
	bare   int    // how many numbers other than zero have none while others do
	bareAt int    // line of the first of them

	// Clock cells.
	dates, times int     // how many have a date, a time of day
	q            float64 // finest resolution of a time of day, s

	// Text.
	text   int    // line of the first cell of text; 0: none
	say    string // that text
	varies int    // line of the first text that differs from it; 0: none
	words  bool   // every text is a unit
}

// lost is a run of rows [from, to) without a value.
type lost struct {
	from, to int
	kind     kind
	why      string
	line     int // of row from
}

// take counts a number: the power of ten of its last digit and its digits.
func (k *column) take(last, digits, line int) {
	if k.count[number]++; k.count[number] == 1 {
		k.start = line
	}
	k.last = min(k.last, last)
	k.digits = max(k.digits, digits)
	k.whole = k.whole && last >= 0
}

// lose notes that row n has no value.
func (k *column) lose(n int, kd kind, why string, line int) {
	k.count[kd]++
	i := len(k.lost) - 1
	switch {
	case i >= 0 && k.lost[i].to == n && k.lost[i].kind == kd && k.lost[i].why == why:
		k.lost[i].to++
	case len(k.lost) < maxLost:
		k.lost = append(k.lost, lost{n, n + 1, kd, why, line})
	default:
		k.lost[i].to = n + 1 // too many to keep apart: one run over all of them
	}
}

// storeOdd stores a cell that is no plain number in row n of column k.
func (f *file) storeOdd(k *column, c *cell, n, line int) {
	switch c.kind {
	case number:
		k.storeGlued(c, n, line)
	case clock:
		k.count[clock]++
		f.storeClock(k, c, n)
	case blank:
		k.lose(n, blank, "blank", line)
	case marker:
		k.lose(n, marker, c.why, line)
	case prose:
		k.noteText(c.raw, line)
		k.lose(n, prose, "not a number", line)
	}
}

// storeGlued stores a number that is written in an uncommon way, perhaps with
// a unit behind it. Volts and seconds are scaled to V and s; other units leave
// the number as written.
func (k *column) storeGlued(c *cell, n, line int) {
	factor := 1.0
	if c.unit == "" {
		if k.glued > 0 && c.V != 0 {
			k.noteBare(line)
		}
	} else {
		q, f := unitOf(c.unit)
		p, bare := prefix(c.unit)
		switch {
		case q == volts || q == seconds:
			factor = f
		case bare:
			factor = p
		}
		if k.glued == 0 {
			if !bare {
				k.unit = c.unit
			}
			if k.count[number] > 0 {
				k.bare, k.bareAt = k.count[number], k.start
			}
		} else if first, _ := unitOf(k.unit); !bare && (k.unit == "" || first != q || q == other && c.unit != k.unit) || bare && k.unit != "" {
			if k.mixed == 0 {
				k.mixed = line
			}
		}
		k.glued++
	}
	k.v[n] = scaled(c.V, factor)
	k.take(c.Last+int(math.Round(math.Log10(factor))), c.Digits, line)
}

// noteBare counts a number without a unit in a column where others have one.
func (k *column) noteBare(line int) {
	if k.bare++; k.bareAt == 0 {
		k.bareAt = line
	}
}

// noteText keeps the first text of a column and whether all are units.
func (k *column) noteText(raw []byte, line int) {
	if k.text > 0 && !k.words && k.varies > 0 {
		return
	}
	say := short(words(raw[:min(len(raw), 200)]))
	if k.text == 0 {
		k.text, k.say, k.words = line, say, true
	}
	if say != k.say && k.varies == 0 {
		k.varies = line
	}
	if q, _ := unitOf(say); q == unknown {
		k.words = false
	}
}

// storeClock stores a clock reading in s from midnight before the first date.
func (f *file) storeClock(k *column, c *cell, n int) {
	st := c.stamp
	v := st.s
	if st.hasDate {
		day := st.day(f.monthFirst)
		if f.day0 == 0 {
			f.day0 = day
		}
		v += float64(day-f.day0) * 86400
		k.dates++
	}
	if st.hasTime {
		k.times++
		if k.q == 0 || st.q < k.q {
			k.q = st.q
		}
	}
	k.v[n] = v
}

// scaled multiplies by a factor. A factor of 1/1000 is applied as a division,
// which is rounded once: 514.1 mV becomes the float64 nearest 0.5141.
func scaled(v, factor float64) float64 {
	if factor == 1 {
		return v
	}
	if r := math.Round(1 / factor); math.Abs(r*factor-1) < 1e-15 {
		return v / r
	}
	return v * factor
}
