package ledger

import (
	"context"
	"fmt"
	"math"

	"github.com/jackc/pgx/v5"

	"budgetcheck/budget/finding"
)

// restore is what to do where the tables do not agree with each other.
const restore = "find out what else writes to the database, and restore it from a copy"

// Vet goes through the lines as the other stores do, works out from them what
// all other tables must hold, and compares. It looks at one repository after
// the other, for that has to fit into memory.
func (s *postgres) Vet(ctx context.Context) (*finding.List, error) {
	var v *audit
	err := s.transact(ctx, pgx.ReadOnly, func(ctx context.Context, tx pgx.Tx) error {
		v = &audit{vetting: newVetting(), tx: tx}
		heads, err := v.heads(ctx)
		if err != nil {
			return err
		}
		for _, h := range heads {
			if err := v.repository(ctx, h.repository, h.n); err != nil {
				return err
			}
		}
		return nil
	})
	if err != nil {
		return nil, s.failure("vet", err)
	}
	return v.findings, nil
}

// audit is the vetting of a database.
type audit struct {
	*vetting
	tx      pgx.Tx
	inForce map[Key]kept // of the repository at hand
	marks   map[id]int64 // number of their lines
	chain   id           // of the line before
}

// heads are all repositories and what is said to be their last line.
func (v *audit) heads(ctx context.Context) (list []lineRow, err error) {
	rows, _ := v.tx.Query(ctx, "SELECT coalesce(h.repository, l.repository), coalesce(h.n, 0) FROM ledger_heads h"+
		" FULL JOIN (SELECT DISTINCT repository FROM ledger_lines) l ON l.repository = h.repository ORDER BY 1")
	err = rows2(func(repository string, n int64) error {
		list = append(list, lineRow{repository: repository, n: n})
		return nil
	})(rows)
	return list, err
}

// repository vets one.
func (v *audit) repository(ctx context.Context, repository string, last int64) error {
	v.page(nameOf(repository))
	v.last = math.MinInt64 // times of repositories have nothing to do with each other
	v.force, v.inForce, v.marks, v.chain = force{}, map[Key]kept{}, map[id]int64{}, id{}
	rows, _ := v.tx.Query(ctx, "SELECT n, body, chain FROM ledger_lines WHERE repository = $1 ORDER BY n", repository)
	if err := rows3(v.take)(rows); err != nil {
		return err
	}
	if int64(v.no) != last {
		v.add(fmt.Sprintf("the last line is %d, the repository's head says %d", v.no, last), restore)
	}
	return v.derived(ctx, repository)
}

// take vets line n.
func (v *audit) take(n int64, body string, chain id) error {
	if n != int64(v.no)+1 {
		v.no++
		v.add(fmt.Sprintf("lines %d to %d are missing", v.no, n-1), restore)
	} else if v.no++; chain != chained(v.chain, body) {
		v.add("the line is not as it was booked", restore)
	}
	v.no, v.chain = int(n)-1, chain
	l, _ := parse([]byte(body))
	if l.entry == nil {
		if l.mark != nil {
			v.marks[l.mark.id()] = n
		}
		v.line([]byte(body))
		return nil
	}
	k := l.entry.Key()
	was := v.force.get(k)
	v.line([]byte(body))
	if is := v.force.get(k); is != was {
		v.inForce[k] = kept{is, n}
	}
	return nil
}
