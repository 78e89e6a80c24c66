package report

import (
	"fmt"
	"io"
	"maps"
	"slices"
	"strings"

	"budgetcheck/budget"
)

// replayed is how past changes go by the policies; nil gives an empty table.
func replayed(r *budget.Replay) table {
	t := table{title: "Past changes by this policy", head: []string{"policy", "open", "closed", "unproven", "days over"}}
	if r == nil {
		return t
	}
	t.rows = append(t.rows, counts(r.Policy))
	if r.Beside != nil {
		t.rows = append(t.rows, counts(*r.Beside))
	}
	return t
}

func counts(n budget.ReplayCounts) []cell {
	var days []string
	for _, name := range slices.Sorted(maps.Keys(n.Days)) {
		days = append(days, fmt.Sprintf("%s: %d", name, n.Days[name]))
	}
	return []cell{foreign(n.Source), own("%d", n.Open), own("%d", n.Closed), own("%d", n.Unproven), foreign(strings.Join(days, "; "))}
}

// closedChanges lists the changes whose gate was or would be closed.
func closedChanges(r *budget.Replay) table {
	t := table{title: "Changes that close the gate", head: []string{"at", "pull request", "commit", "gate", "by the policy beside", "reason"}}
	for _, c := range r.Changes {
		if c.Gate == budget.Open && c.Beside == nil {
			continue
		}
		pull, beside, reasons := none, none, c.Reasons
		if c.Pull > 0 {
			pull = own("%d", c.Pull)
		}
		if c.Beside != nil {
			beside = own("%s", c.Beside.Gate)
			if c.Gate == budget.Open {
				reasons = c.Beside.Reasons
			}
		}
		t.rows = append(t.rows, []cell{own("%s", c.At.Time().Format("2006-01-02 15:04Z")), pull, foreign(short(c.Commit)), own("%s", c.Gate), beside, foreign(first(reasons))})
	}
	return t
}

// short is as much of a commit id as people read.
func short(id string) string { return id[:min(len(id), 12)] }

func first(reasons []string) string {
	switch len(reasons) {
	case 0:
		return ""
	case 1:
		return reasons[0]
	}
	return fmt.Sprintf("%s (and %d more)", reasons[0], len(reasons)-1)
}

// Replay writes what a policy would have made of the past.
func Replay(w io.Writer, r *budget.Replay) error {
	var b strings.Builder
	n := r.Policy
	fmt.Fprintf(&b, "Of %d past changes on branch %s the policy %s would have closed the gate for %d, and for %d more as unproven; %d stay open\n",
		len(r.Changes), Inert(r.Branch), Inert(n.Source), n.Closed, n.Unproven, n.Open)
	for _, t := range []table{replayed(r), closedChanges(r)} {
		textTable(&b, t.slim())
	}
	notes := append([]string{"each change is judged as of the end of its last run; which jobs it left alone is not known, so that none is asked for a run",
		"days over are days at whose end a budget over a period was over"}, r.Notes...)
	textNotes(&b, notes)
	fmt.Fprintf(&b, "\n%s\n", Caution)
	_, err := io.WriteString(w, b.String())
	return err
}

// ReplayJSON writes the same for programs.
func ReplayJSON(w io.Writer, r *budget.Replay) error { return indented(w, r) }
