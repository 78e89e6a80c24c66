package forecast

import (
	"fmt"
	"math"
	"time"

	"budgetcheck/budget/unit"
)

// Period is a day, week, month, quarter or year of the calendar: From up to,
// not including, To. Name is like 2031-03-10, 2031-W11, 2031-03, 2031-Q1, 2031;
// weeks are those of ISO 8601, from Monday.
type Period struct {
	Per      string
	Name     string
	From, To unit.Instant
}

// Holding is the period of the given kind that holds at, in a time zone. It is
// an error if per is no period of the calendar.
//
// A period starts at the first moment that has its date. So periods tile time
// also where midnight is skipped or comes twice, and where a change of the
// clocks brings back the last hour of a day that is over: that hour belongs to
// the new one. A date that a zone skips altogether has no period.
func Holding(per string, at unit.Instant, in *time.Location) (Period, error) {
	if !calendar(per) {
		return Period{}, fmt.Errorf("%q is not a period of the calendar; write day, week, month, quarter or year", per)
	}
	p := period(per, first(per, civil(at.Time().In(in))), in)
	for at >= p.To && p.To < last {
		p = period(per, after(per, p.date), in)
	}
	return p.Period, nil
}

// Next is the period that follows p.
func (p Period) Next(in *time.Location) (Period, error) { return Holding(p.Per, p.To, in) }

// Days is the length in days of 24 h.
func (p Period) Days() float64 { return days(p.To.Sub(p.From)) }

func days(d unit.Duration) float64 { return d.Seconds() / unit.Day.Seconds() }

// dated is a period with its first date, as midnight UTC of that date.
type dated struct {
	Period
	date time.Time
}

func period(per string, date time.Time, in *time.Location) dated {
	return dated{Period{per, name(per, date), begin(date, in), begin(after(per, date), in)}, date}
}

// civil is the date that clocks show at t, as midnight UTC of that date.
func civil(t time.Time) time.Time {
	return time.Date(t.Year(), t.Month(), t.Day(), 0, 0, 0, 0, time.UTC)
}

func calendar(per string) bool {
	switch per {
	case "day", "week", "month", "quarter", "year":
		return true
	}
	return false
}

// first is the first date of the period that date lies in.
func first(per string, date time.Time) time.Time {
	switch per {
	case "week":
		return date.AddDate(0, 0, -(int(date.Weekday())+6)%7) // back to Monday
	case "month":
		return date.AddDate(0, 0, 1-date.Day())
	case "quarter":
		return time.Date(date.Year(), (date.Month()-1)/3*3+1, 1, 0, 0, 0, 0, time.UTC)
	case "year":
		return time.Date(date.Year(), 1, 1, 0, 0, 0, 0, time.UTC)
	}
	return date
}

// after is the first date of the next period.
func after(per string, first time.Time) time.Time {
	switch per {
	case "week":
		return first.AddDate(0, 0, 7)
	case "month":
		return first.AddDate(0, 1, 0)
	case "quarter":
		return first.AddDate(0, 3, 0)
	case "year":
		return first.AddDate(1, 0, 0)
	}
	return first.AddDate(0, 0, 1)
}

func name(per string, first time.Time) string {
	switch per {
	case "week":
		year, week := first.ISOWeek()
		return fmt.Sprintf("%04d-W%02d", year, week)
	case "month":
		return first.Format("2006-01")
	case "quarter":
		return fmt.Sprintf("%04d-Q%d", first.Year(), (first.Month()+2)/3)
	case "year":
		return first.Format("2006")
	}
	return first.Format(time.DateOnly)
}

const last = unit.Instant(math.MaxInt64)

// begin is the first moment at which clocks in a zone show the date or a later
// one. It goes through the offsets in force around that midnight; no offset is
// as large as a day.
func begin(date time.Time, in *time.Location) unit.Instant {
	for t := date.Add(-24 * time.Hour).In(in); ; {
		from, to := bounds(t)
		_, offset := t.Zone()
		midnight := date.Add(-time.Duration(offset) * time.Second)
		switch {
		case midnight.Before(from): // the change of the clocks skipped it
			return held(from)
		case to.IsZero() || midnight.Before(to):
			return held(midnight)
		}
		t = to
	}
}

// bounds is the span around t in which the offset of its zone is constant; zero
// times where it has no end. On December 31 of a leap year the library's end lies
// before t: it takes the year for 365 days. No clock changes in its last hours.
func bounds(t time.Time) (from, to time.Time) {
	from, to = t.ZoneBounds()
	if !to.IsZero() && !to.After(t) {
		to = time.Date(t.UTC().Year()+1, 1, 1, 0, 0, 0, 0, time.UTC).In(t.Location())
	}
	return from, to
}

// held is the instant of t, cut at the range of an Instant.
func held(t time.Time) unit.Instant {
	switch {
	case t.Before(unit.Instant(math.MinInt64).Time()):
		return math.MinInt64
	case t.After(last.Time()):
		return last
	}
	return unit.At(t)
}
