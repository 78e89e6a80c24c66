package github

import (
	"fmt"
	"strconv"
	"strings"

	"budgetcheck/budget"
)

// Outputs are what later steps get. A value that is not known is empty.
type Outputs struct {
	Gate          string // open, closed or unknown
	TotalG        string // of all head runs, in g CO2e
	HeldRatio     string // largest change of a job with the grid held, head/base - 1
	StatementMD   string // path
	StatementJSON string // path
}

// OutputsOf are the outputs of a statement; nil is one that could not be made.
func OutputsOf(s *budget.Statement, md, json string) Outputs {
	o := Outputs{Gate: "unknown", StatementMD: md, StatementJSON: json}
	if s == nil {
		return o
	}
	o.Gate = string(s.Gate)
	o.TotalG = printed(totalOf(s))
	o.HeldRatio = printed(heldRatio(s))
	return o
}

// totalOf sums up the head runs. With one total unknown, the sum is too.
func totalOf(s *budget.Statement) *float64 {
	var sum float64
	runs := 0
	for _, r := range s.Runs {
		switch {
		case r.Side != "head":
			continue
		case r.Total == nil:
			return nil
		}
		sum += float64(*r.Total)
		runs++
	}
	if runs == 0 {
		return nil
	}
	return &sum
}

func heldRatio(s *budget.Statement) (largest *float64) {
	for _, c := range s.Changes {
		if c.HeldRatio != nil && (largest == nil || *c.HeldRatio > *largest) {
			largest = c.HeldRatio
		}
	}
	return largest
}

// printed is a number as shells take it, without an exponent.
func printed(v *float64) string {
	if v == nil {
		return ""
	}
	return strconv.FormatFloat(*v, 'f', -1, 64)
}

// outputEnd is what ends a value in the file of outputs. The library uses the
// same one for all values, so that a value with it could set further outputs.
const outputEnd = "_GitHubActionsFileCommandDelimeter_"

// Outputs hands the outputs to the runner, all of them or none.
func (r *Runner) Outputs(o Outputs) error {
	if r.getenv("GITHUB_OUTPUT") == "" {
		return nil // no runner that takes any
	}
	list := []struct{ name, value string }{
		{"gate", o.Gate}, {"total-g", o.TotalG}, {"held-ratio", o.HeldRatio}, {"statement-md", o.StatementMD}, {"statement-json", o.StatementJSON},
	}
	for _, out := range list {
		if strings.ContainsAny(out.value, "\r\n\x00") || strings.Contains(out.value, outputEnd) {
			return fmt.Errorf("the output %s is %s, which the runner would take for more than one value; choose another folder for the input out", out.name, shown(out.value))
		}
	}
	return safely(func() {
		for _, out := range list {
			r.action.SetOutput(out.name, out.value)
		}
	})
}
