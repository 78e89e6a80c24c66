package grid_test

import (
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget/grid"
)

// badRow is the row between two good ones; it stands on line 3.
func badRow(row string) string {
	return header + rows("NORTH", grid.Average, step(0, 1, 412)) + row + "\n" + rows("SOUTH", grid.Average, step(0, 1, 98))
}

// TestBadRow: a row that cannot count is a finding with place and advice. It
// breaks its own zone, and nothing else is lost.
func TestBadRow(t *testing.T) {
	const span = "2031-03-01T01:00:00Z,2031-03-01T02:00:00Z"
	for name, c := range map[string]struct{ row, what string }{
		"negative":           {"NORTH," + span + ",-1,average", `"-1"`},
		"not a number":       {"NORTH," + span + ",NaN,average", `"NaN"`},
		"infinite":           {"NORTH," + span + ",Inf,average", `"Inf"`},
		"infinity in words":  {"NORTH," + span + ",infinity,average", `"infinity"`},
		"beyond any number":  {"NORTH," + span + ",1e999,average", `"1e999"`},
		"hexadecimal":        {"NORTH," + span + ",0x1p8,average", `"0x1p8"`},
		"with its unit":      {"NORTH," + span + ",412 g/kWh,average", `"412 g/kWh"`},
		"decimal comma":      {"NORTH," + span + `,"412,5",average`, `"412,5"`},
		"a word for blank":   {"NORTH," + span + ",n/a,average", `"n/a"`},
		"no factor":          {"NORTH," + span + ",412,", `factor is ""`},
		"factor unknown":     {"NORTH," + span + ",412,Average", `factor is "Average"`},
		"blank, bad factor":  {"NORTH," + span + ",,mean", `factor is "mean"`},
		"no start":           {"NORTH,,2031-03-01T02:00:00Z,412,average", `"" is not a time`},
		"no end":             {"NORTH,2031-03-01T01:00:00Z,,412,average", `"" is not a time`},
		"no offset":          {"NORTH,2031-03-01T01:00:00,2031-03-01T02:00:00Z,412,average", "2031-03-01T01:00:00"},
		"date only":          {"NORTH,2031-03-01,2031-03-02,412,average", "2031-03-01"},
		"no such day":        {"NORTH,2031-02-30T01:00:00Z,2031-03-01T02:00:00Z,412,average", "2031-02-30"},
		"beyond all times":   {"NORTH,2031-03-01T01:00:00Z,9999-12-31T23:59:59Z,412,average", "1678 and 2262"},
		"ends as it starts":  {"NORTH,2031-03-01T01:00:00Z,2031-03-01T02:00:00+01:00,412,average", "not after its start"},
		"ends before it":     {"NORTH,2031-03-01T01:00:00Z,2031-03-01T00:59:59Z,412,average", "not after its start"},
		"overlaps the first": {"NORTH,2031-03-01T00:59:59Z,2031-03-01T02:00:00Z,412,average", "line 2"},
	} {
		t.Run(name, func(t *testing.T) {
			f := read(t, "grid/harbour.csv", badRow(c.row))
			oneFinding(t, f, 3, c.what)
			set := grid.NewSet(grid.Direct, f)
			require.NotNil(t, set.Broken("NORTH"))
			assert.Equal(t, f.Findings.First(), *set.Broken("NORTH"))
			assert.Nil(t, set.Broken("SOUTH"))
			assert.Equal(t, []grid.Interval{step(0, 1, 412)}, stepsOf("NORTH", grid.Average, f))
			assert.Equal(t, []grid.Interval{step(0, 1, 98)}, stepsOf("SOUTH", grid.Average, f))
			assert.Len(t, set.All(), 2, "the row is in no series of any other name")
		})
	}
}

// oneFinding checks that exactly one thing was found, where, and that advice
// stands with it.
func oneFinding(t *testing.T, f *grid.File, line int, what string) {
	t.Helper()
	require.Equal(t, 1, f.Findings.Len(), f.Findings.Lines())
	found := f.Findings.First()
	assert.Equal(t, f.Name, found.File)
	assert.Equal(t, line, found.Line)
	assert.Contains(t, found.What, what)
	assert.NotEmpty(t, found.Do)
}

// TestUnreadableRow: a row whose zone cannot be trusted may have been of any
// zone of the file, and breaks them all; a zone that only has holes is one of
// them. Zones of other files stand.
func TestUnreadableRow(t *testing.T) {
	for name, c := range map[string]struct{ row, what string }{
		"too few fields":      {"NORTH,2031-03-01T01:00:00Z", "2 fields"},
		"a comma too many":    {"NORTH,2031-03-01T01:00:00Z,2031-03-01T02:00:00Z,412,average,", "6 fields"},
		"no zone":             {",2031-03-01T01:00:00Z,2031-03-01T02:00:00Z,412,average", "zone is empty"},
		"a zone of spaces":    {"  ,2031-03-01T01:00:00Z,2031-03-01T02:00:00Z,412,average", "zone is empty"},
		"not UTF-8":           {"N\xd8RTH,2031-03-01T01:00:00Z,2031-03-01T02:00:00Z,412,average", "UTF-8"},
		"a quotation mark":    {`NO"RTH,2031-03-01T01:00:00Z,2031-03-01T02:00:00Z,412,average`, "cannot be read"},
		"an open quotation":   {`"NORTH,2031-03-01T01:00:00Z,2031-03-01T02:00:00Z,412,average`, "cannot be read"},
		"text after a closed": {`"NORTH"x,2031-03-01T01:00:00Z,2031-03-01T02:00:00Z,412,average`, "cannot be read"},
	} {
		t.Run(name, func(t *testing.T) {
			harbour := read(t, "grid/harbour.csv", header+"SOUTH,2031-03-01T00:00:00Z,2031-03-01T01:00:00Z,,average\n"+c.row+"\n"+
				rows("NORTH", grid.Average, step(0, 1, 412)))
			oneFinding(t, harbour, 3, c.what)
			set := grid.NewSet(grid.Direct, clean(t, "grid/east.csv", header+rows("EAST", grid.Average, step(0, 1, 7))), harbour)
			assert.NotNil(t, set.Broken("SOUTH"))
			assert.Nil(t, set.Broken("EAST"))
			if name != "an open quotation" { // which swallows the rest of the file
				assert.NotNil(t, set.Broken("NORTH"))
				assert.Len(t, stepsOf("NORTH", grid.Average, harbour), 1)
				assert.Len(t, set.All(), 2, "NORTH and EAST")
			}
		})
	}
}

// TestDecimalComma: without quotation marks it shifts the fields behind it. A
// row must not be taken for 412 because the column after it is not needed.
func TestDecimalComma(t *testing.T) {
	f := read(t, "north.csv", "zone,from,to,factor,g_per_kwh\nNORTH,2031-03-01T00:00:00Z,2031-03-01T01:00:00Z,average,412,5\n")
	oneFinding(t, f, 2, "6 fields")
	assert.Empty(t, stepsOf("NORTH", grid.Average, f))
}

// TestBadHeader: of a file without its columns nothing is known, so that every
// zone may be concerned.
func TestBadHeader(t *testing.T) {
	row := rows("NORTH", grid.Average, step(0, 1, 412))
	for name, c := range map[string]struct{ text, what string }{
		"empty file":        {"", `no column "zone"`},
		"no header":         {row, `no column "zone"`},
		"no factor":         {"zone,from,to,g_per_kwh\n" + row, `no column "factor"`},
		"capitals":          {"zone,from,To,g_per_kwh,factor\n" + row, `no column "to"`},
		"semicolons":        {strings.ReplaceAll(header+row, ",", ";"), `no column "zone"`},
		"a column twice":    {"zone,from,to,g_per_kwh,factor,g_per_kwh\n" + row[:len(row)-1] + ",98\n", `two columns "g_per_kwh"`},
		"an open quotation": {`"` + header + row, `no column "zone"`},
	} {
		t.Run(name, func(t *testing.T) {
			f := read(t, "grid/harbour.csv", c.text)
			oneFinding(t, f, 1, c.what)
			set := grid.NewSet(grid.Direct, f)
			assert.NotNil(t, set.Broken("NORTH"))
			assert.NotNil(t, set.Broken("SOUTH"))
			assert.Empty(t, set.All())
		})
	}
}

// TestManyFindings: a file of rubbish stays small in memory and in print.
func TestManyFindings(t *testing.T) {
	f := read(t, "grid/harbour.csv", header+strings.Repeat("NORTH,yesterday,today,412,average\n", 1000))
	assert.Equal(t, 1000, f.Findings.Len())
	lines := f.Findings.Lines()
	assert.Less(t, len(lines), 30)
	assert.Contains(t, lines[len(lines)-1], "980 more")
}

// TestFindingText: it reads as people and editors expect.
func TestFindingText(t *testing.T) {
	f := read(t, "grid/harbour.csv", badRow("NORTH,2031-03-01T01:00:00Z,2031-03-01T02:00:00Z,-1,average"))
	assert.Equal(t, []string{`grid/harbour.csv:3: the intensity "-1" is not a finite decimal number of g/kWh from 0 up; ` +
		"mend the row, or leave its intensity empty for a hole"}, f.Findings.Lines())
}
