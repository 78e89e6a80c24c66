package shift

import (
	"testing"

	"github.com/stretchr/testify/assert"
	"pgregory.net/rapid"

	"budgetcheck/budget/unit"
)

func ptr[T any](v T) *T { return &v }

func efficient(rows []Row) (names []string) {
	for _, r := range rows {
		if r.Efficient {
			names = append(names, r.Site)
		}
	}
	return names
}

func TestSites(t *testing.T) {
	r := Run{Profile: flat(t, 2*unit.Hour), Start: midnight}
	at := func(name string, pue, perKWh, perHour float64, values ...float64) Site {
		return Site{Place: Place{name, series(unit.Hour, values...), pue}, PerKWh: &perKWh, PerHour: &perHour}
	}
	home := at("home", 1.5, 0.2, 1, 400, 400, 100, 100, 100)
	clean := at("clean", 1, 0.4, 1, 100, 100, 100, 100, 100)
	clean.Moves, clean.PerGB = 10, 4
	cheap := at("cheap", 1, 0.1, 1, 500, 500, 500, 500, 500)
	worst := at("worst", 1, 0.5, 1, 500, 500, 500, 500, 500)
	broken := at("broken", 1, 0, 0, 400, hole, 10)
	rows := Sites(r, []Site{home, clean, cheap, worst, broken}, 2*unit.Hour)
	assert.Equal(t, Row{Site: "home", Zone: "NORTH", Total: ptr(unit.Mass(1200)), Best: ptr(unit.Mass(300)), BestStart: ptr(after(2 * unit.Hour)),
		Cost: ptr(0.2*2*1.5 + 2), Efficient: true}, rows[0])
	assert.Equal(t, unit.Mass(240), *rows[1].Best, "200 g and 40 g of moving")
	assert.Equal(t, 10.0, rows[1].Moves)
	assert.Equal(t, []string{"home", "clean", "cheap"}, efficient(rows))
	assert.Nil(t, rows[4].Total)
	assert.Nil(t, rows[4].Best)

	home.PerKWh, home.PerHour = nil, nil
	assert.Equal(t, []string{"clean"}, efficient(Sites(r, []Site{home, clean, cheap, worst}, 2*unit.Hour)), "without a price emissions alone")
	assert.Equal(t, []string{"cheap", "worst"}, efficient(Sites(r, []Site{cheap, {Place: worst.Place}}, 0)), "equals are both efficient")
}

// Each row is either efficient or beaten by an efficient one; no efficient one
// is beaten.
func TestEfficientRowsBeatTheOthers(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		rows := make([]Row, rapid.IntRange(1, 8).Draw(t, "rows"))
		for n := range rows {
			rows[n] = Row{Best: ptr(unit.Mass(rapid.IntRange(1, 5).Draw(t, "g"))), Cost: ptr(float64(rapid.IntRange(1, 5).Draw(t, "cost")))}
		}
		markEfficient(rows)
		for _, row := range rows {
			beaten := false
			for _, o := range rows {
				beats := *o.Best <= *row.Best && *o.Cost <= *row.Cost && (*o.Best < *row.Best || *o.Cost < *row.Cost)
				beaten = beaten || o.Efficient && beats
			}
			assert.Equal(t, row.Efficient, !beaten)
		}
	})
}
