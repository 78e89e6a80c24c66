package ledger

import (
	"context"
	"errors"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"time"
)

// with does something in the repository that the ledger is seen from. One of
// our own is used by one process at a time; it is a cache, and thrown away
// whenever something is odd about it.
func (s *gitStore) with(ctx context.Context, do func(*repo) error) error {
	if s.remote == "" {
		return do(&repo{store: s, dir: s.home})
	}
	held, err := s.hold(ctx)
	if err != nil {
		if ctx.Err() != nil {
			return err
		}
		return s.without(ctx, do) // somebody hangs, or nothing can be kept here
	}
	defer func() { _ = held.Close() }()
	kept, err := s.prepare(ctx)
	if err != nil {
		return s.without(ctx, do)
	}
	err = do(&repo{store: s, dir: s.home, own: true})
	if err == nil || !kept || errors.Is(err, errLate) || ctx.Err() != nil {
		return err
	}
	if s.discard() != nil || s.create(ctx, s.home) != nil {
		return err
	}
	return do(&repo{store: s, dir: s.home, own: true})
}

// without does it in a repository for this time only.
func (s *gitStore) without(ctx context.Context, do func(*repo) error) error {
	return s.aside(ctx, &repo{}, do)
}

// withAll does something in a repository that has the whole history.
func (s *gitStore) withAll(ctx context.Context, do func(*repo) error) error {
	if s.remote == "" {
		return do(&repo{store: s, dir: s.home})
	}
	return s.aside(ctx, &repo{full: true}, do)
}

func (s *gitStore) aside(ctx context.Context, r *repo, do func(*repo) error) error {
	dir, err := os.MkdirTemp("", "budgetcheck-")
	if err != nil {
		return err
	}
	defer func() { _ = os.RemoveAll(dir) }()
	r.store, r.dir, r.own = s, filepath.Join(dir, "git"), true
	if err := s.create(ctx, r.dir); err != nil {
		return err
	}
	return do(r)
}

// hold takes the lock of our repository.
func (s *gitStore) hold(ctx context.Context) (*os.File, error) {
	if err := os.MkdirAll(filepath.Dir(s.home), 0o777); err != nil {
		return nil, err
	}
	f, err := os.OpenFile(s.home+".lock", os.O_RDWR|os.O_CREATE, 0o666)
	if err != nil {
		return nil, err
	}
	const patience = 30 * time.Second
	ctx, cancel := context.WithTimeout(ctx, patience)
	defer cancel()
	if err := lock(ctx, f, true); err != nil {
		_ = f.Close()
		return nil, err
	}
	return f, nil
}

// ready marks a repository that has been made wholly.
const ready = "budgetcheck-ready"

// prepare makes our repository where there is none; kept tells that there was.
func (s *gitStore) prepare(ctx context.Context) (kept bool, err error) {
	if _, err := os.Stat(filepath.Join(s.home, ready)); err == nil && !littered(s.home) {
		return true, nil
	}
	if err := s.discard(); err != nil {
		return false, err
	}
	return false, s.create(ctx, s.home)
}

// create makes a bare repository.
func (s *gitStore) create(ctx context.Context, dir string) error {
	if err := os.MkdirAll(dir, 0o777); err != nil {
		return err
	}
	r := &repo{store: s, dir: dir}
	if _, err := r.run(ctx, nil, "init", "--quiet", "--bare", "--template=", "."); err != nil {
		return err
	}
	return os.WriteFile(filepath.Join(dir, ready), nil, 0o666)
}

// discard takes our repository away. What still runs in it keeps its folder.
func (s *gitStore) discard() error {
	old, err := os.MkdirTemp(filepath.Dir(s.home), filepath.Base(s.home)+".old-")
	if err != nil {
		return err
	}
	err = os.Rename(s.home, filepath.Join(old, "git"))
	_ = os.RemoveAll(old)
	return except(err, fs.ErrNotExist)
}

// littered tells that a git was killed and left locks, or that so much has
// gathered that fetching afresh is better.
func littered(dir string) (yes bool) {
	const most = 400
	files := 0
	_ = filepath.WalkDir(dir, func(path string, d fs.DirEntry, err error) error {
		if err != nil {
			return nil
		}
		files++
		if yes = files > most || strings.HasSuffix(path, ".lock"); yes {
			return fs.SkipAll
		}
		return nil
	})
	return yes
}
