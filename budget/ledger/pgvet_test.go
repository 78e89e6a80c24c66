//go:build unix

package ledger

import (
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
)

// TestPostgresVet: whatever another hand changed is found, each by itself.
func TestPostgresVet(t *testing.T) {
	s := opened(t, freshDatabase(t))
	for _, c := range []struct{ statement, says string }{
		{"DELETE FROM ledger_lines WHERE n = 2", "postgres harbour/tide:2: lines 2 to 2 are missing; find out what else writes"},
		{"DELETE FROM ledger_lines WHERE n = 4", "postgres harbour/tide:3: the last line is 3, the repository's head says 4"},
		{"UPDATE ledger_lines SET body = left(body, 40) WHERE n = 3", "postgres harbour/tide:3: the line cannot be read"},
		{"UPDATE ledger_lines SET body = replace(body, '\"kwh\":1', '\"kwh\":2') WHERE n = 2", "in the hour from 2031-03-01T00:00:00Z it has 1, the entries 2"},
		{"UPDATE ledger_lines SET body = replace(body, 'main', 'Main') WHERE n = 2", "table ledger_entries does not follow from the lines: 1 rows are missing or differ, 1 are"},
		{"UPDATE ledger_lines SET body = replace(body, 'main', 'Main') WHERE n = 1", "postgres harbour/tide:1: the line is not as it was booked"},
		{"UPDATE ledger_lines SET body = (SELECT body FROM ledger_lines WHERE n = 1) WHERE n = 3", "postgres harbour/tide:3: run r1, attempt 1 is there twice"},
		{"UPDATE ledger_lines SET body = replace(body, '2031-03-01T02:01:00Z', '2031-01-01T02:01:00Z') WHERE n = 3", "postgres harbour/tide:3: booked_at goes back"},
		{"INSERT INTO ledger_lines SELECT 'harbour/ebb', 1, body, chain FROM ledger_lines WHERE n = 1", "postgres harbour/ebb:1: the last line is 1, the repository's head says 0"},
		{"UPDATE ledger_heads SET n = 7", "postgres harbour/tide:4: the last line is 4, the repository's head says 7"},
		{"DELETE FROM ledger_entries", "table ledger_entries does not follow from the lines: 2 rows are missing or differ, 0 are"},
		{"UPDATE ledger_entries SET ends = ends + 1 WHERE n = 3", "table ledger_entries does not follow from the lines: 1 rows are missing or differ, 1 are"},
		{"DELETE FROM ledger_groups", "table ledger_hours does not follow from the lines"},
		{"UPDATE ledger_attempts SET latest = latest + 1", "table ledger_attempts does not follow from the lines: 2 rows"},
		{"DELETE FROM ledger_going WHERE hour % 2 = 0", "table ledger_going does not follow from the lines"},
		{"DELETE FROM ledger_hours", "table ledger_hours does not follow from the lines: in the hour from 2031-03-01T00:00:00Z it has 0, the entries 1"},
		{"UPDATE ledger_hours SET sure_g = sure_g * 1.0001", "table ledger_hours does not follow from the lines: in the hour from"},
		{"UPDATE ledger_days SET facility_kwh = facility_kwh + 1", "table ledger_days does not follow from the hours: 1 days differ"},
		{"DELETE FROM ledger_days", "table ledger_days does not follow from the hours: 1 days differ"},
		{"UPDATE ledger_hours SET begun = begun + 1", "the numbers of runs in table ledger_hours"},
		{"DELETE FROM ledger_marks", "postgres harbour/tide:4: the release is missing from table ledger_marks"},
		{"UPDATE ledger_marks SET n = 1", "postgres harbour/tide:1: table ledger_marks has a release that its line does not tell of"},
	} {
		empty(t, s)
		killed := entry("r1", unclosed)
		_, err := s.Book(ctx, []*Entry{killed, entry("r1", lasting(0, 1)), entry("r2", lasting(1, 1))}, []*Mark{mark("v1", 5)})
		require.NoError(t, err)
		sound(t, s)
		_, err = s.pool.Exec(ctx, c.statement)
		require.NoError(t, err)
		found, err := s.Vet(ctx)
		require.NoError(t, err)
		assert.Contains(t, join(found.Lines()), c.says, c.statement)
	}
}

func join(lines []string) string { return strings.Join(lines, "\n") }

// TestPostgresUnreadable: a line that cannot be read is a finding for who
// reads, and an error for who would go on without it.
func TestPostgresUnreadable(t *testing.T) {
	s := opened(t, freshDatabase(t))
	book(t, s, entry("r1"), entry("r2"))
	_, err := s.pool.Exec(ctx, "UPDATE ledger_lines SET body = '{' WHERE n = 1")
	require.NoError(t, err)
	b := read(t, s, Query{})
	assert.Equal(t, []string{"r2"}, names(b))
	assert.Contains(t, join(b.Findings.Lines()), "postgres harbour/tide:1: the line cannot be read")
	_, err = s.Spent(ctx, Window{From: hours(0.5), To: hours(1)})
	assert.ErrorContains(t, err, "vet the ledger")
	_, err = s.Book(ctx, []*Entry{entry("r1", lasting(0, 2))}, nil)
	assert.ErrorContains(t, err, "vet the ledger")
	assert.Equal(t, []Answer{Booked}, book(t, s, entry("r3")))
}

// TestPostgresLast: the newest run is the one with the newest part that is
// asked for, also where it began before another.
func TestPostgresLast(t *testing.T) {
	s := opened(t, freshDatabase(t))
	south := func(e *Entry) { e.Site = "quay-south" }
	book(t, s, entry("x", lasting(0, 1), part("a", 3)), entry("x", lasting(6, 1), part("b", 3)), entry("x", lasting(9, 1), part("c", 3), south),
		entry("y", lasting(3, 1)))
	assert.Equal(t, []string{"xa", "xb", "xc"}, names(read(t, s, Query{Last: 1})))
	assert.Equal(t, []string{"xa", "xb"}, names(read(t, s, Query{Last: 1, Until: hours(8)})))
	assert.Equal(t, []string{"y"}, names(read(t, s, Query{Last: 1, Until: hours(5)})))
	assert.Equal(t, []string{"xb", "xc"}, names(read(t, s, Query{Last: 1, Since: hours(2)})))
}
