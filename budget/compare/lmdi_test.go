package compare_test

import (
	"math"
	"slices"
	"testing"

	"github.com/stretchr/testify/assert"
	"pgregory.net/rapid"

	"budgetcheck/budget/compare"
)

// lmdiYears are the four years of the example of Heun & Brockway 2019, Applied
// Energy, SI section S3: rows sub-categories, columns factors.
var lmdiYears = [][][]float64{
	{{1, 10, 2}, {4, 5, 3}}, // 1971
	{{4, 5, 3}, {5, 6, 4}},
	{{8, 2, 4}, {5, 7, 5}},
	{{10, 1, 5}, {6, 8, 6}},
}

// lmdiColumns sums terms over rows.
func lmdiColumns(terms [][]float64) []float64 {
	sums := make([]float64, len(terms[0]))
	for _, row := range terms {
		for k, term := range row {
			sums[k] += term
		}
	}
	return sums
}

func lmdiTotal(rows [][]float64) (sum float64) {
	for _, row := range rows {
		product := 1.0
		for _, x := range row {
			product *= x
		}
		sum += product
	}
	return sum
}

func lmdiSum(terms [][]float64) (sum float64) {
	for _, term := range slices.Concat(terms...) {
		sum += term
	}
	return sum
}

func lmdiInDelta(t assert.TestingT, want, got []float64, delta float64) {
	if assert.Len(t, got, len(want)) {
		for k := range want {
			assert.InDelta(t, want[k], got[k], delta, "factor %d", k)
		}
	}
}

// Heun & Brockway 2019, SI section S3, additive.
func TestLMDIPublished(t *testing.T) {
	for n, want := range [][]float64{
		{69.79006598, -9.455125793, 39.66505981},
		{42.96021467, -34.31902656, 50.3588119},
		{54.01064234, -9.021284671, 54.01064234},
	} {
		lmdiInDelta(t, want, lmdiColumns(compare.LMDI(lmdiYears[n], lmdiYears[n+1])), 5e-8)
	}
	for n, want := range []float64{80, 180, 239, 338} {
		assert.Equal(t, want, lmdiTotal(lmdiYears[n]))
	}
	z := compare.LMDI(lmdiYears[0], lmdiYears[1])
	lmdiInDelta(t, []float64{50.47438029, -25.23719014, 14.76280986}, z[0], 5e-9)
	lmdiInDelta(t, []float64{19.31568569, 15.78206435, 24.90224996}, z[1], 5e-9)
}

// The same source, multiplicative: the additive terms over the logarithmic
// mean of the totals are the logarithms of the multiplicative ones.
func TestLMDIPublishedMultiplicative(t *testing.T) {
	for n, want := range [][]float64{
		{1.761117821, 0.926191306, 1.379410116},
		{1.229284572, 0.847970248, 1.273773912},
		{1.208140223, 0.968911503, 1.208140223},
	} {
		from, to := lmdiTotal(lmdiYears[n]), lmdiTotal(lmdiYears[n+1])
		got := lmdiColumns(compare.LMDI(lmdiYears[n], lmdiYears[n+1]))
		for k := range got {
			got[k] = math.Exp(got[k] * math.Log(to/from) / (to - from))
		}
		lmdiInDelta(t, want, got, 5e-10)
	}
}

// Zero values: Ang, Zhang & Choi 1998, Energy 23(6):489-495, Table 2; Wood &
// Lenzen 2006, Energy Policy 34:1326-1331.
func TestLMDIZeros(t *testing.T) {
	for _, c := range []struct {
		name             string
		base, head, want []float64
	}{
		{"the first example with X0[1,1] = 0", []float64{0, 10, 2}, []float64{4, 5, 3}, []float64{60, 0, 0}},
		{"the first example with XT[2,3] = 0", []float64{4, 5, 3}, []float64{5, 6, 0}, []float64{0, 0, -60}},
		{"x0 = v0 = 0: vT", []float64{3, 0}, []float64{5, 7}, []float64{0, 35}},
		{"xT = vT = 0: -v0", []float64{5, 7}, []float64{0, 3}, []float64{-35, 0}},
		{"both v zero, by one factor", []float64{0, 2}, []float64{0, 9}, []float64{0, 0}},
		{"both v zero, by two", []float64{0, 2}, []float64{9, 0}, []float64{0, 0}},
		{"everything zero", []float64{0, 0}, []float64{0, 0}, []float64{0, 0}},
		// The table alone would count 30 twice.
		{"two factors zero at once", []float64{0, 4, 0}, []float64{2, 5, 3}, []float64{15, 0, 15}},
		{"three, on the other side", []float64{2, 5, 3}, []float64{0, 0, 0}, []float64{-10, -10, -10}},
	} {
		assert.Equal(t, [][]float64{c.want}, compare.LMDI([][]float64{c.base}, [][]float64{c.head}), c.name)
	}
}

// TestLMDINearlyNoChange: a product that stays almost the same while its
// factors move. Dividing the difference by the logarithm of a quotient that
// has lost its digits is wrong by half here.
func TestLMDINearlyNoChange(t *testing.T) {
	for _, nudge := range []float64{0, 0x1p-52, 0x1p-51, 3 * 0x1p-52, 1e-12, 1e-9} {
		for _, sign := range []float64{1, -1} {
			base, head := []float64{3, 8}, []float64{6, 4 * (1 + sign*nudge)}
			terms := compare.LMDI([][]float64{base}, [][]float64{head})[0]
			assert.InEpsilon(t, 24*math.Ln2, terms[0], 1e-8, "nudge %v", sign*nudge)
			assert.InEpsilon(t, -24*math.Ln2, terms[1], 1e-8, "nudge %v", sign*nudge)
			assert.InDelta(t, 24*sign*nudge, terms[0]+terms[1], 1e-13)
		}
	}
}

// TestLMDIFarApart: quotients and products at the ends of what numbers can be.
func TestLMDIFarApart(t *testing.T) {
	terms := compare.LMDI([][]float64{{1e-300, 1}, {1e-200, 1e-200}}, [][]float64{{1e300, 2}, {1, 5}})
	assert.InEpsilon(t, 2e300+5, lmdiSum(terms), 1e-12)
	for _, term := range slices.Concat(terms...) {
		assert.False(t, math.IsNaN(term) || math.IsInf(term, 0), "%v", terms)
	}
}

// lmdiMatrices draws both sides, alike in shape, zeros among them.
func lmdiMatrices(t *rapid.T) (base, head [][]float64) {
	factor := rapid.OneOf(rapid.Float64Range(1e-6, 1e6), rapid.SampledFrom([]float64{0, 1, 2}))
	row := rapid.SliceOfN(factor, 3, 3)
	rows := rapid.IntRange(1, 5).Draw(t, "rows")
	matrix := rapid.SliceOfN(row, rows, rows)
	return matrix.Draw(t, "base"), matrix.Draw(t, "head")
}

func TestLMDIAddsUpAndFlips(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		base, head := lmdiMatrices(t)
		there, back := compare.LMDI(base, head), compare.LMDI(head, base)
		scale := lmdiTotal(base) + lmdiTotal(head)
		assert.InDelta(t, lmdiTotal(head)-lmdiTotal(base), lmdiSum(there), 1e-12*scale)
		for n := range there {
			for k, term := range there[n] {
				assert.Equal(t, term, -back[n][k])
			}
		}
	})
}

// TestLMDIColumns: no factor is privileged by its place, and one that does not
// change causes nothing.
func TestLMDIColumns(t *testing.T) {
	turned := func(rows [][]float64) (out [][]float64) {
		for _, row := range rows {
			out = append(out, []float64{row[2], row[0], row[1]})
		}
		return out
	}
	rapid.Check(t, func(t *rapid.T) {
		base, head := lmdiMatrices(t)
		scale := lmdiTotal(base) + lmdiTotal(head)
		want, got := turned(compare.LMDI(base, head)), compare.LMDI(turned(base), turned(head))
		for n := range want {
			lmdiInDelta(t, want[n], got[n], 1e-12*scale)
		}
		for n, row := range base {
			head[n][1] = row[1]
		}
		for n, row := range compare.LMDI(base, head) {
			assert.Zero(t, row[1], "row %d", n)
		}
	})
}

// TestLMDILimits: zeros replaced by one small number come close to what is
// said of zeros, and closer the smaller it is. The way there is slow, like
// 1/ln.
func TestLMDILimits(t *testing.T) {
	factor := rapid.OneOf(rapid.Float64Range(0.1, 10), rapid.Just(0.0))
	off := func(base, head []float64, small float64) (most float64) {
		near := func(row []float64) [][]float64 {
			row = slices.Clone(row)
			for k := range row {
				row[k] = max(row[k], small)
			}
			return [][]float64{row}
		}
		want, got := compare.LMDI([][]float64{base}, [][]float64{head})[0], compare.LMDI(near(base), near(head))[0]
		for k := range want {
			most = max(most, math.Abs(want[k]-got[k]))
		}
		return most / max(lmdiTotal([][]float64{base}), lmdiTotal([][]float64{head}), 1e-9)
	}
	rapid.Check(t, func(t *rapid.T) {
		base, head := rapid.SliceOfN(factor, 3, 3).Draw(t, "base"), rapid.SliceOfN(factor, 3, 3).Draw(t, "head")
		coarse, fine := off(base, head, 1e-20), off(base, head, 1e-100)
		assert.LessOrEqual(t, fine, 0.05)
		assert.LessOrEqual(t, fine, coarse/3+1e-12)
	})
}
