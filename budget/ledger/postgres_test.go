//go:build unix

package ledger

import (
	"context"
	"errors"
	"fmt"
	"strings"
	"sync"
	"testing"
	"time"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
)

// opener opens one ledger, emptied for each test, which is quicker than to
// make its tables each time. The tests come one after the other.
func opener(t *testing.T) func(*testing.T) Store {
	url := freshDatabase(t)
	var last *testing.T
	return func(t *testing.T) Store {
		t.Helper()
		s := opened(t, url)
		if last != t {
			empty(t, s)
			last = t
		}
		return s
	}
}

// opened opens a ledger for the time of a test.
func opened(t testing.TB, url string) *postgres {
	t.Helper()
	s, err := Open(ctx, url)
	require.NoError(t, err)
	t.Cleanup(func() { s.Close() })
	return s.(*postgres)
}

func TestPostgres(t *testing.T) { suite(t, opener(t)) }

// TestPostgresFirstUsers: of several that find no tables all go on.
func TestPostgresFirstUsers(t *testing.T) {
	url := freshDatabase(t)
	var wait sync.WaitGroup
	for n := range 6 {
		wait.Go(func() {
			s, err := Open(ctx, url)
			if !assert.NoError(t, err) {
				return
			}
			defer s.Close()
			answers, err := s.Book(ctx, []*Entry{entry(fmt.Sprint("r", n))}, nil)
			assert.NoError(t, err)
			assert.Equal(t, []Answer{Booked}, answers)
		})
	}
	wait.Wait()
	s := opened(t, url)
	assert.Len(t, read(t, s, Query{}).Entries, 6)
	sound(t, s)
}

// TestPostgresNewer: tables of a later version are left alone.
func TestPostgresNewer(t *testing.T) {
	url := freshDatabase(t)
	s := opened(t, url)
	_, err := s.pool.Exec(ctx, "INSERT INTO ledger_version (version) VALUES (99)")
	require.NoError(t, err)
	_, err = Open(ctx, url)
	assert.ErrorContains(t, err, "of version 99, this program knows 1; use a newer one")
}

// TestPostgresNames: names of any length, and of signs that are no text to
// the database.
func TestPostgresNames(t *testing.T) {
	s := opened(t, freshDatabase(t))
	for n, name := range []string{strings.Repeat("潮 tide-", 2000), "nothing\x00here", "\x01", cell("\x00")} {
		e := entry(name, lasting(float64(n), 1), charged(name), job(name, name), repository(name), inputs(name), commit(name), part(name, 2))
		require.Equal(t, []Answer{Booked}, book(t, s, e))
		require.Equal(t, []Answer{Already}, book(t, s, e))
		b := read(t, s, Query{Repository: name, Accounts: []string{name}, Inputs: []string{name}})
		require.Len(t, b.Entries, 1)
		alike(t, e, b.Entries[0])
		w := Window{Repository: name, Account: name, From: hours(0), To: hours(9)}
		require.Equal(t, b.Spent(w), spentBy(t, s, w))
	}
	sound(t, s)
}

func spentBy(t test, s Summing, w Window) Spending {
	t.Helper()
	sum, err := s.Spent(ctx, w)
	require.NoError(t, err)
	return sum
}

// TestPostgresNoDrift: what is taken out of the sums leaves nothing behind,
// where floating point would have lost the small figure in the large one.
func TestPostgresNoDrift(t *testing.T) {
	s := opened(t, freshDatabase(t))
	book(t, s, entry("small", energy(0.1)), entry("large", lasting(0, 1), func(e *Entry) { e.Hours[0].KWh = 1e17 }))
	large := read(t, s, Query{}).Entries[0]
	require.Equal(t, "large", large.Run.Run)
	book(t, s, entry("large", correcting(large), func(e *Entry) { e.Hours[0].KWh = 0 }))
	sum := spentBy(t, s, Window{Account: "main", From: hours(0), To: hours(1)})
	require.Len(t, sum.Lines, 1)
	assert.Equal(t, entry("small").Hours[0].KWh, sum.Lines[0].Facility)
	sound(t, s)
}

// TestPostgresDeadline: who waits for another booking waits no longer than the
// context allows, and nothing of it is booked.
func TestPostgresDeadline(t *testing.T) {
	url := freshDatabase(t)
	s := opened(t, url)
	book(t, s, entry("r1"))
	other := connected(t, url)
	defer other.Close(ctx)
	_, err := other.Exec(ctx, "BEGIN; UPDATE ledger_heads SET n = n")
	require.NoError(t, err)
	short, cancel := context.WithTimeout(ctx, 100*time.Millisecond)
	defer cancel()
	_, err = s.Book(short, []*Entry{entry("r2")}, nil)
	assert.ErrorIs(t, err, context.DeadlineExceeded)
	_, err = other.Exec(ctx, "ROLLBACK")
	require.NoError(t, err)
	assert.Equal(t, []Answer{Already, Booked}, book(t, s, entry("r1"), entry("r2")))
	sound(t, s)
}

// TestPostgresReader: who may only read can judge, and is told what is missing
// for booking.
func TestPostgresReader(t *testing.T) {
	url := freshDatabase(t)
	s := opened(t, url)
	book(t, s, entry("r1"))
	administer(t, "CREATE ROLE reader LOGIN PASSWORD '"+dbPassword+"'")
	schema := url[strings.LastIndex(url, "=")+1:]
	administer(t, "GRANT USAGE ON SCHEMA "+schema+" TO reader")
	administer(t, "GRANT SELECT ON ALL TABLES IN SCHEMA "+schema+" TO reader")
	url = strings.Replace(url, "postgres:"+dbPassword, "reader:"+dbPassword, 1)
	reader := opened(t, url)
	assert.Equal(t, []string{"r1"}, names(read(t, reader, Query{})))
	assert.Len(t, spentBy(t, reader, Window{From: hours(0), To: hours(1)}).Lines, 1)
	sound(t, reader)
	_, err := reader.Book(ctx, []*Entry{entry("r2")}, nil)
	assert.ErrorContains(t, err, "INSERT, UPDATE and DELETE to book")
	_, err = Open(ctx, strings.Replace(url, schema, "public", 1))
	assert.ErrorContains(t, err, "CREATE on the schema once")
}

// TestPostgresPassword: no error shows it, and each says what to do or what
// the network said.
func TestPostgresPassword(t *testing.T) {
	good := freshDatabase(t)
	administer(t, "CREATE ROLE clerk LOGIN PASSWORD 'another'")
	replace := func(old, with string) string { return strings.Replace(good, old, with, 1) }
	for name, c := range map[string]struct{ url, says string }{
		"wrong":        {replace("postgres:"+dbPassword, "clerk:"+dbPassword), "check user and password"},
		"no user":      {replace("postgres:"+dbPassword, "nobody:"+dbPassword), "check user and password"},
		"no database":  {replace("/postgres?", "/nowhere?"), "create the database"},
		"nobody there": {replace(fmt.Sprint(":", server.port), ":1"), "refused"},
		"no port":      {replace(fmt.Sprint(":", server.port), ":port"), "cannot be read"},
		"no option":    {replace("sslmode=disable", "sslmode="+dbPassword), "cannot be read"},
		"no escape":    {replace(dbPassword, dbPassword+"%zz"), "cannot be read"},
		"in the query": {replace("postgres:"+dbPassword+"@", "clerk@") + "&password=" + dbPassword, "check user and password"},
		"no host":      {"postgres://clerk:" + dbPassword + "@[", "cannot be read"},
		"another kind": {"mysql://clerk:" + dbPassword + "@host/db", "no ledger"},
	} {
		_, err := Open(ctx, c.url)
		if assert.Error(t, err, name) {
			assert.Contains(t, err.Error(), c.says, name)
			for ; err != nil; err = errors.Unwrap(err) {
				assert.NotContains(t, err.Error(), dbPassword, name)
			}
		}
	}
}

// TestPostgresClosed: a closed ledger is an error, no wait.
func TestPostgresClosed(t *testing.T) {
	s := opened(t, freshDatabase(t))
	require.NoError(t, s.Close())
	_, err := s.Read(ctx, Query{})
	assert.ErrorContains(t, err, "cannot read the ledger in PostgreSQL: closed pool")
}
