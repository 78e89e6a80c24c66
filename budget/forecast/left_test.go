package forecast

import (
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"

	"budgetcheck/budget/unit"
)

// clock are moments of March 2031, written like 10T02:15.
func clock(t require.TestingT, texts ...string) (all []unit.Instant) {
	for _, text := range texts {
		all = append(all, at(t, "2031-03-"+text+":00Z"))
	}
	return all
}

func TestLeft(t *testing.T) {
	hours := func(h unit.Duration) *unit.Duration { h *= unit.Hour; return &h }
	firings := clock(t, "01T02:15", "02T02:15", "03T02:15", "04T02:15")
	for name, c := range map[string]struct {
		starts []string
		now    string
		window *unit.Duration
		left   []int // of the firings
	}{
		"all to come":                     {nil, "01T00:00", nil, []int{0, 1, 2, 3}},
		"at the firing":                   {nil, "01T02:15", nil, []int{0, 1, 2, 3}},
		"late, but in its window":         {nil, "02T02:14", nil, []int{0, 1, 2, 3}},
		"its window ends with the next":   {nil, "02T02:15", nil, []int{1, 2, 3}},
		"booked":                          {[]string{"01T02:20"}, "01T03:00", nil, []int{1, 2, 3}},
		"booked at the very firing":       {[]string{"01T02:15"}, "01T02:15", nil, []int{1, 2, 3}},
		"two runs stand for one firing":   {[]string{"01T02:20", "01T05:00"}, "01T06:00", nil, []int{1, 2, 3}},
		"a run before any firing":         {[]string{"01T01:00"}, "01T06:00", nil, []int{0, 1, 2, 3}},
		"one missed, the next booked":     {[]string{"02T02:20"}, "02T03:00", nil, []int{2, 3}},
		"window of 6 h: at its end":       {nil, "01T08:15", hours(6), []int{0, 1, 2, 3}},
		"window of 6 h: passed":           {nil, "01T08:16", hours(6), []int{1, 2, 3}},
		"a run after the window":          {[]string{"01T09:00"}, "01T09:00", hours(6), []int{1, 2, 3}},
		"window of 48 h: both wait":       {nil, "02T03:00", hours(48), []int{0, 1, 2, 3}},
		"the latest is stood for first":   {[]string{"02T02:20"}, "02T03:00", hours(48), []int{0, 2, 3}},
		"then the one before":             {[]string{"02T02:20", "02T02:40"}, "02T03:00", hours(48), []int{2, 3}},
		"a start that is not known yet":   {[]string{"02T02:20"}, "02T02:19", nil, []int{1, 2, 3}},
		"the last waits like the one ago": {nil, "05T02:14", nil, []int{3}},
		"nothing is left":                 {nil, "05T02:15", nil, nil},
	} {
		t.Run(name, func(t *testing.T) {
			var want []unit.Instant
			for _, n := range c.left {
				want = append(want, firings[n])
			}
			assert.Equal(t, want, Left(firings, clock(t, c.starts...), clock(t, c.now)[0], c.window))
		})
	}
	assert.Equal(t, firings[:1], Left(firings[:1], nil, clock(t, "02T02:15")[0], nil), "a single one waits for a day")
	assert.Empty(t, Left(firings[:1], nil, clock(t, "02T02:16")[0], nil))
	assert.Empty(t, Left(nil, firings, firings[0], nil))
}

// plainly reads the rule run by run: the latest firing at or before the start
// without a run, if the start is in its window.
func plainly(firings, ends, starts []unit.Instant, now unit.Instant) (left []unit.Instant) {
	done := map[int]bool{}
	for _, s := range starts {
		for n := len(firings) - 1; n >= 0 && s <= now; n-- {
			if firings[n] <= s && !done[n] {
				done[n] = s <= ends[n]
				break
			}
		}
	}
	for n, f := range firings {
		if !done[n] && now <= ends[n] {
			left = append(left, f)
		}
	}
	return left
}

// TestLeftReadPlainly: also that one run takes away one firing at most.
func TestLeftReadPlainly(t *testing.T) {
	ascending := func(t *rapid.T, what string) (all []unit.Instant) {
		var last unit.Instant
		for _, gap := range rapid.SliceOfN(rapid.Int64Range(1, 30), 0, 12).Draw(t, what) {
			last = last.Add(unit.Duration(gap))
			all = append(all, last)
		}
		return all
	}
	rapid.Check(t, func(t *rapid.T) {
		firings, starts := ascending(t, "firings"), ascending(t, "starts")
		now := unit.Instant(rapid.Int64Range(0, 300).Draw(t, "now"))
		var window *unit.Duration
		if w := unit.Duration(rapid.Int64Range(-1, 60).Draw(t, "window")); w >= 0 {
			window = &w
		}
		got := Left(firings, starts, now, window)
		assert.Equal(t, plainly(firings, ends(firings, window), starts, now), got)
		assert.LessOrEqual(t, len(Left(firings, nil, now, window))-len(got), len(starts))
	})
}

func TestRate(t *testing.T) {
	now := at(t, "2031-03-29T00:00:00Z")
	var starts []unit.Instant
	for n := range 40 { // every second day
		starts = append(starts, now.Add(-unit.Duration(2*n+1)*unit.Day))
	}
	starts = append(starts, now+1)
	assert.Equal(t, Rate{14, 28 * unit.Day}, RateOf(starts, starts[39], now), "four weeks, and nothing that is to come")
	assert.Equal(t, Rate{5, 10 * unit.Day}, RateOf(starts, now.Add(-10*unit.Day), now), "books of ten days")
	assert.Equal(t, Rate{1, unit.Day}, RateOf(starts, now, now), "books that were just opened")
	assert.InEpsilon(t, 5, Rate{14, 28 * unit.Day}.expected(10*unit.Day), 1e-15, "N d/D")
}
