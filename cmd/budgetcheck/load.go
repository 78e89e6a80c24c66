package main

import (
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"slices"
	"strings"

	"github.com/bmatcuk/doublestar/v4"

	"budgetcheck/budget"
	"budgetcheck/budget/finding"
	"budgetcheck/budget/footprint"
	"budgetcheck/budget/grid"
	"budgetcheck/budget/record"
)

// loader opens the files that a command names. Everything it reads is judged
// elsewhere; it collects what could not be read.
type loader struct {
	policy *budget.Policy
	series []*grid.File
	set    *grid.Set
	unread []finding.Finding // head files that could not be read
	notes  []string
}

// policies reads the policy files. Findings are an error: nothing must be
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
			lines = append(lines, f.String())
		}
		return nil, errors.New(strings.Join(lines, "\n"))
	}
	return p, nil
}

// readSeries reads the series of the policy, relative to its file, and those
// of the flags, which come later and so win where they differ.
func (l *loader) readSeries(o *options) error {
	globs := slices.Clone(o.grid)
	if len(o.policy) > 0 {
		dir := filepath.Dir(o.policy[0])
		var own []string
		for _, g := range l.policy.Grid.Series {
			own = append(own, filepath.Join(escape(dir), filepath.FromSlash(g)))
		}
		globs = append(own, globs...)
	}
	for _, path := range l.expand(globs, "series") {
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
	return strings.NewReplacer(`\`, `\\`, "*", `\*`, "?", `\?`, "[", `\[`, "{", `\{`).Replace(dir)
}

// expand lists the files that the globs match, each once, in order. A glob
// that matches nothing is noted: whoever wrote it expected something.
func (l *loader) expand(globs []string, what string) (paths []string) {
	for _, g := range globs {
		found, err := matches(g)
		switch {
		case err != nil:
			l.notes = append(l.notes, fmt.Sprintf("the glob %s of %s cannot be used (%v)", g, what, err))
		case len(found) == 0:
			l.notes = append(l.notes, fmt.Sprintf("no file matches %s of %s", g, what))
		}
		for _, path := range found {
			if !slices.Contains(paths, path) {
				paths = append(paths, path)
			}
		}
	}
	return paths
}

// matches are the files of one glob, sorted. A name that is a file is meant
// as written.
func matches(glob string) ([]string, error) {
	if info, err := os.Stat(glob); err == nil && !info.IsDir() {
		return []string{glob}, nil
	}
	found, err := doublestar.FilepathGlob(glob, doublestar.WithFilesOnly(), doublestar.WithFailOnIOErrors())
	slices.Sort(found)
	return found, err
}

// weighAll weighs the records that the globs match.
func (l *loader) weighAll(globs []string, what string, see func(*record.Reader, *footprint.Part)) (parts []*footprint.Part) {
	for _, path := range l.expand(globs, what) {
		part, err := l.weighFile(path, see)
		if err != nil {
			l.unread = append(l.unread, finding.Finding{File: path, What: "the record cannot be read (" + err.Error() + ")", Do: "give the whole file"})
			continue
		}
		parts = append(parts, part)
	}
	return parts
}

func (l *loader) weighFile(path string, see func(*record.Reader, *footprint.Part)) (*footprint.Part, error) {
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
	part, err := l.policy.Weigh(r, l.set)
	if err == nil && see != nil {
		see(r, part)
	}
	return part, err
}
