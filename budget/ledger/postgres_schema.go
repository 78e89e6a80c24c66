package ledger

import (
	"context"
	_ "embed" // the schema
	"errors"
	"fmt"

	"github.com/jackc/pgx/v5"
	"github.com/jackc/pgx/v5/pgconn"
)

//go:embed schema1.sql
var schema1 string

// versions are the steps from an empty database to the tables of today. A step
// that was released is never changed; a change is a further step.
var versions = []string{schema1}

// migrate brings the tables to the version of this program. Of several that
// try at once one makes them, and the others find them made. Who finds them
// needs no right to write.
func (s *postgres) migrate(ctx context.Context) error {
	at := 0
	err := s.transact(ctx, pgx.ReadOnly, func(ctx context.Context, tx pgx.Tx) (err error) {
		at, err = version(ctx, tx)
		return err
	})
	switch {
	case err != nil || at == len(versions):
		return err
	case at > len(versions):
		return fmt.Errorf("its tables are of version %d, this program knows %d; use a newer one", at, len(versions))
	}
	return s.transact(ctx, pgx.ReadWrite, steps)
}

// steps makes the steps that are still to be made.
func steps(ctx context.Context, tx pgx.Tx) error {
	at, err := version(ctx, tx)
	if err != nil {
		return err
	}
	for n := at; n < len(versions); n++ {
		if _, err := tx.Exec(ctx, versions[n]); err != nil { // without arguments it may hold many statements
			return err
		}
		if _, err := tx.Exec(ctx, "INSERT INTO ledger_version (version) VALUES ($1)", n+1); err != nil {
			return err
		}
	}
	return nil
}

// version is the version of the tables; 0 where there are none. The catalogue
// is asked first, for a failed statement would end the transaction.
func version(ctx context.Context, tx pgx.Tx) (n int, err error) {
	var there bool
	err = tx.QueryRow(ctx, "SELECT to_regclass('ledger_version') IS NOT NULL").Scan(&there)
	if err != nil || !there {
		return 0, err
	}
	err = tx.QueryRow(ctx, "SELECT coalesce(max(version), 0) FROM ledger_version").Scan(&n)
	return n, err
}

// made tells of an error that means that somebody else has just made what was
// to be made.
func made(err error) bool {
	var e *pgconn.PgError
	if !errors.As(err, &e) {
		return false
	}
	switch e.Code {
	case "42P07", "42710", "23505": // duplicate table, object, row: also of the catalogue
		return true
	}
	return false
}
