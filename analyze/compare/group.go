package compare

import (
	"math"
	"slices"
	"time"

	"benchslip/analyze/internal/budget"
)

// Group is what three and more values of one check say together.
type Group struct {
	Count    int      `json:"count"` // values
	Mean     *float64 `json:"mean"`
	Spread   *float64 `json:"spread"` // standard deviation, n - 1
	Median   *float64 `json:"median"`
	Outliers []string `json:"outliers"` // labels of slips
	Trend    *Trend   `json:"trend"`    // null with fewer than four dates
}

// Trend is a straight line through values over dates, by least squares.
type Trend struct {
	PerYear     float64 `json:"per_year"` // in the row's unit
	Uncertainty float64 `json:"uncertainty"`
	Significant bool    `json:"significant"`
}

// An outlier lies further than this from the median, in robust standard
// deviations 1.4826 MAD (Iglewicz and Hoaglin, How to Detect and Handle
// Outliers, 1993: 3.5), and by more than its own uncertainty. Fewer than
// leastForOutliers values have no crowd to stand out of.
const (
	outlierAt        = 3.5
	madScale         = 1.4826 // of a normal law: 1/0.6745
	leastForOutliers = 5
	leastForTrend    = 4
)

// groupOf describes the values of the slips whose rows can be compared.
func groupOf(row *Row, in []Input, src []Source) *Group {
	g := &Group{Outliers: []string{}}
	var x, u []float64
	var at []int
	for i, v := range row.Values {
		if v.Value == nil || v.State == Incomparable {
			continue
		}
		x, at = append(x, *v.Value), append(at, i)
		own := 0.0
		if v.Uncertainty != nil {
			own = *v.Uncertainty
		}
		u = append(u, own)
	}
	g.Count = len(x)
	if len(x) == 0 {
		return g
	}
	mean, uMean, _ := budget.TypeA(x)
	median := medianOf(x)
	g.Mean, g.Median = &mean, &median
	if len(x) > 1 {
		s := uMean * math.Sqrt(float64(len(x)))
		g.Spread = &s
	}
	if len(x) >= leastForOutliers {
		dev := make([]float64, len(x))
		for i := range x {
			dev[i] = math.Abs(x[i] - median)
		}
		robust := madScale * medianOf(dev)
		for i := range x {
			if dev[i] > outlierAt*robust && dev[i] > u[i] && dev[i] > 1e-9*math.Abs(median) {
				g.Outliers = append(g.Outliers, src[at[i]].Label)
			}
		}
	}
	var days, y, uy []float64
	for i, k := range at {
		if d, err := time.Parse(time.DateOnly, src[k].Date); err == nil {
			days, y, uy = append(days, float64(d.Unix())/86400), append(y, x[i]), append(uy, u[i])
		}
	}
	g.Trend = trendOf(days, y, uy, in[0].Slip.Rule.Coverage)
	return g
}

func medianOf(x []float64) float64 {
	s := slices.Sorted(slices.Values(x))
	n := len(s)
	return (s[(n-1)/2] + s[n/2]) / 2
}

// daysPerYear is the mean of the calendar.
const daysPerYear = 365.2425

// trendOf fits a line. Its slope's standard uncertainty is the larger of what
// the scatter about the line says (n - 2 degrees of freedom) and what the
// values' own expanded uncertainties u say; significant beyond its expanded
// one. nil with fewer than four values or three dates.
func trendOf(days, y, u []float64, coverage float64) *Trend {
	n := float64(len(days))
	distinct := slices.Compact(slices.Sorted(slices.Values(days)))
	if len(days) < leastForTrend || len(distinct) < 3 {
		return nil
	}
	var md, my float64
	for i := range days {
		md, my = md+days[i]/n, my+y[i]/n
	}
	var sxx, sxy float64
	for i := range days {
		sxx += (days[i] - md) * (days[i] - md)
		sxy += (days[i] - md) * (y[i] - my)
	}
	slope := sxy / sxx
	var left, own float64
	for i := range days {
		r := y[i] - my - slope*(days[i]-md)
		left += r * r
		w := (days[i] - md) * u[i] / coverage
		own += w * w
	}
	scatter := math.Sqrt(left / (n - 2) / sxx)
	U := budget.Coverage(coverage, n-2) * scatter
	if k := coverage * math.Sqrt(own) / sxx; k > U {
		U = k
	}
	t := &Trend{PerYear: slope * daysPerYear, Uncertainty: U * daysPerYear}
	t.Significant = math.Abs(slope) > U*(1+1e-9) && math.Abs(t.PerYear) > 1e-9*math.Abs(my)
	return t
}
