package forecast

import (
	"testing"

	"github.com/stretchr/testify/assert"
	"pgregory.net/rapid"

	"budgetcheck/budget/grid"
	"budgetcheck/budget/unit"
)

// TestKnown: what is kept of a series says at any moment what reading it up to
// that moment says, holes, cut hours and steps of any length included.
func TestKnown(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		var steps []grid.Interval
		at := epoch
		for range rapid.IntRange(1, 60).Draw(t, "steps") {
			at = at.Add(unit.Duration(rapid.SampledFrom([]int{0, 0, 0, 20, 90, 3000}).Draw(t, "hole")) * unit.Minute)
			to := at.Add(unit.Duration(rapid.SampledFrom([]int{15, 60, 60, 45, 600}).Draw(t, "length")) * unit.Minute)
			steps = append(steps, grid.Interval{From: at, To: to, I: unit.Intensity(rapid.IntRange(1, 900).Draw(t, "i"))})
			at = to
		}
		s := grid.NewSeries("NORTH", grid.Average, grid.Direct, steps)
		var kept Known
		for range 5 {
			now := epoch.Add(unit.Duration(rapid.Int64Range(-100, 2+int64(at.Sub(epoch)/unit.Minute)).Draw(t, "now")) * unit.Minute)
			want, got := asOf(s, now), kept.asOf(s, now)
			if want.end == want.first {
				assert.Equal(t, got.first, got.end)
				continue
			}
			assert.Equal(t, want.end, got.end)
			for hour := want.first; hour < want.end; hour++ {
				assert.InDelta(t, want.at(hour), got.at(hour), 1e-9)
				wantSum, wantN := want.column(hour)
				gotSum, gotN := got.column(hour)
				assert.InDelta(t, wantSum, gotSum, 1e-9)
				assert.Equal(t, wantN, gotN)
			}
		}
	})
}
