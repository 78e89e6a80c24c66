package forecast

import (
	"slices"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"

	"budgetcheck/budget/grid"
	"budgetcheck/budget/unit"
)

// drawnBudget has one to four jobs in two zones, some without a schedule, on
// some day of March, with 20 to 250 days of a series of steps of six hours.
func drawnBudget(t *rapid.T) Budget[unit.Mass] {
	p := march(t)
	b := Budget[unit.Mass]{Period: p, Now: p.From.Add(unit.Duration(rapid.IntRange(0, 31*24-1).Draw(t, "hours gone")) * unit.Hour),
		Spent: unit.Mass(rapid.Float64Range(0, 1e4).Draw(t, "spent")), Limit: unit.Mass(rapid.Float64Range(1, 1e5).Draw(t, "limit"))}
	zones := []*grid.Series{drawnSeries(t, b.Now), drawnSeries(t, b.Now)}
	for n := range rapid.IntRange(1, 4).Draw(t, "jobs") {
		i := rapid.IntRange(0, 1).Draw(t, "zone")
		j := Job{Name: string(rune('a' + n)), Zone: []string{"NORTH", "SOUTH"}[i], Series: zones[i], Ratio: rapid.Float64Range(-0.5, 1).Draw(t, "ratio"),
			Past: past(b.Now, 400, 0, rapid.SliceOfN(rapid.Float64Range(1, 20), 2, 40).Draw(t, "kWh")...)}
		if rapid.Bool().Draw(t, "scheduled") {
			j.Left = nightly(t, b.Now, p.To)
		} else {
			j.Rate = &Rate{rapid.IntRange(0, 40).Draw(t, "runs"), 28 * unit.Day}
		}
		b.Jobs = append(b.Jobs, j)
	}
	return b
}

func drawnSeries(t *rapid.T, now unit.Instant) *grid.Series {
	days := rapid.IntRange(20, 250).Draw(t, "days")
	values := make([]float64, 4*(days+10)) // goes on after now
	state := rapid.Uint32().Draw(t, "seed")
	for n := range values {
		state = state*1664525 + 1013904223
		values[n] = 100 + float64(state>>24)
	}
	return series(now.Add(-unit.Duration(days)*unit.Day), 6*unit.Hour, values...)
}

// changed is the budget with its series changed.
func changed(b Budget[unit.Mass], how func(grid.Interval) grid.Interval) Budget[unit.Mass] {
	b.Jobs = slices.Clone(b.Jobs)
	for n, j := range b.Jobs {
		var steps []grid.Interval
		for _, s := range j.Series.Steps() {
			steps = append(steps, how(s))
		}
		b.Jobs[n].Series = grid.NewSeries(j.Series.Zone, j.Series.Factor, j.Series.Boundary, steps)
	}
	return b
}

// TestLandingSeesNoFuture: what the series says of the time after now changes
// nothing.
func TestLandingSeesNoFuture(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		b := drawnBudget(t)
		other := changed(b, func(s grid.Interval) grid.Interval {
			if s.From >= b.Now {
				s.I *= 7
			}
			return s
		})
		assert.Equal(t, LandMass(b), LandMass(other))
	})
}

// TestLandingScales: twice the intensity is twice the mass that is to come, with
// the same relative doubt.
func TestLandingScales(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		b := drawnBudget(t)
		b.Spent = 0
		twice := changed(b, func(s grid.Interval) grid.Interval { s.I *= 2; return s })
		for n := range twice.Jobs {
			twice.Jobs[n].Past = slices.Clone(b.Jobs[n].Past)
			for k := range twice.Jobs[n].Past {
				twice.Jobs[n].Past[k].Total *= 2
			}
		}
		one, two := LandMass(b), LandMass(twice)
		assert.InDelta(t, 2*float64(*one.Expected), float64(*two.Expected), 1e-9*float64(*two.Expected))
		assert.InDelta(t, 2*float64(one.U), float64(two.U), 1e-9*float64(two.U))
	})
}

// TestLandingHoldsTogether: the interval holds the expected value and does not
// take back what is spent; terms add up; the order of jobs does not matter; the
// limit runs out exactly if the expected total is above it.
func TestLandingHoldsTogether(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		b := drawnBudget(t)
		l := LandMass(b)
		require.NotNil(t, l.Low)
		assert.True(t, b.Spent <= *l.Low && *l.Low <= *l.Expected && *l.Expected <= *l.High, "%v %v %v %v", b.Spent, *l.Low, *l.Expected, *l.High)
		sum, left := b.Spent, 0.0
		for _, term := range l.Terms {
			sum += term.Expected
			left += term.RunsLeft
		}
		assert.InDelta(t, float64(*l.Expected), float64(sum), 1e-9*float64(sum))
		assert.InDelta(t, l.RunsLeft, left, 1e-9)
		assert.Equal(t, *l.Expected > b.Limit, l.RunsOutOn != nil)

		slices.Reverse(b.Jobs)
		back := LandMass(b)
		assert.InDelta(t, float64(*l.High), float64(*back.High), 1e-9*float64(*l.High))
		assert.Equal(t, l.RunsOutOn, back.RunsOutOn)
	})
}
