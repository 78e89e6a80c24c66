package main

import (
	"context"
	"errors"
	"fmt"
	"io"
	"os"
	"strings"

	"budgetcheck/budget"
	"budgetcheck/budget/footprint"
	"budgetcheck/budget/ledger"
	"budgetcheck/budget/record"
)

// vet checks a policy, records and series by themselves, without a verdict.
func vet(args []string, s streams) (int, error) {
	var o options
	if err := o.parse("vet", args, s, "policy", "head", "base", "grid", "ledger"); err != nil {
		return 0, err
	}
	records := append(append(o.head, o.base...), o.rest...)
	from := surroundings{&o, s.getenv}
	policy, lines, err := o.vetPolicy(len(records)+len(o.grid) > 0 || o.ledger != "")
	if err != nil {
		return 0, err
	}
	l := &loader{policy: policy}
	if err := l.readSeries(&o); err != nil {
		return 0, err
	}
	for _, f := range l.series {
		lines = append(lines, f.Findings.Lines()...)
	}
	read := 0
	parts, err := l.weighAll(records, "records", func(r *record.Reader, p *footprint.Part) {
		read++
		lines = append(lines, r.Findings().Lines()...)
		lines = append(lines, r.Unknown().Lines()...)
		lines = append(lines, r.Notes()...)
		for _, d := range p.Doubts {
			lines = append(lines, d.Reason)
		}
	})
	if err != nil {
		return 0, err
	}
	for _, f := range l.unread {
		lines = append(lines, f.String())
	}
	lines = append(lines, l.missing...)
	lines = append(lines, l.notes...)
	ledgers := 0
	if o.ledger != "" {
		found, err := vetLedger(from)
		if err != nil {
			return 0, err
		}
		lines, ledgers = append(lines, found...), 1
	}
	runs, _ := policy.Runs(parts)
	for _, w := range policy.Blunt(runs) {
		tell(s.err, "warning: "+w.String())
	}
	seen := []string{count(len(policy.Files), "policy file"), count(len(l.series), "series file"), count(read, "record")}
	if ledgers > 0 {
		seen = append(seen, count(ledgers, "ledger"))
	}
	return tellVetted(s.out, lines, seen)
}

// vetLedger checks all of a ledger.
func vetLedger(from surroundings) (lines []string, err error) {
	ctx := context.Background()
	err = withLedger(ctx, from, func(store ledger.Store) error {
		found, err := store.Vet(ctx)
		if err == nil {
			lines = found.Lines()
		}
		return err
	})
	return lines, err
}

// vetPolicy reads the policy for its findings. One that is not there is fine
// as long as there is something else to look at.
func (o *options) vetPolicy(otherwise bool) (*budget.Policy, []string, error) {
	named := len(o.policy) > 0
	if !named {
		if _, err := os.Stat(policyName); errors.Is(err, os.ErrNotExist) && otherwise {
			return budget.Bare(), nil, nil
		}
		o.policy = list{policyName}
	}
	p, found, err := readPolicies(o.policy)
	if err != nil {
		return nil, nil, err
	}
	var lines []string
	for _, f := range found {
		lines = append(lines, f.String())
	}
	if len(found) > 0 {
		o.policy = nil // its series may not be what it means
		return budget.Bare(), lines, nil
	}
	return p, nil, nil
}

// tellVetted lists what was found, or else what was looked at.
func tellVetted(w io.Writer, lines, seen []string) (int, error) {
	if tell(w, lines...); len(lines) > 0 {
		return exitFinding, nil
	}
	last := len(seen) - 1
	_, err := fmt.Fprintf(w, "nothing found in %s and %s\n", strings.Join(seen[:last], ", "), seen[last])
	return exitDone, err
}

func count(n int, what string) string {
	if n != 1 {
		what += "s"
	}
	return fmt.Sprintf("%d %s", n, what)
}
