package main

import (
	"bytes"
	"embed"
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"slices"
	"text/template"

	"budgetcheck/budget"
	"budgetcheck/budget/inputs"
)

//go:embed starter
var starter embed.FS

// initialise writes a starter policy and workflow. With -head it fills in the
// jobs, sites and machines of these records, and limits with some room.
func initialise(args []string, s streams) (int, error) {
	var o options
	if err := o.parse("init", args, s, "head", "grid", "out"); err != nil {
		return 0, err
	}
	if err := o.noRest(); err != nil {
		return 0, err
	}
	l := &loader{policy: budget.Bare()}
	if err := l.readSeries(&o); err != nil {
		return 0, err
	}
	parts, err := l.weighAll(o.head, "-head", nil)
	if err != nil {
		return 0, err
	}
	wrong := tellFindings(s.err, l, parts)
	tell(s.err, slices.Concat(l.missing, l.notes)...)
	if wrong || len(l.missing) > 0 {
		return 0, errors.New("nothing was written: mend or leave out what is named above")
	}
	series, err := seenFrom(o.out, o.grid)
	if err != nil {
		return 0, err
	}
	runs, _ := l.policy.Runs(parts)
	return exitDone, o.start(s.out, budget.NewStarter(runs, series))
}

// seenFrom rewrites globs so that they hold in a policy that stands in dir.
func seenFrom(dir string, globs []string) (seen []string, err error) {
	if dir, err = filepath.Abs(dir); err != nil {
		return nil, err
	}
	here, err := os.Getwd()
	if err != nil {
		return nil, err
	}
	for _, g := range globs {
		if !filepath.IsAbs(g) {
			// Both folders are written as globs, for the rest is one.
			if g, err = filepath.Rel(escape(dir), filepath.Join(escape(here), g)); err != nil {
				return nil, err
			}
		}
		seen = append(seen, filepath.ToSlash(g))
	}
	return seen, nil
}

// start writes the files; it never overwrites one.
func (o *options) start(w io.Writer, st budget.Starter) error {
	files := []struct{ template, path string }{
		{"starter/budgetcheck.toml", policyName},
		{"starter/workflow.yml", filepath.Join(".github", "workflows", "budgetcheck.yml")},
	}
	for _, f := range files {
		if _, err := os.Stat(filepath.Join(o.out, f.path)); err == nil {
			return fmt.Errorf("%s is already there; nothing was written", filepath.Join(o.out, f.path))
		}
	}
	for _, f := range files {
		if err := writeStarter(f.template, filepath.Join(o.out, f.path), st); err != nil {
			return err
		}
		fmt.Fprintf(w, "wrote %s\n", filepath.Join(o.out, f.path))
	}
	for _, line := range st.Unknown {
		tell(w, "not known: "+line)
	}
	return nil
}

func writeStarter(name, path string, st budget.Starter) error {
	t, err := template.New(filepath.Base(name)).Funcs(template.FuncMap{"literal": inputs.Literal}).ParseFS(starter, name)
	if err != nil {
		return err
	}
	var text bytes.Buffer
	if err := t.Execute(&text, st); err != nil {
		return err
	}
	if err := os.MkdirAll(filepath.Dir(path), 0o777); err != nil {
		return err
	}
	f, err := os.OpenFile(path, os.O_WRONLY|os.O_CREATE|os.O_EXCL, 0o666)
	if err != nil {
		return err
	}
	_, err = f.Write(text.Bytes())
	return errors.Join(err, f.Close())
}
