package grid_test

import (
	"errors"
	"io"
	"strings"
	"testing"
	"testing/iotest"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget/grid"
	"budgetcheck/budget/unit"
)

// TestReadCSVShapes: however a spreadsheet, a script or a person writes them,
// the same two rows are the same two steps.
func TestReadCSVShapes(t *testing.T) {
	const a, b = "2031-03-01T00:00:00Z,2031-03-01T01:00:00Z", "2031-03-01T01:00:00Z,2031-03-01T02:00:00Z"
	want := []grid.Interval{step(0, 1, 412), step(1, 2, 98.5)}
	for name, text := range map[string]string{
		"plain":             header + "NORTH," + a + ",412,average\nNORTH," + b + ",98.5,average\n",
		"no last newline":   header + "NORTH," + a + ",412,average\nNORTH," + b + ",98.5,average",
		"rows out of order": header + "NORTH," + b + ",98.5,average\nNORTH," + a + ",412,average\n",
		"empty lines":       "\n" + header + "\nNORTH," + a + ",412,average\n\n\nNORTH," + b + ",98.5,average\n\n",
		"carriage returns":  strings.ReplaceAll(header+"NORTH,"+a+",412,average\nNORTH,"+b+",98.5,average\n", "\n", "\r\n"),
		"byte order mark":   "\ufeff" + header + "NORTH," + a + ",412,average\nNORTH," + b + ",98.5,average\n",
		"quoted, with mark": "\ufeff" + `"zone","from","to","g_per_kwh","factor"` + "\n" +
			`"NORTH",` + a + `,"412","average"` + "\n" + `"NORTH",` + b + `,"98.5","average"` + "\n",
		"spaces":            "zone, from, to, g_per_kwh, factor\nNORTH, 2031-03-01T00:00:00Z, 2031-03-01T01:00:00Z, 412 ,average \nNORTH ," + b + ",98.5,average\n",
		"exponent":          header + "NORTH," + a + ",4.12e2,average\nNORTH," + b + ",+98.50,average\n",
		"columns elsewhere": "factor,g_per_kwh,to,from,zone\naverage,412,2031-03-01T01:00:00Z,2031-03-01T00:00:00Z,NORTH\naverage,98.5,2031-03-01T02:00:00Z,2031-03-01T01:00:00Z,NORTH\n",
		"more columns": "id,zone,name,from,to,g_per_kwh,factor,remark\n1,NORTH,outer harbour," + a + ",412,average,\n" +
			"2,NORTH,outer harbour," + b + `,98.5,average,"gusty, ""wild"""` + "\n",
		"offsets": header + "NORTH,2031-03-01T01:00:00+01:00,2031-02-28T20:00:00-05:00,412,average\n" +
			"NORTH,2031-03-01T06:30:00+05:30,2031-03-01T02:00:00.000Z,98.5,average\n",
	} {
		t.Run(name, func(t *testing.T) {
			f := clean(t, "north.csv", text)
			assert.Equal(t, want, stepsOf("NORTH", grid.Average, f))
			assert.Zero(t, f.Blank)
		})
	}
}

func TestReadCSVMappedColumns(t *testing.T) {
	// The names of the contract stand in the header too, for something else.
	const text = "area,start,stop,carbon,kind,zone,from\nNORTH,2031-03-01T00:00:00Z,2031-03-01T01:00:00Z,412,average,UTC,feed\n"
	columns := grid.Columns{Zone: "area", From: "start", To: "stop", GPerKWh: "carbon", Factor: "kind"}
	f, err := grid.ReadCSV(strings.NewReader(text), "feed.csv", columns)
	require.NoError(t, err)
	require.Empty(t, f.Findings.Lines())
	assert.Equal(t, []grid.Interval{step(0, 1, 412)}, stepsOf("NORTH", grid.Average, f))
}

func TestReadCSVMappedColumnMissing(t *testing.T) {
	f, err := grid.ReadCSV(strings.NewReader(header), "feed.csv", grid.Columns{GPerKWh: "carbon"})
	require.NoError(t, err)
	require.Equal(t, 1, f.Findings.Len())
	assert.Contains(t, f.Findings.First().What, `"carbon"`, "the name that is missing is the mapped one")
}

// TestReadCSVBlank: hourly grid files have blank hours. They are holes, no
// errors and no zeros.
func TestReadCSVBlank(t *testing.T) {
	f := clean(t, "north.csv", header+rows("NORTH", grid.Average, step(0, 1, 412))+
		"NORTH,2031-03-01T01:00:00Z,2031-03-01T02:00:00Z,,average\n"+
		"NORTH,2031-03-01T02:00:00Z,2031-03-01T03:00:00Z, ,average\n"+
		rows("NORTH", grid.Average, step(3, 4, 0)))
	assert.Equal(t, 2, f.Blank)
	set := grid.NewSet(grid.Direct, f)
	assert.Nil(t, set.Broken("NORTH"))
	s := set.Series("NORTH", grid.Average)
	assert.Equal(t, []grid.Interval{step(0, 1, 412), step(3, 4, 0)}, s.Steps())
	_, ok := s.At(hours(1.5))
	assert.False(t, ok)
	zero, ok := s.At(hours(3))
	assert.True(t, ok, "a written zero is a value")
	assert.Zero(t, zero)
}

// TestReadCSVOnlyBlank: a zone of holes only has no series at all.
func TestReadCSVOnlyBlank(t *testing.T) {
	f := clean(t, "north.csv", header+"NORTH,2031-03-01T01:00:00Z,2031-03-01T02:00:00Z,,average\n")
	set := grid.NewSet(grid.Direct, f)
	assert.Nil(t, set.Series("NORTH", grid.Average))
	assert.Empty(t, set.All())
}

// TestReadCSVFailure: a disk that fails is an error, told with the file's name.
func TestReadCSVFailure(t *testing.T) {
	broken := errors.New("the disk is wet")
	for name, in := range map[string]io.Reader{
		"in the header": iotest.ErrReader(broken),
		"in the rows":   io.MultiReader(strings.NewReader(header+"NORTH,"), iotest.ErrReader(broken)),
	} {
		t.Run(name, func(t *testing.T) {
			_, err := grid.ReadCSV(in, "north.csv", grid.Columns{})
			require.ErrorIs(t, err, broken)
			assert.ErrorContains(t, err, "north.csv: ")
		})
	}
}

// TestSeriesHalfOpen: an interval holds its first moment and not its last.
func TestSeriesHalfOpen(t *testing.T) {
	s := north(step(0, 1, 100), step(1, 2, 200), step(3, 4, 300))
	for _, c := range []struct {
		at   unit.Instant
		want unit.Intensity
		ok   bool
	}{
		{hours(0) - 1, 0, false},
		{hours(0), 100, true},
		{hours(1) - 1, 100, true},
		{hours(1), 200, true},
		{hours(2) - 1, 200, true},
		{hours(2), 0, false},
		{hours(3) - 1, 0, false},
		{hours(3), 300, true},
		{hours(4) - 1, 300, true},
		{hours(4), 0, false},
	} {
		got, ok := s.At(c.at)
		assert.Equal(t, c.ok, ok, c.at)
		assert.Equal(t, c.want, got, c.at)
	}
	from, to := s.Span()
	assert.Equal(t, hours(0), from)
	assert.Equal(t, hours(4), to)
}
