//go:build unix

package ledger

import (
	"bytes"
	"fmt"
	"io"
	"net"
	"strings"
	"sync/atomic"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
)

// cutter stands between the store and the server. Once it is armed, the first
// message that holds the text is let through or not, and then the connection
// is cut on both sides.
type cutter struct {
	net.Listener
	text  []byte
	armed atomic.Bool
	pass  bool   // the message reaches the server, its answer never comes back
	first func() // before that
}

// cutting gives the address of a ledger behind a cutter.
func cutting(t *testing.T, url, text string) (*cutter, string) {
	t.Helper()
	l, err := net.Listen("tcp", "127.0.0.1:0")
	require.NoError(t, err)
	t.Cleanup(func() { l.Close() })
	c := &cutter{Listener: l, text: []byte(text), first: func() {}}
	go c.serve()
	return c, strings.Replace(url, fmt.Sprint(":", server.port), fmt.Sprint(":", l.Addr().(*net.TCPAddr).Port), 1)
}

func (c *cutter) serve() {
	for {
		client, err := c.Accept()
		if err != nil {
			return
		}
		go c.join(client)
	}
}

func (c *cutter) join(client net.Conn) {
	defer client.Close()
	db, err := net.Dial("tcp", fmt.Sprint("127.0.0.1:", server.port))
	if err != nil {
		return
	}
	defer db.Close()
	var mute atomic.Bool
	go answers(client, db, &mute)
	buffer := make([]byte, 1<<16)
	for {
		n, err := client.Read(buffer)
		if err != nil {
			return
		}
		cut := bytes.Contains(buffer[:n], c.text) && c.armed.CompareAndSwap(true, false)
		if cut {
			mute.Store(c.pass)
			c.first()
		}
		if !cut || c.pass {
			if _, err := db.Write(buffer[:n]); err != nil {
				return
			}
		}
		if cut && c.pass { // the server does its work before it sees the end
			settled(db)
		}
		if cut {
			return
		}
	}
}

// settled ends the writing side and waits until the server has ended its own.
func settled(db net.Conn) {
	db.(*net.TCPConn).CloseWrite()
	io.Copy(io.Discard, db)
}

// answers hands on what the server says, until it is to be muted.
func answers(client, db net.Conn, mute *atomic.Bool) {
	buffer := make([]byte, 1<<16)
	for {
		n, err := db.Read(buffer)
		if err != nil {
			if !mute.Load() {
				client.Close()
			}
			return
		}
		if !mute.Load() {
			client.Write(buffer[:n])
		}
	}
}

// TestPostgresCommitLost: where the connection breaks at the commit it is not
// known what became of it. That is said, and booking again settles it.
func TestPostgresCommitLost(t *testing.T) {
	for name, c := range map[string]struct {
		pass, terminate bool
		again           Answer
	}{
		"on the way":    {false, false, Booked},
		"the answer":    {true, false, Already},
		"by the server": {true, true, Booked}, // it was told to end the connection before
	} {
		url := freshDatabase(t)
		proxy, behind := cutting(t, url, "commit\x00")
		s := opened(t, behind)
		book(t, s, entry("r1"))
		proxy.pass = c.pass
		if c.terminate {
			proxy.first = func() { terminate(t, url) }
		}
		proxy.armed.Store(true)
		_, err := s.Book(ctx, []*Entry{entry("r1"), entry("r2")}, []*Mark{mark("v1", 3)})
		require.ErrorIs(t, err, errUnsure, name)
		assert.ErrorContains(t, err, "book again", name)
		answers, err := s.Book(ctx, []*Entry{entry("r1"), entry("r2")}, []*Mark{mark("v1", 3)})
		require.NoError(t, err, name)
		assert.Equal(t, []Answer{Already, c.again}, answers, name)
		b := read(t, s, Query{})
		assert.Equal(t, []string{"r1", "r2"}, names(b), name)
		assert.Equal(t, []string{"v1"}, tags(b), name)
		sound(t, s)
	}
}

// terminate ends the ledger's connections to a test's database and waits until
// they are gone.
func terminate(t *testing.T, url string) {
	db := connected(t, url+"&application_name=terminator")
	defer db.Close(ctx)
	_, err := db.Exec(ctx, "SELECT pg_terminate_backend(pid, 10000) FROM pg_stat_activity WHERE application_name = 'budgetcheck'")
	assert.NoError(t, err)
}

// TestPostgresCutBefore: a connection that breaks before the commit was sent
// is made again, for nothing is booked yet.
func TestPostgresCutBefore(t *testing.T) {
	for _, text := range []string{"begin", "SELECT repository, n, booked_at", "INSERT INTO ledger_lines"} {
		url := freshDatabase(t)
		proxy, behind := cutting(t, url, text)
		s := opened(t, behind)
		proxy.armed.Store(true)
		assert.Equal(t, []Answer{Booked}, book(t, s, entry("r1")), text)
		assert.False(t, proxy.armed.Load(), "%s was cut", text)
		assert.Equal(t, []Answer{Already}, book(t, s, entry("r1")), text)
		sound(t, s)
	}
}

// TestPostgresIdleCut: connections that the server ended while they were idle
// are noticed.
func TestPostgresIdleCut(t *testing.T) {
	url := freshDatabase(t)
	s := opened(t, url)
	book(t, s, entry("r1"))
	terminate(t, url)
	assert.Equal(t, []Answer{Booked}, book(t, s, entry("r2")))
	terminate(t, url)
	assert.Len(t, read(t, s, Query{}).Entries, 2)
}
