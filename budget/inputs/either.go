package inputs

import (
	"context"
	"errors"
)

// Either asks each repository in turn: a shallow clone first, then the API of
// the code host. Only what the first does not have is asked of the next.
type Either []Repository

// Tree lists the files of a commit.
func (e Either) Tree(ctx context.Context, commit string) (Tree, error) {
	return first(e, func(r Repository) (Tree, error) { return r.Tree(ctx, commit) })
}

// Blob reads a file's content.
func (e Either) Blob(ctx context.Context, f File) ([]byte, error) {
	return first(e, func(r Repository) ([]byte, error) { return r.Blob(ctx, f) })
}

// Meet tells where head left a branch.
func (e Either) Meet(ctx context.Context, ref, head string) (tip, base string, err error) {
	type met struct{ tip, base string }
	m, err := first(e, func(r Repository) (m met, err error) {
		m.tip, m.base, err = r.Meet(ctx, ref, head)
		return m, err
	})
	return m.tip, m.base, err
}

// first is the first answer; any failure sends the question on, and the last
// failure is told.
func first[T any](repos Either, ask func(Repository) (T, error)) (answer T, err error) {
	err = errors.New("there is no repository to ask")
	for _, r := range repos {
		if answer, err = ask(r); err == nil {
			return answer, nil
		}
	}
	return answer, err
}
