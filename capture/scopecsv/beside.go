package scopecsv

// holdsNumbers says which columns hold numbers or clock times at all, leaving
// out settings that stand beside the samples.
func (a *assembly) holdsNumbers() []bool {
	numeric := make([]bool, a.lay.width)
	for c := range numeric {
		k := a.t.col[c].count
		numeric[c] = k[number]+k[clock] > 0
	}
	a.findKeys()
	a.beside = a.findBeside(numeric)
	for c, is := range a.beside {
		if is {
			numeric[c] = false
		}
	}
	// Notes in a few rows of a long table: a start, an increment, two clocks.
	if a.t.n >= 10 {
		for c, is := range numeric {
			k := a.t.col[c].count
			if n := k[number] + k[clock]; is && (k[clock] > 0 || a.overSetting(c)) && n <= 2 && (k[blank]+k[prose])*5 >= a.t.n*4 && a.atEnds(c) {
				numeric[c] = false
				a.notes = append(a.notes, c)
			}
		}
	}
	return numeric
}

// overSetting says whether a setting's name stands over column c in one of
// the last rows before the samples.
func (a *assembly) overSetting(c int) bool {
	for i := max(0, len(a.lay.pre)-3); i < len(a.lay.pre); i++ {
		if cells := split(a.lay.pre[i].text, a.lay.sep, nil); c < len(cells) && settingWord(words(trimmed(cells[c]))) {
			return true
		}
	}
	return false
}

// atEnds says whether the values of a column all stand in the first three rows
// or the last one.
func (a *assembly) atEnds(c int) bool {
	v := a.t.col[c].v
	for i := 3; i < len(v)-1; i++ {
		if v[i] == v[i] {
			return false
		}
	}
	return true
}

// findBeside finds columns of settings beside the samples: a column of text in
// the first rows only, and the columns up to the next one that goes on.
func (a *assembly) findBeside(numeric []bool) []bool {
	beside := make([]bool, a.lay.width)
	n := a.t.n
	filledTo := make([]int, a.lay.width)
	for c := range filledTo {
		filledTo[c] = a.t.col[c].lastFilled(n)
	}
	for c := 0; c < a.lay.width; c++ {
		k := &a.t.col[c]
		if k.count[prose] == 0 || numeric[c] && k.count[number]*4 > k.count[prose] {
			continue
		}
		end := 0 // row after the last text
		for _, l := range k.lost {
			if l.kind == prose {
				end = l.to
			}
		}
		if end > maxBeside || k.count[prose]*2 < end {
			continue
		}
		if end >= n && !a.keyed[c] {
			continue
		}
		for d := c; d < a.lay.width; d++ {
			kd := &a.t.col[d]
			if d > c && kd.count[number]+kd.count[clock] > 0 && (end < n && filledTo[d] > end || end >= n && d > c+1) {
				break
			}
			if d > c+1 && kd.count[prose] > 0 && a.isKeyColumn(d) {
				break
			}
			beside[d] = true
		}
	}
	return beside
}

// isKeyColumn says whether column c names settings whose values stand to its
// right.
func (a *assembly) isKeyColumn(c int) bool {
	return a.keyed[c] && c+1 < a.lay.width && a.t.col[c+1].count[number] > 0
}

// lastFilled returns the row after the last one with a value.
func (k *column) lastFilled(n int) int {
	end := n
	for i := len(k.lost) - 1; i >= 0 && k.lost[i].to == end; i-- {
		end = k.lost[i].from
	}
	return end
}

// findKeys marks the columns that name a known setting in the first rows.
func (a *assembly) findKeys() {
	a.keyed = make([]bool, a.lay.width)
	a.firstRows(func(_ int, cells [][]byte) {
		for c, b := range cells[:min(len(cells), len(a.keyed))] {
			if !a.keyed[c] && a.t.col[c].count[prose] > 0 && settingWord(words(trimmed(b))) {
				a.keyed[c] = true
			}
		}
	})
}

// readBeside takes the settings that stand beside the samples.
func (a *assembly) readBeside() {
	var keys []int
	for c, is := range a.beside {
		if is && (c == 0 || !a.beside[c-1] || a.isKeyColumn(c)) {
			keys = append(keys, c)
		}
	}
	if len(keys) == 0 {
		return
	}
	a.firstRows(func(line int, cells [][]byte) {
		for i, c := range keys {
			var values []string
			for d := c + 1; d < len(cells) && d < len(a.beside) && a.beside[d] && (i+1 == len(keys) || d < keys[i+1]); d++ {
				if w := words(trimmed(cells[d])); w != "" {
					values = append(values, w)
				}
			}
			if c < len(cells) {
				a.takePair(words(trimmed(cells[c])), values, line)
			}
		}
	})
	a.assume("settings in %s beside the samples", plural(len(keys), "column"))
}

// firstRows splits the first rows of samples again.
func (a *assembly) firstRows(do func(line int, cells [][]byte)) {
	p, line := a.lay.start, a.lay.line
	var cells [][]byte
	for i := 0; i < min(a.t.n, maxBeside) && p < len(a.text); {
		text, next, n := logicalLine(a.text, p)
		if filled(text) {
			cells = split(text, a.lay.sep, cells)
			do(line, cells)
			i++
		}
		p = next
		line += n
	}
}

// maxBeside is the largest number of rows in which settings stand beside the
// samples.
const maxBeside = 64
