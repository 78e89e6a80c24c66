package report

import (
	"bytes"
	"encoding/json"
	"io"

	"budgetcheck/budget"
	"budgetcheck/budget/footprint"
)

// JSON writes the statement for programs: exact numbers, units in the keys.
// statement.schema.json in this folder describes it.
func JSON(w io.Writer, s *budget.Statement) error { return indented(w, s) }

// RunsJSON writes runs as {"format":1,"runs":[...]}. What speaks against a
// run's evidence stands in its notes, for no ruling tells of it here.
// runs.schema.json in this folder describes it.
func RunsJSON(w io.Writer, runs []*footprint.Run) error {
	told := []footprint.Run{}
	for _, r := range runs {
		run := *r
		run.Notes = append(run.Notes[:len(run.Notes):len(run.Notes)], unproven(r)...)
		told = append(told, run)
	}
	return indented(w, struct {
		Format int             `json:"format"`
		Runs   []footprint.Run `json:"runs"`
	}{1, told})
}

func unproven(r *footprint.Run) (lines []string) {
	for _, d := range r.Doubts {
		lines = append(lines, "unproven: "+d.Reason)
	}
	return lines
}

// indented writes v so that no line of it is a command to a CI system that
// reads its own log. A "#" stands in texts alone, where its escape is the same.
func indented(w io.Writer, v any) error {
	var b bytes.Buffer
	e := json.NewEncoder(&b)
	e.SetIndent("", "  ")
	if err := e.Encode(v); err != nil {
		return err
	}
	_, err := w.Write(bytes.ReplaceAll(b.Bytes(), []byte("##"), []byte(`#\u0023`)))
	return err
}
