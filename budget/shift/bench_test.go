package shift

import (
	"fmt"
	"math"
	"testing"
	"time"

	"budgetcheck/budget/unit"
)

// wavy is a profile of many samples, none of which lies on a whole minute.
func wavy(t test, d unit.Duration, samples int) Profile {
	all := make([]Sample, samples)
	for n := range all {
		at := unit.Duration(float64(d) * float64(n) / float64(samples))
		all[n] = Sample{at, unit.Power(2000 + 700*math.Sin(float64(n)/9) + 200*math.Cos(float64(n)))}
	}
	return linear(t, d, all...)
}

func deferredStart(b *testing.B, step, run, window unit.Duration, samples int) {
	days := int((run + window + unit.Day) / unit.Day)
	r := Run{Profile: wavy(b, run, samples), Start: after(2 * unit.Hour)}
	at := Place{"quay", diurnal(1, 400, step, days+1), 1.2}
	for b.Loop() {
		if DeferredStart(r, at, window) == nil {
			b.Fatal("no start")
		}
	}
	b.ReportMetric(float64(window/unit.Second+1), "starts")
}

func BenchmarkDeferredStart(b *testing.B) {
	for _, window := range []unit.Duration{6 * unit.Hour, 24 * unit.Hour, 6 * unit.Day} {
		b.Run("window="+time.Duration(window).String(), func(b *testing.B) { deferredStart(b, 5*unit.Minute, 24*unit.Hour, window, 10_000) })
	}
	for _, samples := range []int{100, 1_000, 100_000} {
		b.Run(fmt.Sprint("samples=", samples), func(b *testing.B) { deferredStart(b, 5*unit.Minute, 24*unit.Hour, 24*unit.Hour, samples) })
	}
	for _, run := range []unit.Duration{unit.Hour, 6 * unit.Hour, 6 * unit.Day} {
		b.Run("run="+time.Duration(run).String(), func(b *testing.B) { deferredStart(b, 5*unit.Minute, run, 24*unit.Hour, 10_000) })
	}
}

// The time allowed is twice the run's own, a start off the grid of the series
// the harder case.
func BenchmarkInterruptedRun(b *testing.B) {
	for _, c := range []struct {
		days         int
		start, grain unit.Duration
	}{{2, 0, 5}, {7, 0, 5}, {14, 0, 5}, {14, 37 * unit.Second, 5}, {14, 37 * unit.Second, 60}, {28, 0, 5}} {
		b.Run(fmt.Sprintf("allowed=%dd/from=%v/series=%dm", c.days, time.Duration(c.start), c.grain), func(b *testing.B) {
			r := Run{Profile: wavy(b, unit.Duration(c.days)*unit.Day/2, 10_000), Start: after(c.start)}
			at := Place{"quay", diurnal(1, 400, c.grain*unit.Minute, c.days+1), 1.2}
			how := Pausing{Slot: 5 * unit.Minute, MinSlice: 30 * unit.Minute, Stretch: 2, Resume: 0.05}
			for b.Loop() {
				if interrupted(b, r, at, how) == nil {
					b.Fatal("no run")
				}
			}
		})
	}
}

func BenchmarkSpreadOfAYear(b *testing.B) {
	for _, grain := range []unit.Duration{60, 5} {
		b.Run(fmt.Sprintf("series=%dm", grain), func(b *testing.B) {
			var sites []Site
			for n := range uint64(8) {
				sites = append(sites, Site{Place: Place{fmt.Sprint("site", n), diurnal(n, 400, grain*unit.Minute, 366), 1.2}})
			}
			r := Run{Profile: wavy(b, unit.Day, 10_000), Start: midnight}
			for b.Loop() {
				if s := Spreads(r, sites, time.UTC); s[0].Starts < 8760 {
					b.Fatal(s[0].Starts)
				}
			}
		})
	}
}
