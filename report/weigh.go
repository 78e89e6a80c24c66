package report

import (
	"fmt"
	"io"
	"strings"

	"budgetcheck/budget/footprint"
)

// Runs writes the footprints of runs without any ruling.
func Runs(w io.Writer, list []*footprint.Run, notes []string) error {
	var b strings.Builder
	for _, r := range list {
		for _, line := range aligned(oneRun(r), func(int) bool { return false }) {
			fmt.Fprintln(&b, line)
		}
		b.WriteString("\n")
	}
	for _, n := range notes {
		fmt.Fprintf(&b, "%s\n", Inert(n))
	}
	fmt.Fprintf(&b, "%s\n", Caution)
	_, err := io.WriteString(w, b.String())
	return err
}

// oneRun is a run as a list of names and values, on the way from the meters to
// the total.
func oneRun(r *footprint.Run) (lines [][]string) {
	add := func(name string, c cell) {
		if c != none {
			lines = append(lines, []string{name, Inert(c.text)})
		}
	}
	add("run", foreign(name(r)))
	add("job", foreign(jobStage(r.Job, r.Stage)))
	add("site", foreign(r.Site))
	add("zone", foreign(r.Zone))
	add("machine", foreign(r.Machine))
	add("start", start(r))
	add("duration", own("%s", r.End.Sub(r.Start)))
	add("outcome", own("%s", r.Outcome))
	add("grade", own("%s", dash(string(r.Grade))))
	add("coverage", value(r.Coverage))
	add("at the meters", value(r.Measured))
	add("at the machine", value(r.MachineKWh))
	add("at the facility", value(r.Facility))
	add("intensity", intensity(r))
	add("operational", value(r.Operational))
	add("embodied", value(r.Embodied))
	add("total", total(r))
	add("rate", rate(r))
	add("market-based", value(r.Market))
	for _, d := range r.Doubts {
		add("unproven", foreign(d.Reason))
	}
	for _, n := range append(r.Notes[:len(r.Notes):len(r.Notes)], oneBook(r)...) {
		add("note", foreign(n))
	}
	return lines
}

// intensity names the method, for one run has no subject line to do so.
func intensity(r *footprint.Run) cell {
	if r.Intensity == nil {
		return none
	}
	return own("%s, %s factor, %s boundary", *r.Intensity, r.Factor, r.Boundary)
}
