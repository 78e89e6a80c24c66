package unit

import (
	"math"
	"testing"

	"github.com/stretchr/testify/assert"
	"pgregory.net/rapid"
)

// TestSumAgainstNIST: the certified means of NIST StRD, univariate,
// NumAcc1 to NumAcc4 (as given by NIST/SEMATECH; all exact).
func TestSumAgainstNIST(t *testing.T) {
	for _, c := range []struct {
		name  string
		first []Mass
		pair  [2]Mass
		pairs int
		mean  float64
		sum   float64
	}{
		{"NumAcc1", []Mass{10000001, 10000003, 10000002}, [2]Mass{}, 0, 10000002, 30000006},
		{"NumAcc2", []Mass{1.2}, [2]Mass{1.1, 1.3}, 500, 1.2, 1201.2},
		{"NumAcc3", []Mass{1000000.2}, [2]Mass{1000000.1, 1000000.3}, 500, 1000000.2, 1001000200.2},
		{"NumAcc4", []Mass{10000000.2}, [2]Mass{10000000.1, 10000000.3}, 500, 10000000.2, 10010000200.2},
	} {
		var sum Sum[Mass]
		n := 0
		add := func(m Mass) { sum.Add(m); n++ }
		for _, m := range c.first {
			add(m)
		}
		for range c.pairs {
			add(c.pair[0])
			add(c.pair[1])
		}
		// The data are not exact as floats: half a unit in the last place each.
		assert.InEpsilon(t, c.sum, float64(sum.Value()), 1.2e-16, "%s: sum", c.name)
		assert.InEpsilon(t, c.mean, float64(sum.Value())/float64(n), 2.3e-16, "%s: mean", c.name)
	}
}

// TestSumKeepsWhatPlainAdditionLoses: the middle terms are below the last
// figure of the large ones; plain addition gives 0 for both.
func TestSumKeepsWhatPlainAdditionLoses(t *testing.T) {
	for _, terms := range [][]Energy{{1e100, 1, 1, -1e100}, {1, 1e100, 1, -1e100}} {
		var sum Sum[Energy]
		plain := Energy(0)
		for _, term := range terms {
			sum.Add(term)
			plain += term
		}
		assert.Equal(t, Energy(2), sum.Value())
		assert.Equal(t, Energy(0), plain)
	}
}

// TestSumOfManyTerms: a year of samples every two seconds, 0.1 each. Plain
// addition is off by some 1e-10 of it.
func TestSumOfManyTerms(t *testing.T) {
	const n = 365 * 86400 / 2
	var sum Sum[Joules]
	for range n {
		sum.Add(0.1)
	}
	assert.Equal(t, Joules(n*0.1), sum.Value())
}

func TestEmptySum(t *testing.T) {
	var sum Sum[Mass]
	assert.Equal(t, Mass(0), sum.Value())
}

// TestSumHardlyDependsOnOrder: parts and meters may be added in any order.
func TestSumHardlyDependsOnOrder(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		terms := rapid.SliceOfN(rapid.Float64Range(0, 1e9), 1, 50).Draw(t, "terms")
		var forth, back Sum[float64]
		for i := range terms {
			forth.Add(terms[i])
			back.Add(terms[len(terms)-1-i])
		}
		assert.InDelta(t, forth.Value(), back.Value(), math.Abs(forth.Value())*2.3e-16)
	})
}
