package main

import (
	"bytes"
	"fmt"
	"math"
	"strings"
	"time"

	"budgetcheck/budget/unit"
)

// olderStart leaves a season before that, for landings to be tried on.
var olderStart = instant("2030-11-01T00:00:00Z")

// zone is an invented grid zone: its intensity is a daily course times the
// week's times the weather's.
type zone struct {
	name    string
	file    string
	until   unit.Instant // the series' end
	level   float64      // mean, g/kWh
	course  [24]float64  // by hour of UTC, around 1
	weekend float64      // factor of Saturdays and Sundays
	weather float64      // relative standard deviation
}

// seriesStart leaves the four weeks that an expected intensity looks back on.
var seriesStart = instant("2031-02-01T00:00:00Z")

// zones are a fossil north with peaks in the morning and the evening, and a
// south whose sun shows at noon. Both series end while the head runs are still
// at work, as live ones do: their tails have no price yet.
func zones() []zone {
	return []zone{{
		name: "NORTH", file: "grid/north-2031.csv", until: instant("2031-03-10T05:00:00Z"),
		level: 378, weekend: 0.96, weather: 0.055,
		course: [24]float64{
			0.90, 0.88, 0.87, 0.87, 0.89, 0.94, 1.01, 1.08, 1.10, 1.07, 1.04, 1.01,
			0.99, 0.98, 0.98, 1.01, 1.06, 1.13, 1.16, 1.14, 1.09, 1.03, 0.97, 0.93,
		},
	}, {
		name: "SOUTH", file: "grid/south-2031.csv", until: instant("2031-03-10T06:00:00Z"),
		level: 186, weekend: 0.95, weather: 0.08,
		course: [24]float64{
			1.06, 1.04, 1.03, 1.03, 1.05, 1.09, 1.12, 1.08, 0.97, 0.86, 0.77, 0.71,
			0.69, 0.70, 0.75, 0.84, 0.97, 1.13, 1.25, 1.29, 1.24, 1.18, 1.13, 1.09,
		},
	}}
}

// files are the series, one row for each hour, in a file a year.
func (z zone) files() []file {
	older := strings.Replace(z.file, "2031", "2030", 1)
	return []file{{z.file, z.csv(z.name, seriesStart, z.until)}, {older, z.csv(z.name+" 2030", olderStart, seriesStart)}}
}

// csv is a span of the series; chance names its weather.
func (z zone) csv(chance string, from, until unit.Instant) []byte {
	var rows bytes.Buffer
	fmt.Fprintln(&rows, "zone,from,to,g_per_kwh,factor")
	weather := newWander(stream(chance), 0.97, z.weather)
	for at := from; at < until; at = at.Add(unit.Hour) {
		fmt.Fprintf(&rows, "%s,%s,%s,%.1f,average\n", z.name, at, at.Add(unit.Hour), z.intensity(at, weather.next()))
	}
	return rows.Bytes()
}

// intensity never leaves what a grid of power stations can show.
func (z zone) intensity(at unit.Instant, weather float64) float64 {
	const least, most = 15, 800
	t := at.Time()
	i := z.level * z.course[t.Hour()] * (1 + weather)
	if day := t.Weekday(); day == time.Saturday || day == time.Sunday {
		i *= z.weekend
	}
	return math.Min(math.Max(i, least), most)
}

// instant reads a time written in this program.
func instant(text string) unit.Instant {
	at, err := unit.ParseInstant(text)
	if err != nil {
		panic(err) // a slip in the source, not in any input
	}
	return at
}
