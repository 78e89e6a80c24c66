package footprint_test

import (
	"bytes"
	"regexp"
	"testing"
	"time"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget/footprint"
	"budgetcheck/budget/record"
	"budgetcheck/budget/unit"
)

// sum is the energy of all hours.
func sum(hours []footprint.Hour) (all float64) {
	for _, h := range hours {
		all += float64(h.KWh)
	}
	return all
}

// TestHours: facility energy by UTC hour; hours without energy are left out.
func TestHours(t *testing.T) {
	f := plain(flat(400))
	f.Site.PUE, f.Machine.MeasuredShare = 1.2, 0.75
	// From 02:30 to 05:15, with nothing used from 03:00 to 04:00.
	r := open(t, opensAt(1800)).energy(1800, "m", 0, 0).energy(3600, "m", 1.8e6, 0).energy(7200, "m", 1.8e6, 0).
		energy(11700, "m", 1.8e6+4.5e6, 0).close(11700).run(f, method)
	require.Len(t, r.Hours, 3)
	for n, want := range []struct{ from, kwh float64 }{{1800, 0.5}, {7200, 1}, {10800, 0.25}} {
		assert.Equal(t, after(want.from), r.Hours[n].From)
		assert.InEpsilon(t, want.kwh*1.2/0.75, float64(r.Hours[n].KWh), 1e-13)
	}
	assert.InEpsilon(t, value(t, r.Facility), sum(r.Hours), 1e-14)
}

// TestHoursOfFinerSeries: where the series changes within the hour, so do the
// hours, so that the run can be priced again from them.
func TestHoursOfFinerSeries(t *testing.T) {
	quarters := series(900, 100, 900, 300, 700, 200, 800)
	r := open(t, opensAt(600)).powers(600, 5000, 60, "m", 1000).close(5000).run(plain(quarters), method)
	var from []float64
	var again float64
	for _, h := range r.Hours {
		from = append(from, h.From.Sub(start).Seconds())
		i, ok := quarters.At(h.From)
		require.True(t, ok)
		again += float64(i.Of(h.KWh))
	}
	assert.Equal(t, []float64{600, 900, 1800, 2700, 3600, 4500}, from)
	assert.InEpsilon(t, value(t, r.Operational), again, 1e-13)
}

// TestHoursOfCoarserSeries: a step longer than an hour is cut at full hours.
func TestHoursOfCoarserSeries(t *testing.T) {
	r := open(t, opensAt(1800)).powers(1800, 9000, 60, "m", 1000).close(9000).run(plain(flat(400)), method)
	require.Len(t, r.Hours, 3)
	assert.Equal(t, after(7200), r.Hours[2].From)
}

// TestHoursOfParts: the same hour of two parts stays two, for their zones may
// differ.
func TestHoursOfParts(t *testing.T) {
	a := open(t, part("a", 2), opensAt(1800)).powers(1800, 7200, 60, "m", 1000).close(7200).weigh(plain(flat(400)), method)
	b := open(t, part("b", 2)).powers(0, 5400, 60, "m", 1000).close(5400).weigh(plain(flat(400)), method)
	r := footprint.Combine([]*footprint.Part{a, b}, method)
	assert.InEpsilon(t, 3, sum(r.Hours), 1e-13)
	require.Len(t, r.Hours, 4) // 02:00 and 02:30, when the parts open, and 03:00 twice
	assert.Equal(t, r.Hours[2].From, r.Hours[3].From)
	assert.IsNonDecreasing(t, []unit.Instant{r.Hours[0].From, r.Hours[1].From, r.Hours[2].From})
}

var stamp = regexp.MustCompile(`2031-[0-9T:.-]+Z`)

// inZone writes all times of a record in a zone of their own.
func inZone(t test, text []byte, zone func(n int) *time.Location) []byte {
	n := 0
	return stamp.ReplaceAllFunc(text, func(at []byte) []byte {
		moment, err := time.Parse(time.RFC3339Nano, string(at))
		require.NoError(t, err)
		n++
		return []byte(moment.In(zone(n)).Format(time.RFC3339Nano))
	})
}

// TestHoursOfZones: hours are those of UTC, also where the record is written
// in a zone that is half an hour off, and lies on the next day.
func TestHoursOfZones(t *testing.T) {
	s := open(t, opensAt(1800)).powers(1800, 9000, 60, "m", 1000).work(4000, steps(3)).close(9000)
	want := s.run(plain(flat(400)), method)
	for _, zone := range []*time.Location{time.FixedZone("", 5*3600+1800), time.FixedZone("", -9*3600-1800), time.FixedZone("", 14*3600)} {
		text := inZone(t, s.text.Bytes(), func(int) *time.Location { return zone })
		require.False(t, bytes.Equal(text, s.text.Bytes()))
		got := footprint.Combine([]*footprint.Part{weighText(t, text, plain(flat(400)), method)}, method)
		assert.Equal(t, want.Hours, got.Hours)
		assert.Equal(t, want.Start, got.Start)
		assert.Equal(t, want.Operational, got.Operational)
		assert.Equal(t, want.Pieces[0].Digest, got.Pieces[0].Digest)
	}
}

// TestHoursBefore1970 are full hours too.
func TestHoursBefore1970(t *testing.T) {
	opens, err := unit.ParseInstant("1969-12-31T21:30:00Z")
	require.NoError(t, err)
	s := open(t, func(o *record.Open) { o.At = opens })
	require.NoError(t, s.w.Energy(opens, "m", 0, 0))
	require.NoError(t, s.w.Energy(opens.Add(4*unit.Hour), "m", 4*3.6e6, 0))
	hours := s.run(plain(nil), method).Hours
	require.Len(t, hours, 5)
	assert.Equal(t, "1969-12-31T22:00:00Z", hours[1].From.String())
	assert.Equal(t, "1970-01-01T00:00:00Z", hours[3].From.String())
}
