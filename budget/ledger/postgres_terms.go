package ledger

import (
	"fmt"
	"strings"

	"github.com/jackc/pgx/v5"
)

// terms are conditions of a statement, and its arguments.
type terms struct {
	conditions []string
	args       []any
}

// add appends a condition, in which $ stands for the argument.
func (t *terms) add(condition string, arg any) {
	t.conditions = append(t.conditions, strings.ReplaceAll(condition, "$", t.arg(arg)))
}

// arg gives an argument its place.
func (t *terms) arg(arg any) string {
	t.args = append(t.args, arg)
	return fmt.Sprintf("$%d", len(t.args))
}

// String is all conditions together; there must be one.
func (t *terms) String() string { return strings.Join(t.conditions, " AND ") }

// of is the condition that something is of the repository; what is of none is
// of any.
func (t *terms) of(column, repository string) {
	if repository != "" {
		t.add(column+" = ANY($)", []string{"", cell(repository)})
	}
}

// rows1 to rows4 hand rows of so many columns on.
func rows1[A any](take func(A) error) func(pgx.Rows) error {
	return func(rows pgx.Rows) error {
		var a A
		_, err := pgx.ForEachRow(rows, []any{&a}, func() error { return take(a) })
		return err
	}
}

func rows2[A, B any](take func(A, B) error) func(pgx.Rows) error {
	return func(rows pgx.Rows) error {
		var a A
		var b B
		_, err := pgx.ForEachRow(rows, []any{&a, &b}, func() error { return take(a, b) })
		return err
	}
}

func rows3[A, B, C any](take func(A, B, C) error) func(pgx.Rows) error {
	return func(rows pgx.Rows) error {
		var a A
		var b B
		var c C
		_, err := pgx.ForEachRow(rows, []any{&a, &b, &c}, func() error { return take(a, b, c) })
		return err
	}
}

func rows4[A, B, C, D any](take func(A, B, C, D) error) func(pgx.Rows) error {
	return func(rows pgx.Rows) error {
		var a A
		var b B
		var c C
		var d D
		_, err := pgx.ForEachRow(rows, []any{&a, &b, &c, &d}, func() error { return take(a, b, c, d) })
		return err
	}
}
