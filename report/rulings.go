package report

import (
	"fmt"
	"strings"

	"budgetcheck/budget"
	"budgetcheck/budget/unit"
)

func rulings(s *budget.Statement) table {
	t := table{title: "Rulings", head: []string{"state", "rule", "job", "observed", "limit", "probability within", "policy line", "reason"}}
	for _, r := range s.Rulings {
		t.rows = append(t.rows, []cell{own("%s", r.State), foreign(r.Name), foreign(r.Job), observed(r), foreign(r.LimitText),
			conformance(r), policyLine(r, s), foreign(r.Reason)})
	}
	return t
}

// observed is a ruling's value with its interval. The functional unit in a
// rate comes from the policy.
func observed(r budget.Ruling) cell { return foreign(observedText(r)) }

// observedText has the interval beside the value. Where the value needs more
// figures than the interval shows, to tell it from the limit, both are there.
func observedText(r budget.Ruling) string {
	number, _, _ := strings.Cut(r.ObservedText, " ")
	switch {
	case r.IntervalText == "" || r.ObservedText == "":
		return r.ObservedText
	case strings.HasPrefix(r.IntervalText, number+" "):
		return r.IntervalText
	}
	return fmt.Sprintf("%s (%s)", r.ObservedText, r.IntervalText)
}

// conformance never rounds to a certainty that is not there.
func conformance(r budget.Ruling) cell {
	const least, most = 0.001, 0.999
	switch p := r.Conformance; {
	case p == nil:
		return none
	case *p < least:
		return own("below %s", unit.Share(least))
	case *p > most:
		return own("above %s", unit.Share(most))
	}
	return own("%s", unit.Share(*r.Conformance))
}

// policyLine names the file where there are several.
func policyLine(r budget.Ruling, s *budget.Statement) cell {
	switch {
	case r.PolicyLine == 0:
		return none
	case r.PolicyFile == s.PolicySource:
		return own("%d", r.PolicyLine)
	}
	return foreign(place(r))
}

// place is where the ruling's rule stands; "" where the policy has none of it.
func place(r budget.Ruling) string {
	if r.PolicyLine == 0 {
		return ""
	}
	return fmt.Sprintf("%s:%d", r.PolicyFile, r.PolicyLine)
}

// told is a ruling in a line, for where there is no table.
func told(r budget.Ruling) string {
	text := string(r.State)
	if r.ObservedText != "" {
		text += fmt.Sprintf(", observed %s", observedText(r))
	}
	if r.LimitText != "" {
		text += fmt.Sprintf(", limit %s", r.LimitText)
	}
	if c := conformance(r); c != none {
		text += fmt.Sprintf(", within the limit with a probability of %s", c.text)
	}
	if r.Reason != "" {
		text += ": " + r.Reason
	}
	return text
}
