package report

import (
	"encoding/json"
	"io"

	"budgetcheck/budget"
	"budgetcheck/budget/footprint"
)

// JSON writes the statement for programs: exact numbers, units in the keys.
func JSON(w io.Writer, s *budget.Statement) error { return indented(w, s) }

// RunsJSON writes runs as {"format":1,"runs":[...]}.
func RunsJSON(w io.Writer, runs []*footprint.Run) error {
	if runs == nil {
		runs = []*footprint.Run{}
	}
	return indented(w, struct {
		Format int              `json:"format"`
		Runs   []*footprint.Run `json:"runs"`
	}{1, runs})
}

func indented(w io.Writer, v any) error {
	e := json.NewEncoder(w)
	e.SetIndent("", "  ")
	return e.Encode(v)
}
