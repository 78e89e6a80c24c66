package main

import (
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"slices"
	"strings"

	"github.com/bmatcuk/doublestar/v4"

	"budgetcheck/budget"
	"budgetcheck/budget/finding"
	"budgetcheck/budget/footprint"
	"budgetcheck/budget/grid"
	"budgetcheck/budget/inputs"
	"budgetcheck/budget/record"
	"budgetcheck/report"
)

// loader opens the files that a command names. Everything it reads is judged
// elsewhere; it collects what could not be read.
type loader struct {
	policy  *budget.Policy
	noLinks bool               // hostile records: a link could lead to any file of the machine
	fill    func(*record.Open) // completes open lines; nil: nothing does
	series  []*grid.File
	set     *grid.Set
	unread  []finding.Finding // what could not be read at all
	missing []string          // globs that match nothing
	notes   []string
}

// readPolicies reads the policy files. Findings are an error: nothing must be
// judged by a policy that is not understood.
func readPolicies(paths []string) (*budget.Policy, []finding.Finding, error) {
	var files []budget.PolicyFile
	for _, path := range paths {
		data, err := os.ReadFile(path)
		if errors.Is(err, os.ErrNotExist) {
			return nil, nil, fmt.Errorf("there is no policy %s; name one with -policy, or write one with budgetcheck init", path)
		}
		if err != nil {
			return nil, nil, fmt.Errorf("the policy cannot be read: %w", err)
		}
		files = append(files, budget.PolicyFile{Name: path, Data: data})
	}
	p, found := budget.ParsePolicy(files...)
	return p, found, nil
}

// mustPolicy is readPolicies for commands that judge.
func (o *options) mustPolicy() (*budget.Policy, error) {
	if len(o.policy) == 0 {
		o.policy = list{policyName}
	}
	p, found, err := readPolicies(o.policy)
	if err != nil {
		return nil, err
	}
	if len(found) > 0 {
		lines := []string{"the policy cannot be used:"}
		for _, f := range found {
			lines = append(lines, report.Inert(f.String())) // each is a line
		}
		return nil, errors.New(strings.Join(lines, "\n"))
	}
	return p, nil
}

// readSeries reads the series of the policy, relative to its file, and those
// of the flags, which come later and so win where they differ.
func (l *loader) readSeries(o *options) error {
	var own []string
	if len(l.policy.Grid.Series) > 0 {
		dir := escape(filepath.Dir(l.policy.SeriesFrom()))
		for _, g := range l.policy.Grid.Series {
			if g = filepath.FromSlash(g); !filepath.IsAbs(g) {
				g = filepath.Join(dir, g)
			}
			own = append(own, g)
		}
	}
	return l.finishSeries(append(own, o.grid...))
}

// finishSeries reads series files after those that the loader has, and lays
// them over one another.
func (l *loader) finishSeries(globs []string) error {
	paths, err := l.expand(globs, "series")
	if err != nil {
		return err
	}
	for _, path := range paths {
		f, err := os.Open(path)
		if err != nil {
			return fmt.Errorf("the series cannot be read: %w", err)
		}
		file, err := grid.ReadCSV(f, path, l.policy.Grid.ColumnNames())
		f.Close()
		if err != nil {
			return fmt.Errorf("the series cannot be read: %w", err)
		}
		l.series = append(l.series, file)
	}
	l.set = grid.NewSet(l.policy.Grid.Boundary, l.series...)
	l.notes = append(l.notes, l.set.Notes()...)
	return nil
}

// escape makes a folder's own name literal in a glob.
func escape(dir string) string {
	if filepath.Separator == '\\' {
		return dir // there a backslash separates and cannot escape
	}
	return inputs.Literal(dir)
}

// expand lists the files that the globs match, each once, in order. A glob
// that matches nothing is missing: whoever wrote it expected something.
func (l *loader) expand(globs []string, what string) (paths []string, err error) {
	for _, g := range globs {
		found, err := l.matches(g)
		switch {
		case errors.Is(err, doublestar.ErrBadPattern):
			return nil, fmt.Errorf("%q is not a glob; mend its brackets, or put a backslash before each that is meant as written", g)
		case err != nil:
			l.unread = append(l.unread, finding.Finding{What: fmt.Sprintf("the folders of %s (%s) cannot be searched: %v", g, what, err)})
		case len(found) == 0:
			l.missing = append(l.missing, nothing(g, what))
		}
		for _, path := range found {
			if !slices.Contains(paths, path) {
				paths = append(paths, path)
			}
		}
	}
	return paths, nil
}

func nothing(glob, what string) string {
	if info, err := os.Stat(glob); err == nil && info.IsDir() {
		return fmt.Sprintf("%s is a folder (%s); write %s for the files in it", glob, what, filepath.Join(glob, "**"))
	}
	return fmt.Sprintf("no file matches %s (%s)", glob, what)
}

// matches are the files of one glob, sorted. A name that is a file is meant
// as written.
func (l *loader) matches(glob string) ([]string, error) {
	if info, err := os.Stat(glob); err == nil && !info.IsDir() {
		return []string{glob}, nil
	}
	options := []doublestar.GlobOption{doublestar.WithFilesOnly(), doublestar.WithFailOnIOErrors()}
	if l.noLinks {
		options = append(options, doublestar.WithNoFollow())
	}
	found, err := doublestar.FilepathGlob(glob, options...)
	slices.Sort(found)
	return found, err
}

// weighAll weighs the records that the globs match.
func (l *loader) weighAll(globs []string, what string, see func(*record.Reader, *footprint.Part)) (parts []*footprint.Part, err error) {
	paths, err := l.expand(globs, what)
	for _, path := range paths {
		part, err := l.weighFile(path, see)
		if err != nil {
			l.unread = append(l.unread, finding.Finding{File: path, What: without(err, path)})
			continue
		}
		parts = append(parts, part)
	}
	return parts, err
}

// sides weighs the records of both sides into a case. dash is what stands
// before the names of the globs where they were given: as flags, or as inputs.
func (l *loader) sides(c *budget.Case, head, base []string, dash string) (err error) {
	if c.Head, err = l.weighAll(head, dash+"head", nil); err != nil {
		return err
	}
	c.Unread = l.unread
	if c.Base, err = l.weighAll(base, dash+"base", nil); err != nil {
		return err
	}
	c.UnreadBase = l.unread[len(c.Unread):]
	for _, f := range c.UnreadBase {
		l.notes = append(l.notes, f.String())
	}
	l.notes = append(l.notes, l.missing...) // which rulings tell whether anything is due
	return nil
}

// without is the error without the file's name, which the finding says already.
func without(err error, path string) string {
	var failed *fs.PathError
	if errors.As(err, &failed) {
		return "the file cannot be read: " + failed.Err.Error()
	}
	return strings.TrimPrefix(err.Error(), path+": ")
}

func (l *loader) weighFile(path string, see func(*record.Reader, *footprint.Part)) (*footprint.Part, error) {
	if info, err := os.Lstat(path); l.noLinks && err == nil && !info.Mode().IsRegular() {
		return nil, errors.New("it is a link or no regular file")
	}
	f, err := os.Open(path)
	if err != nil {
		return nil, err
	}
	defer f.Close()
	r, err := record.NewReader(f, path)
	if err != nil {
		return nil, err
	}
	defer r.Close()
	r.Fill(l.fill)
	part, err := l.policy.Weigh(r, l.set)
	if err == nil && see != nil {
		see(r, part)
	}
	return part, err
}
