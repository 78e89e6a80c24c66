package ledger

import (
	"context"

	"github.com/jackc/pgx/v5"
)

// Read gives what the query asks for, as of one moment.
func (s *postgres) Read(ctx context.Context, q Query) (*Books, error) {
	var b *Books
	err := s.transact(ctx, pgx.ReadOnly, func(ctx context.Context, tx pgx.Tx) error {
		b = &Books{Since: q.Since}
		newest, err := q.newest(ctx, tx)
		if err != nil {
			return err
		}
		var batch pgx.Batch
		for _, ask := range append(newest, q.marks()) {
			batch.Queue(ask.text, ask.args...).Query(rows3(b.take))
		}
		return tx.SendBatch(ctx, &batch).Close()
	})
	if err != nil {
		return nil, s.failure("read", err)
	}
	b.sort()
	if q.Last > 0 {
		b.Entries = lastRuns(b.Entries, q.Last)
	}
	return b, nil
}

// take takes line n of a repository. One that cannot be read is a finding.
func (b *Books) take(repository string, n int64, body string) error {
	l, err := parse([]byte(body))
	switch {
	case err != nil:
		b.Findings.Add(unreadable(nameOf(repository), int(n), err))
	case l.mark != nil:
		b.Marks = append(b.Marks, l.mark)
	default:
		b.Entries = append(b.Entries, l.entry)
	}
	return nil
}

// nameOf is what findings call the lines of a repository.
func nameOf(repository string) string {
	if repository == "" {
		return "postgres"
	}
	return "postgres " + repository
}
