package grid_test

import (
	"regexp"
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget/grid"
)

// told is how every finding reads: file, line, what is wrong, what to do.
var told = regexp.MustCompile(`(?s)^harbour\.csv:[1-9][0-9]*: .+; .+$|^harbour\.csv: [1-9][0-9]* more like these$`)

func FuzzReadCSV(f *testing.F) {
	const row = "NORTH,2031-03-01T00:00:00Z,2031-03-01T01:00:00Z,412,average\n"
	for _, seed := range []string{
		"", "\n", "\ufeff", header, header + row, header + row + row, "\ufeff" + strings.ReplaceAll(header+row, "\n", "\r\n"),
		header + strings.Replace(row, "412", "", 1), header + strings.Replace(row, "412", "0x1p4", 1),
		header + strings.Replace(row, "412", "-0", 1), header + strings.Replace(row, "412", "NaN", 1),
		header + `"NORTH` + row, header + `N"ORTH` + row, header + row[:40], header + strings.Repeat("x\n", 30),
		header + row + strings.Replace(row, "00:00:00Z", "00:59:59.999999999Z", 1),
		header + strings.Replace(row, "2031-03-01T01:00:00Z", "2262-04-11T23:47:16Z", 1),
		"factor,zone,g_per_kwh,to,from,zone\n", "factor,g_per_kwh,to,from,zone\nmarginal,1,2031-03-01T01:00:00Z,2031-03-01T01:00:00+01:00,\xff\n",
	} {
		f.Add(seed)
	}
	f.Fuzz(func(t *testing.T, text string) {
		file, err := grid.ReadCSV(strings.NewReader(text), "harbour.csv", grid.Columns{})
		require.NoError(t, err, "only a failure to read is an error")
		for _, line := range file.Findings.Lines() {
			assert.Regexp(t, told, line)
		}
		set := grid.NewSet(grid.Direct, file, file)
		assert.Empty(t, set.Notes(), "a file does not differ from itself")
		for _, s := range set.All() {
			inOrder(t, s)
			_, end := s.Span()
			require.Greater(t, grid.Pricer{Series: s}.At(end).Until, end)
		}
	})
}
