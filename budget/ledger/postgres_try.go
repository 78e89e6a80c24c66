package ledger

import (
	"context"
	"errors"
	"fmt"
	"io"
	"net"
	"slices"
	"time"

	"github.com/jackc/pgx/v5"
	"github.com/jackc/pgx/v5/pgconn"
)

// How long a transaction is tried again.
const (
	patience  = 2 * time.Minute // where the context sets no earlier end
	reconnect = 5               // times that a broken connection is made again
	slowly    = 5               // tries after which that begins
	pauseMin  = time.Millisecond
	pauseMax  = 500 * time.Millisecond
)

// errUnsure is a commit whose answer did not come.
var errUnsure = errors.New("the answer to the last step was lost, so it is not known whether it was booked; " +
	"book again, which settles it: nothing is entered twice")

// errBroken is a connection that broke before the commit was sent.
var errBroken = errors.New("the connection broke")

// transact runs a transaction, serializable if it writes, until it is
// committed. It is run again where the database asks for that, and where the
// connection broke before the commit was sent. do must not keep anything of a
// run that failed.
func (s *postgres) transact(ctx context.Context, access pgx.TxAccessMode, do func(context.Context, pgx.Tx) error) error {
	ctx, cancel := context.WithTimeout(ctx, patience)
	defer cancel()
	for try, lost := 0, 0; ; try++ {
		err := s.once(ctx, access, do)
		switch {
		case err == nil, errors.Is(err, errUnsure):
			return err
		case serialization(err):
		case (dropped(err) || made(err)) && lost < reconnect:
			lost++
			try = max(try, slowly)
		default:
			return err
		}
		if late := waitAbout(ctx, pauseAfter(try)); late != nil {
			return fmt.Errorf("%w; the last try: %w", late, err)
		}
	}
}

// once runs the transaction once.
func (s *postgres) once(ctx context.Context, access pgx.TxAccessMode, do func(context.Context, pgx.Tx) error) error {
	level := pgx.Serializable
	if access == pgx.ReadOnly { // one snapshot, which gets in nobody's way
		level = pgx.RepeatableRead
	}
	tx, err := s.pool.BeginTx(ctx, pgx.TxOptions{IsoLevel: level, AccessMode: access})
	if err != nil {
		return err
	}
	defer tx.Rollback(ctx) // without effect after a commit
	if err := do(ctx, tx); err != nil {
		if tx.Conn().IsClosed() {
			return fmt.Errorf("%w: %w", errBroken, err)
		}
		return err
	}
	err = tx.Commit(ctx)
	if err == nil || serialization(err) || access == pgx.ReadOnly {
		return err
	}
	return fmt.Errorf("%w (%w)", errUnsure, err)
}

// pauseAfter is how long to wait after so many tries: longer the more there
// were, so that those that collided part.
func pauseAfter(try int) time.Duration { return min(pauseMin<<min(try, 16), pauseMax) }

// serialization tells of a transaction that others got in the way of, and that
// certainly was not committed (PostgreSQL 15, 13.5 and appendix A).
func serialization(err error) bool {
	var e *pgconn.PgError
	return errors.As(err, &e) && (e.Code == "40001" || e.Code == "40P01")
}

// broken are the errors of a connection that is no more.
var broken = []error{errBroken, io.EOF, io.ErrUnexpectedEOF, net.ErrClosed, pgconn.ErrConnClosed}

// dropped tells of a connection that was not made or broke, other than by a
// context that ended, and is not refused for a reason.
func dropped(err error) bool {
	var e *pgconn.PgError
	if errors.As(err, &e) {
		return slices.Contains([]string{"57P01", "57P02", "57P03", "08000", "08001", "08003", "08004", "08006"}, e.Code)
	}
	var network *net.OpError
	return slices.ContainsFunc(broken, func(b error) bool { return errors.Is(err, b) }) || errors.As(err, &network) || pgconn.SafeToRetry(err)
}
