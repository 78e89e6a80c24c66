package report

import "budgetcheck/budget"

// edits shows how the head's policy differs from the one in force.
func edits(s *budget.Statement) table {
	t := table{title: "Edits of the policy, in force after merge", head: []string{"table", "key", "from", "to"}}
	for _, e := range s.Edits {
		t.rows = append(t.rows, []cell{foreign(e.Table), foreign(e.Key), foreign(e.From), foreign(e.To)})
	}
	return t
}

// preview shows the rulings that the head's policy would make otherwise.
func preview(s *budget.Statement) table {
	t := table{title: "Rulings that the edited policy would give", head: []string{"state", "rule", "job", "observed", "limit"}}
	for _, r := range s.Changed() {
		t.rows = append(t.rows, []cell{own("%s", r.State), foreign(r.Name), foreign(r.Job), observed(r), foreign(r.LimitText)})
	}
	return t
}
