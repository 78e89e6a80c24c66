package forecast

import (
	"math"
	"testing"
	"time"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"

	"budgetcheck/budget/unit"
)

var kinds = []string{"day", "week", "month", "quarter", "year"}

// zones have whole, half and three-quarter hours, clocks that change by an hour
// or by half of one, at midnight or around it, and a day that is missing.
var zones = []string{"UTC", "Europe/Berlin", "America/New_York", "America/Sao_Paulo", "Africa/Cairo", "America/Havana", "America/St_Johns",
	"Asia/Kolkata", "Asia/Kathmandu", "Australia/Lord_Howe", "Pacific/Chatham", "Pacific/Apia", "Asia/Beirut", "America/Asuncion"}

func TestPeriods(t *testing.T) {
	for _, c := range []struct{ per, zone, at, name, from, to string }{
		{"day", "UTC", "2031-03-10T00:00:00Z", "2031-03-10", "2031-03-10T00:00:00Z", "2031-03-11T00:00:00Z"},
		{"day", "UTC", "2031-03-10T23:59:59.999999999Z", "2031-03-10", "2031-03-10T00:00:00Z", "2031-03-11T00:00:00Z"},
		{"week", "UTC", "2031-03-16T23:00:00Z", "2031-W11", "2031-03-10T00:00:00Z", "2031-03-17T00:00:00Z"},
		{"month", "UTC", "2032-02-29T12:00:00Z", "2032-02", "2032-02-01T00:00:00Z", "2032-03-01T00:00:00Z"},
		{"quarter", "UTC", "2031-12-31T12:00:00Z", "2031-Q4", "2031-10-01T00:00:00Z", "2032-01-01T00:00:00Z"},
		{"quarter", "UTC", "2031-04-01T00:00:00Z", "2031-Q2", "2031-04-01T00:00:00Z", "2031-07-01T00:00:00Z"},
		{"year", "UTC", "2031-07-01T00:00:00Z", "2031", "2031-01-01T00:00:00Z", "2032-01-01T00:00:00Z"},
		{"month", "Asia/Kathmandu", "2031-02-28T18:15:00Z", "2031-03", "2031-02-28T18:15:00Z", "2031-03-31T18:15:00Z"},
		{"day", "Asia/Kolkata", "2031-03-09T18:30:00Z", "2031-03-10", "2031-03-09T18:30:00Z", "2031-03-10T18:30:00Z"},
		{"day", "America/New_York", "2031-03-01T02:00:00Z", "2031-02-28", "2031-02-28T05:00:00Z", "2031-03-01T05:00:00Z"},
		// ISO 8601: week 1 holds January 4; 2026 starts on a Thursday and has 53 weeks.
		{"week", "UTC", "2027-01-03T12:00:00Z", "2026-W53", "2026-12-28T00:00:00Z", "2027-01-04T00:00:00Z"},
		{"week", "UTC", "2030-12-30T00:00:00Z", "2031-W01", "2030-12-30T00:00:00Z", "2031-01-06T00:00:00Z"},
		// Midnight is skipped: at 00:00 clocks show 01:00.
		{"day", "America/Sao_Paulo", "2018-11-04T12:00:00Z", "2018-11-04", "2018-11-04T03:00:00Z", "2018-11-05T02:00:00Z"},
		{"day", "America/Sao_Paulo", "2018-11-04T02:59:59Z", "2018-11-03", "2018-11-03T03:00:00Z", "2018-11-04T03:00:00Z"},
		{"day", "Africa/Cairo", "2024-04-26T12:00:00Z", "2024-04-26", "2024-04-25T22:00:00Z", "2024-04-26T21:00:00Z"},
		// Midnight comes twice: at 01:00 clocks show 00:00 again.
		{"day", "America/Havana", "2023-11-05T04:30:00Z", "2023-11-05", "2023-11-05T04:00:00Z", "2023-11-06T05:00:00Z"},
		// At 00:01 clocks show 23:01 of the day before, which stays over.
		{"day", "America/St_Johns", "2010-11-07T03:00:00Z", "2010-11-07", "2010-11-07T02:30:00Z", "2010-11-08T03:30:00Z"},
		// The last day of a leap year, which the time zone rules of the library end early.
		{"day", "Europe/Berlin", "2040-12-31T12:00:00Z", "2040-12-31", "2040-12-30T23:00:00Z", "2040-12-31T23:00:00Z"},
		{"year", "Australia/Lord_Howe", "2040-12-31T12:59:59Z", "2040", "2039-12-31T13:00:00Z", "2040-12-31T13:00:00Z"},
		{"month", "America/New_York", "2041-01-01T04:59:59Z", "2040-12", "2040-12-01T05:00:00Z", "2041-01-01T05:00:00Z"},
		// There was no December 30, 2011 in Samoa.
		{"day", "Pacific/Apia", "2011-12-30T09:59:59Z", "2011-12-29", "2011-12-29T10:00:00Z", "2011-12-30T10:00:00Z"},
		{"day", "Pacific/Apia", "2011-12-30T10:00:00Z", "2011-12-31", "2011-12-30T10:00:00Z", "2011-12-31T10:00:00Z"},
	} {
		got, err := Holding(c.per, at(t, c.at), zone(t, c.zone))
		require.NoError(t, err)
		assert.Equal(t, Period{c.per, c.name, at(t, c.from), at(t, c.to)}, got, "%s of %s, %s", c.per, c.at, c.zone)
	}
}

// TestLengthsOfDays: the days on which clocks change, by the zones' laws: in the
// European Union the last Sundays of March and October; on Lord Howe Island the
// first Sundays of April and October, by half an hour.
func TestLengthsOfDays(t *testing.T) {
	for _, c := range []struct {
		zone, at string
		hours    float64
	}{
		{"Europe/Berlin", "2031-03-30T12:00:00Z", 23},
		{"Europe/Berlin", "2031-10-26T12:00:00Z", 25},
		{"Europe/Berlin", "2031-10-25T12:00:00Z", 24},
		{"America/Sao_Paulo", "2018-02-17T12:00:00Z", 25},
		{"Africa/Cairo", "2024-10-31T12:00:00Z", 25},
		{"Australia/Lord_Howe", "2031-10-05T00:00:00Z", 23.5},
		{"Australia/Lord_Howe", "2031-04-06T00:00:00Z", 24.5},
	} {
		p, err := Holding("day", at(t, c.at), zone(t, c.zone))
		require.NoError(t, err)
		assert.Equal(t, c.hours, p.Days()*24, "%s in %s", p.Name, c.zone)
	}
}

// drawn is a zone and a moment, often near a change of the clocks.
func drawn(t *rapid.T) (*time.Location, unit.Instant) {
	in := zone(t, rapid.SampledFrom(zones).Draw(t, "zone"))
	first, last := at(t, "1975-01-01T00:00:00Z"), at(t, "2060-01-01T00:00:00Z")
	i := unit.Instant(rapid.Int64Range(int64(first), int64(last)).Draw(t, "at"))
	if _, change := i.Time().In(in).ZoneBounds(); !change.IsZero() && rapid.Bool().Draw(t, "near a change") {
		i = unit.At(change).Add(unit.Duration(rapid.Int64Range(-int64(unit.Day), int64(unit.Day)).Draw(t, "off")))
	}
	return in, i
}

// TestPeriodsTileTime: every moment lies in one period of a kind, the next one
// starts where it ends, and all its moments give the same period.
func TestPeriodsTileTime(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		in, i := drawn(t)
		per := rapid.SampledFrom(kinds).Draw(t, "per")
		p, err := Holding(per, i, in)
		require.NoError(t, err)
		require.True(t, p.From <= i && i < p.To, "%s is not in %+v", i, p)
		other := unit.Instant(rapid.Int64Range(int64(p.From), int64(p.To)-1).Draw(t, "other"))
		for _, same := range []unit.Instant{p.From, other, p.To - 1} {
			q, err := Holding(per, same, in)
			require.NoError(t, err)
			require.Equal(t, p, q, "at %s", same)
		}
		next, err := p.Next(in)
		require.NoError(t, err)
		assert.Equal(t, p.To, next.From)
		assert.Less(t, next.From, next.To)
		assert.Less(t, p.Name, next.Name)
	})
}

// TestPeriodsStartWithADay: each starts at the first moment of a local date that
// the calendar gives it, and the days fill it.
func TestPeriodsStartWithADay(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		in, i := drawn(t)
		p, err := Holding(rapid.SampledFrom(kinds[1:4]).Draw(t, "per"), i, in)
		require.NoError(t, err)
		clock, before := p.From.Time().In(in), (p.From - 1).Time().In(in)
		assert.Less(t, before.Format(time.DateOnly), clock.Format(time.DateOnly))
		switch p.Per {
		case "week":
			assert.Equal(t, time.Monday, clock.Weekday())
		case "quarter":
			assert.Contains(t, []time.Month{1, 4, 7, 10}, clock.Month())
			assert.Equal(t, 1, clock.Day())
		case "month":
			assert.Equal(t, 1, clock.Day())
		}
		day, err := Holding("day", p.From, in)
		require.NoError(t, err)
		for require.Equal(t, p.From, day.From); day.To < p.To; {
			day, err = day.Next(in)
			require.NoError(t, err)
		}
		assert.Equal(t, p.To, day.To)
	})
}

func TestNoPeriodOfTheCalendar(t *testing.T) {
	for _, per := range []string{"", "release", "run", "pull", "Month", "fortnight"} {
		_, err := Holding(per, 0, time.UTC)
		assert.ErrorContains(t, err, "write day, week, month, quarter or year", per)
	}
}

// TestPeriodsAtTheEndOfTime: an Instant reaches from 1677 to 2262. Periods are
// cut there and do not wrap around.
func TestPeriodsAtTheEndOfTime(t *testing.T) {
	for _, per := range kinds {
		first, err := Holding(per, math.MinInt64, time.UTC)
		require.NoError(t, err)
		assert.Equal(t, unit.Instant(math.MinInt64), first.From)
		assert.Less(t, first.From, first.To)
		final, err := Holding(per, math.MaxInt64, time.UTC)
		require.NoError(t, err)
		assert.Equal(t, unit.Instant(math.MaxInt64), final.To)
		assert.Less(t, final.From, final.To)
	}
}
