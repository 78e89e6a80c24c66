package forecast

import (
	"errors"
	"fmt"
	"strings"
	"time"

	"github.com/robfig/cron/v3"

	"budgetcheck/budget/unit"
)

// Schedule is the five fields of a cron text, in a time zone.
type Schedule struct {
	text   string
	fields *cron.SpecSchedule
}

// MaxFirings is how many firings are counted at most: one a minute for almost
// two years.
const MaxFirings = 1 << 20

// ParseSchedule reads five cron fields, or @hourly, @daily, @weekly, @monthly
// or @yearly. The time zone is UTC unless CRON_TZ= or TZ= names one. @every is
// refused: it counts from when a scheduler was started, which is not known.
func ParseSchedule(text string) (Schedule, error) {
	zone, _, more := strings.Cut(text, " ")
	named := strings.HasPrefix(zone, "CRON_TZ=") || strings.HasPrefix(zone, "TZ=")
	if named && !more { // the library's version 3.0.1 panics
		return Schedule{}, unreadable(text, errors.New("no fields follow the time zone"))
	}
	if named && strings.HasSuffix(zone, "=Local") {
		return Schedule{}, unreadable(text, errors.New("the time zone Local differs from machine to machine"))
	}
	parsed, err := cron.ParseStandard(text)
	if err != nil {
		return Schedule{}, unreadable(text, err)
	}
	fields, ok := parsed.(*cron.SpecSchedule)
	if !ok {
		return Schedule{}, unreadable(text, errors.New("@every has no fixed times"))
	}
	if !named { // the library's default is the zone of the machine
		fields.Location = time.UTC
	}
	return Schedule{text, fields}, nil
}

func unreadable(text string, err error) error {
	return fmt.Errorf("the schedule %q cannot be read (%w); write five cron fields, like \"15 2 * * *\"", text, err)
}

// Firings are the scheduled starts from one moment up to, not including,
// another, in order; an error if there are more than MaxFirings. A firing is
// every moment at which the clocks of the zone show a scheduled time. So a time
// that a change of the clocks skips is no firing, and one that it repeats is two.
func (s Schedule) Firings(from, to unit.Instant) (firings []unit.Instant, err error) {
	for t := from.Time().In(s.fields.Location); from < to; t = from.Time().In(s.fields.Location) {
		until := to
		if _, change := bounds(t); !change.IsZero() && change.Before(to.Time()) {
			until = unit.At(change)
		}
		if firings, err = s.steady(firings, from, until); err != nil {
			return nil, err
		}
		from = until
	}
	return firings, nil
}

// steady adds the firings of a span in which the offset of the zone is constant.
func (s Schedule) steady(firings []unit.Instant, from, to unit.Instant) ([]unit.Instant, error) {
	start := from.Time().In(s.fields.Location)
	_, seconds := start.Zone()
	offset := unit.Duration(seconds) * unit.Second
	clock := s.clock()
	for date := civil(start); ; date = date.AddDate(0, 0, 1) {
		midnight := held(date.Add(-time.Duration(offset)))
		if midnight >= to || midnight == last {
			return firings, nil
		}
		if !s.on(date) {
			continue
		}
		for _, c := range clock {
			if at := midnight.Add(c); at >= from && at < to {
				firings = append(firings, at)
			}
		}
		if len(firings) > MaxFirings {
			return nil, fmt.Errorf("the schedule %q has more than %d firings from %s to %s; write a rarer one, or a shorter period", s.text, MaxFirings, from, to)
		}
	}
}

// clock is the times of day, in order, as clocks show them.
func (s Schedule) clock() (times []unit.Duration) {
	for h := range 24 {
		for m := range 60 {
			if s.fields.Hour>>h&1 == 1 && s.fields.Minute>>m&1 == 1 {
				times = append(times, unit.Duration(h)*unit.Hour+unit.Duration(m)*unit.Minute)
			}
		}
	}
	return times
}

// on tells whether the schedule fires on a date. Day of the month and day of the
// week both count where one of them is a star, else either does, as in cron(8).
func (s Schedule) on(date time.Time) bool {
	const star = 1 << 63 // how the library marks it
	dom := s.fields.Dom>>date.Day()&1 == 1
	dow := s.fields.Dow>>int(date.Weekday())&1 == 1
	both := (s.fields.Dom|s.fields.Dow)&star != 0
	return s.fields.Month>>int(date.Month())&1 == 1 && (dom && dow || !both && (dom || dow))
}
