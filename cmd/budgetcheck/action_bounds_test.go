package main

import (
	"fmt"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
)

// Records may name any number of commits that do not exist. Only so many are
// looked up, each once.
func TestInventedCommitsAreNotAllLookedUp(t *testing.T) {
	w := forked(t)
	records := map[string]string{}
	for n := range 3 * mostCommits {
		records[fmt.Sprintf("records/%d.ndjson", n)] = training(t, fmt.Sprintf("n%d", n), fmt.Sprintf("%040x", n+1), 250)
	}
	o := w.run(w.reported(fork, records))
	assert.Equal(t, exitFinding, o.status)
	assert.LessOrEqual(t, len(w.api.Calls()), mostCommits+15)
}

// A policy that the workflow names and that is nowhere would drop its budgets
// in silence.
func TestPolicyThatIsNowhere(t *testing.T) {
	w := newWorld(t, nil)
	s := w.pull(lean(t, w.head))
	s.inputs = map[string]string{"policy": "budgetcheck.toml\nlimits/typo.toml\n"}
	o := w.run(s)
	assert.Equal(t, exitCannot, o.status)
	assert.Contains(t, o.complaint, "there is no policy limits/typo.toml on branch main nor in this change")
	require.Equal(t, "unknown", o.outputs["gate"])
}
