package footprint_test

import (
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget/footprint"
	"budgetcheck/budget/grid"
	"budgetcheck/budget/unit"
)

// What real records look like: readings repeated exactly, a few missing,
// counters that wrap, stop stamps copied from the start, grid files with blank
// hours.

// TestMissingTwentySeconds: a series every 2 s lacks 20 s. The gap is short, so
// that it is bridged, from 300 W before to 500 W after it.
func TestMissingTwentySeconds(t *testing.T) {
	r := open(t).powers(0, 600, 2, "m", 300).powers(620, 1200, 2, "m", 500).close(1200).run(plain(flat(400)), method)
	assert.InEpsilon(t, (600*300+20*400+580*500)/3.6e6, value(t, r.Measured), 1e-13)
	assert.InEpsilon(t, 1, value(t, r.Coverage), 1e-15)
	assert.Equal(t, footprint.Measured, r.Grade)
	assert.Empty(t, r.Doubts)
}

// TestReadingsRepeated: every line twice is every line once, and is said.
func TestReadingsRepeated(t *testing.T) {
	s := open(t)
	for at := 0.0; at <= 600; at += 2 {
		s.power(at, "m", 300).power(at, "m", 300)
	}
	r := s.close(600).run(plain(flat(400)), method)
	assert.InEpsilon(t, 300*600/3.6e6, value(t, r.Measured), 1e-13)
	assert.Empty(t, r.Doubts)
	assert.Contains(t, r.Notes, "run.ndjson: 301 repeated samples counted once")
}

// TestStopStampCopied: a close at the time of open is a copied stamp. It does
// not count, and the run has failed at its latest line.
func TestStopStampCopied(t *testing.T) {
	r := open(t).powers(0, 600, 2, "m", 300).close(0).run(plain(flat(400)), method)
	assert.Equal(t, after(600), r.End)
	assert.EqualValues(t, "failed", r.Outcome)
	require.Len(t, r.Doubts, 1)
	assert.Contains(t, r.Doubts[0].Reason, "closes at")
	assert.InEpsilon(t, 300*600/3.6e6, float64(r.Proven.Facility), 1e-13, "what was used was used")
}

// TestBlankHoursInGridFile: the file has a blank hour in the night of the run,
// which is a hole: priced by the annual mean where it is small, else unknown.
func TestBlankHoursInGridFile(t *testing.T) {
	const text = `zone,from,to,g_per_kwh,factor
NORTH,2031-03-04T02:00:00Z,2031-03-04T03:00:00Z,100,average
NORTH,2031-03-04T03:00:00Z,2031-03-04T04:00:00Z,,average
NORTH,2031-03-04T04:00:00Z,2031-03-04T23:00:00Z,200,average
`
	file, err := grid.ReadCSV(strings.NewReader(text), "grid/north.csv", grid.Columns{})
	require.NoError(t, err)
	f := plain(grid.NewSet(grid.Direct, file).Series("NORTH", grid.Average))
	f.Site.Annual = ptr(unit.Intensity(412))
	long := kilowatt(t, 20.5).run(f, method)
	assert.InEpsilon(t, 100+412+18.5*200, value(t, long.Operational), 1e-12)
	assert.Contains(t, strings.Join(long.Notes, "\n"), "annual mean")

	short := kilowatt(t, 3).run(f, method)
	assert.Nil(t, short.Operational)
	require.Len(t, short.Doubts, 1)
	assert.InEpsilon(t, 1.0/3, short.Doubts[0].Observed, 1e-12)
}

// TestCountersWrapWithinMinutes: under load a counter of 65536 J wraps every
// 164 s. Read every 30 s, nothing is lost.
func TestCountersWrapWithinMinutes(t *testing.T) {
	const wrap, w = 65536.0, 400.0
	f := plain(flat(400))
	f.Machine.Rated = ptr(unit.Power(600))
	s := open(t)
	for at := 0.0; at <= hour; at += 30 {
		j := 60000 + w*at
		for j >= wrap {
			j -= wrap
		}
		s.energy(at, "m", j, wrap)
	}
	r := s.close(hour).run(f, method)
	assert.InEpsilon(t, 0.4, value(t, r.Measured), 1e-12)
	assert.Equal(t, footprint.Measured, r.Grade)
	assert.Empty(t, r.Doubts)
}

// TestReadingsOutOfTurn: one meter's line that goes back in time is in doubt;
// meters among each other may come in any order.
func TestReadingsOutOfTurn(t *testing.T) {
	r := open(t).powers(0, 600, 60, "a", 100).powers(0, 600, 60, "b", 100).close(600).run(plain(flat(400)), method)
	assert.Empty(t, r.Doubts)
	r = open(t).powers(0, 600, 60, "a", 100).power(300, "a", 900).close(600).run(plain(flat(400)), method)
	assert.Len(t, r.Doubts, 1)
	assert.InEpsilon(t, 100*600/3.6e6, value(t, r.Measured), 1e-13)
}
