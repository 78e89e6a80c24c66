package ledger

import (
	"context"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"

	"budgetcheck/budget/finding"
	"budgetcheck/budget/unit"
)

// file keeps the books in one file of newline-delimited JSON, to which lines
// are appended under a lock of the operating system. Lines are in order of
// booking, so that a reader seeks to where it has to begin.
type file struct{ path string }

func openFile(path string) (Store, error) { return &file{path}, nil }

func (s *file) Close() error { return nil }

// Book appends under the lock and confirms what has reached the disk.
func (s *file) Book(ctx context.Context, entries []*Entry, marks []*Mark) ([]Answer, error) {
	d, err := newDraft(entries, marks)
	if err != nil || d.empty() {
		return nil, err
	}
	f, fresh, err := s.openToWrite(ctx)
	if err != nil {
		return nil, fmt.Errorf("book into the ledger: %w", err)
	}
	defer func() { _ = f.Close() }()
	answers, err := s.enter(ctx, f, d)
	if err == nil && fresh {
		err = syncFolder(filepath.Dir(s.path))
	}
	if err != nil {
		return nil, fmt.Errorf("book into the ledger %s: %w; book again, what is there already is not entered twice", s.path, err)
	}
	return answers, nil
}

// openToWrite opens the file and locks it; fresh tells that it may be new.
func (s *file) openToWrite(ctx context.Context) (f *os.File, fresh bool, err error) {
	if err := os.MkdirAll(filepath.Dir(s.path), 0o777); err != nil {
		return nil, false, err
	}
	if f, err = os.OpenFile(s.path, os.O_RDWR|os.O_CREATE, 0o666); err != nil {
		return nil, false, err
	}
	if err := lock(ctx, f, true); err != nil {
		_ = f.Close()
		return nil, false, err
	}
	info, err := f.Stat()
	if err != nil {
		_ = f.Close()
		return nil, false, err
	}
	return f, info.Size() == 0, nil
}

// enter settles a draft against the file and appends what goes in.
func (s *file) enter(ctx context.Context, f *os.File, d *draft) ([]Answer, error) {
	p := &page{name: s.path}
	end, err := whole(f)
	if err != nil {
		return nil, err
	}
	if p.last, err = lastBooked(f, end); err != nil {
		return nil, err
	}
	from, err := seek(f, end, d.since())
	if err != nil {
		return nil, err
	}
	if err := eachLine(ctx, f, from, end, func(_ int64, text []byte) { d.read(text, p) }); err != nil {
		return nil, err
	}
	answers := d.settle(func(unit.Instant, *page) *page { return p })
	for n := range p.lines {
		p.lines[n].more = len(p.lines) - 1 - n
	}
	return answers, appendAt(f, end, p.text())
}

// appendAt writes text where the last whole booking ends and flushes it, and
// whatever a process that was killed had not flushed. What goes in only partly
// is taken out again.
func appendAt(f *os.File, end int64, text []byte) error {
	if len(text) > 0 {
		if err := f.Truncate(end); err != nil {
			return err
		}
	}
	if _, err := f.WriteAt(text, end); err != nil {
		return errors.Join(err, f.Truncate(end))
	}
	return f.Sync()
}

// openToRead opens the file and tells where its last whole booking ends, and
// how many bytes follow. There is nothing to read where there is no file.
func (s *file) openToRead(ctx context.Context) (f *os.File, end, torn int64, err error) {
	if f, err = os.Open(s.path); err != nil {
		return nil, 0, 0, err
	}
	// What is found under the lock is no booking that is going on. Where there
	// are no locks nobody writes either.
	if lock(ctx, f, false) == nil {
		defer func() { _ = unlock(f) }()
	}
	if end, err = whole(f); err == nil {
		var info fs.FileInfo
		if info, err = f.Stat(); err == nil {
			return f, end, info.Size() - end, nil
		}
	}
	_ = f.Close()
	return nil, 0, 0, err
}

// Read reads from the first line that may matter.
func (s *file) Read(ctx context.Context, q Query) (*Books, error) {
	g := gather(q)
	f, end, torn, err := s.openToRead(ctx)
	if errors.Is(err, fs.ErrNotExist) {
		return g.done(), nil
	}
	if err != nil {
		return nil, fmt.Errorf("read the ledger: %w", err)
	}
	defer func() { _ = f.Close() }()
	if torn > 0 {
		g.books.Notes = append(g.books.Notes, fmt.Sprintf("%s: a booking was broken off and does not count", s.path))
	}
	from, err := seek(f, end, q.Since)
	if err == nil {
		err = eachLine(ctx, f, from, end, func(at int64, text []byte) { g.line(text, s.path, func() int { return number(f, at) }) })
	}
	if err != nil {
		return nil, fmt.Errorf("read the ledger %s: %w", s.path, err)
	}
	return g.done(), nil
}

// Vet looks at every line.
func (s *file) Vet(ctx context.Context) (*finding.List, error) {
	v := newVetting()
	f, end, torn, err := s.openToRead(ctx)
	if errors.Is(err, fs.ErrNotExist) {
		return v.findings, nil
	}
	if err != nil {
		return nil, fmt.Errorf("vet the ledger: %w", err)
	}
	defer func() { _ = f.Close() }()
	v.page(s.path)
	if err := eachLine(ctx, f, 0, end, func(_ int64, text []byte) { v.line(text) }); err != nil {
		return nil, fmt.Errorf("vet the ledger %s: %w", s.path, err)
	}
	if torn > 0 {
		v.add(fmt.Sprintf("a booking was broken off and left %d bytes", torn), "nothing: it was never confirmed, and the next booking cuts it off")
	}
	return v.findings, nil
}
