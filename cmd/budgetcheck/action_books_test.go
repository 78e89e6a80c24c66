package main

import (
	"os/exec"
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
)

// ledgerOf is what the repository's ledger branch holds for March.
func (w *world) ledgerOf() string {
	w.t.Helper()
	out, err := exec.Command("git", "-C", w.repo.Dir, "show", "budgetcheck-ledger:2031-03.ndjson").CombinedOutput()
	require.NoError(w.t, err, "%s", out)
	return string(out)
}

// The second workflow books what it judges, once, on a branch of its own; from
// then on the books speak for the head without any record.
func TestActionBooks(t *testing.T) {
	w := newWorld(t, nil)
	for range 2 {
		s := w.reported(home, lean(t, w.head))
		s.inputs = map[string]string{"book": "true"}
		o := w.run(s)
		require.Equal(t, exitDone, o.status, "%s%s", o.log, o.complaint)
	}
	books := w.ledgerOf()
	assert.Equal(t, 1, strings.Count(books, "\n"))
	assert.Contains(t, books, `"account":"pull/7"`)
	assert.Contains(t, books, `"commit":"`+w.head+`"`)
	assert.Contains(t, books, `"repository":"`+home+`"`)
	assert.Contains(t, books, `"inputs":"`)

	o := w.run(w.reported(home, nil))
	require.Equal(t, exitDone, o.status, "%s%s", o.log, o.complaint)
	assert.Contains(t, o.statement, "one training")
}

// Whatever the verdict, what is spent is booked.
func TestActionBooksWhatIsOver(t *testing.T) {
	w := newWorld(t, nil)
	s := w.reported(home, heavy(t, w.head))
	s.inputs = map[string]string{"book": "true"}
	require.Equal(t, exitFinding, w.run(s).status)
	assert.Equal(t, 1, strings.Count(w.ledgerOf(), "\n"))
}

// A change that edits the policy shows what either policy makes of the past.
func TestActionReplays(t *testing.T) {
	w := newWorld(t, map[string]string{policyName: strings.Replace(targetPolicy, `limit = "150 g"`, `limit = "90 g"`, 1)})
	s := w.reported(home, lean(t, w.head))
	s.inputs = map[string]string{"book": "true"}
	o := w.run(s)
	require.Equal(t, exitDone, o.status, "%s%s", o.log, o.complaint)
	assert.Contains(t, o.statement, "Past changes by this policy")
	assert.Contains(t, o.statement, "this change's own")
}

// A ledger that is named and cannot be had is no reason to judge without it.
func TestActionWithoutItsLedger(t *testing.T) {
	w := newWorld(t, nil)
	s := w.reported(home, lean(t, w.head))
	s.inputs = map[string]string{"ledger": "git:/nowhere#books"}
	o := w.run(s)
	assert.Equal(t, exitCannot, o.status)
	assert.Contains(t, o.complaint, "the ledger cannot be read")
	assert.Equal(t, "unknown", o.outputs["gate"])
}
