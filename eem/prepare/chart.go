package prepare

import (
	"math"
	"slices"

	"gonum.org/v1/gonum/stat"
)

// ChartPoint is one value of a quality variable.
type ChartPoint struct {
	Batch, ID, Measured string
	Value               float64
	// Centre, Low and High are what the point is held against while the chart has
	// too few points for limits of its own; NaN where there is none.
	Centre, Low, High float64
}

// Chart is a quality variable over the survey, its points in the order of
// measurement.
type Chart struct {
	Variable, Unit string
	Points         []ChartPoint
	OneSided       bool // only large values are bad: no rules but the plain limit
}

// ChartRow is a point with its limits and what was found of it.
type ChartRow struct {
	ChartPoint
	WarnLow, WarnHigh float64 // NaN where there are only plain limits
	Z                 float64 // standard deviations off the centre, NaN likewise
	Rules             []string
	Broken            bool // beyond a plain limit, or against a rule that rejects
}

// The rules of a control chart: Westgard et al. 1981, Clin. Chem. 27, 493 (from
// memory). Of the two readings of R_4s the one with values on both sides is
// taken, within a batch only; it raises 0.104 % of false alarms a pair, the
// difference above 4 s 0.468 % (computed).
const (
	Rule12s = "1_2s" // beyond 2 s: a warning, and no more
	Rule13s = "1_3s" // beyond 3 s
	Rule22s = "2_2s" // two in a row beyond 2 s on one side
	RuleR4s = "R_4s" // one above +2 s and one below −2 s in one batch
	Rule41s = "4_1s" // four in a row beyond 1 s on one side
	Rule10x = "10_x" // ten in a row on one side of the centre
)

// Judge holds the points against each other where there are fewest or more of
// them (Shewhart's limits, 2 s and 3 s about the mean, and the rules), else
// against their own plain limits.
func (c Chart) Judge(fewest int) []ChartRow {
	rows := make([]ChartRow, len(c.Points))
	v := make([]float64, len(rows))
	for i, p := range c.Points {
		rows[i] = ChartRow{ChartPoint: p, WarnLow: nan, WarnHigh: nan, Z: nan}
		v[i] = p.Value
	}
	mean, s := 0.0, 0.0
	if len(v) > 1 {
		mean, s = stat.MeanStdDev(v, nil)
	}
	if c.OneSided || len(v) < max(fewest, 2) || !(s > 0) {
		for i := range rows {
			r := &rows[i]
			if r.Broken = r.Value < r.Low || r.Value > r.High; r.Broken {
				r.Rules = []string{"limit"}
			}
		}
		return rows
	}
	for i := range rows {
		r := &rows[i]
		r.Centre, r.Low, r.High = mean, mean-3*s, mean+3*s
		r.WarnLow, r.WarnHigh, r.Z = mean-2*s, mean+2*s, (r.Value-mean)/s
	}
	for i := range rows {
		rows[i].Rules = rules(rows, i)
		rows[i].Broken = slices.ContainsFunc(rows[i].Rules, func(r string) bool { return r != Rule12s })
	}
	return rows
}

// rules lists what point i breaks, together with those before it.
func rules(rows []ChartRow, i int) []string {
	var out []string
	z := rows[i].Z
	side := math.Copysign(1, z)
	row := func(n int, beyond float64) bool { // the last n, all on the side of point i
		if i+1 < n {
			return false
		}
		for _, r := range rows[i+1-n : i+1] {
			if r.Z*side <= beyond {
				return false
			}
		}
		return true
	}
	if math.Abs(z) > 2 {
		out = append(out, Rule12s)
	}
	if math.Abs(z) > 3 {
		out = append(out, Rule13s)
	}
	if row(2, 2) {
		out = append(out, Rule22s)
	}
	for k := i - 1; k >= 0 && rows[k].Batch == rows[i].Batch; k-- {
		if math.Abs(z) > 2 && rows[k].Z*side < -2 {
			out = append(out, RuleR4s)
			break
		}
	}
	if row(4, 1) {
		out = append(out, Rule41s)
	}
	if row(10, 0) {
		out = append(out, Rule10x)
	}
	return out
}

// Charts returns the quality variables of the blanks: Raman area and position,
// and how much they glow.
func (s *Survey) Charts() []Chart {
	area := Chart{Variable: "Raman area of a blank", Unit: "counts nm"}
	peak := Chart{Variable: "Raman peak", Unit: "nm"}
	glow := Chart{Variable: "blank level", Unit: "%", OneSided: true}
	drift, shift, level := s.Limit("blank-drift"), s.Limit("wavelength"), s.Limit("blank-level")
	for _, bt := range s.Batches {
		for _, b := range bt.Blanks {
			p := ChartPoint{Batch: bt.Name, ID: b.Row.ID, Measured: b.Row.Measured.Text}
			if b.area > 0 {
				p.Value, p.Centre = b.area, bt.Raman.Area
				p.Low, p.High = p.Centre*(1-drift/100), p.Centre*(1+drift/100)
				area.Points = append(area.Points, p)
			}
			if b.Glow != nil {
				p.Value, p.Centre, p.Low, p.High = b.Glow.Percent, 0, nan, level
				glow.Points = append(glow.Points, p)
			}
		}
		if !math.IsNaN(bt.peakNM) {
			want := bt.wantedPeak()
			peak.Points = append(peak.Points, ChartPoint{Batch: bt.Name, Measured: bt.Day, Value: bt.peakNM,
				Centre: want, Low: want - shift, High: want + shift})
		}
	}
	return slices.DeleteFunc([]Chart{area, peak, glow}, func(c Chart) bool { return len(c.Points) == 0 })
}
