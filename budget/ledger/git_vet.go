package ledger

import (
	"bytes"
	"context"
	"fmt"
	"slices"
	"strings"

	"budgetcheck/budget/finding"
)

// vet looks at all lines of the tip, then at the history.
func (r *repo) vet(ctx context.Context, v *vetting) error {
	t, err := r.fetch(ctx)
	if err != nil {
		return err
	}
	defer t.close()
	months := t.months("")
	if err := t.load(ctx, months); err != nil {
		return err
	}
	for _, name := range months {
		v.page(r.store.branch + ":" + name)
		for text := range lines(t.text[name]) {
			v.line(text)
			v.misplaced(text, name)
		}
	}
	if t.head == "" {
		return nil
	}
	return r.vetHistory(ctx, t, v)
}

// misplaced finds an entry in the file of a month before its end: who reads
// from the month of its end on does not meet it.
func (v *vetting) misplaced(text []byte, name string) {
	if l, err := parse(text); err == nil && l.entry != nil && month(l.entry.End) > name {
		v.add(fmt.Sprintf("run %s ended at %s and is in the file of a month before", clip(l.entry.Run.Run), l.entry.End),
			"put the file back from a copy: the run is missed where reading starts in its month")
	}
}

// vetHistory checks that every commit only appended to the files of the one
// before it.
func (r *repo) vetHistory(ctx context.Context, t *tip, v *vetting) error {
	out, err := r.run(ctx, nil, "rev-list", "--parents", "--reverse", "--topo-order", t.head)
	if err != nil {
		return err
	}
	for l := range strings.Lines(string(out)) {
		commits := strings.Fields(l)
		for _, parent := range commits[1:] {
			if err := t.appends(v, parent, commits[0]); err != nil {
				return err
			}
		}
		if ctx.Err() != nil {
			return ctx.Err()
		}
	}
	return r.vetShallow(ctx, v)
}

// vetShallow says where the history that is there begins too late.
func (r *repo) vetShallow(ctx context.Context, v *vetting) error {
	out, err := r.run(ctx, nil, "rev-parse", "--is-shallow-repository")
	if err == nil && strings.TrimSpace(string(out)) == "true" {
		v.findings.Add(finding.Finding{File: r.store.branch, What: "the repository is shallow: the history was checked only as far as it is there",
			Do: "vet in a whole clone to check all of it"})
	}
	return err
}

// appends checks a commit against its parent.
func (t *tip) appends(v *vetting, parent, child string) error {
	before, err := t.cat.filesOf(parent)
	if err != nil {
		return err
	}
	after, err := t.cat.filesOf(child)
	if err != nil {
		return err
	}
	for _, f := range before {
		if !monthName.MatchString(f.name) || slices.Contains(after, f) {
			continue
		}
		if err := t.appended(v, child, f, after); err != nil {
			return err
		}
	}
	return nil
}

// appended checks a file that a commit changed.
func (t *tip) appended(v *vetting, commit string, f treeFile, after []treeFile) error {
	const do = "put the line back: books are corrected by entries that say what they correct"
	add := func(what string) {
		const short = 12
		v.findings.Add(finding.Finding{File: t.repo.store.branch + ":" + f.name, What: fmt.Sprintf("commit %.*s %s", short, commit, what), Do: do})
	}
	n := slices.IndexFunc(after, func(o treeFile) bool { return o.name == f.name })
	if n < 0 {
		add("removed the file")
		return nil
	}
	_, old, err := t.cat.get(f.id)
	if err != nil {
		return err
	}
	_, text, err := t.cat.get(after[n].id)
	if err == nil && !bytes.HasPrefix(text, old) {
		add("changed lines that were there before")
	}
	return err
}

// filesOf are the files of a commit.
func (c *catFile) filesOf(commit string) ([]treeFile, error) {
	_, text, err := c.get(commit)
	if err != nil {
		return nil, err
	}
	return c.tree(treeOf(text))
}
