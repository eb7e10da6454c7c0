package merit_test

import (
	"math"
	"slices"
	"strings"
	"testing"

	"gonum.org/v1/gonum/mat"

	"tarnlight/eem"
	"tarnlight/unmix"
	"tarnlight/unmix/merit"
)

// NIST StRD, analysis of variance, data set SiRstv (resistivity of silicon, five
// instruments): certified mean squares between 1.27865654000000E-02 and within
// 1.08318280000000E-02.
func TestRepeatsSiRstv(t *testing.T) {
	batches := [][]float64{
		{196.3052, 196.1240, 196.1890, 196.2569, 196.3403},
		{196.3042, 196.3825, 196.1669, 196.3257, 196.0422},
		{196.1303, 196.2005, 196.2889, 196.0343, 196.1811},
		{196.2795, 196.1748, 196.1494, 196.1485, 195.9885},
		{196.2119, 196.1051, 196.1850, 196.0052, 196.2090},
	}
	const between, within = 1.27865654e-2, 1.08318280e-2
	r := merit.RepeatsOf(batches)
	if r.N != 25 || r.Batches != 5 {
		t.Errorf("%+v", r)
	}
	near(t, "within", r.Within*r.Within, within, 1e-9)
	near(t, "between", r.Between*r.Between, (between-within)/5, 1e-8)
	near(t, "total", r.Total*r.Total, between/5+0.8*within, 1e-9)
	near(t, "all", r.SD*r.SD, (4*between+20*within)/24, 1e-9)
	near(t, "ν", r.DF, math.Pow(between/5+0.8*within, 2)/(math.Pow(between/5, 2)/4+math.Pow(0.8*within, 2)/20), 1e-8)
}

// Batches of unlike size: the batch size that counts is (N − Σn²/N)/(k − 1); and
// what cannot be told is NaN.
func TestRepeatsUnbalanced(t *testing.T) {
	r := merit.RepeatsOf([][]float64{{1, 2, 3}, {5}, nil})
	size := 4 - 10.0/4
	near(t, "within", r.Within, 1, 1e-12)
	near(t, "between", r.Between, math.Sqrt((6.75-1)/size), 1e-12) // 3·0.75² + 2.25²
	one := merit.RepeatsOf([][]float64{{1, 2, 4}})
	if one.Between == one.Between || one.Total != one.SD || one.DF != 2 {
		t.Errorf("one batch: %+v", one)
	}
	each := merit.RepeatsOf([][]float64{{1}, {2}, {4}})
	if each.Within == each.Within || each.Between == each.Between || each.Total != each.SD {
		t.Errorf("one a batch: %+v", each)
	}
	if none := merit.RepeatsOf(nil); none.N != 0 || none.SD == none.SD {
		t.Errorf("nothing: %+v", none)
	}
}

// MDL = t(n−1, 0.99)·s: the values of t of 40 CFR 136, appendix B, and Currie's
// factors for a known standard deviation.
func TestStudyFactors(t *testing.T) {
	var in struct{ N []int }
	var want struct{ T []float64 }
	checks(t, "merit", "SEC-6.1-mdl", &in, &want)
	for i, n := range in.N {
		near(t, "t", merit.MDL(1, n), want.T[i], 1e-8) // gonum's quantile is 2e-9 off at 8 degrees of freedom
		v := make([]float64, n)                        // of standard deviation 1 about 5
		for k := range v {
			v[k] = 5 + float64(1-2*(k%2))
		}
		s := merit.RepeatsOf([][]float64{v}).SD
		b := merit.FromReplicates("L1", 5, [][]float64{v})
		if b[1].Form != merit.FormMDL || b[1].Refused != "" {
			t.Fatalf("%+v", b[1])
		}
		near(t, "MDL", b[1].Detection, want.T[i]*s, 1e-8)
	}
	var currie struct {
		C float64 `json:"L_C"`
		D float64 `json:"L_D"`
		Q float64 `json:"L_Q"`
		P float64 `json:"paired_L_D"`
	}
	checks(t, "merit", "SEC-6.1-currie", nil, &currie)
	l := merit.Currie(2)
	near(t, "L_C", l.Critical, 2*currie.C, 1e-12)
	near(t, "L_D", l.Detection, 2*currie.D, 1e-12)
	near(t, "L_Q", l.Quantification, 2*currie.Q, 1e-12)
	// One blank subtracted, very many of them known: the paired form.
	var many [][]float64
	for range 4000 {
		many = append(many, []float64{1, -1})
	}
	b := merit.FromBlanks("blanks", many, 1)[0]
	near(t, "paired", b.Detection, math.Sqrt2*currie.P, 1e-3) // s = √2; δ at 4,000 degrees of freedom
}

// ISO 11843-2 worked through; K = 2 there.
func TestISOWorked(t *testing.T) {
	var in struct {
		X, Y []float64
		K    int
	}
	var want struct {
		SD float64 `json:"residual_sd"`
		YC float64 `json:"y_c"`
		XC float64 `json:"x_c"`
		XD float64 `json:"x_d"`
	}
	checks(t, "merit", "SEC-6.2-calibration", &in, &want)
	got := merit.ISO11843(in.X, in.Y, in.K)
	near(t, "s", got.SD, want.SD, 1e-10)
	near(t, "y_c", got.Response, want.YC, 1e-7)
	near(t, "x_c", got.Critical, want.XC, 1e-7)
	near(t, "x_d", got.Detectable, want.XD, 1e-7)
	b := merit.FromStandards(in.X, in.Y, 3)
	one := merit.ISO11843(in.X, in.Y, 1)
	if b.Detection != one.Detectable || b.N != 10 || !strings.Contains(b.Refused, "times the limit") { // 8 against 0.38
		t.Errorf("%+v", b)
	}
	low := merit.FromStandards([]float64{0, 1, 2, 3}, []float64{0.3, 0.8, 2.2, 2.9}, 3)
	if low.Refused != "" || !(low.Detection > low.Critical) {
		t.Errorf("low standards: %+v", low)
	}
}

// What is refused, and why.
func TestStudyRefuses(t *testing.T) {
	days := func(v ...float64) [][]float64 {
		return [][]float64{v[:len(v)/3], v[len(v)/3 : 2*len(v)/3], v[2*len(v)/3:]}
	}
	good := days(1, 1.2, 0.9, 1.1, 0.8, 1, 1.3, 0.9)
	for _, c := range []struct {
		got  merit.Basis
		want string
	}{
		{merit.FromReplicates("L", 1, good)[0], ""},
		{merit.FromReplicates("L", 1, days(1, 1.2, 0.9, 1.1, 0.8, 1))[0], "6 replicates; at least 7"},
		{merit.FromReplicates("L", 1, days(1, 1.2, 0, 1.1, 0.8, 1, 0, 0.9))[0], "in 2 of 8 replicates none"},
		{merit.FromReplicates("L", 9, days(9, 9.2, 8.9, 9.1, 8.8, 9, 9.3, 8.9))[0], "their level, 9.03, is 18 times the limit"},
		{merit.FromBlanks("field blanks", days(0.1, -0.1, 0.2), 0)[0], "3 blanks; at least 7"},
		{merit.FromBlanks("blanks", [][]float64{{1}, {2}, {3}, {4}, {5}, {6}, {7}}, 1)[0], "no two blanks of one batch"},
		{merit.FromStandards([]float64{0, 1}, []float64{0, 1}, 1), "2 levels of standards"},
		{merit.FromStandards([]float64{1, 2, 3}, []float64{3, 2, 1}, 1), "does not grow"},
	} {
		if (c.want == "") != (c.got.Refused == "") || !strings.Contains(c.got.Refused, c.want) {
			t.Errorf("%q, want %q", c.got.Refused, c.want)
		}
	}
	one := merit.FromReplicates("L", 1, [][]float64{slices.Concat(good...)})
	if one[0].Refused != "" || !strings.Contains(one[0].Remark, "from 1 batches") {
		t.Errorf("one batch: %q %q", one[0].Refused, one[0].Remark)
	}
}

// Blanks that are handled like a sample lift the limits by their mean where it is
// above zero (40 CFR 136, appendix B); those that were subtracted count by their
// scatter within a batch, √(1 + 1/m) of it.
func TestStudyBlanks(t *testing.T) {
	v := []float64{0.4, 0.6, 0.5, 0.7, 0.3, 0.5, 0.5, 0.5}
	r := merit.RepeatsOf([][]float64{v[:4], v[4:]})
	b := merit.FromBlanks("field blanks", [][]float64{v[:4], v[4:]}, 0)
	near(t, "MDL", b[1].Detection, 0.5+2.9979515668685277*r.SD, 1e-9)
	near(t, "critical", b[0].Critical, 0.5+merit.TQuantile(0.95, r.DF)*r.Total, 1e-12)
	own := merit.FromBlanks("blanks", [][]float64{{-1, 1}, {-2, 2}, {0, 0}, {-1, 1}}, 2)
	s := math.Sqrt(12.0/4) * math.Sqrt(1.5) // 4 degrees of freedom
	near(t, "critical", own[0].Critical, merit.TQuantile(0.95, 4)*s, 1e-12)
	near(t, "detection", own[0].Detection, 4.067275634663534*s, 1e-7) // δ(4), CHK-6b
	near(t, "MDL", own[1].Critical, merit.TQuantile(0.99, 4)*s, 1e-12)
}

// Signed is plain least squares on the cells present, against gonum's QR.
func TestSigned(t *testing.T) {
	c, set := mixture([][]float64{{0, 0}, {1, 0.2}}, []float64{430, 440}, 0.05, 9)
	c.Why[3], c.X[7] = eem.NotMeasured, math.NaN()
	a, cells := set.Matrix()
	for i, got := range merit.Signed(c, set, []int{0, 1}) {
		var rows, rhs []float64
		for l, cell := range cells {
			if v := c.Sample(i)[cell]; c.SampleWhy(i)[cell] == eem.Measured && v == v {
				rows, rhs = append(rows, a[l*2:l*2+2]...), append(rhs, v)
			}
		}
		var x mat.VecDense
		if err := x.SolveVec(mat.NewDense(len(rhs), 2, rows), mat.NewVecDense(len(rhs), rhs)); err != nil {
			t.Fatal(err)
		}
		for f := range got {
			near(t, "x", got[f], x.AtVec(f), 1e-9)
		}
	}
	dark := &unmix.Set{Grid: set.Grid, Unit: set.Unit, Components: slices.Repeat(set.Components[:1], 2)}
	if v := merit.Signed(c, dark, []int{0})[0]; v[0] == v[0] {
		t.Errorf("one component twice: %v", v)
	}
}
