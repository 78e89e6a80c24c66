package forecast

import (
	"strconv"
	"strings"
	"testing"
	"time"

	"github.com/robfig/cron/v3"
	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"

	"budgetcheck/budget/unit"
)

// firings are those of a text in a span, in the schedule's own clock.
func firings(t require.TestingT, text, from, to string) (clock []string) {
	s, err := ParseSchedule(text)
	require.NoError(t, err)
	all, err := s.Firings(at(t, from), at(t, to))
	require.NoError(t, err)
	for _, f := range all {
		clock = append(clock, f.Time().In(s.fields.Location).Format("01-02 15:04 -0700"))
	}
	return clock
}

// TestNightlyRunsInMarch: 31, whatever the zone of the machine. The library
// would read the fields in that zone.
func TestNightlyRunsInMarch(t *testing.T) {
	local := time.Local
	defer func() { time.Local = local }()
	for _, machine := range []string{"UTC", "Asia/Kathmandu", "America/New_York"} {
		time.Local = zone(t, machine)
		got := firings(t, "15 2 * * *", "2031-03-01T00:00:00Z", "2031-04-01T00:00:00Z")
		assert.Len(t, got, 31)
		assert.Equal(t, "03-01 02:15 +0000", got[0])
	}
}

// TestDaysOnWhichClocksChange: a time of day that is skipped is no firing, one
// that comes twice is two, as for schedulers that go by this library.
func TestDaysOnWhichClocksChange(t *testing.T) {
	const berlin, howe = "CRON_TZ=Europe/Berlin ", "TZ=Australia/Lord_Howe "
	assert.Len(t, firings(t, berlin+"15 2 * * *", "2031-02-28T23:00:00Z", "2031-03-31T22:00:00Z"), 30)
	assert.Len(t, firings(t, berlin+"15 2 * * *", "2031-09-30T22:00:00Z", "2031-10-31T23:00:00Z"), 32)
	assert.Len(t, firings(t, berlin+"15 4 * * *", "2031-02-28T23:00:00Z", "2031-03-31T22:00:00Z"), 31)
	assert.Equal(t, []string{"10-26 02:15 +0200", "10-26 02:15 +0100"}, firings(t, berlin+"15 2 * * *", "2031-10-25T22:00:00Z", "2031-10-26T23:00:00Z"))
	assert.Len(t, firings(t, berlin+"0 * * * *", "2031-03-29T23:00:00Z", "2031-03-30T22:00:00Z"), 23)
	assert.Len(t, firings(t, berlin+"0 * * * *", "2031-10-25T22:00:00Z", "2031-10-26T23:00:00Z"), 25)
	// By half an hour: 02:00 to 02:30 is skipped in October, 01:30 to 02:00 comes
	// twice in April. The library's own Next leaves out 02:15 in April.
	assert.Equal(t, []string{"10-04 02:15 +1030", "10-06 02:15 +1100"}, firings(t, howe+"15 2 * * *", "2031-10-03T13:30:00Z", "2031-10-06T13:00:00Z"))
	assert.Equal(t, []string{"04-06 01:45 +1100", "04-06 01:45 +1030"}, firings(t, howe+"45 1 * * *", "2031-04-05T13:00:00Z", "2031-04-06T13:30:00Z"))
	assert.Equal(t, []string{"04-06 02:15 +1030"}, firings(t, howe+"15 2 * * *", "2031-04-05T13:00:00Z", "2031-04-06T13:30:00Z"))
}

func TestEndsOfTheSpan(t *testing.T) {
	for _, name := range zones { // over the last day of a leap year
		assert.Len(t, firings(t, "CRON_TZ="+name+" 30 12 * * *", "2040-12-25T06:00:00Z", "2041-01-05T06:00:00Z"), 11, name)
	}
	assert.Equal(t, []string{"03-10 02:15 +0000"}, firings(t, "15 2 * * *", "2031-03-10T02:15:00Z", "2031-03-11T02:15:00Z"))
	assert.Empty(t, firings(t, "15 2 * * *", "2031-03-10T02:15:00.000000001Z", "2031-03-11T02:15:00Z"))
	assert.Empty(t, firings(t, "15 2 * * *", "2031-03-11T02:15:00Z", "2031-03-10T02:15:00Z"))
	assert.Empty(t, firings(t, "0 0 30 2 *", "2031-01-01T00:00:00Z", "2041-01-01T00:00:00Z"), "no February 30")
	assert.Equal(t, []string{"02-29 00:00 +0000"}, firings(t, "0 0 29 2 *", "2029-01-01T00:00:00Z", "2036-01-01T00:00:00Z"))
}

// TestDayOfMonthOrWeek: where both are restricted, either fires (cron(8)).
func TestDayOfMonthOrWeek(t *testing.T) {
	assert.Equal(t, []string{"03-03 00:00 +0000", "03-10 00:00 +0000", "03-13 00:00 +0000", "03-17 00:00 +0000", "03-24 00:00 +0000", "03-31 00:00 +0000"},
		firings(t, "0 0 13 * mon", "2031-03-01T00:00:00Z", "2031-04-01T00:00:00Z"))
	assert.Len(t, firings(t, "@weekly", "2031-03-01T00:00:00Z", "2031-04-01T00:00:00Z"), 5)
}

// field draws one cron field within its bounds.
func field(t *rapid.T, low, high int) string {
	number := rapid.IntRange(low, high)
	return rapid.OneOf(rapid.Just("*"),
		rapid.Custom(func(t *rapid.T) string { return strconv.Itoa(number.Draw(t, "n")) }),
		rapid.Custom(func(t *rapid.T) string { return "*/" + strconv.Itoa(rapid.IntRange(1, high).Draw(t, "step")) }),
		rapid.Custom(func(t *rapid.T) string {
			a, b := number.Draw(t, "a"), number.Draw(t, "b")
			return strconv.Itoa(min(a, b)) + "-" + strconv.Itoa(max(a, b)) + "," + strconv.Itoa(number.Draw(t, "c"))
		})).Draw(t, "field")
}

// TestFiringsAgreeWithTheLibrary: with its Next, step by step, in zones whose
// clocks change by whole hours and not at midnight, where that is right.
func TestFiringsAgreeWithTheLibrary(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		fields := []string{field(t, 0, 59), field(t, 0, 23), field(t, 1, 31), field(t, 1, 12), field(t, 0, 6)}
		name := rapid.SampledFrom([]string{"UTC", "Europe/Berlin", "America/New_York", "Asia/Kathmandu", "Pacific/Auckland"}).Draw(t, "zone")
		text := "CRON_TZ=" + name + " " + strings.Join(fields, " ")
		from := at(t, "2031-01-01T00:00:00Z").Add(unit.Duration(rapid.Int64Range(0, int64(2*unit.Year)).Draw(t, "from")))
		to := from.Add(unit.Duration(rapid.Int64Range(0, int64(3*unit.Day)).Draw(t, "span")))

		library, err := cron.ParseStandard(text)
		require.NoError(t, err)
		var want []unit.Instant
		for f := library.Next((from - 1).Time()); !f.IsZero() && f.Before(to.Time()); f = library.Next(f) {
			want = append(want, unit.At(f))
		}
		s, err := ParseSchedule(text)
		require.NoError(t, err)
		got, err := s.Firings(from, to)
		require.NoError(t, err)
		assert.Equal(t, want, got, text)
	})
}

func TestTooManyFirings(t *testing.T) {
	s, err := ParseSchedule("* * * * *")
	require.NoError(t, err)
	from := at(t, "2031-01-01T00:00:00Z")
	year, err := s.Firings(from, from.Add(unit.Year))
	require.NoError(t, err)
	assert.Len(t, year, 525_600)
	_, err = s.Firings(from, from.Add(2*unit.Year))
	assert.ErrorContains(t, err, "has more than 1048576 firings from 2031-01-01T00:00:00Z to 2032-12-31T00:00:00Z; write a rarer one")
}

func TestSchedulesRefused(t *testing.T) {
	for text, why := range map[string]string{
		"":                                "empty",
		"15 2 * *":                        "expected exactly 5 fields",
		"15 2 * * * *":                    "expected exactly 5 fields",
		"75 2 * * *":                      "above maximum",
		"@every 24h":                      "no fixed times",
		"@nightly":                        "unrecognized",
		"TZ=UTC":                          "no fields follow",
		"CRON_TZ=":                        "no fields follow",
		"CRON_TZ=UTC ":                    "expected exactly 5 fields",
		"CRON_TZ=Harbour/Mole 15 2 * * *": "bad location",
		"CRON_TZ=Local 15 2 * * *":        "differs from machine to machine",
	} {
		_, err := ParseSchedule(text)
		if assert.ErrorContains(t, err, why, text) {
			assert.ErrorContains(t, err, `write five cron fields, like "15 2 * * *"`)
		}
	}
}

// FuzzParseSchedule: whatever is read fires in order and within the span.
func FuzzParseSchedule(f *testing.F) {
	for _, text := range []string{"15 2 * * *", "*/7 1-5,8 ? jan-mar 1", "@daily", "CRON_TZ=Asia/Kathmandu 0 0 1 1 *", "TZ=", "TZ=UTC", "@every 1s",
		"CRON_TZ=Local * * * * *", ", , , , ,", "0-59/99999999999 * * * *", "TZ= 1 1 1 1 1"} {
		f.Add(text)
	}
	f.Fuzz(func(t *testing.T, text string) {
		s, err := ParseSchedule(text)
		if err != nil {
			return
		}
		from := at(t, "2031-03-01T00:00:00Z")
		all, err := s.Firings(from, from.Add(unit.Day))
		require.NoError(t, err)
		last := from - 1
		for _, f := range all {
			require.Greater(t, f, last)
			last = f
		}
		require.Less(t, last, from.Add(unit.Day))
	})
}
