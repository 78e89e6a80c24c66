package ledger

import (
	"fmt"
	"strings"

	"budgetcheck/budget/footprint"
	"budgetcheck/budget/unit"
)

// The kinds of line that a ledger holds.
const (
	KindRun     = "run"
	KindRelease = "release"
)

// Entry is one part of a run in the books. An entry is never changed: one that
// stands in for it is booked after it.
type Entry struct {
	Kind       string       `json:"k"` // run
	Repository string       `json:"repository,omitempty"`
	Account    string       `json:"account"`            // the branch, or pull/N
	BookedAt   unit.Instant `json:"booked_at"`          // never before the run's end, nor before the entry booked before it
	Inputs     string       `json:"inputs,omitempty"`   // hash of the files that the job depends on
	Facts      string       `json:"facts,omitempty"`    // hash of the facts and the series it was priced with
	Thin       string       `json:"thin,omitempty"`     // why the policy in force took the evidence for thin; empty if it did not
	Corrects   string       `json:"corrects,omitempty"` // ID of the entry that this one stands in for
	Why        string       `json:"why,omitempty"`      // of a correction

	footprint.Booked
}

// Key names a part of a run. No two entries of a key are in force.
type Key struct {
	Repository string
	Run        string
	Attempt    int
	Part       string
}

// Key is the entry's key.
func (e *Entry) Key() Key {
	return Key{e.Repository, e.Run.Run, e.Attempt, e.part()}
}

func (e *Entry) part() string {
	if len(e.Parts) == 0 {
		return ""
	}
	return e.Parts[0].Part
}

func (k Key) String() string {
	text := fmt.Sprintf("run %s, attempt %d", k.Run, k.Attempt)
	if k.Part != "" {
		text += ", part " + k.Part
	}
	return text
}

// Mark is a release: it ends one account of a branch and opens the next.
type Mark struct {
	Kind       string       `json:"k"` // release
	Repository string       `json:"repository,omitempty"`
	Tag        string       `json:"tag"`
	Commit     string       `json:"commit,omitempty"`
	Branch     string       `json:"branch"`
	At         unit.Instant `json:"at"`
}

// PullAccount is the account that the runs of a pull request are charged to.
func PullAccount(n int) string { return fmt.Sprintf("pull/%d", n) }

// Pull is the number of the pull request that the account is of; 0 if it is a
// branch's.
func Pull(account string) (n int) {
	if number, ok := strings.CutPrefix(account, "pull/"); ok {
		if _, err := fmt.Sscanf(number, "%d", &n); err != nil || PullAccount(n) != account {
			return 0
		}
	}
	return n
}
