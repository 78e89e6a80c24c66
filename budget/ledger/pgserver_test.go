//go:build unix

package ledger

import (
	"fmt"
	"net"
	"os"
	"os/exec"
	"os/user"
	"path/filepath"
	"strconv"
	"strings"
	"sync"
	"syscall"
	"testing"
	"time"

	"github.com/jackc/pgx/v5"
	"github.com/stretchr/testify/require"
)

// dbPassword is the server's; no error may show it.
const dbPassword = "s3cret-tide"

// server is the database server of this run of the tests, on loopback. It is
// started for the first test that needs it.
var server struct {
	once  sync.Once
	bin   string // folder of its programs; empty if there are none
	dir   string
	port  int
	err   error
	admin *pgx.Conn
	stdin any // held open: the server stops when it closes, however the tests end
	count int
	mutex sync.Mutex
}

// freshDatabase makes an empty ledger's place for a test and gives its address:
// a schema of its own, for that takes a millisecond and a database a hundred.
func freshDatabase(t testing.TB) string {
	t.Helper()
	server.once.Do(func() { server.err = startServer() })
	if server.bin == "" {
		if os.Getenv("CI") != "" {
			t.Fatal("there is no PostgreSQL server program; .github/test.sh installs it")
		}
		t.Skip("there is no PostgreSQL server program; on Debian: apt-get install postgresql-15")
	}
	require.NoError(t, server.err)
	server.mutex.Lock()
	server.count++
	name := fmt.Sprintf("ledger%d", server.count)
	server.mutex.Unlock()
	administer(t, "CREATE SCHEMA "+name)
	return address("postgres") + "&search_path=" + name
}

func address(database string) string {
	return fmt.Sprintf("postgres://postgres:%s@127.0.0.1:%d/%s?sslmode=disable", dbPassword, server.port, database)
}

// administer runs a statement as the administrator.
func administer(t testing.TB, statement string, args ...any) {
	t.Helper()
	server.mutex.Lock()
	defer server.mutex.Unlock()
	_, err := server.admin.Exec(ctx, statement, args...)
	require.NoError(t, err)
}

// connected is a plain connection.
func connected(t testing.TB, url string) *pgx.Conn {
	t.Helper()
	db, err := pgx.Connect(ctx, url)
	require.NoError(t, err)
	return db
}

// keeper runs the server until its own input ends, and clears up. It is a
// process of its own so that no server stays behind a killed test.
const keeper = `cd "$1" && "$2/initdb" -D data -A trust --pwfile=password -U postgres --locale=C -E UTF8 -N >log 2>&1 &&
printf 'host all postgres 127.0.0.1/32 trust\nhost all all 127.0.0.1/32 scram-sha-256\n' >data/pg_hba.conf &&
{ "$2/postgres" -D data -h 127.0.0.1 -p "$3" -c unix_socket_directories= -c fsync=off -c max_connections=200 >>log 2>&1 & }
pid=$!
cat
kill -QUIT $pid; wait $pid; cd / && rm -rf "$1"`

func startServer() error {
	if server.bin = programs(); server.bin == "" {
		return nil
	}
	dir, err := os.MkdirTemp("", "budgetcheck-postgres")
	if err != nil {
		return err
	}
	server.dir, server.port = dir, freePort()
	if err := os.WriteFile(filepath.Join(dir, "password"), []byte(dbPassword), 0o644); err != nil {
		return err
	}
	cmd := exec.Command("sh", "-c", keeper, "sh", dir, server.bin, strconv.Itoa(server.port))
	cmd.SysProcAttr = &syscall.SysProcAttr{Setpgid: true}
	if err := unprivileged(cmd, dir); err != nil {
		return err
	}
	if server.stdin, err = cmd.StdinPipe(); err != nil {
		return err
	}
	if err := cmd.Start(); err != nil {
		return err
	}
	return awaitServer()
}

// unprivileged makes root run the command as the user postgres, as the server
// asks for.
func unprivileged(cmd *exec.Cmd, dir string) error {
	if os.Getuid() != 0 {
		return nil
	}
	u, err := user.Lookup("postgres")
	if err != nil {
		return err
	}
	uid, _ := strconv.Atoi(u.Uid)
	gid, _ := strconv.Atoi(u.Gid)
	cmd.SysProcAttr.Credential = &syscall.Credential{Uid: uint32(uid), Gid: uint32(gid)}
	return os.Chown(dir, uid, gid)
}

// programs is the folder of the server's programs.
func programs() string {
	if path, err := exec.LookPath("initdb"); err == nil {
		if path, err = filepath.EvalSymlinks(path); err == nil {
			return filepath.Dir(path)
		}
	}
	all, _ := filepath.Glob("/usr/lib/postgresql/*/bin/initdb")
	if len(all) == 0 {
		return ""
	}
	return filepath.Dir(all[len(all)-1])
}

func freePort() int {
	l, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		return 0
	}
	defer l.Close()
	return l.Addr().(*net.TCPAddr).Port
}

// awaitServer waits for the server.
func awaitServer() (err error) {
	for range 600 {
		if server.admin, err = pgx.Connect(ctx, address("postgres")); err == nil {
			return nil
		}
		time.Sleep(100 * time.Millisecond)
	}
	log, _ := os.ReadFile(filepath.Join(server.dir, "log"))
	return fmt.Errorf("%w\n%s", err, strings.TrimSpace(string(log)))
}
